"""Lognormal figures of groups without nondetects: point estimates, tolerance limits, exceedance.

Notation: ybar and s are mean and standard deviation (n - 1) of ln x, z_p the normal quantile. The
95th percentile is GM GSD^1.645. Groups with a nondetect, a bad number or too few results get NaN.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import nctdtrinc, nctdtrit, ndtr, ndtri, stdtrit

from exposure.statistics.gate import Bools, Floats, Status, require
from exposure.statistics.likelihood import SAME_LOG
from exposure.statistics.pack import Batch

P95: Final = 0.95
LAND_NODES: Final = 200
BISECTIONS: Final = 80

SPREAD_FROM: Final = 2
LAND_FROM: Final = 3


@dataclass(frozen=True)
class Moments:
    """Mean and standard deviation (n - 1) of ln x, each (G,); `s` needs two results."""

    n: Floats
    ybar: Floats
    s: Floats


@dataclass(frozen=True)
class Summary:
    """Point estimates of G groups, each (G,); NaN where one does not exist.

    Attributes:
        n: results in the group.
        gm: geometric mean.
        gsd: geometric standard deviation, from s with n - 1.
        am_mvue: minimum-variance unbiased arithmetic mean.
        x95: point estimate of the 95th percentile, GM GSD^1.645.
        status: 0 if all figures exist, else 1.
    """

    n: Floats
    gm: Floats
    gsd: Floats
    am_mvue: Floats
    x95: Floats
    status: Status


@dataclass(frozen=True)
class Exceedance:
    """Share of exposures above the limit, 0 to 1, with one-sided limits; each (G,)."""

    point: Floats
    lower: Floats
    upper: Floats


def k_factor(n: ArrayLike, *, p: ArrayLike, conf: ArrayLike) -> Floats:
    """One-sided tolerance factor: exp(ybar + k s) is at or above the p quantile in `conf` of cases.

    Args:
        n: number of results; below 2 there is no factor (NaN).
        p: share of exposures covered, above 0 and below 1.
        conf: confidence, above 0 and below 1; with 1 - conf it is the factor of the lower limit.

    Returns:
        Broadcast shape of the three.

    Source: noncentral t, k = nct(conf; n - 1, z_p sqrt n)/sqrt n; agrees with the one-sided tables
        of CMH-17-1G (verified).
    """
    share = require("p", p, above=0.0, below=1.0)
    level = require("conf", conf, above=0.0, below=1.0)
    count = np.asarray(n, dtype=np.float64)
    usable = np.where(count >= SPREAD_FROM, count, SPREAD_FROM)
    root = np.sqrt(usable)
    k = nctdtrit(usable - 1.0, ndtri(share) * root, level) / root
    return np.asarray(np.where(count >= SPREAD_FROM, k, np.nan))


def is_complete(batch: Batch) -> Bools:
    """True for sound groups with results and without nondetects, (G,)."""
    return np.asarray(batch.is_sound & (batch.n > 0) & (batch.n_censored == 0))


def moments(batch: Batch) -> Moments:
    """Mean and standard deviation of the logs; spread that no balance resolves counts as none."""
    usable = is_complete(batch)
    n = np.where(usable, batch.n, np.nan).astype(np.float64)
    ybar = batch.logs.sum(axis=1) / n
    about = np.where(batch.mask & usable[:, None], batch.logs - ybar[:, None], 0.0)
    is_spread = np.abs(about).max(axis=1, initial=0.0) > SAME_LOG
    squares = np.where(is_spread, (about**2).sum(axis=1), 0.0)
    s = np.sqrt(squares / np.where(n >= SPREAD_FROM, n - 1.0, np.nan))
    return Moments(n, ybar, s)


def summary(batch: Batch) -> Summary:
    """Point estimates of groups without nondetects.

    Source: MVUE series of Finney as printed in USEPA guidance (verified on four published values).
    """
    m = moments(batch)
    gm, gsd = np.exp(m.ybar), np.exp(m.s)
    x95 = np.exp(m.ybar + ndtri(P95) * m.s)
    with np.errstate(over="ignore", invalid="ignore"):
        am = gm * _finney(m.n, 0.5 * m.s**2)
    status = np.where(np.isfinite(x95), 0, 1).astype(np.int8)
    return Summary(m.n, gm, gsd, am, x95, status)


def _finney(n: Floats, t: Floats) -> Floats:
    """g_n(t) of the unbiased lognormal mean, by the ratio of its terms."""
    term = (n - 1.0) * t / n
    total = 1.0 + term
    for j in range(2, 2000):
        term = term * (n - 1.0) ** 2 * t / (n * (n + 2 * j - 3) * j)
        total = total + term
        # Not `any(term > ...)`: NaN groups must not keep the series going.
        if not (term > 1e-15 * total).any():
            break
    return np.asarray(total)


def utl(batch: Batch, *, p: float = P95, conf: float) -> Floats:
    """Upper tolerance limit: upper `conf` limit of the p quantile of exposures, (G,).

    With 1 - conf it is the lower limit. Needs two results that differ.
    """
    m = moments(batch)
    s = np.where(m.s > 0.0, m.s, np.nan)
    with np.errstate(over="ignore"):
        return np.asarray(np.exp(m.ybar + k_factor(m.n, p=p, conf=conf) * s))


def exceedance(batch: Batch, limit: ArrayLike, *, conf: float = 0.95) -> Exceedance:
    """Share of exposures above a limit, with one-sided lower and upper confidence limits.

    Args:
        batch: G groups without nondetects.
        limit: scalar or (G,), the unit of the batch; missing or not above 0 gives NaN.
        conf: confidence of each one-sided limit, above 0.5 and below 1.

    Source: noncentral t inversion, the same statement as the tolerance limit.
    """
    level = float(require("conf", conf, above=0.5, below=1.0))
    m = moments(batch)
    log_limit = log_or_nan(limit)
    u = (log_limit - m.ybar) / np.where(m.s > 0.0, m.s, np.nan)
    root = np.sqrt(m.n)
    df = np.where(np.isfinite(u), m.n - 1.0, np.nan)
    upper_z = nctdtrinc(df, level, root * u) / root
    lower_z = nctdtrinc(df, 1.0 - level, root * u) / root
    return Exceedance(ndtr(-u), ndtr(-lower_z), ndtr(-upper_z))


def log_or_nan(limit: ArrayLike) -> Floats:
    """ln of a limit; NaN where it is missing, not finite or not above 0."""
    number = np.asarray(limit, dtype=np.float64)
    is_good = np.isfinite(number) & (number > 0.0)
    return np.log(np.where(is_good, number, np.nan))


def gm_limit(batch: Batch, *, conf: float) -> Floats:
    """Upper `conf` limit of the geometric mean (Student t on the logs), (G,)."""
    m = moments(batch)
    level = float(require("conf", conf, above=0.0, below=1.0))
    return np.asarray(np.exp(m.ybar + stdtrit(m.n - 1.0, level) * m.s / np.sqrt(m.n)))


def land(batch: Batch, *, conf: float) -> Floats:
    """Land's exact upper limit of the lognormal arithmetic mean, (G,); lower with 1 - conf.

    For long-term averages only. With few results and a wide spread the limit is many times the
    estimate; it is no ground for choosing a respirator.

    For a trial value psi of ln AM, with r^2 = sum (y - psi)^2, the statistic sqrt(n) (ybar - psi)/r
    has a density proportional to (1 - m^2)^((n-3)/2) exp(-sqrt(n) r m / 2) on -1 to 1, given r.

    Source: Land 1971 (memory of the form); reproduces three limits published by USEPA (verified).
    """
    level = float(require("conf", conf, above=0.0, below=1.0))
    m = moments(batch)
    is_usable = (m.n >= LAND_FROM) & (m.s > 0.0)
    n, ybar, s = (
        np.where(is_usable, part, fill) for part, fill in ((m.n, 3.0), (m.ybar, 0.0), (m.s, 1.0))
    )
    width = s + s * s
    low, high = ybar - 50.0 * width - 5.0, ybar + 50.0 * width + 5.0
    # With three results the limit can lie very far out.
    high = high + 1e5 * width / n**4
    for _ in range(BISECTIONS):
        middle = 0.5 * (low + high)
        is_below = _land_tail(n, ybar, s, psi=middle) > 1.0 - level
        low, high = np.where(is_below, middle, low), np.where(is_below, high, middle)
    with np.errstate(over="ignore"):
        return np.where(is_usable, np.exp(0.5 * (low + high)), np.nan)


def _land_tail(n: Floats, ybar: Floats, s: Floats, *, psi: Floats) -> Floats:
    """Chance of a statistic at or below the observed one, if ln AM were psi."""
    r = np.sqrt((n - 1.0) * s * s + n * (ybar - psi) ** 2)
    observed = np.arccos(np.clip(np.sqrt(n) * (ybar - psi) / r, -1.0, 1.0))
    nodes, weights = np.polynomial.legendre.leggauss(LAND_NODES)
    unit = 0.5 * (nodes + 1.0)
    rate = (np.sqrt(n) * r * 0.5)[:, None]
    # m = cos(angle): small angles are large m, so the lower tail is from `observed` to pi.
    upper = observed[:, None] * unit
    lower = observed[:, None] + (np.pi - observed)[:, None] * unit
    power = (n - 2.0)[:, None]
    logs = [power * np.log(np.sin(a)) - rate * np.cos(a) for a in (upper, lower)]
    top = np.maximum(logs[0].max(axis=1), logs[1].max(axis=1))[:, None]
    mass = [(np.exp(part - top) * weights).sum(axis=1) for part in logs]
    above, below = mass[0] * observed, mass[1] * (np.pi - observed)
    return np.asarray(below / (above + below))
