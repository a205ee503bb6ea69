"""Whether fitted ranges hold the truth as often as they say, over 400 draws of noise."""

import sys
import time
from pathlib import Path
from typing import NamedTuple

import numpy as np
import xarray as xr

import tracer
from tracer.observe.fit.comparison import components_of, optics_for
from tracer.observe.fit.fitting import fit
from tracer.observe.fit.gathering import gather
from tracer.observe.fit.likelihood import Likelihood, Measured, slots_of
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
BOTH = ["photon desorption", "impact vapour"]
CASES = (
    (["photon desorption"], 1.0),
    (["impact vapour"], 1.0),
    (BOTH, 1.0),
    (BOTH, 2.0),
    (BOTH, 3.0),
    (BOTH, 4.0),
    (["photon desorption"], 10.0),
    (["impact vapour"], 10.0),
)
"""What is fitted, and how many times the noise."""
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


class Coverage(NamedTuple):
    """What `draws` of noise show of P free parameters, of which the rates come first.

    `shares` (2, P) of the 68 and 95 % ranges that hold the truth; medians over the draws of the rates over their
    errors, `depths`, and of the `rises` (P, 2) of -2 ln L at which ranges end.
    """

    names: list[str]
    shares: np.ndarray
    depths: np.ndarray
    rises: np.ndarray


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


def measured(case: Case, value: np.ndarray) -> Measured:
    """Return a profile of the case with these values."""
    return Measured(value, case.sigma, np.zeros(len(value), bool), 0.0)


def model_share(case: Case) -> float:
    """Return the error of the model, Monte Carlo and bins, over the noise where that is largest, at the truth."""
    data = measured(case, case.truth)
    slots = slots_of(data, case.components, False)
    likelihood = Likelihood(data, case.components, slots)
    true = [TRUE[one.name] / one.unit if one.key is None else np.log(TRUE[one.name]) for one in slots]
    likelihood.take_model_error(np.array(true))
    return float(np.max(np.sqrt(np.diag(likelihood.model_covariance)) / case.sigma))


def coverage(case: Case, draws: int, seed: int) -> Coverage:
    """Return how often ranges hold the truth."""
    rng = np.random.default_rng(seed)
    hits, depths, rises = [], [], []
    for _ in range(draws):
        data = measured(case, case.truth + case.sigma * rng.normal(size=len(case.truth)))
        slots = slots_of(data, case.components, False)
        fitted = fit(data, case.components, slots)
        true = np.array([TRUE[slot.name] for slot in slots])
        ends = np.array(fitted.ranges)
        hits.append(
            [(ends[:, 1] <= true) & (true <= ends[:, 2]), (ends[:, 3] <= true) & (true <= ends[:, 4])]
        )
        depths.append([2.0 * e[0] / (e[2] - e[1]) for e in ends[: len(case.components)]])
        rises.append(fitted.calibration.rises)
    return Coverage(
        [slot.name for slot in slots],
        np.mean(hits, axis=0),
        np.median(depths, axis=0),
        np.median(rises, axis=0),
    )


def main(draws: int, numbers: list[int]) -> int:
    """Print how often ranges hold the truth, and return 0 where all of them do as often as they say.

    `numbers` are the cases, from 0.
    """
    model, truth = (tracer.run(tracer.load_run(RUN_FILE, list(settings))) for settings in (MODEL, TRUTH))
    fine = True
    print(f"{'':32s} {'68 %':>8s} {'95 %':>8s}   rises           rate over error")
    for releases, factor in (CASES[number] for number in numbers):
        case, begin = case_of(model, truth, releases), time.process_time()
        case = case._replace(sigma=factor * case.sigma)
        found = coverage(case, draws, SEED)
        print(
            f"{' and '.join(releases)}: noise {100 * np.median(case.sigma / case.truth):.2g} % (median), "
            f"error of the model up to {model_share(case):.2g} of it"
        )
        for i, name in enumerate(found.names):
            shares, rises = found.shares[:, i], found.rises[i]
            good = all(low <= share <= high for (low, high), share in zip(BANDS, shares, strict=True))
            fine &= good
            depth = f"{found.depths[i]:8.1f}" if i < len(found.depths) else 8 * " "
            print(
                f"  {name:30s} {shares[0]:8.3f} {shares[1]:8.3f}   {rises[0]:5.2f} {rises[1]:5.2f}   {depth} "
                f"{'' if good else 'FAILS'}"
            )
        print(f"  {(time.process_time() - begin) / draws:.2f} s of one core a fit", flush=True)
    return 0 if fine else 1


if __name__ == "__main__":
    given = [int(word) for word in sys.argv[1:]]
    sys.exit(main(given[0] if given else DRAWS, given[1:] or list(range(len(CASES)))))
