"""Limit: which limit binds here?"""

from programme.figures import near, unit_sign
from programme.selection.chain import Link, Remedy, Row, Working, state_of
from programme.selection.estimates import AgentEstimates
from programme.selection.facts import TaskFacts
from programme.selection.limits import KIND_SAYS, Binding, not_comparable
from programme.selection.links.words import Finder

LONG_SHIFT_H = 8.0


def _working(one: AgentEstimates, binding: Binding) -> Working:
    row = binding.limit
    tried = [
        Row(
            f"Tried: {other.list_code} {other.get_kind_display()}",
            f"{near(other.value)} {unit_sign(other.unit)}, {other.get_fraction_display()}"
            + (f" ({other.note})" if other.note else ""),
            other.source,
            other.sure,
        )
        for other in binding.tried
        if other.pk != row.pk
    ]
    rows = [
        Row("List", f"{row.list_code} {row.edition}".strip()),
        Row(
            "As printed",
            f"{near(row.value)} {unit_sign(row.unit)}",
            row.source,
            row.sure,
        ),
        Row("Fraction", row.get_fraction_display()),
    ]
    if row.note:
        rows.append(Row("Note", row.note))
    if binding.adjusted_by:
        rows.append(
            Row(
                "For this shift",
                binding.adjusted_by,
                binding.adjusted_source,
                binding.adjusted_sure,
            )
        )
    if binding.unit != row.unit:
        rows.append(Row("Compared as", f"{binding.says} (at the air of the site)"))
    return Working(
        title=f"{one.fact.agent.name}, {KIND_SAYS[binding.kind]}: {binding.says}",
        formula="lowest limit of the lists the site holds itself to, same fraction",
        rows=tuple(rows + tried),
        source=row.source,
        sure=row.sure,
        figures={
            "limit": binding.value,
            "unit": binding.unit,
            "kind": binding.kind,
            "agent": one.fact.agent.name,
        },
    )


def judge(facts: TaskFacts, agents: list[AgentEstimates]) -> Link:
    """Whether every agent has a limit that its results can be compared with."""
    find = Finder(facts.pack, "Limit")
    found, workings = [], []
    for one in agents:
        if not one.bindings:
            agent = one.fact.agent
            lists = ", ".join((*facts.pack.limit_lists, *facts.site.adopted_limit_lists, "SITE"))
            says = f"{agent.name}: no limit for the {one.fact.fraction} fraction in {lists}."
            remedy = Remedy("Add a limit of the site", "exposure:limit_add", (agent.pk,))
            found.append(find.stop("limit-missing", says, remedy))
        else:
            found += _other_unit(facts, one, find)
        workings += [_working(one, binding) for binding in one.bindings.values()]
        found += _long_shift(facts, one, find)
    figure, basis = _headline(agents)
    return Link("Limit", state_of(found), figure, basis, tuple(found), tuple(workings))


def _other_unit(facts: TaskFacts, one: AgentEstimates, find: Finder) -> list:
    found = []
    for row in not_comparable(facts, one.fact):
        says = (
            f"{one.fact.agent.name}: the {row.list_code} {KIND_SAYS[row.kind]} of "
            f"{near(row.value)} {unit_sign(row.unit)} cannot be compared with results in "
            f"{unit_sign(one.unit)}."
        )
        remedy = Remedy("Record a sample in its unit", "exposure:sample_add", ())
        found.append(find.fix("limit-unit", says, remedy, clause="unit-mismatch"))
    return found


def _long_shift(facts: TaskFacts, one: AgentEstimates, find: Finder) -> list:
    twa = one.bindings.get("TWA")
    # Not `<=`: an unknown shift length must not pass as a normal one.
    if facts.task.shift_h <= LONG_SHIFT_H or twa is None or twa.adjusted_by:
        return []
    says = (
        f"{one.fact.agent.name}: the 8-hour limit is used unadjusted for a "
        f"{near(facts.task.shift_h)} h shift."
    )
    remedy = Remedy("Add an adjusted limit of the site", "exposure:limit_add", (one.fact.agent.pk,))
    if twa.limit.list_code == "SITE":
        return []
    return [find.plan("shift-unadjusted", says, remedy, clause="limit-extended-shift")]


def _headline(agents: list[AgentEstimates]) -> tuple[str, str]:
    with_limit = [one for one in agents if one.bindings]
    if not with_limit:
        return "no limit", "no agent has one"

    def ratio(one: AgentEstimates) -> float:
        return one.governing.ratio if one.governing else -1.0

    worst = max(with_limit, key=ratio)
    binding = worst.governing.binding if worst.governing else next(iter(worst.bindings.values()))
    return binding.says, f"{KIND_SAYS[binding.kind]}, {worst.fact.agent.name}"
