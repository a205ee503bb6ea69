"""The body as a viewer sees it: its disc, night side and terminator, and where the Sun stands."""

from math import hypot
from typing import NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patches import Circle, Polygon
from matplotlib.patheffects import withStroke
from matplotlib.transforms import ScaledTranslation, Transform
from numpy.typing import NDArray

from tracer.plots.style import DAY_COLOUR, NIGHT_COLOUR, SMALL_SIZE

Vector = tuple[float, float, float]

LIMB, NIGHT, SUN = "limb of the body", "night side of the body", "direction to the Sun"
"""Names of the artists."""
ON_AXIS = 1e-6
"""Sine of the angle between Sun and line of sight below which the Sun has no direction in the sky."""
STEPS = 90
POINTS_PER_INCH = 72.0


class Disc(NamedTuple):
    """A circle in a picture: its middle rightwards and upwards, and its radius, in body radii."""

    right: float
    up: float
    radius: float

    def meets(self, across: tuple[float, float], along: tuple[float, float]) -> bool:
        """Return whether a part of the circle lies within these limits, rightwards and upwards."""
        beyond = (
            max(low - middle, middle - high, 0.0)
            for middle, (low, high) in ((self.right, across), (self.up, along))
        )
        return hypot(*beyond) < self.radius


BODY = Disc(0.0, 0.0, 1.0)


def night_side(toward_viewer: Vector, up: Vector, right: Vector) -> NDArray[np.float64]:
    """Return the outline of the night side on the disc of a sphere of radius 1.

    The terminator is the great circle at right angles to the Sun, +x; its visible half is an ellipse in the
    sky, and the limb away from the Sun closes the outline.

    Parameters
    ----------
    toward_viewer, up, right : (float, float, float)
        Unit vectors of the image in the Sun-fixed frame.

    Returns
    -------
    ndarray, shape (corners, 2)
        Rightwards and upwards; an outline without area where the viewer stands at the Sun.
    """
    sunward, depth = sun_in_sky(up, right), toward_viewer[0]
    across = np.array([-sunward[1], sunward[0]])
    angle = np.linspace(0.0, np.pi, STEPS + 1)[:, np.newaxis]
    limb = np.cos(angle) * across - np.sin(angle) * sunward
    terminator = np.cos(angle) * across - depth * np.sin(angle) * sunward
    return np.concatenate([limb, terminator[::-1]])


def sun_in_sky(up: Vector, right: Vector) -> NDArray[np.float64]:
    """Return the unit vector (rightwards, upwards) toward the Sun in the sky; rightwards where it has none."""
    x, y = right[0], up[0]
    length = hypot(x, y)
    return np.array([1.0, 0.0]) if length < ON_AXIS else np.array([x / length, y / length])


def draw_body(axes: Axes, toward_viewer: Vector, up: Vector, right: Vector, disc: Disc = BODY) -> None:
    """Draw a solid sphere, day side light and night side dark."""
    middle, radius = (disc.right, disc.up), disc.radius
    outline = middle + radius * night_side(toward_viewer, up, right)
    axes.add_patch(Circle(middle, radius, facecolor=DAY_COLOUR, linewidth=0.0, zorder=3.0))
    axes.add_patch(Polygon(outline, facecolor=NIGHT_COLOUR, linewidth=0.0, gid=NIGHT, zorder=3.1))
    axes.add_patch(Circle(middle, radius, fill=False, edgecolor="black", linewidth=0.5, gid=LIMB, zorder=3.2))


def draw_disc(axes: Axes, toward_viewer: Vector, up: Vector, right: Vector, disc: Disc = BODY) -> None:
    """Draw limb and terminator over an image and darken the night side; what lies before the disc shows through."""
    middle = (disc.right, disc.up)
    outline = middle + disc.radius * night_side(toward_viewer, up, right)
    axes.add_patch(Polygon(outline, facecolor="black", alpha=0.4, linewidth=0.0, gid=NIGHT, zorder=3.0))
    for patch in (
        Polygon(outline, fill=False, edgecolor="white", linewidth=0.4, zorder=3.1),
        Circle(middle, disc.radius, fill=False, edgecolor="white", linewidth=0.6, gid=LIMB, zorder=3.2),
    ):
        patch.set_path_effects([withStroke(linewidth=1.3, foreground="black")])
        axes.add_patch(patch)


def mark_sun(axes: Axes, toward_viewer: Vector, up: Vector, right: Vector, stretch: float = 1.0) -> None:
    """Mark the direction to the Sun in the upper right corner; the vertical is drawn `stretch` times larger."""
    if hypot(right[0], up[0]) < ON_AXIS:
        words = "Sun behind the viewer" if toward_viewer[0] > 0.0 else "Sun behind the body"
        _letters(axes, words, np.array([-3.0, -3.0]), "right", "top")
        return
    toward_sun = sun_in_sky(up, right) * np.array([1.0, stretch])
    toward_sun /= hypot(*toward_sun)
    x, y = toward_sun
    # As near to the corner as neither the tip of the arrow nor the word behind its tail leaves the axes.
    middle = np.array([min(-6.0 - 8.0 * x, -10.0 + 14.0 * x), min(-6.0 - 8.0 * y, -7.0 + 10.5 * y)])
    arrow = axes.annotate(
        "",
        xy=(1.0, 1.0),
        xycoords=_from_corner(axes, middle + 8.0 * toward_sun),
        xytext=(1.0, 1.0),
        textcoords=_from_corner(axes, middle - 6.0 * toward_sun),
        arrowprops={
            "arrowstyle": "-|>",
            "linewidth": 0.8,
            "shrinkA": 0.0,
            "shrinkB": 0.0,
            "mutation_scale": 6.0,
        },
        gid=SUN,
        zorder=5.0,
    )
    if arrow.arrow_patch is not None:
        arrow.arrow_patch.set(color="black", path_effects=[withStroke(linewidth=2.8, foreground="white")])
    _letters(axes, "Sun", middle - toward_sun * np.array([14.0, 10.5]), "center", "center")


def _letters(axes: Axes, words: str, points: NDArray[np.float64], across: str, along: str) -> None:
    axes.annotate(
        words,
        xy=(1.0, 1.0),
        xycoords=_from_corner(axes, points),
        ha=across,
        va=along,
        fontsize=SMALL_SIZE,
        path_effects=[withStroke(linewidth=2.5, foreground="white")],
        zorder=5.0,
    )


def _from_corner(axes: Axes, points: NDArray[np.float64]) -> Transform:
    """Return the axes' own coordinates moved by `points` [pt], so that the upper right corner is (1, 1)."""
    inches = points / POINTS_PER_INCH
    return axes.transAxes + ScaledTranslation(inches[0], inches[1], axes.figure.dpi_scale_trans)
