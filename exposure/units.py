"""Trade units at the edge: what is typed or printed, turned into the units a result is kept in."""

import math
import re

from exposure.models import Agent, Unit
from exposure.statistics.units import mg_m3_to_ppm, molar_volume_l, ppm_to_mg_m3
from programme.roster.models import Site

# Source: conventional millimetre of mercury, 133.322 Pa (BIPM, SI brochure, 8th ed., table 8).
KPA_A_MMHG = 0.133322
# Standard atmosphere below 11 km. Source: ISO 2533:1975, equal to ICAO Doc 7488/3 (1993).
SEA_LEVEL_KPA = 101.325
SEA_LEVEL_K = 288.15
LAPSE_K_M = 0.0065
PRESSURE_EXPONENT = 5.25588
LOWEST_M, HIGHEST_M = -2000, 11000
COLDEST_C, WARMEST_C = -50, 100
THINNEST_KPA, DENSEST_KPA = 40, 119

# Divisors and multipliers, kept apart so that 250 ug/m3 is exactly 0.25 mg/m3.
_MG, _PPM, _FIBRES = Unit.MG_M3, Unit.PPM, Unit.F_CM3
KNOWN_UNITS: dict[str, tuple[Unit, float, float]] = {
    "mg/m3": (_MG, 1.0, 1.0),
    "ug/m3": (_MG, 1.0, 1000.0),
    "ng/m3": (_MG, 1.0, 1e6),
    "ug/l": (_MG, 1.0, 1.0),
    "mg/l": (_MG, 1000.0, 1.0),
    "ppm": (_PPM, 1.0, 1.0),
    "ppb": (_PPM, 1.0, 1000.0),
    "f/cm3": (_FIBRES, 1.0, 1.0),
    "f/ml": (_FIBRES, 1.0, 1.0),
    "f/cc": (_FIBRES, 1.0, 1.0),
    "f/l": (_FIBRES, 1.0, 1000.0),
}
ALLOWED_UNITS = "mg/m3, ug/m3, ng/m3, ppm, ppb or f/cm3"


def _require(name: str, value: float, *, within: tuple[float, float]) -> None:
    low, high = within
    # Not `<` and `>`: NaN is refused too.
    if not low <= value <= high:
        raise ValueError(f"{name}: {value} is not allowed; it must be {low} to {high}")


def pressure_at_kpa(altitude_m: float) -> float:
    """Air pressure of the standard atmosphere.

    Args:
        altitude_m: m above sea level (geopotential), -2000 to 11000.

    Raises:
        ValueError: outside that range, or NaN.

    Source: ISO 2533:1975, Standard Atmosphere, equal to ICAO Doc 7488 (from memory).
    """
    _require("altitude_m", altitude_m, within=(LOWEST_M, HIGHEST_M))
    ratio = 1 - LAPSE_K_M * altitude_m / SEA_LEVEL_K
    return float(SEA_LEVEL_KPA * ratio**PRESSURE_EXPONENT)


def site_pressure_kpa(site: Site) -> float:
    """The pressure entered for the site, else that of the standard atmosphere at its altitude."""
    if site.pressure_kpa is not None:
        return site.pressure_kpa
    return pressure_at_kpa(site.altitude_m)


def molar_volume_l_mol(*, temperature_c: float, pressure_kpa: float) -> float:
    """Volume of one mole of an ideal gas, L/mol.

    Args:
        temperature_c: °C, -50 to 100.
        pressure_kpa: kPa, 40 to 119.

    Raises:
        ValueError: an argument is out of range or NaN.

    Source: ideal gas law; NIOSH Manual of Analytical Methods, Appendix A (1994) prints its table.
    """
    _require("temperature_c", temperature_c, within=(COLDEST_C, WARMEST_C))
    _require("pressure_kpa", pressure_kpa, within=(THINNEST_KPA, DENSEST_KPA))
    return float(molar_volume_l(temperature_c, pressure_kpa / KPA_A_MMHG))


def site_molar_volume_l_mol(site: Site) -> float:
    """Molar volume in the air of the site, L/mol."""
    return molar_volume_l_mol(
        temperature_c=site.temperature_c, pressure_kpa=site_pressure_kpa(site)
    )


def _refuse_conversion(agent: Agent, *, source: str, target: str) -> None:
    way = f"{source} to {target}"
    if _FIBRES in {source, target}:
        raise ValueError(f"unit: {way} is not possible for {agent}; a fibre count has no mass")
    if agent.is_particulate:
        raise ValueError(
            f"unit: {way} is not possible for {agent}; ppm is for gases and vapours only"
        )
    if agent.molar_mass_g_mol is None:
        raise ValueError(f"unit: {way} is not possible for {agent}; its molar mass is not recorded")


def convert(value: float, agent: Agent, *, source: str, target: str, molar_volume: float) -> float:
    """A concentration of a gas or vapour in the other of ppm and mg/m3.

    Args:
        value: in `source`.
        agent: gives the molar mass.
        source: a member of `Unit`.
        target: a member of `Unit`; the same unit gives `value` back.
        molar_volume: L/mol in the air meant (of the site, or that at which a list prints its ppm).

    Raises:
        ValueError: particles, fibres, no molar mass, or an unknown unit.
    """
    start, end = Unit(source), Unit(target)
    if start == end:
        return value
    _refuse_conversion(agent, source=start, target=end)
    change = ppm_to_mg_m3 if start == _PPM else mg_m3_to_ppm
    # A missing molar mass was refused above; NaN would be refused too.
    mass = agent.molar_mass_g_mol or math.nan
    return float(change(value, mass, molar_volume_l=molar_volume))


def _plain(unit_text: str) -> str:
    text = unit_text.strip().lower()
    for sign, plain in (
        ("\u00b5", "u"),
        ("\u03bc", "u"),
        ("³", "3"),
        ("^", ""),
        ("**", ""),
        ("⁻", "-"),
        ("mcg", "ug"),
        ("fibres", "f"),
        ("fibers", "f"),
    ):
        text = text.replace(sign, plain)
    text = re.sub(r"\s+(m|cm|ml|l)-[13]$", r"/\1-3", text).replace("/m-3", "/m3")
    return text.replace("/cm-3", "/cm3").replace(" ", "").removesuffix("(v)")


def normalise(value: float, unit_text: str) -> tuple[float, Unit]:
    """A reported value in one of the three units results are kept in.

    Args:
        value: as reported.
        unit_text: "mg/m3", "µg/m³", "ug/m3", "ppb", "f/ml" ... in any case and spacing.

    Returns:
        (value, unit): µg/m3 and ng/m3 as mg/m3, ppb as ppm, f/ml as f/cm3.

    Raises:
        ValueError: the unit is empty or not known; the message lists what is allowed.
    """
    if not unit_text.strip():
        raise ValueError(f"Unit: empty; it must be {ALLOWED_UNITS}")
    known = KNOWN_UNITS.get(_plain(unit_text))
    if known is None:
        raise ValueError(f"Unit: {unit_text} is not allowed; it must be {ALLOWED_UNITS}")
    unit, times, over = known
    return value * times / over, unit
