"""Which laws of launch speed can be evaluated from responses, and what is said of the others."""

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS
from tracer.errors import InputError
from tracer.observe.responses import BinsDoNotCover, evaluate_law, law_weights
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.single import Single
from tracer.physics.release.speed_bins import speed_bin_edges

SODIUM = 22.98977 * ATOMIC_MASS
ESCAPE = 3249.0
EDGES = speed_bin_edges(32, ESCAPE, 1206.0, 3000.0)


def test_words_and_laws_mean_the_same():
    theirs = law_weights(MaxwellFlux(1200.0), EDGES, SODIUM, ESCAPE)
    assert theirs.shape == (32, 2)
    # A response that is 1 at all speeds gives the law's probability.
    assert theirs[:, 0].sum() == pytest.approx(1.0, abs=1e-9)
    for kelvin in (1200.0, "1200 K", 1200):
        words = {"law": "maxwell-flux", "temperature": kelvin}
        assert np.array_equal(law_weights(words, EDGES, SODIUM, ESCAPE), theirs)


def test_every_law_of_the_run_file_with_a_density_can_be_evaluated():
    speeds = np.array([0.0, 1000.0, 5000.0])
    for words in (
        {"law": "maxwell-gas", "temperature": "1200 K"},
        {"law": "sigmund-thompson", "binding_energy": "2 eV", "cutoff_energy": "500 eV"},
        {"law": "table", "speed": speeds, "pdf": [0.0, 1.0, 0.0]},
    ):
        assert law_weights(words, EDGES, SODIUM, ESCAPE)[:, 0].sum() == pytest.approx(1.0, abs=0.01)


@pytest.mark.parametrize(
    ("law", "message"),
    [
        ({"law": "maxwell-flux", "temperature": 1e6}, r"% of the law is faster than the last bin"),
        ({"law": "maxwell-flux", "temperature": 0.5}, "narrower than the bins"),
        ({"law": "maxwell-flux", "temperature": 1e-250}, "narrower than the bins"),
        ({"law": "maxwell-gas", "temperature": 1e-250}, "narrower than the bins"),
        ({"law": "table", "speed": [1000.0, 1001.0], "pdf": [1.0, 1.0]}, "narrower than the bins"),
        ({"law": "maxwell-flux", "temperature": "1200"}, "temperature: .*unit"),
        ({"law": "maxwell-flux", "temperature": -3.0}, "temperature: -3.0 is out of range; must be above 0"),
        ({"law": "maxwell-flux", "temperature": float("nan")}, "temperature: .* out of range"),
        (
            {"law": "maxwell-flux", "temprature": 1200.0},
            "temprature: unknown key; maxwell-flux takes temperature",
        ),
        ({"law": "maxwell-flux"}, "temperature: missing"),
        (
            {"law": "single", "speed": "2 km/s"},
            'law: "single" cannot be evaluated from responses; allowed: maxwell',
        ),
        (
            {"law": "sigmund-thompson", "binding_energy": "2 eV", "cutoff_energy": "1 eV"},
            "cutoff_energy: .* too low",
        ),
        ({"law": "table", "speed": [3.0, 2.0], "pdf": [1.0, 1.0]}, "speed: must be finite and rise"),
        (
            {"law": "table", "speed": [1.0, 2.0], "pdf": [0.0, 0.0]},
            "pdf: must be finite, at least 0, and not 0",
        ),
        ({"law": "table", "speed": [1.0, 2.0], "pdf": [1.0]}, "two lists of the same length"),
        (Single(2000.0), "Single has no density"),
        (MaxwellFlux(None), "the ground's own cannot be evaluated"),
    ],
)
def test_other_laws_are_refused(law, message):
    with pytest.raises(InputError, match=message):
        law_weights(law, EDGES, SODIUM, ESCAPE)


def test_laws_that_bins_do_not_cover_have_an_error_of_their_own():
    with pytest.raises(BinsDoNotCover):
        law_weights({"law": "maxwell-flux", "temperature": 1e6}, EDGES, SODIUM, ESCAPE)


def test_product_without_responses_is_refused(small_product):
    with pytest.raises(InputError, match="keeps no responses; add speed_bins = 32"):
        evaluate_law(small_product, 0, MaxwellFlux(1200.0))
