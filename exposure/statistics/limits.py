"""Limits: for long shifts, against the error of one day's samples, and for mixtures.

A rule is named, applied and printed; no rule is the default. The error of sampling and analysis
covers the sampled day only: whether a limit was exceeded that day, not how the days vary.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from math import ceil, log, log1p
from types import MappingProxyType
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import gammaln

from exposure.statistics.gate import Floats, require, require_choice

SHIFT_H: Final = 8.0
WEEK_H: Final = 40.0
ALL_WEEK_H: Final = 168.0
DAY_H: Final = 24.0

EXCEEDED: Final = "exceeded"
NOT_EXCEEDED: Final = "not exceeded"
POSSIBLY: Final = "possibly exceeded"

Factor = Callable[[float, float], float]

# hours a day, hours a week -> factor on the limit. "lead" is 29 CFR 1910.1025(c)(2) (verified):
# 400/h ug/m3 on the 50 ug/m3 limit, not on the action level; the daily form is Brief and Scala
# 1975 as worked in a published note (verified), the weekly one and the dose rules are from memory.
RULES: Final[Mapping[str, Factor]] = MappingProxyType(
    {
        "none": lambda _day, _week: 1.0,
        "lead": lambda day, _week: SHIFT_H / day,
        "brief_scala_daily": lambda day, _week: SHIFT_H / day * (DAY_H - day) / 16.0,
        "brief_scala_weekly": lambda _day, week: WEEK_H / week * (ALL_WEEK_H - week) / 128.0,
        "dose_daily": lambda day, _week: SHIFT_H / day,
        "dose_weekly": lambda _day, week: WEEK_H / week,
    }
)


def adjust(limit: ArrayLike, rule: str, *, hours_day: float, hours_week: float) -> Floats:
    """An 8-hour limit lowered for longer work; never raised for shorter.

    Not for ceilings and short-term limits, and never together with taking the worst 8 hours.

    Args:
        limit: any shape, above 0.
        rule: a name of `RULES`.
        hours_day: longest shift, above 0 and below 24 h.
        hours_week: above 0 and below 168 h.
    """
    require_choice("rule", rule, RULES)
    day = float(require("hours_day", hours_day, above=0.0, below=DAY_H))
    week = float(require("hours_week", hours_week, above=0.0, below=ALL_WEEK_H))
    factor = min(1.0, RULES[rule](day, week))
    return np.asarray(require("limit", limit, above=0.0) * factor)


@dataclass(frozen=True)
class DayAgainstLimit:
    """One day's samples as a multiple of the limit, with one-sided 95 % limits of their error."""

    ratio: float
    lower: float
    upper: float
    verdict: str


def sae_limits(
    concentrations: ArrayLike, minutes: ArrayLike, *, sae: float, limit: float
) -> DayAgainstLimit:
    """Was the limit exceeded on the sampled day, given the error of sampling and analysis?

    Args:
        concentrations: one full-period sample or consecutive ones.
        minutes: of each.
        sae: sampling and analytical error at 95 %, 1.645 times the total coefficient of
            variation, 0 or more.
        limit: same unit, above 0.

    Source: procedure of the OSHA Technical Manual as restated by Boss and Day, chapter 4
        (verified); the consecutive form with squares is from the same text.
    """
    c = require("concentrations", concentrations, at_least=0.0)
    t = require("minutes", minutes, above=0.0)
    error = float(require("sae", sae, at_least=0.0))
    allowed = float(require("limit", limit, above=0.0))
    if not c.size:
        raise ValueError("concentrations: none given; at least 1 sample is needed")
    ratio = float(c @ t / t.sum()) / allowed
    # The error of one sample is stated for a result at the limit, that of several by result.
    share = 1.0 if c.size == 1 else float(np.sqrt(((c * t) ** 2).sum())) / (allowed * t.sum())
    lower, upper = ratio - error * share, ratio + error * share
    verdict = NOT_EXCEEDED if upper <= 1.0 else EXCEEDED if lower > 1.0 else POSSIBLY
    return DayAgainstLimit(ratio, lower, upper, verdict)


@dataclass(frozen=True)
class Mixture:
    """Sum of the ratios of a mixture, and what it must exceed to be beyond error."""

    index: float
    control: float


def mixture_index(concentrations: ArrayLike, limits: ArrayLike, *, sae: ArrayLike = 0.0) -> Mixture:
    """Additive effect of agents that act on the same organ: above 1 is over the limit.

    For a group, work out this sum for each worker and day, then treat the sums as results with
    the limit 1: the 95th percentiles of single agents must not be added.

    Args:
        concentrations: (M,), each in the unit of its limit.
        limits: (M,), above 0.
        sae: of each, 0 or more.

    Source: 29 CFR 1910.1000(d)(2)(i) (verified); the control limit is from memory.
    """
    c = require("concentrations", concentrations, at_least=0.0)
    ratios = c / require("limits", limits, above=0.0)
    errors = ratios * require("sae", sae, at_least=0.0)
    index = float(ratios.sum())
    if not index > 0.0:
        return Mixture(index, 1.0)
    return Mixture(index, 1.0 + float(np.sqrt((errors**2).sum())) / index)


def silica_limit_mg_m3(
    quartz_percent: float, *, cristobalite_percent: float = 0.0, tridymite_percent: float = 0.0
) -> float:
    """Limit of respirable dust with silica, mg/m3, only where the 0.05 mg/m3 rule is not in force.

    Source: 29 CFR 1910.1000 Table Z-3 (verified).
    """
    parts = (
        require("quartz_percent", quartz_percent, at_least=0.0, at_most=100.0),
        2.0 * require("cristobalite_percent", cristobalite_percent, at_least=0.0, at_most=100.0),
        2.0 * require("tridymite_percent", tridymite_percent, at_least=0.0, at_most=100.0),
    )
    total = float(sum(parts))
    alone = total > 0.0 and parts[0] == 0.0
    # Without quartz the limit is half of what quartz of that share would have.
    return 0.5 * 10.0 / (0.5 * total + 2.0) if alone else 10.0 / (total + 2.0)


def workers_to_sample(n_workers: int | None, *, top_share: float, conf: float) -> int:
    """How many workers to draw so that one of the highest exposed is among them.

    Args:
        n_workers: size of the group; None for a very large one.
        top_share: share that counts as highest, rounded to whole workers, at least one.
        conf: chance of catching one.

    Source: exact hypergeometric count; the table of Leidel, Busch, Lynch 1977 as recalled agrees
        at 10 and 50 workers and is one lower at 20.
    """
    share = float(require("top_share", top_share, above=0.0, below=1.0))
    miss = 1.0 - float(require("conf", conf, above=0.0, below=1.0))
    if n_workers is None:
        return ceil(log(miss) / log1p(-share))
    size = int(require("n_workers", n_workers, at_least=1))
    top = max(1, round(share * size))
    drawn = np.arange(1, size - top + 1, dtype=np.float64)
    log_miss = gammaln(size - top + 1) - gammaln(size - top - drawn + 1)
    log_miss += gammaln(size - drawn + 1) - gammaln(size + 1)
    is_enough = np.exp(log_miss) <= miss * (1.0 + 1e-9)
    return int(drawn[is_enough.argmax()]) if is_enough.any() else size - top + 1
