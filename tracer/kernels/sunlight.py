"""How much of the Sun's disc an atom sees past the body."""

import math

from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.fused import fused

GENTLE = 0.1
"""Curvature of an edge over the Sun's disc, in units of the disc's, up to which a short series gives its area."""


@kernel
def visible_fraction(x, y, z, distance, radius, sun_radius):
    """Return the visible part, 0 to 1, of the Sun's disc at (x, y, z) [m] in the Sun-fixed frame.

    Body (`radius` [m]) and Sun (`sun_radius` [m], centre at `distance` [m] on +x) are circles on the sky. In
    the stereographic projection about the Sun's centre they stay circles, so that the overlap of two plane
    discs is exact to the square of the Sun's angular radius, beside the ground and behind the umbra's tip
    alike.
    """
    rho2 = y * y + z * z
    r2 = x * x + rho2
    sx = distance - x
    s2 = sx * sx + rho2
    s = math.sqrt(s2)
    # Sine and cosine of the body's angular radius, times r, and of the separation of the centres, times r s.
    low = radius if r2 > radius * radius else math.sqrt(r2)
    horizon = math.sqrt(max(0.0, r2 - radius * radius))
    across = distance * math.sqrt(rho2)
    along = r2 - x * distance
    sun_cosine = math.sqrt(s2 - sun_radius * sun_radius)
    # Radii and gap on the projection are tangents of half angles, sine / (1 + cosine); in units of the Sun's radius.
    twice = s + sun_cosine
    limb = (
        twice * (across * horizon - along * low) / (sun_radius * (r2 * s + (along * horizon + across * low)))
    )
    curvature = sun_radius * (along + horizon * s) / (low * s * twice)
    return 1.0 - covered_fraction(limb, curvature)


@inlined
def covered_fraction(limb, curvature):
    """Return the part of the unit disc that a second disc covers.

    `limb` is where, on the line of centres, the second disc's near edge lies from the first disc's centre,
    `curvature` the inverse of its radius; 0 is a straight edge, a negative one is hollow.
    """
    if limb >= 1.0:
        return 0.0
    if limb <= -1.0:
        # The far edge stands at limb + 2 / curvature: beyond +1 all is covered, else the second disc lies
        # inside.
        if curvature * (1.0 - limb) <= 2.0:
            return 1.0
        return 1.0 / (curvature * curvature)
    if abs(curvature) < GENTLE:
        return _covered_by_gentle_edge(limb, curvature)
    chord = (limb + 0.5 * curvature * (1.0 + limb * limb)) / (1.0 + curvature * limb)
    if not -1.0 < chord < 1.0:
        return min(1.0, 1.0 / (curvature * curvature))
    half = math.sqrt(1.0 - chord * chord)
    covered = math.acos(chord) - chord * half + _bulge(half, curvature, 1.0 - curvature * (chord - limb))
    return min(1.0, max(0.0, covered / math.pi))


@inlined
def _covered_by_gentle_edge(limb, curvature):
    """Return `covered_fraction` of an edge that crosses the disc, for a `curvature` below `GENTLE`.

    Both areas, between chord and disc and between chord and edge, are the cube of half the chord times a smooth
    function: few operations wait on others, which counts where a stage of a step waits on this.
    """
    before, behind = 1.0 - limb, 1.0 + limb
    per = 1.0 / fused(curvature, limb, 1.0)
    # 1 - chord^2 as a product, which keeps its digits where the chord is short.
    squared = before * behind * (fused(-0.5 * curvature, before, 1.0) * fused(0.5 * curvature, behind, 1.0))
    chord = fused(0.5 * curvature, fused(limb, limb, 1.0), limb) * per
    half = math.sqrt(squared) * per
    sine = curvature * half
    segment, bulge = _segment(2.0 * abs(chord) - 1.0), curvature * _sliver(sine * sine)
    cube = half * half * (half * (1.0 / math.pi))
    return cube * (segment + bulge) if chord > 0.0 else 1.0 - cube * (segment - bulge)


@inlined
def _segment(t):
    """Return (arccos c - c h) / h^3 with h^2 = 1 - c^2 and c = (1 + `t`) / 2, for `t` from -1 to 1.

    Own Chebyshev fit of degree 20; its greatest error is 9e-16.
    """
    t2 = t * t
    t4 = t2 * t2
    t8 = t4 * t4
    first = fused(
        t2,
        fused(t, -0.05590207179119427, 0.14968813538869863),
        fused(t, -0.38773389845846123, 0.9455994348748603),
    )
    second = fused(
        t2,
        fused(t, -0.0009298901996158179, 0.002628248280782686),
        fused(t, -0.007368926813454495, 0.0204435025695055),
    )
    third = fused(
        t2,
        fused(t, -1.3825913229879761e-05, 3.982697450321513e-05),
        fused(t, -0.00011434719586654291, 0.00032692107477458234),
    )
    fourth = fused(
        t2,
        fused(t, -2.0336862373190924e-07, 5.662427333749241e-07),
        fused(t, -1.6443229494535277e-06, 4.784050129514753e-06),
    )
    fifth = fused(
        t2,
        fused(t, -5.077422134274203e-09, 5.799338413176187e-09),
        fused(t, -1.6923296791445385e-08, 6.974511417352175e-08),
    )
    last = fused(t4, 1.7303410316289774e-09, fifth)
    return fused(t8, fused(t8, last, fused(t4, fourth, third)), fused(t4, second, first))


@inlined
def _sliver(s2):
    """Return (arcsin s - s sqrt(1 - s^2)) / s^3 for `s2` = s^2 up to `GENTLE` squared.

    The sum of 2 binomial(2 n, n) / ((2 n + 3) 4^n) s^2n; its next term is 3e-16.
    """
    s4 = s2 * s2
    low = fused(s4, fused(s2, 5.0 / 72.0, 3.0 / 28.0), fused(s2, 1.0 / 5.0, 2.0 / 3.0))
    return fused(s4 * s4, fused(s4, 77.0 / 2560.0, fused(s2, 63.0 / 1664.0, 35.0 / 704.0)), low)


@kernel
def _bulge(half, curvature, cosine):
    """Return the area between a chord of half length `half` and its arc, which meets it at the angle of `cosine`."""
    sine = curvature * half
    if abs(sine) < 0.03 and cosine > 0.0:
        s2 = sine * sine
        # The arcsine's series; its next term is 1e-17 of the angle.
        angle = sine * (
            1.0 + s2 * (1.0 / 6.0 + s2 * (3.0 / 40.0 + s2 * (5.0 / 112.0 + s2 * (35.0 / 1152.0))))
        )
    else:
        angle = math.atan2(sine, cosine)
    if abs(angle) > 0.2:
        return (angle - sine * cosine) / (curvature * curvature)
    # Series of angle - sin(angle) cos(angle) over sin(angle)^2: a nearly straight edge would lose all digits.
    a2 = angle * angle
    series = 2.0 / 3.0 + a2 * (4.0 / 45.0 + a2 * (4.0 / 315.0 + a2 * (8.0 / 4725.0 + a2 * (4.0 / 18711.0))))
    return half * half * angle * series
