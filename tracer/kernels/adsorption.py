"""Atoms that the ground holds for a while: how long, where they are meanwhile, and how they leave again.

The ground under an adsorbed atom turns below the Sun. Its hazard of desorption is that of the temperature on the way,
frequency times exp(-E/kT) (Frenkel 1924, Z. Phys. 26, 117: memory); sunlight adds its own. Each process draws the
hazard that it will have gathered when it strikes, and the earlier one does.
"""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.bounce import direction_about, thermal_speed_squared
from tracer.kernels.compiling import kernel
from tracer.kernels.quantiles import drawn_quantile
from tracer.kernels.temperature import temperature

LONGEST_STEP = 1.0 / 48.0
"""In turns of the ground below the Sun: half of it is the finest feature of a temperature that is looked for."""

SHORTEST_STEP = 1e-7
"""In turns: a jump of temperature, as between night and day, is placed no more finely."""

SHORT = 1e-7
"""In radians: a ground that turns less has one temperature."""

NO_WAY = 1e-9
"""In cells: a shorter way lies in one."""

ALLOWED = 1e-3
"""Difference of two rules of quadrature, over what is gathered, up to which a step is good; the better rule counts."""

NEGLIGIBLE = 1e-4
"""The same over what this turn has gathered before, or what is still to be gathered."""


class Adsorption(NamedTuple):
    """What holds adsorbed atoms: for good unless one `desorbs`.

    `binding_kelvin` is the energy of desorption over the Boltzmann constant [K], `log_frequency` the logarithm of the
    attempt frequency in s-1; the rate of desorption by sunlight is `photon_rate` [s-1] times the cosine of the solar
    zenith angle, with speeds of the quantiles `photon_speeds` [m s-1], times the root of the temperature in K where
    `photon_speeds_are_thermal`.
    """

    desorbs: bool
    binding_kelvin: float
    log_frequency: float
    photon_rate: float
    photon_speeds: np.ndarray
    photon_speeds_are_thermal: bool


@kernel
def exponential(rng):
    """Draw the hazard that a process has gathered when it strikes: exponential, of mean 1, never quite 0."""
    return max(1e-18, -math.log(1.0 - rng.random()))


@kernel
def log_hazard(law, adsorption, x, y, z):
    """Return the logarithm of the rate [s-1] of thermal desorption at unit vector (x, y, z)."""
    return adsorption.log_frequency - adsorption.binding_kelvin / temperature(law, x, y, z)


@kernel
def residence(law, adsorption, spin, place, gathered, limit):
    """Return the time [s], at most `limit`, until an atom at unit vector `place` has gathered the hazard `gathered`.

    Exact where the temperature stays the same, as on ground that does not turn. Whatever a whole turn gathers is
    integrated once: cold ground that holds atoms for many turns costs no more than two.
    """
    x, y, z = place
    start = log_hazard(law, adsorption, x, y, z)
    straight = gathered * math.exp(-start)
    if not math.fabs(spin) * min(straight, limit) > SHORT or x * x + y * y == 0.0:
        return min(straight, limit)
    turn = 2.0 * math.pi / math.fabs(spin)
    time, left, first = 0.0, gathered, True
    while time < limit:
        end = min(limit, time + turn)
        time, grown = _within_a_turn(law, adsorption, spin, place, time, end, left)
        left -= grown
        if time < end or left <= 0.0:
            return time
        if first:
            first = False
            turns = (limit - time) / turn
            if grown * turns > left:
                turns = left / grown
            time += math.floor(turns) * turn
            left = max(0.0, left - math.floor(turns) * grown)
    return limit


@kernel
def _within_a_turn(law, adsorption, spin, place, time, end, wanted):
    """Return (time, hazard gathered): where `wanted` is reached between `time` and `end`, else `end` and what was.

    Between two places the logarithm of the hazard is taken as a straight line: exact for a constant one, and good over
    the many decades that a morning takes it through. A step is good where two halves agree with the whole.
    """
    turn = 2.0 * math.pi / math.fabs(spin)
    longest, shortest = LONGEST_STEP * turn, SHORTEST_STEP * turn
    left = wanted
    log0 = _log_hazard_after(law, adsorption, spin, place, time)
    step = min(longest, 1.5 * left * math.exp(-log0))
    while time < end:
        step = min(max(step, shortest), longest, end - time)
        log1 = _log_hazard_after(law, adsorption, spin, place, time + 0.5 * step)
        log2 = _log_hazard_after(law, adsorption, spin, place, time + step)
        first = _gathered(log0, log1, 0.5 * step)
        both = first + _gathered(log1, log2, 0.5 * step)
        gap = math.fabs(both - _gathered(log0, log2, step))
        allowed = ALLOWED * min(both, left) + NEGLIGIBLE * min(wanted - left, left)
        good = gap <= allowed
        if not good and step > shortest:
            step *= 0.5
            continue
        if both >= left:
            if first >= left:
                return time + _time_to_gather(log0, log1, 0.5 * step, left), wanted
            return time + 0.5 * step + _time_to_gather(log1, log2, 0.5 * step, left - first), wanted
        left -= both
        last = step >= end - time
        time = end if last else time + step
        log0 = log2
        if 8.0 * gap <= allowed:
            step *= 2.0
    return end, wanted - left


@kernel
def _log_hazard_after(law, adsorption, spin, place, time):
    x, y, z = place
    angle = spin * time
    c, s = math.cos(angle), math.sin(angle)
    return log_hazard(law, adsorption, c * x - s * y, s * x + c * y, z)


@kernel
def _gathered(log0, log1, step):
    """Return the integral over `step` [s] of a rate whose logarithm goes straight from `log0` to `log1`."""
    rise = log1 - log0
    if math.fabs(rise) < 1e-6:
        return step * math.exp(log0 + 0.5 * rise)
    if math.fabs(rise) < 1.0:
        return step * math.exp(log0) * math.expm1(rise) / rise
    return step * (math.exp(log1) - math.exp(log0)) / rise


@kernel
def _time_to_gather(log0, log1, step, wanted):
    """Return the time [s], at most `step`, in which the rate of `_gathered` adds up to `wanted`."""
    slope = (log1 - log0) / step
    straight = wanted * math.exp(-log0)
    if math.fabs(slope) * straight < 1e-6:
        return min(step, straight)
    return min(step, max(0.0, math.log1p(slope * straight) / slope))


@kernel
def photon_residence(photon_rate, spin, place, gathered, limit):
    """Return the time [s], at most `limit`, until sunlight has given the hazard `gathered`; exact.

    The rate is `photon_rate` [s-1] times the cosine of the solar zenith angle by day and nothing by night.
    """
    x, y, _z = place
    if spin == 0.0 or math.fabs(spin) * limit <= SHORT:
        return min(limit, gathered / (photon_rate * x)) if x > 0.0 else limit
    greatest = photon_rate * math.sqrt(x * x + y * y)
    if not greatest > 0.0:
        return limit
    # The way round, counted from noon along the ground's motion; by day the hazard goes with its sine from dawn on.
    angle = math.atan2(math.copysign(1.0, spin) * y, x)
    dawn, dusk = -0.5 * math.pi, 0.5 * math.pi
    wanted = 1.0 + math.sin(min(max(angle, dawn), dusk)) + gathered * math.fabs(spin) / greatest
    days = math.floor(0.5 * wanted)
    struck = math.asin(min(1.0, max(-1.0, wanted - 2.0 * days - 1.0)))
    return min(limit, max(0.0, (2.0 * math.pi * days + struck - angle) / math.fabs(spin)))


@kernel
def stay(law, adsorption, spin, place, limit, rng):
    """Return (time [s] until an adsorbed atom leaves, at most `limit`; whether sunlight drives it out)."""
    by_light = False
    if adsorption.photon_rate > 0.0:
        struck = photon_residence(adsorption.photon_rate, spin, place, exponential(rng), limit)
        by_light = struck < limit
        limit = struck
    time = residence(law, adsorption, spin, place, exponential(rng), limit)
    return time, by_light and time >= limit


@kernel
def desorbed(rng, surface, adsorption, nx, ny, nz, by_light):
    """Return the velocity [m s-1], relative to the ground, with which an atom leaves, by the cosine law.

    Its speed is that of a flux-weighted Maxwellian at the local temperature, or of the photons' own law.
    """
    kelvin = temperature(surface.temperature, nx, ny, nz)
    if by_light:
        speed = drawn_quantile(rng, adsorption.photon_speeds)
        if adsorption.photon_speeds_are_thermal:
            speed *= math.sqrt(kelvin)
    else:
        speed = math.sqrt(thermal_speed_squared(rng, surface.speed_squared_per_kelvin, kelvin))
    cosine = math.sqrt(rng.random())
    dx, dy, dz = direction_about(nx, ny, nz, cosine, 2.0 * math.pi * rng.random())
    return speed * dx, speed * dy, speed * dz


@kernel
def spread_along(cells, angle, way, content):
    """Add `content`, evenly spread over a `way` [rad] along the ground, to the cells (n,) of local time that it passes.

    `angle` [rad] is where the way begins, from noon towards dusk; a negative way goes towards dawn.
    """
    number = cells.shape[0]
    per_radian = number / (2.0 * math.pi)
    start = (math.pi + angle) * per_radian
    length = math.fabs(way) * per_radian
    here = min(int(start), number - 1)
    if length < NO_WAY:
        cells[here] += content
        return
    per_cell = content / length
    turns = math.floor(length / number)
    if turns > 0.0:
        for i in range(number):
            cells[i] += turns * per_cell
    rest = length - turns * number
    part = here + 1.0 - start if way > 0.0 else start - here
    onward = 1 if way > 0.0 else number - 1
    while rest > 0.0:
        part = min(part, rest)
        cells[here] += part * per_cell
        rest -= part
        part = 1.0
        here = (here + onward) % number
