"""An assembly read against the rule pack, and the working of its factor and its ceilings."""

import math
from collections.abc import Iterable
from dataclasses import dataclass

from exposure.units import site_molar_volume_l_mol
from programme.equipment.models import Assembly
from programme.figures import down, unit_sign
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import RespiratorClass
from programme.selection.chain import Row, Working
from programme.selection.estimates import AgentEstimates
from programme.selection.facts import TaskFacts
from programme.selection.limits import in_unit


@dataclass(frozen=True)
class Wearable:
    """An assembly read against the rule pack: its class and the factor that holds for it here."""

    assembly: Assembly
    of_class: RespiratorClass | None
    apf: float

    @property
    def is_air_purifying(self) -> bool:
        return self.of_class is None or self.of_class.is_air_purifying


def wearable(assembly: Assembly, pack: RulePack, *, is_particulate_only: bool) -> Wearable:
    """The class of the assembly and its factor; NaN if the pack has no such class."""
    of_class = pack.find_class(assembly.respirator_class)
    if of_class is None:
        return Wearable(assembly, None, math.nan)
    apf = of_class.apf_when(
        has_maker_evidence=bool(assembly.maker_evidence.strip()),
        is_particulate_only=is_particulate_only,
    )
    return Wearable(assembly, of_class, float(apf))


def is_particulate_only(agents: Iterable[AgentEstimates]) -> bool:
    """Whether no agent of the task is a gas or vapour."""
    return all(one.fact.form == "particulate" for one in agents)


PLAIN = "APF × limit"


def max_use(facts: TaskFacts, agent: AgentEstimates, one: Wearable) -> tuple[float, str]:
    """The maximum use concentration in the group's unit, and which ceiling it is.

    The lowest of APF times limit, the IDLH figure (for what is not permitted above it) and the
    element's own maximum; NaN where the limit or a ceiling cannot be compared.

    Source: 29 CFR 1910.134(d)(3)(i)(B).
    """
    governing = agent.governing
    if governing is None:
        return math.nan, "not known"
    ceilings = [(one.apf * governing.binding.value, PLAIN)]
    known, element = agent.fact.agent, one.assembly.element
    volume = site_molar_volume_l_mol(facts.site)
    if known.idlh_value is not None and not (one.of_class and one.of_class.idlh):
        cap = in_unit(
            known.idlh_value, known.idlh_unit, agent.fact, target=agent.unit, volume=volume
        )
        ceilings.append((cap, "capped by the IDLH figure"))
    if element and one.is_air_purifying and agent.fact.form != "particulate":
        caps = facts.pack.element_caps(
            tuple(element.gas_elements), cas=known.cas, gas_class=element.gas_class
        )
        for row in caps:
            cap = in_unit(row.max_ppm, "ppm", agent.fact, target=agent.unit, volume=volume)
            ceilings.append((cap, "capped by the element's own maximum"))
    unknown = next((why for value, why in ceilings if math.isnan(value)), "")
    return (math.nan, unknown) if unknown else min(ceilings)


def working(facts: TaskFacts, agents: list[AgentEstimates], one: Wearable) -> Working:
    """What the factor of an assembly rests on, and the ceilings that follow from it."""
    of_class = one.of_class
    rows = [Row("Class", of_class.name if of_class else one.assembly.respirator_class)]
    if of_class:
        rows.append(Row("APF", down(one.apf), of_class.source, of_class.sure))
    element = one.assembly.element
    rows.append(Row("Element", element.name if element else "none"))
    if element:
        rows.append(Row("Particulate class", element.particulate_class or "none"))
        rows.append(Row("Gas elements", ", ".join(element.gas_elements) or "none"))
    rows.append(Row("Approval", one.assembly.approval_number or "not recorded"))
    for agent in agents:
        governing = agent.governing
        if governing is None or math.isnan(one.apf):
            continue
        muc, why = max_use(facts, agent, one)
        text = f"{down(muc)} {unit_sign(agent.unit)}"
        clause = facts.pack.clause("muc-exceeded" if why == PLAIN else "muc-capped")
        rows.append(
            Row(
                f"Maximum use concentration, {agent.fact.agent.name}",
                f"{text} ({why})",
                clause.source,
                clause.sure,
            )
        )
    clause = facts.pack.clause("apf-low")
    return Working(
        title=f"{one.assembly.name}: APF {down(one.apf)}",
        formula="APF ≥ hazard ratio; maximum use concentration = APF × limit, at most IDLH",
        rows=tuple(rows),
        source=of_class.source if of_class else clause.source,
        sure=of_class.sure if of_class else clause.sure,
        note="An assigned factor holds only inside a running programme: fit, training, upkeep.",
        figures={"apf": one.apf, "assembly": one.assembly.name},
    )
