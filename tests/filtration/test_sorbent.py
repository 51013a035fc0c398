import numpy as np
import pytest

from filtration import (
    FLOW_WEIGHTED_RATIO,
    GENERIC_CARBON,
    Bed,
    Conditions,
    Spread,
    Vapour,
    affinity_from_molar_volume,
    affinity_from_parachor,
    breakthrough_min,
    capacity_g_g,
    cautions,
    critical_bed_mass_g,
    humidity_factor,
    life_interval,
    mixture_lives,
    saturation_pressure_pa,
    yoon_nelson,
)

TOLUENE = Vapour(
    name="toluene",
    cas="108-88-3",
    molar_mass_g_mol=92.138,
    liquid_density_g_cm3=0.86699,
    affinity=1.1309,
    vapour_pressure_kpa=2.9189,
    boiling_point_c=110.6,
)
ACETONE = Vapour(
    name="acetone",
    cas="67-64-1",
    molar_mass_g_mol=58.079,
    liquid_density_g_cm3=0.79035,
    affinity=0.69508,
    vapour_pressure_kpa=24.662,
    boiling_point_c=56.075,
)
METHANOL = Vapour(
    name="methanol",
    cas="67-56-1",
    molar_mass_g_mol=32.042,
    liquid_density_g_cm3=0.79103,
    affinity=0.4191,
    vapour_pressure_kpa=13.032,
    boiling_point_c=64.482,
)
BED = Bed(GENERIC_CARBON, mass_g=60.0, area_cm2=100.0)
ROOM = {"temperature_k": 293.15, "relative_humidity": 0.5}
AT_WORK = Conditions(flow_l_min=30.0, **ROOM)


def life(*, conc=200.0, outlet=20.0, vapour=TOLUENE, bed=BED, **conditions):
    return breakthrough_min(
        vapour,
        bed,
        conc_ppm=conc,
        outlet_ppm=outlet,
        conditions=Conditions(**{"flow_l_min": 30.0, **ROOM, **conditions}),
    )


def interval(conc=200.0, seed=5, **changed):
    setting = {"outlet_ppm": 20.0, "conditions": AT_WORK, **changed}
    return life_interval([TOLUENE], BED, conc_ppm=conc, rng=np.random.default_rng(seed), **setting)


def test_life_falls_with_concentration_flow_and_humidity():
    assert np.all(np.diff(life(conc=np.array([100.0, 200.0, 400.0]))) < 0.0)
    assert life(flow_l_min=60.0) < life()
    assert life(relative_humidity=0.85) < 0.51 * life(relative_humidity=0.5)


def test_a_tenth_of_the_concentration_lasts_about_five_times_as_long():
    # Rule of thumb (memory); the model and the rule agree within a factor of 1.5.
    ratio = life(conc=100.0, outlet=1.0) / life(conc=1000.0, outlet=10.0)
    assert 5.0 / 1.5 < ratio < 5.0 * 1.5


def test_the_outlet_is_never_taken_above_a_tenth_of_the_inlet():
    assert life(conc=200.0, outlet=150.0) == life(conc=200.0, outlet=20.0)
    assert life(conc=200.0, outlet=2.0) < life(conc=200.0, outlet=20.0)


def test_an_outlet_at_or_above_the_inlet_is_refused():
    with pytest.raises(ValueError, match=r"^outlet_ppm: 200 is not allowed; .* less than conc_ppm"):
        life(conc=200.0, outlet=200.0)


def test_air_beyond_saturation_is_refused_by_name():
    with pytest.raises(ValueError, match=r"^conc_ppm: 40000 .* toluene .* saturation at 28807"):
        life(conc=40_000.0)


def test_a_bed_under_its_critical_mass_lasts_no_time():
    critical = critical_bed_mass_g(
        TOLUENE, BED, conc_ppm=200.0, outlet_ppm=20.0, conditions=AT_WORK
    )
    assert life(bed=Bed(GENERIC_CARBON, mass_g=critical, area_cm2=100.0)) == pytest.approx(0.0)
    assert life(bed=Bed(GENERIC_CARBON, mass_g=0.5 * critical, area_cm2=100.0)) == 0.0


def test_pulsed_breathing_runs_a_little_shorter():
    ratio = life(velocity_ratio=FLOW_WEIGHTED_RATIO) / life()
    assert 0.9 < ratio < 1.0


def test_capacity_approaches_the_filled_pores_near_saturation():
    most = saturation_pressure_pa(TOLUENE, 293.15) / 101_325.0 * 1e6
    held = capacity_g_g(TOLUENE, GENERIC_CARBON, conc_ppm=0.999 * most)
    assert held == pytest.approx(0.45 * 0.86699, rel=1e-3)


def test_saturation_pressure_passes_through_both_known_points():
    assert saturation_pressure_pa(TOLUENE, 293.15) == pytest.approx(2918.9)
    assert saturation_pressure_pa(ACETONE, 273.15 + 56.075) == pytest.approx(101_325.0)


# Toluene at 25 C: 3.79 kPa in handbooks of chemistry (memory).
def test_saturation_pressure_between_the_points_is_close_to_measured():
    assert saturation_pressure_pa(TOLUENE, 298.15) == pytest.approx(3790.0, rel=0.03)


def test_three_roads_to_affinity_agree_for_benzene():
    # Wood (2001) Carbon 39:343-356: each gives 1.00 for benzene; parachor 205.7 (memory).
    assert affinity_from_molar_volume(78.112 / 0.87901) == pytest.approx(1.0, abs=0.005)
    assert affinity_from_parachor(205.7) == pytest.approx(1.0, abs=0.005)


@pytest.mark.parametrize(
    ("humidity", "left"), [(0.0, 1.0), (0.5, 1.0), (0.675, 0.75), (0.85, 0.5), (0.95, 0.357)]
)
def test_humidity_leaves_all_to_50_percent_and_half_at_85(humidity, left):
    assert humidity_factor(humidity) == pytest.approx(left, abs=5e-4)


def test_nobody_gets_a_life_without_saying_how_warm_and_humid_it_is():
    with pytest.raises(TypeError, match=r"temperature_k.*relative_humidity"):
        Conditions(flow_l_min=30.0)


def test_warm_air_shortens_the_life():
    assert life(temperature_k=308.15) < life()


def test_no_life_is_estimated_above_95_percent_humidity():
    with pytest.raises(ValueError, match=r"^relative_humidity: 0\.97 .* 0 to 0\.95$"):
        Conditions(flow_l_min=30.0, temperature_k=293.15, relative_humidity=0.97)


def test_a_mixture_of_one_is_the_vapour_alone():
    lives = mixture_lives([TOLUENE], BED, conc_ppm=[200.0], outlet_ppm=[20.0], conditions=AT_WORK)
    assert lives.tolist() == [life()]


def test_company_shortens_every_life():
    together = mixture_lives(
        [TOLUENE, ACETONE],
        BED,
        conc_ppm=[200.0, 200.0],
        outlet_ppm=[20.0, 20.0],
        conditions=AT_WORK,
    )
    alone = np.array([life(), life(vapour=ACETONE)])
    assert np.all(together < alone)


def test_mixtures_broadcast_over_tasks_with_the_vapour_axis_last():
    conc = np.array([[200.0, 100.0], [50.0, 10.0], [5.0, 400.0]])
    lives = mixture_lives(
        [TOLUENE, ACETONE], BED, conc_ppm=conc, outlet_ppm=[20.0, 25.0], conditions=AT_WORK
    )
    assert lives.shape == (3, 2)


@pytest.mark.parametrize(
    ("vapours", "conc", "says"),
    [([], [1.0], "vapours: none given"), ([TOLUENE, ACETONE], [1.0, 2.0, 3.0], "conc_ppm: 3")],
    ids=["none", "one too many"],
)
def test_a_mixture_must_have_one_concentration_for_each_vapour(vapours, conc, says):
    with pytest.raises(ValueError, match=f"^{says}"):
        mixture_lives(vapours, BED, conc_ppm=conc, outlet_ppm=0.1, conditions=AT_WORK)


def test_two_measured_points_lie_on_their_own_curve():
    curve = yoon_nelson(80.0, 120.0)
    assert curve.time_min([0.1, 0.5]).tolist() == pytest.approx([80.0, 120.0])
    assert curve.time_min(0.01) < 80.0


def test_times_that_do_not_rise_are_no_curve():
    with pytest.raises(ValueError, match=r"^t50_min: .* more than t10_min$"):
        yoon_nelson(120.0, 80.0)


@pytest.mark.parametrize(
    ("vapour", "codes"),
    [
        (TOLUENE, set()),
        (ACETONE, {"single-use"}),
        (METHANOL, {"not-for-carbon", "small-polar", "single-use"}),
    ],
    ids=lambda value: getattr(value, "name", ""),
)
def test_difficult_vapours_are_flagged(vapour, codes):
    assert {caution.code for caution in cautions(vapour)} == codes


def test_the_interval_holds_the_plain_life_and_is_ordered():
    found = interval()
    assert found.low_min < found.median_min < found.high_min
    assert found.low_min < life() < found.high_min
    assert 0.85 < found.median_min / life() < 1.15


def test_the_same_draws_give_the_same_interval():
    assert interval(seed=11) == interval(seed=11)


def test_a_wide_posterior_widens_the_interval_and_is_named():
    draws = 200.0 * np.exp(np.random.default_rng(3).normal(0.0, 1.0, (2000, 1)))
    found = interval(conc=draws)
    assert found.widest == "concentration"
    assert found.high_min / found.low_min > interval().high_min / interval().low_min


def test_a_stated_carbon_narrows_the_interval():
    stated = Bed(
        carbon=GENERIC_CARBON.__class__(0.45, 18.0, 0.44, 0.11), mass_g=60.0, area_cm2=100.0
    )
    ours = life_interval(
        [TOLUENE],
        stated,
        conc_ppm=200.0,
        outlet_ppm=20.0,
        conditions=AT_WORK,
        rng=np.random.default_rng(5),
    )
    assumed = interval()
    assert ours.high_min / ours.low_min < assumed.high_min / assumed.low_min


def test_without_any_spread_the_interval_is_the_life():
    certain = Spread(0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0, 1.0)
    found = interval(spread=certain)
    assert found.low_min == pytest.approx(float(life()))
    assert found.high_min == pytest.approx(float(life()))
    assert set(found.sensitivity.values()) == {0.0}


@pytest.mark.parametrize(
    ("changed", "says"),
    [
        ({"draws": 10}, "draws: 10 is not allowed; it must be 200 or more"),
        ({"conc": np.full((300, 1), 200.0)}, "conc_ppm: 300 draws; it must be 2000"),
    ],
    ids=["too few", "other length"],
)
def test_draws_must_be_many_and_alike(changed, says):
    with pytest.raises(ValueError, match=f"^{says}"):
        interval(**changed)


def test_the_interval_carries_the_cautions_of_its_vapours():
    found = life_interval(
        [TOLUENE, METHANOL],
        BED,
        conc_ppm=[50.0, 50.0],
        outlet_ppm=[5.0, 5.0],
        conditions=AT_WORK,
        rng=np.random.default_rng(1),
    )
    assert {caution.code for caution in found.cautions} >= {"not-for-carbon", "small-polar"}
