"""`tracer plot` as people use it."""

import subprocess
import sys

import pytest

from tracer.__main__ import main
from tracer.plots.figures import FIGURES, SWEPT_FIGURES, What
from tracer.product.writing import save_product


@pytest.fixture
def folder(tmp_path, monkeypatch, small_product):
    monkeypatch.chdir(tmp_path)
    save_product(small_product, "small.nc")
    return tmp_path


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["plot", *words])
    return ended.value.code or 0


@pytest.mark.parametrize(
    ("name", "start"), [("map.png", b"\x89PNG\r\n"), ("map.PDF", b"%PDF"), ("map.svg", b"<?xml")]
)
def test_figure_is_written_in_the_kind_of_its_ending_and_always_the_same(folder, capsys, name, start):
    words = ["small.nc", "--what", "column", "--width", "column", "--dpi", "50", "-o", name]
    assert ending_of(*words) == 0
    shown = capsys.readouterr()
    assert shown.out == f"{name}\n"
    assert shown.err == "Next: tracer report small.nc -o report.html\n"
    first = (folder / name).read_bytes()
    assert first.startswith(start)
    assert ending_of(*words, "--overwrite") == 0
    assert (folder / name).read_bytes() == first
    assert sorted(path.name for path in folder.iterdir()) == sorted(["small.nc", name])


def test_existing_file_is_kept(folder, capsys):
    (folder / "tail.png").write_bytes(b"precious")
    assert ending_of("small.nc", "--what", "ledger", "-o", "tail.png") == 2
    assert (
        capsys.readouterr().err
        == "tracer: tail.png: exists; --overwrite replaces it, or name another output\n"
    )
    assert (folder / "tail.png").read_bytes() == b"precious"


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (
            ["-o", "a.jpg", "--what", "ledger"],
            '--output: "a.jpg" has none of the endings of a figure: .png, .pdf, .svg',
        ),
        (
            ["-o", "a", "--what", "ledger"],
            '--output: "a" has none of the endings of a figure: .png, .pdf, .svg',
        ),
        (
            ["-o", "a.png", "--what", "density", "--line", "na_d2"],
            "--line: goes with --what image, tail, velocity, swept-brightness and swept-tail, not with --what density",
        ),
        (
            ["-o", "a.png", "--what", "ledger", "--image", "tail"],
            "--image: goes with --what image, tail, velocity, swept-brightness and swept-tail, not with --what ledger",
        ),
        (
            ["-o", "a.png", "--what", "plan", "--release", "sputtering"],
            "--release: goes with --what figures of a product, not with --what plan",
        ),
        (
            ["-o", "a.png", "--what", "image", "--image", "tale"],
            'small.nc: there is no image "tale"; allowed: "tail_from_north"',
        ),
        (
            ["-o", "a.png", "--what", "column", "--release", "vent"],
            'small.nc: there is no release "vent"; allowed: "impact vapour", "sputtering"',
        ),
        (
            ["-o", "a.png", "--what", "adsorbed-map"],
            "small.nc: the product has no adsorbed_column: in its run no atom rests on the ground",
        ),
    ],
)
def test_what_cannot_be_drawn_ends_with_2_one_line_and_no_file(folder, capsys, words, message):
    assert ending_of("small.nc", *words) == 2
    shown = capsys.readouterr()
    assert (shown.out, shown.err) == ("", f"tracer: {message}\n")
    assert [path.name for path in folder.iterdir()] == ["small.nc"]


def test_line_of_a_gas_without_lines_is_refused(folder, capsys):
    words = ["small.nc", "--what", "image", "--line", "na_d2", "-o", "a.png"]
    assert ending_of(*words) == 2
    reason = 'there is no line "na_d2": the gas of this product has no lines with g'
    assert capsys.readouterr().err == f"tracer: small.nc: {reason}\n"


def test_damaged_product_is_one_message(folder, capsys):
    content = bytearray((folder / "small.nc").read_bytes())
    content[len(content) // 3 : len(content) // 3 * 2] = bytes(len(content) // 3)
    (folder / "small.nc").write_bytes(content)
    assert ending_of("small.nc", "--what", "density", "-o", "a.png") == 2
    assert capsys.readouterr().err.startswith("tracer: small.nc: is damaged")


def test_unknown_figure_ends_with_2(folder, capsys):
    assert ending_of("small.nc", "--what", "spectrum", "-o", "a.png") == 2
    told = capsys.readouterr().err
    assert all(word in told for word in ("spectrum", "column", "density", "image", "ledger"))


def test_command_leaves_windows_and_kernels_alone():
    code = (
        "import sys, tracer.commands.plot; "
        "print([name for name in ('matplotlib.pyplot', 'numba', 'tracer.engine') if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "[]\n"


PLAN = "time,tangent_altitude_km,brightness_na_d2_rayleigh,snr,do_not_command\n1,20,1e4,30,False\n2,30,1e3,8,True\n"


def test_plan_is_drawn_without_a_product(folder, capsys):
    (folder / "plan.csv").write_text(PLAN, encoding="utf-8")
    assert ending_of("plan.csv", "--what", "plan", "--dpi", "50", "-o", "plan.svg") == 0
    shown = capsys.readouterr()
    assert shown.out == "plan.svg\n"
    assert shown.err == "Next: tracer report PRODUCT.nc plan.csv -o report.html\n"
    assert "not to be commanded" in (folder / "plan.svg").read_text(encoding="utf-8")


@pytest.mark.parametrize("what", ["profile", "tail", "return-map"])
def test_figure_is_drawn_with_no_more_of_the_product_than_it_needs(folder, capsys, what):
    words = ["small.nc", "--what", what, "--width", "column", "--dpi", "50", "-o", "a.png"]
    assert ending_of(*words) == 0
    assert capsys.readouterr().out == "a.png\n"


def test_every_word_but_that_of_a_plan_has_its_figure():
    assert [*FIGURES, What.PLAN, *SWEPT_FIGURES] == list(What)
