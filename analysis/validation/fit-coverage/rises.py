"""How -2 ln L rises at the truth over thousands of draws, and what thresholds of few draws there make of it."""

import sys

import numpy as np
from run import BOTH, MODEL, RUN_FILE, TRUE, TRUTH, Case, case_of, measured
from scipy.stats import chi2

import tracer
from tracer.observe.fit import calibration
from tracer.observe.fit.descent import Valley, suited
from tracer.observe.fit.likelihood import Likelihood, slots_of
from tracer.observe.fit.ranges import RISE_68, RISE_95, End, Scan, on_edge, scan_of

Floats = np.ndarray

DRAWS, SEED = 4000, 20310902
SEEDS = 12
"""Calibrations about the truth, beside the product's own."""
WILKS = np.array([RISE_68, RISE_95])


def at_truth(case: Case) -> tuple[list[str], Scan]:
    """Return the names of the free parameters and the scan about the truth, with the model's error there."""
    data = measured(case, case.truth)
    slots = slots_of(data, case.components, False)
    likelihood = Likelihood(data, case.components, slots)
    true = np.array([TRUE[s.name] / s.unit if s.key is None else np.log(TRUE[s.name]) for s in slots])
    likelihood.take_model_error(true)
    residual, _ = likelihood.residuals(true)
    return [slot.name for slot in slots], scan_of(likelihood, (Valley(true, float(residual @ residual)),))


def rises_of(scan: Scan, values: Floats) -> tuple[Floats, Floats]:
    """Return by how much -2 ln L of each profile rises (D, P) at the truth, and the best parameters (D, P)."""
    count, true = len(scan.best), scan.best
    held = np.zeros(count, dtype=bool)
    starts = [true, suited(scan.likelihood, values, held, true)]
    at, least = calibration.lowest(scan.likelihood, values, starts, held)
    rises = np.empty_like(at)
    for n in range(count):
        held = np.arange(count) == n
        near = at.copy()
        near[:, n] = true[n]
        starts = [near, suited(scan.likelihood, values, held, true)]
        rises[:, n] = calibration.lowest(scan.likelihood, values, starts, held)[1] - least
    return rises, at


def thresholds(scan: Scan) -> Floats:
    """Return the rises (P, 2) that calibration takes at ends of ranges that lie at the truth."""
    ends = [End(float(place), scan.best, False) for place in scan.best]
    return np.array([[calibration.due(scan, n, end, rise) for rise in WILKS] for n, end in enumerate(ends)])


def report(case: Case) -> None:
    """Print what rises at the truth do, and what shares of them the thresholds of few draws hold."""
    names, scan = at_truth(case)
    noise = np.random.default_rng(SEED).normal(size=(DRAWS, len(case.truth)))
    rises, best = rises_of(scan, case.truth + case.sigma * noise)
    edge = np.array([on_edge(scan.likelihood, one) for one in best]).any(axis=1)
    print(f"  some best parameter on an edge of what is allowed: {edge.mean():.3f}")
    found = {}
    for seed in (calibration.SEED, *range(1, SEEDS + 1)):
        calibration.SEED, kept = seed, calibration.SEED
        found[seed] = thresholds(scan)
        calibration.SEED = kept
    for n, name in enumerate(names):
        one = rises[:, n]
        due = np.quantile(one, chi2.cdf(WILKS, 1))
        own = found[calibration.SEED][n]
        others = np.array([found[seed][n] for seed in range(1, SEEDS + 1)])
        shares = [np.mean(one[:, np.newaxis] <= rise, axis=0) for rise in (WILKS, own)]
        mean = np.mean([np.mean(one[:, np.newaxis] <= rise, axis=0) for rise in others], axis=0)
        at_edge = np.mean(one[edge] <= RISE_95)
        print(
            f"  {name:30s} due {due[0]:.2f} {due[1]:.2f}  own {own[0]:.2f} {own[1]:.2f}  others "
            f"{others[:, 0].mean():.2f} +- {others[:, 0].std(ddof=1):.2f} {others[:, 1].mean():.2f} +- "
            f"{others[:, 1].std(ddof=1):.2f}  held by 1, 3.84: {shares[0][0]:.3f} {shares[0][1]:.3f} "
            f"(on an edge {at_edge:.3f}), by own {shares[1][0]:.3f} {shares[1][1]:.3f}, by others {mean[0]:.3f} "
            f"{mean[1]:.3f}"
        )


def main(factors: list[float]) -> int:
    """Print a report of both releases at each multiple of the noise."""
    model, truth = (tracer.run(tracer.load_run(RUN_FILE, list(settings))) for settings in (MODEL, TRUTH))
    case = case_of(model, truth, BOTH)
    for factor in factors:
        print(f"both releases, noise {factor:g}")
        report(case._replace(sigma=factor * case.sigma))
    return 0


if __name__ == "__main__":
    sys.exit(main([float(word) for word in sys.argv[1:]] or [2.0, 3.0, 4.0]))
