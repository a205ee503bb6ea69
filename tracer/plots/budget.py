"""The particle budget as a figure shows it: which rates, and in which words and colours."""

from math import floor, isfinite, log10
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.product.layout import FATE, RELEASE, STANDARD_ERROR

ALL = "all releases"
EXACT = 1e-7
"""Relative error below which a share is no estimate, such as that of a fate that all atoms meet."""


class Budget(NamedTuple):
    """Rates by release and fate [s-1] with their standard errors, NaN where none is known; shape (R, F).

    `balance` (R,) is what roulette added by chance.
    """

    names: list[str]
    """Releases, and behind several of them their sum."""
    fates: list[str]
    """Fates that any atom met."""
    rate: NDArray[np.float64]
    error: NDArray[np.float64]
    balance: NDArray[np.float64]

    @property
    def released(self) -> NDArray[np.float64]:
        """New atoms a second by release [s-1]."""
        return np.asarray(self.rate.sum(axis=1) - self.balance)


class FateLook(NamedTuple):
    """Words, colour, colour of letters on it, and marker of a fate."""

    words: str
    colour: str
    ink: str
    marker: str


# Colours of Okabe & Ito 2008, Color Universal Design (memory), told apart in every kind of colour vision.
LOOKS: dict[str, FateLook] = {
    "captured": FateLook("captured", "#0072B2", "white", "o"),
    "escaped": FateLook("escaped", "#E69F00", "black", "s"),
    "ionized": FateLook("ionised", "#CC79A7", "black", "^"),
    "other_loss": FateLook("other loss", "#009E73", "black", "D"),
    "age_limit": FateLook("alive at age limit", "#999999", "black", "v"),
    "unresolved": FateLook("unresolved", "#D55E00", "black", "X"),
}


def look(fate: str) -> FateLook:
    """Return how a fate is shown; one without a look of its own in black."""
    return LOOKS.get(fate, FateLook(fate, "black", "white", "P"))


def budget_of(product: xr.Dataset, names: list[str]) -> Budget:
    """Return the budget of the releases `names` and, where there are several, of their sum.

    Releases are independent: the variances of their rates add.
    """
    variables = ["ledger", "ledger" + STANDARD_ERROR, "roulette_balance"]
    chosen = product[variables].sel(release=names).transpose(RELEASE, FATE)
    balance = chosen["roulette_balance"].values
    rate, error = chosen["ledger"].values, chosen["ledger" + STANDARD_ERROR].values
    if len(names) > 1:
        names = [*names, ALL]
        rate = np.vstack([rate, rate.sum(axis=0)])
        balance = np.append(balance, balance.sum())
        # `hypot` neither over- nor underflows where squares would.
        error = np.vstack([error, np.hypot.reduce(np.nan_to_num(error), axis=0)])
    met = np.flatnonzero((rate > 0.0).any(axis=0))
    fates = [str(product["fate_name"].values[fate]) for fate in met]
    return Budget(names, fates, rate[:, met], error[:, met], balance)


def share_words(share: float, error: float, letters: float) -> str:
    """Return the most telling text of a share and its error [%] with at most `letters`; empty where none fits."""
    texts = [f"{share:.3g} %", f"{share:.3g}"]
    if error > EXACT * share:
        # Two digits of the error, as is common practice.
        decimals = min(max(1 - floor(log10(error)), 0), 4)
        texts.insert(0, f"{share:.{decimals}f} \N{PLUS-MINUS SIGN} {error:.{decimals}f} %")
    return next((text for text in texts if len(text) <= letters), "")


def scientific(value: float) -> str:
    """Return a number with three digits as people write it, its power of ten as a formula."""
    if not isfinite(value) or value == 0.0:
        return f"{value:g}"
    digits, _, power = f"{value:.2e}".partition("e")
    digits = digits.rstrip("0").rstrip(".")
    return rf"${digits}\times10^{{{int(power)}}}$"
