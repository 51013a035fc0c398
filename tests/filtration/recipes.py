"""How each row of the filtration check table is worked out with the library, by row name."""

import fnmatch
import math

from filtration import (
    HANDBOOK_AIR,
    DepthStage,
    ParticleFilter,
    Seal,
    Spreading,
    bergman_pressure_drop_pa,
    cycle_average,
    effective_protection_factor,
    electret_penetration,
    electret_worst,
    exceedance,
    face_velocity_m_s,
    fit_factor_to_leak,
    inside_exposure,
    inspiratory_flows,
    inward_leakage,
    k2_from_trade_unit_per_s,
    k2_happel_per_s,
    k2_kozeny_carman_per_s,
    lung_overstatement,
    mass_behind_seal_kg,
    mass_collected_kg,
    mass_to_limit_kg,
    measured_fit_factor,
    overall_fit_factor,
    power_cycle_factor,
    pressure_drop_pa,
    resistance_pa_s_m3,
    share_elasticities,
    solve,
    time_to_limit_s,
    time_to_mass_s,
    two_level_factor,
    workplace_median,
    worn_share_for,
)
from filtration.breathing import METABOLIC_RATE_W_M2
from filtration.particles import slip_in
from tests.filtration import recipes_physics as physics
from tests.filtration.recipes_physics import L_MIN, WEB, through_facepiece

MG = 1e-6
HOUR = 3600.0
LIKELY = 1

CLEAN_RESISTANCE = 120.0 / (85 * L_MIN)
ONE_PERCENT_LEAK = Seal.from_share(
    0.01, flow_m3_s=85 * L_MIN, resistance_pa_s_m3=CLEAN_RESISTANCE, exponent=0.7
)
ELEMENT = ParticleFilter(
    area_m2=0.015, test_flow_m3_s=85 * L_MIN, clean_pressure_pa=120.0, k2_per_s=[3e5, 3e5, 3e5]
)
DEPTH_ELEMENT = ParticleFilter(
    area_m2=0.015,
    test_flow_m3_s=85 * L_MIN,
    clean_pressure_pa=120.0,
    k2_per_s=[3e5, 3e5, 3e5],
    depth=DepthStage(growth_m2_kg=math.log(2.0) / 5e-3, clogging_load_kg_m2=5e-3),
)


def loaded_for_8_h():
    mass = mass_behind_seal_kg(
        8 * HOUR,
        conc_kg_m3=10 * MG,
        minute_volume_m3_s=30 * L_MIN,
        element=ELEMENT,
        seal=ONE_PERCENT_LEAK,
        efficiency=0.99,
    )[LIKELY]
    return mass, resistance_pa_s_m3(mass, element=ELEMENT)[LIKELY]


def share_at(flow_m3_s, resistance=CLEAN_RESISTANCE):
    return solve(flow_m3_s, resistance_pa_s_m3=resistance, seal=ONE_PERCENT_LEAK).share


def worked_leak(row):
    seals = {"n1": Seal(1e-7, 1.0), "n05": Seal(1e-6, 0.5), "n07": Seal(5e-7, 0.7)}
    return solve(60 * L_MIN, resistance_pa_s_m3=1e5, seal=seals[row.id.split("-")[1]])


def cake_of(row):
    law = k2_kozeny_carman_per_s if row.id.startswith("K2-KC") else k2_happel_per_s
    d, density, porosity = {
        "5": (5e-6, 2650.0, 0.6),
        "10um": (10e-6, 2650.0, 0.55),
        "3um": (3e-6, 2650.0, 0.65),
        "1um": (1e-6, 2650.0, 0.75),
        "salt": (0.238e-6, 2165.0, 0.85),
        "fume": (0.03e-6, 5000.0, 0.95),
    }[row.id.split("-")[2]]
    slip = 1.0 if row.id == "K2-KC-5" else slip_in(d, HANDBOOK_AIR)
    return law(d, density_kg_m3=density, porosity=porosity, viscosity_pa_s=1.81e-5, slip=slip)


def worst_electret():
    return electret_worst(0.01, discharged_penetration=0.30, growth_m2_kg=50.0, decay_kg_m2=4e-3)


def wpf_inside(outside, gsd_outside):
    workplace = Spreading(workplace_median(10.0, gsd=2.5), gsd=2.5)
    return inside_exposure(Spreading(outside, gsd=gsd_outside), protection=workplace)


def numbers_of(row):
    if "x6" in row.inputs:
        return [1000.0] * 6 + [20.0]
    return [float(part) for part in row.inputs.split(",")]


def trade_unit(row):
    return k2_from_trade_unit_per_s(float(row.inputs.split()[0]))


RECIPES = {
    **physics.RECIPES,
    # breathing
    "br-pif-*": lambda row: inspiratory_flows(row.given("minute volume")).peak_m3_s,
    "br-fw-*": lambda row: inspiratory_flows(row.given("minute volume")).flow_weighted_m3_s,
    "br-mif-*": lambda row: inspiratory_flows(row.given("minute volume")).mean_m3_s,
    "br-pub-1": lambda row: inspiratory_flows(row.given("VE") * L_MIN).mean_m3_s,
    "br-I-*": lambda row: power_cycle_factor(row.given("m")),
    "br-cycP-*": lambda row: cycle_average(
        lambda flow: through_facepiece(50e-9, flow), row.given("minute volume")
    ),
    "br-constP-126": lambda _row: through_facepiece(50e-9, 125.66 * L_MIN),
    "br-face-*": lambda row: face_velocity_m_s(
        float(row.inputs.split()[0]) * L_MIN, area_m2=150e-4
    ),
    "br-met-low": lambda _row: METABOLIC_RATE_W_M2["low"],
    "br-met-moderate": lambda _row: METABOLIC_RATE_W_M2["moderate"],
    "br-met-very-high": lambda _row: METABOLIC_RATE_W_M2["very_high"],
    # leak
    "leak-n*-dp": lambda row: worked_leak(row).pressure_pa,
    "leak-n*": lambda row: worked_leak(row).share,
    "leak-R*": lambda row: share_at(85 * L_MIN, CLEAN_RESISTANCE * float(row.id[6:])),
    "leak-Q*": lambda row: share_at(row.given("flow")),
    "leak-elast-R": lambda row: share_elasticities(row.given("f"), exponent=0.7)[0],
    "leak-elast-Q": lambda row: share_elasticities(row.given("f"), exponent=0.7)[1],
    "leak-cyc-30": lambda _row: cycle_average(share_at, 30 * L_MIN),
    "ff-[1-5]": lambda row: measured_fit_factor(
        row.given("leak share"), filter_penetration=row.given("Pf")
    ),
    "ff-max-*": lambda row: measured_fit_factor(0.0, filter_penetration=row.given("Pf")),
    "ff-invert": lambda row: (
        fit_factor_to_leak(row.given("FF"), filter_penetration=row.given("Pf")).share
    ),
    "ff-lung": lambda _row: lung_overstatement(0.5),
    "ff-harm-*": lambda row: overall_fit_factor(numbers_of(row)),
    # loading
    "load-m-*": lambda row: mass_collected_kg(
        row.given("C"), minute_volume_m3_s=row.given("VE"), duration_s=8 * HOUR, efficiency=1.0
    ),
    "load-C200-*": lambda row: (
        200
        * MG
        / mass_collected_kg(
            1.0, minute_volume_m3_s=row.given("VE"), duration_s=8 * HOUR, efficiency=1.0
        )
    ),
    "load-t200": lambda row: time_to_mass_s(
        200 * MG, conc_kg_m3=row.given("C"), minute_volume_m3_s=row.given("VE")
    ),
    "K2-KC*": cake_of,
    "K2-RH*": cake_of,
    "K2-unit": lambda _row: k2_from_trade_unit_per_s(1.0),
    "K2-tab-*": trade_unit,
    "load-dp": lambda row: pressure_drop_pa(
        row.given("m"),
        area_m2=row.given("A"),
        flow_m3_s=row.given("Q"),
        clean_pressure_pa=0.0,
        k2_per_s=row.given("K2"),
    ),
    "load-mlim": lambda _row: mass_to_limit_kg(ELEMENT, limit_pa=343.2)[LIKELY],
    "load-tlim": lambda _row: time_to_limit_s(
        5 * MG,
        minute_volume_m3_s=30 * L_MIN,
        element=ELEMENT,
        limit_pa=343.2,
        efficiency=0.99,
    )[LIKELY],
    "load-2phase": lambda _row: mass_to_limit_kg(DEPTH_ELEMENT, limit_pa=343.2)[LIKELY],
    "load-ode-m": lambda _row: loaded_for_8_h()[0],
    "load-ode-R": lambda _row: loaded_for_8_h()[1] / CLEAN_RESISTANCE,
    "load-ode-f0": lambda _row: share_at(60 * L_MIN),
    "load-ode-f8": lambda _row: share_at(60 * L_MIN, loaded_for_8_h()[1]),
    "load-ode-til0": lambda _row: inward_leakage(share_at(60 * L_MIN), filter_penetration=0.01),
    "load-ode-til8": lambda _row: inward_leakage(
        share_at(60 * L_MIN, loaded_for_8_h()[1]), filter_penetration=0.01
    ),
    "berg-clean": lambda _row: bergman_pressure_drop_pa(
        WEB, deposit_solidity=0.0, particle_m=1e-6, face_velocity_m_s=0.1, air=HANDBOOK_AIR
    ),
    "berg-loaded": lambda row: bergman_pressure_drop_pa(
        WEB,
        deposit_solidity=row.given("alpha_p"),
        particle_m=row.given("dp"),
        face_velocity_m_s=0.1,
        air=HANDBOOK_AIR,
    ),
    "elec-Wmax": lambda _row: worst_electret().load_kg_m2,
    "elec-Pmax": lambda _row: worst_electret().penetration,
    "elec-oil-200": lambda _row: electret_penetration(
        13.333e-3,
        clean_penetration=0.01,
        discharged_penetration=0.30,
        growth_m2_kg=0.0,
        decay_kg_m2=4e-3,
    ),
    # protection
    "wpf-gm-*": lambda row: workplace_median(10.0, gsd=row.given("GSD")),
    "wpf-muc": lambda _row: exceedance(wpf_inside(10.0, 1.0), limit=1.0),
    "wpf-gmmuc": lambda _row: exceedance(wpf_inside(10.0, 2.5), limit=1.0),
    "wpf-gmin": lambda _row: wpf_inside(0.5 * MG, 2.5).median,
    "wpf-amin": lambda _row: wpf_inside(0.5 * MG, 2.5).mean,
    "wpf-nicas": lambda _row: two_level_factor(100.0, between_log_sd=0.5, within_log_sd=0.8),
    "epf-w90-*": lambda row: worn_share_for(row.given("PF"), kept=0.9),
    "epf-ceiling": lambda row: effective_protection_factor(1e12, worn_share=row.given("w")),
    "epf-30min": lambda row: effective_protection_factor(row.given("PF"), worn_share=0.9375),
    "epf-[0-9]*-*": lambda row: effective_protection_factor(
        row.given("PF"), worn_share=row.given("wear fraction")
    ),
}


def recipe_for(row):
    """The first recipe whose name matches the row's; exact names win."""
    if row.id in RECIPES:
        return RECIPES[row.id]
    return next(
        (recipe for name, recipe in RECIPES.items() if fnmatch.fnmatchcase(row.id, name)), None
    )
