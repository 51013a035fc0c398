"""Breakthrough: how long a bed of carbon keeps a vapour, or a mixture, below what may be breathed.

An estimate is a planning figure. It never replaces the maker's data, the written change schedule
that the rule demands, or the judgement of a qualified hygienist. Smell is never the signal.

>>> from filtration.carbon import GENERIC_CARBON
>>> toluene = Vapour(
...     name="toluene", molar_mass_g_mol=92.138, liquid_density_g_cm3=0.867, affinity=1.131,
...     vapour_pressure_kpa=2.919, boiling_point_c=110.6,
... )
>>> bed = Bed(GENERIC_CARBON, mass_g=60.0, area_cm2=100.0)
>>> at_work = Conditions(flow_l_min=30.0, temperature_k=293.15, relative_humidity=0.5)
>>> life = breakthrough_min(toluene, bed, conc_ppm=200.0, outlet_ppm=20.0, conditions=at_work)
>>> round(float(life))
632
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from filtration.carbon import (
    GAS_CONSTANT_J_MOL_K,
    Bed,
    Conditions,
    Vapour,
    capacity_g_g,
    filled_pores_g_g,
    humidity_factor,
    rate_coefficient_per_min,
    refuse_saturated,
    saturation_pressure_pa,
)
from filtration.require import Floats, plain, require

# Outlet concentration beyond which the symmetric curve no longer describes the tail.
HIGHEST_OUTLET_SHARE: Final = 0.1


def critical_bed_mass_g(
    vapour: Vapour,
    bed: Bed,
    *,
    conc_ppm: ArrayLike,
    outlet_ppm: ArrayLike,
    conditions: Conditions,
) -> Floats:
    """Carbon below which the vapour breaks through at once, g.

    Args:
        vapour: the vapour.
        bed: all cartridges that share the flow.
        conc_ppm: inlet, ppm, above 0.
        outlet_ppm: what may be breathed, ppm, above 0 and less than `conc_ppm`.
        conditions: flow, temperature, humidity and pressure.

    Source: Jonas & Rehrmann (1973) Carbon 11:59-64 (memory).
    """
    conc, outlet = _inlet_and_outlet(conc_ppm, outlet_ppm)
    dry = capacity_g_g(
        vapour,
        bed.carbon,
        conc_ppm=conc,
        temperature_k=conditions.temperature_k,
        pressure_pa=conditions.pressure_pa,
    )
    held = dry * humidity_factor(conditions.relative_humidity)
    share = np.minimum(outlet / conc, HIGHEST_OUTLET_SHARE)
    return plain(_critical_mass_g(vapour, bed, held_g_g=held, share=share, conditions=conditions))


def breakthrough_min(
    vapour: Vapour,
    bed: Bed,
    *,
    conc_ppm: ArrayLike,
    outlet_ppm: ArrayLike,
    conditions: Conditions,
) -> Floats:
    """Time until the outlet reaches a concentration, min; 0 where the bed is too small for any.

    The outlet is never taken above a tenth of the inlet, where the curve stops being valid.

    Args:
        vapour: the one vapour; for several see `mixture_lives`.
        bed: all cartridges that share the flow.
        conc_ppm: inlet, ppm, above 0.
        outlet_ppm: what may be breathed, ppm, above 0 and less than `conc_ppm`.
        conditions: flow, temperature, humidity and pressure.

    Raises:
        ValueError: an argument out of range, the outlet at or above the inlet, or saturated air.

    Valid: one vapour, constant conditions. Published agreement is within a factor of 1.5 to 2; far
        too long for small polar molecules, see `cautions`. The capacity has no linear limit at low
        concentration, so that a weakly held vapour, or a bed near its critical mass, may seem to
        last *less* at a lower concentration: too short there, not too long.
    Source: Jonas & Rehrmann (1973) Carbon 11:59-64; Wood (1994) Am Ind Hyg Assoc J 55:11-15
        (memory).
    """
    conc, outlet = _inlet_and_outlet(conc_ppm, outlet_ppm)
    lives = mixture_lives(
        [vapour],
        bed,
        conc_ppm=conc[..., np.newaxis],
        outlet_ppm=outlet[..., np.newaxis],
        conditions=conditions,
    )
    return plain(lives[..., 0])


def mixture_lives(
    vapours: Sequence[Vapour],
    bed: Bed,
    *,
    conc_ppm: ArrayLike,
    outlet_ppm: ArrayLike,
    conditions: Conditions,
) -> Floats:
    """Breakthrough time of each vapour of a mixture, min; the shortest is the schedule's.

    Each vapour gets its mole fraction of the capacity it would have alone, which errs short. A
    vapour below its own limit is still held to a tenth of its inlet.

    Args:
        vapours: n vapours, 1 or more.
        bed: all cartridges that share the flow.
        conc_ppm: inlets, ppm, above 0, trailing axis n.
        outlet_ppm: what may be breathed of each, ppm, above 0, trailing axis n or broadcastable.
        conditions: flow, temperature, humidity and pressure, without the vapour axis.

    Returns:
        Minutes, trailing axis n.

    Source: Wood (2002, 2004), molar proportion (memory).
    """
    conc = per_vapour("conc_ppm", conc_ppm, len(vapours))
    outlet = per_vapour("outlet_ppm", outlet_ppm, len(vapours))
    for index, vapour in enumerate(vapours):
        refuse_saturated(
            vapour,
            conc[..., index],
            temperature_k=conditions.temperature_k,
            pressure_pa=conditions.pressure_pa,
        )
    humid = humidity_factor(conditions.relative_humidity)
    return plain(
        lives_min(
            vapours, bed, Inlets(conc, outlet, conditions), humid=humid, rate_factor=np.ones(())
        )
    )


@dataclass(frozen=True)
class Inlets:
    """Checked concentrations, ppm, with the vapour axis last, and what else the bed meets."""

    conc: Floats
    outlet: Floats
    conditions: Conditions


def lives_min(
    vapours: Sequence[Vapour],
    bed: Bed,
    inlets: Inlets,
    *,
    humid: Floats,
    rate_factor: Floats,
) -> Floats:
    """Life of each vapour, min, vapour axis last; air beyond saturation counts as saturated.

    Args:
        vapours: n vapours, 1 or more.
        bed: all cartridges that share the flow.
        inlets: checked concentrations and conditions.
        humid: share of the dry capacity that is left, 0 to 1.
        rate_factor: on the rate coefficient, above 0.
    """
    conditions = inlets.conditions
    molar_fraction = inlets.conc / np.sum(inlets.conc, axis=-1, keepdims=True)
    lives = []
    for index, vapour in enumerate(vapours):
        conc = inlets.conc[..., index]
        full_pa = saturation_pressure_pa(vapour, conditions.temperature_k)
        held = filled_pores_g_g(
            vapour,
            bed.carbon,
            np.minimum(conc * 1e-6 * np.asarray(conditions.pressure_pa) / full_pa, 1.0),
            temperature_k=conditions.temperature_k,
        )
        held = held * humid * molar_fraction[..., index]
        share = np.minimum(inlets.outlet[..., index] / conc, HIGHEST_OUTLET_SHARE)
        critical_g = _critical_mass_g(
            vapour, bed, held_g_g=held, share=share, conditions=conditions
        )
        useful_g = np.maximum(np.asarray(bed.mass_g) - critical_g / rate_factor, 0.0)
        lives.append(held * useful_g / _fed_g_min(vapour, conc, conditions))
    return np.stack(np.broadcast_arrays(*lives), axis=-1)


def per_vapour(name: str, value: ArrayLike, count: int) -> Floats:
    """Concentrations with a vapour axis of `count`, or a refusal."""
    numbers = require(name, value, above=0.0)
    if count == 0:
        raise ValueError("vapours: none given; at least 1 must be known")
    if numbers.ndim and numbers.shape[-1] not in {1, count}:
        raise ValueError(f"{name}: {numbers.shape[-1]} values; it must be one for each of {count}")
    return np.broadcast_to(numbers, (*numbers.shape[:-1], count))


def _inlet_and_outlet(conc_ppm: ArrayLike, outlet_ppm: ArrayLike) -> tuple[Floats, Floats]:
    conc = require("conc_ppm", conc_ppm, above=0.0, at_most=1e6)
    outlet = require("outlet_ppm", outlet_ppm, above=0.0)
    if not np.all(outlet < conc):
        raise ValueError(
            f"outlet_ppm: {np.max(outlet):.12g} is not allowed; it must be less than conc_ppm"
        )
    return conc, outlet


def _critical_mass_g(
    vapour: Vapour, bed: Bed, *, held_g_g: Floats, share: Floats, conditions: Conditions
) -> Floats:
    # The bed must stop the vapour at the flow of a breath, not at the mean over in and out.
    flow_cm3_min = (
        np.asarray(conditions.flow_l_min) * np.asarray(conditions.velocity_ratio) * 1000.0
    )
    rate = rate_coefficient_per_min(
        vapour,
        bed.carbon,
        capacity=held_g_g,
        velocity_cm_s=flow_cm3_min / 60.0 / np.asarray(bed.area_cm2),
    )
    tail = np.log((1.0 - share) / share)
    return np.asarray(np.asarray(bed.carbon.bed_density_g_cm3) * flow_cm3_min / rate * tail)


def _fed_g_min(vapour: Vapour, conc_ppm: Floats, conditions: Conditions) -> Floats:
    """Vapour that the flow brings, g/min."""
    kelvin = np.asarray(conditions.temperature_k, dtype=np.float64)
    molar_l = GAS_CONSTANT_J_MOL_K * kelvin / np.asarray(conditions.pressure_pa) * 1e3
    moles_l = conc_ppm * 1e-6 / molar_l
    return np.asarray(moles_l * vapour.molar_mass_g_mol * np.asarray(conditions.flow_l_min))


@dataclass(frozen=True)
class YoonNelson:
    """A breakthrough curve through two measured points, without knowing the carbon.

    Attributes:
        tau_min: time to half of the inlet, min.
        rate_per_min: steepness, 1/min.

    Source: Yoon & Nelson (1984) Am Ind Hyg Assoc J 45:509-516 (memory).
    """

    tau_min: Floats
    rate_per_min: Floats

    def time_min(self, outlet_share: ArrayLike) -> Floats:
        """Time to that share of the inlet, min; never below 0.

        Args:
            outlet_share: outlet over inlet, above 0 to less than 1.
        """
        share = require("outlet_share", outlet_share, above=0.0, below=1.0)
        return plain(
            np.maximum(self.tau_min + np.log(share / (1.0 - share)) / self.rate_per_min, 0.0)
        )


def yoon_nelson(t10_min: ArrayLike, t50_min: ArrayLike) -> YoonNelson:
    """The curve through measured times to 10 % and 50 % of the inlet.

    Args:
        t10_min: min, above 0.
        t50_min: min, more than `t10_min`.

    Raises:
        ValueError: the times do not rise.

    Source: Yoon & Nelson (1984) Am Ind Hyg Assoc J 45:509-516 (memory).
    """
    early = require("t10_min", t10_min, above=0.0)
    half = require("t50_min", t50_min, above=0.0)
    if not np.all(half > early):
        raise ValueError(f"t50_min: {half} is not allowed; it must be more than t10_min")
    return YoonNelson(tau_min=plain(half), rate_per_min=plain(np.log(9.0) / (half - early)))
