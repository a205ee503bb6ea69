"""Moons beside their host as people meet them on the command line."""

from pathlib import Path

import pytest

from tracer.__main__ import main

TINE = str(Path(__file__).parents[3] / "runs" / "tine-sodium.toml")


def said_by(capsys, *words: str) -> str:
    with pytest.raises(SystemExit) as ended:
        main(list(words))
    assert not ended.value.code
    return capsys.readouterr().out


@pytest.mark.parametrize(
    ("angle", "words"),
    [
        (0.5, "full moon"),
        (80.0, "near last quarter"),
        (120.0, "between last quarter and new moon"),
        (184.0, "near new moon"),
        (300.0, "between first quarter and full moon"),
        (359.5, "full moon"),
    ],
)
def test_check_names_the_phase(angle, words, capsys):
    out = said_by(capsys, "check", TINE, "--set", f"body.host.phase_angle={angle} deg")
    row = next(line for line in out.splitlines() if line.strip().startswith("phase angle"))
    assert row.endswith(f"; {words} seen from the host")


def test_run_says_what_hit_the_host(tmp_path, capsys):
    few = ("ensemble.particles_per_batch=20", "ensemble.batches=2", "ensemble.replicates=2")
    settings = [word for setting in few for word in ("--set", setting)]
    out = said_by(capsys, "run", TINE, "-o", str(tmp_path / "tine.nc"), "--workers", "1", *settings)
    assert "of all hit the host planet, part of what is lost otherwise" in out
