"""Reported units, and what may be converted into what."""

import math

import pytest

from exposure.models import Agent, Unit
from exposure.units import (
    convert,
    molar_volume_l_mol,
    normalise,
    pressure_at_kpa,
    site_pressure_kpa,
)
from programme.roster.models import Site

TOLUENE = Agent(name="Toluene", kind="vapour", molar_mass_g_mol=92.14)
QUARTZ = Agent(name="Quartz", kind="dust", molar_mass_g_mol=60.08)
ASBESTOS = Agent(name="Asbestos", kind="fibre")


@pytest.mark.parametrize(
    ("value", "written", "kept"),
    [
        (0.25, "mg/m3", (0.25, Unit.MG_M3)),
        (0.25, "mg/m³", (0.25, Unit.MG_M3)),
        (0.25, "mg m-3", (0.25, Unit.MG_M3)),
        (250, "ug/m3", (0.25, Unit.MG_M3)),
        (250, "\u00b5g/m³", (0.25, Unit.MG_M3)),
        (250, "\u03bcg/m3", (0.25, Unit.MG_M3)),
        (250, "UG/M3", (0.25, Unit.MG_M3)),
        (250000, "ng/m3", (0.25, Unit.MG_M3)),
        (250, "ppb", (0.25, Unit.PPM)),
        (0.1, "f/mL", (0.1, Unit.F_CM3)),
        (0.1, "fibres/cm³", (0.1, Unit.F_CM3)),
    ],
)
def test_a_reported_unit_is_kept_in_one_of_three(value, written, kept):
    assert normalise(value, written) == kept


@pytest.mark.parametrize("written", ["", "  ", "mg", "mg/l3", "g", "%", "mg/m2"])
def test_an_unknown_unit_is_refused_with_what_is_allowed(written):
    with pytest.raises(ValueError, match=r"^Unit: .*mg/m3, ug/m3, ng/m3, ppm, ppb or f/cm3"):
        normalise(1.0, written)


@pytest.mark.parametrize(
    ("agent", "source", "target", "why"),
    [
        (QUARTZ, "ppm", "mg/m3", "gases and vapours only"),
        (QUARTZ, "mg/m3", "ppm", "gases and vapours only"),
        (ASBESTOS, "f/cm3", "mg/m3", "fibre count has no mass"),
        (Agent(name="X", kind="gas"), "ppm", "mg/m3", "molar mass is not recorded"),
    ],
    ids=["dust from ppm", "dust to ppm", "fibres", "no molar mass"],
)
def test_what_has_no_conversion_is_refused(agent, source, target, why):
    with pytest.raises(ValueError, match=why):
        convert(1.0, agent, source=source, target=target, molar_volume=24.45)


def test_there_and_back_gives_the_same_concentration():
    there = convert(50.0, TOLUENE, source="ppm", target="mg/m3", molar_volume=24.45)
    back = convert(there, TOLUENE, source="mg/m3", target="ppm", molar_volume=24.45)
    assert back == pytest.approx(50.0, rel=1e-12)


def test_the_same_ppm_is_less_mass_on_a_mountain():
    low = molar_volume_l_mol(temperature_c=20, pressure_kpa=pressure_at_kpa(0))
    high = molar_volume_l_mol(temperature_c=20, pressure_kpa=pressure_at_kpa(3000))
    at_sea = convert(50.0, TOLUENE, source="ppm", target="mg/m3", molar_volume=low)
    assert convert(50.0, TOLUENE, source="ppm", target="mg/m3", molar_volume=high) < at_sea


@pytest.mark.parametrize("altitude_m", [math.nan, -5000, 20000, math.inf])
def test_an_altitude_off_the_earth_is_refused(altitude_m):
    with pytest.raises(ValueError, match=r"^altitude_m: "):
        pressure_at_kpa(altitude_m)


@pytest.mark.parametrize("bad", [math.nan, math.inf, 0.0])
def test_air_that_cannot_be_is_refused(bad):
    with pytest.raises(ValueError, match=r"^pressure_kpa: "):
        molar_volume_l_mol(temperature_c=20, pressure_kpa=bad)


def test_an_entered_pressure_goes_before_the_altitude():
    assert site_pressure_kpa(Site(altitude_m=1500, pressure_kpa=84.0)) == 84.0
    assert site_pressure_kpa(Site(altitude_m=0)) == pytest.approx(101.325)
