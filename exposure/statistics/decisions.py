"""From the results of a group to the statistic that enters its hazard ratio.

The statistic is an upper confidence limit of the 95th percentile and never below the highest
result: 70 % by default, the confidence of the European compliance test, because protection factors
carry a margin of their own; the 95 % figure is always given beside it. Nothing here is a pass: no
results, a bad result or no limit is status 1, "no estimate", and NaN in every figure.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtri

from exposure.statistics.bayes import posterior
from exposure.statistics.censored import quantile_limit, tobit
from exposure.statistics.flags import (
    FEW_DETECTS,
    FEW_RESULTS,
    MOST_RESULTS,
    data_flags,
    is_coarse,
    is_identical,
)
from exposure.statistics.gate import Bools, Floats, Ints, Objects, Status, require, require_choice
from exposure.statistics.lognormal import P95, SPREAD_FROM, is_complete, moments, utl
from exposure.statistics.pack import Batch, buckets

POLICIES: Final = ("upper70", "upper95")
LEVELS: Final = (0.70, 0.95)
MOST_CENSORED: Final = 0.80

# Spread taken where nothing was detected (GSD 2.2): the median of the `weak` prior.
ASSUMED_SIGMA: Final = 0.80
# Priors disagree when the wide one moves the 70 % figure by this factor; our own threshold.
PRIOR_FACTOR: Final = 1.5

NONE: Final = "none"
LOGNORMAL: Final = "lognormal"
LIKELIHOOD: Final = "maximum likelihood"
FEW: Final = "few results"
ALL_BELOW: Final = "all below detection"
IDENTICAL: Final = "identical results"

Z95: Final = float(ndtri(P95))


@dataclass(frozen=True)
class GroupFigures:
    """Figures of G groups, each (G,), in the unit of the results; NaN where there is none.

    Attributes:
        n: results.
        n_censored: results below detection.
        gm: geometric mean, shown where at least two results allow it.
        gsd: geometric standard deviation; n - 1 in complete data, maximum likelihood otherwise.
        x95: point estimate of the 95th percentile; half the time too low, never decides.
        x95_upper70: its upper 70 % limit.
        x95_upper95: its upper 95 % limit.
        highest: highest detected result.
        basis: how the limits were found, one of the names in this module.
        governing: the statistic that enters the hazard ratio.
        ratio: governing over the limit: the hazard ratio.
        ratio95: the same at 95 % confidence.
        status: 0, or 1 for no estimate.
        flags: words of `flags.SENTENCES`, one tuple a group.
    """

    n: Ints
    n_censored: Ints
    gm: Floats
    gsd: Floats
    x95: Floats
    x95_upper70: Floats
    x95_upper95: Floats
    highest: Floats
    basis: Objects
    governing: Floats
    ratio: Floats
    ratio95: Floats
    status: Status
    flags: list[tuple[str, ...]]


@dataclass(frozen=True)
class _Kinds:
    """Which way each group is worked out, each (G,); at most one is True."""

    lognormal: Bools
    likelihood: Bools
    few: Bools
    all_below: Bools
    identical: Bools


@dataclass(frozen=True)
class _Uppers:
    """Upper limits of the 95th percentile, (2, G) at `LEVELS`, and where the prior decides."""

    limits: Floats
    is_prior_driven: Bools


def describe(batch: Batch, limit: ArrayLike, *, policy: str = "upper70") -> GroupFigures:
    """Figures, hazard ratio and flags of every group.

    Args:
        batch: G groups, each of one unit; results of one averaging time and size fraction.
        limit: scalar or (G,), same unit and averaging time, adjusted for the shift; a missing one
            (NaN) or one not above 0 gives its group no figures.
        policy: confidence of the statistic that governs, "upper70" or "upper95".

    Raises:
        ValueError: the policy is not known, or `limit` does not fit the groups.
    """
    require_choice("policy", policy, POLICIES)
    allowed = _usable_limit(limit, len(batch.n))
    figures = _blank(batch)
    flags: list[tuple[str, ...]] = _reasons(batch, allowed)
    for rows, part in buckets(batch):
        is_usable = part.is_sound & np.isfinite(allowed[rows]) & (part.n <= MOST_RESULTS)
        index = rows[is_usable]
        if index.size:
            found = _describe_part(part.rows(is_usable), allowed[index], policy=policy)
            _enter(figures, flags, index=index, found=found)
    return GroupFigures(n=batch.n, n_censored=batch.n_censored, flags=flags, **figures)


def _usable_limit(limit: ArrayLike, n_groups: int) -> Floats:
    number = np.asarray(limit, dtype=np.float64)
    if number.shape not in {(), (n_groups,)}:
        raise ValueError(
            f"limit: shape {number.shape} is not allowed; it must be one or {n_groups}"
        )
    is_good = np.isfinite(number) & (number > 0.0)
    return np.broadcast_to(np.where(is_good, number, np.nan), (n_groups,))


def _blank(batch: Batch) -> dict[str, NDArray[Any]]:
    shape = batch.n.shape
    names = ("gm", "gsd", "x95", "x95_upper70", "x95_upper95", "highest", "governing")
    figures: dict[str, NDArray[Any]] = {
        name: np.full(shape, np.nan) for name in (*names, "ratio", "ratio95")
    }
    figures["basis"] = np.full(shape, NONE, dtype=object)
    figures["status"] = np.ones(shape, dtype=np.int8)
    return figures


def _reasons(batch: Batch, limit: Floats) -> list[tuple[str, ...]]:
    """Why a group has no figures; empty for those that have."""
    return _words(
        {
            "no_results": batch.n == 0,
            "bad_value": ~batch.is_sound,
            "limit_missing": np.isnan(limit),
            "too_many_results": batch.n > MOST_RESULTS,
        }
    )


def _words(holds: dict[str, Bools]) -> list[tuple[str, ...]]:
    names = tuple(holds)
    table = np.stack(list(holds.values()), axis=1)
    return [tuple(names[i] for i in np.flatnonzero(row)) for row in table]


def _enter(
    figures: dict[str, NDArray[Any]],
    flags: list[tuple[str, ...]],
    *,
    index: Ints,
    found: tuple[dict[str, NDArray[Any]], list[tuple[str, ...]]],
) -> None:
    columns, words = found
    for name, column in columns.items():
        figures[name][index] = column
    for row, said in zip(index, words, strict=True):
        flags[row] = said


def _describe_part(
    batch: Batch, limit: Floats, *, policy: str
) -> tuple[dict[str, NDArray[Any]], list[tuple[str, ...]]]:
    """Figures of sound groups with results and a limit."""
    gm, gsd, x95 = _points(batch)
    kinds = _kinds(batch)
    uppers = _uppers(batch, kinds, limit, x95=x95)
    upper70, upper95 = uppers.limits
    wanted = upper70 if policy == "upper70" else upper95
    # Where nothing was detected only the 95 % bound is strong enough to act on.
    wanted = np.where(kinds.all_below, upper95, wanted)
    governing, governing95 = np.fmax(wanted, batch.highest), np.fmax(upper95, batch.highest)
    is_known = np.isfinite(governing) & np.isfinite(wanted) & np.isfinite(governing95)
    columns = {
        "gm": gm,
        "gsd": gsd,
        "x95": x95,
        "x95_upper70": upper70,
        "x95_upper95": upper95,
        "highest": batch.highest,
        "governing": np.where(is_known, governing, np.nan),
        "ratio": np.where(is_known, governing / limit, np.nan),
        "ratio95": np.where(is_known, governing95 / limit, np.nan),
        "basis": np.where(is_known, _basis(kinds), NONE),
        "status": np.where(is_known, 0, 1).astype(np.int8),
    }
    holds = data_flags(batch, limit, gsd)
    holds["prior_driven"] = uppers.is_prior_driven
    holds["out_of_range"] = ~is_known
    return columns, _words(holds)


def _kinds(batch: Batch) -> _Kinds:
    n, n_censored = batch.n, batch.n_censored
    n_detected = n - n_censored
    all_below = n_detected == 0
    identical = is_identical(batch)
    lognormal = is_complete(batch) & (n >= FEW_RESULTS) & ~identical
    likelihood = (n_censored > 0) & (batch.n_telling >= FEW_RESULTS)
    likelihood &= n_detected >= FEW_DETECTS
    likelihood &= (n_censored <= MOST_CENSORED * n) & (tobit(batch).status == 0)
    few = ~(all_below | identical | lognormal | likelihood)
    return _Kinds(lognormal, likelihood, few, all_below, identical)


def _basis(kinds: _Kinds) -> Objects:
    basis = np.full(kinds.few.shape, FEW, dtype=object)
    basis[kinds.lognormal] = LOGNORMAL
    basis[kinds.likelihood] = LIKELIHOOD
    basis[kinds.all_below] = ALL_BELOW
    basis[kinds.identical] = IDENTICAL
    return basis


def _points(batch: Batch) -> tuple[Floats, Floats, Floats]:
    """GM, GSD and X95 to show; a single detect among nondetects gives none."""
    m, fit = moments(batch), tobit(batch)
    n_detected = batch.n - batch.n_censored
    can_fit = (n_detected >= SPREAD_FROM) & (batch.n_censored <= MOST_CENSORED * batch.n)
    has_both = is_complete(batch) & (batch.n >= SPREAD_FROM)
    mu = np.where(has_both, m.ybar, np.where(can_fit, fit.mu, np.nan))
    sigma = np.where(has_both, m.s, np.where(can_fit, fit.sigma, np.nan))
    with np.errstate(over="ignore"):
        return np.exp(mu), np.exp(sigma), np.exp(mu + Z95 * sigma)


def _uppers(batch: Batch, kinds: _Kinds, limit: Floats, *, x95: Floats) -> _Uppers:
    """Upper limits by the way that suits each group."""
    limits = np.full((2, len(limit)), np.nan)
    for row, conf in enumerate(LEVELS):
        limits[row] = np.where(kinds.lognormal, utl(batch, conf=conf), np.nan)
        index = np.flatnonzero(kinds.likelihood)
        limits[row, index] = quantile_limit(batch.rows(index), p=P95, conf=conf, is_calibrated=True)
        bound = all_below_bound(batch.highest_lod, batch.n, conf=conf)
        limits[row] = np.where(kinds.all_below, bound, limits[row])
    is_driven = np.zeros(len(limit), dtype=bool)
    # Two coarse values say too little about the spread: the prior may only raise their limit.
    index = np.flatnonzero(kinds.few | kinds.identical | is_coarse(batch))
    if index.size:
        part = batch.rows(index)
        weak, wide = (posterior(part, limit[index], prior=name) for name in ("weak", "wide"))
        # Where results scatter more than the prior allows, the plain estimate is the floor.
        floor = np.fmax(weak.q70, np.where(kinds.few[index], x95[index], np.nan))
        found = np.stack([floor, np.fmax(floor, weak.q95)])
        is_driven[index] = ~(wide.q70 < PRIOR_FACTOR * weak.q70) | (floor > weak.q70)
        limits[:, index] = np.fmax(limits[:, index], found)
    return _Uppers(limits, is_driven)


def share_above_lod(n: ArrayLike, *, conf: float = 0.95) -> Floats:
    """Upper limit of the share of exposures above detection when none of n results was, 0 to 1.

    Source: binomial, 1 - (1 - conf)^(1/n).
    """
    level = float(require("conf", conf, above=0.0, below=1.0))
    count = np.where(np.asarray(n) >= 1, n, np.nan).astype(np.float64)
    return np.asarray(1.0 - (1.0 - level) ** (1.0 / count))


def all_below_bound(
    lod: ArrayLike, n: ArrayLike, *, conf: float = 0.95, sigma: float = ASSUMED_SIGMA
) -> Floats:
    """Upper limit of the 95th percentile when all n results are below detection.

    A lognormal of the assumed spread, with as large a share above the highest limit as the results
    allow, has this 95th percentile. A statement about the method's reach, not an estimate of the
    exposure.

    Args:
        lod: highest detection limit; the answer has its unit.
        n: results, 1 or more; NaN for none.
        conf: above 0 and below 1.
        sigma: assumed standard deviation of ln x, above 0.

    Source: binomial bound with a stated sigma of 0.80 (our own choice).
    """
    spread = float(require("sigma", sigma, above=0.0))
    # From 59 results on the percentile itself is below the limit; how far is only assumed.
    lift = np.maximum(spread * (Z95 + ndtri(share_above_lod(n, conf=conf))), 0.0)
    return np.asarray(np.asarray(lod) * np.exp(lift))
