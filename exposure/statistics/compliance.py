"""Tests of compliance of one group with a limit, and how many results they ask for.

Decision rules of EN 689:2018 as recalled and as seen in abstracts; the standard itself was not
seen. Consult it before claiming conformity.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import nctdtr, ndtr, ndtri

from exposure.statistics.gate import Floats, Objects, require
from exposure.statistics.lognormal import P95, k_factor, log_or_nan, moments
from exposure.statistics.pack import Batch

COMPLIANT: Final = "compliant"
NOT_COMPLIANT: Final = "not compliant"
UNDECIDED: Final = "undecided"

# EN 689:2018 5.5.2 (memory): share of the limit that all of 3, 4 or 5 results must stay under.
PRELIMINARY: Final = {3: 0.10, 4: 0.15, 5: 0.20}
# EN 689:2018 (criterion seen in an abstract, confidence from memory).
GROUP_CONF: Final = 0.70
GROUP_FROM: Final = 6
MOST_SAMPLES: Final = 2000


def en689_preliminary(results: ArrayLike, limit: float, *, does_boundary_pass: bool = False) -> str:
    """Preliminary test on 3, 4 or 5 results of full shifts.

    Safe for a GSD near 2; at GSD 5 it passes one group in five whose exceedance is 5 %.

    Args:
        results: above 0, all measured; a result below detection enters as its detection limit.
        limit: same unit, above 0.
        does_boundary_pass: whether a result just at the share passes; not settled, default no.

    Returns:
        `COMPLIANT`, `NOT_COMPLIANT` (a result above the limit) or `UNDECIDED`; also undecided for
        any other number of results.

    Source: EN 689:2018 5.5.2 (memory).
    """
    ratios = require("results", results, above=0.0) / require("limit", limit, above=0.0)
    if (ratios > 1.0).any():
        return NOT_COMPLIANT
    share = PRELIMINARY.get(ratios.size)
    if share is None:
        return UNDECIDED
    # A ratio that only rounding lifts over the share is on the boundary.
    is_on = np.isclose(ratios, share, rtol=1e-12, atol=0.0)
    passes = (ratios < share) & ~is_on | (is_on & does_boundary_pass)
    return COMPLIANT if passes.all() else UNDECIDED


@dataclass(frozen=True)
class GroupTest:
    """Group test of G groups: distance of the limit in standard deviations, and what it must be."""

    distance: Floats
    needed: Floats
    verdict: Objects


def en689_group(batch: Batch, limit: ArrayLike) -> GroupTest:
    """Compliant when fewer than 5 % of exposures exceed the limit, with 70 % confidence.

    Pools the workers of the group: check first that they do not differ. Groups under six results,
    with nondetects or without spread are undecided.

    Args:
        batch: G groups.
        limit: scalar or (G,).

    Source: EN 689:2018 (criterion seen in an abstract, table not retrieved); factors computed
        from the noncentral t.
    """
    m = moments(batch)
    is_testable = (m.n >= GROUP_FROM) & (m.s > 0.0)
    distance = (log_or_nan(limit) - m.ybar) / np.where(is_testable, m.s, np.nan)
    needed = k_factor(m.n, p=P95, conf=GROUP_CONF)
    verdict = np.full(distance.shape, UNDECIDED, dtype=object)
    verdict[distance >= needed] = COMPLIANT
    verdict[distance < needed] = NOT_COMPLIANT
    return GroupTest(distance, needed, verdict)


def preliminary_pass_chance(gsd: ArrayLike, n: int) -> Floats:
    """Chance that the preliminary test passes a group of which exactly 5 % exceed the limit."""
    share = PRELIMINARY[int(require("n", n, at_least=3, at_most=5))]
    sigma = np.log(require("gsd", gsd, above=1.0))
    return np.asarray(ndtr(np.log(share) / sigma + ndtri(P95)) ** n)


def compliance_chance(
    n: ArrayLike, gsd: ArrayLike, ratio: ArrayLike, *, conf: float = GROUP_CONF, p: float = P95
) -> Floats:
    """Chance that the upper `conf` limit of the p quantile comes out below the limit.

    Args:
        n: results, 2 or more.
        gsd: true one, above 1.
        ratio: true p quantile over the limit, above 0.
        conf: above 0.5 and below 1.
        p: above 0.5 and below 1.
    """
    count = require("n", n, at_least=2)
    sigma = np.log(require("gsd", gsd, above=1.0))
    z = ndtri(require("p", p, above=0.5, below=1.0))
    root = np.sqrt(count)
    away = root * (z - np.log(require("ratio", ratio, above=0.0)) / sigma)
    k = k_factor(count, p=p, conf=require("conf", conf, above=0.5, below=1.0))
    # Far beyond the factor the noncentral t runs out of digits; the chance is then certain.
    missed = nctdtr(count - 1.0, away, root * k)
    return np.asarray(np.where(away > root * k + 37.0, 1.0, 1.0 - missed))


def samples_needed(
    gsd: float, ratio: float, *, conf: float = GROUP_CONF, power: float = 0.80
) -> int | None:
    """Fewest results that show compliance with the chance `power`; None if over 2000.

    Args:
        gsd: expected, above 1; 2.7 where nothing is known (Buringh and Lanting 1991).
        ratio: expected 95th percentile over the limit, above 0; 1 or more can never be shown.
        conf: confidence asked for, above 0.5 and below 1.
        power: above 0 and below 1.
    """
    wanted = float(require("power", power, above=0.0, below=1.0))
    n = np.arange(3, MOST_SAMPLES + 1)
    chance = compliance_chance(n, gsd, ratio, conf=conf)
    is_enough = chance >= wanted
    return int(n[is_enough.argmax()]) if is_enough.any() else None
