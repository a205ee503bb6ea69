"""Progress knows how well the mean life is known."""

import numpy as np
import pytest

from tracer.engine.batches import trace_batch
from tracer.engine.planning import make_plan
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run


def test_relative_error_without_a_stop_rule_is_that_of_the_mean_life(small_run_file):
    spec = load_run(small_run_file)
    plan = make_plan(spec, build_scene(spec))
    folder = plan.new_folder()
    assert folder.relative_error() is None
    for task in plan.tasks:
        folder.take(task, trace_batch(plan.work, task, lambda atoms, flights: None, lambda: False))
    product = run(spec, workers=1)
    rates = np.array([release.rate for release in plan.scene.releases])
    lives = product.mean_life.values * rates
    errors = product.mean_life_standard_error.values * rates
    assert folder.relative_error() == pytest.approx(np.hypot(*errors) / lives.sum(), rel=1e-12)
