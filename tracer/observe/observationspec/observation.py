"""An observation file as a whole, read and checked."""

import os

from pydantic import Field

from tracer.inputs.checking import parsed
from tracer.inputs.reference import reference_of
from tracer.inputs.table import FileTable
from tracer.inputs.text import Line
from tracer.inputs.toml import file_text
from tracer.observe.observationspec.fit import BackgroundTable, FitTable
from tracer.observe.observationspec.profile import ProfileTable
from tracer.observe.observationspec.view import SeeingTable, SlitTable, ViewTable

BEGIN = "<!-- observation reference: made from the package, do not edit -->"
END = "<!-- end of observation reference -->"

_PREFACE = """\
## Observation-file reference

An observation file is TOML with the rules of run files: quantities are texts with their unit, `radii`
means the radius of the product's body, paths are relative to the observation file, keys that stand in
no table below are refused. Lengths in the sky may be angles (`"0.6 arcsec"`) where `view.distance` is
given. Sky: the viewer's right and up are those of an image of the run file with the same `look_from`.
"""


class ObservationSpec(FileTable):
    """An observation file as the user wrote it, checked, with the defaults filled in."""

    title: Line = Field("Observed profile", description="Title, carried into results and figures.")
    profile: ProfileTable = Field(description="What was measured.")
    view: ViewTable = Field(description="Where the observer stands.")
    slit: SlitTable | None = Field(None, description="Over what each point is a mean. Default: a point.")
    seeing: SeeingTable | None = Field(None, description="How light is spread. Default: not at all.")
    background: BackgroundTable = Field(BackgroundTable(), description="What is not the body's gas.")
    fit: FitTable = Field(FitTable(), description="What is to be found.")


def load_observation(path: str | os.PathLike[str]) -> ObservationSpec:
    """Read an observation file.

    Raises
    ------
    InputError
        The file cannot be read or used; the message says file, key, value and what is allowed.
    """
    return parse_observation(file_text(path, "observation file"), path)


def parse_observation(text: str, file: str | os.PathLike[str]) -> ObservationSpec:
    """Check the text of an observation file; `file` names it in messages, and relative paths begin in its folder.

    Raises
    ------
    InputError
        The text is no TOML or cannot be used.
    """
    return parsed(ObservationSpec, text, file)


def observation_reference() -> str:
    """Return the reference of observation files as Markdown."""
    return reference_of(ObservationSpec, _PREFACE)
