"""Run files that many tests trace, and whose kernels are compiled before the tests start."""

SMALL_RUN = """
title = "Sodium over Harrow, small"

[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
rotation_period = "60 d"

[gas]
species = "Na"

[[gas.loss]]
name = "charge exchange"
rate = "1e-5 s-1"

[[release]]
name = "impact vapour"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "3500 K" }
place = { law = "cosine-power", toward = "dawn", power = 1 }

[[release]]
name = "sputtering"
rate = "5e23 s-1"
speed = { law = "sigmund-thompson", binding_energy = "2 eV", cutoff_energy = "2020.75 eV" }
place = { law = "band", latitude = ["30 deg", "60 deg"] }

[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.4
accommodation = 0.7

[domain]
outer_radius = "20 radii"
age_limit = "30 d"

[grid]
altitude = { first_cell = "50 km", top = "3 radii", cells = 5 }
latitude_cells = 4
local_time_cells = 6

[[image]]
name = "tail from north"
look_from = "north"
horizontal = ["-5 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [8, 6]

[ensemble]
particles_per_batch = 250
batches = 6
replicates = 3
"""

SUN = """
[sun]
distance = "0.35 au"
radial_velocity = "8 km/s"
solar_activity = 0.5
"""

LIGHT = """scaling = "inverse-square"
where = "sunlight"

[[gas.line]]
name = "invented"
wavelength = "500 nm"
g = "0.2 s-1"
"""

SMALL_LIGHT_RUN = SMALL_RUN.replace("\n[gas]", SUN + "\n[gas]").replace(
    'rate = "1e-5 s-1"\n', 'rate = "1e-5 s-1"\n' + LIGHT
)

MOVING_RUN = SMALL_LIGHT_RUN.replace(
    'distance = "0.35 au"\nradial_velocity = "8 km/s"', 'true_anomaly = "60 deg"\nmotion = "moving"'
).replace('rotation_period = "60 d"', 'orbit = { semi_major_axis = "0.4 au", eccentricity = 0.2 }')

HOST = """
[body.host]
gm = "2e7 km3 s-2"
radius = "30000 km"
distance = "400000 km"
phase_angle = "5 deg"
rotation = "turning"
"""

HOST_RUN = SMALL_LIGHT_RUN.replace("\n[sun]", HOST + "\n[sun]")

MOVING_HOST_RUN = MOVING_RUN.replace("\n[sun]", HOST.replace('rotation = "turning"\n', "") + "\n[sun]")
