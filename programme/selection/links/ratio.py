"""Ratio: how many times over the limit, and what protection does that require?"""

import math
from dataclasses import dataclass

from exposure.units import site_molar_volume_l_mol
from programme.figures import near, unit_sign, up
from programme.selection.chain import Link, Mismatch, Remedy, Row, Working, state_of
from programme.selection.estimates import AgentEstimates
from programme.selection.facts import TaskFacts
from programme.selection.limits import in_unit
from programme.selection.links.words import Finder


@dataclass(frozen=True, slots=True)
class Demand:
    """What the air of a task asks of a respirator.

    Attributes:
        ratio: largest hazard ratio; NaN while any agent's is unknown.
        ratio95: the same at 95 % confidence.
        required_apf: smallest factor of the pack that covers `ratio`; None if there is none.
        needs_idlh_grade: declared, reached or assumed immediately dangerous.
        oxygen_low: an air-purifying respirator cannot do.
        allows_any_supplied_air: low oxygen inside the band of the altitude.
    """

    ratio: float
    ratio95: float
    required_apf: int | None
    needs_idlh_grade: bool
    oxygen_low: bool
    allows_any_supplied_air: bool
    why_idlh: str = ""


def _idlh(one: AgentEstimates, facts: TaskFacts) -> float:
    """The IDLH figure in the group's unit; NaN if there is none."""
    agent = one.fact.agent
    if agent.idlh_value is None or not agent.idlh_unit:
        return math.nan
    volume = site_molar_volume_l_mol(facts.site)
    return in_unit(agent.idlh_value, agent.idlh_unit, one.fact, target=one.unit, volume=volume)


def _worst(agents: list[AgentEstimates]) -> tuple[float, float]:
    ratios, ratios95 = [], []
    for one in agents:
        governing = one.governing
        ratios.append(governing.ratio if governing else math.nan)
        ratios95.append(max((e.ratio95 for e in one.estimates.values() if e.is_known), default=0))
    if not ratios or any(math.isnan(value) for value in ratios):
        return math.nan, math.nan
    return max(ratios), max(ratios95)


def demand(facts: TaskFacts, agents: list[AgentEstimates]) -> Demand:
    """What is asked of the respirator, from all agents, IDLH figures and oxygen together."""
    ratio, ratio95 = _worst(agents)
    task, pack = facts.task, facts.pack
    why = "declared immediately dangerous" if task.is_idlh else ""
    for one in agents:
        # Any averaging kind may reach it, not only the one with the largest ratio.
        if any(e.governing >= _idlh(one, facts) for e in one.estimates.values() if e.is_known):
            level = f"{up(_idlh(one, facts))} {unit_sign(one.unit)}"
            why = why or f"{one.fact.agent.name} reaches its IDLH figure, {level}"
    low, any_air, short = _short_of_oxygen(facts)
    why = why or short
    required = None if math.isnan(ratio) else pack.required_apf(ratio)
    return Demand(ratio, ratio95, required, bool(why), low, any_air, why)


def _is_oxygen_known(facts: TaskFacts) -> bool:
    task = facts.task
    is_measured = task.oxygen == "measured" and task.oxygen_percent is not None
    return task.oxygen == "ambient" or is_measured


def _short_of_oxygen(facts: TaskFacts) -> tuple[bool, bool, str]:
    """Too low for a filter, any supplied air will do, and why it is immediately dangerous."""
    task, pack = facts.task, facts.pack
    if not _is_oxygen_known(facts):
        return True, False, "oxygen not measured where it may be short"
    if task.oxygen == "ambient":
        return False, False, ""
    oxygen = float(task.oxygen_percent or 0)
    # Not `<`: NaN is low.
    low = not oxygen >= pack.oxygen.min_percent
    any_air = low and pack.allows_any_supplied_air(oxygen, altitude_m=facts.site.altitude_m)
    return low, any_air, f"oxygen {near(oxygen)} %" if low and not any_air else ""


def _workings(facts: TaskFacts, agents: list[AgentEstimates], asked: Demand) -> list[Working]:
    made = []
    for one in agents:
        for estimate in one.estimates.values():
            if not estimate.is_known:
                continue
            unit = unit_sign(estimate.unit)
            needs = facts.pack.required_apf(estimate.ratio)
            needs95 = facts.pack.required_apf(estimate.ratio95)
            idlh = _idlh(one, facts)
            rows = [
                Row("Upper estimate", f"{up(estimate.governing)} {unit}"),
                Row("Limit", f"{estimate.binding.says}"),
                Row("Required APF", str(needs or "above every class")),
                Row(
                    "At 95 % confidence",
                    f"ratio {up(estimate.ratio95)}, required APF {needs95 or 'above every class'}"
                    + (": the same class" if needs == needs95 else ": another class"),
                ),
                Row(
                    "IDLH figure",
                    f"{up(idlh)} {unit}" if idlh == idlh else "none recorded",
                ),
            ]
            made.append(
                Working(
                    title=f"{one.fact.agent.name}: {up(estimate.ratio)} times the limit",
                    formula="hazard ratio = upper estimate ÷ limit; "
                    "required APF = smallest of the table that is at least the ratio",
                    rows=tuple(rows),
                    source=facts.pack.clause("apf-low").source,
                    sure=facts.pack.clause("apf-low").sure,
                    figures={
                        "ratio": estimate.ratio,
                        "ratio95": estimate.ratio95,
                        "required_apf": needs,
                        "required_apf95": needs95,
                        "agent": one.fact.agent.name,
                        "kind": estimate.kind,
                    },
                )
            )
    made.append(_oxygen(facts, asked))
    return made


def _oxygen(facts: TaskFacts, asked: Demand) -> Working:
    task, pack = facts.task, facts.pack
    measured = f"{near(task.oxygen_percent)} %" if task.oxygen == "measured" else "not measured"
    rows = (
        Row("Air space", task.get_oxygen_display()),
        Row("Oxygen", measured),
        Row(
            "At least",
            f"{near(pack.oxygen.min_percent)} %",
            pack.oxygen.source,
            pack.oxygen.sure,
        ),
        Row("Altitude", f"{near(facts.site.altitude_m)} m"),
        Row("Immediately dangerous", asked.why_idlh or "no"),
    )
    return Working(
        title="Oxygen and immediate danger",
        formula="short of oxygen, unknown or at the IDLH figure: only apparatus permitted there",
        rows=rows,
        source=pack.clause("oxygen-low").source,
        sure=pack.clause("oxygen-low").sure,
        figures={"oxygen_percent": task.oxygen_percent},
    )


def _found(facts: TaskFacts, agents: list[AgentEstimates], asked: Demand) -> list[Mismatch]:
    find = Finder(facts.pack, "Ratio")
    task = facts.task
    edit = Remedy("Enter the measured oxygen", "exposure:task_edit", (task.pk,))
    found = []
    if not _is_oxygen_known(facts) and not task.is_idlh:
        says = "Oxygen may be short here and was not measured: treated as immediately dangerous."
        found.append(find.stop("oxygen-unknown", says, edit))
    if math.isnan(asked.ratio) and not task.is_idlh:
        missing = [one.fact.agent.name for one in agents if one.governing is None]
        what = ", ".join(missing) or "the task"
        says = f"No hazard ratio for {what}: treated as immediately dangerous."
        found.append(find.stop("ratio-unknown", says))
    elif asked.required_apf is None and not task.is_idlh:
        says = f"{up(asked.ratio)} times the limit is above every class of the table."
        remedy = Remedy("Lower the exposure: control the source first")
        found.append(find.stop("ratio-above-classes", says, remedy, clause="apf-low"))
    for one in agents:
        found += _unsampled_peak(one, find)
        if one.fact.agent.idlh_value is not None and math.isnan(_idlh(one, facts)):
            agent = one.fact.agent
            says = (
                f"{agent.name}: its IDLH figure in {agent.idlh_unit or 'no unit'} cannot be "
                f"compared with results in {unit_sign(one.unit)}."
            )
            mend = Remedy("Record a sample in its unit", "exposure:sample_add")
            found.append(find.fix("idlh-unit", says, mend, clause="unit-mismatch"))
    return found


def _unsampled_peak(one: AgentEstimates, find: Finder) -> list[Mismatch]:
    kinds = [k for k in ("STEL", "C") if k in one.estimates and not one.estimates[k].n]
    governing = one.governing
    if not kinds or governing is None:
        return []
    limits = " and ".join(
        f"{one.bindings[k].says} {'short term' if k == 'STEL' else 'ceiling'}" for k in kinds
    )
    query = f"?task_agent={one.fact.id}"
    add = Remedy("Record a short-term sample", "exposure:sample_add", (), query)
    name = one.fact.agent.name
    # A peak is never below the average of its shift: under a stricter peak limit the ratio of the
    # average alone understates what is needed.
    least = min(one.bindings[k].value for k in kinds)
    if least < governing.binding.value and governing.governing > least:
        says = f"{name}: even the shift's average is above the limit of {limits}; no short sample."
        return [find.stop("peak-unsampled", says, add, clause="peak")]
    says = f"{name}: the limit of {limits} was not judged, no short sample."
    return [find.plan("peak-unsampled", says, add, clause="peak")]


def judge(facts: TaskFacts, agents: list[AgentEstimates], asked: Demand) -> Link:
    """The hazard ratio and what it requires, with IDLH and oxygen."""
    found = tuple(_found(facts, agents, asked))
    workings = tuple(_workings(facts, agents, asked))
    if asked.needs_idlh_grade and (facts.task.is_idlh or not math.isnan(asked.ratio)):
        figure = "immediately dangerous" if asked.why_idlh else ""
        return Link("Ratio", state_of(found), figure, asked.why_idlh, found, workings)
    if math.isnan(asked.ratio):
        return Link("Ratio", state_of(found), "not known", "exposure or limit", found, workings)
    needs = f"needs APF {asked.required_apf}" if asked.required_apf else "above every class"
    if asked.ratio <= 1:
        needs = f"not above the limit; smallest class APF {asked.required_apf}"
    return Link(
        "Ratio",
        state_of(found),
        f"{up(asked.ratio)} times the limit",
        needs,
        found,
        workings,
    )
