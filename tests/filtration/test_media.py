import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import minimize_scalar

from filtration import (
    ROOM_AIR,
    SALT_SIZES,
    Layer,
    Lognormal,
    Material,
    Meeting,
    effective_fibre_m,
    efficiency,
    fit_line_charge_c_m,
    mechanisms,
    most_penetrating,
    neutralised_penetration,
    penetration,
    quality_factor_per_pa,
    weighted_penetration,
)
from filtration.fibre import FAMILIES
from filtration.media import pressure_drop_pa

WEB = Layer(solidity=0.05, thickness_m=1e-3, fibre_m=2e-6)
ELECTRET = Layer(solidity=0.08, thickness_m=1.5e-3, fibre_m=6e-6, line_charge_c_m=10e-9)
SPEED = 0.1


def through(layers, d=0.1e-6, **changed):
    return penetration(layers, d, **{"face_velocity_m_s": SPEED, **changed})


def test_layers_multiply_their_penetrations_and_add_their_pressures():
    both = [WEB, ELECTRET]
    np.testing.assert_allclose(through(both), through([WEB]) * through([ELECTRET]))
    drops = [pressure_drop_pa(layers, face_velocity_m_s=SPEED) for layers in ([WEB], [ELECTRET])]
    np.testing.assert_allclose(pressure_drop_pa(both, face_velocity_m_s=SPEED), sum(drops))


def test_more_of_the_same_web_keeps_its_quality():
    one, three = (
        quality_factor_per_pa(
            through([WEB] * count),
            pressure_pa=pressure_drop_pa([WEB] * count, face_velocity_m_s=SPEED),
        )
        for count in (1, 3)
    )
    np.testing.assert_allclose(one, three)


def test_a_medium_has_at_least_one_layer():
    with pytest.raises(ValueError, match=r"^layers: none given"):
        through([])


def test_the_effective_fibre_gives_back_its_pressure_drop():
    fibre = effective_fibre_m(120.0, solidity=0.08, thickness_m=1.5e-3, face_velocity_m_s=SPEED)
    web = Layer(solidity=0.08, thickness_m=1.5e-3, fibre_m=fibre)
    np.testing.assert_allclose(pressure_drop_pa([web], face_velocity_m_s=SPEED), 120.0)


def test_slip_eases_the_flow_round_fine_fibres_only():
    def eased(fibre_m):
        layers = [Layer(0.05, 1e-3, fibre_m)]
        slip, none = (
            pressure_drop_pa(layers, face_velocity_m_s=SPEED, law=law)
            for law in ("kuwabara-slip", "kuwabara")
        )
        return slip / none

    assert eased(0.2e-6) < 0.8
    assert 0.99 < eased(20e-6) < 1.0


@pytest.mark.parametrize("family", list(FAMILIES))
def test_each_family_counts_its_mechanisms_within_0_and_1(family):
    meeting = Meeting(ELECTRET, np.geomspace(5e-9, 3e-6, 50), SPEED)
    shares = mechanisms(meeting, family=family)
    assert set(shares) == set(FAMILIES[family])
    assert all(np.all(share >= 0.0) for share in shares.values())
    together = efficiency(meeting, family=family)
    assert np.all((together >= 0.0) & (together <= 1.0))


def test_unknown_families_and_laws_are_refused():
    with pytest.raises(ValueError, match=r"^family: 'mixed' is not allowed; .* lee-liu, "):
        through([WEB], family="mixed")
    with pytest.raises(ValueError, match=r"^law: 'mixed' is not allowed; .* davies, "):
        pressure_drop_pa([WEB], face_velocity_m_s=SPEED, law="mixed")


def test_a_charged_particle_is_never_caught_less_than_an_uncharged_one():
    d = np.geomspace(10e-9, 3e-6, 80)
    bare, charged = (
        through([ELECTRET], d, material=Material(2165.0, 5.9, charges)) for charges in (0, 3)
    )
    assert np.all(charged <= bare)
    assert np.any(charged < bare)


def test_removing_the_charge_changes_penetration_but_not_resistance():
    bare = Layer(ELECTRET.solidity, ELECTRET.thickness_m, ELECTRET.fibre_m)
    assert through([bare]) > 3 * through([ELECTRET])
    drops = [pressure_drop_pa([layer], face_velocity_m_s=SPEED) for layer in (bare, ELECTRET)]
    assert drops[0] == drops[1]


def test_the_worst_size_is_the_one_a_general_search_finds():
    worst = most_penetrating([WEB], face_velocity_m_s=SPEED)
    found = minimize_scalar(
        lambda log_d: -through([WEB], np.exp(log_d)),
        bounds=(np.log(5e-9), np.log(3e-6)),
        method="bounded",
        options={"xatol": 1e-10},
    )
    assert worst.diameter_m == pytest.approx(np.exp(found.x), rel=1e-4)
    assert worst.penetration == pytest.approx(-found.fun, rel=1e-10)


def test_worst_sizes_of_many_media_come_at_once():
    webs = [Layer(np.array([0.03, 0.05, 0.10]), 1e-3, np.array([[1e-6], [2e-6]]))]
    worst = most_penetrating(webs, face_velocity_m_s=SPEED)
    assert worst.diameter_m.shape == (2, 3)
    alone = most_penetrating([WEB], face_velocity_m_s=SPEED)
    assert worst.diameter_m[1, 1] == pytest.approx(alone.diameter_m)
    assert np.all(worst.penetration >= through(webs, 0.3e-6))


def test_a_whole_aerosol_agrees_with_adaptive_quadrature():
    def by_mass(log_d):
        z = (log_d - np.log(SALT_SIZES.median_m("mass"))) / np.log(1.86)
        return through([WEB], np.exp(log_d)) * np.exp(-0.5 * z**2)

    middle = np.log(SALT_SIZES.median_m("mass"))
    width = np.log(1.86)
    area = quad(by_mass, middle - 9 * width, middle + 9 * width, epsabs=1e-12, limit=200)[0]
    ours = weighted_penetration([WEB], SALT_SIZES, face_velocity_m_s=SPEED)
    assert ours == pytest.approx(area / (width * np.sqrt(2 * np.pi)), rel=1e-5)


def test_media_along_one_axis_and_aerosols_along_another_give_the_whole_table():
    webs = [Layer(np.full((4, 1), 0.05), 1e-3, np.array([[1e-6], [2e-6], [4e-6], [8e-6]]))]
    sizes = Lognormal(np.array([0.05e-6, 0.2e-6, 1e-6]), np.array([1.5, 1.8, 2.2]))
    table = weighted_penetration(webs, sizes, face_velocity_m_s=SPEED)
    assert table.shape == (4, 3)
    one = weighted_penetration([WEB], Lognormal(0.2e-6, 1.8), face_velocity_m_s=SPEED)
    assert table[1, 1] == pytest.approx(float(one))


def test_air_and_material_broadcast_with_the_aerosols():
    sizes = Lognormal(np.array([0.1e-6, 0.3e-6]), 1.6)
    table = weighted_penetration(
        [WEB], sizes, face_velocity_m_s=SPEED, material=Material(np.array([1000.0, 4000.0]))
    )
    assert table.shape == (2,)


def test_a_single_size_weighs_like_itself():
    ours = weighted_penetration([WEB], Lognormal(0.3e-6, 1.0), face_velocity_m_s=SPEED)
    assert ours == pytest.approx(float(through([WEB], 0.3e-6)))


def test_the_line_charge_is_found_back_from_one_penetration():
    charge = fit_line_charge_c_m(
        through([ELECTRET], [0.1e-6, 0.3e-6]),
        layers=[ELECTRET],
        diameter_m=[0.1e-6, 0.3e-6],
        face_velocity_m_s=SPEED,
    )
    np.testing.assert_allclose(charge, 10e-9, rtol=1e-9)


def test_a_penetration_above_the_uncharged_web_needs_no_charge_and_is_refused():
    with pytest.raises(ValueError, match=r"^measured: 0\.9999.* these fibres can only show"):
        fit_line_charge_c_m(0.9999, layers=[ELECTRET], diameter_m=0.1e-6, face_velocity_m_s=SPEED)


def test_warm_air_diffuses_particles_faster():
    cold, warm = (through([WEB], 0.02e-6, air=ROOM_AIR.at(kelvin)) for kelvin in (263.15, 313.15))
    assert warm < cold


def test_a_neutralised_aerosol_passes_less_than_an_uncharged_one():
    d = np.geomspace(20e-9, 1e-6, 30)
    neutral = neutralised_penetration([ELECTRET], d, face_velocity_m_s=SPEED)
    assert neutral.shape == d.shape
    uncharged = through([ELECTRET], d)
    assert np.all(neutral <= uncharged * (1 + 1e-12))
    assert np.all(neutral[:10] < 0.95 * uncharged[:10])


def test_without_charge_on_the_fibres_the_charge_of_the_particles_does_not_count():
    neutral = neutralised_penetration([WEB], 0.1e-6, face_velocity_m_s=SPEED)
    assert neutral == pytest.approx(float(through([WEB], 0.1e-6)))
