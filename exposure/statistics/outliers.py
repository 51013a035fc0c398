"""One result apart from the others: shown, never deleted."""

from __future__ import annotations

from typing import Final

import numpy as np
from scipy.special import stdtrit

from exposure.statistics.gate import Bools, Floats, require
from exposure.statistics.lognormal import moments
from exposure.statistics.pack import Batch

LEVEL: Final = 0.01
TESTABLE_FROM: Final = 3


def largest_deviation(batch: Batch) -> Floats:
    """Largest |y - ybar|/s of the logs, (G,); NaN for nondetects and for no spread."""
    m = moments(batch)
    s = np.where(m.s > 0.0, m.s, np.nan)
    away = np.where(batch.mask, np.abs(batch.logs - m.ybar[:, None]), 0.0)
    return np.asarray(away.max(axis=1, initial=0.0) / s)


def grubbs_critical(n: Floats, *, level: float = LEVEL) -> Floats:
    """Two-sided critical value of the largest deviation, NaN under three results.

    Source: Grubbs 1969 (memory of the form): with t the quantile of n - 2 degrees of freedom at
        level/(2 n), (n - 1)/sqrt(n) sqrt(t^2/(n - 2 + t^2)).
    """
    share = float(require("level", level, above=0.0, below=0.5))
    count = np.where(np.asarray(n) >= TESTABLE_FROM, n, np.nan).astype(np.float64)
    t = stdtrit(count - 2.0, share / (2.0 * count))
    return np.asarray((count - 1.0) / np.sqrt(count) * np.sqrt(t * t / (count - 2.0 + t * t)))


def has_outlier(batch: Batch) -> Bools:
    """True where one log result lies further out than 1 in 100 lognormal groups has one, (G,)."""
    return np.asarray(largest_deviation(batch) > grubbs_critical(batch.n.astype(np.float64)))
