"""Straight lines of sight through the spherical cells: exact paths, and what lies along them.

A ray is cut wherever it meets a shell, a cone of latitude, a half plane of local time or the umbra; the middle of
each piece then says which cell it lies in. A cut too many does no harm, so that edges touched, doubled or lost in
rounding neither lose nor double any path.
"""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.compiling import allocating_kernel, inlined, kernel
from tracer.kernels.shadow import NO_SHADOW, umbra_height

NODES = np.array([-0.8611363115940526, -0.3399810435848563, 0.3399810435848563, 0.8611363115940526])
WEIGHTS = np.array([0.3478548451374538, 0.6521451548625461, 0.6521451548625461, 0.3478548451374538])
"""Gauss-Legendre quadrature of four points on [-1, 1], from `numpy.polynomial.legendre.leggauss`."""

DOUBLE_ROOT = 1e-9
"""Discriminants of this size, relative to what they are the difference of, count as 0."""


class SphericalCells(NamedTuple):
    """Edges of A x L x H cells.

    `radii` (A + 1,) [m] from the centre; `sines` (L + 1,) of the latitude edges; `cones` (K,) the different
    |sines| between 0 and 1; `equator` whether an edge lies on it; `cosines_of_time` and `sines_of_time` (H,) of the
    local-time edges, as angles from noon.
    """

    radii: np.ndarray
    sines: np.ndarray
    cones: np.ndarray
    equator: bool
    cosines_of_time: np.ndarray
    sines_of_time: np.ndarray


class Contents(NamedTuple):
    """What is in the cells, C quantities side by side; the first `densities` of them are number densities.

    Inside a cell a quantity is mean * norm * exp(-decay * height over the cell's middle radius): `means`, `norms` (no
    unit) and `decays` [m-1], all (cells, C). `replicates` (cells, C, G) holds the means over groups of batches.
    """

    densities: int
    means: np.ndarray
    norms: np.ndarray
    decays: np.ndarray
    replicates: np.ndarray


class Paths(NamedTuple):
    """N rays: `nearest` (N, 3) [m] the nearest point of the whole line to the centre, `look` (N, 3) unit vectors.

    `start` and `end` (N,) [m] are counted along `look` from there; `end` may be infinite.
    """

    nearest: np.ndarray
    look: np.ndarray
    start: np.ndarray
    end: np.ndarray


class Sums(NamedTuple):
    """Integrals along N rays, in the unit of the quantity times metres; to be handed over as zeros.

    `all` (N, C), `lit` (N, densities) outside the umbra, `replicates` (N, C, G), `beyond` (N,) an estimate of the
    column outside the grid.
    """

    all: np.ndarray
    lit: np.ndarray
    replicates: np.ndarray
    beyond: np.ndarray


@allocating_kernel
def integrate(cells, shadow, contents, paths, sums):
    """Add up what lies along every ray, in the order of the rays."""
    top = cells.radii[-1]
    cuts = np.empty(2 * cells.radii.size + 2 * cells.cones.size + cells.cosines_of_time.size + 5)
    for ray in range(paths.start.size):
        p, u = paths.nearest[ray], paths.look[ray]
        rho2 = p[0] * p[0] + p[1] * p[1] + p[2] * p[2]
        if rho2 >= top * top:
            continue
        reach = math.sqrt((top - math.sqrt(rho2)) * (top + math.sqrt(rho2)))
        first, last = max(paths.start[ray], -reach), min(paths.end[ray], reach)
        if not first < last:
            continue
        count = _cut(cells, shadow, p, u, rho2, first, last, cuts)
        cuts[:count].sort()
        _add_up(cells, shadow, contents, p, u, rho2, cuts[:count], sums, ray)
        _estimate_beyond(
            cells, contents, p, u, rho2, reach, paths.start[ray], paths.end[ray], sums.beyond, ray
        )


@kernel
def _cut(cells, shadow, p, u, rho2, first, last, cuts):
    """Write where the ray meets edges between `first` and `last`, with these two, and return how many there are."""
    cuts[0], cuts[1] = first, last
    count = 2
    rho = math.sqrt(rho2)
    for radius in cells.radii:
        if radius > rho:
            half = math.sqrt((radius - rho) * (radius + rho))
            count = _keep(-half, first, last, cuts, count)
            count = _keep(half, first, last, cuts, count)
    if cells.equator and u[2] != 0.0:
        count = _keep(-p[2] / u[2], first, last, cuts, count)
    for sine in cells.cones:
        # z^2 = sine^2 r^2, both the northern and the southern cone.
        square = sine * sine
        count = _keep_roots(
            u[2] * u[2] - square, p[2] * u[2], p[2] * p[2] - square * rho2, first, last, cuts, count
        )
    for edge in range(cells.cosines_of_time.size):
        c, s = cells.cosines_of_time[edge], cells.sines_of_time[edge]
        across = c * u[1] - s * u[0]
        if across != 0.0:
            count = _keep(-(c * p[1] - s * p[0]) / across, first, last, cuts, count)
    if shadow.kind != NO_SHADOW:
        # rho_x cosine = R + x sine with rho_x^2 = r^2 - x^2, the surface of the umbra.
        c2, across = shadow.umbra_cosine * shadow.umbra_cosine, shadow.radius * shadow.umbra_sine
        a, b = p[0], u[0]
        count = _keep_roots(
            b * b - c2,
            b * (across + a),
            shadow.radius * shadow.radius + 2.0 * across * a + a * a - c2 * rho2,
            first,
            last,
            cuts,
            count,
        )
    return count


@inlined
def _keep(t, first, last, cuts, count):
    """Note a cut that lies between the ends; NaN and infinities do not."""
    if first < t < last:
        cuts[count] = t
        return count + 1
    return count


@inlined
def _keep_roots(a, b, c, first, last, cuts, count):
    """Note the roots of a t^2 + 2 b t + c = 0, without loss of digits, where they are lost in rounding as well."""
    discriminant = b * b - a * c
    # A ray through a cone's tip has a double root: what rounding makes of it may be negative.
    if discriminant < -DOUBLE_ROOT * b * b:
        return count
    q = -(b + math.copysign(math.sqrt(max(0.0, discriminant)), b))
    if a != 0.0:
        count = _keep(q / a, first, last, cuts, count)
    if q != 0.0:
        count = _keep(c / q, first, last, cuts, count)
    return count


@kernel
def _add_up(cells, shadow, contents, p, u, rho2, cuts, sums, ray):
    shells, bands, hours = cells.radii.size - 1, cells.sines.size - 1, cells.cosines_of_time.size
    shell, band = shells - 1, 0
    quantities, groups = contents.replicates.shape[1], contents.replicates.shape[2]
    for piece in range(cuts.size - 1):
        half = 0.5 * (cuts[piece + 1] - cuts[piece])
        if not half > 0.0:
            continue
        t = 0.5 * (cuts[piece + 1] + cuts[piece])
        x, y, z = p[0] + t * u[0], p[1] + t * u[1], p[2] + t * u[2]
        r = math.sqrt(rho2 + t * t)
        shell, band = _walk(cells.radii, r, shell), _walk(cells.sines, z / r, band)
        hour = min(hours - 1, int((0.5 + math.atan2(y, x) / (2.0 * math.pi)) * hours))
        cell = (shell * bands + band) * hours + hour
        middle = 0.5 * (cells.radii[shell] + cells.radii[shell + 1])
        lit = shadow.kind == NO_SHADOW or umbra_height(shadow, x, math.sqrt(y * y + z * z)) >= 0.0
        h0 = math.sqrt(rho2 + (t + half * NODES[0]) * (t + half * NODES[0])) - middle
        h1 = math.sqrt(rho2 + (t + half * NODES[1]) * (t + half * NODES[1])) - middle
        h2 = math.sqrt(rho2 + (t + half * NODES[2]) * (t + half * NODES[2])) - middle
        h3 = math.sqrt(rho2 + (t + half * NODES[3]) * (t + half * NODES[3])) - middle
        for i in range(quantities):
            mean, k = contents.means[cell, i], contents.decays[cell, i]
            if mean == 0.0:
                continue
            weight = 2.0 * half
            if k != 0.0:
                weight = (
                    half
                    * contents.norms[cell, i]
                    * (
                        WEIGHTS[0] * math.exp(-k * h0)
                        + WEIGHTS[1] * math.exp(-k * h1)
                        + WEIGHTS[2] * math.exp(-k * h2)
                        + WEIGHTS[3] * math.exp(-k * h3)
                    )
                )
            sums.all[ray, i] += mean * weight
            if lit and i < contents.densities:
                sums.lit[ray, i] += mean * weight
            for group in range(groups):
                sums.replicates[ray, i, group] += contents.replicates[cell, i, group] * weight


@inlined
def _walk(edges, value, cell):
    """Return the cell of `value` between rising `edges`, looked for from `cell`; the end cells hold what is beyond."""
    while cell > 0 and value < edges[cell]:
        cell -= 1
    while cell < edges.size - 2 and value >= edges[cell + 1]:
        cell += 1
    return cell


@kernel
def _estimate_beyond(cells, contents, p, u, rho2, reach, start, end, beyond, ray):
    """Put an estimate of the column above the grid's top, from the densities of the cells where the ray crosses it.

    Gas that flies freely thins out as r^-2: the integral of n (top/r)^2 along the ray from the top outwards.
    """
    top, rho = cells.radii[-1], math.sqrt(rho2)
    shells, bands, hours = cells.radii.size - 1, cells.sines.size - 1, cells.cosines_of_time.size
    for side in (-1.0, 1.0):
        far = -start if side < 0.0 else end
        if not far > reach:
            continue
        t = side * reach
        x, y, z = p[0] + t * u[0], p[1] + t * u[1], p[2] + t * u[2]
        band = _walk(cells.sines, z / top, 0)
        hour = min(hours - 1, int((0.5 + math.atan2(y, x) / (2.0 * math.pi)) * hours))
        cell = ((shells - 1) * bands + band) * hours + hour
        density = 0.0
        for i in range(contents.densities):
            density += contents.means[cell, i]
        # (1/rho) [atan(far/rho) - atan(reach/rho)], which is 1/reach - 1/far on a ray through the centre.
        inverse = 1.0 / far
        span = 1.0 / reach - inverse
        if rho > 1e-6 * reach:
            span = (math.atan(rho / reach) - math.atan(rho * inverse)) / rho
        beyond[ray] += density * top * top * span
