"""Publications behind the laws that a scene uses, for the product's `references`."""

from collections.abc import Iterator

from tracer.engine.scene import Scene
from tracer.kernels.temperature import CONDUCTION, HURLEY_2015
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson

SPUTTERING = "Sigmund, P. (1969), Phys. Rev. 184, 383; Thompson, M. W. (1968), Phil. Mag. 18, 377"
INTEGRATOR = (
    "Butcher, J. C. (1964), J. Austral. Math. Soc. 4, 179; "
    "Dormand, J. R. & Prince, P. J. (1980), J. Comput. Appl. Math. 6, 19: Runge-Kutta pair"
)
SOLAR_LINES = (
    "Brault, J. & Neckel, H. (1987) and Neckel, H. (1999), Solar Physics 184, 421: solar flux in the lines"
)
PHOTO_RATES = "Huebner, W. F., Keady, J. J. & Lyon, S. P. (1992), Astrophys. Space Sci. 195, 1"
RESIDENCE = "Frenkel, J. (1924), Z. Physik 26, 117: residence times of adsorbed atoms"
ROULETTE = "Kahn, H. & Harris, T. E. (1951), Natl. Bur. Stand. Appl. Math. Ser. 12, 27: roulette"
KEPLER = "Danby, J. M. A. (1988), Fundamentals of Celestial Mechanics, section 6.9"

THREE_BODIES = "Szebehely, V. (1967), Theory of Orbits: the restricted problem of three bodies"

MOON_TEMPERATURE = "Hurley, D. M. et al. (2015), Icarus 255, 159: temperature of the lunar surface"
HEAT_CONDUCTION = (
    "Carslaw, H. S. & Jaeger, J. C. (1959), Conduction of Heat in Solids; "
    "Spencer, J. R., Lebofsky, L. A. & Sykes, M. V. (1989), Icarus 78, 337"
)


def scene_references(scene: Scene) -> Iterator[str]:
    """Yield the publications behind what `scene` uses, each once."""
    yield INTEGRATOR if scene.integrated else KEPLER
    if any(isinstance(release.speed, SigmundThompson) for release in scene.releases):
        yield SPUTTERING
    ground = None if scene.surface_temperature is None else scene.surface_temperature.law
    if ground == HURLEY_2015:
        yield MOON_TEMPERATURE
    if ground == CONDUCTION:
        yield HEAT_CONDUCTION
    if scene.moon is not None:
        yield THREE_BODIES
    if scene.lines:
        yield SOLAR_LINES
    if scene.sun is not None and scene.sun.photo.total:
        yield PHOTO_RATES
    if scene.desorption is not None:
        yield RESIDENCE
    if scene.losses or (scene.sun is not None and scene.sun.photo.total):
        yield ROULETTE
