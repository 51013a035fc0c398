"""Air: viscosity, density and mean free path, and the slip law that belongs to them.

>>> room = Air.at(293.15)
>>> f"{float(room.viscosity_pa_s):.4e}", f"{float(room.mean_free_path_m) * 1e9:.1f} nm"
('1.8181e-05', '66.4 nm')
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from filtration.require import Floats, plain, require

ATMOSPHERE_PA: Final = 101_325.0
GAS_CONSTANT_J_MOL_K: Final = 8.314462618
DRY_AIR_KG_MOL: Final = 0.0289647
WATER_KG_MOL: Final = 0.0180153
SUTHERLAND_K: Final = 110.4

# Law: (viscosity Pa s, at K). White, Viscous Fluid Flow (memory); ISO 15900 and Kim et al. (2005)
# J Res NIST 110:31-54 (memory). The two differ by 0.26 %.
VISCOSITY_LAWS: Final = {"white": (1.716e-5, 273.15), "iso15900": (1.83245e-5, 296.15)}

# ISO 15900: 67.3 nm at 296.15 K and one atmosphere (memory); the form is Willeke's (1976).
FREE_PATH_M: Final = 67.3e-9
FREE_PATH_AT_K: Final = 296.15

COLDEST_K: Final = 170.0
HOTTEST_K: Final = 1900.0


def viscosity_pa_s(temperature_k: ArrayLike, *, law: str = "iso15900") -> Floats:
    """Dynamic viscosity of air by Sutherland's formula, Pa s. It does not change with pressure.

    Args:
        temperature_k: K, 170 to 1900.
        law: "iso15900" or "white".

    Source: see `VISCOSITY_LAWS`.
    """
    temperature = require("temperature_k", temperature_k, at_least=COLDEST_K, at_most=HOTTEST_K)
    if law not in VISCOSITY_LAWS:
        known = ", ".join(VISCOSITY_LAWS)
        raise ValueError(f"law: {law!r} is not allowed; it must be one of {known}")
    at_reference, reference_k = VISCOSITY_LAWS[law]
    growth = (reference_k + SUTHERLAND_K) / (temperature + SUTHERLAND_K)
    return plain(at_reference * (temperature / reference_k) ** 1.5 * growth)


def saturation_water_pa(temperature_k: ArrayLike) -> Floats:
    """Saturation pressure of water vapour, Pa.

    Args:
        temperature_k: K, 250 to 330.

    Source: Magnus form with Buck's constants (1981) J Appl Meteorol 20:1527-1532 (memory).
    """
    celsius = require("temperature_k", temperature_k, at_least=250.0, at_most=330.0) - 273.15
    return plain(611.21 * np.exp(17.502 * celsius / (240.97 + celsius)))


def density_kg_m3(
    temperature_k: ArrayLike,
    *,
    pressure_pa: ArrayLike = ATMOSPHERE_PA,
    relative_humidity: ArrayLike = 0.0,
) -> Floats:
    """Density of dry or humid air, kg/m3; saturated air at 30 C is about 1.6 % lighter than dry.

    Args:
        temperature_k: K, 250 to 330.
        pressure_pa: Pa, 3e4 to 1.2e5.
        relative_humidity: share of saturation, 0 to 1.

    Source: ideal gas, exact.
    """
    temperature = require("temperature_k", temperature_k, at_least=250.0, at_most=330.0)
    pressure = require("pressure_pa", pressure_pa, at_least=3e4, at_most=1.2e5)
    humidity = require("relative_humidity", relative_humidity, at_least=0.0, at_most=1.0)
    water_pa = humidity * saturation_water_pa(temperature)
    kg_per_mol = (pressure - water_pa) * DRY_AIR_KG_MOL + water_pa * WATER_KG_MOL
    return plain(kg_per_mol / (GAS_CONSTANT_J_MOL_K * temperature))


def mean_free_path_m(temperature_k: ArrayLike, *, pressure_pa: ArrayLike = ATMOSPHERE_PA) -> Floats:
    """Mean free path of air, m; it rises as 1/pressure.

    Keep it with the slip constants that were fitted to it (Kim et al. 2005).

    Args:
        temperature_k: K, 170 to 1900.
        pressure_pa: Pa, above 0.

    Source: Willeke (1976) J Aerosol Sci 7:381-387; constants of ISO 15900 (memory).
    """
    temperature = require("temperature_k", temperature_k, at_least=COLDEST_K, at_most=HOTTEST_K)
    pressure = require("pressure_pa", pressure_pa, above=0.0)
    warmth = (temperature / FREE_PATH_AT_K) * (
        (1.0 + SUTHERLAND_K / FREE_PATH_AT_K) / (1.0 + SUTHERLAND_K / temperature)
    )
    return plain(FREE_PATH_M * warmth * ATMOSPHERE_PA / pressure)


def kinetic_mean_free_path_m(
    temperature_k: ArrayLike, *, viscosity_pa_s: ArrayLike, pressure_pa: ArrayLike = ATMOSPHERE_PA
) -> Floats:
    """Mean free path from kinetic theory, m; about 2 % shorter than `mean_free_path_m`.

    Args:
        temperature_k: K, 170 to 1900.
        viscosity_pa_s: Pa s, above 0.
        pressure_pa: Pa, above 0.

    Source: Seinfeld & Pandis (2006) eq 9.6 (verified as restated).
    """
    temperature = require("temperature_k", temperature_k, at_least=COLDEST_K, at_most=HOTTEST_K)
    viscosity = require("viscosity_pa_s", viscosity_pa_s, above=0.0)
    pressure = require("pressure_pa", pressure_pa, above=0.0)
    speed = np.sqrt(8.0 * DRY_AIR_KG_MOL / (math.pi * GAS_CONSTANT_J_MOL_K * temperature))
    return plain(2.0 * viscosity / (pressure * speed))


@dataclass(frozen=True)
class Air:
    """Air as particles and fibres meet it. Fields broadcast.

    Attributes:
        temperature_k: K, 170 to 1900.
        viscosity_pa_s: Pa s, above 0.
        density_kg_m3: kg/m3, above 0.
        mean_free_path_m: m, above 0.
        slip_law: name of the slip constants that go with the mean free path.
    """

    temperature_k: ArrayLike
    viscosity_pa_s: ArrayLike
    density_kg_m3: ArrayLike
    mean_free_path_m: ArrayLike
    slip_law: str = "kim2005"

    def __post_init__(self) -> None:
        require("temperature_k", self.temperature_k, at_least=COLDEST_K, at_most=HOTTEST_K)
        for name in ("viscosity_pa_s", "density_kg_m3", "mean_free_path_m"):
            require(name, getattr(self, name), above=0.0)

    @classmethod
    def at(
        cls,
        temperature_k: ArrayLike,
        *,
        pressure_pa: ArrayLike = ATMOSPHERE_PA,
        relative_humidity: ArrayLike = 0.0,
    ) -> Air:
        """Air at a temperature, pressure and humidity, by ISO 15900.

        Args:
            temperature_k: K, 250 to 330.
            pressure_pa: Pa, 3e4 to 1.2e5.
            relative_humidity: share of saturation, 0 to 1; only the density heeds it.
        """
        return cls(
            temperature_k=temperature_k,
            viscosity_pa_s=viscosity_pa_s(temperature_k),
            density_kg_m3=density_kg_m3(
                temperature_k, pressure_pa=pressure_pa, relative_humidity=relative_humidity
            ),
            mean_free_path_m=mean_free_path_m(temperature_k, pressure_pa=pressure_pa),
        )


ROOM_AIR: Final = Air.at(293.15)

# 20 C and one atmosphere as aerosol handbooks print it (verified), with the slip constants of Hinds
# (1999) eq 3.20. Only to reproduce handbook figures.
HANDBOOK_AIR: Final = Air(
    temperature_k=293.15,
    viscosity_pa_s=1.81e-5,
    density_kg_m3=1.20,
    mean_free_path_m=66e-9,
    slip_law="hinds1999",
)
