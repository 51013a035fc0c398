"""Carbon and vapour: how much of a vapour a carbon holds, and how fast it takes it up.

>>> pe = polarisability_cm3_mol(1.4941, molar_mass_g_mol=92.138, density_g_cm3=0.86699)
>>> round(float(pe), 2), round(float(affinity(pe)), 3)
(30.94, 1.131)
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from filtration.require import Floats, plain, require

GAS_CONSTANT_J_MOL_K: Final = 8.314462618
CELSIUS_ZERO_K: Final = 273.15
ATMOSPHERE_PA: Final = 101_325.0
ROOM_K: Final = 293.15

# Capacity left by humidity: whole up to the first share, half at the second, none stated beyond
# the third. Half at 85 % is the agency's published rule of thumb (memory).
DRY_UP_TO: Final = 0.50
HALF_AT: Final = 0.85
HIGHEST_HUMIDITY: Final = 0.95

# Below this affinity the measured lives of Nelson & Correia (1976) fall far short of the model
# (methanol 0.42, ethanol 0.59); the boundary is our own reading of that table.
SMALL_POLAR_AFFINITY: Final = 0.60
SINGLE_USE_BOILING_C: Final = 65.0

# CAS numbers that organic-vapour carbon is not meant for, with the reason. Common practice.
NOT_FOR_CARBON: Final[Mapping[str, str]] = MappingProxyType(
    {
        "67-56-1": "methanol passes organic-vapour carbon within minutes",
        "75-09-2": "dichloromethane has a standard of its own and passes carbon early",
        "630-08-0": "carbon monoxide is not held by carbon",
        "10102-43-9": "nitric oxide is not held by carbon",
    }
)


@dataclass(frozen=True)
class Vapour:
    """A vapour as far as a bed of carbon is concerned.

    Attributes:
        name: for messages.
        molar_mass_g_mol: g/mol, 2 to 1000.
        liquid_density_g_cm3: g/cm3, 0.3 to 5; taken as constant with temperature.
        affinity: affinity coefficient, benzene = 1, above 0 to 5; see `affinity`.
        vapour_pressure_kpa: saturation pressure at `reference_k`, kPa, above 0 to 1000.
        boiling_point_c: at one atmosphere, degrees C, -200 to 500.
        reference_k: K, 250 to 330.
        cas: registry number, blank where unknown.
    """

    name: str
    molar_mass_g_mol: float
    liquid_density_g_cm3: float
    affinity: float
    vapour_pressure_kpa: float
    boiling_point_c: float
    reference_k: float = ROOM_K
    cas: str = ""

    def __post_init__(self) -> None:
        require("molar_mass_g_mol", self.molar_mass_g_mol, at_least=2.0, at_most=1000.0)
        require("liquid_density_g_cm3", self.liquid_density_g_cm3, at_least=0.3, at_most=5.0)
        require("affinity", self.affinity, above=0.0, at_most=5.0)
        require("vapour_pressure_kpa", self.vapour_pressure_kpa, above=0.0, at_most=1000.0)
        require("boiling_point_c", self.boiling_point_c, at_least=-200.0, at_most=500.0)
        require("reference_k", self.reference_k, at_least=250.0, at_most=330.0)


@dataclass(frozen=True)
class Carbon:
    """A respirator carbon.

    Attributes:
        micropore_cm3_g: micropore volume W_0, cm3/g, 0.1 to 1.5.
        energy_kj_mol: characteristic energy E_0 for benzene, kJ/mol, 5 to 40.
        bed_density_g_cm3: packed density, g/cm3, 0.1 to 1.
        granule_cm: granule diameter, cm, 0.01 to 1.
        is_assumed: True for a default that no maker has stated.
    """

    micropore_cm3_g: ArrayLike
    energy_kj_mol: ArrayLike
    bed_density_g_cm3: ArrayLike
    granule_cm: ArrayLike
    is_assumed: bool = False

    def __post_init__(self) -> None:
        require("micropore_cm3_g", self.micropore_cm3_g, at_least=0.1, at_most=1.5)
        require("energy_kj_mol", self.energy_kj_mol, at_least=5.0, at_most=40.0)
        require("bed_density_g_cm3", self.bed_density_g_cm3, at_least=0.1, at_most=1.0)
        require("granule_cm", self.granule_cm, at_least=0.01, at_most=1.0)


# Assumed, from the usual ranges: W_0 0.40-0.60, E_0 15-20, density 0.40-0.50, granule 0.08-0.15 cm
# (memory). A maker's figures replace it.
GENERIC_CARBON: Final = Carbon(
    micropore_cm3_g=0.45,
    energy_kj_mol=18.0,
    bed_density_g_cm3=0.44,
    granule_cm=0.11,
    is_assumed=True,
)


@dataclass(frozen=True)
class Bed:
    """All the carbon that the flow passes in parallel: both cartridges of a pair together.

    Attributes:
        carbon: what it is made of.
        mass_g: carbon, g, above 0 to 1e5.
        area_cm2: cross section, cm2, above 0 to 1e5.
    """

    carbon: Carbon
    mass_g: ArrayLike
    area_cm2: ArrayLike

    def __post_init__(self) -> None:
        require("mass_g", self.mass_g, above=0.0, at_most=1e5)
        require("area_cm2", self.area_cm2, above=0.0, at_most=1e5)


@dataclass(frozen=True)
class Conditions:
    """What the cartridge meets. All fields broadcast with the concentrations.

    Temperature and humidity have no default: warm or humid air shortens a life, so that leaving
    them out would err to the long side.

    Attributes:
        flow_l_min: mean flow, L/min, above 0: the minute volume when a person breathes, the
            blower's flow in a powered device.
        temperature_k: K, 250 to 330.
        relative_humidity: share of saturation, 0 to 0.95; there is no estimate beyond.
        pressure_pa: of the air, Pa, 3e4 to 1.2e5.
        velocity_ratio: flow that the bed must stop over mean flow, 1 or more. Breathing is pulsed:
            pass `breathing.FLOW_WEIGHTED_RATIO`, which shortens the life a little.
    """

    flow_l_min: ArrayLike
    temperature_k: ArrayLike
    relative_humidity: ArrayLike
    pressure_pa: ArrayLike = ATMOSPHERE_PA
    velocity_ratio: ArrayLike = 1.0

    def __post_init__(self) -> None:
        require("flow_l_min", self.flow_l_min, above=0.0)
        require("temperature_k", self.temperature_k, at_least=250.0, at_most=330.0)
        require("relative_humidity", self.relative_humidity, at_least=0.0, at_most=HIGHEST_HUMIDITY)
        require("pressure_pa", self.pressure_pa, at_least=3e4, at_most=1.2e5)
        require("velocity_ratio", self.velocity_ratio, at_least=1.0)


class Caution(NamedTuple):
    """Something that a life in minutes does not say."""

    code: str
    says: str


def cautions(vapour: Vapour) -> tuple[Caution, ...]:
    """What speaks against trusting a computed life for this vapour; empty if nothing is known to.

    Source: measured lives in Nelson & Correia (1976) Am Ind Hyg Assoc J 37:514-525 (verified as
        restated) for small polar molecules; single use to 65 C after the AX type definition
        (verified); substances that carbon does not hold are common practice.
    """
    found = []
    if vapour.cas in NOT_FOR_CARBON:
        found.append(Caution("not-for-carbon", NOT_FOR_CARBON[vapour.cas]))
    if not vapour.affinity >= SMALL_POLAR_AFFINITY:
        found.append(
            Caution(
                "small-polar",
                f"{vapour.name} is held far less than computed; only measured lives count",
            )
        )
    if not vapour.boiling_point_c > SINGLE_USE_BOILING_C:
        found.append(
            Caution(
                "single-use",
                f"{vapour.name} boils at {SINGLE_USE_BOILING_C:g} C or below and moves in a "
                "resting bed: "
                "one shift at most, never used again",
            )
        )
    return tuple(found)


def polarisability_cm3_mol(
    refractive_index: ArrayLike, *, molar_mass_g_mol: ArrayLike, density_g_cm3: ArrayLike
) -> Floats:
    """Molar polarisability by Lorentz-Lorenz, cm3/mol.

    Args:
        refractive_index: of the liquid at the sodium line, above 1 to 3.
        molar_mass_g_mol: g/mol, above 0.
        density_g_cm3: of the liquid, g/cm3, above 0.
    """
    n2 = require("refractive_index", refractive_index, above=1.0, at_most=3.0) ** 2
    mass = require("molar_mass_g_mol", molar_mass_g_mol, above=0.0)
    return plain(
        (n2 - 1.0) / (n2 + 2.0) * mass / require("density_g_cm3", density_g_cm3, above=0.0)
    )


def affinity(polarisability: ArrayLike) -> Floats:
    """Affinity coefficient (benzene = 1) from molar polarisability.

    Args:
        polarisability: cm3/mol, above 0.

    Source: Wood (2001) Carbon 39:343-356 (memory).
    """
    return plain(0.0862 * require("polarisability", polarisability, above=0.0) ** 0.75)


def affinity_from_molar_volume(volume_cm3_mol: ArrayLike) -> Floats:
    """Affinity coefficient from the molar volume of the liquid, where no refractive index is known.

    Args:
        volume_cm3_mol: molar mass over liquid density, cm3/mol, above 0.

    Source: Wood (2001) Carbon 39:343-356 (memory).
    """
    return plain(0.0176 * require("volume_cm3_mol", volume_cm3_mol, above=0.0) ** 0.90)


def affinity_from_parachor(parachor: ArrayLike) -> Floats:
    """Affinity coefficient from the parachor.

    Args:
        parachor: (cm3/mol)(mN/m)^(1/4), above 0.

    Source: Wood (2001) Carbon 39:343-356 (memory).
    """
    return plain(0.00827 * require("parachor", parachor, above=0.0) ** 0.90)


def saturation_pressure_pa(vapour: Vapour, temperature_k: ArrayLike) -> Floats:
    """Saturation pressure at a temperature, Pa.

    Two known points, the stated pressure and the boiling point, joined by a straight line of ln p
    against 1/T. A vapour stated at its own boiling point keeps Trouton's slope (88 J/(mol K)).

    Args:
        vapour: the vapour.
        temperature_k: K, 250 to 330.

    Source: Clausius-Clapeyron; Trouton's rule (common practice).
    """
    temperature = require("temperature_k", temperature_k, at_least=250.0, at_most=330.0)
    boiling_k = vapour.boiling_point_c + CELSIUS_ZERO_K
    stated_pa = vapour.vapour_pressure_kpa * 1000.0
    inverse_gap = 1.0 / vapour.reference_k - 1.0 / boiling_k
    slope = 88.0 * boiling_k / GAS_CONSTANT_J_MOL_K
    if abs(inverse_gap) > 1e-5:  # noqa: PLR2004 - about 1 K apart
        slope = np.log(ATMOSPHERE_PA / stated_pa) / inverse_gap
    return plain(stated_pa * np.exp(slope * (1.0 / vapour.reference_k - 1.0 / temperature)))


def humidity_factor(relative_humidity: ArrayLike) -> Floats:
    """Share of the capacity that humid air leaves to a vapour.

    1 to 50 %, falling in a straight line through one half at 85 %; no estimate above 95 %.

    Args:
        relative_humidity: share of saturation, 0 to 0.95.

    Source: agency rule of thumb (memory); published toluene data show no effect below 50 % and a
        clear loss at 75 % (verified).
    """
    humidity = require(
        "relative_humidity", relative_humidity, at_least=0.0, at_most=HIGHEST_HUMIDITY
    )
    return plain(1.0 - 0.5 * np.maximum(humidity - DRY_UP_TO, 0.0) / (HALF_AT - DRY_UP_TO))


def capacity_g_g(
    vapour: Vapour,
    carbon: Carbon,
    *,
    conc_ppm: ArrayLike,
    temperature_k: ArrayLike = ROOM_K,
    pressure_pa: ArrayLike = ATMOSPHERE_PA,
) -> Floats:
    """Equilibrium capacity of dry carbon for a vapour, g per g (Dubinin-Radushkevich).

    Args:
        vapour: the vapour.
        carbon: the carbon; its fields broadcast.
        conc_ppm: parts per million by volume, above 0 to 1e6.
        temperature_k: K, 250 to 330.
        pressure_pa: of the air, Pa, 3e4 to 1.2e5.

    Raises:
        ValueError: the vapour would be at or beyond saturation.

    Source: Dubinin-Radushkevich with affinity coefficients after Wood (2001) Carbon 39:343-356
        (memory).
    """
    saturation = refuse_saturated(
        vapour, conc_ppm, temperature_k=temperature_k, pressure_pa=pressure_pa
    )
    return plain(filled_pores_g_g(vapour, carbon, saturation, temperature_k=temperature_k))


def refuse_saturated(
    vapour: Vapour, conc_ppm: ArrayLike, *, temperature_k: ArrayLike, pressure_pa: ArrayLike
) -> Floats:
    """Share of saturation, 0 to 1.

    Args:
        vapour: the vapour.
        conc_ppm: parts per million by volume, above 0 to 1e6.
        temperature_k: K, 250 to 330.
        pressure_pa: of the air, Pa, 3e4 to 1.2e5.

    Raises:
        ValueError: air cannot hold that much of the vapour.
    """
    conc = require("conc_ppm", conc_ppm, above=0.0, at_most=1e6)
    pressure = require("pressure_pa", pressure_pa, at_least=3e4, at_most=1.2e5)
    saturated_pa = saturation_pressure_pa(vapour, temperature_k)
    saturation = conc * 1e-6 * pressure / saturated_pa
    if not np.all(saturation < 1.0):
        most = float(np.min(saturated_pa / pressure)) * 1e6
        raise ValueError(
            f"conc_ppm: {np.max(conc):.12g} is not allowed; {vapour.name} must be less than its "
            f"saturation at {most:.6g} ppm"
        )
    return saturation


def filled_pores_g_g(
    vapour: Vapour, carbon: Carbon, saturation: Floats, *, temperature_k: ArrayLike
) -> Floats:
    """Capacity at a share of saturation, g per g; the caller has checked the arguments."""
    kelvin = np.asarray(temperature_k, dtype=np.float64)
    potential_kj_mol = -GAS_CONSTANT_J_MOL_K * 1e-3 * kelvin * np.log(saturation)
    energy = vapour.affinity * np.asarray(carbon.energy_kj_mol)
    filled_cm3_g = np.asarray(carbon.micropore_cm3_g) * np.exp(-((potential_kj_mol / energy) ** 2))
    return np.asarray(filled_cm3_g * vapour.liquid_density_g_cm3)


def rate_coefficient_per_min(
    vapour: Vapour, carbon: Carbon, *, capacity: ArrayLike, velocity_cm_s: ArrayLike
) -> Floats:
    """Overall rate coefficient of adsorption, 1/min; 4000 to 9000 is typical.

    Args:
        vapour: the vapour.
        carbon: the carbon.
        capacity: g vapour per g carbon, above 0.
        velocity_cm_s: superficial velocity, cm/s, above 0.

    Source: Lodewyckx & Wood (2003) Am Ind Hyg Assoc J 64:646-650 (memory).
    """
    held = require("capacity", capacity, above=0.0)
    velocity = require("velocity_cm_s", velocity_cm_s, above=0.0)
    granule = np.asarray(carbon.granule_cm, dtype=np.float64)
    transfer = velocity**0.75 * granule**-1.5 * np.sqrt(held / vapour.molar_mass_g_mol)
    return plain(800.0 * vapour.affinity**0.33 * transfer)
