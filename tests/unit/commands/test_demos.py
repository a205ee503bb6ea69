"""The demos, with fewer particles than they ask for: each runs, keeps its budget and follows the CF conventions."""

import subprocess
import sys
from pathlib import Path

import pytest

import tracer

DEMOS = sorted((Path(__file__).parents[3] / "runs").glob("*.toml"))
FEWER = ("ensemble.particles_per_batch=10", "ensemble.batches=3")


@pytest.fixture(scope="module", params=DEMOS, ids=lambda path: path.stem)
def demo(request, tmp_path_factory):
    product = tmp_path_factory.mktemp("demo") / f"{request.param.stem}.nc"
    spec = tracer.load_run(request.param, FEWER)
    tracer.save_product(tracer.run(spec, workers=1), product)
    return product


def test_demo_closes_its_budget(demo):
    with tracer.open_product(demo) as ds:
        released = (ds.release_flux * ds.cell_area).sum(("latitude", "local_time"))
        assert (abs(ds.ledger.sum("fate") / released - 1.0) < 1e-9).all()
        assert (ds.ledger.sel(fate="unresolved") == 0.0).all()


def test_demo_product_follows_the_cf_conventions(demo):
    command = [
        str(Path(sys.executable).with_name("compliance-checker")),
        "--test=cf:1.11",
        "--criteria",
        "lenient",
    ]
    done = subprocess.run([*command, str(demo)], capture_output=True, text=True)
    assert done.returncode == 0, done.stdout
