"""Fibrous media: pressure drop, penetration, the most penetrating size, and calibration.

A prediction from first principles is good to a factor of 2 in penetration at best: measure pressure
drop, basis weight and thickness for `effective_fibre_m`, one penetration for `fit_line_charge_c_m`.

>>> web = Layer(solidity=0.05, thickness_m=1e-3, fibre_m=2e-6)
>>> round(float(pressure_drop_pa([web], face_velocity_m_s=0.10)), 1)
327.5
>>> worst = most_penetrating([web], face_velocity_m_s=0.10)
>>> 0.1e-6 < float(worst.diameter_m) < 0.3e-6
True
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from typing import Any, Final, TypeVar

import numpy as np
from numpy.typing import ArrayLike

from filtration.air import ROOM_AIR, Air
from filtration.fibre import FIBRE_SLIP, Layer, Meeting, efficiency, kuwabara_factor
from filtration.particles import BOLTZMANN_J_K, SALT, Lognormal, Material, charge_shares
from filtration.require import Floats, plain, require

SMALLEST_M: Final = 5e-9
LARGEST_M: Final = 3e-6
GRID_POINTS: Final = 60
GOLDEN: Final = (math.sqrt(5.0) - 1.0) / 2.0
GOLDEN_STEPS: Final = 45
CHARGE_RANGE_C_M: Final = (1e-13, 1e-5)
BISECTIONS: Final = 80
Record = TypeVar("Record", Layer, Air, Material)

RESISTANCE_LAWS: Final = ("davies", "kuwabara", "kuwabara-slip")


def pressure_drop_pa(
    layers: Sequence[Layer],
    *,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
    law: str = "davies",
) -> Floats:
    """Pressure drop of layers in a row, Pa.

    Args:
        layers: 1 or more; their fields broadcast.
        face_velocity_m_s: m/s, 0 or more.
        air: the air.
        law: "davies" (real webs, scatter about 30 %), "kuwabara" (parallel fibres across the flow,
            about 40 % above), or "kuwabara-slip" for fibres below about 2 um.

    Valid: solidity 0.006 to 0.3, fibre 1.6 to 80 um for Davies; fibre Reynolds number below 1.
    Source: Davies (1952) Proc Inst Mech Eng 1B:185-198; Kuwabara (1959); slip after Pich in Brown
        (1993) Air Filtration, ch. 3 (memory).
    """
    velocity = require("face_velocity_m_s", face_velocity_m_s, at_least=0.0)
    if law not in RESISTANCE_LAWS:
        known = ", ".join(RESISTANCE_LAWS)
        raise ValueError(f"law: {law!r} is not allowed; it must be one of {known}")
    drag = sum(_drag_per_m2(layer, air, law) for layer in _some(layers))
    return plain(drag * np.asarray(air.viscosity_pa_s) * velocity)


def _some(layers: Sequence[Layer]) -> Sequence[Layer]:
    if not layers:
        raise ValueError("layers: none given; a medium has at least 1 layer")
    return layers


def _drag_per_m2(layer: Layer, air: Air, law: str) -> Floats:
    """Pressure drop over viscosity and velocity, 1/m."""
    alpha = np.asarray(layer.solidity, dtype=np.float64)
    scale = np.asarray(layer.thickness_m) / np.asarray(layer.fibre_m) ** 2
    if law == "davies":
        return np.asarray(scale * 64.0 * alpha**1.5 * (1.0 + 56.0 * alpha**3))
    if law == "kuwabara":
        return np.asarray(scale * 16.0 * alpha / kuwabara_factor(alpha))
    slip = FIBRE_SLIP * 2.0 * np.asarray(air.mean_free_path_m) / np.asarray(layer.fibre_m)
    eased = slip * (-0.5 * np.log(alpha) - 0.25 + 0.25 * alpha**2)
    return np.asarray(scale * 16.0 * alpha * (1.0 + slip) / (kuwabara_factor(alpha) + eased))


def effective_fibre_m(
    pressure_pa: ArrayLike,
    *,
    solidity: ArrayLike,
    thickness_m: ArrayLike,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
) -> Floats:
    """Fibre diameter that explains a measured pressure drop, m: the safe way to model a real web.

    Args:
        pressure_pa: of the clean web, Pa, above 0.
        solidity: basis weight / (thickness x fibre density), 0.001 to 0.3.
        thickness_m: m, above 0.
        face_velocity_m_s: of the measurement, m/s, above 0.
        air: the air.

    Source: Davies (1952) Proc Inst Mech Eng 1B:185-198, inverted (memory).
    """
    pressure = require("pressure_pa", pressure_pa, above=0.0)
    velocity = require("face_velocity_m_s", face_velocity_m_s, above=0.0)
    unit = Layer(solidity=solidity, thickness_m=thickness_m, fibre_m=1.0)
    at_one_metre = _drag_per_m2(unit, air, "davies") * np.asarray(air.viscosity_pa_s) * velocity
    return plain(np.sqrt(at_one_metre / pressure))


def penetration(
    layers: Sequence[Layer],
    diameter_m: ArrayLike,
    *,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
    material: Material = SALT,
    family: str = "lee-liu",
) -> Floats:
    """Share of the particles of a size that passes all layers, 0 to 1.

    Args:
        layers: in a row, 1 or more; their fields broadcast with all other arguments.
        diameter_m: physical diameter, m, above 0.
        face_velocity_m_s: m/s, above 0.
        air: the air.
        material: density, permittivity and charge of the particles.
        family: of single-fibre formulas, "lee-liu", "lee-liu-continuum" or "hinds".

    Source: log-penetration law with (1 - solidity) in the denominator (Lee & Liu; Brown).
    """
    depth: Floats = np.zeros(())
    for layer in _some(layers):
        meeting = Meeting(layer, diameter_m, face_velocity_m_s, air=air, material=material)
        alpha, share = meeting.alpha, efficiency(meeting, family=family)
        swept = alpha * np.asarray(layer.thickness_m) / (math.pi * (1.0 - alpha) * meeting.df)
        depth = depth + 4.0 * swept * share
    return plain(np.exp(-depth))


def neutralised_penetration(
    layers: Sequence[Layer],
    diameter_m: ArrayLike,
    *,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
    material: Material = SALT,
    family: str = "lee-liu",
) -> Floats:
    """Penetration of particles at charge equilibrium, each charge state on its own, 0 to 1.

    A certification aerosol is neutralised, which leaves many particles charged; taking them all as
    uncharged, as `penetration` does by default, errs to the safe side.

    Args:
        layers: in a row, 1 or more; their fields broadcast with all other arguments.
        diameter_m: physical diameter, m, above 0 to 100e-6.
        face_velocity_m_s: m/s, above 0.
        air: the air.
        material: of the particles; its charge is replaced by the equilibrium.
        family: of single-fibre formulas.

    Source: Boltzmann equilibrium (Hinds 1999, eq 15.30, memory) over `penetration`.
    """
    numbers, shares = charge_shares(diameter_m, temperature_k=air.temperature_k)
    velocity = require("face_velocity_m_s", face_velocity_m_s, above=0.0)
    by_charge = penetration(
        [_with_last_axis(layer) for layer in _some(layers)],
        np.asarray(diameter_m, dtype=np.float64)[..., np.newaxis],
        face_velocity_m_s=velocity[..., np.newaxis],
        air=_with_last_axis(air),
        material=replace(_with_last_axis(material), charges=np.abs(numbers)),
        family=family,
    )
    return plain(np.sum(by_charge * shares, axis=-1))


def quality_factor_per_pa(penetration: ArrayLike, *, pressure_pa: ArrayLike) -> Floats:
    """-ln P / dP, 1/Pa; more layers of one medium leave it unchanged.

    Args:
        penetration: above 0 to 1.
        pressure_pa: Pa, above 0.
    """
    share = require("penetration", penetration, above=0.0, at_most=1.0)
    return plain(-np.log(share) / require("pressure_pa", pressure_pa, above=0.0))


def weighted_penetration(
    layers: Sequence[Layer],
    sizes: Lognormal,
    *,
    face_velocity_m_s: ArrayLike,
    by: str = "mass",
    air: Air = ROOM_AIR,
    material: Material = SALT,
    family: str = "lee-liu",
    nodes: int = 41,
) -> Floats:
    """Penetration of a whole aerosol, by number or by mass, 0 to 1.

    All fields of layers, sizes, air and material broadcast, so that media along one axis and
    aerosols along another give the whole table at once.

    Args:
        layers: in a row, 1 or more.
        sizes: by number.
        face_velocity_m_s: m/s, above 0.
        by: "number", "length", "surface" or "mass".
        air: the air.
        material: of the particles.
        family: of single-fibre formulas.
        nodes: Gauss-Hermite points; 41 is good to 1e-7 at GSD 1.86 and to a few parts in a
            thousand where particles reach 0.4 of the fibre and the impaction formula jumps.

    Source: Gauss-Hermite quadrature in ln d (computed).
    """
    diameters, weights = sizes.nodes(by, count=nodes)
    velocity = require("face_velocity_m_s", face_velocity_m_s, above=0.0)
    shares = penetration(
        [_with_last_axis(layer) for layer in _some(layers)],
        diameters,
        face_velocity_m_s=velocity[..., np.newaxis],
        air=_with_last_axis(air),
        material=_with_last_axis(material),
        family=family,
    )
    return plain(np.sum(shares * weights, axis=-1))


def _with_last_axis(record: Record) -> Record:
    """The same with a trailing axis of 1 on each number, to meet an axis of sizes."""
    wider: dict[str, Any] = {
        entry.name: np.asarray(value)[..., np.newaxis]
        for entry in fields(record)
        if not isinstance(value := getattr(record, entry.name), str)
    }
    return replace(record, **wider)


@dataclass(frozen=True)
class WorstSize:
    """The size that passes most easily.

    Attributes:
        diameter_m: m, 5 nm to 3 um.
        penetration: there, 0 to 1.
    """

    diameter_m: Floats
    penetration: Floats


def most_penetrating(
    layers: Sequence[Layer],
    *,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
    material: Material = SALT,
    family: str = "lee-liu",
) -> WorstSize:
    """The most penetrating particle size between 5 nm and 3 um, and the penetration there.

    For an electret it lies near 0.05 um, far below the nominal 0.3 um; with the charge gone it
    moves up and the resistance does not change at all.

    Args:
        layers: in a row, 1 or more.
        face_velocity_m_s: m/s, above 0.
        air: the air.
        material: of the particles.
        family: of single-fibre formulas.

    Source: the best of a 60-point grid in ln d, refined by golden section (computed).
    """
    wide = [_with_last_axis(layer) for layer in _some(layers)]
    velocity = require("face_velocity_m_s", face_velocity_m_s, above=0.0)[..., np.newaxis]
    air, material = _with_last_axis(air), _with_last_axis(material)

    def at(log_d: Floats) -> Floats:
        """Penetration at these logarithms of the diameter."""
        return penetration(
            wide,
            np.exp(log_d),
            face_velocity_m_s=velocity,
            air=air,
            material=material,
            family=family,
        )

    grid = np.linspace(math.log(SMALLEST_M), math.log(LARGEST_M), GRID_POINTS)
    best = np.argmax(at(grid), axis=-1, keepdims=True)
    low = grid[np.maximum(best - 1, 0)]
    high = grid[np.minimum(best + 1, GRID_POINTS - 1)]
    for _ in range(GOLDEN_STEPS):
        left, right = high - GOLDEN * (high - low), low + GOLDEN * (high - low)
        is_left = at(left) >= at(right)
        low, high = np.where(is_left, low, left), np.where(is_left, right, high)
    log_d = 0.5 * (low + high)
    share = at(log_d)
    return WorstSize(plain(np.exp(log_d)[..., 0]), plain(share[..., 0]))


def lee_liu_worst_size_m(
    layer: Layer, *, face_velocity_m_s: ArrayLike, air: Air = ROOM_AIR
) -> Floats:
    """Most penetrating size of an uncharged medium in closed form, m, 0.075 to 1.3 um.

    Args:
        layer: the medium; its charge is ignored.
        face_velocity_m_s: m/s, above 0.
        air: the air.

    Source: Lee & Liu (1980) J Air Pollut Control Assoc 30:377-381 (memory).
    """
    velocity, mobility, b = _lee_liu_terms(layer, face_velocity_m_s, air)
    fibre = np.asarray(layer.fibre_m, dtype=np.float64)
    return plain(0.885 * (mobility / b * fibre**2 / velocity) ** (2.0 / 9.0))


def lee_liu_least_efficiency(
    layer: Layer, *, face_velocity_m_s: ArrayLike, air: Air = ROOM_AIR
) -> Floats:
    """Single-fibre efficiency at `lee_liu_worst_size_m`, 0 to 1.

    Args:
        layer: the medium; its charge is ignored.
        face_velocity_m_s: m/s, above 0.
        air: the air.

    Source: Lee & Liu (1980) J Air Pollut Control Assoc 30:377-381 (memory).
    """
    velocity, mobility, b = _lee_liu_terms(layer, face_velocity_m_s, air)
    fibre = np.asarray(layer.fibre_m, dtype=np.float64)
    return plain(1.44 * (b**5 * mobility**4 / (velocity**4 * fibre**10)) ** (1.0 / 9.0))


def _lee_liu_terms(
    layer: Layer, face_velocity_m_s: ArrayLike, air: Air
) -> tuple[Floats, Floats, Floats]:
    velocity = require("face_velocity_m_s", face_velocity_m_s, above=0.0)
    alpha = np.asarray(layer.solidity, dtype=np.float64)
    thermal = BOLTZMANN_J_K * np.asarray(air.temperature_k) / np.asarray(air.viscosity_pa_s)
    mobility = np.sqrt(np.asarray(air.mean_free_path_m)) * thermal
    return velocity, mobility, (1.0 - alpha) / kuwabara_factor(alpha)


def fit_line_charge_c_m(
    measured: ArrayLike,
    *,
    layers: Sequence[Layer],
    diameter_m: ArrayLike,
    face_velocity_m_s: ArrayLike,
    air: Air = ROOM_AIR,
    material: Material = SALT,
    family: str = "lee-liu",
) -> Floats:
    """The one line charge on all fibres that explains a measured penetration, C/m.

    Args:
        measured: penetration, above 0 to less than 1.
        layers: in a row; their own charge is ignored.
        diameter_m: of the test particles, m, above 0.
        face_velocity_m_s: of the test, m/s, above 0.
        air: the air.
        material: of the test particles.
        family: of single-fibre formulas.

    Raises:
        ValueError: the web without charge lets through less than measured, or no charge suffices.

    Source: bisection in the logarithm of the charge (computed).
    """
    target = require("measured", measured, above=0.0, below=1.0)

    def at(charge: ArrayLike) -> Floats:
        """Penetration with this line charge on every layer."""
        return penetration(
            [replace(layer, line_charge_c_m=charge) for layer in _some(layers)],
            diameter_m,
            face_velocity_m_s=face_velocity_m_s,
            air=air,
            material=material,
            family=family,
        )

    smallest, largest = CHARGE_RANGE_C_M
    most, least = at(0.0), at(largest)
    if not np.all((target <= most) & (target >= least)):
        raise ValueError(
            f"measured: {target} is not allowed; these fibres can only show {np.max(least):.3g} "
            f"(fully charged) to {np.min(most):.3g} (no charge)"
        )
    shape = np.broadcast_shapes(np.shape(most), target.shape)
    low, high = np.full(shape, math.log(smallest)), np.full(shape, math.log(largest))
    for _ in range(BISECTIONS):
        middle = 0.5 * (low + high)
        needs_more = at(np.exp(middle)) > target
        low, high = np.where(needs_more, middle, low), np.where(needs_more, high, middle)
    return plain(np.exp(0.5 * (low + high)))
