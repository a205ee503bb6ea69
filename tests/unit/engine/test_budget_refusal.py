"""A run whose particle budget does not close, or whose propagator gave up, ends in an error."""

import numpy as np
import pytest

from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.folding import Folder
from tracer.engine.outcome import Costs, make_product
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.tally.buffer import tally_views


@pytest.fixture
def folded(small_run_file):
    """Return (spec, scene, folder) of two batches of each release."""
    spec = load_run(small_run_file, ["ensemble.batches=2", "ensemble.particles_per_batch=20"])
    scene = build_scene(spec)
    work = make_work(scene, 1, 20)
    tasks = [Task(release, batch) for batch in range(2) for release in range(2)]
    folder = Folder(work.layout, tasks, 2, 2)
    for task in tasks:
        folder.take(task, trace_batch(work, task, lambda _a, _f: None, lambda: False))
    return spec, scene, folder


def ledger(folder, release: int) -> np.ndarray:
    return tally_views(folder.layout, folder.statistics[release].mean).ledger


def test_closed_budget_makes_a_product(folded):
    product = make_product(*folded, Costs(1.0, 1))
    assert product.attrs["complete"] == 1
    np.testing.assert_array_equal(product.ledger.values[1], ledger(folded[2], 1))


def test_budget_open_by_a_part_in_a_hundred_million_is_refused(folded):
    _, scene, folder = folded
    ledger(folder, 1)[Fate.ESCAPED] += 1e-8 * scene.releases[1].rate
    with pytest.raises(TracerError, match=r"particle budget of release 'sputtering' does not close"):
        make_product(*folded, Costs(1.0, 1))


def test_unresolved_atom_is_refused_though_the_budget_closes(folded):
    fates = ledger(folded[2], 0)
    fates[Fate.UNRESOLVED], fates[Fate.CAPTURED] = fates[Fate.CAPTURED], 0.0
    with pytest.raises(TracerError, match=r"gave up on 0\.\d+ of the atoms of release 'impact vapour'"):
        make_product(*folded, Costs(1.0, 1))
