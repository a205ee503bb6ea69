"""Write a run file with its defaults."""

import tomli_w

from tracer.engine.runspec.run import RunSpec


def run_file_text(spec: RunSpec) -> str:
    """Return the run file's text, every default written out; `parse_run` gives the same spec again.

    Parameters
    ----------
    spec : RunSpec
        A checked run file.

    Returns
    -------
    str
        TOML. Keys whose default is found out later (the catalogue's constants, the Hill radius) are left out
        unless they were given.
    """
    tables = spec.model_dump(exclude_none=True, by_alias=True)
    if not tables["image"]:
        # An empty list would stand above the tables, where nobody looks for images.
        del tables["image"]
    return tomli_w.dumps(tables)
