import numpy as np
import pytest

from filtration import electret_penetration, electret_worst, mechanical_penetration

MEDIUM = {"discharged_penetration": 0.30, "growth_m2_kg": 50.0, "decay_kg_m2": 4e-3}


def test_a_mechanical_medium_improves_under_dust():
    shares = mechanical_penetration([0.0, 0.01, 0.02], clean_penetration=0.05, growth_m2_kg=50.0)
    assert shares[0] == pytest.approx(0.05)
    assert np.all(np.diff(shares) < 0.0)


def test_an_electret_is_new_at_no_load_and_worst_at_its_peak():
    worst = electret_worst(0.01, **MEDIUM)
    loads = np.linspace(0.0, 0.05, 2001)
    shares = electret_penetration(loads, clean_penetration=0.01, **MEDIUM)
    assert shares[0] == pytest.approx(0.01)
    assert shares.max() == pytest.approx(float(worst.penetration), rel=1e-6)
    assert loads[shares.argmax()] == pytest.approx(float(worst.load_kg_m2), abs=5e-5)


def test_oil_only_ever_raises_the_penetration():
    worst = electret_worst(0.01, **{**MEDIUM, "growth_m2_kg": 0.0})
    assert np.isposinf(worst.load_kg_m2)
    assert worst.penetration == pytest.approx(0.30)


def test_a_medium_that_never_held_charge_is_worst_when_new():
    worst = electret_worst(0.30, **MEDIUM)
    assert worst.load_kg_m2 == 0.0
    assert worst.penetration == pytest.approx(0.30)


def test_a_new_medium_cannot_let_through_more_than_the_discharged_one():
    with pytest.raises(ValueError, match=r"^clean_penetration: 0\.4 is not allowed"):
        electret_worst(0.40, **MEDIUM)
