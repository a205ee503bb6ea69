"""What the ground is like before anything is traced: its temperatures and who sticks."""

from math import pi
from typing import NamedTuple

import numpy as np

from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import Scene
from tracer.engine.surface_temperature import synodic_rate
from tracer.kernels.sticking import sticking_probability
from tracer.kernels.temperature import MAP, SurfaceTemperature, temperature, temperatures
from tracer.tally.axes import VIEWERS, direction

TRIAL_LATITUDES = np.linspace(-90.0, 90.0, 181)
TRIAL_HOURS = np.arange(0.0, 24.0, 0.25)
"""Where formulas are tried for their extremes; both the subsolar point and the poles are among the places."""


class SurfacePreview(NamedTuple):
    """The ground; what needs a temperature is None where it has none.

    `temperature_law` is the run file's word; `noon_temperature` and `midnight_temperature` [K] on the equator; the
    lowest and the highest [K] anywhere; the range of the sticking probability over the ground; `solar_day` [s], the
    mean time from noon to noon, None without a Sun, without rotation, or where it never ends.
    """

    temperature_law: str | None
    noon_temperature: float | None
    midnight_temperature: float | None
    lowest_temperature: float | None
    highest_temperature: float | None
    lowest_sticking: float
    highest_sticking: float
    solar_day: float | None


def preview_surface(spec: RunSpec, scene: Scene) -> SurfacePreview:
    """Return the figures of the ground of `scene`."""
    law, table = scene.surface_temperature, spec.surface.temperature
    day = _solar_day(scene)
    if law is None or table is None:
        value = scene.sticking.value
        return SurfacePreview(None, None, None, None, None, value, value, day)
    lowest, highest = _extremes(law)
    return SurfacePreview(
        temperature_law=table.law,
        noon_temperature=float(temperature(law, *VIEWERS["sun"])),
        midnight_temperature=float(temperature(law, *VIEWERS["midnight"])),
        lowest_temperature=lowest,
        highest_temperature=highest,
        lowest_sticking=float(sticking_probability(scene.sticking, highest)),
        highest_sticking=float(sticking_probability(scene.sticking, lowest)),
        solar_day=day,
    )


def _extremes(law: SurfaceTemperature) -> tuple[float, float]:
    if law.law >= MAP:
        return float(law.table.values.min()), float(law.table.values.max())
    places = np.array([direction(latitude, hour) for latitude in TRIAL_LATITUDES for hour in TRIAL_HOURS])
    kelvin = temperatures(law, places)
    return float(kelvin.min()), float(kelvin.max())


def _solar_day(scene: Scene) -> float | None:
    rate = None if scene.sun is None else synodic_rate(scene.body, scene.sun)
    return 2.0 * pi / abs(rate) if rate else None
