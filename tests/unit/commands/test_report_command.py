"""`tracer report` as people use it."""

from itertools import islice

import netCDF4
import pytest

from tracer.__main__ import main
from tracer.plots.page import document
from tracer.plots.page.figure_list import product_figures
from tracer.product.writing import save_product

PLAN = "time,tangent_altitude_km,brightness_na_d2_rayleigh,snr,do_not_command\n1,20,1e4,30,False\n2,30,1e3,8,True\n"


@pytest.fixture
def folder(tmp_path, monkeypatch, small_product):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(document, "DOTS_PER_INCH", 50)
    monkeypatch.setattr(document, "product_figures", lambda ds: islice(product_figures(ds), 1))
    save_product(small_product, "small.nc")
    (tmp_path / "plan.csv").write_text(PLAN, encoding="utf-8")
    return tmp_path


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["report", *words])
    return ended.value.code or 0


def test_page_is_written_and_always_the_same(folder, capsys):
    assert ending_of("small.nc", "plan.csv", "-o", "page.html") == 0
    assert capsys.readouterr().out == "page.html\n"
    first = (folder / "page.html").read_bytes()
    assert first.startswith(b'<!DOCTYPE html>\n<html lang="en">')
    assert b"Planned observation" in first
    assert ending_of("small.nc", "plan.csv", "-o", "page.html", "--overwrite") == 0
    assert (folder / "page.html").read_bytes() == first


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (
            ["small.nc", "-o", "page.pdf"],
            '--output: "page.pdf" has none of the endings of a page: .html, .htm',
        ),
        (["none.nc", "-o", "page.html"], "none.nc: no such file"),
        (["small.nc", "none.csv", "-o", "page.html"], "none.csv: no such file"),
        (["small.nc", "-o", "nowhere/page.html"], "nowhere/page.html: there is no folder"),
    ],
)
def test_what_cannot_be_reported_ends_with_2_one_line_and_no_file(folder, capsys, words, message):
    before = sorted(path.name for path in folder.iterdir())
    assert ending_of(*words) == 2
    told = capsys.readouterr().err
    assert told.startswith(f"tracer: {message}")
    assert told.count("\n") == 1
    assert sorted(path.name for path in folder.iterdir()) == before


def test_changed_product_is_refused(folder, capsys):
    with netCDF4.Dataset("small.nc", "a") as file:
        file["ledger"][0, 0] = 1.0
    assert ending_of("small.nc", "-o", "page.html") == 2
    assert "do not match its data_checksum" in capsys.readouterr().err
