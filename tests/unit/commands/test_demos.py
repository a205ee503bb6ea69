"""The demos, with fewer particles than they ask for: each runs, keeps its budget and follows the CF conventions."""

from pathlib import Path

import pytest

import tracer
from tracer.engine.sweep.preparing import prepare_sweep

RUNS = Path(__file__).parents[3] / "runs"
DEMOS = sorted(
    path for path in RUNS.glob("*.toml") if not path.stem.endswith(("-plan", "-sweep", "-observation"))
)
SWEEPS = sorted(RUNS.glob("*-sweep.toml"))
FEWER = (
    "ensemble.particles_per_batch=10",
    "ensemble.batches=3",
    "grid.latitude_cells=6",
    "grid.local_time_cells=8",
)
VARIABLES_OF_ALL = (
    *("harrow-sodium-adsorbed", "harrow-sodium-perihelion", "harrow-sodium-sources", "moon-argon"),
    "tine-sodium",
)
"""Demos that have between them what any of them has: the checker takes seconds for each."""


@pytest.fixture(scope="session")
def products(tmp_path_factory):
    """Return the demos' products by the name of the run file."""
    folder = tmp_path_factory.mktemp("demos")
    paths = {demo.stem: folder / f"{demo.stem}.nc" for demo in DEMOS}
    for demo in DEMOS:
        images = len(tracer.load_run(demo).image)
        fewer = [*FEWER, *(f"image[{number}].pixels=[8, 6]" for number in range(1, images + 1))]
        tracer.save_product(tracer.run(tracer.load_run(demo, fewer), workers=1), paths[demo.stem])
    return paths


@pytest.mark.parametrize("demo", [demo.stem for demo in DEMOS])
def test_demo_closes_its_budget(products, demo):
    with tracer.open_product(products[demo]) as ds:
        released = (ds.release_flux * ds.cell_area).sum(("latitude", "local_time"))
        assert (abs((ds.ledger.sum("fate") - ds.roulette_balance) / released - 1.0) < 1e-9).all()
        assert (ds.ledger.sel(fate="unresolved") == 0.0).all()


def test_lantern_plans_its_observation_of_harrow(products):
    with tracer.open_product(products["harrow-sodium-perihelion"]) as ds:
        table = tracer.plan_observation(ds, tracer.load_plan(RUNS / "lantern-plan.toml"))
    assert len(table) == 91
    assert (table["snr"] > 0.0).all()
    assert 0 < table["do_not_command"].sum() < 10


@pytest.mark.parametrize("demo", [demo.stem for demo in SWEEPS])
def test_demo_sweep_is_one_that_can_be_traced(demo):
    prepared = prepare_sweep(tracer.load_sweep(RUNS / f"{demo}.toml"), workers=1)
    assert len(prepared.points) > 2
    assert {axis.name for axis in prepared.axes} <= {"true_anomaly"}


def test_measured_tail_of_harrow_is_explained_by_its_sources():
    # Few particles: their error is counted. The truth of analysis/synthetic-tail/source.toml lies in the 95 % ranges
    # of all four numbers but for a chance of one in five; the seed is fixed.
    fewer = ["ensemble.particles_per_batch=800", "grid.latitude_cells=6", "grid.local_time_cells=8"]
    product = tracer.run(tracer.load_run(RUNS / "harrow-sodium-sources.toml", fewer), workers=1)
    found = tracer.compare(product, tracer.load_observation(RUNS / "harrow-tail-observation.toml"))
    estimates = {name: (found.rates[name], found.parameters[name]["temperature"]) for name in found.rates}
    for name, truths in {"photon desorption": (3.1e24, 1450.0), "impact vapour": (2.3e23, 3800.0)}.items():
        for estimate, true in zip(estimates[name], truths, strict=True):
            assert estimate.low95 < true < estimate.high95, (name, estimate)


@pytest.mark.parametrize("demo", VARIABLES_OF_ALL)
def test_demo_product_follows_the_cf_conventions(products, check_conventions, demo):
    done = check_conventions(products[demo])
    assert done.returncode == 0, done.stdout
    assert "All tests passed!" in done.stdout


def test_those_that_are_checked_have_the_variables_of_all(products):
    def kinds(names):
        found = set()
        for name in names:
            with tracer.open_product(products[name]) as ds:
                images = {
                    str(dim).removesuffix("_vertical") for dim in ds.dims if str(dim).endswith("_vertical")
                }
                for variable in map(str, ds.variables):
                    image = next((one for one in images if one in variable), None)
                    found.add(variable if image is None else variable.replace(image, "image"))
        return found

    assert kinds(VARIABLES_OF_ALL) == kinds(products)
