"""Clogging behind a leaking seal: the filter takes ever less of the air, the gap ever more.

"Still comfortable to breathe" can mean that the seal has taken over the flow.

>>> from filtration.leak import Seal
>>> element = ParticleFilter(
...     area_m2=0.015, test_flow_m3_s=85 / 60_000, clean_pressure_pa=120.0, k2_per_s=(1e5, 3e5, 5e5)
... )
>>> gap = Seal.from_share(0.01, flow_m3_s=85 / 60_000, resistance_pa_s_m3=120.0 * 60_000 / 85)
>>> mass = mass_behind_seal_kg(
...     8 * 3600.0, conc_kg_m3=1e-5, minute_volume_m3_s=5e-4, element=element, seal=gap
... )
>>> [round(kg * 1e6, 1) for kg in mass.tolist()]
[142.0, 141.3, 140.8]
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from filtration.leak import Seal, solve
from filtration.loading import (
    LIFE_ORDER,
    ParticleFilter,
    mass_to_limit_kg,
    resistance_on_k2_axis,
)
from filtration.require import Floats, plain, require

# Half of each minute is inhalation, at twice the minute volume on average.
INSPIRATORY_DUTY: Final = 0.5
QUADRATURE_NODES: Final = 32
NEWTON_STEPS: Final = 30
NEWTON_DONE: Final = 1e-12


def time_behind_seal_s(
    mass_kg: ArrayLike,
    *,
    conc_kg_m3: ArrayLike,
    minute_volume_m3_s: ArrayLike,
    element: ParticleFilter,
    seal: Seal,
    efficiency: ArrayLike = 1.0,
) -> Floats:
    """Time until the filter holds that mass while a growing share of the air leaks past it, s.

    As the filter clogs the seal takes over some of the flow, so the filter loads ever more slowly.
    The integral of dm / (C Q_filter E) is taken by quadrature, without stepping in time.

    Args:
        mass_kg: kg, 0 or more.
        conc_kg_m3: inhalable or total dust outside, kg/m3, above 0.
        minute_volume_m3_s: air breathed, m3/s, above 0; drawn at twice that during inhalation.
        element: the filter; the answer has its low, likely and high K2 on the trailing axis.
        seal: the gap.
        efficiency: of the filter by mass, above 0 to 1.

    Returns:
        Seconds for low, likely and high K2 in that order (more resistance, more time).

    Source: separable mass balance (computed).
    """
    mass = require("mass_kg", mass_kg, at_least=0.0)[..., np.newaxis]
    intake = _Intake.of(conc_kg_m3, minute_volume_m3_s, efficiency)
    return plain(_time_behind_seal(mass, intake, element=element, seal=seal))


def mass_behind_seal_kg(
    duration_s: ArrayLike,
    *,
    conc_kg_m3: ArrayLike,
    minute_volume_m3_s: ArrayLike,
    element: ParticleFilter,
    seal: Seal,
    efficiency: ArrayLike = 1.0,
) -> Floats:
    """Mass that the filter holds after a time while a growing share of the air leaks past it, kg.

    Args:
        duration_s: s, 0 or more.
        conc_kg_m3: inhalable or total dust outside, kg/m3, above 0.
        minute_volume_m3_s: air breathed, m3/s, above 0.
        element: the filter; the answer has its low, likely and high K2 on the trailing axis.
        seal: the gap.
        efficiency: of the filter by mass, above 0 to 1.

    Source: inverse of `time_behind_seal_s` by Newton; the time is a convex function of the mass.
    """
    target = require("duration_s", duration_s, at_least=0.0)[..., np.newaxis]
    intake = _Intake.of(conc_kg_m3, minute_volume_m3_s, efficiency)
    # With no leak at all the filter holds the most it can; Newton descends from there.
    mass = target * intake.conc * intake.volume * intake.caught * np.ones(len(LIFE_ORDER))
    for _ in range(NEWTON_STEPS):
        late = _time_behind_seal(mass, intake, element=element, seal=seal) - target
        step = late * _rate_behind_seal(mass, intake, element=element, seal=seal)
        mass = np.maximum(mass - step, 0.0)
        if np.all(np.abs(step) <= NEWTON_DONE * mass):
            break
    return plain(mass)


def time_to_limit_behind_seal_s(
    limit_pa: ArrayLike,
    *,
    conc_kg_m3: ArrayLike,
    minute_volume_m3_s: ArrayLike,
    element: ParticleFilter,
    seal: Seal,
    efficiency: ArrayLike = 1.0,
) -> Floats:
    """Time until the pressure meets the limit behind a leaking seal, s, (low, likely, high) life.

    Always longer than `time_to_limit_s`: the gap spares the filter and not the wearer. Schedule by
    the shorter one.

    Args:
        limit_pa: at the element's test flow, Pa, above 0.
        conc_kg_m3: inhalable or total dust outside, kg/m3, above 0.
        minute_volume_m3_s: air breathed, m3/s, above 0.
        element: the filter, with the K2 range.
        seal: the gap.
        efficiency: of the filter by mass, above 0 to 1.

    Source: separable mass balance (computed).
    """
    # Low mass belongs to high K2, and the resistances run from low K2 to high.
    by_k2 = np.asarray(mass_to_limit_kg(element, limit_pa=limit_pa))[..., ::-1]
    intake = _Intake.of(conc_kg_m3, minute_volume_m3_s, efficiency)
    return plain(_time_behind_seal(by_k2, intake, element=element, seal=seal)[..., ::-1])


@dataclass(frozen=True)
class _Intake:
    """What is drawn in, each with the K2 axis already."""

    conc: Floats
    volume: Floats
    caught: Floats

    @classmethod
    def of(
        cls, conc_kg_m3: ArrayLike, minute_volume_m3_s: ArrayLike, efficiency: ArrayLike
    ) -> _Intake:
        """The three checked, with a trailing axis for the range of lives."""
        return cls(
            require("conc_kg_m3", conc_kg_m3, above=0.0)[..., np.newaxis],
            require("minute_volume_m3_s", minute_volume_m3_s, above=0.0)[..., np.newaxis],
            require("efficiency", efficiency, above=0.0, at_most=1.0)[..., np.newaxis],
        )


def _rate_behind_seal(
    mass_kg: Floats, intake: _Intake, *, element: ParticleFilter, seal: Seal
) -> Floats:
    """kg/s into the filter when it holds that mass."""
    state = solve(
        intake.volume / INSPIRATORY_DUTY,
        resistance_pa_s_m3=resistance_on_k2_axis(mass_kg, element),
        seal=Seal(
            leak_k=np.asarray(seal.leak_k)[..., np.newaxis],
            exponent=np.asarray(seal.exponent)[..., np.newaxis],
        ),
    )
    return intake.conc * intake.volume * intake.caught * (1.0 - state.share)


def _time_behind_seal(
    mass_kg: Floats, intake: _Intake, *, element: ParticleFilter, seal: Seal
) -> Floats:
    points, weights = np.polynomial.legendre.leggauss(QUADRATURE_NODES)
    mean_slowness = sum(
        0.5
        * weight
        / _rate_behind_seal(0.5 * (point + 1.0) * mass_kg, intake, element=element, seal=seal)
        for point, weight in zip(points, weights, strict=True)
    )
    return np.asarray(mass_kg * mean_slowness)
