"""What a page says: escaped, cautions first, the scene in words, and nothing fetched."""

import re
from html import unescape
from html.parser import HTMLParser

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tracer.plots.ground_map import MAPS
from tracer.plots.moving import time_words
from tracer.plots.page.cautions import left_out, plan_cautions, watch
from tracer.plots.page.figure_list import product_figures
from tracer.plots.page.markup import element, escaped
from tracer.plots.page.reading import duration, number, percent, quantity, raised
from tracer.plots.page.scene_words import scene_words
from tracer.plots.plan_table import PlanTable

RUN = """
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
rotation_period = "60 d"
[sun]
true_anomaly = "60 deg"
tide = false
[gas]
species = "Na"
[[gas.loss]]
name = "charge exchange"
rate = "1e-7 s-1"
scaling = "inverse-square"
where = "everywhere"
[[release]]
name = "impact vapour"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "9000 K" }
direction = { law = "cosine", power = 2.0 }
place = { law = "band", latitude = ["30 deg", "60 deg"] }
[surface]
sticking = { law = "step", below = "200 K" }
temperature = { law = "uniform", value = "300 K" }
[domain]
outer_radius = "40 radii"
age_limit = "30 d"
"""


class Reader(HTMLParser):
    """Collects what a browser would see."""

    def __init__(self, text):
        super().__init__(convert_charrefs=True)
        self.words, self.tags, self.addresses = [], [], []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag, attributes):
        self.tags.append(tag)
        self.addresses += [value for name, value in attributes if name in ("href", "src", "srcset")]

    def handle_data(self, data):
        self.words.append(data)


@given(st.text(st.characters(exclude_categories=("Cs", "Cc"))))
@settings(max_examples=100, deadline=None)
def test_any_text_comes_back_as_text(text):
    read = Reader(element("p", text, title=text))
    assert "".join(read.words) == text
    assert read.tags == ["p"]


def test_characters_that_html_forbids_are_replaced():
    assert escaped("a\x00\x1bb\n") == "a\N{REPLACEMENT CHARACTER}\N{REPLACEMENT CHARACTER}b\n"


def test_page_fetches_nothing(page):
    addresses = Reader(page).addresses
    assert len(addresses) > 10
    assert all(address.startswith(("#", "data:image/png;base64,")) for address in addresses)
    assert not re.search(r"@import|url\(", page)
    assert "default-src 'none'" in unescape(page)


def test_links_within_the_page_have_their_ends(page):
    wanted = {address[1:] for address in Reader(page).addresses if address.startswith("#")}
    assert wanted <= set(re.findall(r'id="([a-z0-9_-]+)"', page))


def test_cautions_come_before_everything_else(page):
    words = " ".join(Reader(page).words)
    rising = (
        "A planning aid, not a flight product. Flight rules",
        "1 of 4 planned",
        "Body and gas",
        "What becomes of the released atoms",
        "Atoms never meet",
    )
    places = [words.index(text) for text in rising]
    assert places == sorted(places)
    assert "NOT to be commanded: Sun inside its keep-out" in words


def test_run_file_hashes_and_file_names_are_told(page, small_light_product):
    words = " ".join(Reader(page).words)
    for key in ("scene_hash", "run_hash", "data_checksum", "source"):
        assert str(small_light_product.attrs[key]) in words
    assert small_light_product.attrs["run_file"].strip() in words
    assert "a & b.nc" in words


def test_scene_is_told_in_words(make_product):
    product = make_product().assign_attrs(
        run_file=RUN,
        sun_distance=5.6e10,
        sun_radial_velocity=-7283.0,
        true_anomaly=300.0,
        batches=np.int64(20),
    )
    told = dict(scene_words(product))
    # sqrt(2 x 9.5e12/1.8e6) = 3.249 km/s, 9.5e12/1.8e6^2 = 2.932 m s-2, 5.6e10 m = 0.3743 au
    assert "radius 1800 km" in told["Body and gas"]
    assert (
        "2.932 m s\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT TWO}, escape speed 3.249 km/s" in told["Body and gas"]
    )
    assert (
        "0.3743 au from the Sun at a true anomaly of 300 deg and approaches it at 7.283 km/s"
        in told["Sunlight"]
    )
    assert "tide is switched off" in told["Sunlight"]
    (release,) = [text for name, text in told.items() if "impact vapour" in name]
    assert (
        "cosine to the power 2; places: latitudes 30\N{NO-BREAK SPACE}deg to 60\N{NO-BREAK SPACE}deg"
        in release
    )
    (loss,) = [text for name, text in told.items() if "charge exchange" in name]
    assert loss.endswith("at 1 au, falling with the square of the distance, everywhere.")
    # A law that has no words of its own is shown by its name and keys.
    assert (
        "is adsorbed by the law step, below 200\N{NO-BREAK SPACE}K, and then captured for good."
        in told["Surface"]
    )
    assert "20 batches" in told["Sample"]


MOVING = RUN.replace('true_anomaly = "60 deg"', 'true_anomaly = "60 deg"\nmotion = "moving"').replace(
    'rate = "2e24 s-1"\n', 'rate = "2e24 s-1"\nrate_scaling = "inverse-square"\n'
)


@pytest.fixture
def moving(make_product):
    """Return a product of a moving body, as it comes back from a file: attributes of one element are numbers."""
    return make_product().assign_attrs(
        run_file=MOVING, motion="moving", event_window=np.float64(21270.0), share_older_than_age_limit=0.034
    )


def plain(words: str) -> str:
    return words.replace("\N{NO-BREAK SPACE}", " ")


def test_what_the_numbers_of_a_moving_body_mean_is_told(moving):
    told = dict(time_words(moving))
    # 21270 s are 5.91 h.
    assert told["Return, capture and escape fluxes"].startswith(
        "What happens in the last 5.91 h before the stated"
    )
    assert "released while the body was on its way there" in told["Density, columns, images, light, ions"]
    assert "followed on along the orbit to their end" in told["Particle budget, mean life, flights"]
    assert told["Release rates"].startswith(
        "impact vapour, with the inverse square of the distance from the Sun."
    )
    assert told["Left out by the age limit"].endswith("is missing: 3.4 %.")
    release = dict(scene_words(moving))[
        "Release \N{LEFT DOUBLE QUOTATION MARK}impact vapour\N{RIGHT DOUBLE QUOTATION MARK}"
    ]
    assert plain(release).startswith("2 × 10²⁴ s⁻¹ new atoms at the stated position; speeds:")
    assert "this is its stated position" in dict(scene_words(moving))["Sunlight"]
    assert "Up to 3.4 % of the survival time lies behind the age limit" in plain(" ".join(watch(moving)))


def test_numbers_of_a_body_that_stands_still_are_those_of_a_steady_state(make_product):
    ((name, words),) = time_words(make_product().assign_attrs(run_file=RUN, motion="stationary"))
    assert name == "All numbers"
    assert words.startswith("The steady state")


def test_each_release_has_its_share_behind_the_age_limit(make_product):
    product = make_product(releases=("one", "two")).assign_attrs(
        motion="moving", event_window=3600.0, share_older_than_age_limit=np.array([0.001, 0.002])
    )
    assert dict(time_words(product))["Left out by the age limit"].endswith("0.1 % (one), 0.2 % (two).")
    # A tenth of a per cent is no caution.
    assert "survival time" not in " ".join(watch(product))


@pytest.mark.parametrize("share", ["much", np.array([0.1, 0.2]), np.nan])
def test_share_that_fits_no_release_is_not_told(moving, share):
    product = moving.assign_attrs(share_older_than_age_limit=share)
    assert "Left out by the age limit" not in dict(time_words(product))
    assert "survival time" not in " ".join(watch(product))


def test_figures_of_fluxes_say_when_their_events_happened(moving, make_product):
    words = {one.name: one.alternative for one in product_figures(moving)}
    for name in ("return-map", "capture-map", "escape-map", "escape-directions"):
        assert words[f"figure-{name}"].endswith("Events of the last 5.91 h before the stated position.")
    for name in ("release-map", "column", "density"):
        assert "stated position" not in words[f"figure-{name}"]
    assert "Of all atoms released at the stated position" in words["figure-ledger"]
    still = " ".join(one.alternative for one in product_figures(make_product()))
    assert "stated position" not in still


@pytest.mark.parametrize(
    "text", ["", "no TOML [", 'release = 5\nsun = "x"\ngas = []', "[sun]\nsolar_activity = 'much'"]
)
def test_run_file_of_any_content_raises_nothing(make_product, text):
    product = make_product().assign_attrs(run_file=text, sun_distance="far", flights="many")
    assert list(scene_words(product))
    assert list(left_out(product))
    list(watch(product))


def test_what_limits_a_product_is_said(make_product):
    product = make_product(replicates=0).assign_attrs(
        run_file=RUN, stop_reached=0, share_beyond_line_tables=np.array([0.0, 0.02])
    )
    product.number_density.values[0, 0] = 0.0
    words = " ".join(watch(product))
    for part in (
        "were given up by the propagator",
        "outlived the age limit",
        "no replicates",
        "before it reached",
        "jeans parameter of 1.6",
    ):
        assert part in words
    assert "25\N{NO-BREAK SPACE}% of the cells of number density say nothing" in words
    assert "Up to 2\N{NO-BREAK SPACE}% of the time" in words


@pytest.mark.parametrize(
    ("gas", "lines", "words"),
    [
        (
            "",
            ("na_d2",),
            "Push of sunlight: that of the lines with known g, Doppler-shifted. Photo-ionisation: the",
        ),
        ("", (), "Push of sunlight: none. Photo-ionisation: the catalogue's rate."),
        ('photoionization_rate = "0 s-1"', (), "Photo-ionisation: none."),
        ('photoionization_rate = "5e-6 s-1"', (), "Photo-ionisation: 5 × 10⁻⁶ s⁻¹ at 1 au."),
        ('radiation_acceleration = "0.05 m s-2"', ("na_d2",), "Push of sunlight: 0.05 m s⁻² at 1 au."),
    ],
)
def test_what_sunlight_does_is_told(make_product, gas, lines, words):
    text = RUN.replace('species = "Na"', f'species = "Na"\n{gas}')
    told = dict(scene_words(make_product(lines=lines).assign_attrs(run_file=text)))
    assert words in plain(told["Sunlight"])


def test_scene_without_the_sun_leaves_out_sunlight(make_product):
    with_sun, without = (
        " ".join(left_out(make_product().assign_attrs(run_file=text)))
        for text in (RUN, RUN.replace("[sun]", "[moon]"))
    )
    assert "single scattering" in with_sun
    assert "single scattering" not in without
    assert "There is no Sun in this scene" in without


def left_out_of(make_product, text, lines=("na_d2",)):
    return " ".join(left_out(make_product(lines=lines).assign_attrs(run_file=text)))


def test_what_is_left_out_fits_the_motion(make_product):
    still, moving = (left_out_of(make_product, text) for text in (RUN, MOVING))
    assert "stands still on its orbit" in still
    assert "stands still on its orbit" not in moving
    assert "the laws of release stay those of the run file" in moving


@pytest.mark.parametrize(
    ("body", "words", "others"),
    [
        ('name = "Moon"', "The gravity and shadow of Earth", "Should the body be a moon"),
        ('name = "Europa"', "The gravity and shadow of Jupiter", "Should the body be a moon"),
        ('name = "Mercury"', "A smooth sphere", "gravity and shadow"),
        ('name = "Harrow"', "Should the body be a moon", "of Earth"),
        ('name = "Harrow"\norbit = { eccentricity = 0.1 }', "A smooth sphere", "gravity and shadow"),
    ],
)
def test_host_is_left_out_where_there_is_one(make_product, body, words, others):
    told = left_out_of(make_product, RUN.replace('name = "Harrow"', body))
    assert words in told
    assert others not in told


HOSTED = RUN.replace(
    'name = "Harrow"',
    'name = "Tine"\nhost = { gm = "9500 km3 s-2", radius = "1800 km", distance = "14000 km", phase_angle = "8 deg" }',
)


def test_a_host_is_told(make_product):
    attributes = {"host": "the host of Tine", "host_radius": 1.8e6, "phase_angle": 8.0}
    told = {}
    for motion in ("stationary", "moving"):
        text = HOSTED.replace('true_anomaly = "60 deg"', f'true_anomaly = "60 deg"\nmotion = "{motion}"')
        product = make_product().assign_attrs(
            run_file=text, host_position=np.array([8.4e6, 11.2e6, 0.0]), **attributes
        )
        told[motion] = plain(dict(scene_words(product))["Host"]), left_out_of(make_product, text)
        assert "keeps the same face to the host" in dict(scene_words(product))["Body and gas"]
    host, caution = told["stationary"]
    assert host.startswith(
        "the host of Tine, a sphere of radius 1800 km, 14,000 km away, at a phase angle of 8 deg"
    )
    assert "it keeps its place while atoms fly" in host
    assert "the Sun's direction turns along with it" in caution
    host, caution = told["moving"]
    assert "the moon goes round it while atoms fly" in host
    assert "the Sun's direction turns along with it" not in caution
    assert "Host" not in dict(scene_words(make_product().assign_attrs(run_file=RUN)))


def test_what_is_left_out_fits_the_ground(make_product):
    kept, bouncing, resting = (
        left_out_of(make_product, RUN.replace('sticking = { law = "step", below = "200 K" }', ground))
        for ground in ("sticking = 0.5", "sticking = 0.0", 'sticking = 0.5\nadsorbed = "desorbed"')
    )
    assert "captured for good" in kept
    assert "one energy of desorption" not in kept
    assert "captured for good" not in bouncing
    assert "one energy of desorption" not in bouncing
    assert "one energy of desorption" in resting
    assert "captured for good" not in resting
    assert "the ground has one temperature everywhere" in kept


def test_gas_without_lines_leaves_out_its_brightness(make_product):
    dark = left_out_of(make_product, RUN, lines=())
    assert "nothing about its brightness" in dark
    assert "single scattering" not in dark


GROUND = """
[body]
name = "Harrow"
[[release]]
name = "vent"
place = {{ law = "map", file = "vents.nc", variable = "flux" }}
[surface]
{}
"""


@pytest.mark.parametrize(
    ("ground", "words"),
    [
        ("sticking = 0.0", "Every atom that returns bounces, with an energy accommodation of 1."),
        ("sticking = 1.0", "Every atom that returns is adsorbed and then captured for good."),
        (
            "sticking = 0.5\naccommodation = 0.7",
            "An atom that returns is adsorbed with probability 0.5 and then captured for good. Others bounce, with an "
            "energy accommodation of 0.7.",
        ),
        (
            'sticking = { law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }',
            "with probability 0.5 on ground of 250 K, less by a factor e for every 272.8 K above that, and then",
        ),
        (
            'sticking = 1.0\nadsorbed = "desorbed"\n'
            'desorption = { energy = "1.85 eV", attempt_frequency = "1e13 s-1" }',
            "leaves again after its residence time, exp(E/kT)/frequency with E = 1.85 eV and a frequency of "
            "1 × 10¹³ s⁻¹.",
        ),
        (
            'cold_traps = { poleward_of = "85 deg" }',
            "Cold traps: all ground poleward of 85 deg keeps what lands",
        ),
        ('temperature = { law = "hurley-2015" }', "a fit to observed temperatures of the Moon"),
        (
            'temperature = { law = "conduction", thermal_inertia = "50 J m-2 K-1 s-1/2", albedo = 0.1, '
            "emissivity = 0.95 }",
            "ground that conducts heat and radiates (thermal inertia 50",
        ),
    ],
)
def test_ground_is_told_in_words(make_product, ground, words):
    told = dict(scene_words(make_product().assign_attrs(run_file=GROUND.format(ground))))
    assert words in plain(told["Surface"])
    (release,) = [text for name, text in told.items() if "vent" in name]
    assert "places: the map flux of vents.nc." in release


@pytest.mark.parametrize(
    ("scene", "words"),
    [
        ("abc", ""),
        ("xyz", "made from another scene"),
        (None, "does not tell from which product"),
    ],
)
def test_plan_of_another_product_is_told(make_product, scene, words):
    notes = {} if scene is None else {"product_scene_hash": scene}
    plan = PlanTable({"time": np.arange(2.0), "do_not_command": np.array([True, False])}, notes)
    told = list(plan_cautions(make_product().assign_attrs(scene_hash="abc"), plan))
    assert told[0].startswith("1 of 2 planned exposures lie inside a keep-out")
    assert words in " ".join(told)
    assert len(told) == (3 if words else 2)


def test_every_figure_has_a_heading_and_an_alternative(make_product, empty):
    product = make_product()
    figures = list(product_figures(product))
    # Three of all; of four images column and brightness, of three a tail; six maps.
    assert len(figures) == 3 + 2 * 4 + 3 + len(MAPS)
    assert len({one.name for one in figures}) == len(figures)
    assert all(len(one.alternative) > 30 and one.heading for one in figures)
    assert "Nothing was counted" in " ".join(one.alternative for one in product_figures(empty(product)))


def test_atoms_at_rest_are_shown_only_where_some_rest(make_product):
    product = make_product()
    names = {one.name for one in product_figures(product)}
    without = {one.name for one in product_figures(product.drop_vars("adsorbed_column"))}
    assert names - without == {"figure-adsorbed-map"}


def test_largest_cell_of_a_map_is_named(make_product):
    product = make_product()
    product.return_flux.values[0, 3, 1] = 9e11
    (words,) = [one.alternative for one in product_figures(product) if one.name == "figure-return-map"]
    gap = "\N{NO-BREAK SPACE}"
    assert f"9{gap}\N{MULTIPLICATION SIGN}{gap}10⁷ cm⁻² s⁻¹, at latitude 67.5 deg and local time 6 h" in words


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (0.0, "0"),
        (1800.0, "1800"),
        (12345.6, "12,350"),
        (2e24, "2 × 10²⁴"),
        (2.34567e-7, "2.346 × 10⁻⁷"),
        (-1e6, "-1 × 10⁶"),
        (float("inf"), "inf"),
    ],
)
def test_numbers_read_well(value, text):
    assert number(value).replace("\N{NO-BREAK SPACE}", " ") == text


def test_quantities_durations_and_shares_read_well():
    plain = {ord("\N{NO-BREAK SPACE}"): " "}
    assert quantity("2e24 s-1").translate(plain) == "2 × 10²⁴ s⁻¹"
    assert quantity("2031-06-01T00:00:00") == "2031-06-01T00:00:00"
    assert raised("km3 s-2") == "km³ s⁻²"
    assert duration(5400.0).translate(plain) == "1.5 h"
    assert percent(0.527412, 0.000781).translate(plain) == "52.741 ± 0.078 %"
    assert percent(1.0, 1e-12).translate(plain) == "100 %"
