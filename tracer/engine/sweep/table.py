"""[sweep]: which keys of the run file vary, and over which values."""

import re
from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import Field, GetCoreSchemaHandler, PrivateAttr, model_validator
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.number import SeveralOf
from tracer.inputs.reference import reference_of
from tracer.inputs.table import FileTable, Table, conflict
from tracer.inputs.text import FilePath, Line
from tracer.units import quoted

BEGIN = "<!-- sweep reference: made from the package, do not edit -->"
END = "<!-- end of sweep reference -->"

_PREFACE = """\
## Sweep-file reference

A sweep file is a run file with a table `[sweep]` that says which of its keys vary. All other tables
are those of a run file, with the same rules. With `run` they may be left out: those that are given
then change the named run file, key by key, and a list takes the place of the whole list; paths are
relative to the named run file.

Each point of the sweep is the run of that file with the point's values, to the last bit; `tracer run
RUN.toml --set KEY=VALUE` makes it alone. All points have the run file's seed: with the same random
numbers their differences are usually known better than the error bars of each say. Where points must
be independent vary `ensemble.seed` along with other keys, `paired`.

Any key may vary that leaves grid, images, releases, emission lines, bins of launch speed and the
number of replicates as they are, which the points of one product share. The bins of
`ensemble.speed_bins` follow the laws of release and the escape speed. Numbers along an axis rise or
fall throughout.
"""

_NAME = re.compile(r"[a-z][a-z0-9_]{0,39}")


@dataclass(frozen=True)
class _AxisName:
    """Validator of a name that a dimension of the product can bear."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> str:
        if not (isinstance(given, str) and _NAME.fullmatch(given)):
            raise ValueError(f"{quoted(given)} is no name; must be {self.kind()}")
        return given

    def kind(self) -> str:
        return "text of at most 40 lower-case letters, digits and `_`"


@dataclass(frozen=True)
class _Values:
    """Validator of a list that holds something; what it holds is judged as the run file's key."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> tuple[Any, ...]:
        if not isinstance(given, tuple):
            raise ValueError(f"{quoted(given)} is not a list; must be a {self.kind()}")
        if not given:
            raise ValueError(f"is empty; must be a {self.kind()}")
        return given

    def kind(self) -> str:
        return "list of values as the key takes them"


@dataclass(frozen=True)
class _End:
    """Validator of the end of a range: a number, or a quantity whose unit the key will judge."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> str | int | float:
        if isinstance(given, bool) or not isinstance(given, str | int | float):
            raise ValueError(f"{quoted(given)} is not allowed; must be a {self.kind()}")
        return given

    def kind(self) -> str:
        return "quantity or number as the key takes it"


class AxisTable(Table):
    """One key that varies, over a list of values or a range."""

    key: Line = Field(
        description="The key, as `--set` takes it, lists counted from 1: `release[1].speed.temperature`."
    )
    name: Annotated[str, _AxisName()] | None = Field(
        None, description="Name of the values in the product and in figures. Default: the last word of `key`."
    )
    values: Annotated[tuple[Any, ...], _Values()] | None = Field(
        None, description="The values, as the run file would have them; or a range by the keys below."
    )
    labels: tuple[Line, ...] | None = Field(
        None, description="Names of the values, as many; needed where a value is a table or a list."
    )
    first: Annotated[str | float, _End()] | None = Field(None, description="First value of a range.")
    last: Annotated[str | float, _End()] | None = Field(None, description="Last value of a range.")
    count: SeveralOf | None = Field(None, description="Number of values in a range, both ends included.")
    spacing: Literal["linear", "logarithmic"] = Field(
        "linear", description="Whether a range goes in equal steps or in equal ratios."
    )

    @model_validator(mode="after")
    def _has_values(self) -> "AxisTable":
        given = self.model_fields_set & {"first", "last", "count", "spacing"}
        if self.values is not None:
            if given:
                raise conflict(sorted(given)[0], "stands beside values; give either a list or a range")
            if self.labels is not None and len(self.labels) != len(self.values):
                raise conflict(
                    "labels", f"has {len(self.labels)} entries; must be as many as values, {len(self.values)}"
                )
            return self
        if not given:
            raise conflict("values", _NO_VALUES)
        for key in ("first", "last", "count"):
            if getattr(self, key) is None:
                raise conflict(key, f"missing beside {sorted(given)[0]}; a range needs first, last and count")
        if self.labels is not None:
            raise conflict("labels", "stands beside a range; goes with values")
        return self


_NO_VALUES = "missing; must be a list of values as the key takes them, or first, last and count"


class SweepTable(Table):
    """What varies, and how it is combined."""

    run: FilePath | None = Field(
        None, description="The run file that is swept, relative to this file; without it this file holds all."
    )
    combine: Literal["all", "paired"] = Field(
        "all",
        description="All combinations of the axes, each of which becomes a dimension of the product; or paired: the "
        "first values of all, the second values of all, ..., along one dimension `point`.",
    )
    axis: tuple[AxisTable, ...] = Field(description="What varies, one or more.")

    @model_validator(mode="after")
    def _has_axes(self) -> "SweepTable":
        if not self.axis:
            raise conflict("axis", "missing; must be at least one table, headed [[sweep.axis]]")
        return self


class SweepFile(FileTable):
    """What a sweep file holds beside a run file."""

    sweep: SweepTable = Field(description="What varies.")

    _file: str = PrivateAttr(default="sweep file")


def sweep_reference() -> str:
    """Return the reference of sweep files as Markdown."""
    return reference_of(SweepFile, _PREFACE)
