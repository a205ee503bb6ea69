"""Photo-losses by solar activity, and which of them leave an ion."""

import pytest

from tracer.physics.photo_losses import photo_loss


def test_atoms_are_ionised_and_nothing_else():
    loss = photo_loss("Na", 0.0)
    assert loss is not None
    # Huebner, Keady & Lyon (1992), Astrophys. Space Sci. 195, 1 (memory): 5.9e-6 s-1, quiet Sun.
    assert loss.ionizing == 5.9e-6
    assert loss.other == 0.0
    assert loss.told_apart


def test_rate_goes_linearly_from_quiet_to_active_sun():
    half = photo_loss("He", 0.5)
    assert half is not None
    assert half.total == pytest.approx(0.5 * (5.3e-8 + 1.5e-7), rel=1e-12)


def test_most_of_water_breaks_without_an_ion():
    loss = photo_loss("H2O", 0.0)
    assert loss is not None
    assert loss.told_apart
    assert loss.total == pytest.approx(1.2e-5, rel=1e-12)
    assert 0.02 < loss.ionizing / loss.total < 0.05


def test_channels_not_told_apart_count_as_other():
    loss = photo_loss("CH4", 1.0)
    assert loss is not None
    assert not loss.told_apart
    assert loss.ionizing == 0.0
    assert loss.other == 1.7e-5


def test_unknown_species_has_no_rate():
    assert photo_loss("Xx", 0.0) is None


@pytest.mark.parametrize("activity", [-0.1, 1.1, float("nan")])
def test_activity_outside_0_to_1_is_refused(activity):
    with pytest.raises(ValueError, match="activity"):
        photo_loss("Na", activity)
