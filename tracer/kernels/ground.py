"""What happens to an atom at the ground, and what each end of a life leaves in the tallies."""

import math

from numba.core import types
from numba.extending import overload

from tracer.fate import Fate
from tracer.kernels.adsorption import desorbed, spread_along, stay
from tracer.kernels.arc_flight import turned
from tracer.kernels.bounce import rebound, sticks
from tracer.kernels.compiling import INLINED, field_type, inlined, merged
from tracer.kernels.endings import AGED, CROSSED, DROPPED, LANDED, STRUCK
from tracer.kernels.resume import AGE, CLOCK, HOME_COLUMN, HOME_ROW, SURVIVAL, UNDER_WAY, WEIGHT
from tracer.kernels.roulette import play_roulette
from tracer.kernels.scoring import ground_cell
from tracer.kernels.traps import NOWHERE, trapped
from tracer.kernels.two_body import orbit_state, turning_at


@inlined
def _spin_on_orbit(world, atom):
    forces = world.light.conditions.sky.forces
    distance, _ = orbit_state(forces.orbit, atom[CLOCK] + atom[AGE])
    slower = forces.turning - turning_at(forces.orbit, distance)
    return world.surface.spin + world.snapshot.ground_turns * slower


def ground_spin(world, atom):
    """Return the ground's angular rate [rad s-1] about +z in the Sun-fixed frame, at the atom's present age."""
    return world.surface.spin if world.snapshot is None else _spin_on_orbit.py_func(world, atom)


@overload(ground_spin, jit_options=INLINED)
def _compiled_ground_spin(world, atom):
    if isinstance(field_type(world, "snapshot"), types.NoneType):
        return lambda world, atom: world.surface.spin
    return lambda world, atom: _spin_on_orbit(world, atom)


@merged
def release(world, launches, i, atom, tally):
    """Make `atom` number `i` of `launches` and launch it."""
    nx, ny, nz = launches.positions[i, 0], launches.positions[i, 1], launches.positions[i, 2]
    row, column = ground_cell(world.cells, nx, ny, nz, 1.0)
    tally.released[row, column] += launches.weights[i]
    atom[WEIGHT] = launches.weights[i]
    atom[SURVIVAL] = 1.0
    atom[AGE] = 0.0
    atom[HOME_ROW] = row
    atom[HOME_COLUMN] = column
    atom[UNDER_WAY] = 1.0
    v = launches.velocities
    _launch(world.motion.radius, ground_spin(world, atom), atom, nx, ny, nz, v[i, 0], v[i, 1], v[i, 2])


@merged
def take_off(atom, tally):
    """Count a launch and return the weight [s-1] that flies."""
    alive = atom[WEIGHT] * atom[SURVIVAL]
    tally.launches[0] += alive
    return alive


@merged
def come_down(world, atom, tally, alive, end, rng):
    """Enter the end of a flight, `end` = (ending, survival, time [s], position, velocity), that `alive` [s-1] began.

    The atom is launched again, or its life ends and `atom[UNDER_WAY]` is 0.
    """
    ending, kept, t, x, y, z, vx, vy, vz = end
    alive *= kept
    atom[SURVIVAL] *= kept
    atom[AGE] += t
    if ending == LANDED:
        _land(world, atom, tally, alive, x, y, z, vx, vy, vz, rng)
    else:
        _end_aloft(world, atom, tally, ending, alive, x, y, z)


@merged
def _launch(radius, spin, atom, nx, ny, nz, vx, vy, vz):
    """Put an atom at the ground under unit vector n with velocity v relative to the ground, which turns."""
    atom[0] = radius * nx
    atom[1] = radius * ny
    atom[2] = radius * nz
    atom[3] = vx - spin * atom[1]
    atom[4] = vy + spin * atom[0]
    atom[5] = vz


@merged
def _land(world, atom, tally, alive, x, y, z, vx, vy, vz, rng):
    per_r = 1.0 / math.sqrt(x * x + y * y + z * z)
    nx, ny, nz = x * per_r, y * per_r, z * per_r
    row, column = ground_cell(world.cells, nx, ny, nz, 1.0)
    tally.returned[row, column] += alive
    kept = world.traps.where != NOWHERE and trapped(world.traps, nx, ny, nz, rng)
    adsorbed = not kept and sticks(world.surface, nx, ny, nz, rng)
    if kept or (adsorbed and not world.adsorption.desorbs):
        tally.captured[row, column] += alive
        tally.ledger[Fate.CAPTURED] += alive
        atom[UNDER_WAY] = 0.0
        return
    atom[SURVIVAL] = play_roulette(
        world.roulette.gain, tally, atom[WEIGHT], atom[SURVIVAL], world.roulette.on_ground, rng
    )
    if atom[SURVIVAL] == 0.0:
        atom[UNDER_WAY] = 0.0
        return
    if adsorbed:
        _rest(world, atom, tally, row, nx, ny, nz, rng)
        return
    spin = ground_spin(world, atom)
    ux = vx + spin * y
    uy = vy - spin * x
    out = rebound(rng, world.surface, nx, ny, nz, ux * ux + uy * uy + vz * vz)
    _launch(world.motion.radius, spin, atom, nx, ny, nz, out[0], out[1], out[2])


@merged
def _rest(world, atom, tally, row, nx, ny, nz, rng):
    """Keep an adsorbed atom until it leaves or its time is up: at rest nothing but age takes from it."""
    surface = world.surface
    alive = atom[WEIGHT] * atom[SURVIVAL]
    limit = world.motion.age_limit - atom[AGE]
    time, by_light = stay(surface.temperature, world.adsorption, surface.spin, (nx, ny, nz), limit, rng)
    way = surface.spin * time
    spread_along(tally.adsorbed[row], math.atan2(ny, nx), way, alive * time)
    tally.life[0] += alive * time
    atom[AGE] += time
    if time >= limit:
        tally.ledger[Fate.AGE_LIMIT] += alive
        atom[UNDER_WAY] = 0.0
        return
    mx, my = turned(nx, ny, -way)
    out = desorbed(rng, surface, world.adsorption, mx, my, nz, by_light)
    _launch(world.motion.radius, surface.spin, atom, mx, my, nz, out[0], out[1], out[2])


@merged
def _end_aloft(world, atom, tally, ending, alive, x, y, z):
    if ending == CROSSED:
        tally.ledger[Fate.ESCAPED] += alive
        tally.escaped[int(atom[HOME_ROW]), int(atom[HOME_COLUMN])] += alive
        row, column = ground_cell(world.cells, x, y, z, math.sqrt(x * x + y * y + z * z))
        tally.escaped_by_direction[row, column] += alive
    elif ending == AGED:
        tally.ledger[Fate.AGE_LIMIT] += alive
    elif ending == STRUCK:
        tally.ledger[Fate.OTHER_LOSS] += alive
        tally.struck[0] += alive
    elif ending != DROPPED:
        tally.ledger[Fate.UNRESOLVED] += alive
    atom[UNDER_WAY] = 0.0
