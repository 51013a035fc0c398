"""From filter to worker: workplace protection factors as distributions, and time not worn.

>>> round(float(effective_protection_factor(50.0, worn_share=0.9375)), 1)
12.3
>>> inside = inside_exposure(
...     Spreading(0.5, gsd=1.0), protection=Spreading(workplace_median(10.0, gsd=2.5), gsd=2.5)
... )
>>> round(float(inside.median), 4)
0.0111
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr, ndtri

from filtration.require import Floats, plain, require

# An assigned protection factor is reached by this share of wearings.
APF_SHARE: Final = 0.95


@dataclass(frozen=True)
class Spreading:
    """A lognormal quantity: protection factor, or concentration in any one unit. Fields broadcast.

    Attributes:
        median: geometric mean, above 0.
        gsd: geometric standard deviation, 1 or more.
    """

    median: ArrayLike
    gsd: ArrayLike

    def __post_init__(self) -> None:
        require("median", self.median, above=0.0)
        require("gsd", self.gsd, at_least=1.0)

    @property
    def log_sd(self) -> Floats:
        """ln GSD."""
        return np.log(np.asarray(self.gsd, dtype=np.float64))

    @property
    def mean(self) -> Floats:
        """Arithmetic mean, in the unit of the median."""
        return plain(np.asarray(self.median) * np.exp(0.5 * self.log_sd**2))

    def quantile(self, share: ArrayLike) -> Floats:
        """Value below which that share lies. `share`: above 0 to less than 1."""
        p = require("share", share, above=0.0, below=1.0)
        return plain(np.asarray(self.median) * np.exp(self.log_sd * ndtri(p)))


def workplace_median(
    assigned: ArrayLike, *, gsd: ArrayLike, share: ArrayLike = APF_SHARE
) -> Floats:
    """Geometric mean of workplace protection factors whose lower percentile is the assigned one.

    Args:
        assigned: protection factor, 1 or more.
        gsd: of workplace protection factors, 1 to 20; 2 to 3 is typical (memory).
        share: of wearings that reach it, 0.5 to less than 1.

    Source: APF as the 5th percentile (common practice).
    """
    apf = require("assigned", assigned, at_least=1.0)
    spread = require("gsd", gsd, at_least=1.0, at_most=20.0)
    reached = require("share", share, at_least=0.5, below=1.0)
    return plain(apf * spread ** ndtri(reached))


def two_level_factor(
    median: ArrayLike,
    *,
    between_log_sd: ArrayLike,
    within_log_sd: ArrayLike,
    wearers_share: ArrayLike = APF_SHARE,
    wearings_share: ArrayLike = APF_SHARE,
) -> Floats:
    """Factor that a share of wearers reaches in a share of their wearings.

    Args:
        median: of workplace protection factors, above 0.
        between_log_sd: standard deviation of logs between wearers, 0 or more.
        within_log_sd: standard deviation of logs within one wearer, 0 or more.
        wearers_share: 0.5 to less than 1.
        wearings_share: 0.5 to less than 1.

    Source: criterion of Nicas & Neuhaus (2004) J Occup Environ Hyg 1:99-109 (verified).
    """
    middle = require("median", median, above=0.0)
    between = require("between_log_sd", between_log_sd, at_least=0.0)
    within = require("within_log_sd", within_log_sd, at_least=0.0)
    wearers = require("wearers_share", wearers_share, at_least=0.5, below=1.0)
    wearings = require("wearings_share", wearings_share, at_least=0.5, below=1.0)
    return plain(middle * np.exp(-ndtri(wearers) * between - ndtri(wearings) * within))


def inside_exposure(
    outside: Spreading, *, protection: Spreading, correlation: ArrayLike = 0.0
) -> Spreading:
    """Concentration inside the facepiece, in the unit of the one outside.

    Args:
        outside: concentration.
        protection: workplace protection factors.
        correlation: of the two logarithms, -1 to 1.

    Source: ratio of lognormals, exact.
    """
    r = require("correlation", correlation, at_least=-1.0, at_most=1.0)
    out_sd, in_sd = outside.log_sd, protection.log_sd
    # At correlation 1 the difference of equal spreads is 0 up to rounding.
    variance = np.maximum(out_sd**2 + in_sd**2 - 2.0 * r * out_sd * in_sd, 0.0)
    return Spreading(
        median=plain(np.asarray(outside.median) / np.asarray(protection.median)),
        gsd=plain(np.exp(np.sqrt(variance))),
    )


def exceedance(exposure: Spreading, *, limit: ArrayLike) -> Floats:
    """Share of wearings above a limit, 0 to 1; a GSD of 1 gives 0 or 1, and 1 at the limit itself.

    Args:
        exposure: concentration inside.
        limit: above 0, in the unit of the exposure.
    """
    over = require("limit", limit, above=0.0)
    room = np.log(over / np.asarray(exposure.median, dtype=np.float64))
    spread = exposure.log_sd
    is_spread = spread > 0.0
    share = ndtr(-room / np.where(is_spread, spread, 1.0))
    return plain(np.where(is_spread, share, np.where(room > 0.0, 0.0, 1.0)))


def effective_protection_factor(factor: ArrayLike, *, worn_share: ArrayLike) -> Floats:
    """Protection over a whole shift when the device is off for part of it.

    Nothing exceeds 1 / (1 - worn share): 95 % wear caps every device at 20.

    Args:
        factor: protection factor while worn, 1 or more.
        worn_share: share of the exposure-weighted time worn, 0 to 1.

    Source: time-weighted mean of penetrations, exact.
    """
    pf = require("factor", factor, at_least=1.0)
    worn = require("worn_share", worn_share, at_least=0.0, at_most=1.0)
    return plain(1.0 / (worn / pf + (1.0 - worn)))


def effective_protection_over_tasks(
    factor: ArrayLike, *, concentration: ArrayLike, hours: ArrayLike, axis: int = -1
) -> Floats:
    """Protection over periods of differing concentration and device.

    Args:
        factor: of each period, 1 or more; 1 where nothing is worn.
        concentration: of each period, 0 or more, one unit.
        hours: of each period, 0 or more.
        axis: the period axis; it is gone from the result.

    Raises:
        ValueError: there is no exposure at all, so that no factor exists.

    Source: sum of C t over sum of C t / PF, exact.
    """
    pf = require("factor", factor, at_least=1.0)
    conc = require("concentration", concentration, at_least=0.0)
    dose = conc * require("hours", hours, at_least=0.0)
    dose, pf = np.broadcast_arrays(np.atleast_1d(dose), pf)
    outside = require("exposure of all periods", np.sum(dose, axis=axis), above=0.0)
    return plain(outside / np.sum(dose / pf, axis=axis))


def worn_share_for(factor: ArrayLike, *, kept: ArrayLike = 0.9) -> Floats:
    """Share of the time that a device must be worn to keep a share of its factor.

    Args:
        factor: protection factor while worn, above 1.
        kept: share of the factor to keep, above 0 to 1, at least 1 / factor.

    Raises:
        ValueError: even no wear at all keeps more than that.
    """
    pf = require("factor", factor, above=1.0)
    effective = require(
        "kept x factor", pf * require("kept", kept, above=0.0, at_most=1.0), at_least=1.0
    )
    return plain((1.0 - 1.0 / effective) / (1.0 - 1.0 / pf))
