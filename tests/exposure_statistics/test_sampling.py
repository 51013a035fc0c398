import numpy as np
import pytest

from exposure.statistics.sampling import air_volume, concentration, size_fraction, twa
from exposure.statistics.units import (
    looks_like_a_slip,
    mg_m3_to_ppm,
    molar_volume_l,
    ppm_at_conditions,
    ppm_to_mg_m3,
)
from tests.published.check_rows import read_commented


def test_air_is_the_mean_flow_times_the_minutes():
    drawn = air_volume(2.0, 1.8, minutes=100.0)
    np.testing.assert_allclose([drawn.litres, drawn.drift], [190.0, 0.2 / 1.9])


def test_a_flow_of_zero_before_sampling_is_refused():
    with pytest.raises(
        ValueError, match=r"^flow_before_l_min: 0 is not allowed; it must be above 0"
    ):
        air_volume(0.0, 2.0, minutes=100.0)


def test_published_samples_give_their_printed_concentrations():
    # Boss and Day, Air Sampling and Industrial Hygiene Engineering, chapter 4 (carbaryl), and
    # OSHA TED 1.15 chapter 1 Appendix I (respirable dust, printed with one decimal) (verified).
    lines = [
        line for line in read_commented("datasets/agency_sampling_examples.csv") if line["mass_mg"]
    ]
    mass, litres, printed = (
        np.array([float(line[key]) for line in lines]) for key in ("mass_mg", "litres", "conc")
    )
    ours = concentration(mass, [], litres=litres, lod_mass_mg=np.nan)
    np.testing.assert_allclose(ours.value_mg_m3, printed, atol=0.05)
    assert not ours.is_censored.any()


def test_a_mass_at_or_below_its_blank_is_below_detection_and_the_raw_figure_is_kept():
    found = concentration([0.02, 0.01], [0.02, 0.02], litres=500.0, lod_mass_mg=0.005)
    assert found.is_censored.all()
    np.testing.assert_allclose(found.value_mg_m3, 0.01)
    np.testing.assert_allclose(found.raw_mg_m3, [0.0, -0.02])


def test_without_a_detection_limit_nothing_found_is_unknown_not_zero():
    found = concentration(0.0, [], litres=500.0, lod_mass_mg=np.nan)
    assert np.isnan(found.value_mg_m3)


def test_a_short_sample_has_a_higher_detection_limit():
    found = concentration([0.0, 0.0], [], litres=[30.0, 960.0], lod_mass_mg=0.003)
    np.testing.assert_allclose(found.lod_mg_m3, [0.1, 0.003125])


def test_recovery_raises_result_and_limit_alike():
    full, half = (
        concentration(0.1, [], litres=100.0, lod_mass_mg=0.01, recovery=r) for r in (1.0, 0.5)
    )
    np.testing.assert_allclose(half.value_mg_m3, 2.0 * full.value_mg_m3)
    np.testing.assert_allclose(half.lod_mg_m3, 2.0 * full.lod_mg_m3)


def test_a_short_shift_is_still_divided_by_eight_hours():
    np.testing.assert_allclose(twa([10.0], [240.0]).value, 5.0)


@pytest.mark.parametrize(
    ("rule", "expected"),
    [("zero", (6.0, 6.0, 6.0)), ("same", (8.0, 8.0, 8.0)), ("unknown", (8.5, 6.0, 8.5))],
)
def test_unsampled_time_counts_as_declared(rule, expected):
    found = twa([10.0, 6.0], [180.0, 180.0], gap_minutes=120.0, gap_rule=rule)
    np.testing.assert_allclose((found.value, found.low, found.high), expected)
    assert found.sampled_fraction == 0.75


def test_a_measured_gap_needs_its_value():
    found = twa([10.0], [240.0], gap_minutes=240.0, gap_rule="value", gap_value=2.0)
    assert found.value == 6.0
    with pytest.raises(ValueError, match=r"^gap_value: nan is not allowed; it must be at least 0"):
        twa([10.0], [240.0], gap_minutes=240.0, gap_rule="value")


def test_more_than_a_day_is_refused():
    with pytest.raises(ValueError, match=r"^minutes, all together: 1500 is not allowed"):
        twa([1.0], [1400.0], gap_minutes=100.0)


def test_no_sample_is_refused():
    with pytest.raises(ValueError, match=r"^concentrations: none given"):
        twa([], [], gap_minutes=480.0)


def test_the_fractions_lie_inside_each_other():
    d = np.linspace(0.0, 100.0, 201)
    inhalable, thoracic, respirable = (
        size_fraction(d, kind) for kind in ("inhalable", "thoracic", "respirable")
    )
    assert (inhalable >= thoracic).all()
    assert (thoracic >= respirable).all()
    assert inhalable[0] == thoracic[0] == respirable[0] == 1.0


def test_an_unknown_fraction_is_refused():
    with pytest.raises(ValueError, match=r"^kind: 'total' is not allowed; it must be one of inhal"):
        size_fraction(4.0, "total")


def test_molar_volumes_equal_the_printed_table():
    # NIOSH Manual of Analytical Methods, Appendix A (15 Aug 1994), all 24 cells (verified).
    lines = read_commented("datasets/nmam_molar_volume.csv")
    t, p, printed = (
        np.array([float(line[key]) for line in lines]) for key in ("t_c", "p_mmhg", "vm_l_per_mol")
    )
    # One cell is off by 0.01 in print.
    np.testing.assert_allclose(molar_volume_l(t, p), printed, atol=0.0151)


def test_ppm_and_mass_come_back_to_each_other():
    np.testing.assert_allclose(mg_m3_to_ppm(ppm_to_mg_m3(50.0, 92.14), 92.14), 50.0)


def test_at_the_conditions_of_limits_nothing_is_corrected():
    same = ppm_at_conditions(376.8, 92.14, t_c=25.0, p_mmhg=760.0)
    np.testing.assert_allclose(same, mg_m3_to_ppm(376.8, 92.14))


def test_thin_air_hides_ppm():
    high = ppm_at_conditions(100.0, 92.14, t_c=25.0, p_mmhg=600.0)
    assert high > mg_m3_to_ppm(100.0, 92.14)


def test_a_result_off_by_the_factor_of_a_unit_looks_like_a_slip():
    found = looks_like_a_slip([1000.0, 1.0, 0.001, 3.77, 30.0], 1.0, molar_mass_g_mol=92.14)
    assert found.tolist() == [True, False, True, True, False]
