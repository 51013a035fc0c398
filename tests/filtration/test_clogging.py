import numpy as np
from scipy.integrate import solve_ivp

from filtration import (
    CAKE_RESISTANCE,
    ParticleFilter,
    Seal,
    mass_behind_seal_kg,
    resistance_pa_s_m3,
    solve,
    time_behind_seal_s,
    time_to_limit_behind_seal_s,
    time_to_limit_s,
)

L_MIN = 1.0 / 60_000.0
MG = 1e-6
MODERATE = 30 * L_MIN


def make_filter(**changed):
    usual = {
        "area_m2": 0.015,
        "test_flow_m3_s": 85 * L_MIN,
        "clean_pressure_pa": 120.0,
        "k2_per_s": CAKE_RESISTANCE["fine_dust"].per_s,
    }
    return ParticleFilter(**{**usual, **changed})


def test_a_tight_seal_loads_like_no_leak_at_all():
    element = make_filter()
    masses = mass_behind_seal_kg(
        8 * 3600.0,
        conc_kg_m3=10 * MG,
        minute_volume_m3_s=MODERATE,
        element=element,
        seal=Seal(0.0),
    )
    np.testing.assert_allclose(masses, 144 * MG)


def test_mass_and_time_behind_a_leaking_seal_invert_each_other():
    setting = {
        "conc_kg_m3": 10 * MG,
        "minute_volume_m3_s": MODERATE,
        "element": make_filter(),
        "seal": Seal(1e-6, 0.6),
    }
    times = time_behind_seal_s(60 * MG, **setting)
    masses = [mass_behind_seal_kg(time, **setting)[index] for index, time in enumerate(times)]
    np.testing.assert_allclose(masses, 60 * MG, rtol=1e-9)


def test_loading_behind_a_seal_agrees_with_stepping_in_time():
    element, seal = make_filter(), Seal(1e-6, 0.7)

    def rate(_, mass):
        resistance = resistance_pa_s_m3(mass[0], element=element)[2]
        share = solve(2 * MODERATE, resistance_pa_s_m3=resistance, seal=seal).share
        return [10 * MG * MODERATE * (1.0 - share)]

    stepped = solve_ivp(rate, (0.0, 8 * 3600.0), [0.0], rtol=1e-10, atol=1e-14).y[0, -1]
    ours = mass_behind_seal_kg(
        8 * 3600.0, conc_kg_m3=10 * MG, minute_volume_m3_s=MODERATE, element=element, seal=seal
    )[2]
    np.testing.assert_allclose(ours, stepped, rtol=1e-7)


def test_the_gap_spares_the_filter_so_its_limit_comes_later():
    setting = {"minute_volume_m3_s": MODERATE, "element": make_filter()}
    closed = time_to_limit_s(5 * MG, limit_pa=343.2, **setting)
    tight, leaking = (
        time_to_limit_behind_seal_s(343.2, conc_kg_m3=5 * MG, seal=seal, **setting)
        for seal in (Seal(0.0), Seal(1e-6, 0.7))
    )
    np.testing.assert_allclose(tight, closed)
    assert np.all(leaking > closed)
    assert np.all(np.diff(leaking) > 0.0)


def test_filters_and_seals_broadcast_with_the_k2_axis_last():
    seal = Seal(np.array([[0.0], [1e-6]]), 0.7)
    masses = mass_behind_seal_kg(
        8 * 3600.0,
        conc_kg_m3=np.array([1.0, 5.0, 10.0, 20.0]) * MG,
        minute_volume_m3_s=MODERATE,
        element=make_filter(),
        seal=seal,
    )
    assert masses.shape == (2, 4, 3)
