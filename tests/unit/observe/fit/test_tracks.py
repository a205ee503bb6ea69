"""Where the points of a profile lie in the sky, by view and axis."""

import math

import numpy as np
import pytest

from tracer.errors import InputError
from tracer.observe.fit.sky import Scale, aperture_of, metres, track_of, view_of
from tracer.observe.observationspec.observation import parse_observation
from tracer.units import Quantity

OBSERVATION = """
[profile]
file = "p.csv"
position = "x_km"
value = "b_kR"
sigma = "s_kR"
quantity = "brightness"
line = "na_d2"
AXIS
[view]
VIEW
[slit]
width = "1 km"
length = "2 km"
SLIT
"""
SCALE = Scale(100.0, None, "o.toml")
POSITIONS = np.array([0.0, 10.0])


def spec_of(axis='along = "downtail"', view='look_from = "north"', slit=""):
    text = OBSERVATION.replace("AXIS", axis).replace("VIEW", view).replace("SLIT", slit)
    return parse_observation(text, "o.toml")


def places(axis, view):
    spec = spec_of(axis, view)
    track = track_of(spec, view_of(spec.view), SCALE, POSITIONS)
    return np.stack([track.h, track.v], axis=1)


@pytest.mark.parametrize(
    ("axis", "view", "expected"),
    [
        # Seen from north the Sun is at the right and dusk up; from dusk the Sun is at the left and north up.
        ('along = "downtail"', 'look_from = "north"', [[0, 0], [-10, 0]]),
        ('along = "downtail"', 'look_from = "dusk"', [[0, 0], [10, 0]]),
        ('along = "downtail"', 'look_from = "dawn"', [[0, 0], [-10, 0]]),
        # To the left of the way down the tail is south here, dawn.
        ('along = "downtail"\noffset = "3 m"', 'look_from = "north"', [[0, -3], [-10, -3]]),
        ('along = "altitude"\nside = "dawn"', 'look_from = "north"', [[0, -100], [0, -110]]),
        ('along = "altitude"\nside = "sunward"', 'look_from = "dusk"', [[-100, 0], [-110, 0]]),
        ('along = "altitude"\nside = "north"', 'phase_angle = "60 deg"', [[0, 100], [0, 110]]),
        (
            'along = "slit"\ndirection = "90 deg"\nthrough = ["5 m", "1 radii"]',
            'look_from = "sun"',
            [[5, 100], [5, 110]],
        ),
    ],
)
def test_points_lie_where_axis_and_view_put_them(axis, view, expected):
    np.testing.assert_allclose(places(axis, view), expected, atol=1e-9)


def test_phase_angle_is_that_between_sun_and_viewer():
    spec = spec_of(view='phase_angle = "60 deg"\nside = "dawn"')
    view = view_of(spec.view)
    np.testing.assert_allclose(view.toward_viewer, [0.5, -math.sqrt(0.75), 0.0], atol=1e-12)
    same = view_of(spec_of(view='phase_angle = "90 deg"').view)
    np.testing.assert_allclose(
        same.toward_viewer, view_of(spec_of(view='look_from = "dusk"').view).toward_viewer
    )


def test_axis_along_the_line_of_sight_is_refused():
    with pytest.raises(InputError, match=r"o\.toml: profile\.along: the viewer looks along the tail's axis"):
        places('along = "downtail"', 'look_from = "midnight"')
    with pytest.raises(InputError, match=r"profile\.side: the viewer looks along the north side"):
        places('along = "altitude"\nside = "north"', 'look_from = "south"')


@pytest.mark.parametrize(
    ("slit", "turn"), [("", 0.0), ('orientation = "across"', 90.0), ('orientation = "30 deg"', 30.0)]
)
def test_slit_lies_along_across_or_aslant_of_the_profile(slit, turn):
    spec = spec_of(slit=slit)
    aperture = aperture_of(spec.slit, SCALE, math.pi)
    assert (aperture.length, aperture.width) == (2000.0, 1000.0)
    assert aperture.angle == pytest.approx(math.pi + math.radians(turn))


def test_angles_are_lengths_at_the_observers_distance():
    # The parsec: 1 au under 1 arcsec at 206,264.8 au (IAU 2015 resolution B2).
    au = 1.495978707e11
    assert metres(Quantity(1.0, "arcsec"), Scale(1.0, 206264.80625 * au, "o.toml")) == pytest.approx(
        au, rel=1e-9
    )
    assert metres(Quantity(2.0, "radii"), SCALE) == 200.0
    with pytest.raises(InputError, match=r"o\.toml: view\.distance: missing"):
        metres(Quantity(1.0, "arcsec"), SCALE)
