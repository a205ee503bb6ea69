"""Sweeps of a small run, as files."""

from collections.abc import Callable
from pathlib import Path

import pytest

from tracer.engine.sweep.points import Sweep, load_sweep

TWO_AXES = Path(__file__).with_name("two-axes.toml").read_text(encoding="utf-8")


@pytest.fixture
def sweep_of(tmp_path: Path, small_run_file: Path) -> Callable[..., Sweep]:
    """Return a function that loads a sweep file of the given text, beside which `small.toml` lies."""
    (tmp_path / "small.toml").write_bytes(small_run_file.read_bytes())

    def load(text: str = TWO_AXES, *changes: str) -> Sweep:
        path = tmp_path / "sweep.toml"
        path.write_text(text, encoding="utf-8")
        return load_sweep(path, changes)

    return load
