"""Monte Carlo test-particle tracer for surface-bound exospheres, the gas of airless bodies.

`load_run`, `run`, `open_product`, `save_product`, and for observers `sightlines`, `load_plan`, `plan_observation`,
`evaluate_law`, `load_observation` and `compare`, are loaded when they are first asked for, so that `import tracer`
costs nothing.
"""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from tracer.engine.runspec.load import load_run
    from tracer.engine.tracing import run
    from tracer.observe.fit.comparison import compare
    from tracer.observe.observationspec.observation import load_observation
    from tracer.observe.plan import plan_observation
    from tracer.observe.planspec.plan import load_plan
    from tracer.observe.responses import evaluate_law
    from tracer.observe.sightlines import sightlines
    from tracer.product.reading import open_product
    from tracer.product.writing import save_product

__all__ = [
    "__version__",
    "compare",
    "evaluate_law",
    "load_observation",
    "load_plan",
    "load_run",
    "open_product",
    "plan_observation",
    "run",
    "save_product",
    "sightlines",
]

_HOMES = {
    "compare": "tracer.observe.fit.comparison",
    "evaluate_law": "tracer.observe.responses",
    "load_observation": "tracer.observe.observationspec.observation",
    "load_plan": "tracer.observe.planspec.plan",
    "load_run": "tracer.engine.runspec.load",
    "open_product": "tracer.product.reading",
    "plan_observation": "tracer.observe.plan",
    "run": "tracer.engine.tracing",
    "save_product": "tracer.product.writing",
    "sightlines": "tracer.observe.sightlines",
}


def __getattr__(name: str) -> Any:
    if name == "__version__":
        return import_module("importlib.metadata").version("exosphere-tracer")
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'tracer' has no attribute {name!r}")
