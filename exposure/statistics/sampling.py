"""From a pump and a filter to a concentration, and from concentrations to a shift average.

Unsampled time is never passed over: how it is taken is said each time, and where it is not known
the answer is an interval whose upper end protects.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr

from exposure.statistics.gate import Bools, Floats, require, require_choice

# Common practice (memory); the owner of the programme may be stricter.
DRIFT_FLAG: Final = 0.05
DRIFT_VOID: Final = 0.10
BREAKTHROUGH_FLAG: Final = 0.10
BREAKTHROUGH_VOID: Final = 0.25

L_PER_M3: Final = 1000.0
SHIFT_MIN: Final = 480.0
GAP_RULES: Final = ("zero", "same", "value", "unknown")

# ISO 7708:1995, EN 481:1993: median um of the cut and its GSD (parameters verified for
# respirable, memory for thoracic).
CUTS: Final = {"thoracic": (11.64, 1.5), "respirable": (4.25, 1.5)}
FRACTIONS: Final = ("inhalable", "thoracic", "respirable")


@dataclass(frozen=True)
class AirVolume:
    """Air drawn, L, and the change of flow as a share of its mean."""

    litres: Floats
    drift: Floats


@dataclass(frozen=True)
class Concentration:
    """Result of a sample, mg/m3.

    Attributes:
        value_mg_m3: the result, or its limit where below; NaN where neither is known.
        is_censored: True where the result is below detection.
        lod_mg_m3: limit of detection of this sample.
        raw_mg_m3: blank-corrected figure as it came, may be negative; kept for audit only.
    """

    value_mg_m3: Floats
    is_censored: Bools
    lod_mg_m3: Floats
    raw_mg_m3: Floats


@dataclass(frozen=True)
class Average:
    """Time-weighted average of one shift and what the unsampled time may do to it.

    Attributes:
        value: by the stated rule; the upper end where the unsampled time is not known.
        low: with nothing in the unsampled time that is not known.
        high: with the highest measured concentration there.
        sampled_fraction: sampled minutes over exposed minutes, 0 to 1.
    """

    value: float
    low: float
    high: float
    sampled_fraction: float


def air_volume(
    flow_before_l_min: ArrayLike, flow_after_l_min: ArrayLike, *, minutes: ArrayLike
) -> AirVolume:
    """Volume from the mean of the flows before and after; a flow of 0 at the end is allowed.

    Source: mean of initial and final flow, common practice in agency methods (verified).
    """
    before = require("flow_before_l_min", flow_before_l_min, above=0.0)
    after = require("flow_after_l_min", flow_after_l_min, at_least=0.0)
    flow = 0.5 * (before + after)
    litres = flow * require("minutes", minutes, above=0.0)
    return AirVolume(litres, np.asarray(np.abs(before - after) / flow))


def concentration(
    mass_mg: ArrayLike,
    blanks_mg: ArrayLike,
    *,
    litres: ArrayLike,
    lod_mass_mg: ArrayLike,
    recovery: ArrayLike = 1.0,
) -> Concentration:
    """Blank-corrected concentration; at or below blank or detection it is "below", not zero.

    Args:
        mass_mg: found on each sample.
        blanks_mg: field blanks; their mean is taken off. None given means none.
        litres: air drawn.
        lod_mass_mg: detection limit in mass; NaN where not known.
        recovery: desorption or recovery, above 0 to 1.2; 1 if the laboratory has corrected.

    Source: sample less blank over recovery and volume, 29 CFR 1910.1045 App. D form (verified).
    """
    found = require("mass_mg", mass_mg, at_least=0.0)
    blanks = require("blanks_mg", blanks_mg, at_least=0.0)
    share = require("recovery", recovery, above=0.0, at_most=1.2)
    volume_m3 = require("litres", litres, above=0.0) / L_PER_M3
    blank = blanks.mean() if blanks.size else 0.0
    raw = (found - blank) / share / volume_m3
    lod = np.asarray(lod_mass_mg, dtype=np.float64) / share / volume_m3
    lod = np.where(lod > 0.0, lod, np.nan)
    # Not `raw < lod`: with an unknown limit a positive result stands and any other is unknown.
    is_detected = (raw > 0.0) & ~(raw < lod)
    return Concentration(np.where(is_detected, raw, lod), ~is_detected, lod, np.asarray(raw))


def pooled_concentration(mass_mg: ArrayLike, litres: ArrayLike) -> float:
    """Concentration of consecutive samples together, mg/m3: all mass over all air."""
    mass = require("mass_mg", mass_mg, at_least=0.0)
    return float(mass.sum() / require("litres", litres, above=0.0).sum() * L_PER_M3)


def mass_weighted_percent(percent: ArrayLike, mass_mg: ArrayLike) -> float:
    """Content of consecutive samples together, %, each by its mass."""
    share = require("percent", percent, at_least=0.0, at_most=100.0)
    mass = require("mass_mg", mass_mg, above=0.0)
    return float(share @ mass / mass.sum())


def twa(
    concentrations: ArrayLike,
    minutes: ArrayLike,
    *,
    gap_minutes: float = 0.0,
    gap_rule: str = "unknown",
    gap_value: float | None = None,
    reference_minutes: float | None = SHIFT_MIN,
) -> Average:
    """Time-weighted average of one shift, divided by 8 h however short the shift was.

    Args:
        concentrations: of each sample, one unit.
        minutes: of each sample, above 0.
        gap_minutes: exposed time without a sample.
        gap_rule: "zero" (documented), "same" (the samples stand for it), "value" (measured
            elsewhere, `gap_value`), or "unknown".
        gap_value: concentration of the gap, only with "value".
        reference_minutes: what is divided by; None for the exposed time itself.

    Raises:
        ValueError: the sampled and unsampled minutes are more than a day, or no samples.

    Source: 29 CFR 1910.1000(d)(1)(i) (verified).
    """
    require_choice("gap_rule", gap_rule, GAP_RULES)
    c = require("concentrations", concentrations, at_least=0.0)
    t = require("minutes", minutes, above=0.0)
    gap = float(require("gap_minutes", gap_minutes, at_least=0.0))
    if not c.size:
        raise ValueError("concentrations: none given; at least 1 sample is needed")
    exposed = float(require("minutes, all together", t.sum() + gap, at_most=1440.0))
    if gap_rule == "value":
        own = float(require("gap_value", np.nan if gap_value is None else gap_value, at_least=0.0))
    else:
        own = 0.0
    dose, top = float(c @ t), float(c.max())
    filled = {"zero": (0.0,) * 3, "same": (dose / t.sum(),) * 3, "value": (own,) * 3}
    value, low, high = filled.get(gap_rule, (top, 0.0, top))
    divisor = exposed if reference_minutes is None else reference_minutes
    divisor = float(require("reference_minutes", divisor, above=0.0))
    value, low, high = ((dose + level * gap) / divisor for level in (value, low, high))
    return Average(value, low, high, sampled_fraction=float(t.sum()) / exposed)


def size_fraction(diameter_um: ArrayLike, kind: str) -> Floats:
    """Share of airborne particles that a fraction holds, by aerodynamic diameter, 0 to 1.

    There is no conversion between results of different fractions: this describes samplers.

    Args:
        diameter_um: 0 to 100 um.
        kind: "inhalable", "thoracic" or "respirable".

    Source: ISO 7708:1995 and EN 481:1993 (formula from memory; half points 100, 10 and 4 um).
    """
    require_choice("kind", kind, FRACTIONS)
    d = require("diameter_um", diameter_um, at_least=0.0, at_most=100.0)
    inhalable = 0.5 * (1.0 + np.exp(-0.06 * d))
    if kind == "inhalable":
        return np.asarray(inhalable)
    median, gsd = CUTS[kind]
    with np.errstate(divide="ignore"):
        return np.asarray(inhalable * ndtr(-np.log(d / median) / np.log(gsd)))
