"""Monte Carlo test-particle tracer for surface-bound exospheres, the gas of airless bodies.

`load_run`, `run`, `open_product`, `save_product`, for sweeps `load_sweep`, `run_sweep`, `open_sweep` and `sweep_point`,
and for observers `sightlines`, `load_plan`, `plan_observation`, `load_observation`, `compare` and `evaluate_law`, are
loaded when they are first asked for, so that `import tracer` costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from tracer.engine.runspec.load import load_run
    from tracer.engine.sweep.points import load_sweep
    from tracer.engine.sweep.tracing import run_sweep
    from tracer.engine.tracing import run
    from tracer.observe.fit.comparison import compare
    from tracer.observe.observationspec.observation import load_observation
    from tracer.observe.plan import plan_observation
    from tracer.observe.planspec.plan import load_plan
    from tracer.observe.responses import evaluate_law
    from tracer.observe.sightlines import sightlines
    from tracer.product.reading import open_product, open_sweep
    from tracer.product.sweeping import sweep_point
    from tracer.product.writing import save_product

__all__ = [
    "__version__",
    "compare",
    "evaluate_law",
    "load_observation",
    "load_plan",
    "load_run",
    "load_sweep",
    "open_product",
    "open_sweep",
    "plan_observation",
    "run",
    "run_sweep",
    "save_product",
    "sightlines",
    "sweep_point",
]

_HOMES = {
    "compare": "tracer.observe.fit.comparison",
    "evaluate_law": "tracer.observe.responses",
    "load_observation": "tracer.observe.observationspec.observation",
    "load_plan": "tracer.observe.planspec.plan",
    "load_run": "tracer.engine.runspec.load",
    "load_sweep": "tracer.engine.sweep.points",
    "open_product": "tracer.product.reading",
    "open_sweep": "tracer.product.reading",
    "plan_observation": "tracer.observe.plan",
    "run": "tracer.engine.tracing",
    "run_sweep": "tracer.engine.sweep.tracing",
    "save_product": "tracer.product.writing",
    "sightlines": "tracer.observe.sightlines",
    "sweep_point": "tracer.product.sweeping",
}


def __getattr__(name: str) -> Any:
    if name == "__version__":
        return import_module("importlib.metadata").version("exosphere-tracer")
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'tracer' has no attribute {name!r}")
