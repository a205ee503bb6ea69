"""A sweep file says what varies; what cannot be swept is refused before anything is traced."""

import numpy as np
import pytest

from tracer.engine.runspec.load import load_run
from tracer.engine.sweep.points import sweep_points
from tracer.engine.sweep.preparing import notes_of, prepare_sweep
from tracer.errors import InputError
from tracer.units import Quantity

HEAD = '[sweep]\nrun = "small.toml"\n'
PAIRED = '[sweep]\nrun = "small.toml"\ncombine = "paired"\n'


def axis(key: str, values: str, *more: str) -> str:
    return "\n".join(["[[sweep.axis]]", f'key = "{key}"', f"values = {values}", *more, ""])


STICKING = axis("surface.sticking", "[0.2, 1.0]")


def test_all_combinations_come_with_the_last_axis_fastest(sweep_of):
    points = list(sweep_points(sweep_of()))
    found = [(one.spec.surface.sticking, one.spec.release[0].speed.temperature.value) for one in points]
    assert found == [(s, t) for s in (0.2, 1.0) for t in (600.0, 1200.0, 2400.0)]
    assert points[4].words == "sticking 1.0, temperature 1200 K"
    assert [one.number for one in points] == [1, 2, 3, 4, 5, 6]


def test_paired_values_go_together(sweep_of):
    text = PAIRED + STICKING + axis("surface.accommodation", "[0.5, 0.5]")
    points = list(sweep_points(sweep_of(text)))
    assert [(one.spec.surface.sticking, one.spec.surface.accommodation) for one in points] == [
        (0.2, 0.5),
        (1.0, 0.5),
    ]


def test_each_point_is_what_the_same_settings_make_of_the_run_file(sweep_of, tmp_path):
    for point in sweep_points(sweep_of()):
        alone = load_run(tmp_path / "small.toml", (*point.settings, "ensemble.batches=4"))
        assert point.spec == alone


def test_tables_of_the_sweep_file_change_the_run_file_key_by_key(sweep_of):
    point = next(sweep_points(sweep_of(HEAD + STICKING + "[ensemble]\nseed = 7\n")))
    assert (point.spec.ensemble.seed, point.spec.ensemble.batches) == (7, 6)


def test_a_sweep_file_may_hold_the_run_itself(sweep_of, small_run_file):
    text = small_run_file.read_text(encoding="utf-8") + "\n[sweep]\n" + STICKING
    sweep = sweep_of(text)
    assert [one.spec.title for one in sweep_points(sweep)] == ["Sodium over Harrow, small"] * 2
    # What the product keeps reads back as the same sweep.
    again = sweep_of(sweep.text)
    assert [one.spec for one in sweep_points(again)] == [one.spec for one in sweep_points(sweep)]


def test_settings_change_all_points(sweep_of):
    points = sweep_points(sweep_of(HEAD + STICKING, "release[2].rate=1e20 s-1"))
    assert {one.spec.release[1].rate for one in points} == {Quantity(1e20, "s-1")}


def axes_of(sweep_of, text):
    return {one.variable: one for one in prepare_sweep(sweep_of(text), 1).axes}


def test_values_are_kept_in_si_units_with_what_was_written(sweep_of):
    text = (
        HEAD
        + axis("domain.outer_radius", '["10 radii", "20 radii"]')
        + axis("release[1].rate", '["1e24 s-1", "3e24 s-1"]', 'name = "source"')
        + axis("domain.age_limit", '["1 d", "100 h"]')
    )
    axes = axes_of(sweep_of, text)
    np.testing.assert_array_equal(axes["outer_radius"].values, [1.8e7, 3.6e7])
    assert axes["outer_radius"].attributes["written_unit"] == "radii"
    assert axes["source"].attributes["run_file_key"] == "release[1].rate"
    assert axes["age_limit"].attributes["units"] == "s"
    np.testing.assert_array_equal(axes["age_limit"].values, [86400.0, 360000.0])


def test_angles_are_kept_in_degrees(sweep_of):
    sun = (
        'body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", '
        'orbit = { semi_major_axis = "0.42 au", eccentricity = 0.18 } }\n'
    )
    text = sun + HEAD + axis("sun.true_anomaly", '["0 deg", "3.141592653589793 rad"]')
    found = axes_of(sweep_of, text)["true_anomaly"]
    assert found.attributes["units"] == "degree"
    np.testing.assert_allclose(found.values, [0.0, 180.0], rtol=1e-14)


def test_words_and_labelled_tables_are_kept_as_text(sweep_of):
    place = axis(
        "release[1].place",
        '["uniform", { law = "cosine-power", toward = "sun", power = 1 }]',
        'labels = ["all round", "noon"]',
    )
    axes = axes_of(
        sweep_of, HEAD + place + axis("surface.temperature.subsolar", '["500 K", "600 K"]', 'name = "noon"')
    )
    assert axes["place_name"].values.tolist() == ["all round", "noon"]
    assert axes["noon"].attributes["units_metadata"] == "temperature: on_scale"


MANY = axis("ensemble.seed", str(list(range(100))))


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ('[sweep]\nrun = "none.toml"\n' + STICKING, "{folder}/none.toml: no such file"),
        (HEAD, "{file}: sweep.axis: missing; must be a list of tables, each headed [[sweep.axis]]"),
        (HEAD + "axes = 3\n" + STICKING, "{file}: sweep.axes: unknown key; did you mean axis?"),
        (
            HEAD.replace("run =", 'combine = "both"\nrun =') + STICKING,
            '{file}: sweep.combine: "both" is not allowed; must be "all" or "paired"',
        ),
        (
            HEAD + axis("surface.sticking", "[]"),
            "{file}: sweep.axis[1].values: is empty; must be a list of values as the key takes them",
        ),
        (
            HEAD + axis("surface.sticking", "0.3"),
            "{file}: sweep.axis[1].values: 0.3 is not a list; must be a list of values as the key takes them",
        ),
        (
            HEAD + '[[sweep.axis]]\nkey = "surface.sticking"\n',
            "{file}: sweep.axis[1].values: missing; must be a list of values as the key takes them, or first, last and "
            "count",
        ),
        (
            HEAD + '[[sweep.axis]]\nkey = "surface.sticking"\nfirst = 0.1\nlast = 0.4\n',
            "{file}: sweep.axis[1].count: missing beside first; a range needs first, last and count",
        ),
        (
            HEAD + axis("surface.sticking", "[0.2, 0.3]", "count = 3"),
            "{file}: sweep.axis[1].count: stands beside values; give either a list or a range",
        ),
        (
            HEAD + axis("surface.sticking", "[0.2, 0.3, 0.2]"),
            '{file}: sweep.axis[1].values: "0.2" stands there twice; each value is traced once',
        ),
        (
            HEAD + axis("domain.outer_radius", '["10 radii", "18000 km"]'),
            '{file}: sweep.axis[1].values: "18000 km" is the same as "10 radii"; each value is traced once',
        ),
        (
            HEAD + axis("surface.sticking", "[0.2, 0.4, 0.3]"),
            '{file}: sweep.axis[1].values: turn back at "0.3"; numbers along an axis must rise or fall throughout',
        ),
        (
            HEAD + axis("release[1].speed.temprature", '["300 K"]'),
            "{file}: point 1 (temprature 300 K): release[1].speed.temprature: unknown key; did you mean temperature?",
        ),
        (
            HEAD + axis("release[1].speed.temperature", '["300 K", "300 km"]'),
            '{file}: point 2 (temperature 300 km): release[1].speed.temperature: "300 km": "km" is not a unit of '
            'temperature; write for example "1200 K" or "surface"',
        ),
        (
            HEAD + axis("release[3].rate", '["1e20 s-1"]'),
            "{file}: sweep.axis[1].key: release[3].rate: there is no release[3]; there are 2, counted from 1",
        ),
        (
            HEAD + axis("release[1", "[1]"),
            '{file}: sweep.axis[1].key: "release[1" is not a key; write for example release[1].speed.temperature',
        ),
        (
            HEAD + STICKING + axis("surface", "[{ sticking = 1.0 }]", 'labels = ["a"]'),
            '{file}: sweep.axis[2].key: "surface" is varied by axis[1] already, "surface.sticking"',
        ),
        (
            HEAD + axis("surface.sticking", "[0.2]", 'name = "ledger"'),
            '{file}: sweep.axis[1].name: "ledger" is taken by the product or another axis; give the axis another name',
        ),
        (
            HEAD + axis("surface.sticking", "[0.2]", 'name = "column_tail_from_north"'),
            '{file}: sweep.axis[1].name: "column_tail_from_north" is taken by an image; rename one of them',
        ),
        (
            HEAD + axis("surface.sticking", "[0.2]", 'name = "How sticky"'),
            '{file}: sweep.axis[1].name: "How sticky" is no name; must be text of at most 40 lower-case letters, '
            "digits and `_`",
        ),
        (
            HEAD + axis("release[1].place", '[{ law = "uniform" }]'),
            "{file}: sweep.axis[1].values[1]: is a table, which has no name of its own; the axis needs labels",
        ),
        (
            HEAD + axis("surface.sticking", "[0.2, 0.3]", 'labels = ["a"]'),
            "{file}: sweep.axis[1].labels: has 1 entries; must be as many as values, 2",
        ),
        (
            PAIRED + STICKING + axis("surface.accommodation", "[0.1, 0.2, 0.3]"),
            '{file}: sweep.combine: "paired" axes need as many values each; there are sticking 2, accommodation 3',
        ),
        (
            HEAD + MANY + axis("surface.sticking", str([round(0.01 * i, 2) for i in range(1, 101)])),
            "{file}: sweep: 100 x 100 are 10000 points; at most 4096 are allowed",
        ),
        (
            HEAD + axis("body.radius", '["1800 km", "1900 km"]', 'name = "size"'),
            "{file}: sweep: point 2 (size 1900 km) has another grid or body radius than point 1; the points of one "
            "product share them. Lengths in radii follow the body's radius: give them in km, or make several sweeps",
        ),
        (
            HEAD + axis("grid.latitude_cells", "[4, 6]"),
            "{file}: sweep: point 2 (latitude_cells 6) has another grid or body radius than point 1; ",
        ),
        (
            HEAD + axis("image[1].pixels", "[[8, 6], [4, 3]]", 'labels = ["fine", "coarse"]'),
            "{file}: sweep: point 2 (pixels coarse) has other images than point 1; ",
        ),
        (
            HEAD + axis("release[1].name", '["one", "two"]', 'name = "who"'),
            "{file}: sweep: point 2 (who two) has other releases than point 1; ",
        ),
        (
            HEAD + axis("ensemble.replicates", "[3, 2]"),
            "{file}: sweep: point 2 (replicates 2) has another number of replicates than point 1; ",
        ),
        (
            HEAD + axis("ensemble.speed_bins", "[0, 8]"),
            "{file}: sweep: point 2 (speed_bins 8) has other bins of launch speed than point 1; ",
        ),
        (
            HEAD
            + axis("release[1].speed.temperature", '["900 K", "3000 K"]')
            + "[ensemble]\nspeed_bins = 8\n",
            "{file}: sweep: point 2 (temperature 3000 K) has other bins of launch speed than point 1; the points of "
            "one product share them. The bins of ensemble.speed_bins follow the run's laws and the escape speed: "
            "evaluate other laws from the responses of one run, or set speed_bins = 0",
        ),
        (
            HEAD
            + STICKING
            + '[ensemble]\nreplicates = 30\nstop = { variable = "number_density", relative_error = 0.1, '
            + "at_most_batches = 80 }\n",
            "{file}: ensemble.replicates: 30 is out of range beside ensemble.stop, which may end a point after 20 "
            "batches; must be at most 20 in a sweep",
        ),
        (
            "title = 3\n",
            "{file}: sweep: missing; a sweep file is a run file with a table [sweep] that says what varies",
        ),
        ("[sweep\n", "{file}: line 1, column 7: not TOML: "),
    ],
)
def test_what_cannot_be_swept_is_refused_with_the_reason(sweep_of, tmp_path, text, message):
    with pytest.raises(InputError) as refusal:
        prepare_sweep(sweep_of(text), 1)
    expected = message.format(file=tmp_path / "sweep.toml", folder=tmp_path)
    assert str(refusal.value)[: len(expected)] == expected
    if not expected.endswith((": ", "; ")):
        assert str(refusal.value) == expected


def test_bins_of_launch_speed_that_all_points_share_are_swept(sweep_of):
    prepared = prepare_sweep(sweep_of(HEAD + STICKING + "[ensemble]\nspeed_bins = 8\n"), 1)
    assert len(prepared.points) == 2


def test_notes_about_scenes_are_said_once(sweep_of):
    text = HEAD + axis("domain.outer_radius", '["3 radii", "10 radii"]')
    (note,) = notes_of(prepare_sweep(sweep_of(text), 1))
    assert note.startswith("point 1: the grid's top, 4 radii from the centre, lies beyond the outer radius")
