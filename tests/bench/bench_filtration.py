"""Vectorised filtration against a plain loop over scipy, as time for each item and as a ratio.

Run with `python -m tests.bench.bench_filtration`. The loop runs on a subsample; the answers of both
are compared there, so that speed is never bought with another result.
"""

import sys
import time

import numpy as np
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq, minimize_scalar

from filtration import (
    GENERIC_CARBON,
    Bed,
    Conditions,
    Layer,
    Lognormal,
    ParticleFilter,
    Seal,
    Vapour,
    breakthrough_min,
    mass_behind_seal_kg,
    most_penetrating,
    penetration,
    resistance_pa_s_m3,
    solve,
    weighted_penetration,
)

L_MIN = 1.0 / 60_000.0
SPEED = 0.1
RNG = np.random.default_rng(2024)

TOLUENE = Vapour(
    name="toluene",
    molar_mass_g_mol=92.138,
    liquid_density_g_cm3=0.867,
    affinity=1.131,
    vapour_pressure_kpa=2.919,
    boiling_point_c=110.6,
)


def spread(low, high, count):
    return np.exp(RNG.uniform(np.log(low), np.log(high), count))


def leaks():
    """Facepiece pressure behind many seals, against a bracketed root each."""
    count, few = 100_000, 400
    flow, resistance = spread(20 * L_MIN, 200 * L_MIN, count), spread(2e4, 5e5, count)
    k, n = spread(1e-9, 1e-5, count), RNG.uniform(0.5, 1.0, count)

    def one(i):
        return brentq(
            lambda dp: dp / resistance[i] + k[i] * dp ** n[i] - flow[i],
            0.0,
            flow[i] * resistance[i],
            xtol=1e-12,
        )

    return (
        count,
        lambda: solve(flow, resistance_pa_s_m3=resistance, seal=Seal(k, n)).pressure_pa,
        lambda: [one(i) for i in range(few)],
    )


def random_webs(count):
    return RNG.uniform(0.02, 0.15, count), spread(2e-4, 3e-3, count), spread(1e-6, 2e-5, count)


def whole_aerosols():
    """Mass penetration of media by aerosols, against adaptive quadrature each."""
    media, aerosols, few = 1000, 20, 2
    alpha, thickness, fibre = random_webs(media)
    cmd, gsd = spread(0.05e-6, 0.5e-6, aerosols), RNG.uniform(1.5, 2.2, aerosols)

    def one(i, j):
        layer, s = Layer(alpha[i], thickness[i], fibre[i]), np.log(gsd[j])
        middle = np.log(Lognormal(cmd[j], gsd[j]).median_m("mass"))

        def density(x):
            share = penetration([layer], np.exp(x), face_velocity_m_s=SPEED)
            return share * np.exp(-0.5 * ((x - middle) / s) ** 2)

        area = quad(density, middle - 8 * s, middle + 8 * s, limit=200)[0]
        return area / (s * np.sqrt(2 * np.pi))

    layer = Layer(alpha[:, np.newaxis], thickness[:, np.newaxis], fibre[:, np.newaxis])
    return (
        media * aerosols,
        lambda: np.ravel(
            weighted_penetration([layer], Lognormal(cmd, gsd), face_velocity_m_s=SPEED)
        ),
        lambda: [one(i, j) for i in range(few) for j in range(aerosols)],
    )


def worst_sizes():
    """Most penetrating size of many media, against a bounded scalar search each."""
    count, few = 5000, 40
    alpha, thickness, fibre = random_webs(count)

    def one(i):
        layer = Layer(alpha[i], thickness[i], fibre[i])
        found = minimize_scalar(
            lambda x: -penetration([layer], np.exp(x), face_velocity_m_s=SPEED),
            bounds=(np.log(5e-9), np.log(3e-6)),
            method="bounded",
            options={"xatol": 1e-8},
        )
        return -found.fun

    return (
        count,
        lambda: (
            most_penetrating([Layer(alpha, thickness, fibre)], face_velocity_m_s=SPEED).penetration
        ),
        lambda: [one(i) for i in range(few)],
    )


def loaded_filters():
    """Mass behind a leaking seal after a shift, against a differential equation each."""
    count, few = 2000, 5
    conc, area = spread(1e-7, 1e-5, count), RNG.uniform(0.01, 0.03, count)
    seal = Seal(2e-7, 0.7)

    def filters(area_m2):
        return ParticleFilter(area_m2, 85 * L_MIN, 120.0, (1e5, 2e5, 3e5))

    def one(i):
        element = filters(area[i])

        def rate(_, mass):
            resistance = resistance_pa_s_m3(max(mass[0], 0.0), element=element)[1]
            state = solve(60 * L_MIN, resistance_pa_s_m3=resistance, seal=seal)
            return [conc[i] * 30 * L_MIN * (1.0 - state.share)]

        return solve_ivp(rate, (0.0, 28_800.0), [0.0], rtol=1e-8, atol=1e-13).y[0, -1]

    return (
        count,
        lambda: mass_behind_seal_kg(
            28_800.0,
            conc_kg_m3=conc,
            minute_volume_m3_s=30 * L_MIN,
            element=filters(area),
            seal=seal,
        )[:, 1],
        lambda: [one(i) for i in range(few)],
    )


def cartridges():
    """Breakthrough times of many cartridges, against one call each."""
    count, few = 100_000, 500
    conc, mass = spread(10.0, 1000.0, count), RNG.uniform(30.0, 120.0, count)
    at_work = Conditions(flow_l_min=30.0, temperature_k=293.15, relative_humidity=0.5)

    def lives(conc_ppm, mass_g):
        bed = Bed(GENERIC_CARBON, mass_g=mass_g, area_cm2=100.0)
        return breakthrough_min(TOLUENE, bed, conc_ppm=conc_ppm, outlet_ppm=1.0, conditions=at_work)

    return (
        count,
        lambda: lives(conc, mass),
        lambda: [float(lives(conc[i], mass[i])) for i in range(few)],
    )


def timed(run):
    started = time.perf_counter()
    result = run()
    return time.perf_counter() - started, np.asarray(result, dtype=np.float64)


def compare(case):
    count, together, loop = case()
    together()
    whole_s, ours = timed(together)
    loop_s, theirs = timed(loop)
    each_us, loop_us = 1e6 * whole_s / count, 1e6 * loop_s / theirs.size
    apart = np.max(np.abs(ours[: theirs.size] / theirs - 1.0))
    return (
        f"{case.__name__:<16}{count:>9,}{whole_s:>10.3f} s{each_us:>12.2f} us{loop_us:>12.1f} us"
        f"{loop_us / each_us:>9.0f} x{apart:>12.1e}\n"
    )


def main():
    sys.stdout.write(
        f"{'case':<16}{'items':>9}{'all':>12}{'one, ours':>15}{'one, loop':>15}{'ratio':>11}"
        f"{'apart':>12}\n"
    )
    for case in (leaks, whole_aerosols, worst_sizes, loaded_filters, cartridges):
        sys.stdout.write(compare(case))


if __name__ == "__main__":
    main()
