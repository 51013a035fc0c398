"""Rows of a laboratory's sheet as air samples."""

import hashlib
from collections import Counter, defaultdict
from collections.abc import Iterable
from datetime import date
from statistics import median

from exposure.models import Agent, Fraction, Sample, Task, TaskAgent, Unit
from exposure.units import normalise
from programme.figures import near, unit_sign
from programme.records.intake.fields import SAMPLES
from programme.records.intake.matching import Matching
from programme.records.intake.names import AgentBook, WorkerBook, cas_fault, folded, some
from programme.records.intake.preview import Preview, PreviewRow
from programme.records.intake.row_reader import RowReader
from programme.records.intake.table import Table
from programme.roster.models import Site, Worker

EARLIEST = date(1970, 1, 1)
LARGEST = 1e6
COLUMNS = (
    "Task", "Agent", "Date", "Worker", "Result", "Kept as", "Minutes", "Where", "Span", "Number",
)  # fmt: skip
# A reported volume may be corrected for temperature and pressure; more than this is a slip.
VOLUME_AGREES_WITHIN = 0.10
# A factor of 1000 off the group's middle is what a slip of unit looks like.
SLIP_FACTOR = 300.0
_FEWEST_FOR_SLIP = 3
_SHORT_MINUTES, _FULL_MINUTES = 30.0, 120.0
_FIELDS = {field.key: field for field in SAMPLES}

_WHERE = {
    "personal": "personal", "p": "personal", "pers": "personal", "breathing zone": "personal",
    "personal, breathing zone": "personal", "area": "area", "a": "area", "static": "area",
    "stationary": "area", "inside": "inside", "inside the facepiece": "inside",
    "in mask": "inside", "in-mask": "inside",
}  # fmt: skip
_SPAN = {
    "full": "full", "full shift": "full", "full-shift": "full", "shift": "full", "8 h": "full",
    "twa": "full", "partial": "partial", "part": "partial", "part shift": "partial",
    "partial shift": "partial", "part of the shift, taken as representative": "partial",
    "short": "short", "short term": "short", "short-term": "short", "stel": "short",
    "15 min": "short", "short term (15 min)": "short", "ceiling": "ceiling", "c": "ceiling",
    "instant": "ceiling", "peak": "ceiling", "ceiling (instant)": "ceiling",
}  # fmt: skip
_FRACTION = {folded(str(label)): value for value, label in Fraction.choices} | {
    value: value for value in Fraction.values
}


class SampleBooks:
    """Everything rows are matched against, in five queries."""

    def __init__(self, site: Site) -> None:
        self.tasks: dict[str, list[Task]] = defaultdict(list)
        self.groups: dict[int, list[TaskAgent]] = defaultdict(list)
        rows = TaskAgent.objects.at(site).select_related("agent", "task")
        for group in rows:
            self.groups[group.task_id].append(group)
        self.task_names = []
        for task in Task.objects.at(site):
            self.task_names.append(task.name)
            for name in {folded(task.name), folded(task.code)}:
                self.tasks[name].append(task)
        self.agents = AgentBook(Agent.objects.at(site))
        self.workers = WorkerBook(Worker.objects.at(site))
        self.standing: dict[tuple[int, str], str] = {}
        self.references: dict[tuple[int, str], str] = {}
        stands = Sample.objects.at(site).in_force().values_list(
            "task_agent_id", "fingerprint", "reference", "result_as_reported"
        )  # fmt: skip
        for group_id, print_, reference, reported in stands:
            self.standing[group_id, print_] = reported
            if reference:
                self.references[group_id, folded(reference)] = reported


def fingerprint_of(sample: Sample, nth: int) -> str:
    """What makes two lines of one group the same sample; `nth` tells equal lines of a file apart."""
    parts = (
        sample.worker_id, sample.sampled_on, sample.where, sample.span, sample.is_censored,
        repr(float(sample.value)), sample.unit, sample.minutes, sample.volume_l,
        folded(sample.reference), nth,
    )  # fmt: skip
    return hashlib.sha256("|".join(str(part) for part in parts).encode()).hexdigest()


def _task(reader: RowReader, books: SampleBooks) -> Task | None:
    text = reader.text("task")
    if not text:
        return None
    found = books.tasks.get(folded(text), [])
    if len(found) == 1:
        return found[0]
    if found:
        codes = some(task.code for task in found)
        reader.refuse(
            "task", f"{text!r} is the name of {len(found)} tasks; give the code: {codes}."
        )
    else:
        reader.refuse("task", f"{text!r} is no task here; known are {some(books.task_names)}.")
    return None


def _agents(reader: RowReader, books: SampleBooks, groups: list[TaskAgent]) -> set[Agent]:
    """The agents the text may mean within this task; refused with the reason if there is none."""
    text = reader.text("agent")
    if not text:
        return set()
    if fault := cas_fault(text):
        reader.refuse("agent", f"{fault}.")
        return set()
    here = AgentBook(group.agent for group in groups)
    if exact := here.find(text):
        return exact
    listed = some(group.agent.name for group in groups) or "none yet"
    if books.agents.find(text):
        reader.refuse(
            "agent", f"{text!r} is not listed for the task; listed are {listed}. Add it first."
        )
        return set()
    near_by = here.begins(text)
    if len(near_by) == 1:
        reader.ask(f"Agent: {text!r} is read as {next(iter(near_by))}.")
        return near_by
    reader.refuse(
        "agent", f"{text!r} is not known; give a name, synonym or CAS number of {listed}."
    )
    return set()


def _group(reader: RowReader, books: SampleBooks) -> TaskAgent | None:
    task = _task(reader, books)
    if task is None:
        # Read for its own faults, so that one refusal does not hide another.
        if fault := cas_fault(reader.text("agent")):
            reader.refuse("agent", f"{fault}.")
        return None
    groups = books.groups.get(task.pk, [])
    agents = _agents(reader, books, groups)
    fraction = reader.choice("fraction", _FRACTION)
    if not agents:
        return None
    found = [group for group in groups if group.agent in agents]
    if fraction:
        found = [group for group in found if group.fraction == fraction]
    if len(found) == 1:
        return found[0]
    of_task = some(f"{group.agent}, {group.get_fraction_display()}" for group in groups)
    reader.refuse(
        "fraction" if len(agents) == 1 else "agent",
        f"it does not tell one group of the task; give agent and fraction: {of_task}.",
    )
    return None


def _unit_fault(unit: Unit, agent: Agent) -> str:
    """Why this unit cannot be one of this agent; empty if it can."""
    if unit == Unit.PPM and agent.is_particulate:
        return f"ppm is a unit of gases and vapours; {agent} is a {agent.kind}, give mg/m³"
    if unit == Unit.F_CM3 and agent.kind != Agent.Kind.FIBRE:
        return f"f/cm³ counts fibres; {agent} is a {agent.kind}, give mg/m³"
    return ""


def _unit(reader: RowReader, group: TaskAgent | None) -> str:
    """The unit as reported; empty if it was refused."""
    text = reader.text("unit", at_most=20)
    if not text:
        return ""
    try:
        _, unit = normalise(1.0, text)
    except ValueError as refused:
        reader.refuse("unit", f"{str(refused).removeprefix('Unit: ')}.")
        return ""
    if group is not None and (fault := _unit_fault(unit, group.agent)):
        reader.refuse("unit", f"{fault}.")
        return ""
    return text


def _measured(reader: RowReader, sample: Sample) -> None:
    reading = reader.result("result", lod="lod", censored="censored")
    sample.minutes = reader.number("minutes", at_least=0.1, at_most=1440, unit="min")
    sample.flow_l_min = reader.number("flow", at_least=0.001, at_most=100, unit="L/min")
    sample.volume_l = reader.number("volume", at_least=0.001, at_most=1e5, unit="L")
    if reading is None:
        return
    sample.result_as_reported = reading.as_reported
    sample.is_censored = reading.is_censored
    if len(reading.as_reported) > 40:
        reader.refuse("result", "more than 40 characters are not allowed.")
    if not sample.unit_as_reported:
        return
    sample.value, sample.unit = normalise(reading.value, sample.unit_as_reported)
    if reading.lod is not None:
        sample.lod = normalise(reading.lod, sample.unit_as_reported)[0]
    if not 0 < sample.value <= LARGEST:
        reader.refuse(
            "result",
            f"{reading.as_reported} is not allowed; above 0 and at most 1 000 000 "
            f"{unit_sign(sample.unit)}.",
        )


def _sample(reader: RowReader, books: SampleBooks, today: date) -> Sample:
    group = _group(reader, books)
    sample = Sample(
        unit_as_reported=_unit(reader, group),
        where=reader.choice("where", _WHERE),
        span=reader.choice("span", _SPAN),
        sampled_on=reader.day("date", earliest=EARLIEST, latest=today, why=" (not in the future)"),
        method=reader.text("method"),
        laboratory=reader.text("laboratory"),
        reference=reader.text("reference", at_most=60),
        note=reader.text("note", at_most=2000),
    )
    if group is not None:
        sample.task_agent = group
    _measured(reader, sample)
    if text := reader.text("worker"):
        worker, fault = books.workers.find(text)
        if worker is None:
            reader.refuse("worker", fault)
        sample.worker = worker
    return sample


def _ask(reader: RowReader, sample: Sample) -> None:
    """What is possible but unlikely."""
    worker, day = sample.worker, sample.sampled_on
    if worker and day and worker.born_on and day <= worker.born_on:
        reader.refuse("date", f"{day} is not allowed; {worker.name} was born {worker.born_on}.")
    elif worker and day and day < worker.active_from:
        reader.ask(f"{worker.name} began here on {worker.active_from}, after the sample.")
    if sample.minutes and sample.flow_l_min and sample.volume_l:
        drawn = sample.minutes * sample.flow_l_min
        if abs(drawn - sample.volume_l) > VOLUME_AGREES_WITHIN * drawn:
            reader.ask(
                f"Volume: {near(sample.volume_l)} L, but {near(sample.minutes)} min at "
                f"{near(sample.flow_l_min)} L/min are {near(drawn)} L."
            )
    if sample.span == Sample.Span.SHORT and (sample.minutes or 0) > _SHORT_MINUTES:
        reader.ask(f"Span: short term, but {near(sample.minutes)} minutes.")
    if sample.span == Sample.Span.FULL and 0 < (sample.minutes or 0) < _FULL_MINUTES:
        reader.ask(f"Span: full shift, but {near(sample.minutes)} minutes only.")


def _shows(sample: Sample) -> list[str]:
    group = sample.task_agent if sample.task_agent_id else None
    kept = ""
    if sample.value is not None and sample.unit:
        # Six digits: what is kept is shown, not judged, so no rounding up.
        sign = "below " if sample.is_censored else ""
        kept = f"{sign}{near(sample.value, 6)} {unit_sign(sample.unit)}"
    return [
        group.task.name if group else "",
        group.agent.name if group else "",
        sample.sampled_on.isoformat() if sample.sampled_on else "",
        sample.worker.name if sample.worker else "",
        f"{sample.result_as_reported} {unit_sign(sample.unit_as_reported)}".strip(),
        kept,
        near(sample.minutes) if sample.minutes else "",
        sample.where,
        sample.span,
        sample.reference,
    ]


def _settle(rows: Iterable[PreviewRow], books: SampleBooks) -> None:
    """Fingerprints, and which rows stand already."""
    met: Counter[tuple[int, str]] = Counter()
    for row in rows:
        sample = row.record
        if row.problems:
            continue
        plain = (sample.task_agent_id, fingerprint_of(sample, 0))
        met[plain] += 1
        sample.fingerprint = fingerprint_of(sample, met[plain])
        key = (sample.task_agent_id, sample.fingerprint)
        if key in books.standing:
            row.known_as = f"{books.standing[key]} of {sample.sampled_on}"
            continue
        stands = books.references.get((sample.task_agent_id, folded(sample.reference)))
        if sample.reference and stands is not None:
            row.questions.append(
                f"Sample number {sample.reference} stands already, with {stands}. "
                "To correct a sample, correct it on its own page."
            )


def _ask_slips(rows: Iterable[PreviewRow]) -> None:
    """A result a thousand times off the others of its group is asked about."""
    values: dict[tuple, list[tuple[float, PreviewRow]]] = defaultdict(list)
    for row in rows:
        if not row.problems:
            sample = row.record
            key = (sample.task_agent_id, sample.unit, sample.span)
            values[key].append((sample.value, row))
    for found in values.values():
        if len(found) < _FEWEST_FOR_SLIP:
            continue
        middle = median(value for value, _ in found)
        for value, row in found:
            if not middle / SLIP_FACTOR < value < middle * SLIP_FACTOR:
                row.questions.append(
                    f"Result: {row.record.result_as_reported} is more than {SLIP_FACTOR:g} "
                    "times off the middle of this file; is the unit right?"
                )


def preview_samples(table: Table, matching: Matching, *, site: Site, today: date) -> Preview:
    """Judge every row of a laboratory's sheet; five queries, whatever its length.

    Args:
        table: header and rows.
        matching: which column means what.
        site: whose samples.
        today: the day at the site; a later sample is refused.
    """
    books = SampleBooks(site)
    rows = []
    for line in table.lines:
        reader = RowReader(_FIELDS, table, matching, line)
        sample = _sample(reader, books, today)
        _ask(reader, sample)
        reader.row.record = sample
        reader.row.shows = _shows(sample)
        rows.append(reader.row)
    _settle(rows, books)
    _ask_slips(rows)
    return Preview(COLUMNS, rows)
