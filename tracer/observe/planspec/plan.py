"""A plan file as a whole, read and checked."""

import os

from pydantic import Field, PrivateAttr

from tracer.inputs.checking import parsed
from tracer.inputs.reference import reference_of
from tracer.inputs.table import FileTable
from tracer.inputs.text import Line
from tracer.inputs.toml import file_text
from tracer.observe.planspec.observer import ObserverPath
from tracer.observe.planspec.pointing import Pointing
from tracer.observe.planspec.spectrometer import SpectrometerTable

BEGIN = "<!-- plan reference: made from the package, do not edit -->"
END = "<!-- end of plan reference -->"

_PREFACE = """\
## Plan-file reference

A plan file is TOML with the rules of run files: quantities are texts with their unit, `radii` means
the radius of the product's body, paths are relative to the plan file, keys that stand in no table
below are refused.
"""


class PlanSpec(FileTable):
    """A plan file as the user wrote it, checked, with the defaults filled in."""

    title: Line = Field(description="Title of the plan, carried into its table.")
    observer: ObserverPath = Field(description="Where the observer is at what times.")
    pointing: Pointing = Field(description="Where the instrument looks.")
    spectrometer: SpectrometerTable = Field(description="The instrument.")

    _file: str = PrivateAttr(default="plan file")


def load_plan(path: str | os.PathLike[str]) -> PlanSpec:
    """Read a plan file.

    Raises
    ------
    InputError
        The file cannot be read or used; the message says file, key, value and what is allowed.
    """
    return parse_plan(file_text(path, "plan file"), path)


def parse_plan(text: str, file: str | os.PathLike[str]) -> PlanSpec:
    """Check the text of a plan file; `file` names it in messages, and relative paths begin in its folder.

    Raises
    ------
    InputError
        The text is no TOML or cannot be used.
    """
    return parsed(PlanSpec, text, file)


def plan_reference() -> str:
    """Return the reference of plan files as Markdown."""
    return reference_of(PlanSpec, _PREFACE)
