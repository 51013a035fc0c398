"""A logged shift: many readings, one result.

Minutes of one shift follow each other closely and are never pooled as results of a group. Negative
readings within the noise stay in the mean; leaving them out would raise it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from exposure.statistics.gate import Floats, require

WINDOW_MIN: Final = 15.0
LEAST_READINGS: Final = 3
# A step longer than this many usual ones is a gap.
GAP_STEPS: Final = 2.0


@dataclass(frozen=True)
class ShiftSummary:
    """What one logged shift says.

    Attributes:
        twa: average over the logged time, each reading weighted by how long it stands.
        highest_15_min: highest average over any 15 minutes; NaN if logged shorter.
        highest_15_min_from: minute at which that window starts.
        peak: highest reading.
        lag1: correlation of following readings.
        n_equivalent: independent readings that the series is worth.
        has_gap: True where a step is longer than two usual ones.
    """

    twa: float
    highest_15_min: float
    highest_15_min_from: float
    peak: float
    lag1: float
    n_equivalent: float
    has_gap: bool


def shift_summary(minute: ArrayLike, reading: ArrayLike) -> ShiftSummary:
    """Average, highest 15 minutes and peak of one logged shift.

    Args:
        minute: (N,), start of each reading, rising; three readings or more.
        reading: (N,), finite; the last stands as long as the usual step.
    """
    t, x = _in_time(minute, reading)
    usual = float(np.median(np.diff(t)))
    edges = np.append(t, t[-1] + usual)
    dose = np.concatenate([[0.0], np.cumsum(x * np.diff(edges))])
    twa = float(dose[-1] / (edges[-1] - edges[0]))
    highest, start = _highest_window(edges, dose)
    lag1 = lag1_correlation(x)
    return ShiftSummary(
        twa=twa,
        highest_15_min=highest,
        highest_15_min_from=start,
        peak=float(x.max()),
        lag1=lag1,
        n_equivalent=float(equivalent_readings(x.size, lag1)) if np.isfinite(lag1) else np.nan,
        has_gap=bool((np.diff(t) > GAP_STEPS * usual).any()),
    )


def _in_time(minute: ArrayLike, reading: ArrayLike) -> tuple[Floats, Floats]:
    t, x = require("minute", minute), require("reading", reading)
    if t.shape != x.shape or t.size < LEAST_READINGS:
        raise ValueError(f"reading: shape {x.shape} is not allowed; one a minute, 3 or more")
    if not (np.diff(t) > 0.0).all():
        raise ValueError("minute: repeated or falling times are not allowed; they must rise")
    return t, x


def _highest_window(edges: Floats, dose: Floats) -> tuple[float, float]:
    """The average is a broken line of the start: its highest point has an end on a reading."""
    if edges[-1] - edges[0] < WINDOW_MIN:
        return np.nan, np.nan
    starts = np.concatenate([edges, edges - WINDOW_MIN])
    starts = starts[(starts >= edges[0]) & (starts <= edges[-1] - WINDOW_MIN)]
    ends = np.interp(starts + WINDOW_MIN, edges, dose) - np.interp(starts, edges, dose)
    best = int(ends.argmax())
    return float(ends[best] / WINDOW_MIN), float(starts[best])


def lag1_correlation(reading: ArrayLike) -> float:
    """Correlation of following readings (moment estimator); NaN for a constant series."""
    x = require("reading", reading)
    away = x - x.mean()
    squares = float(away @ away)
    return float(away[1:] @ away[:-1]) / squares if squares > 0.0 else np.nan


def equivalent_readings(n: ArrayLike, lag1: ArrayLike) -> Floats:
    """Independent readings that n readings of a first-order series are worth for their mean.

    Args:
        n: readings.
        lag1: correlation of following readings, above -1 and below 1.
    """
    rho = require("lag1", lag1, above=-1.0, below=1.0)
    return np.asarray(require("n", n, at_least=1) * (1.0 - rho) / (1.0 + rho))
