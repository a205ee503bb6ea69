"""The run-file reference, made from the tables themselves so that it cannot drift."""

from tracer.engine.runspec.run import RunSpec
from tracer.inputs.reference import reference_of
from tracer.inputs.sky import SkyPoint

BEGIN = "<!-- reference: made from the package, do not edit -->"
END = "<!-- end of reference -->"

_PREFACE = """\
## Run-file reference

A run file is TOML in UTF-8. Every quantity with a dimension is a text with its unit, such as `"1200
K"`; units are written as `astropy.units` reads them, and where `radii` is allowed it means the
radius of the body. Local times are plain numbers of hours in [0, 24): noon 12, dusk 18, midnight 0,
dawn 6. Paths are relative to the run file. A law is a table with the key `law`; a law whose other
keys all have defaults may be given by its name alone. Keys that stand in no table below are
refused. From the command line, `--set release[1].rate="2e24 s-1"` changes a key before the file is
checked; lists count from 1.
"""


def reference() -> str:
    """Return the reference of run files as Markdown."""
    return reference_of(RunSpec, _PREFACE, hidden=(SkyPoint,))
