"""Where lines of sight start, come nearest and end, and where the Sun stands."""

import numpy as np
import pytest

from tracer.errors import InputError
from tracer.observe.sightlines import sightlines
from tracer.tally.axes import make_grid

RADIUS = 2e6
GRID = make_grid(RADIUS, 1e5, 4e6, 6, 4, 6)


@pytest.fixture
def product(filled):
    return filled(GRID, np.full((1, 6, 4, 6), 1e8), sun_distance=5e10)


def one_ray(observer, **rest) -> dict[str, list]:
    names = ("observer_x_km", "observer_y_km", "observer_z_km")
    return {
        **{name: [value] for name, value in zip(names, observer, strict=True)},
        **{name: [value] for name, value in rest.items()},
    }


def look(x, y, z) -> dict[str, float]:
    return {"look_x": x, "look_y": y, "look_z": z}


def test_limb_is_found_where_it_was_asked_for(product):
    asked = {"tangent_altitude_km": 300.0, "tangent_latitude_deg": 20.0, "tangent_local_time_h": 7.5}
    by_tangent = sightlines(product, one_ray((9000.0, 1000.0, -3000.0), **asked))
    # The same line by hand: P, the way to it without its part along P, and the start at P minus that.
    theta, phi = np.radians(20.0), np.radians((7.5 - 12.0) * 15.0)
    tangent = 2300.0 * np.array([np.cos(theta) * np.cos(phi), np.cos(theta) * np.sin(phi), np.sin(theta)])
    way = tangent - np.array([9000.0, 1000.0, -3000.0])
    way -= (way @ tangent) / (tangent @ tangent) * tangent
    by_look = sightlines(product, one_ray(tangent - way, **look(*way)))
    for name, value in asked.items():
        assert by_tangent[name][0] == value
        assert by_look[name][0] == pytest.approx(value, rel=1e-12)
    for name in ("column_m2", "solar_zenith_angle_deg", "sun_angle_deg", "outside_share"):
        assert by_look[name][0] == pytest.approx(by_tangent[name][0], rel=1e-12)
    chord = 2.0 * np.sqrt(6e6**2 - 2.3e6**2)
    assert by_tangent["column_m2"][0] == pytest.approx(1e8 * chord, rel=1e-12)


def test_blocked_line_has_a_negative_tangent_altitude_and_ends_at_the_ground(product):
    table = sightlines(product, one_ray((5000.0, 0.0, 1000.0), **look(-1.0, 0.0, 0.0)))
    assert table["ends_at_body"][0]
    assert table["tangent_altitude_km"][0] == pytest.approx(-1000.0)
    assert table["tangent_latitude_deg"][0] == pytest.approx(90.0)
    assert table["column_m2"][0] == pytest.approx(1e8 * (5e6 - np.sqrt(4e12 - 1e12)), rel=1e-12)


def test_observer_who_looks_away_is_nearest_himself(product):
    table = sightlines(product, one_ray((0.0, 3000.0, 0.0), **look(0.0, 2.0, 0.0)))
    assert not table["ends_at_body"][0]
    assert table["tangent_altitude_km"][0] == pytest.approx(1000.0)
    assert table["tangent_local_time_h"][0] == pytest.approx(18.0)
    assert table["column_m2"][0] == pytest.approx(1e8 * 3e6, rel=1e-12)


def test_sun_stands_at_its_distance(product, filled):
    rays = one_ray((0.0, 4e6, 0.0), **look(1.0, 0.0, 0.0))
    near = sightlines(product, rays)["sun_angle_deg"][0]
    assert near == pytest.approx(np.degrees(np.arctan2(4e9, 5e10)), rel=1e-12)
    far = filled(GRID, np.full((1, 6, 4, 6), 1e8))
    assert sightlines(far, rays)["sun_angle_deg"][0] == pytest.approx(0.0, abs=1e-9)


def test_solar_zenith_angle_is_that_of_the_tangent_point(product):
    table = sightlines(product, one_ray((3000.0, 1e4, 0.0), **look(0.0, -1.0, 0.0)))
    assert table["solar_zenith_angle_deg"][0] == pytest.approx(0.0, abs=1e-9)
    # Seen from 3000 km on +y the Sun at 5e10 m stands arctan(3e6/5e10) below the terminator's plane.
    table = sightlines(product, one_ray((1e4, 3000.0, 0.0), **look(-1.0, 0.0, 0.0)))
    assert table["solar_zenith_angle_deg"][0] == pytest.approx(90.0 + np.degrees(np.arctan(3e6 / 5e10)))


def test_part_in_the_umbra_is_not_lit(filled):
    # Along the axis behind the body, to the tip of the umbra and beyond: R / sin, sin = (R_sun - R) / d.
    grid = make_grid(RADIUS, 1e5, 8e7, 8, 4, 6)
    ds = filled(grid, np.full((1, 8, 4, 6), 1e8), sun_distance=1e10)
    table = sightlines(ds, one_ray((-81000.0, 0.0, 0.0), **look(1.0, 0.0, 0.0)))
    tip = RADIUS / ((6.957e8 - RADIUS) / 1e10)
    assert table["column_m2"][0] == pytest.approx(1e8 * (8.1e7 - RADIUS), rel=1e-12)
    assert table["column_lit_m2"][0] == pytest.approx(1e8 * (8.1e7 - tip), rel=1e-9)
    beside = sightlines(ds, one_ray((-81000.0, 2001.0, 0.0), **look(1.0, 0.0, 0.0)))
    assert beside["column_lit_m2"][0] == beside["column_m2"][0]


def test_umbra_without_a_known_distance_is_a_cylinder(filled):
    ds = filled(GRID, np.full((1, 6, 4, 6), 1e8))
    table = sightlines(ds, one_ray((-3000.0, 5000.0, 0.0), **look(0.0, -1.0, 0.0)))
    chord = 5e6 + np.sqrt(6e6**2 - 3e6**2)
    assert table["column_m2"][0] == pytest.approx(1e8 * chord, rel=1e-12)
    assert table["column_lit_m2"][0] == pytest.approx(1e8 * (chord - 2.0 * RADIUS), rel=1e-12)


def test_single_cell_is_a_grid_too(filled):
    ds = filled(make_grid(RADIUS, 1e5, 4e6, 1, 1, 1), np.full((1, 1, 1, 1), 1e8))
    table = sightlines(ds, one_ray((9e3, 0.0, 3e3), **look(-1.0, 0.0, 0.0)))
    assert table["column_m2"][0] == pytest.approx(2e8 * np.sqrt(6e6**2 - 3e6**2), rel=1e-12)


def test_share_outside_is_that_of_the_path_through_traced_space(filled):
    run_file = '[domain]\nouter_radius = "10 radii"\n'
    ds = filled(GRID, np.full((1, 6, 4, 6), 1e8), run_file=run_file)
    through = sightlines(ds, one_ray((0.0, 0.0, 9e4), **look(0.0, 0.0, -1.0)))
    assert through["outside_share"][0] == pytest.approx((2e7 - 6e6) / (2e7 - RADIUS))
    missing = sightlines(ds, one_ray((7000.0, 0.0, 9e4), **look(0.0, 0.0, -1.0)))
    assert missing["outside_share"][0] == 1.0
    assert missing["column_m2"][0] == 0.0
    inside = sightlines(ds, one_ray((0.0, 0.0, 4000.0), **look(0.0, 0.0, -1.0)))
    assert inside["outside_share"][0] == 0.0


@pytest.mark.parametrize(
    ("rays", "message"),
    [
        (
            {"observer_x_km": [5e3], "observer_y_km": [0.0], **{f"look_{i}": [1.0] for i in "xyz"}},
            "column observer_z_km: missing; the table has observer_x_km, observer_y_km, look_x, look_y, look_z",
        ),
        (
            {k: [*v, *v] for k, v in one_ray((5e3, 0.0, 0.0)).items()},
            "columns look_x, look_y, look_z, or tangent_altitude_km, tangent_latitude_deg, tangent_local_time_h: "
            "missing; the table has observer_x_km",
        ),
        (
            one_ray((5e3, np.nan, 0.0), **look(1.0, 0.0, 0.0)),
            "row 1, column observer_y_km: nan is not allowed",
        ),
        (one_ray((5e3, 0.0, 0.0), **look(1.0, np.inf, 0.0)), "row 1, column look_y: inf is not allowed"),
        (one_ray((5e3, 0.0, 0.0), **look("a", 1.0, 0.0)), 'row 1, column look_x: "a" is not a number'),
        (
            one_ray((1e3, 0.0, 1e3), **look(1.0, 0.0, 0.0)),
            "row 1, columns observer_x_km, observer_y_km, observer_z_km: the observer is inside the body, 585.786 km",
        ),
        (
            {k: [*v, *v] for k, v in one_ray((5e3, 0.0, 0.0), **look(0.0, 0.0, 0.0)).items()},
            "row 1, columns look_x, look_y, look_z: the look vector has no length",
        ),
        (
            {
                **{k: [*v, *v, *v] for k, v in one_ray((5e3, 0.0, 0.0), **look(0.0, 1.0, 0.0)).items()},
                "time": [0.0, 5.0, 4.0],
            },
            "row 3, column time: 4.0 is earlier than 5.0 in row 2; times must rise",
        ),
        (
            one_ray(
                (5e3, 0.0, 0.0), tangent_altitude_km=1e3, tangent_latitude_deg=0.0, tangent_local_time_h=12.0
            ),
            "row 1, columns tangent_altitude_km, tangent_latitude_deg, tangent_local_time_h: the tangent point lies "
            "straight below",
        ),
        (
            one_ray(
                (5e3, 0.0, 0.0), tangent_altitude_km=1e3, tangent_latitude_deg=91.0, tangent_local_time_h=12.0
            ),
            "row 1, column tangent_latitude_deg: 91 is not allowed; must be from -90 to 90",
        ),
        (
            {**one_ray((5e3, 0.0, 0.0), **look(1.0, 0.0, 0.0)), "column_m2": [1.0]},
            "column column_m2: is one of the results",
        ),
        (one_ray((5e3, 0.0, 0.0), **look([1.0, 2.0], 0.0, 0.0)), "column look_x: must hold one number a row"),
        ({}, "the table has no rows"),
    ],
)
def test_bad_rays_are_refused_with_row_and_column(product, rays, message):
    with pytest.raises(InputError) as refused:
        sightlines(product, rays)
    assert str(refused.value).startswith(message)


def test_unknown_line_is_refused(filled):
    dark = filled(GRID, np.ones((1, 6, 4, 6)))
    rays = one_ray((5e3, 0.0, 0.0), **look(1.0, 0.0, 0.0))
    with pytest.raises(InputError, match='no line "na_d2": the gas of this product has no lines'):
        sightlines(dark, rays, lines=["na_d2"])
    bright = filled(GRID, np.ones((1, 6, 4, 6)), np.ones((1, 1, 6, 4, 6)))
    with pytest.raises(InputError, match='no line "na_d3"; allowed: "na_d2"'):
        sightlines(bright, rays, lines=["na_d3"])


def test_errors_without_replicates_are_refused_and_can_be_left_out(product):
    bare = product.drop_vars("number_density_replicates")
    rays = one_ray((5e3, 0.0, 0.0), **look(-1.0, 0.1, 0.0))
    with pytest.raises(InputError, match="there are no number_density_replicates"):
        sightlines(bare, rays)
    table = sightlines(bare, rays, errors=False)
    assert "column_standard_error_m2" not in table.colnames
    assert table["column_m2"][0] == sightlines(product, rays)["column_m2"][0]
