"""Particles: slip, diffusion, settling, aerodynamic diameter, size fractions and charge.

Filters see the physical diameter; the aerodynamic one governs only impaction and settling.

>>> from filtration.air import HANDBOOK_AIR
>>> round(float(slip_correction(0.1e-6, mean_free_path_m=66e-9, law="hinds1999")), 3)
2.928
>>> f"{float(settling_velocity_m_s(1e-6, density_kg_m3=1000.0, air=HANDBOOK_AIR)):.2e}"
'3.48e-05'
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtr, ndtri

from filtration.air import Air
from filtration.require import Floats, plain, require

BOLTZMANN_J_K: Final = 1.380649e-23
GRAVITY_M_S2: Final = 9.81
ELEMENTARY_CHARGE_C: Final = 1.602176634e-19
VACUUM_PERMITTIVITY_F_M: Final = 8.8541878128e-12
UNIT_DENSITY_KG_M3: Final = 1000.0
MOST_CHARGES: Final = 60

# Law: A, B, C of 1 + Kn (A + B exp(-C/Kn)), Kn = 2 l/d.
# Davies (1945) Proc Phys Soc 57:259 (verified); Allen & Raabe (1985) Aerosol Sci Technol 4:269-286
# (verified in use); Kim et al. (2005) J Res NIST 110:31-54 and ISO 15900; Hinds (1999) eq 3.20.
SLIP_LAWS: Final = {
    "davies1945": (1.257, 0.400, 1.10),
    "allen_raabe1985": (1.142, 0.558, 0.999),
    "kim2005": (1.165, 0.483, 0.997),
    "hinds1999": (1.17, 0.525, 0.78),
}

# Power of the diameter that a weighting counts.
WEIGHTINGS: Final = {"number": 0, "length": 1, "surface": 2, "mass": 3}

# Median (um) and GSD of the cumulative part of ISO 7708:1995.
THORACIC: Final = (11.64, 1.5)
RESPIRABLE: Final = (4.25, 1.5)
LARGEST_DEFINED_UM: Final = 100.0
FRACTIONS: Final = ("inhalable", "thoracic", "respirable")


@dataclass(frozen=True)
class Material:
    """What the particles are made of and what charge they carry. Fields broadcast.

    Attributes:
        density_kg_m3: kg/m3, above 0.
        permittivity: relative, above 1.
        charges: elementary charges on each particle, 0 or more; the sign does not matter.
    """

    density_kg_m3: ArrayLike = UNIT_DENSITY_KG_M3
    permittivity: ArrayLike = 5.9
    charges: ArrayLike = 0.0

    def __post_init__(self) -> None:
        require("density_kg_m3", self.density_kg_m3, above=0.0)
        require("permittivity", self.permittivity, above=1.0)
        require("charges", self.charges, at_least=0.0)


# Certification aerosols, neutralised: permittivities 5.9 and 5.1 from memory.
SALT: Final = Material(density_kg_m3=2165.0, permittivity=5.9)
OIL: Final = Material(density_kg_m3=985.0, permittivity=5.1)


def slip_correction(
    diameter_m: ArrayLike, *, mean_free_path_m: ArrayLike, law: str = "kim2005"
) -> Floats:
    """Cunningham factor: how much less a small particle is held by the air, 1 or more.

    Args:
        diameter_m: m, above 0.
        mean_free_path_m: m, above 0; use the one that the law was fitted with.
        law: one of `SLIP_LAWS`.

    Valid: Kn 0.01 to 100; the four laws agree within 3.5 % above 20 nm.
    Source: see `SLIP_LAWS`.
    """
    d = require("diameter_m", diameter_m, above=0.0)
    path = require("mean_free_path_m", mean_free_path_m, above=0.0)
    if law not in SLIP_LAWS:
        raise ValueError(f"law: {law!r} is not allowed; it must be one of {', '.join(SLIP_LAWS)}")
    a, b, c = SLIP_LAWS[law]
    kn = 2.0 * path / d
    return plain(1.0 + kn * (a + b * np.exp(-c / kn)))


def slip_in(diameter_m: ArrayLike, air: Air) -> Floats:
    """Cunningham factor in that air, 1 or more. `diameter_m`: m, above 0."""
    return slip_correction(diameter_m, mean_free_path_m=air.mean_free_path_m, law=air.slip_law)


def diffusivity_m2_s(diameter_m: ArrayLike, *, air: Air) -> Floats:
    """Diffusion coefficient of a particle, m2/s.

    Args:
        diameter_m: physical (mobility) diameter, m, above 0.
        air: the air.

    Source: Stokes-Einstein; Hinds (1999) eq 7.7.
    """
    d = require("diameter_m", diameter_m, above=0.0)
    drag = 3.0 * math.pi * np.asarray(air.viscosity_pa_s) * d
    return plain(BOLTZMANN_J_K * np.asarray(air.temperature_k) * slip_in(d, air) / drag)


def relaxation_time_s(diameter_m: ArrayLike, *, density_kg_m3: ArrayLike, air: Air) -> Floats:
    """Time in which a particle follows a change of the air's velocity, s.

    Args:
        diameter_m: physical diameter, m, above 0.
        density_kg_m3: kg/m3, above 0.
        air: the air.

    Source: Stokes's law; Hinds (1999) eq 5.3.
    """
    d = require("diameter_m", diameter_m, above=0.0)
    density = require("density_kg_m3", density_kg_m3, above=0.0)
    return plain(density * d**2 * slip_in(d, air) / (18.0 * np.asarray(air.viscosity_pa_s)))


def settling_velocity_m_s(
    diameter_m: ArrayLike, *, density_kg_m3: ArrayLike, air: Air, shape: ArrayLike = 1.0
) -> Floats:
    """Terminal settling velocity, m/s, with the drag of fast particles.

    Args:
        diameter_m: equivalent volume diameter, m, above 0.
        density_kg_m3: kg/m3, above 0.
        air: the air.
        shape: dynamic shape factor, 1 or more.

    Valid: particle Reynolds number below 1000.
    Source: Stokes's law (Hinds 1999, eq 3.21) with the drag of Schiller & Naumann (memory).
    """
    kappa = require("shape", shape, at_least=1.0)
    tau = relaxation_time_s(diameter_m, density_kg_m3=density_kg_m3, air=air)
    stokes = tau * GRAVITY_M_S2 / kappa
    d = require("diameter_m", diameter_m, above=0.0)
    per_velocity = np.asarray(air.density_kg_m3) * d / np.asarray(air.viscosity_pa_s)
    target = per_velocity * stokes
    reynolds = np.asarray(target)
    for _ in range(30):
        excess = reynolds + 0.15 * reynolds**1.687 - target
        reynolds = reynolds - excess / (1.0 + 0.15 * 1.687 * reynolds**0.687)
    require("particle Reynolds number", reynolds, at_most=1000.0)
    return plain(reynolds / per_velocity)


def aerodynamic_diameter_m(
    diameter_m: ArrayLike, *, density_kg_m3: ArrayLike, air: Air, shape: ArrayLike = 1.0
) -> Floats:
    """Diameter of the unit-density sphere that settles as fast, m.

    Args:
        diameter_m: equivalent volume diameter, m, above 0.
        density_kg_m3: kg/m3, above 0.
        air: the air.
        shape: dynamic shape factor, 1 or more.

    Source: Hinds (1999) eq 3.26 to 3.28, solved with slip.
    """
    d = require("diameter_m", diameter_m, above=0.0)
    density = require("density_kg_m3", density_kg_m3, above=0.0)
    kappa = require("shape", shape, at_least=1.0)
    target = d**2 * slip_in(d, air) * density / (UNIT_DENSITY_KG_M3 * kappa)
    # Each pass at least halves the error in the logarithm.
    found = np.sqrt(target)
    for _ in range(60):
        found = np.sqrt(target / slip_in(found, air))
    return plain(found)


def size_fraction(aerodynamic_um: ArrayLike, kind: str) -> Floats:
    """Share of airborne particles that a sampling convention takes, 0 to 1.

    Args:
        aerodynamic_um: aerodynamic diameter, um, 0 to 100; undefined beyond.
        kind: "inhalable", "thoracic" or "respirable".

    Source: ISO 7708:1995 and EN 481:1993; formula in Soderholm (1989) Ann Occup Hyg 33:301-320
        (verified).
    """
    d = require("aerodynamic_um", aerodynamic_um, at_least=0.0, at_most=LARGEST_DEFINED_UM)
    if kind not in FRACTIONS:
        raise ValueError(f"kind: {kind!r} is not allowed; it must be one of {', '.join(FRACTIONS)}")
    inhalable = 0.5 * (1.0 + np.exp(-0.06 * d))
    if kind == "inhalable":
        return plain(inhalable)
    median_um, gsd = THORACIC if kind == "thoracic" else RESPIRABLE
    # The smallest size stands for 0, whose logarithm does not exist.
    logs = np.log(np.maximum(d, 1e-12) / median_um) / math.log(gsd)
    return plain(inhalable * ndtr(-logs))


@dataclass(frozen=True)
class Lognormal:
    """A lognormal size distribution by number. Fields broadcast.

    Attributes:
        cmd_m: count median diameter, m, above 0.
        gsd: geometric standard deviation, 1 to 10, the same for every weighting.

    Source: Hatch & Choate (1929); Hinds (1999) eq 4.48 on.
    """

    cmd_m: ArrayLike
    gsd: ArrayLike

    def __post_init__(self) -> None:
        require("cmd_m", self.cmd_m, above=0.0)
        require("gsd", self.gsd, at_least=1.0, at_most=10.0)

    @classmethod
    def from_mass_median(cls, mmd_m: ArrayLike, *, gsd: ArrayLike) -> Lognormal:
        """The distribution with that median by mass (m, above 0)."""
        mass_median = require("mmd_m", mmd_m, above=0.0)
        spread = require("gsd", gsd, at_least=1.0, at_most=10.0)
        return cls(cmd_m=plain(mass_median * np.exp(-3.0 * np.log(spread) ** 2)), gsd=spread)

    @property
    def log_sd(self) -> Floats:
        """ln GSD."""
        return np.log(np.asarray(self.gsd, dtype=np.float64))

    def median_m(self, by: str = "mass") -> Floats:
        """Median diameter of a weighting ("number", "length", "surface", "mass"), m."""
        return plain(np.asarray(self.cmd_m) * np.exp(_power(by) * self.log_sd**2))

    def average_diameter_m(self, moment: float) -> Floats:
        """Diameter of the particle of average d^moment, m: 1 count mean, 3 average mass."""
        power = float(require("moment", moment))
        return plain(np.asarray(self.cmd_m) * np.exp(0.5 * power * self.log_sd**2))

    def sauter_m(self) -> Floats:
        """Diameter with the volume to surface ratio of the whole, m."""
        return plain(np.asarray(self.cmd_m) * np.exp(2.5 * self.log_sd**2))

    def mode_m(self) -> Floats:
        """Most frequent diameter by number, m."""
        return plain(np.asarray(self.cmd_m) * np.exp(-(self.log_sd**2)))

    def quantile_m(self, share: ArrayLike, *, by: str = "number") -> Floats:
        """Diameter below which that share lies, m. `share`: above 0 to less than 1."""
        p = require("share", share, above=0.0, below=1.0)
        return plain(self.median_m(by) * np.exp(self.log_sd * ndtri(p)))

    def share_below(self, diameter_m: ArrayLike, *, by: str = "number") -> Floats:
        """Share below a diameter, 0 to 1. `diameter_m`: m, above 0; the GSD must be above 1."""
        d = require("diameter_m", diameter_m, above=0.0)
        require("gsd", self.gsd, above=1.0)
        return plain(ndtr(np.log(d / self.median_m(by)) / self.log_sd))

    def nodes(self, by: str = "mass", *, count: int = 41) -> tuple[Floats, Floats]:
        """Diameters (m, a trailing axis of `count`) and weights (sum 1) for a weighted average.

        Args:
            by: the weighting.
            count: Gauss-Hermite points, 3 or more; 41 gives 1e-7 at GSD 1.86, take more above 3.

        Source: Gauss-Hermite quadrature in ln d about the weighting's own median.
        """
        if count < 3:  # noqa: PLR2004 - fewer cannot carry a spread
            raise ValueError(f"count: {count} is not allowed; it must be 3 or more")
        points, weights = np.polynomial.hermite_e.hermegauss(count)
        steps = self.log_sd[..., np.newaxis] * points
        centre = np.asarray(self.median_m(by), dtype=np.float64)[..., np.newaxis]
        return centre * np.exp(steps), weights / np.sum(weights)


def _power(by: str) -> int:
    if by not in WEIGHTINGS:
        raise ValueError(f"by: {by!r} is not allowed; it must be one of {', '.join(WEIGHTINGS)}")
    return WEIGHTINGS[by]


# Certification challenges by number: salt 0.075 um, GSD up to 1.86 (Rengasamy et al. 2017, Table 1,
# verified); oil 0.185 um, GSD up to 1.60 (memory).
SALT_SIZES: Final = Lognormal(cmd_m=0.075e-6, gsd=1.86)
OIL_SIZES: Final = Lognormal(cmd_m=0.185e-6, gsd=1.60)


def charge_shares(
    diameter_m: ArrayLike, *, temperature_k: ArrayLike = 293.15
) -> tuple[NDArray[np.int64], Floats]:
    """Boltzmann equilibrium of charge: numbers -60 to 60 and the share of particles with each.

    Fresh industrial dust can carry far more; certification neutralises because that is the hard
    case for an electret.

    Args:
        diameter_m: m, above 0 to 100e-6.
        temperature_k: K, 170 to 1900.

    Returns:
        The numbers (121), and the shares with that trailing axis (sum 1).

    Source: Boltzmann's law; Hinds (1999) eq 15.30 (memory).
    """
    d = require("diameter_m", diameter_m, above=0.0, at_most=100e-6)
    temperature = require("temperature_k", temperature_k, at_least=170.0, at_most=1900.0)
    numbers = np.arange(-MOST_CHARGES, MOST_CHARGES + 1)
    coulomb = ELEMENTARY_CHARGE_C**2 / (4.0 * math.pi * VACUUM_PERMITTIVITY_F_M)
    steepness = np.asarray(coulomb / (d * BOLTZMANN_J_K * temperature))
    relative = np.exp(-steepness[..., np.newaxis] * numbers**2)
    return numbers, relative / np.sum(relative, axis=-1, keepdims=True)
