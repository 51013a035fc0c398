"""Posterior of the 95th percentile under a stated prior, by quadrature, many groups at once.

For few results a prior on the spread has to stand in for what the data cannot tell. The prior is
printed with the figure, and the answer under another prior belongs beside it. What is reported is
the chance that the 95th percentile exceeds multiples of the limit: such a multiple is an assigned
protection factor. For all-censored groups the figures are ruled by the prior: never a finding.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import nctdtr, nctdtrit, ndtri

from exposure.statistics.gate import Floats, require, require_choice
from exposure.statistics.likelihood import evidence
from exposure.statistics.lognormal import P95, log_or_nan, moments
from exposure.statistics.pack import Batch
from exposure.statistics.quadrature import Box, slices

MULTIPLES: Final = (0.1, 0.5, 1.0, 10.0, 50.0)
Z95: Final = float(ndtri(P95))

# Work at once on so many groups that the largest table stays near this many numbers.
CHUNK_NUMBERS: Final = 3_000_000
NUMBERS_A_GROUP: Final = 3_000


@dataclass(frozen=True)
class Prior:
    """What is held about a group before its results.

    Attributes:
        spread: shape of the prior on sigma: "reciprocal" (1/sigma), "uniform", or "lognormal".
        gsd: lowest and highest geometric standard deviation; None for no bounds.
        median_sigma: of the lognormal, before the cut to `gsd`.
        factor_sigma: of the lognormal: ln sigma has standard deviation ln(factor_sigma).
        gm: lowest and highest geometric mean in multiples of the limit, ln GM uniform between;
            None for no bounds. Results outside widen them: they reach two decades past the data.
    """

    spread: str
    gsd: tuple[float, float] | None = None
    median_sigma: float = 0.80
    factor_sigma: float = 2.0
    gm: tuple[float, float] | None = None

    def log_density(self, log_sigma: Floats) -> Floats:
        """Log density of ln sigma, up to a constant."""
        if self.spread == "lognormal":
            away = (log_sigma - np.log(self.median_sigma)) / np.log(self.factor_sigma)
            return np.asarray(-0.5 * away**2)
        return np.asarray(log_sigma if self.spread == "uniform" else np.zeros_like(log_sigma))


GSD_RANGE: Final = (1.05, 10.0)
GM_RANGE: Final = (1e-4, 100.0)
DATA_REACH: Final = 100.0

# The bounds and the lognormal of `weak` are this program's own choice: wide enough for the spread
# that surveys of occupational variance components report (Kromhout, Symanski, Rappaport 1993,
# memory). `ref` gives back the tolerance limit; `flat` is flat in sigma and only for comparison.
PRIORS: Final[Mapping[str, Prior]] = MappingProxyType(
    {
        "ref": Prior("reciprocal"),
        "flat": Prior("uniform"),
        "wide": Prior("uniform", gsd=GSD_RANGE, gm=GM_RANGE),
        "weak": Prior("lognormal", gsd=GSD_RANGE, gm=GM_RANGE),
    }
)

# Degrees of freedom that an unbounded prior takes from n complete results.
CLOSED_FORM_LOSS: Final = {"reciprocal": 1.0, "uniform": 2.0}


@dataclass(frozen=True)
class Posterior:
    """Posterior of the 95th percentile of G groups; NaN and status 1 where there is none.

    Attributes:
        p_over: (G, M), chance that it exceeds each multiple of the limit.
        multiples: (M,), multiples of the limit, as asked.
        q70: (G,), its 70 % quantile.
        q95: (G,), its 95 % quantile.
        status: (G,), 0 or 1.
    """

    p_over: Floats
    multiples: tuple[float, ...]
    q70: Floats
    q95: Floats
    status: NDArray[np.int8]


def posterior(
    batch: Batch,
    limit: ArrayLike,
    *,
    prior: str | Prior = "weak",
    multiples: tuple[float, ...] = MULTIPLES,
) -> Posterior:
    """Chance that the 95th percentile exceeds multiples of the limit, and its upper quantiles.

    Args:
        batch: G groups; empty and unsound ones have no posterior.
        limit: scalar or (G,), unit of the batch; missing or not above 0 gives NaN.
        prior: a name of `PRIORS`, or one's own. Without bounds it needs results that differ.
        multiples: each above 0.

    Source: Bayesian exposure decisions as in Hewett et al. 2006, with this program's own priors.
        `ref` equals the noncentral t limit, `flat` its closed form with n - 2 degrees of freedom.
    """
    times = require("multiples", multiples, above=0.0)
    held = PRIORS[require_choice("prior", prior, PRIORS)] if isinstance(prior, str) else prior
    log_limit = np.broadcast_to(log_or_nan(limit), batch.n.shape)
    has_answer = batch.is_sound & (batch.n > 0) & np.isfinite(log_limit)
    is_closed = (batch.n_censored == 0) & (held.gsd is None) & (held.gm is None)
    is_closed &= held.spread in CLOSED_FORM_LOSS
    cuts = log_limit[:, None] + np.log(times)
    found = np.full((len(log_limit), times.size + 2), np.nan)
    index = np.flatnonzero(has_answer & is_closed)
    if index.size:
        found[index] = _closed_form(batch.rows(index), held, cuts=cuts[index])
    index = np.flatnonzero(has_answer & ~is_closed)
    if index.size:
        part, log_limits = batch.rows(index), log_limit[index]
        found[index] = _quadrature(part, held, cuts=cuts[index], log_limit=log_limits)
    p_over, q70, q95 = found[:, :-2], np.exp(found[:, -2]), np.exp(found[:, -1])
    status = np.where(np.isfinite(q95), 0, 1).astype(np.int8)
    return Posterior(p_over, tuple(float(m) for m in times), q70, q95, status)


def _closed_form(batch: Batch, prior: Prior, *, cuts: Floats) -> Floats:
    """Unbounded prior on complete results: the posterior is a scaled noncentral t."""
    m = moments(batch)
    df = m.n - CLOSED_FORM_LOSS[prior.spread]
    df = np.where((df > 0.0) & (m.s > 0.0), df, np.nan)
    scale = (m.s * np.sqrt((m.n - 1.0) / df) / np.sqrt(m.n))[:, None]
    nc = (Z95 * np.sqrt(m.n))[:, None]
    over = 1.0 - nctdtr(df[:, None], nc, (cuts - m.ybar[:, None]) / scale)
    quantiles = m.ybar[:, None] + scale * nctdtrit(df[:, None], nc, np.array([0.70, 0.95]))
    return np.hstack([over, quantiles])


def _quadrature(batch: Batch, prior: Prior, *, cuts: Floats, log_limit: Floats) -> Floats:
    data = evidence(batch)
    box = _box(batch, prior, log_limit)
    is_bounded = (prior.gsd is not None) & np.isfinite(box.low - data.center)
    # With no bounds below, only data that fix mean and spread have a posterior.
    can_do = is_bounded | (data.n_detected >= (1 if prior.gsd is not None else 2))
    can_do &= data.is_estimable | (prior.gsd is not None)
    found = np.full((len(log_limit), cuts.shape[1] + 2), np.nan)
    width = 1 + data.limits.shape[1]
    size = max(1, CHUNK_NUMBERS // (NUMBERS_A_GROUP * width))
    index = np.flatnonzero(can_do)
    for start in range(0, index.size, size):
        rows = index[start : start + size]
        part = data.rows(rows)
        span = _span(prior, batch.rows(rows))
        cut = slices(part, prior.log_density, span=span, box=box.rows(rows))
        center = part.center[:, None]
        over = 1.0 - cut.cdf(cuts[rows] - center, z=Z95)
        found[rows] = np.hstack([over, center + cut.quantiles(np.array([0.70, 0.95]), z=Z95)])
    return found


def _box(batch: Batch, prior: Prior, log_limit: Floats) -> Box:
    """Bounds of ln GM, each (G,)."""
    if prior.gm is None:
        return Box(np.full_like(log_limit, -np.inf), np.full_like(log_limit, np.inf))
    lowest = np.where(batch.mask, batch.logs, np.inf).min(axis=1)
    highest = np.where(batch.detected, batch.logs, -np.inf).max(axis=1)
    reach = np.log(DATA_REACH)
    low = np.minimum(log_limit + np.log(prior.gm[0]), lowest - reach)
    high = np.maximum(log_limit + np.log(prior.gm[1]), highest + reach)
    return Box(low, high)


def _span(prior: Prior, batch: Batch) -> Floats:
    """Lowest and highest ln sigma, (2, G); far about the spread of the results if unbounded."""
    if prior.gsd is not None:
        edges = np.log(np.log(np.array(prior.gsd)))
        return np.repeat(edges[:, None], len(batch.n), axis=1)
    mean = batch.logs.sum(axis=1) / batch.n
    spread = np.where(batch.mask, batch.logs - mean[:, None], 0.0)
    middle = 0.5 * np.log((spread**2).sum(axis=1) / batch.n)
    return np.stack([middle - 6.0, middle + 12.0])
