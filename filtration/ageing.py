"""Ageing: how a deposit changes what passes a medium, and the resistance inside it.

The constants of a medium are fitted to its own loading test; those shown here are illustrative.
A discharged electret breathes as easily as before, so nobody can feel it.

>>> worst = electret_worst(
...     0.01, discharged_penetration=0.30, growth_m2_kg=50.0, decay_kg_m2=0.004
... )
>>> round(float(worst.load_kg_m2) * 1000.0, 1), round(float(worst.penetration), 3)
(10.6, 0.125)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from filtration.air import ROOM_AIR, Air
from filtration.fibre import Layer
from filtration.require import Floats, plain, require


def mechanical_penetration(
    load_kg_m2: ArrayLike, *, clean_penetration: ArrayLike, growth_m2_kg: ArrayLike
) -> Floats:
    """Penetration of an uncharged medium under a solid deposit, 0 to 1: it falls.

    Liquids do the opposite; this is not for them.

    Args:
        load_kg_m2: deposit over area, kg/m2, 0 or more.
        clean_penetration: above 0 to 1.
        growth_m2_kg: a in -ln P = -ln P0 (1 + a W), m2/kg, 0 or more.

    Source: linear growth of -ln P (common practice); for liquids Payet et al. (1992) J Aerosol Sci
        23:723-735 (verified abstract).
    """
    load = require("load_kg_m2", load_kg_m2, at_least=0.0)
    clean = require("clean_penetration", clean_penetration, above=0.0, at_most=1.0)
    growth = require("growth_m2_kg", growth_m2_kg, at_least=0.0)
    return plain(np.exp(np.log(clean) * (1.0 + growth * load)))


def electret_penetration(
    load_kg_m2: ArrayLike,
    *,
    clean_penetration: ArrayLike,
    discharged_penetration: ArrayLike,
    growth_m2_kg: ArrayLike,
    decay_kg_m2: ArrayLike,
) -> Floats:
    """Penetration of a charged medium as the deposit hides its charge, 0 to 1.

    -ln P = E_m (1 + a W) + E_e exp(-W/W*), with E_m what is left when the charge is gone. Oil has
    no growth term, so its penetration only rises.

    Args:
        load_kg_m2: W, deposit over area, kg/m2, 0 or more.
        clean_penetration: new, above 0 to 1, at most `discharged_penetration`.
        discharged_penetration: with the charge gone, above 0 to 1.
        growth_m2_kg: a, m2/kg, 0 or more; 0 for oil.
        decay_kg_m2: W*, kg/m2, above 0.

    Raises:
        ValueError: the new medium lets through more than the discharged one.

    Source: form after Brown et al. (1988) Ann Occup Hyg 32:271-294 and Walsh & Stenhouse (1997)
        (memory).
    """
    load = require("load_kg_m2", load_kg_m2, at_least=0.0)
    mechanical, electrical = _depths(clean_penetration, discharged_penetration)
    growth = require("growth_m2_kg", growth_m2_kg, at_least=0.0)
    decay = require("decay_kg_m2", decay_kg_m2, above=0.0)
    return plain(np.exp(-(mechanical * (1.0 + growth * load) + electrical * np.exp(-load / decay))))


def _depths(
    clean_penetration: ArrayLike, discharged_penetration: ArrayLike
) -> tuple[Floats, Floats]:
    """-ln P left without charge, and what the charge adds."""
    clean = require("clean_penetration", clean_penetration, above=0.0, at_most=1.0)
    bare = require("discharged_penetration", discharged_penetration, above=0.0, at_most=1.0)
    if not np.all(clean <= bare):
        raise ValueError(
            f"clean_penetration: {np.max(clean):.12g} is not allowed; "
            "it must be at most discharged_penetration"
        )
    return -np.log(bare), np.log(bare / clean)


@dataclass(frozen=True)
class WorstLoad:
    """The load at which an electret lets through most; infinite where it only ever rises.

    Attributes:
        load_kg_m2: kg/m2.
        penetration: there, or in the limit, 0 to 1.
    """

    load_kg_m2: Floats
    penetration: Floats


def electret_worst(
    clean_penetration: ArrayLike,
    *,
    discharged_penetration: ArrayLike,
    growth_m2_kg: ArrayLike,
    decay_kg_m2: ArrayLike,
) -> WorstLoad:
    """Where the penetration of a loading electret peaks.

    Args:
        clean_penetration: new, above 0 to 1, at most `discharged_penetration`.
        discharged_penetration: with the charge gone, above 0 to 1.
        growth_m2_kg: a, m2/kg, 0 or more; 0 for oil, which has no peak.
        decay_kg_m2: W*, kg/m2, above 0.

    Source: derivative of `electret_penetration` (computed).
    """
    mechanical, electrical = _depths(clean_penetration, discharged_penetration)
    growth = require("growth_m2_kg", growth_m2_kg, at_least=0.0)
    decay = require("decay_kg_m2", decay_kg_m2, above=0.0)
    rise = mechanical * growth * decay
    has_peak = rise > 0.0
    # Where the charge adds little the new medium is the worst: the peak lies at no load.
    least = np.where(has_peak, rise, 1.0)
    climb = np.log(np.maximum(electrical, least)) - np.log(least)
    load = np.where(has_peak, decay * climb, np.inf)
    finite = np.where(has_peak, load, 0.0)
    at_peak = np.exp(-(mechanical * (1.0 + growth * finite) + electrical * np.exp(-finite / decay)))
    in_the_limit = np.exp(-mechanical)
    never_charged = ~has_peak & (electrical <= 0.0)
    return WorstLoad(
        load_kg_m2=plain(np.where(never_charged, 0.0, load)),
        penetration=plain(np.where(has_peak, at_peak, in_the_limit)),
    )


def bergman_pressure_drop_pa(
    layer: Layer,
    *,
    deposit_solidity: ArrayLike,
    particle_m: ArrayLike,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
) -> Floats:
    """Pressure drop while the deposit hangs on the fibres inside the medium, Pa.

    Args:
        layer: the clean medium.
        deposit_solidity: mass / (area x thickness x particle density), 0 to 0.3.
        particle_m: diameter of the deposited particles, m, above 0.
        face_velocity_m_s: m/s, 0 or more.
        air: the air.

    Valid: early stage, deposit spread evenly; too high later.
    Source: Bergman et al. (1978) 15th DOE Nuclear Air Cleaning Conference (memory); with no deposit
        it is Davies's law without its (1 + 56 solidity^3).
    """
    deposit = require("deposit_solidity", deposit_solidity, at_least=0.0, at_most=0.3)
    particle = require("particle_m", particle_m, above=0.0)
    velocity = require("face_velocity_m_s", face_velocity_m_s, at_least=0.0)
    alpha = np.asarray(layer.solidity, dtype=np.float64)
    fibre = np.asarray(layer.fibre_m, dtype=np.float64)
    surface = np.sqrt(alpha / fibre**2 + deposit / particle**2)
    length = alpha / fibre + deposit / particle
    drag = 64.0 * np.asarray(air.viscosity_pa_s) * np.asarray(layer.thickness_m)
    return plain(drag * velocity * surface * length)
