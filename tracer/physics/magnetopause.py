"""How far a body's magnetic field holds off the solar wind."""

from tracer.constants import PROTON_MASS, VACUUM_PERMEABILITY

FLAT_SHEET = 2.0
"""Field just inside the boundary over the dipole's alone, for a flat current sheet (Chapman & Ferraro 1931; memory)."""

CURVED_BOUNDARY = 2.44
"""The same for the curved boundary that pressure balance gives (common practice)."""


def wind_pressure(density: float, speed: float) -> float:
    """Return rho v^2 [Pa] of a wind of protons of number `density` [m-3] at `speed` [m s-1]."""
    return PROTON_MASS * density * speed * speed


def standoff(equatorial_field: float, pressure: float, factor: float = FLAT_SHEET) -> float | None:
    """Return R_mp/R = (f^2 B^2 / (2 mu0 P))^(1/6), the magnetopause's distance from the centre, in radii.

    The compressed field of a dipole, f B (R/r)^3, balances the wind's pressure P at the subsolar point. A result
    under one means that the wind reaches the ground.

    Parameters
    ----------
    equatorial_field : float
        B [T], of the body at the equator's surface, of either sign.
    pressure : float
        P [Pa], above 0.
    factor : float
        f: `FLAT_SHEET` or `CURVED_BOUNDARY`.

    Returns
    -------
    float or None
        Stand-off in radii of the body; None without a field.
    """
    if equatorial_field == 0.0:
        return None
    inside = (factor * equatorial_field) ** 2 / (2.0 * VACUUM_PERMEABILITY)
    return float((inside / pressure) ** (1.0 / 6.0))
