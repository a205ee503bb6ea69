"""Whether fitted ranges hold the truth as often as they say, over 400 draws of noise."""

import sys
import time
from pathlib import Path
from typing import NamedTuple

import numpy as np
import xarray as xr

import tracer
from tracer.observe.fit.comparison import components_of, fit, optics_for
from tracer.observe.fit.gathering import gather
from tracer.observe.fit.likelihood import Measured, slots_of
from tracer.observe.fit.profile import Profile
from tracer.observe.observationspec.observation import ObservationSpec, parse_observation

RUN_FILE = Path(__file__).parents[3] / "runs" / "harrow-sodium-sources.toml"
DRAWS, SEED = 400, 20310901
MODEL = ("ensemble.seed=20310601", "ensemble.particles_per_batch=16000", "ensemble.emphasis=far")
TRUTH = (
    "ensemble.seed=20310999",
    "ensemble.particles_per_batch=16000",
    "ensemble.emphasis=far",
    "ensemble.speed_bins=0",
    "release[1].speed.temperature=1500 K",
    "release[2].speed.temperature=3600 K",
    "release[2].rate=1.5e24 s-1",
)
TRUE = {
    "photon desorption: rate": 2e24,
    "impact vapour: rate": 1.5e24,
    "photon desorption: temperature": 1500.0,
    "impact vapour: temperature": 3600.0,
}
POSITIONS = np.arange(-2.5, 15.01, 0.5)
NOISE_OVER_MODEL, LEAST_NOISE = 20.0, 0.05
BANDS = ((0.62, 0.74), (0.92, 0.98))
OBSERVATION = """
[profile]
file = "none.csv"
position = "downtail_radii"
value = "brightness_R"
sigma = "sigma_R"
quantity = "brightness"
line = "na_d2"
along = "downtail"
[view]
look_from = "north"
[slit]
width = "1 radii"
length = "0.5 radii"
[seeing]
fwhm = "0.8 radii"
[fit]
releases = [RELEASES]
"""
RANGES = {"photon desorption": ("500 K", "5000 K"), "impact vapour": ("1200 K", "10000 K")}


class Case(NamedTuple):
    """A profile without noise, its standard errors, and what is fitted to it."""

    truth: np.ndarray
    sigma: np.ndarray
    spec: ObservationSpec
    components: list


def observation(releases: list[str]) -> ObservationSpec:
    """Return an observation file that fits rate and temperature of each release."""
    text = OBSERVATION.replace("RELEASES", ", ".join(f'"{name}"' for name in releases))
    for name in releases:
        low, high = RANGES[name]
        text += f'[[fit.release]]\nname = "{name}"\ntemperature = ["{low}", "{high}"]\n'
    return parse_observation(text, "observation")


def case_of(model: xr.Dataset, truth: xr.Dataset, releases: list[str]) -> Case:
    """Return what is seen of some releases of the truth, and how the model explains it."""
    spec = observation(releases)
    none = np.zeros(len(POSITIONS))
    optics = optics_for(spec, Profile(POSITIONS, none, none + 1.0, none > 0.0, "radii", "R", 1.0), model)
    real = gather(truth, "truth", spec.profile.line, optics, responses=False).sources
    seen = np.sum([one.rate * one.mean for one in real if one.name in releases], axis=0)
    sources = gather(model, "model", spec.profile.line, optics, responses=True).sources
    components = components_of(spec, sources)
    errors = [
        one.rate
        * part.curve.replicates_at(np.log([TRUE[f"{part.name}: temperature"]])).std(axis=0, ddof=1)
        / 20**0.5
        for part in components
        for one in real
        if one.name == part.name
    ]
    return Case(
        seen,
        np.maximum(LEAST_NOISE * seen, NOISE_OVER_MODEL * np.sqrt(np.sum(np.square(errors), axis=0))),
        spec,
        components,
    )


def coverage(case: Case, draws: int, seed: int) -> tuple[list[str], np.ndarray, np.ndarray]:
    """Return the names of the free parameters, how often 68 and 95 % ranges hold the truth, and rates over errors."""
    rng = np.random.default_rng(seed)
    hits, depths = [], []
    for _ in range(draws):
        value = case.truth + case.sigma * rng.normal(size=len(case.truth))
        data = Measured(value, case.sigma, np.zeros(len(value), bool), 0.0)
        slots = slots_of(data, case.components, False)
        fitted = fit(data, case.components, slots)
        true = np.array([TRUE[slot.name] for slot in slots])
        ends = np.array(fitted.ranges)
        hits.append(
            [(ends[:, 1] <= true) & (true <= ends[:, 2]), (ends[:, 3] <= true) & (true <= ends[:, 4])]
        )
        depths.append([2.0 * e[0] / (e[2] - e[1]) for e in ends[: len(case.components)]])
    return [slot.name for slot in slots], np.mean(hits, axis=0), np.median(depths, axis=0)


def main(draws: int) -> int:
    """Print how often ranges hold the truth, and return 0 where all of them do as often as they say."""
    model, truth = (tracer.run(tracer.load_run(RUN_FILE, list(settings))) for settings in (MODEL, TRUTH))
    fine = True
    print(f"{'':32s} {'68 %':>8s} {'95 %':>8s}   rate over error")
    for releases in (["photon desorption"], ["impact vapour"], ["photon desorption", "impact vapour"]):
        case, begin = case_of(model, truth, releases), time.monotonic()
        names, shares, depths = coverage(case, draws, SEED)
        print(f"{' and '.join(releases)}: noise {100 * np.median(case.sigma / case.truth):.2g} % (median)")
        for i, name in enumerate(names):
            good = all(low <= share <= high for (low, high), share in zip(BANDS, shares[:, i], strict=True))
            fine &= good
            depth = f"{depths[i]:8.1f}" if i < len(depths) else ""
            print(f"  {name:30s} {shares[0, i]:8.3f} {shares[1, i]:8.3f}   {depth} {'' if good else 'FAILS'}")
        print(f"  {(time.monotonic() - begin) / draws:.3f} s a fit")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else DRAWS))
