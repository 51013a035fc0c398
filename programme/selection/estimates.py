"""Exposure statistics of every group of many tasks in one call."""

import math
from collections import Counter
from dataclasses import dataclass, field
from datetime import date
from functools import cached_property

import numpy as np

from exposure.statistics.decisions import GroupFigures, describe
from exposure.statistics.pack import pack
from exposure.units import site_molar_volume_l_mol
from programme.roster.months import months_after
from programme.selection.facts import AgentFact, SampleFact, TaskFacts
from programme.selection.limits import Binding, bindings, in_unit

CANNOT = "which cannot be converted"
SPANS = {"TWA": ("full", "partial"), "STEL": ("short",), "C": ("ceiling", "short")}


@dataclass(frozen=True, slots=True)
class Estimate:
    """Figures of one group (task, agent, averaging kind) beside its binding limit.

    Concentrations are in `unit`; a figure that does not exist is NaN. `left_out` counts the
    results that take no part, by reason.
    """

    kind: str
    binding: Binding
    unit: str
    n: int
    n_censored: int
    gm: float
    gsd: float
    x95: float
    x95_upper70: float
    x95_upper95: float
    highest: float
    governing: float
    ratio: float
    ratio95: float
    basis: str
    flags: tuple[str, ...]
    newest: date | None

    @property
    def is_known(self) -> bool:
        return math.isfinite(self.ratio) and self.n > 0


@dataclass(frozen=True)
class AgentEstimates:
    """One agent of a task: its limits, its groups, and the results that did not count."""

    fact: AgentFact
    bindings: dict[str, Binding]
    estimates: dict[str, Estimate]
    left_out: Counter[str]
    unit: str
    values: dict[str, list[tuple[float, bool]]]
    days: dict[str, list[date]] = field(default_factory=dict)

    @cached_property
    def governing(self) -> Estimate | None:
        """The group with the largest hazard ratio.

        None where the shift's average has none, or a group with results allows no estimate: the
        ratio that is known may be the smaller one.
        """
        needed = [one for kind, one in self.estimates.items() if one.n or kind == "TWA"]
        if not needed or not all(one.is_known for one in needed):
            return None
        return max(needed, key=lambda one: one.ratio)


def _why_left_out(sample: SampleFact, facts: TaskFacts) -> str:
    if sample.where == "area":
        return "area"
    if sample.where == "inside":
        return "inside the facepiece"
    if facts.task.changed_on and sample.sampled_on < facts.task.changed_on:
        return f"before the change of {facts.task.changed_on}"
    if facts.on >= months_after(sample.sampled_on, facts.site.sample_age_months):
        return f"older than {facts.site.sample_age_months} months"
    return ""


def _usable(facts: TaskFacts, fact: AgentFact, unit: str) -> tuple[list, Counter[str]]:
    volume = site_molar_volume_l_mol(facts.site)
    left_out: Counter[str] = Counter()
    usable = []
    for sample in fact.samples:
        reason = _why_left_out(sample, facts)
        value, lod = sample.value, sample.lod or math.nan
        if not reason and sample.unit != unit:
            value = in_unit(value, sample.unit, fact, target=unit, volume=volume)
            lod = in_unit(lod, sample.unit, fact, target=unit, volume=volume)
            reason = "" if value > 0 else f"in {sample.unit}, {CANNOT}"
        if reason:
            left_out[reason] += 1
        else:
            usable.append((sample, value, lod))
    return usable, left_out


def _estimate(one: AgentEstimates, kind: str, figures: GroupFigures, index: int) -> Estimate:
    return Estimate(
        kind=kind,
        binding=one.bindings[kind],
        unit=one.unit,
        n=int(figures.n[index]),
        n_censored=int(figures.n_censored[index]),
        gm=float(figures.gm[index]),
        gsd=float(figures.gsd[index]),
        x95=float(figures.x95[index]),
        x95_upper70=float(figures.x95_upper70[index]),
        x95_upper95=float(figures.x95_upper95[index]),
        highest=float(figures.highest[index]),
        governing=float(figures.governing[index]),
        ratio=float(figures.ratio[index]),
        ratio95=float(figures.ratio95[index]),
        basis=str(figures.basis[index]),
        flags=figures.flags[index],
        newest=max(one.days[kind], default=None),
    )


def estimates(tasks: list[TaskFacts]) -> dict[int, AgentEstimates]:
    """Estimates by task-agent id, for all tasks in one statistical batch."""
    found: dict[int, AgentEstimates] = {}
    groups: list[tuple[AgentEstimates, str]] = []
    values, censored, lods, ids = [], [], [], []
    for facts in tasks:
        for fact in facts.agents:
            limits = bindings(facts, fact)
            unit = next((one.unit for one in limits.values()), "mg/m3")
            usable, left_out = _usable(facts, fact, unit)
            one = AgentEstimates(fact, limits, {}, left_out, unit, {})
            found[fact.id] = one
            for kind in limits:
                rows = [row for row in usable if row[0].span in SPANS[kind]]
                one.values[kind] = [(value, sample.is_censored) for sample, value, _ in rows]
                one.days[kind] = [sample.sampled_on for sample, _, _ in rows]
                for sample, value, lod in rows:
                    values.append(value)
                    censored.append(sample.is_censored)
                    lods.append(lod)
                    ids.append(len(groups))
                groups.append((one, kind))
    if not groups:
        return found
    batch = pack(
        np.asarray(values, dtype=float),
        np.asarray(censored, dtype=bool),
        np.asarray(ids, dtype=int),
        n_groups=len(groups),
        lod=np.asarray(lods, dtype=float),
    )
    limit = np.array([one.bindings[kind].value for one, kind in groups])
    figures = describe(batch, limit, policy=tasks[0].site.statistic)
    for index, (one, kind) in enumerate(groups):
        one.estimates[kind] = _estimate(one, kind, figures, index)
    return found
