"""What the light's data files hold."""

from tracer.catalogue.lines import lines, lines_of
from tracer.catalogue.load import gases, source_notes
from tracer.catalogue.photo_rates import photo_rates


def test_every_line_and_rate_belongs_to_a_known_gas_or_ion():
    assert {line.species for line in lines().values()} - set(gases()) == {"Ca+"}
    assert set(photo_rates()) <= set(gases())


def test_lines_say_whether_their_g_is_known():
    unknown = {line.name for line in lines().values() if not line.has_g}
    assert unknown == {"mg_2852", "h_lyman_alpha", "he_584", "o_1302"}


def test_lines_of_sodium():
    names = [line.name for line in lines_of("Na")]
    assert names == ["na_d2", "na_d1"]
    assert lines_of("Ne") == ()


def test_wavelengths_are_in_vacuum_and_longer_than_in_air():
    for line in lines().values():
        if line.wavelength_air is not None:
            # Refractive index of air, 1.00027 to 1.0003 over the visible and near ultraviolet.
            assert 1.00026 < line.wavelength / line.wavelength_air < 1.00031


def test_receding_atom_samples_the_violet_side():
    line = lines()["na_d2"]
    assert line.velocity_of_offset(-0.1e-10) > 0.0


def test_residual_flux_covers_fast_atoms():
    for name in ("na_d2", "na_d1", "k_d2", "k_d1", "ca_4227"):
        line = lines()[name]
        assert line.residual_flux is not None
        reach = min(abs(line.velocity_of_offset(line.residual_flux.offset[i])) for i in (0, -1))
        assert reach > 58e3


def test_ionising_part_is_less_than_all():
    for rate in photo_rates().values():
        if rate.ionizing_quiet is not None and rate.ionizing_active is not None:
            assert 0.0 < rate.ionizing_quiet <= rate.quiet
            assert 0.0 < rate.ionizing_active <= rate.active
        assert rate.low <= rate.quiet <= rate.active <= rate.high


def test_data_files_carry_their_sources():
    for name in ("lines", "g_values_1au", "photo_rates_1au", "photo_channels_1au", "solar_residual_flux"):
        assert "memory" in source_notes(f"{name}.csv") or "Derived" in source_notes(f"{name}.csv")
