"""Filter: when must it be changed, by what reason, and whose is due?"""

import math
from dataclasses import dataclass, field
from datetime import date, timedelta

from filtration import loading
from filtration.breathing import WORK_CLASSES
from filtration.schedule import Limit, shifts, shortest
from programme.equipment.models import Assembly
from programme.figures import down, near, up
from programme.selection.chain import (
    DUE_SOON,
    PLAN,
    Link,
    Mismatch,
    Remedy,
    Row,
    Working,
    state_of,
)
from programme.selection.estimates import AgentEstimates
from programme.selection.facts import CrewFact, TaskFacts, local_day
from programme.selection.links.words import Finder

L_MIN = 1e-3 / 60
TEST_FLOW_L_MIN = 85.0
DAYS_A_WEEK = 7
COARSE = {"inhalable", "total"}


@dataclass(frozen=True)
class ElementSchedule:
    """When the element of one assembly is changed in this task."""

    assembly: Assembly
    binding: Limit | None
    others: tuple[Limit, ...]
    whole_shifts: int | None
    rows: tuple[Row, ...]
    mismatches: tuple[Mismatch, ...]

    @property
    def is_new_each_shift(self) -> bool:
        return self.whole_shifts is not None and self.whole_shifts <= 1

    @property
    def says(self) -> str:
        if self.binding is None:
            return "no schedule"
        if self.whole_shifts == 0:
            return f"change after {down(self.binding.hours, 2)} h"
        if self.is_new_each_shift:
            return "new at the start of each shift"
        return f"every {self.whole_shifts} shifts"


@dataclass(frozen=True)
class MemberFilter:
    """The filter of one member of the crew on the day."""

    mismatches: tuple[Mismatch, ...] = ()
    due_on: date | None = None
    says: str = ""


@dataclass(frozen=True)
class Schedule:
    """Schedules of every assembly assigned to the task, and the crew's filters against them."""

    facts: TaskFacts
    by_assembly: dict[int, ElementSchedule] = field(default_factory=dict)

    def of(self, member: CrewFact) -> MemberFilter:
        """What the change schedule has against this member's filter, and when it is due."""
        one = self.by_assembly.get(member.assembly.pk) if member.assembly else None
        if one is None or one.binding is None or one.whole_shifts is None:
            return MemberFilter(says="" if one is None else one.says)
        if one.is_new_each_shift:
            return MemberFilter(says=one.says)
        return _dated(self.facts, member, one, one.whole_shifts)


def days_of(shifts_left: float, *, a_week: float) -> int:
    """Calendar days that so many shifts cover at the least: full weeks, then day after day.

    Three shifts of a five-day week are three days from Monday, not 3 / 5 x 7 = 4.

    Args:
        shifts_left: may be 0 or less, for a filter that is used up.
        a_week: shifts a week, above 0.
    """
    if not shifts_left > 0:
        return min(math.floor(shifts_left * DAYS_A_WEEK / a_week), 0)
    weeks, rest = divmod(shifts_left, a_week)
    return int(weeks) * DAYS_A_WEEK + math.floor(rest / max(1, math.ceil(a_week / DAYS_A_WEEK)))


def _dated(facts: TaskFacts, member: CrewFact, one: ElementSchedule, interval: int) -> MemberFilter:
    find = Finder(facts.pack, "Filter")
    name, pk = member.worker.name, member.worker.id
    query = f"?worker={pk}&assembly={one.assembly.pk}"
    change = Remedy("Record a filter change", "equipment:filter_change", (), query)
    last = member.worker.changes.get(one.assembly.pk)
    if last is None:
        says = f"{name}: no day is recorded on which the filter of {one.assembly.name} was fitted."
        missing = find.stop("filter-unknown", says, change, worker_id=pk, worker=name)
        return MemberFilter((missing,), None, "fitted on an unknown day")
    fitted = local_day(last.fitted_at, facts.site)
    a_week = facts.task.shifts_per_week
    if last.shifts_used is not None:
        # The count was true on the day it was recorded; shifts go on from there.
        counted_on = local_day(last.recorded_at, facts.site)
        due = counted_on + timedelta(days=days_of(interval - last.shifts_used, a_week=a_week))
    else:
        due = fitted + timedelta(days=days_of(interval, a_week=a_week))
    # Not `<`: the due day is the first on which the filter no longer counts.
    if facts.on >= due:
        says = f"{name}: the filter fitted on {fitted} was to be changed by {due}."
        late = find.stop("filter-due", says, change, worker_id=pk, worker=name)
        return MemberFilter((late,), due, f"overdue since {due}")
    return MemberFilter((), due, f"change by {due}")


def _dust_mg_m3(agents: list[AgentEstimates]) -> tuple[float, str]:
    """The dust that loads the filter, and where the figure is from; NaN if it is not known."""
    entered = [one.fact.dust_load_mg_m3 for one in agents if one.fact.dust_load_mg_m3]
    if entered:
        return max(entered), "dust load entered for the task"
    dusts = [one for one in agents if one.fact.form != "gas"]
    sums = [
        one.governing.governing
        for one in dusts
        if one.governing and one.unit == "mg/m3" and one.fact.fraction in COARSE
    ]
    if sums and len(sums) == len(dusts):
        return sum(sums), "sum of the upper estimates of inhalable or total dust"
    return math.nan, "not all was sampled as inhalable or total dust, and a part understates it"


def _flow(facts: TaskFacts, assembly: Assembly) -> tuple[float, Row]:
    """L/min that load the filter, and the line of the working that says where they are from."""
    of_class = facts.pack.find_class(assembly.respirator_class)
    if of_class is not None and of_class.mode == "powered":
        rule = facts.pack.powered_flow
        flow = rule.flow_l_min(is_tight=of_class.is_tight)
        return flow, Row("Air drawn through", f"{near(flow)} L/min, blower", rule.source, rule.sure)
    flow = float(WORK_CLASSES[facts.task.work_rate])
    says = f"{near(flow)} L/min, minute volume (common practice)"
    return flow, Row("Air drawn through", says)


class _Candidates:
    """Collects every reason to change the element of one assembly."""

    def __init__(self, facts: TaskFacts, agents: list[AgentEstimates], assembly: Assembly) -> None:
        self.facts, self.agents, self.assembly = facts, agents, assembly
        self.pack, self.element = facts.pack, assembly.element
        self.find = Finder(facts.pack, "Filter")
        self.limits: list[Limit] = []
        self.rows: list[Row] = []
        self.found: list[Mismatch] = []
        self.edit = Remedy("Open the assembly", "equipment:assembly", (assembly.pk,))
        self.task_edit = Remedy("Open the task's agents", "exposure:task_edit", (facts.task.pk,))

    def add(
        self, reason: str, hours: float, working: str, source: str = "", sure: str = ""
    ) -> None:
        self.limits.append(Limit(reason, hours, working))
        shown = f"{down(hours)} h ({working})"
        self.rows.append(Row(reason.capitalize(), shown, source, sure))

    def particulate(self) -> None:
        """Resistance, mass, hours and policy of a particulate filter."""
        element, facts = self.element, self.facts
        has_particles = any(
            one.fact.form != "gas" or one.fact.dust_load_mg_m3 for one in self.agents
        )
        if element is None or not element.particulate_class or not has_particles:
            return
        dust, whence = _dust_mg_m3(self.agents)
        flow, flow_row = _flow(facts, self.assembly)
        self.rows.append(flow_row)
        if dust == dust:
            self.rows.append(Row("Dust load", f"{up(dust)} mg/m³ ({whence})"))
            mass = loading.mass_collected_kg(
                dust * 1e-6,
                minute_volume_m3_s=flow * L_MIN,
                duration_s=facts.task.wear_h_per_shift * 3600,
                efficiency=1.0,
            )
            self.rows.append(Row("Mass collected a shift", f"{up(float(mass) * 1e6)} mg"))
            self._resistance(dust, flow)
            self._mass(dust, flow)
        else:
            says = f"{self.assembly.name}: how much dust loads the filter is not known ({whence})."
            self.found.append(
                self.find.plan("dust-load-unknown", says, self.task_edit, clause="filter-loading")
            )
        self._certified()
        if element.maker_max_h:
            self.add("maker's limit", element.maker_max_h, "data sheet, hours in use")
        if facts.site.filter_max_shifts:
            n = facts.site.filter_max_shifts
            self.add("site policy", n * facts.task.wear_h_per_shift, f"{n} shifts")

    def _resistance(self, dust: float, flow: float) -> None:
        element = self.element
        if element is None or not (element.area_cm2 and element.clean_resistance_pa):
            text = "not estimable: area or resistance of the element is not recorded"
            self.rows.append(Row("Breathing resistance", text))
            return
        kinds = {one.fact.cake for one in self.agents if one.fact.cake} or {"unknown"}
        # Of several deposits the one that clogs first.
        cake = max((loading.CAKE_RESISTANCE[kind] for kind in kinds), key=lambda c: c.high_per_s)
        made = loading.ParticleFilter(
            area_m2=element.area_cm2 * 1e-4,
            test_flow_m3_s=TEST_FLOW_L_MIN * L_MIN,
            clean_pressure_pa=element.clean_resistance_pa,
            k2_per_s=cake.per_s,
        )
        limit_pa = self.facts.site.breathing_limit_pa
        life = loading.time_to_limit_s(
            dust * 1e-6,
            minute_volume_m3_s=flow * L_MIN,
            element=made,
            limit_pa=limit_pa,
        )
        low, likely, high = (float(value) / 3600 for value in life)
        working = (
            f"from {near(element.clean_resistance_pa)} to {near(limit_pa)} Pa at 85 L/min; likely "
            f"{down(likely, 2)} h, at most {down(high, 2)} h"
        )
        self.add("breathing resistance", low, working, cake.basis, cake.mark)

    def _mass(self, dust: float, flow: float) -> None:
        limit = self._use_limit()
        if limit is None or limit.loading_mg is None or self.element is None:
            return
        mass_mg = limit.loading_mg * (2 if self.element.is_pair else 1)
        hours = mass_mg / (dust * flow * 60 / 1000)
        self.add("mass", hours, f"{near(mass_mg)} mg collected", limit.source, limit.sure)

    def _use_limit(self):
        element = self.element
        known = self.pack.find_particulate_filter(element.particulate_class) if element else None
        if known is None:
            return None
        oily = self.facts.task.has_oil_aerosol or any(
            one.fact.agent.is_oil_aerosol for one in self.agents
        )
        return self.pack.filter_use_limit(known.series, has_oil=oily)

    def _certified(self) -> None:
        limit = self._use_limit()
        if limit is None:
            return
        task = self.facts.task
        if limit.hours is not None:
            self.add("certification rule", limit.hours, limit.rule, limit.source, limit.sure)
        if limit.days is not None:
            used = limit.days / DAYS_A_WEEK * task.shifts_per_week * task.wear_h_per_shift
            self.add(
                "certification rule, calendar",
                used,
                f"{limit.days} days at {near(task.shifts_per_week)} shifts a week",
                limit.source,
                limit.sure,
            )

    def gas(self) -> None:
        """Cartridge life from objective data, rules of the substance, and policy."""
        element, facts = self.element, self.facts
        gases = [one for one in self.agents if one.fact.form in {"gas", "both"}]
        if element is None or not element.is_gas or not gases:
            return
        based = element.has_esli
        if element.cartridge_life_h and element.cartridge_life_source.strip():
            self.add(
                "cartridge life",
                element.cartridge_life_h,
                element.cartridge_life_source,
            )
            based = True
        left = [one for one in gases if not self._substance(one)]
        for gas_id in element.gas_elements:
            known = self.pack.find_gas_element(gas_id)
            if known and known.max_hours:
                self.add(
                    "certification rule",
                    known.max_hours,
                    known.name,
                    known.source,
                    known.sure,
                )
        if element.has_esli:
            self.rows.append(Row("End-of-service-life indicator", "changes when it shows"))
        if left and not based:
            names = ", ".join(one.fact.agent.name for one in left)
            says = (
                f"{self.assembly.name}: cartridge life against {names} cannot be estimated from "
                "what is recorded: missing objective data or an end-of-service-life indicator."
            )
            self.found.append(self.find.stop("change-schedule", says, self.edit))
        if facts.site.cartridge_max_shifts:
            n = facts.site.cartridge_max_shifts
            hours = n * facts.task.wear_h_per_shift
            self.add("site policy, cartridges", hours, f"{n} shift(s): vapours move at rest")

    def _substance(self, one: AgentEstimates) -> bool:
        rule = self.pack.substance(one.fact.agent.cas)
        if rule is None:
            return False
        if rule.change_each_shift:
            part = rule.change_each_shift
            self.add(
                "substance rule",
                self.facts.task.wear_h_per_shift,
                f"{rule.name}: new each shift",
                part.source,
                part.sure,
            )
        governing = one.governing
        ppm = governing.governing if governing and one.unit == "ppm" else math.nan
        row = rule.hours_at(ppm) if rule.element_hours and ppm == ppm else None
        if row is not None and row.hours is not None:
            self.add(
                "substance rule",
                row.hours,
                f"{rule.name} at {up(ppm)} ppm",
                row.source,
                row.sure,
            )
            return True
        return False


def _element_schedule(
    facts: TaskFacts, agents: list[AgentEstimates], assembly: Assembly
) -> ElementSchedule:
    made = _Candidates(facts, agents, assembly)
    made.particulate()
    made.gas()
    if not made.limits:
        if not made.found or all(one.severity == PLAN for one in made.found):
            says = f"{assembly.name}: nothing recorded gives a change schedule."
            remedy = Remedy(
                "Set a site policy or enter the filter's data",
                "equipment:assembly",
                (assembly.pk,),
            )
            made.found.append(
                made.find.stop("schedule-missing", says, remedy, clause="filter-unknown")
            )
        return ElementSchedule(assembly, None, (), None, tuple(made.rows), tuple(made.found))
    found = shortest(made.limits)
    whole = int(shifts(min(found.hours, 1e6), hours_per_shift=facts.task.wear_h_per_shift + 0.0))
    return ElementSchedule(
        assembly,
        found.binding,
        found.others,
        whole,
        tuple(made.rows),
        tuple(made.found),
    )


def schedule(facts: TaskFacts, agents: list[AgentEstimates]) -> Schedule:
    """Change schedules of the assigned assemblies that have an element."""
    with_element = [one for one in facts.assigned if one.element is not None]
    return Schedule(facts, {one.pk: _element_schedule(facts, agents, one) for one in with_element})


def _working(facts: TaskFacts, one: ElementSchedule) -> Working:
    bound = one.binding
    title = f"{one.assembly.name}: {one.says}"
    if bound is not None:
        title += f", because of {bound.reason}"
    clause = facts.pack.clause("filter-due")
    hours = Row("Worn a shift", f"{near(facts.task.wear_h_per_shift)} h")
    return Working(
        title=title,
        formula="earliest of resistance, mass, hours in use, certification rule and policy; "
        "whole shifts, rounded down",
        rows=(hours, *one.rows),
        source=clause.source,
        sure=clause.sure,
        note="The lower end of the range is used. Leave and change at once on breakthrough, "
        "higher resistance or leak.",
        figures={
            "hours": bound.hours if bound else None,
            "shifts": one.whole_shifts,
            "reason": bound.reason if bound else None,
            "assembly": one.assembly.name,
        },
    )


def judge(facts: TaskFacts, made: Schedule, members: tuple[MemberFilter, ...]) -> Link:
    """The Filter link: a schedule for every assembly, and nobody's filter overdue."""
    if not facts.assigned:
        return Link("Filter", "broken", "no respirator", "nothing to change", ())
    every = list(made.by_assembly.values())
    filters = [facts.pack.find_class(one.respirator_class) for one in facts.assigned]
    if not every and any(one is None or one.is_air_purifying for one in filters):
        # The Class link says which assembly lacks it.
        return Link("Filter", "broken", "no filter recorded", "nothing to change")
    if not every:
        return Link("Filter", "holds", "no filter", "the air is supplied")
    found = tuple(m for one in every for m in one.mismatches) + tuple(
        m for one in members for m in one.mismatches
    )
    days = [one.due_on for one in members if one.due_on and one.due_on > facts.on]
    first = min(days, default=None)
    a_shift = timedelta(days=math.ceil(DAYS_A_WEEK / facts.task.shifts_per_week))
    soon = first is not None and first - facts.on <= a_shift
    state = state_of(found, is_due_soon=soon)
    shortest_one = min(
        every, key=lambda one: one.whole_shifts if one.whole_shifts is not None else -1
    )
    figure = shortest_one.says
    basis = shortest_one.binding.reason if shortest_one.binding else "cannot be estimated"
    if first and state == DUE_SOON:
        basis = f"next change by {first}"
    workings = tuple(_working(facts, one) for one in every)
    return Link(
        "Filter",
        state,
        figure,
        basis,
        found,
        workings,
        due_on=first,
        due_says="first filter change to fall due",
    )
