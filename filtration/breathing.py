"""Breathing: how much air a worker draws, and how fast it passes the filter.

A sinusoid with equal in and out times draws its minute volume in half of each minute, so the mean
inspiratory flow is 2, the flow-weighted mean pi^2/4 x 2 / 2 = 2.467 and the peak pi times the
minute volume.

>>> flows = inspiratory_flows(minute_volume_m3_s("moderate"))
>>> [round(float(flow) * 60_000.0, 1) for flow in flows]
[60.0, 74.0, 94.2]
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import gammaln

from filtration.require import Floats, plain, require

# Minute volume, L/min, by class of work. Common practice, not a table of a standard; ISO
# 16976-1:2022 tabulates by body size and was not seen. Editable by whoever knows the crew better.
WORK_CLASSES: Final[Mapping[str, float]] = MappingProxyType(
    {"resting": 10.0, "low": 20.0, "moderate": 30.0, "high": 45.0, "very_high": 60.0}
)

# Metabolic rate, W per m2 of body surface. ISO 8996:2021 Annex A (memory).
METABOLIC_RATE_W_M2: Final[Mapping[str, float]] = MappingProxyType(
    {"resting": 65.0, "low": 100.0, "moderate": 165.0, "high": 230.0, "very_high": 290.0}
)

# kJ released per litre of oxygen at a respiratory quotient of 0.85 (memory).
OXYGEN_KJ_L: Final = 20.6

M3_S_PER_L_MIN: Final = 1.0 / 60_000.0

# Flow-weighted mean of a half sine over its minute volume: what the lungs receive.
FLOW_WEIGHTED_RATIO: Final = math.pi**2 / 4.0


class InspiratoryFlows(NamedTuple):
    """Flows of a sinusoidal breath, m3/s, each of the shape of the minute volume."""

    mean_m3_s: Floats
    flow_weighted_m3_s: Floats
    peak_m3_s: Floats


def minute_volume_m3_s(work_class: str) -> float:
    """Minute volume of a class of work, m3/s.

    Raises:
        ValueError: the class is not one of `WORK_CLASSES`.

    Source: common practice (see `WORK_CLASSES`).
    """
    if work_class not in WORK_CLASSES:
        known = ", ".join(WORK_CLASSES)
        raise ValueError(f"work_class: {work_class!r} is not allowed; it must be one of {known}")
    return WORK_CLASSES[work_class] * M3_S_PER_L_MIN


def minute_volume_from_metabolism_m3_s(
    metabolic_rate_w: ArrayLike, *, ventilatory_equivalent: ArrayLike = 26.0
) -> Floats:
    """Minute volume that a metabolic rate asks for, m3/s.

    Args:
        metabolic_rate_w: whole body, W, above 0 to 2000.
        ventilatory_equivalent: litres of air per litre of oxygen, 15 to 60; 23 to 30 is usual and
            it rises with the load.

    Source: common practice; 20.6 kJ per litre of oxygen (memory).
    """
    rate_w = require("metabolic_rate_w", metabolic_rate_w, above=0.0, at_most=2000.0)
    ratio = require("ventilatory_equivalent", ventilatory_equivalent, at_least=15.0, at_most=60.0)
    oxygen_l_min = rate_w * 60.0 / (OXYGEN_KJ_L * 1000.0)
    return plain(ratio * oxygen_l_min * M3_S_PER_L_MIN)


def inspiratory_flows(minute_volume_m3_s: ArrayLike) -> InspiratoryFlows:
    """Mean, flow-weighted mean and peak inspiratory flow of a sinusoidal breath, m3/s.

    Speech raises the peak well beyond the sinusoid's without raising the minute volume.

    Args:
        minute_volume_m3_s: m3/s, 0 or more, any shape.

    Source: exact for a sinusoid; the pairing of 135 L/min cyclic with 270 L/min constant in
        Eshbaugh et al. (2009) J Occup Environ Hyg 6:52-61 agrees (verified).
    """
    volume = require("minute_volume_m3_s", minute_volume_m3_s, at_least=0.0)
    return InspiratoryFlows(
        mean_m3_s=plain(2.0 * volume),
        flow_weighted_m3_s=plain(FLOW_WEIGHTED_RATIO * volume),
        peak_m3_s=plain(math.pi * volume),
    )


def cycle_average(
    of_flow: Callable[[Floats], ArrayLike], minute_volume_m3_s: ArrayLike, *, nodes: int = 64
) -> Floats:
    """Average of a quantity over inhalation, each instant weighted by the air it brings.

    Args:
        of_flow: takes flows (m3/s, a trailing phase axis of `nodes`), returns the quantity in the
            same shape, broadcastable.
        minute_volume_m3_s: m3/s, above 0, any shape.
        nodes: Gauss-Legendre points over the half cycle, 2 or more.

    Returns:
        The shape of what `of_flow` returns without its last axis.

    Source: exact for a sinusoid up to the quadrature.
    """
    volume = require("minute_volume_m3_s", minute_volume_m3_s, above=0.0)
    if nodes < 2:  # noqa: PLR2004 - one point is no average
        raise ValueError(f"nodes: {nodes} is not allowed; it must be 2 or more")
    points, weights = np.polynomial.legendre.leggauss(nodes)
    flow_shape = np.sin(0.5 * math.pi * (points + 1.0))
    air = weights * flow_shape
    flows = math.pi * volume[..., np.newaxis] * flow_shape
    values = np.asarray(of_flow(flows), dtype=np.float64)
    return plain(np.sum(values * air, axis=-1) / np.sum(air))


def power_cycle_factor(exponent: ArrayLike) -> Floats:
    """Flow-weighted penetration over penetration at the peak, where penetration ~ flow^exponent.

    Args:
        exponent: dimensionless, 0 or more.

    Source: closed form of the half-sine integral.
    """
    m = require("exponent", exponent, at_least=0.0)
    return plain(
        0.5 * math.sqrt(math.pi) * np.exp(gammaln(0.5 * m + 1.0) - gammaln(0.5 * (m + 3.0)))
    )


def face_velocity_m_s(flow_m3_s: ArrayLike, *, area_m2: ArrayLike) -> Floats:
    """Speed of the air before the filter, m/s: flow over the area of all elements together."""
    flow = require("flow_m3_s", flow_m3_s, at_least=0.0)
    return plain(flow / require("area_m2", area_m2, above=0.0))
