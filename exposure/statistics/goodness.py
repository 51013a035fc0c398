"""Goodness of fit to the lognormal (or the normal) distribution, many groups at once.

Under six results no test has power and none is given. Rejection means a mixed group, a trend or an
outlier: split the group first, change the distribution last.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.polynomial.polynomial import polyval
from scipy.special import ndtr, ndtri

from exposure.statistics.gate import Bools, Floats, require_choice
from exposure.statistics.likelihood import SAME_LOG
from exposure.statistics.lognormal import is_complete
from exposure.statistics.pack import Batch, buckets

TESTABLE_FROM: Final = 6
TESTABLE_TO: Final = 5000
SMALL_TO: Final = 11
SCALES: Final = ("ln", "raw")

# Royston 1995 (Appl Stat 44:547-51, AS R94), lowest power first; checked against
# scipy.stats.shapiro and twelve published W and p.
LAST_WEIGHT: Final = (0.0, 0.221157, -0.147981, -2.07119, 4.434685, -2.706056)
NEXT_WEIGHT: Final = (0.0, 0.042981, -0.293762, -1.752461, 5.682633, -3.582633)
SMALL_GAMMA: Final = (-2.273, 0.459)
SMALL_MEAN: Final = (0.5440, -0.39978, 0.025054, -6.714e-4)
SMALL_LOG_SD: Final = (1.3822, -0.77857, 0.062767, -0.0020322)
LARGE_MEAN: Final = (-1.5861, -0.31082, -0.083751, 0.0038915)
LARGE_LOG_SD: Final = (-0.4803, -0.082676, 0.0030302)


@dataclass(frozen=True)
class Fit:
    """Shapiro-Wilk W with its p, and the probability plot correlation; each (G,)."""

    w: Floats
    p: Floats
    ppcc: Floats


def goodness_of_fit(batch: Batch, *, scale: str = "ln") -> Fit:
    """Test groups of 6 to 5000 results without nondetects; NaN for the others and for ties only.

    Args:
        batch: G groups.
        scale: "ln" tests the lognormal, "raw" the normal distribution.

    Source: Royston 1995 (AS R94); Blom positions for the plot correlation.
    """
    require_choice("scale", scale, SCALES)
    w, p, r = np.full((3, len(batch.n)), np.nan)
    can_test = is_complete(batch) & (batch.n >= TESTABLE_FROM) & (batch.n <= TESTABLE_TO)
    index = np.flatnonzero(can_test)
    for place, part in buckets(batch.rows(index)):
        numbers = part.logs if scale == "ln" else part.values
        rows = index[place]
        w[rows], p[rows] = _shapiro_wilk(numbers, part.mask)
        r[rows] = _plot_correlation(numbers, part.mask)
    return Fit(w, p, r)


def _in_order(numbers: Floats, mask: Bools) -> tuple[Floats, Floats]:
    """Sorted results less their mean (0 in the padding) and Blom's normal scores."""
    n = mask.sum(axis=1)[:, None]
    mean = np.where(mask, numbers, 0.0).sum(axis=1)[:, None] / n
    x = np.sort(np.where(mask, numbers - mean, np.inf), axis=1)
    rank = np.arange(1, x.shape[1] + 1)[None, :]
    is_real = rank <= n
    score = ndtri(np.where(is_real, (rank - 0.375) / (n + 0.25), 0.5))
    return np.where(is_real, x, 0.0), score


def _plot_correlation(numbers: Floats, mask: Bools) -> Floats:
    x, score = _in_order(numbers, mask)
    squares = (x**2).sum(axis=1)
    has_spread = np.abs(x).max(axis=1) > SAME_LOG * np.abs(numbers).max(axis=1)
    squares = np.where(has_spread, squares, np.nan)
    return np.asarray((x * score).sum(axis=1) / np.sqrt(squares * (score**2).sum(axis=1)))


def _shapiro_wilk(numbers: Floats, mask: Bools) -> tuple[Floats, Floats]:
    x, m = _in_order(numbers, mask)
    n = mask.sum(axis=1).astype(np.float64)
    weight = _royston_weights(m, n)
    squares = (x**2).sum(axis=1)
    has_spread = np.abs(x).max(axis=1) > SAME_LOG * np.abs(numbers).max(axis=1)
    squares = np.where(has_spread, squares, np.nan)
    w = np.minimum((weight * x).sum(axis=1) ** 2 / squares, 1.0)
    return np.asarray(w), _royston_p(w, n)


def _royston_weights(m: Floats, n: Floats) -> Floats:
    """Weights of the ordered results, odd about the middle, squares summing to 1."""
    row = np.arange(len(n))
    last, following = n.astype(int) - 1, n.astype(int) - 2
    total = (m**2).sum(axis=1)
    m_last, m_next = m[row, last], m[row, following]
    u = 1.0 / np.sqrt(n)
    a_last = polyval(u, LAST_WEIGHT) + m_last / np.sqrt(total)
    a_next = polyval(u, NEXT_WEIGHT) + m_next / np.sqrt(total)
    rest = (total - 2.0 * m_last**2 - 2.0 * m_next**2) / (1.0 - 2.0 * a_last**2 - 2.0 * a_next**2)
    weight = m / np.sqrt(rest)[:, None]
    weight[row, last], weight[row, 0] = a_last, -a_last
    weight[row, following], weight[row, 1] = a_next, -a_next
    return np.asarray(weight)


def _royston_p(w: Floats, n: Floats) -> Floats:
    log_n = np.log(n)
    is_small = n <= SMALL_TO
    tail = np.log1p(-np.minimum(w, 1.0 - 1e-16))
    gamma = polyval(n, SMALL_GAMMA)
    room = np.where(is_small, gamma - tail, 1.0)
    # Beyond the end of the approximation the fit is as bad as can be.
    is_beyond = is_small & ~(room > 0.0) & np.isfinite(w)
    y = np.where(is_small, -np.log(np.where(room > 0.0, room, 1.0)), tail)
    mean = np.where(is_small, polyval(n, SMALL_MEAN), polyval(log_n, LARGE_MEAN))
    log_sd = np.where(is_small, polyval(n, SMALL_LOG_SD), polyval(log_n, LARGE_LOG_SD))
    p = ndtr(-(y - mean) / np.exp(log_sd))
    return np.where(is_beyond, 0.0, np.where(np.isfinite(w), p, np.nan))
