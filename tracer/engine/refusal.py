"""Say what is wrong with a run file once its values are put together."""

from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError


def refuse(spec: RunSpec, key: str, value: object, reason: str) -> InputError:
    """Return the error for `key` of `spec`, with its value where there is one, in the run file's own words."""
    shown = "" if value is None else f'"{value}" '
    return InputError(f"{spec.file}: {key}: {shown}{reason}")
