"""Everything the six links judge, read in a fixed number of queries.

`gather` asks the database; nothing here decides. Rows become small frozen objects, so that the
links can be judged without a database, for one task or for a whole site.
"""

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field
from datetime import date, datetime, time, timedelta
from zoneinfo import ZoneInfo

from django.db.models import Count, F, FloatField, Min, Q, Sum, Value
from django.db.models.functions import Cast

from exposure.models import Agent, ExposureLimit, Sample, Task, TaskAgent
from programme.equipment.models import Assembly, FilterChange
from programme.fit.models import FitTest
from programme.roster.models import Clearance, SealNote, Site, Training
from programme.rulepack.load import load
from programme.rulepack.pack import RulePack
from programme.selection.models import CrewMember, TaskAssembly

MIDNIGHT_H = 24.0


@dataclass(frozen=True, slots=True)
class SampleFact:
    """One result of a group: its value in its own unit, or its detection limit if censored."""

    value: float
    is_censored: bool
    lod: float | None
    unit: str
    sampled_on: date
    where: str
    span: str
    worker_id: int | None


@dataclass(frozen=True, slots=True)
class AgentFact:
    """One agent of a task with its limits (all lists the site holds itself to) and samples."""

    id: int
    agent: Agent
    form: str
    fraction: str
    mmad_um: float | None
    gsd: float | None
    dust_load_mg_m3: float | None
    cake: str
    limits: tuple[ExposureLimit, ...]
    samples: tuple[SampleFact, ...]


@dataclass(frozen=True, slots=True)
class FitFact:
    """A fit test in force: its overall factor recomputed from its counted exercises."""

    id: int
    size_id: int
    facepiece_id: int
    size: str
    tested_on: date
    protocol: str
    outcome: str
    overall_fit_factor: float | None
    lowest_fit_factor: float | None
    counted: int


@dataclass(frozen=True, slots=True)
class WorkerFact:
    """One person and the newest of each kind of record that stands on the day."""

    id: int
    name: str
    personnel_number: str
    active_from: date
    active_to: date | None
    clearance: Clearance | None = None
    training: Training | None = None
    hair_note: SealNote | None = None
    face_changed_on: date | None = None
    fit_tests: tuple[FitFact, ...] = ()
    changes: dict[int, FilterChange] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class CrewFact:
    """A worker on a task: the assembly and size worn there."""

    worker: WorkerFact
    assembly: Assembly | None
    size_id: int | None
    size: str
    size_facepiece_id: int | None


@dataclass(frozen=True, slots=True)
class TaskFacts:
    """All that is known of one task for one day."""

    site: Site
    pack: RulePack
    task: Task
    on: date
    agents: tuple[AgentFact, ...]
    assigned: tuple[Assembly, ...]
    crew: tuple[CrewFact, ...]
    shelf: tuple[Assembly, ...]
    tested_sizes: dict[int, frozenset[int]]

    @property
    def last_day(self) -> date:
        """The day the shift ends: a test that lapses at midnight lapses mid-shift."""
        start_h = self.task.starts_at.hour + self.task.starts_at.minute / 60
        return self.on + timedelta(days=int((start_h + self.task.shift_h) > MIDNIGHT_H))


def _newest(rows: Iterable, key: str = "worker_id") -> dict:
    """The first row of each worker; the rows must come newest first."""
    found: dict = {}
    for row in rows:
        found.setdefault(getattr(row, key), row)
    return found


def _fit_tests(workers: Q, on: date) -> dict[int, list[FitFact]]:
    counted = Q(exercises__is_counted=True)
    penetration = Value(1.0, output_field=FloatField()) / Cast(
        F("exercises__fit_factor"), FloatField()
    )
    rows = (
        FitTest.objects.in_force()
        .filter(workers, tested_on__lte=on)
        .annotate(
            penetration=Sum(penetration, filter=counted),
            counted=Count("exercises__fit_factor", filter=counted),
            expected=Count("exercises", filter=counted),
            lowest=Min("exercises__fit_factor", filter=counted),
        )
        .order_by("-tested_on", "-pk")
        .values_list(
            "worker_id",
            "pk",
            "size_id",
            "size__facepiece_id",
            "size__label",
            "tested_on",
            "protocol",
            "outcome",
            "penetration",
            "counted",
            "expected",
            "lowest",
        )
    )
    found: dict[int, list[FitFact]] = defaultdict(list)
    for (
        worker,
        pk,
        size_id,
        facepiece,
        size,
        day,
        protocol,
        outcome,
        pen,
        n,
        all_n,
        low,
    ) in rows:
        # Harmonic mean: only where every counted exercise has its figure. Twelve digits, so that
        # a sum of reciprocals does not bring a test of exactly the pass level under it.
        overall = float(f"{n / pen:.12g}") if pen and n and n == all_n else None
        found[worker].append(
            FitFact(pk, size_id, facepiece, size, day, protocol, outcome, overall, low, n)
        )
    return found


def _end_of(on: date, site: Site) -> datetime:
    """The midnight that ends a day at the site."""
    return datetime.combine(on + timedelta(days=1), time.min, tzinfo=ZoneInfo(site.time_zone))


def _worker_facts(
    members: list[CrewMember], workers: Q, on: date, *, site: Site
) -> dict[int, WorkerFact]:
    clearances = _newest(
        Clearance.objects.in_force()
        .filter(workers, decided_on__lte=on)
        .order_by("-decided_on", "-pk")
    )
    trainings = _newest(
        Training.objects.in_force()
        .filter(workers, trained_on__lte=on)
        .order_by("-trained_on", "-pk")
    )
    notes = (
        SealNote.objects.in_force().filter(workers, noted_on__lte=on).order_by("-noted_on", "-pk")
    )
    hair: dict[int, SealNote] = {}
    changed: dict[int, date] = {}
    for note in notes:
        if note.kind == SealNote.Kind.FACE_CHANGE:
            changed.setdefault(note.worker_id, note.noted_on)
        else:
            hair.setdefault(note.worker_id, note)
    tests = _fit_tests(workers, on)
    filters: dict[int, dict[int, FilterChange]] = defaultdict(dict)
    changes = FilterChange.objects.in_force().filter(workers, fitted_at__lt=_end_of(on, site))
    for change in changes.order_by("-fitted_at", "-pk"):
        filters[change.worker_id].setdefault(change.assembly_id, change)
    found = {}
    for member in members:
        one = member.worker
        found[one.pk] = WorkerFact(
            one.pk,
            one.name,
            one.personnel_number,
            one.active_from,
            one.active_to,
            clearances.get(one.pk),
            trainings.get(one.pk),
            hair.get(one.pk),
            changed.get(one.pk),
            tuple(tests.get(one.pk, ())),
            filters.get(one.pk, {}),
        )
    return found


def _agent_facts(site: Site, pack: RulePack, tasks: list[Task], on: date) -> dict[int, list]:
    rows = list(TaskAgent.objects.filter(task__in=tasks).select_related("agent"))
    lists = [*pack.limit_lists, *site.adopted_limit_lists, "SITE"]
    limits: dict[int, list[ExposureLimit]] = defaultdict(list)
    standing = Q(withdrawn_on=None) | Q(withdrawn_on__gt=on)
    for limit in ExposureLimit.objects.at(site).filter(
        standing, list_code__in=lists, agent__in={row.agent_id for row in rows}
    ):
        limits[limit.agent_id].append(limit)
    samples: dict[int, list[SampleFact]] = defaultdict(list)
    values = (
        Sample.objects.in_force()
        .filter(task_agent__in=[row.pk for row in rows], sampled_on__lte=on)
        .order_by("sampled_on", "pk")
        .values_list(
            "task_agent_id",
            "value",
            "is_censored",
            "lod",
            "unit",
            "sampled_on",
            "where",
            "span",
            "worker_id",
        )
    )
    for task_agent, *rest in values:
        samples[task_agent].append(SampleFact(*rest))
    found: dict[int, list[AgentFact]] = defaultdict(list)
    for row in rows:
        found[row.task_id].append(
            AgentFact(
                row.pk,
                row.agent,
                row.form,
                row.fraction,
                row.mmad_um,
                row.gsd,
                row.dust_load_mg_m3,
                row.cake,
                tuple(limits[row.agent_id]),
                tuple(samples[row.pk]),
            )
        )
    return found


def _assigned(tasks: list[Task], on: date) -> dict[int, list[Assembly]]:
    found: dict[int, list[Assembly]] = defaultdict(list)
    for row in (
        TaskAssembly.objects.filter(task__in=tasks)
        .active(on)
        .select_related("assembly__facepiece", "assembly__element")
    ):
        found[row.task_id].append(row.assembly)
    return found


def gather(site: Site, *, on: date, tasks: list[Task] | None = None) -> list[TaskFacts]:
    """Read what is known of these tasks (default: all active ones of the site) for one day."""
    whole_site = tasks is None
    if tasks is None:
        tasks = list(Task.objects.at(site).active(on))
    pack = load(site.rule_pack)
    agents = _agent_facts(site, pack, tasks, on)
    shelf = tuple(
        Assembly.objects.at(site)
        .filter(Q(withdrawn_on=None) | Q(withdrawn_on__gt=on))
        .select_related("facepiece", "element")
    )
    assigned = _assigned(tasks, on)
    members = list(
        CrewMember.objects.filter(task__in=tasks)
        .active(on)
        .select_related("worker", "size")
        .order_by("task_id", "worker__name")
    )
    every = {one.pk: one for one in (*shelf, *(a for rows in assigned.values() for a in rows))}
    missing = {m.assembly_id for m in members if m.assembly_id and m.assembly_id not in every}
    if missing:
        rows = Assembly.objects.filter(pk__in=missing).select_related("facepiece", "element")
        every.update({row.pk: row for row in rows})
    if whole_site:
        workers = Q(worker__site=site)
    else:
        workers = Q(worker__in=[member.worker_id for member in members])
    people = _worker_facts(members, workers, on, site=site)
    crews: dict[int, list[CrewFact]] = defaultdict(list)
    for member in members:
        size = member.size
        crews[member.task_id].append(
            CrewFact(
                people[member.worker_id],
                every.get(member.assembly_id or 0),
                member.size_id,
                size.label if size else "",
                size.facepiece_id if size else None,
            )
        )
    tested = {
        pk: frozenset(test.facepiece_id for test in one.fit_tests) for pk, one in people.items()
    }
    return [
        TaskFacts(
            site,
            pack,
            task,
            on,
            tuple(agents.get(task.pk, ())),
            tuple(assigned.get(task.pk, ())),
            tuple(crews.get(task.pk, ())),
            shelf,
            tested,
        )
        for task in tasks
    ]


def local_day(moment: datetime, site: Site) -> date:
    """The site's own date of an instant."""
    return site.today(moment)
