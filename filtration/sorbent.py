"""Vapour cartridges: how sure a life is. Everything about sorbents can be imported from here.

An estimate is a planning figure. It never replaces the maker's data, the written change schedule
that the rule demands, or the judgement of a qualified hygienist. Smell is never the signal.

>>> toluene = Vapour(
...     name="toluene", molar_mass_g_mol=92.138, liquid_density_g_cm3=0.867, affinity=1.131,
...     vapour_pressure_kpa=2.919, boiling_point_c=110.6,
... )
>>> life = life_interval(
...     [toluene], Bed(GENERIC_CARBON, mass_g=60.0, area_cm2=100.0), conc_ppm=200.0,
...     outlet_ppm=20.0, rng=np.random.default_rng(7),
...     conditions=Conditions(flow_l_min=30.0, temperature_k=293.15, relative_humidity=0.5),
... )
>>> life.low_min < life.median_min < life.high_min
True
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from filtration.breakthrough import (
    Inlets,
    YoonNelson,
    breakthrough_min,
    critical_bed_mass_g,
    lives_min,
    mixture_lives,
    per_vapour,
    yoon_nelson,
)
from filtration.carbon import (
    GENERIC_CARBON,
    NOT_FOR_CARBON,
    Bed,
    Carbon,
    Caution,
    Conditions,
    Vapour,
    affinity,
    affinity_from_molar_volume,
    affinity_from_parachor,
    capacity_g_g,
    cautions,
    humidity_factor,
    polarisability_cm3_mol,
    rate_coefficient_per_min,
    saturation_pressure_pa,
)
from filtration.require import Floats, require

__all__ = [
    "GENERIC_CARBON",
    "NOT_FOR_CARBON",
    "Bed",
    "Carbon",
    "Caution",
    "Conditions",
    "LifeInterval",
    "Spread",
    "Vapour",
    "YoonNelson",
    "affinity",
    "affinity_from_molar_volume",
    "affinity_from_parachor",
    "breakthrough_min",
    "capacity_g_g",
    "cautions",
    "critical_bed_mass_g",
    "humidity_factor",
    "life_interval",
    "mixture_lives",
    "polarisability_cm3_mol",
    "rate_coefficient_per_min",
    "saturation_pressure_pa",
    "yoon_nelson",
]

FEWEST_DRAWS: Final = 200


@dataclass(frozen=True)
class Spread:
    """How unsure each input of a life is, as a coefficient of variation (share of the value).

    Attributes:
        micropore: of the micropore volume.
        energy: of the characteristic energy.
        mass: of the carbon in the cartridges.
        rate: of the rate coefficient.
        flow: of the minute volume within its class of work (assumed).
        humidity: of the capacity that humidity leaves (assumed).
        model_gsd: geometric standard deviation of the model's own error.
        assumed_carbon: factor on the carbon's spreads where no maker stated them (assumed).

    Source: planning values from memory; published agreement within a factor of 1.5 to 2.
    """

    micropore: float = 0.10
    energy: float = 0.07
    mass: float = 0.05
    rate: float = 0.30
    flow: float = 0.20
    humidity: float = 0.10
    model_gsd: float = 1.25
    assumed_carbon: float = 1.5

    def __post_init__(self) -> None:
        for name in ("micropore", "energy", "mass", "rate", "flow", "humidity"):
            require(name, getattr(self, name), at_least=0.0, at_most=1.0)
        require("model_gsd", self.model_gsd, at_least=1.0, at_most=3.0)
        require("assumed_carbon", self.assumed_carbon, at_least=1.0, at_most=3.0)


USUAL_SPREAD: Final = Spread()


@dataclass(frozen=True)
class LifeInterval:
    """A life with its 5th to 95th percentile, min. A schedule uses `low_min`.

    Attributes:
        low_min: 5th percentile.
        median_min: median.
        high_min: 95th percentile.
        sensitivity: squared rank correlation of each input with the life, 0 to 1.
        cautions: what the minutes do not say.
    """

    low_min: float
    median_min: float
    high_min: float
    sensitivity: Mapping[str, float]
    cautions: tuple[Caution, ...] = field(default=())

    @property
    def widest(self) -> str:
        """The input that widens the interval most."""
        return max(self.sensitivity, key=lambda name: self.sensitivity[name])


def life_interval(
    vapours: Sequence[Vapour],
    bed: Bed,
    *,
    conc_ppm: ArrayLike,
    outlet_ppm: ArrayLike,
    conditions: Conditions,
    rng: np.random.Generator,
    draws: int = 2000,
    spread: Spread = USUAL_SPREAD,
) -> LifeInterval:
    """Life of a cartridge against one vapour or a mixture, as an interval.

    The carbon, the bed, the rate, the flow, the humidity and the model's own error are drawn; the
    concentration too if it comes as draws. Air drawn beyond saturation counts as saturated.

    Args:
        vapours: n vapours, 1 or more.
        bed: all cartridges that share the flow; plain numbers.
        conc_ppm: inlets, ppm, above 0, shape (n,) or, as draws of a posterior, (draws, n).
        outlet_ppm: what may be breathed of each, ppm, above 0, shape (n,).
        conditions: flow, temperature, humidity and pressure; plain numbers.
        rng: source of the draws.
        draws: 200 or more.
        spread: how unsure the inputs are.

    Raises:
        ValueError: an argument out of range, or a posterior of another length than `draws`.

    Source: Monte Carlo over `breakthrough_min` and `mixture_lives` (computed).
    """
    if draws < FEWEST_DRAWS:
        raise ValueError(f"draws: {draws} is not allowed; it must be {FEWEST_DRAWS} or more")
    conc = per_vapour("conc_ppm", conc_ppm, len(vapours))
    outlet = per_vapour("outlet_ppm", outlet_ppm, len(vapours))
    if conc.ndim > 1 and conc.shape[0] != draws:
        raise ValueError(f"conc_ppm: {conc.shape[0]} draws; it must be {draws}")
    factors = _drawn_factors(rng, draws, spread=spread, is_assumed=bed.carbon.is_assumed)
    lives = _drawn_lives(vapours, bed, Inlets(conc, outlet, conditions), factors=factors)
    if conc.ndim > 1:
        factors = {**factors, "concentration": np.sum(conc, axis=-1)}
    low, median, high = np.quantile(lives, [0.05, 0.5, 0.95])
    return LifeInterval(
        low_min=float(low),
        median_min=float(median),
        high_min=float(high),
        sensitivity={name: _rank_r2(drawn, lives) for name, drawn in factors.items()},
        cautions=tuple(caution for vapour in vapours for caution in cautions(vapour)),
    )


def _drawn_factors(
    rng: np.random.Generator, draws: int, *, spread: Spread, is_assumed: bool
) -> dict[str, Floats]:
    """Lognormal factors with median 1 on each input."""
    widening = spread.assumed_carbon if is_assumed else 1.0
    variation = {
        "micropore volume": spread.micropore * widening,
        "characteristic energy": spread.energy * widening,
        "carbon mass": spread.mass * widening,
        "rate coefficient": spread.rate,
        "minute volume": spread.flow,
        "humidity": spread.humidity,
    }
    log_sds = {name: np.sqrt(np.log1p(cv**2)) for name, cv in variation.items()}
    log_sds["model error"] = np.log(spread.model_gsd)
    return {name: np.exp(sd * rng.standard_normal(draws)) for name, sd in log_sds.items()}


def _drawn_lives(
    vapours: Sequence[Vapour], bed: Bed, inlets: Inlets, *, factors: Mapping[str, Floats]
) -> Floats:
    """The shortest life of each draw, min."""
    conditions = inlets.conditions
    carbon = bed.carbon
    drawn_bed = Bed(
        carbon=replace(
            carbon,
            micropore_cm3_g=np.clip(
                np.asarray(carbon.micropore_cm3_g) * factors["micropore volume"], 0.1, 1.5
            ),
            energy_kj_mol=np.clip(
                np.asarray(carbon.energy_kj_mol) * factors["characteristic energy"], 5.0, 40.0
            ),
        ),
        mass_g=np.asarray(bed.mass_g) * factors["carbon mass"],
        area_cm2=bed.area_cm2,
    )
    drawn = replace(
        conditions, flow_l_min=np.asarray(conditions.flow_l_min) * factors["minute volume"]
    )
    dry_share = humidity_factor(conditions.relative_humidity)
    # Dry air takes nothing away, so its factor is certain.
    humid = np.where(dry_share < 1.0, np.minimum(dry_share * factors["humidity"], 1.0), 1.0)
    lives = lives_min(
        vapours,
        drawn_bed,
        replace(inlets, conditions=drawn),
        humid=humid,
        rate_factor=factors["rate coefficient"],
    )
    return np.asarray(np.min(lives, axis=-1) * factors["model error"])


def _rank_r2(first: Floats, second: Floats) -> float:
    """Squared rank correlation; 0 where one of them does not vary."""
    if np.ptp(first) == 0.0 or np.ptp(second) == 0.0:
        return 0.0
    ranks = np.argsort(np.argsort(np.stack([first, second]), axis=-1), axis=-1)
    correlation: Floats = np.asarray(np.corrcoef(ranks))
    return float(correlation[0, 1] ** 2)
