"""Figures against what varies show what each point's own product holds."""

from functools import cache

import numpy as np
import pytest
import xarray as xr

from tracer.errors import InputError
from tracer.plots.saving import figure_bytes
from tracer.plots.swept import axes
from tracer.plots.swept.brightness import SkyPlace, swept_brightness
from tracer.plots.swept.column import Place, swept_column
from tracer.plots.swept.ledger import swept_ledger
from tracer.plots.swept.tail import length_above, swept_tail
from tracer.product.layout import REPLICATES, STANDARD_ERROR

IMAGE = "tail_from_north"
ANOMALIES = (0.0, 90.0, 180.0)
WIDTHS = ("column", "full")


def scaled(product, factor: float):
    """Return a product all of whose tallied variables are `factor` times as large."""
    more = product.copy(deep=True)
    for name in map(str, product.data_vars):
        if name + STANDARD_ERROR in product:
            for ending in ("", STANDARD_ERROR, REPLICATES):
                if name + ending in more:
                    more[name + ending].values[...] *= factor
    return more


def falling(product, scale: float, radius: float):
    """Return a product whose images fall off behind the body as exp(-distance/scale), distances in body radii."""
    made = product.copy(deep=True)
    shape = np.exp(product[f"{IMAGE}_horizontal"].values / radius / scale)
    for name in (f"column_{IMAGE}", f"brightness_{IMAGE}"):
        made[name].values[...] = 1e3 * shape
        made[name + REPLICATES].values[...] = 1e3 * shape
    return made


@pytest.fixture(scope="module")
def seasons(make_product, swept, axis):
    """Return a sweep over three true anomalies, each with twice as much gas as the one before."""
    product = make_product(("impact vapour", "sputtering"), views={IMAGE: "north", "from_the_sun": "sun"})
    points = [scaled(product, 2.0**i) for i in range(3)]
    return swept(points, axis("true_anomaly", ANOMALIES, units="degree", written_unit="deg"))


def lines_of(figure):
    """Return x and y of the points of each line with error bars."""
    lines = [one.lines[0].get_xydata() for one in figure.axes[0].containers if one.lines[0] is not None]
    return [line[np.isfinite(line[:, 1])] for line in lines]


def bars_of(figure):
    """Return the half lengths of each line's error bars."""
    found = []
    for one in figure.axes[0].containers:
        segments = np.array(one.lines[2][0].get_segments())
        half = 0.5 * (segments[:, 1, 1] - segments[:, 0, 1])
        found.append(half[np.isfinite(half)])
    return found


@pytest.mark.parametrize("width", WIDTHS)
def test_shares_are_those_of_each_point(seasons, width):
    figure = swept_ledger(seasons, width=width)
    rates = seasons.ledger.sum("release")
    shares = 100.0 * rates / rates.sum("fate")
    for found, fate in zip(lines_of(figure), seasons.fate_name.values, strict=True):
        np.testing.assert_allclose(found[:, 0], ANOMALIES)
        np.testing.assert_allclose(found[:, 1], shares.sel(fate=str(fate)).values)
    assert figure.axes[0].get_xlabel() == "True anomaly (deg)"
    assert figure_bytes(figure, ".svg").startswith(b"<?xml")


def test_errors_of_shares_add_as_those_of_independent_releases(seasons):
    (bars,) = bars_of(swept_ledger(seasons, fate="escaped"))
    errors = np.hypot(*seasons.ledger_standard_error.sel(fate="escaped").transpose("release", ...).values)
    np.testing.assert_allclose(bars, 100.0 * errors / seasons.ledger.sum(("release", "fate")).values)


def test_one_release_is_drawn_where_it_is_asked_for(seasons):
    (line,) = lines_of(swept_ledger(seasons, "sputtering", "escaped"))
    rates = seasons.ledger.sel(release="sputtering")
    np.testing.assert_allclose(line[:, 1], (100.0 * rates.sel(fate="escaped") / rates.sum("fate")).values)


def test_columns_are_means_over_the_day_and_the_night(seasons):
    day, night = lines_of(swept_column(seasons))
    column = seasons.vertical_column.sum("release") * 1e-4
    # Cells of four hours: those from 4 to 8 h and from 16 to 20 h lie half on either side.
    by_day = xr.DataArray([0.0, 0.5, 1.0, 1.0, 0.5, 0.0], dims="local_time")
    for line, cells in ((day, by_day), (night, 1.0 - by_day)):
        mean = column.weighted(seasons.cell_area * cells).mean(("latitude", "local_time"))
        np.testing.assert_allclose(line[:, 1], mean.values)
    np.testing.assert_allclose(day[1:, 1] / day[:-1, 1], 2.0)


def test_column_of_one_place_is_that_of_its_cell_with_its_own_error(seasons):
    place = Place(float(seasons.latitude[2]), float(seasons.local_time[1]))
    figure = swept_column(seasons, place=place)
    (line,), (bars,) = lines_of(figure), bars_of(figure)
    at = {"latitude": 2, "local_time": 1}
    np.testing.assert_allclose(line[:, 1], seasons.vertical_column.isel(at).sum("release").values * 1e-4)
    spread = seasons.vertical_column_replicates.isel(at).sum("release").std("replicate", ddof=1)
    np.testing.assert_allclose(bars, spread.values * 1e-4 / np.sqrt(seasons.sizes["replicate"]), rtol=1e-5)


def test_place_beyond_the_poles_is_refused(seasons):
    with pytest.raises(InputError, match="no place at latitude 91 deg and local time 0 h"):
        swept_column(seasons, place=Place(91.0, 0.0))


def test_brightness_is_that_of_the_pixel_that_holds_the_place(seasons):
    figure = swept_brightness(seasons, IMAGE, "na_d1", place=SkyPlace(-1.4, 0.9))
    (line,) = lines_of(figure)
    right = int(np.argmin(np.abs(seasons[f"{IMAGE}_horizontal"].values / 1.8e6 + 1.4)))
    up = int(np.argmin(np.abs(seasons[f"{IMAGE}_vertical"].values / 1.8e6 - 0.9)))
    pixel = {f"{IMAGE}_horizontal": right, f"{IMAGE}_vertical": up}
    stored = seasons[f"brightness_{IMAGE}"].sel(line="na_d1").isel(pixel).sum("release")
    np.testing.assert_allclose(line[:, 1], stored.values * 1e-3)


def test_brightest_pixel_of_the_first_point_is_drawn_unasked(seasons):
    (line,) = lines_of(swept_brightness(seasons, IMAGE))
    first = seasons[f"column_{IMAGE}"].isel(true_anomaly=0).sum("release")
    assert line[0, 1] == pytest.approx(float(first.max()) * 1e-4)


def test_place_outside_the_image_is_refused(seasons):
    with pytest.raises(InputError) as refusal:
        swept_brightness(seasons, IMAGE, place=SkyPlace(9.0, 0.0))
    assert str(refusal.value) == (
        'image "tail_from_north" shows nothing at 9, 0; it goes from -4 to 3 body radii rightward and from -2 to 2 '
        "upward"
    )


@pytest.mark.parametrize("level", [300.0, 100.0, 40.0])
def test_length_of_an_exponential_tail_is_its_scale_times_the_logarithm(level):
    places = np.arange(-2.0, 12.0, 0.5) + 0.1
    along = 1e3 * np.exp(-places / 3.0)
    assert length_above(along, places, level) == pytest.approx(3.0 * np.log(1e3 / level), rel=1e-12)


def test_lengths_that_begin_or_end_outside_are_said_so():
    places = np.array([0.5, 1.5, 2.5, 3.5])
    assert length_above(np.array([9.0, 9.0, 9.0, 9.0]), places, 1.0) == 3.5
    assert length_above(np.array([9.0, 0.5, 9.0, 9.0]), places, 1.0) == 0.0
    assert length_above(np.array([0.5, 9.0, 0.0, 9.0]), places, 1.0) == 1.5
    assert length_above(np.array([9.0, 9.0, np.nan, 9.0]), places, 1.0) == 1.5


@pytest.fixture(scope="module")
def tails(make_product, swept, axis):
    """Return a sweep whose tails fall off over 0.8, 1.2 and 1,000 radii."""
    product = make_product(("impact vapour", "sputtering"), views={IMAGE: "north"})
    points = [falling(product, scale, 1.8e6) for scale in (0.8, 1.2, 1000.0)]
    return swept(points, axis("true_anomaly", ANOMALIES, units="degree", written_unit="deg"))


def test_tail_lengths_are_those_of_each_point(tails):
    # Two releases of 1,000 rayleigh, so 2 kR at the centre: down to 0.3 kR a tail is its scale times log(2/0.3) long.
    figure = swept_tail(tails, 0.3, IMAGE, "na_d2")
    line = lines_of(figure)[0]
    np.testing.assert_allclose(line[:2, 1], [0.8 * np.log(2.0 / 0.3), 1.2 * np.log(2.0 / 0.3)], rtol=1e-9)
    assert line[2, 1] == pytest.approx(3.5)
    assert "Arrows: still above the level at the image's end, 3.5 body radii." in _texts(figure)


def test_points_without_a_tail_leave_a_gap(tails):
    figure = swept_tail(tails, 0.4, IMAGE, "na_d2")
    assert [line[:, 0].tolist() for line in lines_of(figure)] == [[90.0, 180.0]]
    assert "Gaps: nowhere behind the body above the level." in _texts(figure)


def test_title_of_a_tail_in_column_density_has_its_unit_in_plain_letters(tails):
    words = _texts(swept_tail(tails, 0.1, IMAGE))
    assert (
        "length of the tail down to 0.1 cm\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT TWO}, column density" in words
    )


def _texts(figure) -> str:
    return " ".join(text.get_text() for text in figure.texts)


def test_error_of_a_tail_length_is_that_of_its_brightness_over_the_slope(make_product, swept, axis):
    # A tail of scale s whose brightness is known to a share e ends within s e.
    product = falling(make_product(replicates=20, views={IMAGE: "north"}), 2.0, 1.8e6)
    share = 0.03 * np.random.default_rng(5).normal(size=(20, 1, 1, 1, 1))
    share -= share.mean()
    product[f"brightness_{IMAGE}{REPLICATES}"].values[...] *= 1.0 + share
    sweep = swept([product, product], axis("true_anomaly", ANOMALIES[:2], units="degree", written_unit="deg"))
    bars = bars_of(swept_tail(sweep, 0.3, IMAGE, "na_d2"))[0]
    expected = 2.0 * share.std(ddof=1) / np.sqrt(20)
    np.testing.assert_allclose(bars, expected, rtol=0.02)


def test_a_level_that_is_missing_or_too_high_is_refused_with_the_range_there_is(tails):
    with pytest.raises(
        InputError, match=r"--level is needed, in kR: how bright a tail counts; the tails show .* to .* kR"
    ):
        swept_tail(tails, None, IMAGE, "na_d2")
    with pytest.raises(InputError, match=r"no tail reaches the level of 5 kR; the tails show"):
        swept_tail(tails, 5.0, IMAGE, "na_d2")


@pytest.fixture(scope="module")
def two(make_product, swept, axis):
    """Return a function that makes a sweep over two dimensions of the given lengths, no two points alike."""
    product = make_product(lines=(), views={IMAGE: "north"})

    @cache
    def make(temperatures: int, stickings: int):
        points = [scaled(product, 1.0 + i) for i in range(temperatures * stickings)]
        first = axis(
            "temperature", [300.0 * 2.0**i for i in range(temperatures)], units="K", written_unit="K"
        )
        second = axis("sticking", [0.1 * (i + 1) for i in range(stickings)], units="1")
        return swept(points, first, second)

    return make


@pytest.mark.parametrize("width", WIDTHS)
def test_the_shorter_of_two_dimensions_becomes_lines(two, width):
    sweep = two(2, 4)
    found = lines_of(swept_column(sweep, place=Place(10.0, 5.0), width=width))
    assert [len(line) for line in found] == [4, 4]
    cell = sweep.vertical_column.sel(latitude=10.0, local_time=5.0, method="nearest").sum("release") * 1e-4
    for line, row in zip(found, cell.values, strict=True):
        np.testing.assert_allclose(line[:, 0], sweep.sticking.values)
        np.testing.assert_allclose(line[:, 1], row)


@pytest.mark.parametrize("width", WIDTHS)
def test_many_values_of_both_become_a_map(two, width, monkeypatch):
    monkeypatch.setattr(axes, "MOST_LINES", 2)
    sweep = two(3, 3)
    figure = swept_column(sweep, place=Place(10.0, 5.0), width=width)
    (mesh,) = figure.axes[0].collections[:1]
    cell = sweep.vertical_column.sel(latitude=10.0, local_time=5.0, method="nearest").sum("release") * 1e-4
    # Rows are those of the second dimension, upwards.
    np.testing.assert_allclose(np.asarray(mesh.get_array()).reshape(3, 3), cell.values.T)
    assert figure.axes[0].get_xlabel() == "Temperature (K)"
    assert figure.axes[0].get_ylabel() == "Sticking"
    assert figure_bytes(figure, ".png", 50)


def test_values_in_equal_ratios_lie_on_a_logarithmic_axis(make_product, swept, axis):
    product = make_product(lines=(), views={})
    for numbers, scale in (
        ([1e23, 1e24, 1e25], "log"),
        ([1.0, 2.0, 4.0], "linear"),
        ([1.0, 50.0, 99.0], "linear"),
    ):
        figure = swept_ledger(swept([product] * 3, axis("rate", numbers, units="s-1", written_unit="s-1")))
        assert figure.axes[0].get_xscale() == scale


def test_three_dimensions_are_refused(make_product, swept, axis):
    sweep = swept(
        [make_product(lines=(), views={})] * 2,
        axis("one", [1.0, 2.0]),
        axis("two", [1.0]),
        axis("three", [1.0]),
    )
    with pytest.raises(
        InputError, match="the sweep has 3 dimensions, one, two, three; a figure shows at most two"
    ):
        swept_ledger(sweep)


def test_paired_values_are_drawn_in_rising_order_and_what_goes_along_is_said(make_product, swept, axis):
    product = make_product(lines=(), views={})
    points = [scaled(product, factor) for factor in (3.0, 1.0, 2.0)]
    place = axis("place", ["a", "b", "c"], "point")
    sweep = swept(points, axis("rate", [3e24, 1e24, 2e24], "point", units="s-1", written_unit="s-1"), place)
    figure = swept_column(sweep, place=Place(10.0, 5.0))
    (line,) = lines_of(figure)
    np.testing.assert_allclose(line[:, 0], [1e24, 2e24, 3e24])
    np.testing.assert_allclose(line[:, 1] / line[0, 1], [1.0, 2.0, 3.0])
    assert "With rate varies: place." in _texts(figure)


def test_words_stand_at_places_of_their_own(make_product, swept, axis):
    product = make_product(lines=(), views={})
    sweep = swept([product, scaled(product, 2.0)], axis("species", ["Na", "He"]))
    assert sweep.sel(species="He").ledger.sum() == pytest.approx(
        2.0 * float(sweep.sel(species="Na").ledger.sum())
    )
    figure = swept_column(sweep)
    assert [label.get_text() for label in figure.axes[0].get_xticklabels()] == ["Na", "He"]


def test_values_are_shown_in_the_unit_in_which_they_were_written(make_product, swept, axis):
    product = make_product(lines=(), views={})
    for written, unit, si, shown in (
        ("au", "m", 1.495978707e11, 1.0),
        ("radii", "m", 1.8e7, 10.0),
        ("rad", "degree", 180.0, np.pi),
    ):
        sweep = swept([product, product], axis("far", [si, 2.0 * si], units=unit, written_unit=written))
        np.testing.assert_allclose(lines_of(swept_column(sweep))[0][:, 0], [shown, 2.0 * shown], rtol=1e-9)


def test_without_replicates_there_are_no_bars_and_the_caption_says_so(make_product, swept, axis):
    product = make_product(replicates=0, lines=(), views={})
    figure = swept_column(swept([product, product], axis("sticking", [0.1, 0.2])))
    assert all(np.all(bars == 0.0) for bars in bars_of(figure))
    assert "No error bands: the product keeps no replicates" in _texts(figure)


def test_points_in_which_nothing_was_counted_are_left_out(make_product, empty, swept, axis):
    product = make_product(lines=(), views={})
    sweep = swept([empty(product), product], axis("sticking", [0.1, 0.2]))
    assert [len(line) for line in lines_of(swept_column(sweep))] == [1, 1]
    nothing = swept([empty(product)] * 2, axis("sticking", [0.1, 0.2]))
    assert "nothing counted" in " ".join(text.get_text() for text in swept_column(nothing).axes[0].texts)


@pytest.mark.parametrize(
    ("draw", "message"),
    [
        (
            lambda ds: swept_ledger(ds, "nobody"),
            'there is no release "nobody"; allowed: "impact vapour", "sputtering"',
        ),
        (lambda ds: swept_ledger(ds, fate="lost"), 'there is no fate "lost"; allowed: "captured", '),
        (lambda ds: swept_brightness(ds), "the product has 2 images, name one of them: "),
        (
            lambda ds: swept_brightness(ds, IMAGE, "k_d1"),
            'there is no line "k_d1"; allowed: "na_d2", "na_d1"',
        ),
        (lambda ds: swept_tail(ds, 1.0, "from_the_sun"), 'image "from_the_sun" looks along the tail'),
    ],
)
def test_what_a_sweep_does_not_have_is_refused(seasons, draw, message):
    with pytest.raises(InputError) as refusal:
        draw(seasons)
    assert str(refusal.value).startswith(message)


def test_legend_shows_markers_that_grey_print_keeps(seasons):
    handles = swept_ledger(seasons).legends[0].legend_handles
    markers = [one.get_marker() for one in handles]
    assert len(markers) > 1
    assert len(set(markers)) == len(markers)
    assert "" not in markers
