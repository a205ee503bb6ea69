"""Images resolved by velocity as people meet them on the command line."""

import json

import pytest

from tracer.__main__ import main
from tracer.product.writing import save_product

VELOCITY = 'image[1].velocity={ from = "-1 km/s", to = "1 km/s", bins = 3 }'


def said_by(capsys, *words: str) -> tuple[str, str]:
    with pytest.raises(SystemExit) as ended:
        main(list(words))
    assert not ended.value.code
    shown = capsys.readouterr()
    return shown.out, shown.err


def test_run_says_what_the_bins_leave_out_and_summary_how_well_velocities_are_known(
    small_run_file, tmp_path, capsys
):
    product = str(tmp_path / "small.nc")
    settings = ["--set", VELOCITY, "--set", "ensemble.replicates=6"]
    _, err = said_by(capsys, "run", str(small_run_file), "-o", product, *settings)
    assert "Note: image tail_from_north: " in err
    assert "% of its atoms are slower or faster than all bins of velocity" in err
    wide = VELOCITY.replace("1 km/s", "100 km/s")
    _, err = said_by(
        capsys, "run", str(small_run_file), "-o", str(tmp_path / "wide.nc"), "--set", wide, "--workers", "1"
    )
    assert "bins of velocity" not in err
    out, _ = said_by(capsys, "summary", product)
    row = next(line for line in out.splitlines() if line.strip().startswith("mean_velocity_tail_from_north"))
    assert row.rstrip().endswith(" m s-1")
    # A velocity may be any side of 0: its relative error says nothing.
    out, _ = said_by(capsys, "summary", product, "--json")
    errors = json.loads(out)["median_relative_standard_error"]
    assert "column_by_velocity_tail_from_north" in errors
    assert "mean_velocity_tail_from_north" not in errors
    figure = tmp_path / "velocity.png"
    said_by(capsys, "plot", product, "--what", "velocity", "-o", str(figure), "--dpi", "50")
    assert figure.read_bytes().startswith(b"\x89PNG")


def test_a_product_without_velocities_has_no_such_figure(small_product, tmp_path, capsys):
    save_product(small_product, tmp_path / "small.nc")
    with pytest.raises(SystemExit) as ended:
        main(["plot", str(tmp_path / "small.nc"), "--what", "velocity", "-o", str(tmp_path / "v.png")])
    assert ended.value.code == 2
    assert "small.nc: no image is resolved by velocity; give one velocity = " in capsys.readouterr().err
    assert not (tmp_path / "v.png").exists()


def test_check_says_that_without_replicates_velocities_have_no_errors(small_run_file, capsys):
    out, _ = said_by(
        capsys, "check", str(small_run_file), "--set", VELOCITY, "--set", "ensemble.replicates=0"
    )
    assert "means and widths of velocities come without errors" in out
    out, _ = said_by(capsys, "check", str(small_run_file), "--set", VELOCITY)
    assert "means and widths of velocities" not in out
