import numpy as np
import pytest

from filtration import (
    CAKE_RESISTANCE,
    CakeResistance,
    DepthStage,
    ParticleFilter,
    k2_endo_per_s,
    k2_from_used_filter_per_s,
    k2_kozeny_carman_per_s,
    mass_collected_kg,
    mass_to_limit_kg,
    pressure_drop_pa,
    resistance_pa_s_m3,
    time_to_limit_s,
    time_to_mass_s,
)

L_MIN = 1.0 / 60_000.0
MG = 1e-6
TEST_FLOW = 85 * L_MIN
MODERATE = 30 * L_MIN


def make_filter(**changed):
    usual = {
        "area_m2": 0.015,
        "test_flow_m3_s": TEST_FLOW,
        "clean_pressure_pa": 120.0,
        "k2_per_s": CAKE_RESISTANCE["fine_dust"].per_s,
    }
    return ParticleFilter(**{**usual, **changed})


def life_of(element, conc=5 * MG, limit=343.2, **changed):
    setting = {"minute_volume_m3_s": MODERATE, "efficiency": 1.0, **changed}
    return time_to_limit_s(conc, element=element, limit_pa=limit, **setting)


def test_mass_is_concentration_times_air_times_what_is_caught():
    mass = mass_collected_kg(
        5 * MG,
        minute_volume_m3_s=MODERATE,
        duration_s=8 * 3600,
        efficiency=0.9,
        leak_share=0.1,
    )
    np.testing.assert_allclose(mass, 72 * MG * 0.81)


def test_time_to_a_mass_inverts_the_mass():
    setting = {"minute_volume_m3_s": MODERATE, "efficiency": 0.95, "leak_share": 0.02}
    mass = mass_collected_kg(3 * MG, duration_s=5000.0, **setting)
    np.testing.assert_allclose(time_to_mass_s(mass, conc_kg_m3=3 * MG, **setting), 5000.0)


@pytest.mark.parametrize(
    ("changed", "named"),
    [({"conc_kg_m3": 0.0}, "mass collected per second"), ({"efficiency": 1.2}, "efficiency")],
    ids=["no dust", "more than all"],
)
def test_a_mass_that_never_comes_or_cannot_be_has_no_time(changed, named):
    setting = {"conc_kg_m3": 5 * MG, "minute_volume_m3_s": MODERATE, **changed}
    with pytest.raises(ValueError, match=f"^{named}: "):
        time_to_mass_s(200 * MG, **setting)


def test_filter_area_enters_squared():
    setting = {"flow_m3_s": TEST_FLOW, "clean_pressure_pa": 0.0, "k2_per_s": 3e5}
    small, large = pressure_drop_pa(100 * MG, area_m2=np.array([0.01, 0.02]), **setting)
    np.testing.assert_allclose(small, 4 * large)


def test_life_comes_as_low_likely_high_and_the_harsh_cake_gives_the_low_one():
    low, likely, high = life_of(make_filter())
    assert low < likely < high
    np.testing.assert_allclose(high / low, 3.0)


def test_the_pressure_meets_the_limit_at_the_end_of_each_life():
    element = make_filter(depth=DepthStage(growth_m2_kg=100.0, clogging_load_kg_m2=4e-3))
    lives = life_of(element)
    masses = mass_collected_kg(
        5 * MG, minute_volume_m3_s=MODERATE, duration_s=lives, efficiency=1.0
    )
    pressures = resistance_pa_s_m3(masses, element=element) * TEST_FLOW
    np.testing.assert_allclose(np.diag(pressures[:, ::-1]), 343.2)


def test_a_limit_inside_the_depth_stage_is_met_before_any_cake():
    element = make_filter(depth=DepthStage(growth_m2_kg=1000.0, clogging_load_kg_m2=0.01))
    masses = mass_to_limit_kg(element, limit_pa=240.0)
    np.testing.assert_allclose(masses, np.log(2.0) / 1000.0 * 0.015)


@pytest.mark.parametrize("depth", [DepthStage(), DepthStage(100.0, 4e-3)], ids=["cake", "depth"])
def test_a_filter_over_its_limit_when_clean_has_no_life(depth):
    assert life_of(make_filter(depth=depth), limit=119.0).tolist() == [0.0, 0.0, 0.0]


def test_filters_and_tasks_broadcast_with_the_life_axis_last():
    element = make_filter(area_m2=np.array([[0.010], [0.015]]), clean_pressure_pa=100.0)
    lives = life_of(element, conc=np.array([1.0, 5.0, 10.0]) * MG)
    assert lives.shape == (2, 3, 3)
    np.testing.assert_allclose(lives[1, 1], life_of(make_filter(clean_pressure_pa=100.0)))


@pytest.mark.parametrize(
    ("k2", "says"),
    [(3e5, "must be low, likely and high"), ([3e5, 1e5, 5e5], "must not fall")],
    ids=["one value", "out of order"],
)
def test_a_cake_must_come_as_a_rising_range(k2, says):
    with pytest.raises(ValueError, match=f"^k2_per_s: .*{says}"):
        make_filter(k2_per_s=k2)


def test_every_starting_value_is_a_rising_range_with_basis_and_mark():
    assert {"coarse_dust", "fine_dust", "fume", "unknown"} <= set(CAKE_RESISTANCE)
    for kind in CAKE_RESISTANCE.values():
        assert kind.per_s == tuple(sorted(kind.per_s))
        assert kind.basis
        assert kind.mark


def test_an_unknown_dust_is_taken_as_harsh_as_the_harshest():
    harshest = max(kind.high_per_s for kind in CAKE_RESISTANCE.values())
    assert CAKE_RESISTANCE["unknown"].high_per_s == harshest


def test_a_falling_cake_resistance_is_refused():
    with pytest.raises(ValueError, match=r"^cake resistance: .* rising$"):
        CakeResistance(2e5, 1e5, 3e5, "basis", "mark")


def test_one_used_filter_gives_back_its_cake():
    setting = {"mass_kg": 80 * MG, "area_m2": 0.015, "flow_m3_s": TEST_FLOW}
    used = pressure_drop_pa(clean_pressure_pa=120.0, k2_per_s=2.4e5, **setting)
    k2 = k2_from_used_filter_per_s(used, clean_pressure_pa=120.0, **setting)
    np.testing.assert_allclose(k2, 2.4e5)


def test_a_used_filter_cannot_resist_less_than_a_new_one():
    with pytest.raises(ValueError, match=r"^pressure_pa less clean_pressure_pa: -20 "):
        k2_from_used_filter_per_s(
            100.0, clean_pressure_pa=120.0, mass_kg=MG, area_m2=0.01, flow_m3_s=1e-3
        )


def test_a_cake_of_one_size_is_the_same_by_both_formulas():
    grain = {"density_kg_m3": 2650.0, "porosity": 0.6, "viscosity_pa_s": 1.8e-5}
    np.testing.assert_allclose(
        k2_endo_per_s(3e-6, gsd=1.0, **grain), k2_kozeny_carman_per_s(3e-6, **grain)
    )
