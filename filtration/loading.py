"""Loading: the mass a filter draws, how its resistance grows, and when it meets a limit.

Concentrations are of everything that is drawn in (inhalable or total); a respirable sample
understates the load. Lives are planning figures in three values, because the resistance of a cake
is known to a decade at best.

>>> mg = mass_collected_kg(
...     5e-6, minute_volume_m3_s=5e-4, duration_s=8 * 3600.0, efficiency=1.0
... )
>>> round(float(mg) * 1e6, 6)
72.0
>>> element = ParticleFilter(
...     area_m2=0.015, test_flow_m3_s=85 / 60_000, clean_pressure_pa=120.0, k2_per_s=(1e5, 3e5, 5e5)
... )
>>> life = time_to_limit_s(
...     5e-6, minute_volume_m3_s=5e-4, element=element, limit_pa=343.2, efficiency=0.99
... )
>>> [round(hours, 1) for hours in (life / 3600.0).tolist()]
[8.0, 13.3, 39.8]
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from filtration.ageing import (
    WorstLoad,
    bergman_pressure_drop_pa,
    electret_penetration,
    electret_worst,
    mechanical_penetration,
)
from filtration.cake import CAKE_RESISTANCE, CakeResistance
from filtration.require import Floats, plain, require

__all__ = [
    "CAKE_RESISTANCE",
    "CakeResistance",
    "DepthStage",
    "ParticleFilter",
    "WorstLoad",
    "bergman_pressure_drop_pa",
    "electret_penetration",
    "electret_worst",
    "mass_collected_kg",
    "mass_to_limit_kg",
    "mechanical_penetration",
    "pressure_drop_pa",
    "resistance_pa_s_m3",
    "time_to_limit_s",
    "time_to_mass_s",
]

LIFE_ORDER: Final = ("low", "likely", "high")


@dataclass(frozen=True)
class DepthStage:
    """Deposit inside the medium before a cake forms: pressure grows as exp(growth x load).

    Attributes:
        growth_m2_kg: b, m2/kg, 0 or more.
        clogging_load_kg_m2: W_c, kg/m2, 0 or more; 0.001 to 0.010 is usual (memory).

    Source: Thomas et al. (2001) Chem Eng Sci 56:3549-3561, simplified (memory).
    """

    growth_m2_kg: ArrayLike = 0.0
    clogging_load_kg_m2: ArrayLike = 0.0

    def __post_init__(self) -> None:
        require("growth_m2_kg", self.growth_m2_kg, at_least=0.0)
        require("clogging_load_kg_m2", self.clogging_load_kg_m2, at_least=0.0)


NO_DEPTH: Final = DepthStage()


@dataclass(frozen=True)
class ParticleFilter:
    """A particle filter as far as its resistance goes. All elements of a set together.

    Attributes:
        area_m2: m2, above 0.
        test_flow_m3_s: flow at which clean pressure and limit are stated, m3/s, above 0.
        clean_pressure_pa: at that flow, Pa, above 0.
        k2_per_s: (low, likely, high) resistance of the cake on a trailing axis of 3, 1/s, above 0.
        depth: what happens before the cake.
    """

    area_m2: ArrayLike
    test_flow_m3_s: ArrayLike
    clean_pressure_pa: ArrayLike
    k2_per_s: ArrayLike
    depth: DepthStage = NO_DEPTH

    def __post_init__(self) -> None:
        for name in ("area_m2", "test_flow_m3_s", "clean_pressure_pa"):
            require(name, getattr(self, name), above=0.0)
        k2 = require("k2_per_s", self.k2_per_s, above=0.0)
        if k2.ndim == 0 or k2.shape[-1] != len(LIFE_ORDER):
            raise ValueError("k2_per_s: one value is not allowed; it must be low, likely and high")
        if not np.all(np.diff(k2, axis=-1) >= 0.0):
            raise ValueError(f"k2_per_s: {k2} is not allowed; low, likely and high must not fall")


def mass_collected_kg(
    conc_kg_m3: ArrayLike,
    *,
    minute_volume_m3_s: ArrayLike,
    duration_s: ArrayLike,
    efficiency: ArrayLike,
    leak_share: ArrayLike = 0.0,
) -> Floats:
    """Mass that stays in the filter: concentration x air through the filter x efficiency, kg.

    Args:
        conc_kg_m3: inhalable or total dust outside, kg/m3, 0 or more.
        minute_volume_m3_s: air breathed, m3/s, 0 or more; in a powered device the blower's flow,
            which loads the filter whether or not anybody breathes.
        duration_s: time worn, s, 0 or more.
        efficiency: of the filter by mass, 0 to 1; 1 is the safe value for loading.
        leak_share: leak flow over total flow, 0 to 1; 0 is the safe value for loading.

    Source: mass balance, exact.
    """
    rate = _mass_rate_kg_s(conc_kg_m3, minute_volume_m3_s, efficiency, leak_share=leak_share)
    return plain(rate * require("duration_s", duration_s, at_least=0.0))


def time_to_mass_s(
    mass_kg: ArrayLike,
    *,
    conc_kg_m3: ArrayLike,
    minute_volume_m3_s: ArrayLike,
    efficiency: ArrayLike = 1.0,
    leak_share: ArrayLike = 0.0,
) -> Floats:
    """Time until the filter holds that mass, s.

    Args:
        mass_kg: kg, 0 or more.
        conc_kg_m3: inhalable or total dust outside, kg/m3, above 0.
        minute_volume_m3_s: air breathed, m3/s, above 0.
        efficiency: of the filter by mass, above 0 to 1.
        leak_share: leak flow over total flow, 0 to less than 1.

    Raises:
        ValueError: nothing is collected, so that no time exists.
    """
    mass = require("mass_kg", mass_kg, at_least=0.0)
    rate = _mass_rate_kg_s(conc_kg_m3, minute_volume_m3_s, efficiency, leak_share=leak_share)
    return plain(mass / require("mass collected per second", rate, above=0.0))


def _mass_rate_kg_s(
    conc_kg_m3: ArrayLike,
    minute_volume_m3_s: ArrayLike,
    efficiency: ArrayLike,
    *,
    leak_share: ArrayLike,
) -> Floats:
    conc = require("conc_kg_m3", conc_kg_m3, at_least=0.0)
    volume = require("minute_volume_m3_s", minute_volume_m3_s, at_least=0.0)
    caught = require("efficiency", efficiency, at_least=0.0, at_most=1.0)
    leak = require("leak_share", leak_share, at_least=0.0, at_most=1.0)
    return conc * volume * caught * (1.0 - leak)


def pressure_drop_pa(
    mass_kg: ArrayLike,
    *,
    area_m2: ArrayLike,
    flow_m3_s: ArrayLike,
    clean_pressure_pa: ArrayLike,
    k2_per_s: ArrayLike,
    depth: DepthStage = NO_DEPTH,
) -> Floats:
    """Pressure drop of a loaded filter at a flow, Pa. The area enters squared in the cake's part.

    Args:
        mass_kg: deposit, kg, 0 or more.
        area_m2: of all elements together, m2, above 0.
        flow_m3_s: total flow, m3/s, 0 or more.
        clean_pressure_pa: of the new filter at the same flow, Pa, 0 or more.
        k2_per_s: resistance of the cake, 1/s, 0 or more; broadcasts with the rest.
        depth: stage before the cake; none by default.

    Source: linear cake; depth stage after Thomas et al. (2001) Chem Eng Sci 56:3549-3561 (memory).
    """
    area = require("area_m2", area_m2, above=0.0)
    load = require("mass_kg", mass_kg, at_least=0.0) / area
    flow = require("flow_m3_s", flow_m3_s, at_least=0.0)
    clean = require("clean_pressure_pa", clean_pressure_pa, at_least=0.0)
    k2 = require("k2_per_s", k2_per_s, at_least=0.0)
    inside = np.minimum(load, np.asarray(depth.clogging_load_kg_m2))
    cake = load - inside
    return plain(clean * np.exp(np.asarray(depth.growth_m2_kg) * inside) + k2 * cake * flow / area)


def resistance_pa_s_m3(mass_kg: ArrayLike, *, element: ParticleFilter) -> Floats:
    """Resistance of a loaded filter, Pa s/m3, for low, likely and high K2 on a trailing axis.

    Args:
        mass_kg: deposit, kg, 0 or more, any shape that broadcasts with the element's fields.
        element: the filter.
    """
    mass = require("mass_kg", mass_kg, at_least=0.0)
    return plain(resistance_on_k2_axis(mass[..., np.newaxis], element))


def resistance_on_k2_axis(mass_kg: Floats, element: ParticleFilter) -> Floats:
    """Pa s/m3, for a mass that has the K2 axis already."""
    flow = np.asarray(element.test_flow_m3_s, dtype=np.float64)[..., np.newaxis]
    pressure = pressure_drop_pa(
        mass_kg,
        area_m2=np.asarray(element.area_m2)[..., np.newaxis],
        flow_m3_s=flow,
        clean_pressure_pa=np.asarray(element.clean_pressure_pa)[..., np.newaxis],
        k2_per_s=element.k2_per_s,
        depth=_on_trailing_axis(element.depth),
    )
    return pressure / flow


def _on_trailing_axis(depth: DepthStage) -> DepthStage:
    return DepthStage(
        growth_m2_kg=np.asarray(depth.growth_m2_kg)[..., np.newaxis],
        clogging_load_kg_m2=np.asarray(depth.clogging_load_kg_m2)[..., np.newaxis],
    )


def mass_to_limit_kg(element: ParticleFilter, *, limit_pa: ArrayLike) -> Floats:
    """Deposit at which the pressure meets the limit, kg, as (low, likely, high) mass.

    The harshest cake gives the low mass. 0 where the clean filter is at or over the limit already.

    Args:
        element: the filter.
        limit_pa: at the element's test flow, Pa, above 0.

    Source: closed form of `pressure_drop_pa`.
    """
    limit = require("limit_pa", limit_pa, above=0.0)[..., np.newaxis]
    area = np.asarray(element.area_m2, dtype=np.float64)[..., np.newaxis]
    flow = np.asarray(element.test_flow_m3_s, dtype=np.float64)[..., np.newaxis]
    clean = np.asarray(element.clean_pressure_pa, dtype=np.float64)[..., np.newaxis]
    k2_high_to_low = np.asarray(element.k2_per_s, dtype=np.float64)[..., ::-1]
    depth = _on_trailing_axis(element.depth)
    growth, clogging = np.asarray(depth.growth_m2_kg), np.asarray(depth.clogging_load_kg_m2)
    room = np.maximum(np.log(limit / clean), 0.0)
    needed = growth * clogging
    # Inside the medium the limit is met where exp(b W) closes the room; beyond it, in the cake.
    is_within = room < needed
    within = np.where(is_within, room / np.where(is_within, growth, 1.0), clogging)
    inside = np.where(room > 0.0, np.minimum(within, clogging), 0.0)
    over = np.maximum(limit - clean * np.exp(needed), 0.0)
    return plain(inside * area + over * area**2 / (k2_high_to_low * flow))


def time_to_limit_s(
    conc_kg_m3: ArrayLike,
    *,
    minute_volume_m3_s: ArrayLike,
    element: ParticleFilter,
    limit_pa: ArrayLike,
    efficiency: ArrayLike = 1.0,
    leak_share: ArrayLike = 0.0,
) -> Floats:
    """Time until the pressure drop meets the limit, s, as (low, likely, high) life.

    Closed form: t = (dP_limit - dP_clean) A^2 / (K2 Q_test C VE E). The short life comes from the
    high K2. A filter that is over the limit when clean has a life of 0.

    Args:
        conc_kg_m3: inhalable or total dust outside, kg/m3, above 0; at 0 there is no such limit.
        minute_volume_m3_s: air breathed at the work, m3/s, above 0.
        element: the filter, with the K2 range.
        limit_pa: at the element's test flow, Pa, above 0.
        efficiency: of the filter by mass, above 0 to 1.
        leak_share: leak flow over total flow, 0 to less than 1.

    Returns:
        Seconds, the broadcast shape and a trailing axis of 3.

    Source: linear cake with an optional depth stage; mass balance.
    """
    rate = _mass_rate_kg_s(conc_kg_m3, minute_volume_m3_s, efficiency, leak_share=leak_share)
    rate = require("mass collected per second", rate, above=0.0)
    return plain(mass_to_limit_kg(element, limit_pa=limit_pa) / rate[..., np.newaxis])
