"""Which limit binds an agent in a task: every limit tried, the binding one named, in one unit."""

import math
from dataclasses import dataclass

from exposure.models import ExposureLimit
from exposure.units import convert, site_molar_volume_l_mol
from programme.figures import near, unit_sign
from programme.selection.facts import AgentFact, TaskFacts

# A maximum peak above a ceiling is an allowance, not a second ceiling: it never drives a choice.
PEAK = "maximum peak"
# A total sample below a limit for a finer fraction shows compliance; the converse is not allowed.
ANSWERS = {
    "total": ("total", "inhalable", "thoracic", "respirable"),
    "inhalable": ("inhalable", "thoracic", "respirable"),
    "thoracic": ("thoracic", "respirable"),
    "respirable": ("respirable",),
    "vapour": ("vapour",),
}
KIND_SAYS = {"TWA": "8-hour average", "STEL": "short-term average", "C": "ceiling"}


@dataclass(frozen=True, slots=True)
class Binding:
    """The limit that binds one averaging kind, as it is compared: value and unit after adjustment."""

    kind: str
    limit: ExposureLimit
    value: float
    unit: str
    adjusted_by: str = ""
    adjusted_source: str = ""
    adjusted_sure: str = ""
    tried: tuple[ExposureLimit, ...] = ()

    @property
    def says(self) -> str:
        return f"{near(self.value)} {unit_sign(self.unit)}"


def sample_unit(fact: AgentFact) -> str:
    """The unit in which the group is judged: that of its newest personal result, else its kind's."""
    personal = [one for one in fact.samples if one.where == "personal"]
    if personal:
        return personal[-1].unit
    return "ppm" if fact.form == "gas" else "mg/m3"


def in_unit(value: float, unit: str, fact: AgentFact, *, target: str, volume: float) -> float:
    """`value` in the target unit; NaN where it cannot be converted (a dust has no ppm)."""
    try:
        return convert(value, fact.agent, source=unit, target=target, molar_volume=volume)
    except ValueError:
        return math.nan


def _compared(row: ExposureLimit, fact: AgentFact, facts: TaskFacts, unit: str) -> float:
    # ppm is conserved under temperature and pressure, mg/m3 is not: a mass limit of a vapour goes
    # to ppm at its list's reference state first, then to the site's air.
    if row.unit == unit:
        if unit == "mg/m3" and row.fraction == "vapour" and fact.agent.molar_mass_g_mol:
            volume = facts.pack.list_reference(row.list_code).molar_volume_l_mol
            ppm = in_unit(row.value, unit, fact, target="ppm", volume=volume)
            site = site_molar_volume_l_mol(facts.site)
            return in_unit(ppm, "ppm", fact, target=unit, volume=site)
        return row.value
    if unit == "ppm":
        volume = facts.pack.list_reference(row.list_code).molar_volume_l_mol
    else:
        volume = site_molar_volume_l_mol(facts.site)
    return in_unit(row.value, row.unit, fact, target=unit, volume=volume)


def _adjusted(facts: TaskFacts, fact: AgentFact, binding: Binding) -> Binding:
    substance = facts.pack.substance(fact.agent.cas)
    rule = substance.extended_shift if substance else None
    own = rule.limit_ug_m3(facts.task.shift_h) if rule and binding.kind == "TWA" else None
    if rule is None or own is None or binding.unit != "mg/m3" or own / 1000 >= binding.value:
        return binding
    says = f"{rule.numerator_ug_m3_h:g} µg·h/m³ ÷ {facts.task.shift_h:g} h"
    return Binding(
        binding.kind,
        binding.limit,
        own / 1000,
        binding.unit,
        says,
        rule.source,
        rule.sure,
        binding.tried,
    )


def _without_twins(
    rows: list[tuple[float, ExposureLimit]], unit: str
) -> list[tuple[float, ExposureLimit]]:
    """A list prints one limit in ppm and in mg/m3: where the results' unit is there, it is meant."""
    printed = {row.list_code for _, row in rows if row.unit == unit}
    return [one for one in rows if one[1].unit == unit or one[1].list_code not in printed]


def _answered(fact: AgentFact) -> list[ExposureLimit]:
    """The limits that a sample of this fraction can answer."""
    return [
        row
        for row in fact.limits
        if row.fraction in ANSWERS[fact.fraction]
        and not (row.kind == "C" and PEAK in row.note.lower())
    ]


def _of_own_fraction(
    rows: list[tuple[float, ExposureLimit]], fraction: str
) -> list[tuple[float, ExposureLimit]]:
    """Within each list the limit of the sampled fraction; its finer ones where it has none."""
    exact = {row.list_code for _, row in rows if row.fraction == fraction}
    return [one for one in rows if one[1].fraction == fraction or one[1].list_code not in exact]


def not_comparable(facts: TaskFacts, fact: AgentFact) -> list[ExposureLimit]:
    """Limits that cannot be put in the unit of the results, without a twin that can."""
    unit = sample_unit(fact)
    values = [(row, _compared(row, fact, facts, unit)) for row in _answered(fact)]
    judged = {(row.list_code, row.kind) for row, value in values if value > 0}
    # Not `<= 0`: a NaN is what cannot be compared.
    return [r for r, value in values if not value > 0 and (r.list_code, r.kind) not in judged]


def bindings(facts: TaskFacts, fact: AgentFact) -> dict[str, Binding]:
    """The binding limit of each averaging kind there is one for: "TWA", "STEL", "C"."""
    unit = sample_unit(fact)
    by_kind: dict[str, list[tuple[float, ExposureLimit]]] = {}
    for row in _answered(fact):
        value = _compared(row, fact, facts, unit)
        # Not `> 0`: a limit that cannot be converted (NaN) does not take part.
        if value > 0:
            by_kind.setdefault(row.kind, []).append((value, row))
    found = {}
    for kind, rows in by_kind.items():
        exact = _of_own_fraction(rows, fact.fraction)
        value, row = min(_without_twins(exact, unit), key=lambda one: one[0])
        tried = tuple(one[1] for one in sorted(rows, key=lambda one: one[0]))
        binding = Binding(kind, row, value, unit, tried=tried)
        found[kind] = _adjusted(facts, fact, binding)
    return found
