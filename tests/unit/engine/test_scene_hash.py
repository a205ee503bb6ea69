"""The scene's hash changes with whatever changes the physics, and with nothing else."""

import pytest

from tracer.engine.hashing import run_hash, scene_hash
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene, referenced_files


@pytest.fixture
def hashed(small_run_file):
    """Return a function from changes of the small run file to the scene's hash."""

    def make(*changes: str) -> str:
        spec = load_run(small_run_file, changes)
        return scene_hash(build_scene(spec), referenced_files(spec))

    return make


@pytest.mark.parametrize(
    "change",
    [
        "body.radius=1800.000001 km",
        "body.gm=9501 km3 s-2",
        "body.rotation_period=61 d",
        "gas.species=K",
        "gas.loss[1].rate=1.1e-5 s-1",
        "gas.loss[1].name=photons",
        "release[1].rate=2.1e24 s-1",
        "release[1].name=other vapour",
        "release[2].speed.binding_energy=2.1 eV",
        "release[1].place.power=2",
        "release[1].direction.law=isotropic",
        "surface.sticking=0.41",
        "surface.accommodation=0.71",
        "surface.temperature.night=111 K",
        "domain.outer_radius=21 radii",
        "domain.age_limit=31 d",
        "grid.altitude.first_cell=51 km",
        "grid.latitude_cells=5",
        "grid.local_time_cells=7",
        "image[1].look_from=south",
        "image[1].pixels=[8, 7]",
        "image[1].name=tail",
        "ensemble.emphasis=far",
        "ensemble.speed_bins=8",
    ],
)
def test_hash_changes_with_what_decides_the_product(hashed, change):
    assert hashed(change) != hashed()


@pytest.mark.parametrize(
    "change",
    [
        "title=Another title",
        "ensemble.seed=1",
        "ensemble.batches=7",
        "ensemble.particles_per_batch=9",
        "ensemble.replicates=0",
        # The same values in other words.
        "body.radius=1.8e6 m",
        "surface.accommodation=0.70",
        "release[1].direction.law=cosine",
    ],
)
def test_hash_stays_with_title_number_of_particles_and_spelling(hashed, change):
    assert hashed(change) == hashed()


def test_hash_is_the_same_in_every_folder(hashed, small_run_file, tmp_path):
    copy = tmp_path / "copy.toml"
    copy.write_bytes(small_run_file.read_bytes())
    spec = load_run(copy)
    assert scene_hash(build_scene(spec), referenced_files(spec)) == hashed()


def test_hash_sees_every_byte_of_a_speed_table(small_run_file, tmp_path):
    run_file, table = tmp_path / "run.toml", tmp_path / "speeds.csv"
    text = small_run_file.read_text(encoding="utf-8")
    law = '{ law = "maxwell-flux", temperature = "3500 K" }'
    assert law in text
    run_file.write_text(text.replace(law, '{ law = "table", file = "speeds.csv" }'), encoding="utf-8")

    def found(rows: str) -> str:
        table.write_text(rows, encoding="utf-8")
        spec = load_run(run_file)
        assert [path.name for path in referenced_files(spec)] == ["speeds.csv"]
        return scene_hash(build_scene(spec), referenced_files(spec))

    first = found("0,0\n1000,1\n3000,0\n")
    assert found("0,0\n1000,1\n3001,0\n") != first
    # Even bytes that change no number: the file is part of what was run.
    assert found("speed,pdf\n0,0\n1000,1\n3000,0\n") != first
    assert found("0,0\n1000,1\n3000,0\n") == first


def test_run_hash_takes_in_scene_seed_and_particles():
    first = run_hash("abc", 1, 20)
    assert run_hash("abc", 1, 20) == first
    others = {run_hash("abd", 1, 20), run_hash("abc", 2, 20), run_hash("abc", 1, 21), run_hash("abc", 12, 0)}
    assert len(others | {first}) == 5


def test_hash_sees_every_byte_of_a_map(small_run_file, small_product, tmp_path):
    run_file, ground = tmp_path / "run.toml", tmp_path / "ground.nc"
    text = small_run_file.read_text(encoding="utf-8")
    law = '{ law = "quarter-power", subsolar = "600 K", night = "110 K" }'
    place = '{ law = "band", latitude = ["30 deg", "60 deg"] }'
    assert law in text
    assert place in text
    text = text.replace(law, '{ law = "map", file = "ground.nc", variable = "surface_temperature" }')
    text = text.replace(place, '{ law = "map", file = "ground.nc", variable = "surface_temperature" }')
    run_file.write_text(text, encoding="utf-8")

    def found(title: str) -> str:
        ground.unlink(missing_ok=True)
        maps = small_product[["surface_temperature"]].drop_vars(
            ["release_name", "fate_name"], errors="ignore"
        )
        maps.assign_attrs(title=title).to_netcdf(ground)
        spec = load_run(run_file)
        assert [path.name for path in referenced_files(spec)] == ["ground.nc", "ground.nc"]
        return scene_hash(build_scene(spec), referenced_files(spec))

    first = found("one")
    assert found("two") != first
    assert found("one") == first
