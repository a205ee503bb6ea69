"""The scene: what a run file means, in SI numbers. The only place where units end."""

from pathlib import Path
from typing import NamedTuple

import numpy as np

from tracer.catalogue.load import gases
from tracer.engine.body_constants import BodyConstants, resolve_body
from tracer.engine.ground import (
    ColdTraps,
    Desorption,
    ground_files,
    resolve_cold_traps,
    resolve_desorption,
)
from tracer.engine.laws import direction_law, place_law, speed_law
from tracer.engine.refusal import refuse
from tracer.engine.runspec.grid import GridTable
from tracer.engine.runspec.image import ImageTable, product_name
from tracer.engine.runspec.place import ReleaseMap
from tracer.engine.runspec.release import ReleaseTable
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.speed import TabulatedSpeed
from tracer.engine.runspec.sticking import ExponentialSticking
from tracer.engine.runspec.temperature import TemperatureMap
from tracer.engine.sunlight import Sunlight, g_files, resolve_sunlight
from tracer.engine.surface_temperature import surface_temperature
from tracer.inputs.sky import SkyPoint
from tracer.kernels.sticking import Sticking
from tracer.kernels.temperature import SurfaceTemperature
from tracer.physics.host import MoonPlace, moon_without_sun
from tracer.physics.lines import VelocityTable
from tracer.physics.orbit import hill_radius
from tracer.physics.release.laws import DirectionLaw, PlaceLaw, SpeedLaw
from tracer.product.layout import variable_names
from tracer.tally.axes import Grid, ImagePlane, make_grid, make_image_plane, viewer_direction
from tracer.units import si

_BY_FILE = TabulatedSpeed | ReleaseMap | TemperatureMap

FARTHEST = 1e8
"""Largest outer radius in radii: beyond it an arc's end loses the digits that landing and escape promise."""


class Release(NamedTuple):
    """One source: `rate` [s-1] of new atoms and the laws by which they leave.

    A rate that `follows_distance` is that at the stated position and goes with the inverse square of the body's
    distance from the Sun as the body moves.
    """

    name: str
    rate: float
    follows_distance: bool
    speed: SpeedLaw
    direction: DirectionLaw
    place: PlaceLaw


class Loss(NamedTuple):
    """A loss in flight: `rate` [s-1], at 1 au where it goes with the `inverse_square` of the distance from the Sun.

    One that acts `in_sunlight` goes with the visible part of the Sun's disc.
    """

    name: str
    rate: float
    inverse_square: bool
    in_sunlight: bool

    @property
    def constant(self) -> bool:
        """Whether the rate is the same wherever an atom is."""
        return not (self.inverse_square or self.in_sunlight)


class Scene(NamedTuple):
    """All that decides the physics and the cells of a run, in SI units.

    `sun` is None where there is no Sun: no light, no tide, no turning frame. `body` holds the constants of the body,
    `mass` [kg] of one atom; `surface_temperature` is None where nothing needs it, `desorption` where adsorbed atoms are
    kept for good, `cold_traps` where there are none; `outer_radius` [m] from the centre, `age_limit` [s]; `emphasis`
    says which launches are sampled densely, "even" or "far", `speed_bins` how many bins of launch speed have their
    responses kept, 0 for none; `moon` is where the body stands beside its host, None where it has none.
    """

    body: BodyConstants
    sun: Sunlight | None
    mass: float
    losses: tuple[Loss, ...]
    releases: tuple[Release, ...]
    surface_temperature: SurfaceTemperature | None
    sticking: Sticking
    accommodation: float
    desorption: Desorption | None
    cold_traps: ColdTraps | None
    outer_radius: float
    age_limit: float
    grid: Grid
    planes: tuple[ImagePlane, ...]
    emphasis: str
    speed_bins: int
    moon: MoonPlace | None

    @property
    def lines(self) -> tuple[VelocityTable, ...]:
        """Emission lines with known g; without a Sun nothing shines."""
        return () if self.sun is None else self.sun.lines

    @property
    def constant_hazard(self) -> float:
        """Rate [s-1] of the losses that act everywhere alike."""
        return sum(loss.rate for loss in self.losses if loss.constant)

    @property
    def integrated(self) -> bool:
        """Whether flights must be integrated; else closed-form arcs are exact."""
        if self.moon is not None:
            return True
        if self.sun is None:
            return False
        if self.sun.orbit is not None:
            return True
        return self.sun.matters_in_flight or not all(loss.constant for loss in self.losses)

    @property
    def event_window(self) -> float | None:
        """Time [s] before the stated position in which events count as fluxes; None where the body stands still.

        One degree of the orbit's mean anomaly, or of a moon's phase, but not more than the limit of age.
        """
        if self.sun is None or self.sun.orbit is None:
            return None
        rate = self.sun.orbit.mean_motion
        if self.moon is not None:
            rate = abs(self.moon.rate - rate)
        return float(min(self.age_limit, np.radians(1.0) / rate))

    @property
    def frame_rate(self) -> float:
        """Angular rate [rad s-1] at which the Sun-fixed frame turns about +z; without Sun and host it does not.

        Beside a host it is the moon's about the host, so that the host keeps its place; where the moon moves it is the
        moon's about the Sun, as at the stated position.
        """
        if self.moon is not None:
            moves = self.sun is not None and self.sun.orbit is not None
            return self.moon.station.orbital_rate if moves else self.moon.rate
        return 0.0 if self.sun is None else self.sun.station.orbital_rate

    @property
    def ground_spin(self) -> float:
        """Angular rate [rad s-1] of the ground about +z in the Sun-fixed frame, 0 where it has no rotation period."""
        period = self.body.rotation_period
        return 0.0 if period is None else 2.0 * np.pi / period - self.frame_rate


def build_scene(spec: RunSpec) -> Scene:
    """Resolve a run file into numbers.

    Raises
    ------
    InputError
        A name that is in no catalogue and lacks its constants, a missing outer radius, lengths that do not fit
        the body, or a file that cannot be used.
    """
    body = resolve_body(spec)
    _refuse_colliding_images(spec)
    _refuse_rest_on_uneven_ground(spec)
    _refuse_rest_beside_host(spec)
    sun = resolve_sunlight(spec, body)
    return Scene(
        body=body,
        sun=sun,
        mass=_mass(spec),
        losses=tuple(
            Loss(loss.name, si(loss.rate), loss.scaling == "inverse-square", loss.where == "sunlight")
            for loss in spec.gas.loss
        ),
        releases=tuple(_release(spec, i, entry, body.radius) for i, entry in enumerate(spec.release, 1)),
        surface_temperature=surface_temperature(spec, body, sun),
        sticking=_sticking(spec.surface.sticking),
        accommodation=spec.surface.accommodation,
        desorption=resolve_desorption(spec, sun),
        cold_traps=resolve_cold_traps(spec),
        outer_radius=_outer_radius(spec, body),
        age_limit=si(spec.domain.age_limit),
        grid=_grid(spec, spec.grid, body.radius),
        planes=tuple(_plane(spec, i, image, body.radius) for i, image in enumerate(spec.image, 1)),
        emphasis=spec.ensemble.emphasis,
        speed_bins=spec.ensemble.speed_bins,
        moon=_moon(body) if sun is None else sun.moon,
    )


def referenced_files(spec: RunSpec) -> tuple[Path, ...]:
    """Return the files that the run file refers to, in its order."""
    laws = [law for entry in spec.release for law in (entry.speed, entry.place)]
    names = [law.file for law in (*laws, spec.surface.temperature) if isinstance(law, _BY_FILE)]
    return tuple(spec.folder / name for name in [*names, *g_files(spec), *ground_files(spec)])


def _refuse_rest_on_uneven_ground(spec: RunSpec) -> None:
    """Refuse atoms at rest on a body that moves: how long they stay is known for ground that turns evenly."""
    if spec.sun is not None and spec.sun.motion == "moving" and spec.surface.adsorbed == "desorbed":
        raise refuse(
            spec,
            "sun.motion",
            spec.sun.motion,
            'stands beside surface.adsorbed "desorbed": the ground of a moving body turns unevenly under the Sun, and '
            'how long atoms rest on it is not known; must be "stationary", or surface.adsorbed "captured"',
        )


def _refuse_rest_beside_host(spec: RunSpec) -> None:
    """Refuse atoms at rest beside a host that keeps its place: the ground of the moon would keep its own to the Sun."""
    if spec.body.host is not None and spec.surface.adsorbed == "desorbed":
        raise refuse(
            spec,
            "body.host",
            None,
            'stands beside surface.adsorbed "desorbed": with the host held at its phase the ground does not turn '
            "under the Sun, and atoms would rest through nights without end; must be left out, or surface.adsorbed "
            '"captured"',
        )


def _moon(body: BodyConstants) -> MoonPlace | None:
    """Return where a body without a Sun stands beside its host, None where it has none."""
    if body.host is None:
        return None
    assert body.host.phase_angle is not None
    return moon_without_sun(body.host.distance, body.host.rate, body.host.phase_angle)


def _refuse_colliding_images(spec: RunSpec) -> None:
    """Refuse images whose names in the product would be those of other variables, before anything is traced."""
    names = variable_names(
        [product_name(image.name) for image in spec.image],
        velocities=[product_name(image.name) for image in spec.image if image.velocity is not None],
        speeds=spec.ensemble.speed_bins > 0,
    )
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise refuse(
            spec, "image", None, f"names collide in the product: {', '.join(twice)}; rename an image"
        )


def _mass(spec: RunSpec) -> float:
    if spec.gas.mass is not None:
        return si(spec.gas.mass)
    known = gases()
    if spec.gas.species not in known:
        raise refuse(
            spec,
            "gas.species",
            spec.gas.species,
            f"is not in the catalogue; give its mass, or one of {', '.join(known)}",
        )
    return known[spec.gas.species].mass


def _release(spec: RunSpec, number: int, entry: ReleaseTable, radius: float) -> Release:
    key = f"release[{number}]"
    return Release(
        entry.name,
        si(entry.rate),
        _follows_distance(spec, f"{key}.rate_scaling", entry),
        speed_law(spec, f"{key}.speed", entry.speed),
        direction_law(entry.direction),
        place_law(spec, f"{key}.place", entry.place, radius),
    )


def _follows_distance(spec: RunSpec, key: str, entry: ReleaseTable) -> bool:
    if entry.rate_scaling == "constant":
        return False
    if spec.sun is None or spec.sun.motion == "stationary":
        raise refuse(
            spec,
            key,
            entry.rate_scaling,
            'needs sun.motion = "moving"; without it the distance from the Sun does not change, and "constant" says so',
        )
    return True


def _sticking(given: float | ExponentialSticking) -> Sticking:
    if isinstance(given, ExponentialSticking):
        return Sticking(given.value, si(given.at), si(given.e_folding))
    return Sticking(given, 0.0, np.inf)


def _outer_radius(spec: RunSpec, body: BodyConstants) -> float:
    given = spec.domain.outer_radius
    if given is not None:
        outer = si(given, body.radius)
        if outer <= body.radius:
            raise refuse(
                spec, "domain.outer_radius", given, f"must be above the body's radius, {body.radius:g} m"
            )
        if outer > FARTHEST * body.radius:
            raise refuse(spec, "domain.outer_radius", given, f"must be at most {FARTHEST:g} radii")
        return outer
    if body.orbit is None:
        raise refuse(
            spec, "domain.outer_radius", None, 'required for a body without an orbit, for example "40 radii"'
        )
    if body.host_gm == 0.0:
        raise refuse(
            spec,
            "domain.outer_radius",
            None,
            'required beside a host without gravity, for example "40 radii"',
        )
    outer = hill_radius(body.orbit, body.gm, body.host_gm)
    if outer <= body.radius:
        raise refuse(
            spec,
            "domain.outer_radius",
            None,
            f'the Hill radius, {outer:g} m, lies below the surface; give an outer radius, for example "40 radii"',
        )
    return outer


def _grid(spec: RunSpec, table: GridTable, radius: float) -> Grid:
    altitude = table.altitude
    first, top = si(altitude.first_cell, radius), si(altitude.top, radius)
    if not first < top:
        raise refuse(
            spec,
            "grid.altitude.top",
            altitude.top,
            f'must be above first_cell "{altitude.first_cell}"; a small body needs both',
        )
    try:
        return make_grid(radius, first, top, altitude.cells, table.latitude_cells, table.local_time_cells)
    except ValueError as error:
        raise refuse(spec, "grid.altitude", None, str(error)) from None


def _plane(spec: RunSpec, number: int, image: ImageTable, radius: float) -> ImagePlane:
    look_from = image.look_from
    viewer = (si(look_from.latitude), look_from.local_time) if isinstance(look_from, SkyPoint) else look_from
    ends = {}
    for axis in ("horizontal", "vertical"):
        low, high = (si(end, radius) for end in getattr(image, axis))
        if not low < high:
            raise refuse(
                spec, f"image[{number}].{axis}", None, f"must rise, and goes from {low:g} m to {high:g} m"
            )
        ends[axis] = (low, high)
    velocity = image.velocity
    return make_image_plane(
        product_name(image.name),
        image.name,
        viewer_direction(viewer),
        ends["horizontal"],
        ends["vertical"],
        image.pixels,
        None if velocity is None else (si(velocity.from_), si(velocity.to), velocity.bins),
    )
