"""A run whose particle budget does not close, or whose propagator gave up, ends in an error."""

import numpy as np
import pytest

from tracer.engine.batches import trace_batch
from tracer.engine.outcome import Costs, make_product
from tracer.engine.planning import make_plan
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.tally.buffer import tally_views


@pytest.fixture
def folded(small_run_file):
    """Return (plan, folder) of two batches of each release."""
    spec = load_run(small_run_file, ["ensemble.batches=2", "ensemble.particles_per_batch=20"])
    plan = make_plan(spec, build_scene(spec))
    folder = plan.new_folder()
    for task in plan.tasks:
        folder.take(task, trace_batch(plan.work, task, lambda _a, _f: None, lambda: False))
    return plan, folder


def ledger(folder, release: int) -> np.ndarray:
    return tally_views(folder.layout, folder.statistics[release].mean).ledger


def test_closed_budget_makes_a_product(folded):
    product = make_product(*folded, Costs(1.0, 1))
    assert product.attrs["complete"] == 1
    np.testing.assert_array_equal(product.ledger.values[1], ledger(folded[1], 1))


def test_budget_open_by_a_part_in_a_hundred_million_is_refused(folded):
    plan, folder = folded
    ledger(folder, 1)[Fate.ESCAPED] += 1e-8 * plan.scene.releases[1].rate
    with pytest.raises(TracerError, match=r"particle budget of release 'sputtering' does not close"):
        make_product(*folded, Costs(1.0, 1))


def test_unresolved_atom_is_refused_though_the_budget_closes(folded):
    fates = ledger(folded[1], 0)
    fates[Fate.UNRESOLVED], fates[Fate.CAPTURED] = fates[Fate.CAPTURED], 0.0
    with pytest.raises(TracerError, match=r"gave up on 0\.\d+ of the atoms of release 'impact vapour'"):
        make_product(*folded, Costs(1.0, 1))
