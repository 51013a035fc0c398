"""`assess`: the six links of a task on a day, joined. It adds nothing of its own.

Every page, paper, API answer and command prints the `Chain` made here; nothing else in the
programme decides whether a person is protected.
"""

from dataclasses import replace
from datetime import date

from exposure.models import Task
from programme.roster.models import Site, Worker
from programme.selection.chain import Chain, CrewVerdict, Link
from programme.selection.estimates import AgentEstimates, estimates
from programme.selection.facts import TaskFacts, gather
from programme.selection.links import air, face, limit, ratio, respirator_class
from programme.selection.links import filter as filter_link
from programme.selection.models import CrewMember

BEFORE_FACE = ("Air", "Limit", "Ratio", "Class")


def _waiting(links: list[Link]) -> tuple[Link, ...]:
    broken = next((one.name for one in links if one.is_broken), "")
    joined, seen = [], False
    for one in links:
        joined.append(replace(one, waits_on=broken) if seen else one)
        seen = seen or one.is_broken
    return tuple(joined)


def _chain(
    facts: TaskFacts, groups: dict[int, AgentEstimates], *, with_choices: bool = True
) -> Chain:
    agents = [groups[fact.id] for fact in facts.agents]
    asked = ratio.demand(facts, agents)
    first_four = [
        air.judge(facts, agents),
        limit.judge(facts, agents),
        ratio.judge(facts, agents, asked),
        respirator_class.judge(facts, agents, asked),
    ]
    made = filter_link.schedule(facts, agents)
    task_breaks = any(one.is_broken for one in first_four) or any(
        m.severity != "plan" for one in made.by_assembly.values() for m in one.mismatches
    )
    members = tuple(made.of(member) for member in facts.crew)
    crew = tuple(
        face.verdict(facts, member, asked, task_breaks=task_breaks, schedule=made)
        for member in facts.crew
    )
    links = [
        *first_four,
        face.judge(facts, crew),
        filter_link.judge(facts, made, members),
    ]
    return Chain(
        site_code=facts.site.code,
        site=facts.site.name,
        task_id=facts.task.pk,
        task_code=facts.task.code,
        task=facts.task.name,
        on=facts.on,
        rule_pack=facts.pack.name,
        rule_pack_title=facts.pack.title,
        edition=facts.pack.edition,
        links=_waiting(links),
        crew=crew,
        choices=respirator_class.choices(facts, agents, asked) if with_choices else (),
    )


def assess(task: Task, *, on: date) -> Chain:
    """The protection chain of one task for the shift that starts on that day."""
    facts = gather(task.site, on=on, tasks=[task])
    return _chain(facts[0], estimates(facts))


def assess_site(
    site: Site, *, on: date, tasks: list[Task] | None = None, with_choices: bool = False
) -> list[Chain]:
    """The chains of these tasks (default: all active ones) in a fixed number of queries."""
    facts = gather(site, on=on, tasks=tasks)
    groups = estimates(facts) if facts else {}
    return [_chain(one, groups, with_choices=with_choices) for one in facts]


def verdicts_of(worker: Worker, *, on: date) -> list[tuple[Chain, CrewVerdict]]:
    """The chains of the tasks this worker is on that day, each with the worker's own verdict."""
    rows = CrewMember.objects.at(worker.site).active(on).filter(worker=worker)
    tasks = list(
        Task.objects.at(worker.site).active(on).filter(pk__in=[row.task_id for row in rows])
    )
    found = []
    for chain in assess_site(worker.site, on=on, tasks=tasks):
        found += [(chain, one) for one in chain.crew if one.worker_id == worker.pk]
    return found
