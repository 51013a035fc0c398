"""Class: does the chosen respirator class and filter type answer all of it?"""

import math

from exposure.units import site_molar_volume_l_mol
from programme.figures import down, near, up
from programme.rulepack.rows import RespiratorClass
from programme.rulepack.substance import Substance
from programme.selection.chain import (
    Choice,
    Link,
    Mismatch,
    Remedy,
    state_of,
)
from programme.selection.estimates import AgentEstimates
from programme.selection.facts import TaskFacts
from programme.selection.limits import in_unit
from programme.selection.links.ratio import Demand
from programme.selection.links.wearable import (
    Wearable,
    is_particulate_only,
    wearable,
    working,
)
from programme.selection.links.words import Finder


def is_carcinogen(note: str) -> bool:
    """Whether a note on cancer names a group that calls for the higher class in doubt.

    IARC group 3 says "not classifiable" and does not.
    """
    return bool(note.strip().replace("IARC group 3", "").strip(" ;,."))


class _Judge:
    """Judges one assembly against one task; collects what does not fit."""

    def __init__(
        self,
        facts: TaskFacts,
        agents: list[AgentEstimates],
        asked: Demand,
        one: Wearable,
    ) -> None:
        self.facts, self.agents, self.asked, self.one = facts, agents, asked, one
        self.pack, self.assembly = facts.pack, one.assembly
        self.find = Finder(facts.pack, "Class")
        self.found: list[Mismatch] = []
        self.other = Remedy("Choose another assembly", "selection:assign", (facts.task.pk,))
        self.edit = Remedy("Open the assembly", "equipment:assembly", (one.assembly.pk,))

    def stop(self, code: str, says: str, *remedies: Remedy, **more) -> None:
        line = f"{self.assembly.name}: {says}"
        self.found.append(self.find.stop(code, line, *(remedies or (self.other,)), **more))

    def fix(self, code: str, says: str, *remedies: Remedy, **more) -> None:
        line = f"{self.assembly.name}: {says}"
        self.found.append(self.find.fix(code, line, *(remedies or (self.other,)), **more))

    def plan(self, code: str, says: str, *remedies: Remedy, **more) -> None:
        line = f"{self.assembly.name}: {says}"
        self.found.append(self.find.plan(code, line, *(remedies or (self.other,)), **more))

    def all(self) -> list[Mismatch]:
        self.whole()
        if self.one.of_class is None:
            says = f"class {self.assembly.respirator_class!r} has no factor in {self.pack.title}."
            self.stop("class-unknown", says, self.edit)
            return self.found
        self.danger(self.one.of_class)
        self.factor()
        self.eyes(self.one.of_class)
        self.goggles(self.one.of_class)
        for agent in self.agents:
            self.substance(self.one.of_class, agent)
            if self.one.is_air_purifying:
                self.element(agent)
        return self.found

    def whole(self) -> None:
        """Approved as a whole, of the kind its class is for, not withdrawn."""
        assembly, of_class = self.assembly, self.one.of_class
        if not assembly.approval_number.strip():
            self.stop(
                "approval-missing",
                "no approval number of the whole is recorded.",
                self.edit,
            )
        for part in (assembly, assembly.facepiece, assembly.element):
            if part is not None and part.withdrawn_on and part.withdrawn_on <= self.facts.on:
                self.stop(
                    "assembly-withdrawn",
                    f"{part.name} was withdrawn on {part.withdrawn_on}.",
                    clause="assembly-approval",
                )
        if of_class is None:
            return
        if of_class.inlet != assembly.facepiece.kind:
            says = f"{assembly.facepiece.name} is no {of_class.inlet.replace('_', ' ')}."
            self.stop("class-facepiece", says, self.edit, clause="assembly-approval")
        element = assembly.element
        if of_class.is_air_purifying:
            particulate = element.particulate_class if element else ""
            has_gas = bool(element and element.is_gas)
            if element is None:
                self.stop(
                    "element-missing",
                    "no filter or cartridge.",
                    self.edit,
                    clause="element-class",
                )
            elif not of_class.takes_element(particulate, has_gas=has_gas):
                says = f"the factor of {of_class.name} does not hold with {element.name}."
                self.stop("element-class", says, self.edit)

    def danger(self, of_class: RespiratorClass) -> None:
        """Immediate danger and oxygen."""
        if self.asked.needs_idlh_grade and not of_class.idlh:
            says = f"{self.asked.why_idlh}: {of_class.name} is not permitted there."
            self.stop("idlh-class", says)
        elif self.asked.needs_idlh_grade and of_class.family == "scba":
            minutes = self.assembly.service_life_min
            # A pack without a least life still wants the life on record.
            least = self.pack.idlh.service_life_min or 1
            if minutes is None or not minutes >= least:
                have = f"{minutes} min" if minutes else "not recorded"
                says = f"certified life {have}; at least {least} min."
                self.stop("idlh-service-life", says, self.edit)
        if self.asked.oxygen_low and of_class.is_air_purifying:
            self.stop(
                "oxygen-low",
                "a filter brings no oxygen, and oxygen is low or not known.",
            )

    def factor(self) -> None:
        """Assigned factor against the ratio, at both confidences."""
        asked, apf = self.asked, self.one.apf
        # IDLH and an unknown ratio are judged by their own rules, not by a factor.
        if math.isnan(asked.ratio):
            return
        if not apf >= asked.ratio:
            says = f"APF {down(apf)} is under {up(asked.ratio)} times the limit."
            self.stop("apf-low", says)
        elif not apf >= asked.ratio95:
            says = (
                f"APF {down(apf)} covers {up(asked.ratio)} times the limit at the site's "
                f"confidence, but not {up(asked.ratio95)} times at 95 %."
            )
            sample = Remedy("Record more samples", "exposure:sample_add")
            if any(is_carcinogen(one.fact.agent.carcinogen_note) for one in self.agents):
                self.fix(
                    "class-uncertain",
                    says,
                    self.other,
                    sample,
                    clause="exposure-uncertain",
                )
            else:
                self.plan(
                    "class-uncertain",
                    says,
                    sample,
                    self.other,
                    clause="exposure-uncertain",
                )

    def eyes(self, of_class: RespiratorClass) -> None:
        if self.facts.task.irritates_eyes and not of_class.covers_eyes:
            self.fix(
                "eyes",
                f"{of_class.name} leaves the eyes open, and the air irritates them.",
            )

    def goggles(self, of_class: RespiratorClass) -> None:
        """Substances against which the eyes are always covered."""
        for one in self.agents:
            rule = self.pack.substance(one.fact.agent.cas)
            eyes = rule.eyes if rule else None
            if eyes is None or eyes.only_if_irritating or of_class.covers_eyes:
                continue
            says = f"{one.fact.agent.name}: the eyes have to be covered"
            more = {"source": eyes.source, "sure": eyes.sure, "clause": "eyes"}
            if eyes.goggles_suffice:
                self.plan("eyes-goggles", f"{says}; see that gas-proof goggles are worn.", **more)
            else:
                self.fix("eyes-substance", f"{says}, and {of_class.name} leaves them open.", **more)

    def table(self, of_class: RespiratorClass, one: AgentEstimates, rule: Substance) -> None:
        """A substance's own table of classes by concentration: its row, or one above it."""
        if not rule.element_hours:
            return
        ppm = self.highest_ppm(one)
        row = rule.hours_at(ppm)
        name = one.fact.agent.name
        if row is None:
            self.stop("substance-table", f"the table of {name} has no row for {up(ppm)} ppm.")
            return
        above = [other for other in rule.element_hours if other.max_ppm >= row.max_ppm]
        if of_class.id not in {known for other in above for known in other.classes}:
            says = f"{of_class.name} is not in the table of {name} for {up(ppm)} ppm."
            self.stop("substance-table", says, source=row.source, sure=row.sure)

    def highest_ppm(self, one: AgentEstimates) -> float:
        """The highest known estimate of any averaging kind, in ppm; NaN if there is none."""
        known = [e.governing for e in one.estimates.values() if e.is_known]
        volume = site_molar_volume_l_mol(self.facts.site)
        highest = max(known, default=math.nan)
        return in_unit(highest, one.unit, one.fact, target="ppm", volume=volume)

    def substance(self, of_class: RespiratorClass, one: AgentEstimates) -> None:
        """What the law adds for single substances."""
        rule = self.pack.substance(one.fact.agent.cas)
        if rule is None:
            return
        name = one.fact.agent.name
        self.table(of_class, one, rule)
        if rule.inlets and of_class.inlet in rule.inlets.barred:
            says = f"{of_class.name} is barred for {name}."
            self.stop(
                "substance-inlet",
                says,
                source=rule.inlets.source,
                sure=rule.inlets.sure,
            )
        if rule.air_purifying and of_class.is_air_purifying:
            bar = rule.air_purifying
            self.stop(
                "substance-air-purifying",
                f"{name}: {bar.reason}",
                source=bar.source,
                sure=bar.sure,
            )
        if rule.particulate_rank and of_class.is_air_purifying and one.fact.form != "gas":
            element = self.assembly.element
            known = (
                self.pack.find_particulate_filter(element.particulate_class) if element else None
            )
            least = rule.particulate_rank
            if known is None or not known.rank >= least.rank_min:
                have = element.particulate_class if element else ""
                says = (
                    f"{name} asks for a filter of rank {least.rank_min}; this is {have or 'none'}."
                )
                self.stop("particulate-rank", says, source=least.source, sure=least.sure)

    def element(self, one: AgentEstimates) -> None:
        """The element against the form of the agent, and its own ceiling."""
        if one.fact.form in {"particulate", "both"}:
            self.particulate(one)
        if one.fact.form in {"gas", "both"}:
            self.gas(one)

    def particulate(self, one: AgentEstimates) -> None:
        element, name = self.assembly.element, one.fact.agent.name
        known = self.pack.find_particulate_filter(element.particulate_class) if element else None
        if known is None:
            self.stop("particulate-missing", f"no particulate filter against {name}.")
            return
        is_oily = self.facts.task.has_oil_aerosol or one.fact.agent.is_oil_aerosol
        if is_oily and known.oil == "no":
            says = f"{known.id} is not for oil aerosol, and there is oil in the air."
            self.stop("oil", says, source=known.source, sure=known.oil_sure or known.sure)

    def gas(self, one: AgentEstimates) -> None:
        agent, element, pack = one.fact.agent, self.assembly.element, self.pack
        text = agent.us_filter_need if pack.need_scheme == "us" else agent.en_filter_need
        needs = self.needs(text)
        have = tuple(element.gas_elements) if element else ()
        if not have:
            self.stop("gas-missing", f"no cartridge against {agent.name}.")
            return
        if not needs:
            self.stop("gas-need-unknown", f"no filter need is recorded for {agent.name}.")
        elif pack.supplied_air_need in needs and not self._made_for(agent.cas, have):
            self.stop(
                "supplied-air-only",
                f"{agent.name} calls for supplied air, not a cartridge.",
            )
        elif not pack.covers_gas(have, needs=needs, cas=agent.cas):
            says = f"{'+'.join(have)} does not cover {agent.name}, which needs {text}."
            self.stop("gas-type", says)
        self.low_boiling(one, have, needs)
        self.label(one, have, needs)
        bar = pack.not_for(agent.cas, have)
        if bar and pack.supplied_air_need not in needs and not bar.allowed_with_schedule:
            self.stop(
                "not-for-cartridge",
                f"{agent.name}: {bar.reason}",
                source=bar.source,
                sure=bar.sure,
            )
        self.ceiling(one, have)

    def needs(self, text: str) -> tuple[str, ...]:
        """The needs of an agent; none where the text is not of this pack."""
        try:
            return self.pack.needs(text)
        except ValueError:
            return ()

    def _answering(self, cas: str, have: tuple[str, ...], needs: tuple[str, ...]) -> list:
        """The elements at hand that hold the agent; none where they are of the wrong type."""
        if not self.pack.covers_gas(have, needs=needs, cas=cas):
            return []
        rows = [row for row in self.pack.gas_elements if row.id in have]
        made_for = [row for row in rows if cas and cas in row.agents]
        return made_for or [row for row in rows if set(needs) & set(row.covers)]

    def low_boiling(
        self, one: AgentEstimates, have: tuple[str, ...], needs: tuple[str, ...]
    ) -> None:
        """Vapours of low boiling point pass an ordinary organic-vapour element early."""
        agent, rule = one.fact.agent, self.pack.low_boiling
        answering = {row.id for row in self._answering(agent.cas, have, needs)}
        if not answering or not answering <= set(rule.ordinary_elements):
            return
        point, more = agent.boiling_point_c, {"source": rule.source, "sure": rule.sure}
        if point is None:
            says = f"the boiling point of {agent.name} is not recorded: it may pass early."
            self.plan("boiling-point-unknown", says, clause="gas-low-boiling", **more)
        elif not point > rule.boiling_point_c:
            says = (
                f"{agent.name} boils at {near(point)} °C, {near(rule.boiling_point_c)} °C or less: "
                f"{'+'.join(have)} holds it too briefly."
            )
            self.stop("gas-low-boiling", says, **more)

    def label(self, one: AgentEstimates, have: tuple[str, ...], needs: tuple[str, ...]) -> None:
        """Elements that are approved only for the gases their label names."""
        answering = self._answering(one.fact.agent.cas, have, needs)
        if answering and all(row.label_must_name_agent for row in answering):
            row = answering[0]
            says = f"{row.name} will do only if its approval label names {one.fact.agent.name}."
            more = {"clause": "element-label", "source": row.source, "sure": row.sure}
            self.plan("element-label", says, **more)

    def _made_for(self, cas: str, have: tuple[str, ...]) -> bool:
        rows = [row for row in self.pack.gas_elements if row.id in have]
        return any(cas and cas in row.agents for row in rows)

    def ceiling(self, one: AgentEstimates, have: tuple[str, ...]) -> None:
        """The element's own maximum, in ppm, against the highest estimate."""
        element = self.assembly.element
        gas_class = element.gas_class if element else None
        caps = self.pack.element_caps(have, cas=one.fact.agent.cas, gas_class=gas_class)
        known = [e for e in one.estimates.values() if e.is_known]
        if not caps or not known:
            return
        ppm = self.highest_ppm(one)
        cap = caps[0]
        if not ppm <= cap.max_ppm:
            says = f"{up(ppm)} ppm of {one.fact.agent.name} is above {down(cap.max_ppm)} ppm."
            self.stop("element-max-use", says, source=cap.source, sure=cap.sure)


def judge(facts: TaskFacts, agents: list[AgentEstimates], asked: Demand) -> Link:
    """Every assembly assigned to the task against all that its air asks."""
    find = Finder(facts.pack, "Class")
    if not facts.assigned:
        remedy = Remedy("Assign an assembly", "selection:assign", (facts.task.pk,))
        says = "No respirator is assigned to this task."
        missing = find.stop("class-missing", says, remedy)
        return Link("Class", state_of((missing,)), "none assigned", "", (missing,))
    only = is_particulate_only(agents)
    worn = [wearable(a, facts.pack, is_particulate_only=only) for a in facts.assigned]
    found = tuple(m for one in worn for m in _Judge(facts, agents, asked, one).all())
    figure, basis = worn[0].assembly.name, f"APF {down(worn[0].apf)}"
    if len(worn) > 1:
        # An unknown factor is not passed over for a known one.
        lowest = min((one.apf for one in worn), key=lambda apf: (apf == apf, apf))
        figure, basis = f"{len(worn)} assemblies", f"APF {down(lowest)} or more"
    workings = tuple(working(facts, agents, one) for one in worn)
    return Link("Class", state_of(found), figure, basis, found, workings)


def choices(facts: TaskFacts, agents: list[AgentEstimates], asked: Demand) -> tuple[Choice, ...]:
    """Every assembly on the site's shelf: whether it would answer, else the first reason why not."""
    only = is_particulate_only(agents)
    assigned = {one.pk for one in facts.assigned}
    found = []
    for assembly in facts.shelf:
        one = wearable(assembly, facts.pack, is_particulate_only=only)
        against = [m for m in _Judge(facts, agents, asked, one).all() if m.severity != "plan"]
        unknown = math.isnan(asked.ratio) and not facts.task.is_idlh
        why = against[0].says.split(": ", 1)[-1] if against else ""
        if unknown and not against and not (one.of_class and one.of_class.idlh):
            why = "the hazard ratio is not known."
        tested = sum(
            1
            for member in facts.crew
            if assembly.facepiece_id in facts.tested_sizes.get(member.worker.id, ())
        )
        found.append(
            Choice(
                assembly.pk,
                assembly.name,
                one.of_class.name if one.of_class else assembly.respirator_class,
                None if math.isnan(one.apf) else one.apf,
                not why,
                why,
                assembly.in_stock,
                assembly.pk in assigned,
                tested,
            )
        )
    return tuple(sorted(found, key=lambda c: (not c.answers, c.apf or 0, c.name)))
