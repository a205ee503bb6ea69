"""The commented run file that `tracer new` writes."""

import tomli_w

_BODY = """
[body]
name = "Harrow"                      # a body of the catalogue needs no more than its name
radius = "1800 km"                   # constants of your own; they go before those of the catalogue
gm = "9500 km3 s-2"                  # 0 is allowed
rotation_period = "60 d"             # sidereal, positive where prograde
orbit = { semi_major_axis = "0.42 au", eccentricity = 0.18 }

# [sun]                              # light, tide and turning frame; left out: gravity alone
# true_anomaly = "60 deg"            # on the orbit; or epoch = "2031-06-10T00:00:00Z" (Mercury, Moon),
#                                    # or distance = "0.4 au" with radial_velocity = "8 km/s"
# tide = true                        # the Sun's tide on the atoms
# motion = "stationary"              # the body's distance and velocity stay while atoms fly
# shadow = "penumbra"                # or "cylinder" or "none"
# solar_activity = 0.0               # 0 quiet Sun .. 1 active Sun, for the photo-rates

[gas]
species = "He"                       # a gas of the catalogue, or a name of your own with mass = "4.0026 u"

[[gas.loss]]                         # losses in flight, any number, or none
name = "ionisation"
rate = "3e-7 s-1"

[[release]]                          # one or more
name = "degassing"
rate = "1e24 s-1"                    # new atoms per second from the whole surface
speed = { law = "maxwell-flux", temperature = "surface" }
direction = { law = "cosine", power = 1 }
place = { law = "uniform" }

[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.0                       # probability that a landing atom is adsorbed; the others bounce
accommodation = 1.0                  # energy accommodation of atoms that bounce
# adsorbed = "desorbed"              # leaves again after exp(E/kT)/frequency; left out: captured for good
# desorption = { energy = "0.1 eV", attempt_frequency = "1e13 s-1" }
# cold_traps = { poleward_of = "85 deg" }    # what lands there is captured

[domain]
outer_radius = "40 radii"            # crossing it outwards is escape; left out: the Hill radius
age_limit = "30 d"                   # longest life of an atom

[grid]
altitude = { first_cell = "10 km", top = "10 radii", cells = 50 }
latitude_cells = 36
local_time_cells = 48

[[image]]                            # column-density images, any number, or none
name = "from north"
look_from = "north"    # south, dawn, dusk, sun, midnight or { latitude = "0 deg", local_time = 9.0 }
horizontal = ["-8 radii", "8 radii"]
vertical = ["-8 radii", "8 radii"]
pixels = [128, 128]

[ensemble]
particles_per_batch = 2_000          # per release; the more, the smaller the error bars
batches = 20                         # at least 2; error bars come from the scatter between batches
seed = 20310601
emphasis = "even"                    # or "far": more launches that reach high, escape or make a tail
speed_bins = 0                       # 32 keeps responses by launch speed, for other speed laws afterwards
replicates = 20                      # groups of batches kept for the errors of sums; 0 keeps none
"""


def run_file_template(title: str) -> str:
    """Return a commented run file to start from, which runs as it is.

    Parameters
    ----------
    title : str
        The run's title, one printable line.

    Returns
    -------
    str
        TOML about helium over an invented body.
    """
    return tomli_w.dumps({"title": title}) + _BODY
