"""Results below detection without a full model: order statistics, Kaplan-Meier, substitution.

These serve the mean and the median. None gives a confidence limit of the 95th percentile, and an
imputed value never belongs to an individual sample. `ros` and `kaplan_meier` take one group,
`beta_substitution` a batch.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr, ndtri

from exposure.statistics.gate import Bools, Floats, require, require_choice
from exposure.statistics.lognormal import P95
from exposure.statistics.pack import Batch

LEFTOVERS: Final = ("lowest detect", "lowest limit")
POSITIONS: Final = ("limits", "ranks")
LEAST_DETECTS: Final = 2


@dataclass(frozen=True)
class Regression:
    """Regression on order statistics of one group of n results.

    Attributes:
        mean_ln: intercept: mean of the logs of the fitted line.
        sd_ln: slope: standard deviation of the logs of the fitted line.
        completed: (n,), results in the order given, nondetects replaced by the line.
        position: (n,), plotting position of each result, 0 to 1.
    """

    mean_ln: float
    sd_ln: float
    completed: Floats
    position: Floats


def exceedance_at_limits(values: Floats, censored: Bools) -> tuple[Floats, Floats]:
    """Distinct detection limits, lowest first, and the share of results at or above each.

    Source: Helsel and Cohn 1988 (verified on the example of their appendix B).
    """
    limits = np.unique(values[censored])
    tops = np.append(limits[1:], np.inf)
    share = np.zeros(limits.size + 1)
    for j in range(limits.size - 1, -1, -1):
        between = (~censored & (values >= limits[j]) & (values < tops[j])).sum()
        below = (values < limits[j]).sum() + (censored & (values == limits[j])).sum()
        share[j] = share[j + 1] + between / max(between + below, 1) * (1.0 - share[j + 1])
    return limits, share[:-1]


def ros(
    values: ArrayLike, censored: ArrayLike, *, a: float = 0.0, positions: str = "limits"
) -> Regression:
    """Robust regression on order statistics: a line through the detects completes the nondetects.

    Good for the mean from some 20 results with under 80 % below detection.

    Args:
        values: (n,), result, or limit of a result below it; above 0, at least two detects.
        censored: (n,), True where below detection.
        a: plotting constant, 0 (Helsel and Cohn) to 0.5; 0.375 moves the third figure.
        positions: "limits" honours several limits; "ranks" is (i - a)/(n + 1 - 2 a) over all
            results and only right when the limits are below all detects.

    Source: Helsel and Cohn 1988; USEPA 2009 Example 15-1 (verified).
    """
    require_choice("positions", positions, POSITIONS)
    shift = float(require("a", a, at_least=0.0, at_most=0.5))
    x = require("values", values, above=0.0)
    is_below = np.asarray(censored, dtype=bool)
    if (~is_below).sum() < LEAST_DETECTS:
        raise ValueError(f"values: {(~is_below).sum()} detects are not allowed; at least 2 needed")
    place = (_ranks if positions == "ranks" else _positions)(x, is_below, shift)
    score, logs = ndtri(place), np.log(x)
    slope, mean = np.polyfit(score[~is_below], logs[~is_below], 1)
    completed = np.where(is_below, np.exp(mean + slope * score), x)
    return Regression(float(mean), float(slope), completed, place)


def _ranks(x: Floats, is_below: Bools, a: float) -> Floats:
    place = np.empty(x.size)
    order = np.lexsort((x, ~is_below))
    place[order] = (np.arange(1, x.size + 1) - a) / (x.size + 1 - 2.0 * a)
    return place


def _positions(x: Floats, is_below: Bools, a: float) -> Floats:
    limits, share = exceedance_at_limits(x, is_below)
    # Detects under the lowest limit, if any, stand between 0 and the share below it.
    edges = np.concatenate([[1.0], share, [0.0]])
    place = np.empty(x.size)
    slot = np.searchsorted(limits, x, side="right")
    for j in range(limits.size + 1):
        for kind, base, width in (
            (~is_below, 1.0 - edges[j], edges[j] - edges[j + 1]),
            (is_below, 0.0, 1.0 - edges[j]),
        ):
            index = np.flatnonzero(kind & (slot == j))
            rank = np.empty(index.size)
            rank[np.argsort(x[index], kind="stable")] = np.arange(1, index.size + 1)
            place[index] = base + width * (rank - a) / (index.size + 1 - 2.0 * a)
    return place


@dataclass(frozen=True)
class Mass:
    """Distribution as masses at values: Kaplan-Meier of results below detection, highest first."""

    value: Floats
    mass: Floats

    @property
    def mean(self) -> float:
        """Mean of the distribution."""
        return float(self.mass @ self.value)

    @property
    def sd(self) -> float:
        """Standard deviation of the distribution, without a correction for n."""
        return float(np.sqrt(self.mass @ (self.value - self.mean) ** 2))


def kaplan_meier(
    values: ArrayLike, censored: ArrayLike, *, leftover: str = "lowest detect"
) -> Mass:
    """Kaplan-Meier walked down from the highest detect; a nondetect counts as below its limit.

    For the mean of some 20 results or more; no limit of the 95th percentile.

    Args:
        values: (n,), results or their logs; at least one detect.
        censored: (n,), True where below detection.
        leftover: what the mass below all detects is put at, one of `LEFTOVERS`; a lowest limit
            above the lowest detect is not used.

    Source: Beal 2010; USEPA 2009 Example 15-1 (verified).
    """
    require_choice("leftover", leftover, LEFTOVERS)
    x = require("values", values)
    is_below = np.asarray(censored, dtype=bool)
    steps = np.unique(x[~is_below])[::-1]
    if not steps.size:
        raise ValueError("values: no detect; at least 1 is needed")
    survival, masses = 1.0, []
    for step in steps:
        at_risk = (x < step).sum() + (x == step).sum()
        mass = survival * (~is_below & (x == step)).sum() / at_risk
        masses.append(mass)
        survival -= mass
    floor = steps[-1]
    if leftover == "lowest limit" and is_below.any():
        floor = min(floor, x[is_below].min())
    return Mass(np.append(steps, floor), np.append(masses, survival))


def substituted(batch: Batch, *, factor: float) -> Batch:
    """The batch with nondetects replaced by a fraction of their limit: a rough table, no more.

    Allowed for a quick look under some 15 % below detection, and labelled as such.
    """
    part = float(require("factor", factor, above=0.0, at_most=1.0))
    values = np.where(batch.censored, part * batch.bound, batch.values)
    return Batch(values, batch.mask, np.zeros_like(batch.mask), batch.lod)


def mean_below_limit(gsd: ArrayLike, share_below: ArrayLike) -> Floats:
    """Mean of lognormal results below a limit, as a fraction of the limit.

    What a substitution would have to be: 0.5 suits a GSD of about 3, 0.71 one of about 2.

    Args:
        gsd: above 1.
        share_below: share of results below the limit, above 0 and below 1.
    """
    sigma = np.log(require("gsd", gsd, above=1.0))
    share = require("share_below", share_below, above=0.0, below=1.0)
    z = ndtri(share)
    return np.asarray(np.exp(sigma * (0.5 * sigma - z)) * ndtr(z - sigma) / share)


@dataclass(frozen=True)
class BetaFigures:
    """Point estimates by beta-substitution, each (G,); NaN where it does not apply."""

    beta_mean: Floats
    beta_gm: Floats
    am: Floats
    gm: Floats
    gsd: Floats
    x95: Floats


def beta_substitution(batch: Batch) -> BetaFigures:
    """Replace each nondetect by a fraction of its limit that the detects suggest.

    Point estimates close to maximum likelihood; no confidence limits. With several limits their
    mean enters the fractions and each nondetect its own limit; that form is not confirmed.

    Args:
        batch: groups with one to n - 1 nondetects; NaN for others.

    Source: Ganser and Hewett 2010 (formula from memory).
    """
    is_usable = batch.is_sound & (batch.n_censored > 0) & (batch.n_censored < batch.n)
    n = np.where(is_usable, batch.n, np.nan)
    k = np.where(is_usable, batch.n_censored, np.nan)
    logs, detected = batch.logs, batch.detected
    mean_detect = np.where(detected, logs, 0.0).sum(axis=1) / (n - k)
    lods = np.where(batch.censored & is_usable[:, None], batch.bound, 0.0)
    z = ndtri(k / n)
    hazard = np.exp(-0.5 * z * z) / np.sqrt(2.0 * np.pi) / ndtr(-z)
    s = (mean_detect - np.log(lods.sum(axis=1) / k)) / (hazard - z)
    beta_mean = n / k * ndtr(z - s) * np.exp(s * (0.5 * s - z))
    tail = np.log(ndtr(s / n - z) / ndtr(-z))
    beta_gm = np.exp(-(n - k) * n / k * tail - s * z - (n - k) * s * s / (2.0 * k * n))
    detects = np.where(detected & is_usable[:, None], batch.bound, 0.0)
    am = (detects.sum(axis=1) + beta_mean * lods.sum(axis=1)) / n
    log_lods = np.where(batch.censored, logs, 0.0).sum(axis=1)
    gm = np.exp(((n - k) * mean_detect + log_lods + k * np.log(beta_gm)) / n)
    sigma = np.sqrt(np.maximum(2.0 * n / (n - 1.0) * np.log(am / gm), 0.0))
    return BetaFigures(beta_mean, beta_gm, am, gm, np.exp(sigma), gm * np.exp(ndtri(P95) * sigma))
