"""One person in sentences: what may they do, with what, until when, and on which papers."""

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date, timedelta
from typing import Any

from django.db.models import Q
from django.urls import reverse

from programme.equipment.models import FilterChange
from programme.figures import down
from programme.fit.models import FitTest
from programme.ledger.models import Entry
from programme.roster.models import Clearance, SealNote, Site, Training, Worker
from programme.selection.assess import assess_site
from programme.selection.chain import ASK, MEDICAL, PLAN, Chain, CrewVerdict, Mismatch

STATES = {
    "here": "works here",
    "coming": "starts later",
    "left": "no longer here",
    "all": "everybody",
}
READINESS = {
    "ready": "may start every task",
    "some": "may start some tasks",
    "none": "may start none",
    "free": "on no task",
}
_ORDER = ("none", "some", "ready", "free")
HISTORY_ROWS = 60


@dataclass
class PersonRow:
    """One line of the list: the worker and, over their tasks, what they may start."""

    worker: Worker
    may: int = 0
    of: int = 0
    lapses_on: date | None = None

    @property
    def ready(self) -> str:
        """One of `READINESS`."""
        if not self.of:
            return "free"
        if self.may == self.of:
            return "ready"
        return "some" if self.may else "none"

    @property
    def order(self) -> int:
        return _ORDER.index(self.ready)

    @property
    def says(self) -> str:
        return f"{self.may} of {self.of} tasks" if self.of else READINESS["free"]


def people_rows(workers: Iterable[Worker], *, site: Site, on: date) -> list[PersonRow]:
    """One row a worker; the whole site is judged once, whatever their number."""
    rows = {worker.pk: PersonRow(worker) for worker in workers}
    if not rows:
        return []
    for chain in assess_site(site, on=on):
        for one in chain.crew:
            row = rows.get(one.worker_id)
            if row is None:
                continue
            row.of += 1
            row.may += one.may_start
            if one.may_start and one.good_until is not None:
                row.lapses_on = min(row.lapses_on or one.good_until, one.good_until)
    return list(rows.values())


@dataclass(frozen=True)
class Reason:
    """One thing against a start, and the pages that mend it: (what to do, address)."""

    says: str
    mends: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True)
class Saying:
    """One task of one person as the page prints it.

    Attributes:
        reasons: what is against a start, each with its mends; empty where the person may start.
        plans: what is due soon.
        through: last day on which nothing of the person's has lapsed.
    """

    chain: Chain
    verdict: CrewVerdict
    reasons: tuple[Reason, ...]
    plans: tuple[str, ...]

    @property
    def may_start(self) -> bool:
        return self.verdict.may_start

    @property
    def through(self) -> date | None:
        lapses = self.verdict.good_until
        return None if lapses is None else lapses - timedelta(days=1)


def _mends(mismatch: Mismatch, code: str) -> tuple[tuple[str, str], ...]:
    return tuple(
        (one.says, reverse(one.page, args=[code, *one.args]) + one.query)
        for one in mismatch.remedies
        if one.page
    )


def _of_task(chain: Chain) -> list[Reason]:
    """The break of the task itself, whoever wears what."""
    broken = [link for link in chain.links if link.is_broken and link.name != "Face"]
    if not broken:
        return []
    page = reverse("selection:task", args=[chain.site_code, chain.task_id])
    says = f"The chain of {chain.task} breaks at {broken[0].name}."
    return [Reason(says, (("See the chain", page),))]


def saying_of(chain: Chain, verdict: CrewVerdict, *, sees_medical: bool) -> Saying:
    """The verdict in words for a reader who may, or may not, see what a clearance limits."""
    against = [m for m in verdict.mismatches if m.severity != PLAN]
    hidden = [m for m in against if m.code.startswith(MEDICAL) and not sees_medical]
    reasons = [Reason(f"{ASK.capitalize()}.")] if hidden else []
    reasons += [Reason(m.says, _mends(m, chain.site_code)) for m in against if m not in hidden]
    if not verdict.may_start:
        reasons += _of_task(chain)
    if not verdict.may_start and not reasons:
        reasons = [Reason("The chain does not hold; the reason is not recorded.")]
    plans = tuple(m.says for m in verdict.mismatches if m.severity == PLAN)
    return Saying(chain, verdict, tuple(reasons), plans)


@dataclass(frozen=True)
class Papers:
    """What is on file of one person, newest first; records that no longer stand come along."""

    clearances: list[tuple[Clearance, str]]
    trainings: list[tuple[Training, str]]
    seal_notes: list[SealNote]
    fit_tests: list[FitTest]
    changes: list[FilterChange]


def _limits(row: Clearance) -> str:
    hours = row.max_hours_a_shift
    said = {
        "no negative-pressure respirator": row.no_negative_pressure,
        "no self-contained breathing apparatus": row.no_scba,
        f"up to {row.get_heaviest_work_display()} work": row.heaviest_work,
        f"at most {down(hours)} h a shift": hours is not None,
        "follow-up needed": row.follow_up_needed,
        "worker has no copy yet": not row.copy_given,
    }
    return "; ".join(says for says, holds in said.items() if holds)


def _covers(training: Training) -> str:
    names = [str(family).replace("_", " ") for family in training.families]
    return ", ".join(names) or "all respirators"


def papers_of(worker: Worker, *, on: date) -> Papers:
    """All papers of the person, dated on or before that day."""
    return Papers(
        [(row, _limits(row)) for row in worker.clearances.filter(decided_on__lte=on)],
        [(row, _covers(row)) for row in worker.trainings.filter(trained_on__lte=on)],
        list(worker.seal_notes.filter(noted_on__lte=on)),
        list(worker.fit_tests.filter(tested_on__lte=on).select_related("size__facepiece")),
        list(
            worker.filter_changes.in_force().select_related("assembly").order_by("-fitted_at")[:20]
        ),
    )


def history_of(worker: Worker) -> list[Entry]:
    """The ledger's entries on the person and their papers, newest first."""
    papers: dict[str, list[Any]] = defaultdict(list)
    papers[worker._meta.label_lower] = [worker.pk]
    for relation in Worker._meta.related_objects:
        model = relation.related_model
        if relation.one_to_many and model._meta.app_label != "exposure":
            keys = model._default_manager.filter(**{relation.field.name: worker})
            papers[model._meta.label_lower] = list(keys.values_list("pk", flat=True))
    subjects = Q()
    for kind, ids in papers.items():
        if ids:
            subjects |= Q(subject_kind=kind, subject_id__in=[str(one) for one in ids])
    rows = Entry.objects.filter(subjects, chain=worker.site.code)
    return list(rows.order_by("-serial")[:HISTORY_ROWS])
