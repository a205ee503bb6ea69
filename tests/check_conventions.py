"""The CF checker on one file: `python tests/check_conventions.py ARGUMENTS OF compliance-checker`.

The checker asks anew for each variable which of all variables are coordinates; with a hundred variables that takes half
a minute. The file does not change meanwhile, so that each question is answered once here.
"""

import copy
import functools
import inspect
import runpy
import sys
import sysconfig
from collections.abc import Callable
from pathlib import Path
from typing import Any

from compliance_checker.cf import util


def asked_once(question: Callable[[Any], Any]) -> Callable[[Any], Any]:
    """Return the question about a dataset, with its answers kept."""
    kept = functools.lru_cache(question)
    return functools.wraps(question)(lambda dataset: copy.copy(kept(dataset)))


if __name__ == "__main__":
    for name, function in inspect.getmembers(util, inspect.isfunction):
        if name.startswith("get_") and list(inspect.signature(function).parameters) in (["ds"], ["nc"]):
            setattr(util, name, asked_once(function))
    scripts = Path(sysconfig.get_path("scripts"))
    sys.path.insert(0, str(scripts))
    runpy.run_path(str(scripts / "compliance-checker"), run_name="__main__")
