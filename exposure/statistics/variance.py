"""Variation between and within the workers of a group.

A wide spread between workers means that a group figure hides its worst worker. Results of the same
few workers are also worth less than their number.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtr, ndtri

from exposure.statistics.gate import Floats, require

# 97.5th over 2.5th percentile of the worker means: 2 z, rounded as in the literature.
RANGE_Z: Final = 3.92
LEAST_WORKERS: Final = 3
SEARCH_STEPS: Final = 200
GOLDEN: Final = (np.sqrt(5.0) - 1.0) / 2.0


@dataclass(frozen=True)
class Components:
    """One-way analysis of variance of ln exposure by worker.

    Attributes:
        ms_between: mean square between workers.
        ms_within: mean square within workers.
        n0: results a worker, weighted for unequal numbers.
        var_between_raw: as estimated, may be negative.
        var_between: 0 where the estimate was negative.
        var_within: equals `ms_within`.
        is_truncated: True where the estimate was negative.
    """

    ms_between: float
    ms_within: float
    n0: float
    var_between_raw: float
    var_between: float
    var_within: float
    is_truncated: bool


def components(y: ArrayLike, worker: ArrayLike) -> Components | None:
    """Variance components of logs by worker; None under three workers or without a repeat.

    Args:
        y: (N,), ln of the results.
        worker: (N,), who; any kind of label.

    Source: one-way random-effects ANOVA with unequal numbers.
    """
    logs, code, counts = _by_worker(y, worker)
    k, n = counts.size, logs.size
    if k < LEAST_WORKERS or n == k:
        return None
    means = np.bincount(code, weights=logs) / counts
    between = float((counts * (means - logs.mean()) ** 2).sum() / (k - 1))
    within = float(((logs - means[code]) ** 2).sum() / (n - k))
    n0 = float((n - (counts**2).sum() / n) / (k - 1))
    raw = (between - within) / n0
    return Components(between, within, n0, raw, max(0.0, raw), within, raw < 0.0)


def _by_worker(
    y: ArrayLike, worker: ArrayLike
) -> tuple[Floats, NDArray[np.int64], NDArray[np.int64]]:
    logs = require("y", y)
    _, code, counts = np.unique(np.asarray(worker), return_inverse=True, return_counts=True)
    if code.shape != logs.shape:
        raise ValueError(f"worker: shape {code.shape} is not allowed; it must be {logs.shape}")
    return logs, code, counts


@dataclass(frozen=True)
class LikelihoodComponents:
    """Components by (restricted) maximum likelihood, with twice the negative log-likelihood."""

    var_between: float
    var_within: float
    minus_two_log_likelihood: float


def likelihood_components(
    y: ArrayLike, worker: ArrayLike, *, is_restricted: bool = True
) -> LikelihoodComponents | None:
    """Variance components by REML, or by ML, for unequal numbers; None as in `components`.

    Searched over the ratio of the components; the rest is closed form.
    """
    logs, code, counts = _by_worker(y, worker)
    if counts.size < LEAST_WORKERS or logs.size == counts.size:
        return None
    means = np.bincount(code, weights=logs) / counts
    inner = float(((logs - means[code]) ** 2).sum())
    freedom = logs.size - (1 if is_restricted else 0)

    def loss(ratio: float) -> tuple[float, float]:
        weight = counts / (1.0 + counts * ratio)
        mean = (weight @ means) / weight.sum()
        squares = inner + float(weight @ (means - mean) ** 2)
        value = freedom * np.log(2.0 * np.pi * squares / freedom) + freedom
        value += np.log1p(counts * ratio).sum()
        value += np.log(weight.sum()) if is_restricted else 0.0
        return float(value), squares / freedom

    ratio = _least(lambda share: loss(share / (1.0 - share))[0])
    ratio = ratio / (1.0 - ratio)
    if loss(0.0)[0] <= loss(ratio)[0]:
        ratio = 0.0
    value, var_within = loss(ratio)
    return LikelihoodComponents(ratio * var_within, var_within, value)


def _least(loss: Callable[[float], float]) -> float:
    """Where a function with one valley on 0 to 1 is least, by golden section."""
    low, high = 0.0, 1.0 - 1e-9
    for _ in range(SEARCH_STEPS):
        left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        if loss(left) < loss(right):
            high = right
        else:
            low = left
    return 0.5 * (low + high)


def worker_range(var_between: ArrayLike) -> Floats:
    """How many times the 97.5th percentile of worker means is the 2.5th; up to 2 is uniform.

    Source: Rappaport, Kromhout, Symanski 1993 (criterion verified).
    """
    return np.asarray(np.exp(RANGE_Z * np.sqrt(require("var_between", var_between, at_least=0.0))))


def var_between_of_range(ratio: ArrayLike) -> Floats:
    """Variance between workers at which their means span this ratio; the inverse."""
    return np.asarray((np.log(require("ratio", ratio, at_least=1.0)) / RANGE_Z) ** 2)


def worker_mean_over_limit(
    mu: ArrayLike, var_between: ArrayLike, *, var_within: ArrayLike, limit: ArrayLike
) -> Floats:
    """Chance that the long-term mean of a worker is over the limit.

    Args:
        mu: mean of ln exposure of the group.
        var_between: above 0.
        var_within: 0 or more.
        limit: above 0, for the long-term mean.
    """
    spread = np.sqrt(require("var_between", var_between, above=0.0))
    inner = 0.5 * require("var_within", var_within, at_least=0.0)
    log_limit = np.log(require("limit", limit, above=0.0))
    return np.asarray(ndtr(-(log_limit - require("mu", mu) - inner) / spread))


def individual_chance(mu: float, var_between: float, *, var_within: float, limit: float) -> float:
    """Chance that a worker has more than 5 % of days over the limit; under 0.20 complies.

    Source: BOHS-NVvA 2011 (memory).
    """
    within = float(np.sqrt(require("var_within", var_within, at_least=0.0)))
    room = np.log(float(require("limit", limit, above=0.0))) - float(require("mu", mu))
    spread = float(np.sqrt(require("var_between", var_between, above=0.0)))
    return float(ndtr(-(room - float(ndtri(0.95)) * within) / spread))


def equivalent_n(n: ArrayLike, n_workers: ArrayLike, *, share_between: ArrayLike) -> Floats:
    """Independent results that n results of the same workers are worth, between both numbers.

    Args:
        n: results.
        n_workers: workers, 1 to n.
        share_between: variance between workers over all variance, 0 to 1.
    """
    count = require("n", n, at_least=1)
    each = count / require("n_workers", n_workers, at_least=1)
    rho = require("share_between", share_between, at_least=0.0, at_most=1.0)
    return np.asarray(count / (1.0 + (each - 1.0) * rho))
