"""The lognormal likelihood of detects and nondetects, in the form that every fit here rests on.

Detects enter through count, mean and sum of squares of their logarithms, nondetects through their
distinct log limits and how often each occurs; so a fit costs the same for 5 or 500 detects.
With `theta` = 1/sigma and `delta` = mu/sigma the log-likelihood is concave (Olsen 1978).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.special import log_ndtr

from exposure.statistics.gate import Bools, Floats, Ints
from exposure.statistics.pack import Batch

HALF_LN_2PI = 0.5 * np.log(2.0 * np.pi)

# Logs of results that differ by less than this are one value: no balance resolves it.
SAME_LOG = 1e-9


@dataclass(frozen=True)
class Evidence:
    """What the likelihood of (G,) groups needs, in logs less `center`.

    Attributes:
        center: (G,), mean log of the detects; the highest log limit where there are none.
        n_detected: (G,), float.
        squares: (G,), sum of squares of the detects about their mean.
        limits: (G, K), distinct log limits of the nondetects less `center`.
        counts: (G, K), how many nondetects lie under each; 0 is padding.
        is_estimable: (G,), True where a maximum of the likelihood exists.
    """

    center: Floats
    n_detected: Floats
    squares: Floats
    limits: Floats
    counts: Floats
    is_estimable: Bools

    def rows(self, index: Ints | Bools) -> Evidence:
        """The same for some of the groups."""
        return Evidence(
            self.center[index],
            self.n_detected[index],
            self.squares[index],
            self.limits[index],
            self.counts[index],
            self.is_estimable[index],
        )


def evidence(batch: Batch) -> Evidence:
    """Condense a batch; unsound and empty groups are not estimable.

    The maximum is missing when nothing was detected, and when all detects have one value with no
    nondetect limit below it: the likelihood then grows without end as sigma goes to 0.
    """
    detected, logs = batch.detected, batch.logs
    n_detected = detected.sum(axis=1).astype(np.float64)
    has_detect = n_detected > 0
    total = np.where(detected, logs, 0.0).sum(axis=1)
    top_limit = np.where(batch.censored, logs, -np.inf).max(axis=1, initial=-np.inf)
    fallback = np.where(np.isfinite(top_limit), top_limit, 0.0)
    center = np.where(has_detect, total / np.maximum(n_detected, 1.0), fallback)
    about = np.where(detected, logs - center[:, None], 0.0)
    is_spread = np.abs(about).max(axis=1, initial=0.0) > SAME_LOG
    squares = np.where(is_spread, (about**2).sum(axis=1), 0.0)
    limits, counts = _distinct_limits(batch, center)
    has_lower_limit = ((counts > 0) & (limits < -SAME_LOG)).any(axis=1)
    is_estimable = batch.is_sound & has_detect & (is_spread | has_lower_limit)
    return Evidence(center, n_detected, squares, limits, counts, is_estimable)


def _distinct_limits(batch: Batch, center: Floats) -> tuple[Floats, Floats]:
    logs = np.sort(np.where(batch.censored, batch.logs - center[:, None], np.inf), axis=1)
    is_real = np.isfinite(logs)
    is_first = is_real.copy()
    is_first[:, 1:] &= logs[:, 1:] > logs[:, :-1]
    shape = (len(logs), int(is_first.sum(axis=1).max(initial=0)))
    limits, counts = np.zeros(shape), np.zeros(shape)
    column = np.cumsum(is_first, axis=1) - 1
    group, place = np.nonzero(is_real)
    np.add.at(counts, (group, column[group, place]), 1.0)
    limits[group, column[group, place]] = logs[group, place]
    return limits, counts


def mills(r: Floats) -> tuple[Floats, Floats]:
    """ln Phi(r) and its derivative phi(r)/Phi(r), finite far into the lower tail."""
    log_phi = log_ndtr(r)
    return log_phi, np.exp(-0.5 * r * r - HALF_LN_2PI - log_phi)


def log_likelihood(data: Evidence, theta: Floats, delta: Floats) -> Floats:
    """Log-likelihood of (G,) groups without the constant of the detects' density.

    Args:
        data: G groups.
        theta: (G,), 1/sigma, above 0.
        delta: (G,), (mu - center)/sigma.
    """
    r = theta[:, None] * data.limits - delta[:, None]
    below = (data.counts * log_ndtr(r)).sum(axis=1)
    m = data.n_detected
    return np.asarray(m * np.log(theta) - 0.5 * (theta**2 * data.squares + m * delta**2) + below)
