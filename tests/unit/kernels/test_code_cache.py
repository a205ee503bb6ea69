"""The cache of compiled kernels: a second start is fast, and no fault of the cache costs more than time."""

import os
import shutil
import stat
import subprocess
import sys
from pathlib import Path

import pytest

import tracer.kernels.code_cache as code_cache

SOURCES = Path(code_cache.__file__).parents[2]
"""The folder that holds the package."""

PROBE = """
import sys
import numpy as np
from tracer.kernels.cells import latitude_cell, make_cells
some = make_cells(1.0, np.array([1.0, 2.0]), 0.5, 0.0, 4, 4)
print(latitude_cell(some, 0.1), sum(latitude_cell.stats.cache_hits.values()))
"""
"""Prints the result of one small kernel and how many of its compilations came from the cache."""


def probe(cache_home: Path, sources: Path = SOURCES) -> tuple[str, int]:
    """Return (result, cache hits) of a fresh interpreter that imports the package from `sources`."""
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", PROBE],
        env={**os.environ, "XDG_CACHE_HOME": str(cache_home), "PYTHONPATH": str(sources)},
        # Elsewhere than the checkout: the current folder goes before PYTHONPATH.
        cwd=cache_home.parent,
        capture_output=True,
        text=True,
        timeout=60,
    )
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    result, hits = done.stdout.split()
    return result, int(hits)


@pytest.fixture(scope="module")
def warm(tmp_path_factory) -> Path:
    """Return a cache home that one start has filled; copy it before harming it."""
    home = tmp_path_factory.mktemp("cache")
    assert probe(home) == ("2", 0)
    return home


@pytest.fixture
def cache_home(warm, tmp_path) -> Path:
    return Path(shutil.copytree(warm, tmp_path / "cache"))


def entries(cache_home: Path, kind: str) -> list[Path]:
    found = sorted(cache_home.rglob(f"*.{kind}"))
    assert found
    return found


def folder_of(cache_home: Path) -> Path:
    return entries(cache_home, "nbi")[0].parent


linux = pytest.mark.skipif(sys.platform != "linux", reason="XDG_CACHE_HOME is Linux's")


@linux
def test_second_start_loads_what_the_first_compiled(cache_home):
    assert probe(cache_home) == ("2", 1)


@linux
def test_folder_is_private(cache_home):
    folder = folder_of(cache_home)
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700
    assert folder.name == code_cache.source_hash()[:16]


@linux
@pytest.mark.parametrize("kind", ["nbi", "nbc"])
def test_truncated_entry_costs_only_the_time_to_compile(cache_home, kind):
    for path in entries(cache_home, kind):
        content = path.read_bytes()
        path.write_bytes(content[: len(content) // 2])
    assert probe(cache_home) == ("2", 0)
    # And it mends: at once, or a start later where the index had to be dropped first.
    probe(cache_home)
    assert probe(cache_home) == ("2", 1)


@linux
def test_entry_with_one_wrong_byte_is_not_unpickled(cache_home):
    for path in entries(cache_home, "nbc"):
        content = bytearray(path.read_bytes())
        content[len(content) // 2] ^= 1
        path.write_bytes(content)
    assert probe(cache_home) == ("2", 0)


@linux
def test_folder_that_others_may_write_is_left_alone(cache_home):
    folder_of(cache_home).chmod(0o777)
    assert probe(cache_home) == ("2", 0)


@linux
def test_home_that_is_no_folder_costs_only_the_time_to_compile(tmp_path):
    # Not a folder without permission: the superuser writes there all the same.
    (tmp_path / "file").write_text("in the way")
    assert probe(tmp_path / "file") == ("2", 0)


def test_hash_changes_with_every_edit_of_a_kernel(tmp_path, monkeypatch):
    package = tmp_path / "tracer"
    shutil.copytree(Path(code_cache.__file__).parent, package / "kernels")
    fate = Path(code_cache.__file__).parent.parent / "fate.py"
    shutil.copy(fate, package / "fate.py")
    monkeypatch.setattr(code_cache, "__file__", str(package / "kernels" / "code_cache.py"))
    plain = code_cache.source_hash.__wrapped__
    assert plain() == code_cache.source_hash()
    seen = {plain()}
    for name in ("kernels/universal.py", "kernels/compiling.py", "fate.py"):
        path = package / name
        path.write_text(path.read_text(encoding="utf-8") + "\n# edited\n", encoding="utf-8")
        seen.add(plain())
    (package / "kernels" / "new_file.py").write_text("")
    seen.add(plain())
    assert len(seen) == 5


@linux
def test_entries_of_other_sources_are_stale(cache_home):
    # An index under this version's name that was written for other sources, as after an edit with the folder kept.
    folder = folder_of(cache_home)
    edited = cache_home / "edited"
    shutil.copytree(SOURCES / "tracer", edited / "tracer", ignore=shutil.ignore_patterns("__pycache__"))
    cells = edited / "tracer" / "kernels" / "cells.py"
    text = cells.read_text(encoding="utf-8")
    old = "return row_of(cells.tables, sine)"
    assert old in text
    cells.write_text(text.replace(old, "return 1 + row_of(cells.tables, sine)"))
    assert probe(cache_home, edited) == ("3", 0)
    folders = [path for path in folder.parent.iterdir() if path.is_dir()]
    assert len(folders) == 2
    # The new source's folder filled with the old source's entries: their stamp is wrong.
    new = next(path for path in folders if path != folder)
    shutil.rmtree(new)
    shutil.copytree(folder, new)
    assert probe(cache_home, edited) == ("3", 0)
