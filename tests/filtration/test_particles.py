import numpy as np
import pytest
from scipy.integrate import quad

from filtration import (
    HANDBOOK_AIR,
    ROOM_AIR,
    Air,
    Lognormal,
    aerodynamic_diameter_m,
    charge_shares,
    settling_velocity_m_s,
    size_fraction,
    slip_correction,
)
from filtration.air import density_kg_m3, mean_free_path_m, viscosity_pa_s
from filtration.particles import SLIP_LAWS

SALT = Lognormal(cmd_m=75e-9, gsd=1.86)


def test_slip_laws_agree_within_3_5_percent_above_20_nm():
    d = np.geomspace(20e-9, 10e-6, 200)
    # Each with the mean free path it was fitted with, at 20 C.
    paths = {"davies1945": 66.4e-9, "hinds1999": 66e-9}
    slips = [
        slip_correction(d, mean_free_path_m=paths.get(law, 66.4e-9), law=law) for law in SLIP_LAWS
    ]
    assert np.max(np.max(slips, axis=0) / np.min(slips, axis=0)) < 1.035


@pytest.mark.parametrize(
    "call",
    [
        lambda: slip_correction(1e-6, mean_free_path_m=66e-9, law="none"),
        lambda: viscosity_pa_s(293.0, law="none"),
        lambda: size_fraction(1.0, "none"),
        lambda: SALT.median_m("none"),
    ],
    ids=["slip", "viscosity", "fraction", "weighting"],
)
def test_an_unknown_name_is_refused_with_the_known_ones(call):
    with pytest.raises(ValueError, match=r"^\w+: 'none' is not allowed; it must be one of "):
        call()


def test_humid_air_is_lighter_and_thin_air_has_a_longer_path():
    dry, humid = (density_kg_m3(303.15, relative_humidity=rh) for rh in (0.0, 1.0))
    assert humid / dry == pytest.approx(0.984, abs=0.001)
    ratio = mean_free_path_m(293.15, pressure_pa=8e4) / mean_free_path_m(293.15)
    assert ratio == pytest.approx(1.2666, abs=1e-4)


def test_air_takes_whole_ranges_of_temperature():
    assert Air.at(np.linspace(260.0, 320.0, 7)).viscosity_pa_s.shape == (7,)


def test_small_particles_settle_as_stokes_says_and_large_ones_slower():
    small, large = settling_velocity_m_s(
        np.array([1e-6, 100e-6]), density_kg_m3=1000.0, air=HANDBOOK_AIR
    )
    assert small == pytest.approx(3.48e-5, rel=3e-3)
    assert large < 0.30


def test_a_stone_is_beyond_the_drag_law():
    with pytest.raises(ValueError, match=r"^particle Reynolds number: .* 1000 or less$"):
        settling_velocity_m_s(0.01, density_kg_m3=3000.0, air=ROOM_AIR)


def test_a_unit_density_sphere_is_its_own_aerodynamic_diameter():
    d = np.geomspace(10e-9, 50e-6, 20)
    ours = aerodynamic_diameter_m(d, density_kg_m3=1000.0, air=ROOM_AIR)
    np.testing.assert_allclose(ours, d, rtol=1e-12)


def test_the_fractions_nest_and_end_at_100_um():
    d = np.linspace(0.0, 100.0, 201)
    inhalable, thoracic, respirable = (
        size_fraction(d, kind) for kind in ("inhalable", "thoracic", "respirable")
    )
    assert np.all(inhalable >= thoracic)
    assert np.all(thoracic >= respirable)
    with pytest.raises(ValueError, match=r"^aerodynamic_um: 101 .* 0 to 100$"):
        size_fraction(101.0, "inhalable")


def test_charges_sum_to_one_and_are_symmetric():
    numbers, shares = charge_shares(np.array([0.01e-6, 1e-6]))
    assert shares.shape == (2, numbers.size)
    np.testing.assert_allclose(shares.sum(axis=-1), 1.0)
    np.testing.assert_allclose(shares, shares[:, ::-1])


def test_the_mass_median_turns_back_into_the_count_median():
    found = Lognormal.from_mass_median(SALT.median_m("mass"), gsd=1.86)
    assert found.cmd_m == pytest.approx(75e-9)


def test_the_named_diameters_rank_as_hatch_and_choate_have_them():
    named = [
        SALT.mode_m(),
        SALT.median_m("number"),
        SALT.average_diameter_m(1),
        SALT.average_diameter_m(3),
        SALT.sauter_m(),
        SALT.median_m("mass"),
    ]
    assert named == sorted(named)


def test_quantile_and_share_invert_each_other():
    p = np.array([0.05, 0.5, 0.95])
    np.testing.assert_allclose(SALT.share_below(SALT.quantile_m(p, by="mass"), by="mass"), p)


def test_nodes_integrate_a_moment_exactly():
    d, weights = SALT.nodes("number")
    third = np.sum(weights * d**3)
    assert third ** (1 / 3) == pytest.approx(float(SALT.average_diameter_m(3)), rel=1e-9)


def test_a_weighting_is_the_normalised_moment():
    def of_mass(log_d, power):
        z = (log_d - np.log(75e-9)) / np.log(1.86)
        return np.exp(power * (log_d - np.log(75e-9)) - 0.5 * z**2)

    ends = (np.log(1e-9), np.log(1e-5))
    below = (ends[0], np.log(100e-9))
    share = quad(of_mass, *below, args=(3,))[0] / quad(of_mass, *ends, args=(3,))[0]
    assert SALT.share_below(100e-9, by="mass") == pytest.approx(share, rel=1e-6)
