from tracer.product.layout import has_lines, layout, resolved_images, variable_names, why_no_product

GROUND = ("release", "latitude", "local_time")


def test_every_variable_of_gravity_has_its_dimensions_and_unit():
    table = {name: (row.dimensions, row.unit) for name, row in layout(["tail"]).items()}
    assert table == {
        "number_density": (("release", "altitude", "latitude", "local_time"), "m-3"),
        "vertical_column": (GROUND, "m-2"),
        "column_tail": (("release", "tail_vertical", "tail_horizontal"), "m-2"),
        "release_flux": (GROUND, "m-2 s-1"),
        "return_flux": (GROUND, "m-2 s-1"),
        "capture_flux": (GROUND, "m-2 s-1"),
        "escape_flux": (GROUND, "m-2 s-1"),
        "escape_rate_by_direction": (GROUND, "s-1 sr-1"),
        "adsorbed_column": (GROUND, "m-2"),
        "ionization_rate": (("release", "altitude", "latitude", "local_time"), "m-3 s-1"),
        "ledger": (("release", "fate"), "s-1"),
        "host_impact_rate": (("release",), "s-1"),
        "roulette_balance": (("release",), "s-1"),
        "mean_flights": (("release",), "1"),
        "mean_life": (("release",), "s"),
        "surface_temperature": (("latitude", "local_time"), "K"),
        "cell_volume": (("altitude", "latitude"), "m3"),
        "cell_area": (("latitude",), "m2"),
    }


def test_gas_with_lines_shines_by_line():
    table = layout(["tail"], lines=True)
    by_line = {name: (row.dimensions, row.unit) for name, row in table.items() if "line" in row.dimensions}
    assert by_line == {
        "emission_rate": (("line", "release", "altitude", "latitude", "local_time"), "m-3 s-1"),
        "brightness_tail": (("line", "release", "tail_vertical", "tail_horizontal"), "1e10 m-2 s-1"),
    }
    assert all(table[name].replicated for name in by_line)
    assert {name for name in table if has_lines(name)} == set(by_line)


BINS = ("release", "tail_velocity", "tail_vertical", "tail_horizontal")
PIXELS = ("release", "tail_vertical", "tail_horizontal")


def test_an_image_resolved_by_velocity_has_bins_means_and_widths():
    table = layout(["limb", "tail"], lines=True, velocities=["tail"])
    plain = layout(["limb", "tail"], lines=True)
    added = {name: (row.dimensions, row.unit) for name, row in table.items() if name not in plain}
    assert added == {
        "column_by_velocity_tail": (BINS, "m-2"),
        "column_outside_velocity_tail": (PIXELS, "m-2"),
        "mean_velocity_tail": (PIXELS, "m s-1"),
        "velocity_width_tail": (PIXELS, "m s-1"),
        "brightness_by_velocity_tail": (("line", *BINS), "1e10 m-2 s-1"),
        "brightness_outside_velocity_tail": (("line", *PIXELS), "1e10 m-2 s-1"),
        "line_shift_tail": (("line", *PIXELS), "m s-1"),
        "line_width_tail": (("line", *PIXELS), "m s-1"),
    }
    assert {name for name in table if has_lines(name)} == {
        name for name, row in table.items() if row.dimensions[0] == "line"
    }
    assert all(table[name].replicated for name in added)
    assert resolved_images([*BINS, "limb_vertical", "limb_horizontal"]) == ["tail"]


def test_names_of_images_collide_with_those_of_velocities():
    names = variable_names(["tail", "by_velocity_tail"], velocities=["tail"])
    assert "column_by_velocity_tail" in {name for name in names if names.count(name) > 1}
    assert len(set(variable_names(["tail", "limb"], True, ["tail", "limb"]))) == len(
        variable_names(["tail", "limb"], True, ["tail", "limb"])
    )


def test_fields_for_sums_over_cells_are_kept_as_replicates():
    kept = {name for name, row in layout(["tail"]).items() if row.replicated}
    assert kept == {"number_density", "vertical_column", "column_tail"}


def test_names_of_two_images_that_collide_come_twice():
    names = variable_names(["tail", "tail_standard_error"])
    assert {name for name in names if names.count(name) > 1} == {
        "column_tail_standard_error",
        "brightness_tail_standard_error",
    }


def test_names_of_images_that_do_not_collide_come_once():
    names = variable_names(["tail", "limb"])
    assert len(names) == len(set(names))


def test_a_later_product_version_is_told_with_the_known_one():
    variables = ("ledger", "release_name", "fate_name")
    assert why_no_product({"product_version": 1}, variables) is None
    reason = why_no_product({"product_version": 2}, variables)
    assert reason == "is of product_version 2; this package reads version 1"
