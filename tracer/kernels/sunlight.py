"""How much of the Sun's disc an atom sees past the body."""

import math

from tracer.kernels.compiling import kernel


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
    per_disc = (s + sun_cosine) / sun_radius
    limb = per_disc * (across * horizon - along * low) / (r2 * s + (along * horizon + across * low))
    curvature = (along + horizon * s) / (low * s * per_disc)
    return 1.0 - covered_fraction(limb, curvature)


@kernel
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
    chord = (limb + 0.5 * curvature * (1.0 + limb * limb)) / (1.0 + curvature * limb)
    if not -1.0 < chord < 1.0:
        return min(1.0, 1.0 / (curvature * curvature))
    half = math.sqrt(1.0 - chord * chord)
    covered = math.acos(chord) - chord * half + _bulge(half, curvature, 1.0 - curvature * (chord - limb))
    return min(1.0, max(0.0, covered / math.pi))


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
