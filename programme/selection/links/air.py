"""Air: what is in the air, and how sure are we?"""

from exposure.statistics.flags import SENTENCES
from programme.figures import near, unit_sign, up
from programme.selection.chain import (
    BROKEN,
    HOLDS,
    Link,
    Mismatch,
    Remedy,
    Row,
    Working,
    state_of,
)
from programme.selection.estimates import CANNOT, AgentEstimates, Estimate
from programme.selection.facts import TaskFacts
from programme.selection.links.words import Finder

FEW = 6
STATISTIC_SAYS = {
    "upper70": "larger of the 70 % upper limit of the 95th percentile and the highest result",
    "upper95": "larger of the 95 % upper limit of the 95th percentile and the highest result",
}
BASIS_SAYS = {
    "lognormal": "upper limit exp(mean of logs + k × sd of logs), k from the noncentral t",
    "maximum likelihood": "maximum likelihood with the results below detection as such",
    "few results": "posterior of the 95th percentile under a weakly informative prior on the spread",
    "all below detection": "highest detection limit raised for the number of results, GSD taken 2.2",
    "identical results": "posterior of the 95th percentile; identical results show no spread",
}
KIND_SAYS = {"TWA": "over the shift", "STEL": "short term", "C": "ceiling"}


def _figure(value: float, unit: str) -> str:
    return f"{up(value)} {unit_sign(unit)}" if value == value else "not estimable"


def working(one: AgentEstimates, estimate: Estimate, facts: TaskFacts) -> Working:
    """How the figures of one group came about."""
    unit = estimate.unit
    policy = facts.site.statistic
    rows = [
        Row("Results", f"{estimate.n}, of which {estimate.n_censored} below detection"),
        Row("Geometric mean", _figure(estimate.gm, unit)),
        Row("Geometric standard deviation", near(estimate.gsd)),
        Row("95th percentile, estimate", _figure(estimate.x95, unit)),
        Row("95th percentile, 70 % upper limit", _figure(estimate.x95_upper70, unit)),
        Row("95th percentile, 95 % upper limit", _figure(estimate.x95_upper95, unit)),
        Row("Highest result", _figure(estimate.highest, unit)),
        Row("How", BASIS_SAYS.get(estimate.basis, estimate.basis)),
        Row("Statistic (site setting)", STATISTIC_SAYS[policy]),
    ]
    rows += [Row("Note", SENTENCES[flag]) for flag in estimate.flags if flag in SENTENCES]
    rows += [Row("Left out", f"{count} {reason}") for reason, count in sorted(one.left_out.items())]
    return Working(
        title=f"{one.fact.agent.name}, {KIND_SAYS[estimate.kind]}: "
        f"{_figure(estimate.governing, unit)}",
        formula="statistic = max(upper limit of the 95th percentile, highest result)",
        rows=tuple(rows),
        source="EN 689:2018 group test confidence; noncentral t and profile likelihood",
        sure="computed",
        figures={
            name: getattr(estimate, name)
            for name in (
                "n",
                "n_censored",
                "gm",
                "gsd",
                "x95",
                "x95_upper70",
                "x95_upper95",
                "highest",
                "governing",
            )
        }
        | {"unit": unit, "kind": estimate.kind, "agent": one.fact.agent.name},
    )


def _of_agent(one: AgentEstimates, facts: TaskFacts, find: Finder) -> list[Mismatch]:
    name = one.fact.agent.name
    add = Remedy("Record a sample", "exposure:sample_add", (), f"?task_agent={one.fact.id}")
    sheet = Remedy("Import a laboratory sheet", "records:import_start", ("samples",))
    left = ", ".join(f"{count} {reason}" for reason, count in sorted(one.left_out.items()))
    usable = sum(e.n for e in one.estimates.values())
    if not one.bindings:
        # Without a limit nothing can be estimated against it; the Limit link says what is missing.
        if len(one.fact.samples) > one.left_out.total():
            return []
        says = f"{name}: not assessed, no usable air sample."
        return [find.stop("exposure-unknown", says, add, sheet)]
    if usable == 0:
        also = f" Left out: {left}." if left else ""
        if any("before the change" in reason for reason in one.left_out):
            return [
                find.fix(
                    "sample-before-change",
                    f"{name}: no sample since the work changed on {facts.task.changed_on}.{also}",
                    add,
                    sheet,
                )
            ]
        return [
            find.stop(
                "exposure-unknown",
                f"{name}: not assessed, no usable air sample.{also}",
                add,
                sheet,
            )
        ]
    return [*_other_unit(one, find, add), *_of_usable(one, find, add, sheet)]


def _other_unit(one: AgentEstimates, find: Finder, add: Remedy) -> list[Mismatch]:
    count = sum(n for reason, n in one.left_out.items() if CANNOT in reason)
    if not count:
        return []
    says = (
        f"{one.fact.agent.name}: {count} result(s) in a unit that cannot be compared with "
        f"{unit_sign(one.unit)}."
    )
    return [find.fix("sample-unit", says, add, clause="unit-mismatch")]


def _of_usable(one: AgentEstimates, find: Finder, *remedies: Remedy) -> list[Mismatch]:
    name, add = one.fact.agent.name, remedies[0]
    usable = sum(e.n for e in one.estimates.values())
    found = []
    twa = one.estimates.get("TWA")
    if twa is not None and twa.n == 0:
        says = f"{name}: {usable} short-term results but none over the shift."
        found.append(find.stop("exposure-unknown", says, *remedies))
    elif one.governing is None:
        says = f"{name}: its results allow no estimate."
        found.append(find.stop("exposure-unknown", says, *remedies))
    elif twa is not None and twa.n < FEW:
        says = f"{name}: {twa.n} results; at least {FEW} settle the spread."
        found.append(find.plan("sample-few", says, add))
    return found


def judge(facts: TaskFacts, agents: list[AgentEstimates]) -> Link:
    """Whether every agent of the task has an estimate, and from what."""
    find = Finder(facts.pack, "Air")
    if not agents:
        says = "No agent is recorded for this task: what is in the air is not known."
        remedy = Remedy("Add an agent", "exposure:task_agent_add", (facts.task.pk,))
        missing = find.stop("agent-missing", says, remedy, clause="exposure-unknown")
        return Link("Air", BROKEN, "not assessed", "no agent recorded", (missing,))
    workings = tuple(
        working(one, estimate, facts)
        for one in agents
        for estimate in one.estimates.values()
        if estimate.n
    )
    if facts.task.is_idlh:
        note = "declared immediately dangerous: treated as such whatever was measured"
        figure = "immediately dangerous"
        return Link("Air", HOLDS, figure, note, (), workings)
    mismatches = tuple(m for one in agents for m in _of_agent(one, facts, find))
    figure, basis = _headline(agents)
    return Link("Air", state_of(mismatches), figure, basis, mismatches, workings)


def _headline(agents: list[AgentEstimates]) -> tuple[str, str]:
    known = [one for one in agents if one.governing]
    if not known:
        return "not assessed", f"{len(agents)} agent(s), no usable sample"
    worst = max(known, key=lambda one: one.governing.ratio if one.governing else 0)
    estimate = worst.governing
    if estimate is None:
        return "not assessed", ""
    below = f", {estimate.n_censored} below detection" if estimate.n_censored else ""
    more = f"; {len(agents)} agents" if len(agents) > 1 else ""
    return (
        f"{up(estimate.governing)} {unit_sign(estimate.unit)}",
        f"upper estimate, {worst.fact.agent.name}; {estimate.n} samples{below}{more}",
    )
