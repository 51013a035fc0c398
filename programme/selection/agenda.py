"""Today: what must not start and why, and what lapses soon; sorted out of chains, judging nothing."""

from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date, timedelta
from itertools import groupby

from programme.selection.chain import PLAN, SEVERITIES, SEVERITY_SAYS, Chain, Mismatch

MANY = 50


@dataclass(frozen=True)
class Finding:
    """One mismatch of one task."""

    chain: Chain
    mismatch: Mismatch


@dataclass(frozen=True)
class Severity:
    """The findings of one severity: the first of them, and how many there are in all."""

    key: str
    says: str
    findings: tuple[Finding, ...]
    count: int

    @property
    def more(self) -> int:
        return self.count - len(self.findings)


@dataclass(frozen=True)
class Lapse:
    """Something of one person that lapses on a day, and the tasks that stop with it."""

    day: date
    worker_id: int
    worker: str
    what: str
    tasks: tuple[str, ...]


@dataclass(frozen=True)
class Week:
    """The lapses of one week."""

    starts: date
    lapses: tuple[Lapse, ...]
    count: int

    @property
    def more(self) -> int:
        return self.count - len(self.lapses)


@dataclass(frozen=True)
class Agenda:
    """Everything the Today page shows."""

    severities: tuple[Severity, ...]
    weeks: tuple[Week, ...]
    tasks: int
    may: int
    crew: int
    crew_may: int

    @property
    def verdict(self) -> str:
        """The sentence that heads the page."""
        if not self.tasks:
            return "No task is recorded yet."
        stop = self.tasks - self.may
        if not stop:
            return f"All {self.tasks} tasks may start."
        return (
            f"{self.may} of {self.tasks} tasks may start; {stop} must not, or not with all hands."
        )


def _severities(chains: list[Chain], limit: int) -> tuple[Severity, ...]:
    found: dict[str, list[Finding]] = {key: [] for key in SEVERITIES}
    for chain in chains:
        for mismatch in chain.mismatches:
            found[mismatch.severity].append(Finding(chain, mismatch))
    return tuple(
        Severity(key, SEVERITY_SAYS[key], tuple(rows[:limit]), len(rows))
        for key, rows in found.items()
        if rows
    )


def lapses(chains: Iterable[Chain], *, on: date, days: int) -> list[Lapse]:
    """What lapses after `on` and within `days`, soonest first, one row a person, day and thing."""
    last = on + timedelta(days=days)
    found: dict[tuple[date, int, str], tuple[str, list[str]]] = {}
    for chain in chains:
        for one in chain.crew:
            for day, what in (
                (one.good_until, one.good_until_says),
                (one.filter_due_on, "filter change"),
            ):
                if day and on < day <= last:
                    rows = found.setdefault((day, one.worker_id, what), (one.worker, []))
                    rows[1].append(chain.task)
    return [
        Lapse(day, worker_id, worker, what, tuple(tasks))
        for (day, worker_id, what), (worker, tasks) in sorted(
            found.items(), key=lambda row: (row[0][0], row[1][0], row[0][2])
        )
    ]


def _weeks(rows: list[Lapse], limit: int) -> tuple[Week, ...]:
    def monday(row: Lapse) -> date:
        return row.day - timedelta(days=row.day.weekday())

    made = []
    for starts, group in groupby(rows, key=monday):
        of_week = tuple(group)
        made.append(Week(starts, of_week[:limit], len(of_week)))
    return tuple(made)


def agenda(chains: list[Chain], *, on: date, days: int, limit: int = MANY) -> Agenda:
    """Sort the chains of a site into what Today shows; at most `limit` lines a group."""
    return Agenda(
        severities=_severities(chains, limit),
        weeks=_weeks(lapses(chains, on=on, days=days), limit),
        tasks=len(chains),
        may=sum(1 for chain in chains if chain.holds),
        crew=sum(len(chain.crew) for chain in chains),
        crew_may=sum(chain.may_start for chain in chains),
    )


def against(chain: Chain) -> list[Mismatch]:
    """The mismatches that stop this task or somebody in it."""
    return [one for one in chain.mismatches if one.severity != PLAN]
