"""Face seal: how the air divides between filter and gap, and what a fit test can tell of it.

The filter and the gap lie in parallel under one pressure: dP = R Q_filter, Q_leak = k dP^n. The
power law describes a gap that does not move; suction that pulls the seal tighter is not in it, and
no model replaces a fit test.

>>> seal = Seal(leak_k=5e-7, exponent=0.7)
>>> state = solve(1e-3, resistance_pa_s_m3=1e5, seal=seal)
>>> round(float(state.pressure_pa), 3), round(float(state.share), 5)
(98.755, 0.01245)
>>> round(float(overall_fit_factor([1000.0] * 6 + [20.0])), 6)
125.0
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from filtration.require import Floats, plain, require

NEWTON_STEPS: Final = 60
NEWTON_DONE: Final = 1e-14
SMALLEST_K: Final = 1e-300


@dataclass(frozen=True)
class Seal:
    """A gap that passes k dP^n.

    Attributes:
        leak_k: m3/s per Pa^n, 0 or more.
        exponent: n, 0.5 (orifice) to 1 (narrow slit).

    Source: Chen & Willeke (1992) Am Ind Hyg Assoc J 53:533-539 (memory).
    """

    leak_k: ArrayLike
    exponent: ArrayLike = 0.7

    def __post_init__(self) -> None:
        require("leak_k", self.leak_k, at_least=0.0)
        require("exponent", self.exponent, at_least=0.5, at_most=1.0)

    @classmethod
    def from_share(
        cls,
        share: ArrayLike,
        *,
        flow_m3_s: ArrayLike,
        resistance_pa_s_m3: ArrayLike,
        exponent: ArrayLike = 0.7,
    ) -> Seal:
        """The gap that leaks `share` of the air at that flow behind that filter.

        Args:
            share: leak flow over total flow, 0 to less than 1.
            flow_m3_s: total flow at which the share holds, m3/s, above 0.
            resistance_pa_s_m3: of the filter, Pa s/m3, above 0.
            exponent: n, 0.5 to 1.
        """
        f = require("share", share, at_least=0.0, below=1.0)
        flow = require("flow_m3_s", flow_m3_s, above=0.0)
        resistance = require("resistance_pa_s_m3", resistance_pa_s_m3, above=0.0)
        n = require("exponent", exponent, at_least=0.5, at_most=1.0)
        return cls(leak_k=plain(f * flow / (resistance * flow * (1.0 - f)) ** n), exponent=n)

    @classmethod
    def slit(
        cls,
        *,
        length_m: ArrayLike,
        width_m: ArrayLike,
        height_m: ArrayLike,
        viscosity_pa_s: ArrayLike,
    ) -> Seal:
        """A narrow slit between parallel plates, w h^3 / (12 mu L); n = 1.

        Args:
            length_m: along the flow, m, above 0.
            width_m: across the flow, m, above 0.
            height_m: the gap, m, above 0.
            viscosity_pa_s: of the air, Pa s, above 0.
        """
        length = require("length_m", length_m, above=0.0)
        width = require("width_m", width_m, above=0.0)
        height = require("height_m", height_m, above=0.0)
        viscosity = require("viscosity_pa_s", viscosity_pa_s, above=0.0)
        return cls(leak_k=plain(width * height**3 / (12.0 * viscosity * length)), exponent=1.0)


@dataclass(frozen=True)
class LeakState:
    """Where the two flows balance.

    Attributes:
        pressure_pa: negative pressure in the facepiece, Pa.
        share: leak flow over total flow, 0 to 1.
    """

    pressure_pa: Floats
    share: Floats


def solve(
    flow_m3_s: ArrayLike,
    *,
    resistance_pa_s_m3: ArrayLike,
    seal: Seal,
    valve_pa_s2_m6: ArrayLike = 0.0,
) -> LeakState:
    """Facepiece pressure and leak share at a total inhaled flow.

    Doubling the filter's resistance raises a small leak share by about 2^n, so a clogging filter
    leaks more at the face while the filter itself improves.

    Args:
        flow_m3_s: total flow, m3/s, above 0.
        resistance_pa_s_m3: of the filter, Pa s/m3, above 0.
        seal: the gap; its fields broadcast with the other arguments.
        valve_pa_s2_m6: quadratic term of valves or hoses in the filter path, 0 or more.

    Returns:
        `LeakState` of the broadcast shape.

    Source: mass balance; Newton on the logarithm of pressure, which always converges because the
        total flow rises with pressure.
    """
    flow = require("flow_m3_s", flow_m3_s, above=0.0)
    resistance = require("resistance_pa_s_m3", resistance_pa_s_m3, above=0.0)
    valve = require("valve_pa_s2_m6", valve_pa_s2_m6, at_least=0.0)
    k, n = np.asarray(seal.leak_k, dtype=np.float64), np.asarray(seal.exponent, dtype=np.float64)
    log_flow = np.log(flow)
    by_filter = np.log(resistance * flow + valve * flow**2)
    by_gap = (log_flow - np.log(np.maximum(k, SMALLEST_K))) / n
    # Each path alone would carry the flow at its own pressure; together they need less than both.
    log_pressure = np.minimum(by_filter, by_gap)
    for _ in range(NEWTON_STEPS):
        pressure = np.exp(log_pressure)
        root = np.sqrt(resistance**2 + 4.0 * valve * pressure)
        filter_flow = 2.0 * pressure / (resistance + root)
        leak_flow = k * pressure**n
        slope = filter_flow * (resistance + root) / (2.0 * root) + n * leak_flow
        total = filter_flow + leak_flow
        step = (np.log(total) - log_flow) * total / slope
        log_pressure = log_pressure - step
        if np.all(np.abs(step) < NEWTON_DONE * np.maximum(1.0, np.abs(log_pressure))):
            break
    pressure = np.exp(log_pressure)
    return LeakState(
        pressure_pa=plain(pressure), share=plain(np.minimum(k * pressure**n / flow, 1))
    )


def share_elasticities(share: ArrayLike, *, exponent: ArrayLike) -> tuple[Floats, Floats]:
    """Relative change of the leak share per relative change of resistance and of flow.

    Args:
        share: leak flow over total flow, 0 to 1.
        exponent: n, 0.5 to 1.

    Returns:
        d ln f / d ln R (0 or more) and d ln f / d ln Q (0 or less).

    Source: derivative of the mass balance (computed).
    """
    f = require("share", share, at_least=0.0, at_most=1.0)
    n = require("exponent", exponent, at_least=0.5, at_most=1.0)
    balance = (1.0 - f) + n * f
    return plain(n * (1.0 - f) / balance), plain(n / balance - 1.0)


def inward_leakage(
    share: ArrayLike, *, filter_penetration: ArrayLike, leak_penetration: ArrayLike = 1.0
) -> Floats:
    """Total inward leakage: what of the outside concentration reaches the wearer, 0 to 1.

    Args:
        share: leak flow over total flow, 0 to 1.
        filter_penetration: of the filter for these particles, 0 to 1.
        leak_penetration: of the gap, 0 to 1; 1 is the safe default and falls below it only for
            particles above about 1 to 2 um.

    Source: mass balance; for the gap Holton, Tackett & Willeke (1987) AIHAJ 48:848-854 (memory).
    """
    f = require("share", share, at_least=0.0, at_most=1.0)
    through = require("filter_penetration", filter_penetration, at_least=0.0, at_most=1.0)
    round_it = require("leak_penetration", leak_penetration, at_least=0.0, at_most=1.0)
    return plain(through * (1.0 - f) + round_it * f)


def measured_fit_factor(
    share: ArrayLike, *, filter_penetration: ArrayLike, leak_penetration: ArrayLike = 1.0
) -> Floats:
    """Fit factor that an aerosol test shows when the filter lets particles through too.

    A filter of penetration P can never show more than 1/P, however good the seal.

    Args:
        share: leak flow over total flow, 0 to 1.
        filter_penetration: of the filter for the test particles, 0 to 1.
        leak_penetration: of the gap, 0 to 1.

    Raises:
        ValueError: nothing at all comes in, so that no finite fit factor exists.
    """
    leakage = inward_leakage(
        share, filter_penetration=filter_penetration, leak_penetration=leak_penetration
    )
    return plain(1.0 / require("inward leakage", leakage, above=0.0))


@dataclass(frozen=True)
class SealFinding:
    """What a fit factor says of the seal alone.

    Attributes:
        share: leak share, masked where the test cannot resolve it.
        is_resolved: False where the filter alone explains the fit factor. That is no pass.
        reason: one sentence for the reader.
    """

    share: np.ma.MaskedArray[tuple[int, ...], np.dtype[np.float64]]
    is_resolved: NDArray[np.bool_]
    reason: str


def fit_factor_to_leak(fit_factor: ArrayLike, *, filter_penetration: ArrayLike) -> SealFinding:
    """Leak share behind a measured fit factor, where the test can resolve it.

    Args:
        fit_factor: outside over inside concentration, 1 or more.
        filter_penetration: of the filter for the test particles, 0 to less than 1.

    Returns:
        `SealFinding` of the broadcast shape; never NaN.

    Source: inverse of the inward leakage with an open gap (leak penetration 1).
    """
    ff = require("fit_factor", fit_factor, at_least=1.0)
    through = require("filter_penetration", filter_penetration, at_least=0.0, below=1.0)
    share = (1.0 / ff - through) / (1.0 - through)
    is_resolved = np.asarray(share > 0.0)
    reason = "The leak share follows from the fit factor."
    if not is_resolved.all():
        reason = (
            "The filter alone lets through as much as was found inside: the test says nothing "
            "about the seal, and that is not a pass."
        )
    return SealFinding(
        share=np.ma.masked_array(np.where(is_resolved, share, 0.0), mask=~is_resolved),
        is_resolved=is_resolved,
        reason=reason,
    )


def overall_fit_factor(fit_factors: ArrayLike, *, axis: int = -1) -> Floats:
    """Overall fit factor of a test: the harmonic mean of its counted exercises.

    Penetrations (1 / fit factor) are what is averaged, so one bad exercise weighs as it should.

    Args:
        fit_factors: dimensionless, 1 or more, any shape with an exercise axis; the caller leaves
            out the grimace.
        axis: the exercise axis; it is gone from the result.

    Returns:
        Dimensionless, shape of `fit_factors` without `axis`.

    Raises:
        ValueError: a fit factor is below 1, infinite or NaN, or there are none.

    Source: 29 CFR 1910.134 App. A, Part I.C.3 (memory of the clause).
    """
    ff = np.atleast_1d(require("fit_factors", fit_factors, at_least=1.0))
    if ff.shape[axis] == 0:
        raise ValueError("fit_factors: none given; at least 1 exercise must count")
    return plain(1.0 / np.mean(1.0 / ff, axis=axis))


def lung_overstatement(deposition: ArrayLike) -> Floats:
    """Factor by which sampling the whole breath overstates the fit factor, 1 to 2.

    Exhaled air has lost part of its particles to the lung; equal times in and out.

    Args:
        deposition: share of the inhaled particles that stays in the lung, 0 to 1.

    Source: cycle average (computed).
    """
    d = require("deposition", deposition, at_least=0.0, at_most=1.0)
    return plain(2.0 / (2.0 - d))
