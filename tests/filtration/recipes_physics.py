"""How the rows on air, particles and media are worked out with the library, by row name."""

import numpy as np

from filtration import (
    HANDBOOK_AIR,
    Layer,
    Lognormal,
    Material,
    Meeting,
    aerodynamic_diameter_m,
    charge_shares,
    diffusivity_m2_s,
    effective_fibre_m,
    efficiency,
    kuwabara_factor,
    lee_liu_least_efficiency,
    lee_liu_worst_size_m,
    mechanisms,
    most_penetrating,
    penetration,
    quality_factor_per_pa,
    relaxation_time_s,
    settling_velocity_m_s,
    size_fraction,
    slip_correction,
    weighted_penetration,
)
from filtration import air as air_rules
from filtration.fibre import net_charge_efficiency
from filtration.media import pressure_drop_pa as web_pressure_drop_pa

L_MIN = 1.0 / 60_000.0

WEB = Layer(solidity=0.05, thickness_m=1e-3, fibre_m=2e-6)
WATER = Material(density_kg_m3=1000.0)
# Some rows count diffusion, interception and charge only; particles without weight do not impact.
WEIGHTLESS = Material(density_kg_m3=1e-6)
FINE_GLASS = Layer(solidity=0.06, thickness_m=0.4e-3, fibre_m=0.65e-6)

FACEPIECE_M2 = 0.011
FACEPIECE = [
    Layer(solidity=0.165, thickness_m=0.31e-3, fibre_m=39.49e-6, line_charge_c_m=13e-9),
    Layer(solidity=0.069, thickness_m=1.77e-3, fibre_m=7.84e-6, line_charge_c_m=13e-9),
    Layer(solidity=0.200, thickness_m=1.05e-3, fibre_m=40.88e-6, line_charge_c_m=13e-9),
]
DISCHARGED = [
    Layer(solidity=layer.solidity, thickness_m=layer.thickness_m, fibre_m=layer.fibre_m)
    for layer in FACEPIECE
]
SALT_CHALLENGE = Lognormal(cmd_m=75e-9, gsd=1.86)


def through_facepiece(diameter_m, flow_m3_s, layers=FACEPIECE):
    return penetration(
        layers,
        diameter_m,
        face_velocity_m_s=np.asarray(flow_m3_s) / FACEPIECE_M2,
        air=HANDBOOK_AIR,
        material=WEIGHTLESS,
    )


def meeting(row):
    d = float(row.id.rsplit("-", 1)[1]) * 1e-6
    return Meeting(WEB, d, 0.10, air=HANDBOOK_AIR, material=WATER)


def charge_mean(d):
    numbers, shares = charge_shares(d)
    return np.sum(np.abs(numbers) * shares)


RECIPES = {
    # air
    "air-01": lambda row: air_rules.viscosity_pa_s(row.given("T"), law="white"),
    "air-03": lambda row: air_rules.viscosity_pa_s(row.given("T"), law="iso15900"),
    "air-04": lambda row: air_rules.viscosity_pa_s(row.given("T"), law="white"),
    "air-0[56]": lambda row: air_rules.density_kg_m3(row.given("T")),
    "air-0[89]": lambda row: air_rules.mean_free_path_m(row.given("T")),
    "air-10": lambda row: air_rules.kinetic_mean_free_path_m(
        row.given("T"), viscosity_pa_s=row.given("mu")
    ),
    "air-11": lambda row: air_rules.mean_free_path_m(row.given("T"), pressure_pa=row.given("P")),
    "air-12": lambda _row: (
        air_rules.mean_free_path_m(293.15, pressure_pa=8e4) / air_rules.mean_free_path_m(293.15)
    ),
    # particles
    "cc-A11-*": lambda row: slip_correction(
        row.given("d"), mean_free_path_m=row.given("l"), law="hinds1999"
    ),
    "cc-SP-*": lambda row: slip_correction(
        row.given("d"), mean_free_path_m=row.given("l"), law="davies1945"
    ),
    "cc-davies-*": lambda row: slip_correction(
        row.given("d"), mean_free_path_m=row.given("l"), law="davies1945"
    ),
    "cc-AR85-*": lambda row: slip_correction(
        row.given("d"), mean_free_path_m=row.given("l"), law="allen_raabe1985"
    ),
    "D-0.*": lambda row: diffusivity_m2_s(row.given("d"), air=HANDBOOK_AIR),
    "D-kim-0.1": lambda row: diffusivity_m2_s(
        row.given("d"), air=air_rules.Air(293.15, 1.81e-5, 1.2, 66e-9, "davies1945")
    ),
    "vts-*": lambda row: settling_velocity_m_s(
        row.given("d"), density_kg_m3=1000.0, air=HANDBOOK_AIR
    ),
    "vts-100-stokes": lambda row: (
        relaxation_time_s(row.given("d"), density_kg_m3=1000.0, air=HANDBOOK_AIR) * 9.81
    ),
    "tau-*": lambda row: relaxation_time_s(row.given("d"), density_kg_m3=1000.0, air=HANDBOOK_AIR),
    "da-nacl*": lambda row: aerodynamic_diameter_m(
        row.given("d"), density_kg_m3=2165.0, air=HANDBOOK_AIR, shape=row.given("chi")
    ),
    "hc-[0-9]*": lambda row: Lognormal(row.given("CMD"), row.given("GSD")).median_m("mass"),
    "hc-dop": lambda row: Lognormal(row.given("CMD"), row.given("GSD")).median_m("mass"),
    "hc-amd": lambda row: Lognormal(row.given("CMD"), row.given("GSD")).average_diameter_m(1),
    "hc-dav": lambda row: Lognormal(row.given("CMD"), row.given("GSD")).average_diameter_m(3),
    "cert-lt100-1": lambda _row: SALT_CHALLENGE.share_below(100e-9, by="number"),
    "cert-lt100-4": lambda _row: Lognormal(185e-9, 1.6).share_below(100e-9, by="mass"),
    "iso7708-resp-4": lambda _row: size_fraction(4.0, "respirable"),
    "iso7708-*-*": lambda row: size_fraction(row.given("dae") * 1e6, row.id.split("-")[1]),
    "boltz-0.*": lambda row: charge_shares(row.given("d"))[1][60],
    "boltz-mean-1": lambda row: charge_mean(row.given("d")),
    # media
    "ku-*": lambda row: kuwabara_factor(row.given("alpha")),
    "dp-davies": lambda _row: web_pressure_drop_pa([WEB], face_velocity_m_s=0.1, air=HANDBOOK_AIR),
    "dp-kuw": lambda _row: web_pressure_drop_pa(
        [WEB], face_velocity_m_s=0.1, air=HANDBOOK_AIR, law="kuwabara"
    ),
    "dp-kuw-nano": lambda _row: np.divide(
        *(
            web_pressure_drop_pa(
                [Layer(0.05, 1e-3, 0.2e-6)], face_velocity_m_s=0.1, air=HANDBOOK_AIR, law=law
            )
            for law in ("kuwabara-slip", "kuwabara")
        )
    ),
    "df-eff": lambda _row: effective_fibre_m(
        326.0491216,
        solidity=0.05,
        thickness_m=1e-3,
        face_velocity_m_s=0.1,
        air=HANDBOOK_AIR,
    ),
    "df-eff-2": lambda row: effective_fibre_m(
        120.0,
        solidity=0.08,
        thickness_m=1.5e-3,
        face_velocity_m_s=row.given("U"),
        air=HANDBOOK_AIR,
    ),
    "E-D-*": lambda row: mechanisms(meeting(row), family="hinds")["diffusion"],
    "E-R-*": lambda row: mechanisms(meeting(row), family="hinds")["interception"],
    "E-I-*": lambda row: mechanisms(meeting(row), family="hinds")["impaction"],
    "E-DR-*": lambda row: mechanisms(meeting(row), family="hinds")["diffusion-interception"],
    "E-tot-*": lambda row: efficiency(meeting(row), family="hinds"),
    "P-std": lambda _row: penetration(
        [WEB],
        0.3e-6,
        face_velocity_m_s=0.1,
        air=HANDBOOK_AIR,
        material=WATER,
        family="hinds",
    ),
    "mpps-leeliu": lambda _row: (
        most_penetrating(
            [WEB],
            face_velocity_m_s=0.1,
            air=HANDBOOK_AIR,
            material=WEIGHTLESS,
            family="lee-liu-continuum",
        ).diameter_m
    ),
    "mpps-ll-closed": lambda _row: lee_liu_worst_size_m(
        WEB, face_velocity_m_s=0.1, air=HANDBOOK_AIR
    ),
    "emin-ll-closed": lambda _row: lee_liu_least_efficiency(
        WEB, face_velocity_m_s=0.1, air=HANDBOOK_AIR
    ),
    "mpps-hepa": lambda _row: (
        most_penetrating(
            [FINE_GLASS], face_velocity_m_s=0.025, air=HANDBOOK_AIR, material=WEIGHTLESS
        ).diameter_m
    ),
    "P-hepa": lambda _row: (
        most_penetrating(
            [FINE_GLASS], face_velocity_m_s=0.025, air=HANDBOOK_AIR, material=WEIGHTLESS
        ).penetration
    ),
    "ba-P-30": lambda _row: (
        most_penetrating(
            FACEPIECE,
            face_velocity_m_s=30 * L_MIN / FACEPIECE_M2,
            air=HANDBOOK_AIR,
            material=WEIGHTLESS,
        ).penetration
    ),
    "ba-P300-*": lambda row: through_facepiece(300e-9, row.given("flow")),
    "ba-mpps-unch": lambda _row: (
        most_penetrating(
            DISCHARGED,
            face_velocity_m_s=85 * L_MIN / FACEPIECE_M2,
            air=HANDBOOK_AIR,
            material=WEIGHTLESS,
        ).diameter_m
    ),
    "ba-P-unch": lambda _row: (
        most_penetrating(
            DISCHARGED,
            face_velocity_m_s=85 * L_MIN / FACEPIECE_M2,
            air=HANDBOOK_AIR,
            material=WEIGHTLESS,
        ).penetration
    ),
    "ba-polyN": lambda _row: weighted_penetration(
        FACEPIECE,
        SALT_CHALLENGE,
        face_velocity_m_s=85 * L_MIN / FACEPIECE_M2,
        by="number",
        air=HANDBOOK_AIR,
        material=WEIGHTLESS,
    ),
    "ba-polyM-unch": lambda _row: weighted_penetration(
        DISCHARGED,
        SALT_CHALLENGE,
        face_velocity_m_s=85 * L_MIN / FACEPIECE_M2,
        by="mass",
        air=HANDBOOK_AIR,
        material=WEIGHTLESS,
    ),
    "KIn-50": lambda row: (
        Meeting(FACEPIECE[1], 50e-9, row.given("U"), air=HANDBOOK_AIR, material=WATER).k_in
    ),
    "EC-exact": lambda _row: net_charge_efficiency(
        Meeting(FACEPIECE[1], 50e-9, 0.128788, air=HANDBOOK_AIR, material=Material(1000.0, 5.9, 1))
    ),
    "qf": lambda row: quality_factor_per_pa(row.given("P"), pressure_pa=row.given("dp")),
}
