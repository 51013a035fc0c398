"""Concentrations of gases and vapours between ppm and mg/m3, and units that look wrong.

ppm is kept when temperature and pressure change, mg/m3 is not. Limits in ppm stand for 25 C and
760 mmHg. Dust, fume, mist, fibres and counts have no ppm: the caller refuses them.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from exposure.statistics.gate import Bools, Floats, require

# The constant printed beside most limits; 62.36 (t + 273.15)/P gives 24.46. One is chosen.
LIMIT_MOLAR_VOLUME_L: Final = 24.45
GAS_CONSTANT_L_MMHG: Final = 62.36
ZERO_C_K: Final = 273.15
LIMIT_T_C: Final = 25.0
LIMIT_P_MMHG: Final = 760.0

# A result off its group by one of these is more likely a wrong unit than an exposure.
SLIP_TOLERANCE: Final = 0.02
THOUSAND: Final = 1000.0
LEAST_VISIBLE: Final = 1.5


def molar_volume_l(t_c: ArrayLike, p_mmhg: ArrayLike) -> Floats:
    """Volume of one mole of gas, L.

    Args:
        t_c: -50 to 100 degrees Celsius.
        p_mmhg: 300 to 900 mmHg.

    Source: NIOSH Manual of Analytical Methods, Appendix A (1994) (verified, 24-cell table).
    """
    t = require("t_c", t_c, at_least=-50.0, at_most=100.0)
    p = require("p_mmhg", p_mmhg, at_least=300.0, at_most=900.0)
    return np.asarray(GAS_CONSTANT_L_MMHG * (t + ZERO_C_K) / p)


def ppm_to_mg_m3(
    ppm: ArrayLike, molar_mass_g_mol: ArrayLike, *, molar_volume_l: ArrayLike = LIMIT_MOLAR_VOLUME_L
) -> Floats:
    """mg/m3 of a vapour given in ppm.

    Args:
        ppm: 0 to 1 000 000.
        molar_mass_g_mol: 1 to 5000.
        molar_volume_l: 24.45 for limits; see `molar_volume_l` for other conditions.
    """
    parts = require("ppm", ppm, at_least=0.0, at_most=1e6)
    mass = require("molar_mass_g_mol", molar_mass_g_mol, at_least=1.0, at_most=5000.0)
    return np.asarray(parts * mass / require("molar_volume_l", molar_volume_l, above=0.0))


def mg_m3_to_ppm(
    mg_m3: ArrayLike,
    molar_mass_g_mol: ArrayLike,
    *,
    molar_volume_l: ArrayLike = LIMIT_MOLAR_VOLUME_L,
) -> Floats:
    """ppm of a vapour given in mg/m3 at the conditions of the molar volume."""
    amount = require("mg_m3", mg_m3, at_least=0.0)
    mass = require("molar_mass_g_mol", molar_mass_g_mol, at_least=1.0, at_most=5000.0)
    return np.asarray(amount * require("molar_volume_l", molar_volume_l, above=0.0) / mass)


def ppm_at_conditions(
    mg_m3: ArrayLike, molar_mass_g_mol: ArrayLike, *, t_c: ArrayLike, p_mmhg: ArrayLike
) -> Floats:
    """ppm of mg/m3 measured in actual air, on the scale of limits printed with 24.45 L.

    Source: form of 29 CFR 1910.1045 App. D (there with 273 and 298) (verified).
    """
    t = require("t_c", t_c, at_least=-50.0, at_most=100.0)
    p = require("p_mmhg", p_mmhg, at_least=300.0, at_most=900.0)
    swell = LIMIT_P_MMHG / p * (t + ZERO_C_K) / (LIMIT_T_C + ZERO_C_K)
    return np.asarray(mg_m3_to_ppm(mg_m3, molar_mass_g_mol) * swell)


def looks_like_a_slip(
    value: ArrayLike, typical: ArrayLike, *, molar_mass_g_mol: float | None = None
) -> Bools:
    """True where a result is off its group by just the factor of a wrong unit.

    Args:
        value: results, above 0.
        typical: what the group has, same unit, e.g. its geometric mean without this result.
        molar_mass_g_mol: of a vapour, to see ppm taken for mg/m3 and the reverse.
    """
    ratio = require("value", value, above=0.0) / require("typical", typical, above=0.0)
    factors = [THOUSAND]
    if molar_mass_g_mol is not None:
        factors.append(float(ppm_to_mg_m3(1.0, molar_mass_g_mol)))
    away = np.abs(np.log(ratio))[..., None] - np.abs(np.log(factors))
    # A molar mass near 24 makes no difference that could be seen.
    is_visible = np.abs(np.log(factors)) > np.log(LEAST_VISIBLE)
    return np.asarray(((np.abs(away) < SLIP_TOLERANCE) & is_visible).any(axis=-1))
