"""Single fibre: how much of the air before a fibre is swept clean, mechanism by mechanism.

Two families of formulas exist and must not be mixed, because each fit already holds what the other
adds. All use the face velocity and keep (1 - solidity) where Lee & Liu and Brown have it.

>>> from filtration.air import HANDBOOK_AIR
>>> web = Layer(solidity=0.05, thickness_m=1e-3, fibre_m=2e-6)
>>> water = Material(density_kg_m3=1000.0)
>>> meeting = Meeting(web, 0.3e-6, face_velocity_m_s=0.10, air=HANDBOOK_AIR, material=water)
>>> round(float(efficiency(meeting, family="hinds")), 4)
0.0538
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Final, TypeAlias

import numpy as np
from numpy.typing import ArrayLike

from filtration.air import ROOM_AIR, Air
from filtration.particles import (
    ELEMENTARY_CHARGE_C,
    GRAVITY_M_S2,
    SALT,
    VACUUM_PERMITTIVITY_F_M,
    Material,
    diffusivity_m2_s,
    relaxation_time_s,
    slip_in,
)
from filtration.require import Floats, plain, require

LOWEST_SOLIDITY: Final = 0.001
HIGHEST_SOLIDITY: Final = 0.3

# First-order slip at the fibre's surface.
FIBRE_SLIP: Final = 1.996

# Up to this ratio of particle to fibre the impaction integral is a polynomial.
SMALL_PARTICLE_RATIO: Final = 0.4


@dataclass(frozen=True)
class Layer:
    """One layer of fibrous medium. Fields broadcast.

    Attributes:
        solidity: volume share of fibre, 0.001 to 0.3.
        thickness_m: m, above 0.
        fibre_m: effective fibre diameter, m, above 0; see `media.effective_fibre_m`.
        line_charge_c_m: charge per fibre length, C/m, 0 or more; a fitting constant, not a
            measurable net charge.
    """

    solidity: ArrayLike
    thickness_m: ArrayLike
    fibre_m: ArrayLike
    line_charge_c_m: ArrayLike = 0.0

    def __post_init__(self) -> None:
        require("solidity", self.solidity, at_least=LOWEST_SOLIDITY, at_most=HIGHEST_SOLIDITY)
        require("thickness_m", self.thickness_m, above=0.0)
        require("fibre_m", self.fibre_m, above=0.0)
        require("line_charge_c_m", self.line_charge_c_m, at_least=0.0)


def kuwabara_factor(solidity: ArrayLike) -> Floats:
    """Hydrodynamic factor of a bed of parallel fibres across the flow.

    Args:
        solidity: volume share of fibre, 0.001 to 0.3.

    Source: Kuwabara (1959) J Phys Soc Jpn 14:527-532 (form verified in Lee & Liu 1982).
    """
    alpha = require("solidity", solidity, at_least=LOWEST_SOLIDITY, at_most=HIGHEST_SOLIDITY)
    return plain(-0.5 * np.log(alpha) - 0.75 + alpha - 0.25 * alpha**2)


@dataclass(frozen=True)
class Meeting:
    """A particle in front of a fibre: everything broadcasts with everything.

    Attributes:
        layer: the medium.
        diameter_m: physical diameter of the particle, m, above 0.
        face_velocity_m_s: flow over area, m/s, above 0.
        air: the air.
        material: of the particle.
    """

    layer: Layer
    diameter_m: ArrayLike
    face_velocity_m_s: ArrayLike
    air: Air = ROOM_AIR
    material: Material = SALT

    def __post_init__(self) -> None:
        require("diameter_m", self.diameter_m, above=0.0)
        require("face_velocity_m_s", self.face_velocity_m_s, above=0.0)

    @cached_property
    def d(self) -> Floats:
        """Particle diameter, m."""
        return np.asarray(self.diameter_m, dtype=np.float64)

    @cached_property
    def df(self) -> Floats:
        """Fibre diameter, m."""
        return np.asarray(self.layer.fibre_m, dtype=np.float64)

    @cached_property
    def u0(self) -> Floats:
        """Face velocity, m/s."""
        return np.asarray(self.face_velocity_m_s, dtype=np.float64)

    @cached_property
    def alpha(self) -> Floats:
        """Solidity."""
        return np.asarray(self.layer.solidity, dtype=np.float64)

    @cached_property
    def ku(self) -> Floats:
        """Kuwabara factor."""
        return kuwabara_factor(self.alpha)

    @cached_property
    def b(self) -> Floats:
        """(1 - solidity) / Kuwabara factor."""
        return (1.0 - self.alpha) / self.ku

    @cached_property
    def r(self) -> Floats:
        """Particle over fibre diameter."""
        return self.d / self.df

    @cached_property
    def kn_f(self) -> Floats:
        """Knudsen number of the fibre."""
        return 2.0 * np.asarray(self.air.mean_free_path_m) / self.df

    @cached_property
    def slip(self) -> Floats:
        """Cunningham factor of the particle."""
        return slip_in(self.d, self.air)

    @cached_property
    def pe(self) -> Floats:
        """Peclet number."""
        return self.u0 * self.df / diffusivity_m2_s(self.d, air=self.air)

    @cached_property
    def relaxation_s(self) -> Floats:
        """Relaxation time of the particle, s."""
        return relaxation_time_s(self.d, density_kg_m3=self.material.density_kg_m3, air=self.air)

    @cached_property
    def stk(self) -> Floats:
        """Stokes number, tau U0 / df."""
        return self.relaxation_s * self.u0 / self.df

    @cached_property
    def _force_scale(self) -> Floats:
        """Cc / (3 pi^2 eps0 mu df U0)."""
        drag = 3.0 * math.pi**2 * VACUUM_PERMITTIVITY_F_M * np.asarray(self.air.viscosity_pa_s)
        return self.slip / (drag * self.df * self.u0)

    @cached_property
    def k_in(self) -> Floats:
        """Induced-force number of a charged fibre and a polarised particle."""
        permittivity = np.asarray(self.material.permittivity, dtype=np.float64)
        polarised = (permittivity - 1.0) / (permittivity + 2.0)
        charge = np.asarray(self.layer.line_charge_c_m, dtype=np.float64)
        return np.asarray(polarised * charge**2 * self.r**2 * self._force_scale)

    @cached_property
    def k_c(self) -> Floats:
        """Coulomb number of a charged fibre and a charged particle."""
        particle_c = np.asarray(self.material.charges, dtype=np.float64) * ELEMENTARY_CHARGE_C
        charge = np.asarray(self.layer.line_charge_c_m, dtype=np.float64)
        return np.asarray(charge * particle_c * self._force_scale / self.d)


def diffusion_lee_liu(m: Meeting) -> Floats:
    """1.6 b^(1/3) Pe^(-2/3). Source: Lee & Liu (1982) Aerosol Sci Technol 1:35-46 (memory)."""
    return 1.6 * np.cbrt(m.b) * m.pe ** (-2.0 / 3.0)


def diffusion_slip(m: Meeting) -> Floats:
    """Lee & Liu's diffusion with slip at the fibre, bounded below 1.

    Source: Liu & Rubow (1990); Payet et al. (1992) J Aerosol Sci 23:723-735 (form verified in use).
    """
    faster = diffusion_lee_liu(m) * (1.0 + 0.388 * m.kn_f * np.cbrt(m.b * m.pe))
    return np.asarray(faster / (1.0 + faster))


def diffusion_hinds(m: Meeting) -> Floats:
    """2 Pe^(-2/3). Source: Hinds (1999) eq 9.27 (memory)."""
    return 2.0 * m.pe ** (-2.0 / 3.0)


def interception_lee_liu(m: Meeting) -> Floats:
    """0.6 b R^2/(1+R). Source: Lee & Liu (1982) Aerosol Sci Technol 1:35-46 (verified in use)."""
    return np.asarray(0.6 * m.b * m.r**2 / (1.0 + m.r))


def interception_slip(m: Meeting) -> Floats:
    """Lee & Liu's interception with slip. Source: Liu & Rubow (1990) (memory)."""
    return interception_lee_liu(m) * (1.0 + FIBRE_SLIP * m.kn_f / m.r)


def interception_hinds(m: Meeting) -> Floats:
    """b R^2/(1+R), R below 0.4. Source: Hinds (1999) eq 9.21 (memory)."""
    return np.asarray(m.b * m.r**2 / (1.0 + m.r))


def cross_term_hinds(m: Meeting) -> Floats:
    """1.24 R^(2/3)/sqrt(Ku Pe), Pe above 100. Source: Hinds (1999) eq 9.28 (memory)."""
    return np.asarray(1.24 * np.cbrt(m.r) ** 2 / np.sqrt(m.ku * m.pe))


def impaction(m: Meeting) -> Floats:
    """Stk J/(2 Ku^2), never more than 1 + R. Solidity 0.0035 to 0.111.

    Source: Stechkina, Kirsch & Fuchs (1969) Ann Occup Hyg 12:1-8; Yeh & Liu (1974) (memory).
    """
    small = (29.6 - 28.0 * m.alpha**0.62) * m.r**2 - 27.5 * m.r**2.8
    integral = np.where(m.r < SMALL_PARTICLE_RATIO, small, 2.0)
    return np.minimum(m.stk * integral / (2.0 * m.ku**2), 1.0 + m.r)


def gravity_downward(m: Meeting) -> Floats:
    """(1 + R) v/U0 with the flow downward. Source: Hinds (1999) eq 9.30 (memory)."""
    return np.asarray(m.relaxation_s * GRAVITY_M_S2 / m.u0 * (1.0 + m.r))


def electret(m: Meeting) -> Floats:
    """Capture by the charge of the fibre, for particles of any charge.

    The cross term of the fit can pull a charged particle below an uncharged one; then the uncharged
    value holds.

    Source: 0.06 K_In^(2/5) (form verified as restated from Balazy et al. 2006); charged terms from
        Kanaoka et al. (1987) Aerosol Sci Technol 7:1-13 (structure verified, constants memory).
    """
    induced = 0.06 * m.k_in**0.4
    coulomb = 0.067 * m.k_c**0.75 - 0.017 * np.sqrt(m.k_in * m.k_c)
    return np.asarray(induced + np.maximum(coulomb, 0.0))


def net_charge_efficiency(m: Meeting) -> Floats:
    """pi K_C: exact for a fibre with a *net* charge. Never for the fitted charge of an electret.

    Source: flux of a divergence-free field (computed); Brown (1993) Air Filtration.
    """
    return plain(math.pi * m.k_c)


Mechanism: TypeAlias = Callable[[Meeting], Floats]

# Families of mechanisms that belong together; the electret term joins each.
FAMILIES: Final[Mapping[str, Mapping[str, Mechanism]]] = MappingProxyType(
    {
        "lee-liu": {
            "diffusion": diffusion_slip,
            "interception": interception_slip,
            "impaction": impaction,
            "electret": electret,
        },
        "lee-liu-continuum": {
            "diffusion": diffusion_lee_liu,
            "interception": interception_lee_liu,
            "impaction": impaction,
            "electret": electret,
        },
        "hinds": {
            "diffusion": diffusion_hinds,
            "interception": interception_hinds,
            "diffusion-interception": cross_term_hinds,
            "impaction": impaction,
            "gravity": gravity_downward,
            "electret": electret,
        },
    }
)


def mechanisms(meeting: Meeting, *, family: str = "lee-liu") -> dict[str, Floats]:
    """Efficiency of each mechanism by name, 0 or more.

    Args:
        meeting: particle, fibre and flow.
        family: one of `FAMILIES`.

    Raises:
        ValueError: the family is not known.
    """
    if family not in FAMILIES:
        raise ValueError(
            f"family: {family!r} is not allowed; it must be one of {', '.join(FAMILIES)}"
        )
    return {name: plain(of(meeting)) for name, of in FAMILIES[family].items()}


def efficiency(meeting: Meeting, *, family: str = "lee-liu") -> Floats:
    """Single-fibre efficiency of all mechanisms together, 0 to 1.

    Args:
        meeting: particle, fibre and flow.
        family: one of `FAMILIES`.

    Source: independent mechanisms, 1 - product of (1 - E), each E at most 1.
    """
    missed = np.ones(())
    for share in mechanisms(meeting, family=family).values():
        missed = missed * (1.0 - np.minimum(share, 1.0))
    return plain(1.0 - missed)
