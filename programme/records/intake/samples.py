"""Rows of a laboratory's sheet as air samples."""

import re
from collections import defaultdict
from collections.abc import Iterable
from datetime import date
from statistics import median

from exposure.actions import fingerprint_of
from exposure.cas import read_cas
from exposure.models import Agent, Fraction, Sample, Task, TaskAgent
from exposure.plausible import SLIP, findings
from exposure.units import normalise
from programme.figures import near, unit_sign
from programme.records.intake.fields import SAMPLES
from programme.records.intake.matching import Matching
from programme.records.intake.names import AgentBook, WorkerBook, folded, some
from programme.records.intake.preview import NEW, Preview, PreviewRow, Problem
from programme.records.intake.row_reader import RowReader
from programme.records.intake.table import Table
from programme.roster.models import Site, Worker

EARLIEST = date(1970, 1, 1)
LARGEST = 1e6
COLUMNS = (
    "Task", "Agent", "Date", "Worker", "Result", "Kept as", "Minutes", "Where", "Span", "Number",
)  # fmt: skip
_FEWEST_FOR_SLIP = 3
_CAS_SHAPE = re.compile(r"[0-9]{2,7}-[0-9]{2}-[0-9]")
_STANDING = (
    "task_agent_id", "fingerprint", "result_as_reported", "reference", "is_censored", "unit", "value",
)  # fmt: skip
_KEY_OF = {"sampled_on": "date", "volume_l": "volume", "flow_l_min": "flow"}
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
        for group in TaskAgent.objects.at(site).select_related("agent", "task__site"):
            self.groups[group.task_id].append(group)
        self.task_names = []
        for task in Task.objects.at(site):
            self.task_names.append(task.name)
            for name in {folded(task.name), folded(task.code)}:
                self.tasks[name].append(task)
        self.agents = AgentBook(Agent.objects.at(site))
        self.workers = WorkerBook(Worker.objects.at(site))
        self.standing: dict[str, str] = {}
        self.references: dict[tuple[int, str], str] = {}
        self.values: dict[tuple[int, str], list[float]] = defaultdict(list)
        rows = Sample.objects.at(site).in_force().values_list(*_STANDING)
        for group, print_, reported, reference, is_censored, unit, value in rows:
            self.standing[print_] = reported
            if reference:
                self.references[group, folded(reference)] = reported
            if not is_censored:
                self.values[group, unit].append(value)


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


def _refuse_cas(reader: RowReader, text: str) -> bool:
    """Whether the text has the shape of a CAS number and a wrong check digit."""
    if not _CAS_SHAPE.fullmatch(text):
        return False
    try:
        read_cas(text)
    except ValueError as refused:
        reader.refuse("agent", f"{str(refused).removeprefix('CAS number: ')}.")
        return True
    return False


def _agents(reader: RowReader, books: SampleBooks, groups: list[TaskAgent]) -> set[Agent]:
    """The agents the text may mean within this task; refused with the reason if there is none."""
    text = reader.text("agent")
    if not text:
        return set()
    if _refuse_cas(reader, text):
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
        _refuse_cas(reader, reader.text("agent"))
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


def _unit(reader: RowReader) -> str:
    """The unit as reported; empty if it was refused."""
    text = reader.text("unit", at_most=20)
    if not text:
        return ""
    try:
        normalise(1.0, text)
    except ValueError as refused:
        reader.refuse("unit", f"{str(refused).removeprefix('Unit: ')}.")
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
        unit_as_reported=_unit(reader),
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


def _check(reader: RowReader, sample: Sample, today: date) -> None:
    """What the form would refuse or ask about a sample that could be read."""
    if reader.row.problems:
        return
    for finding in findings(sample, today=today):
        key = _KEY_OF.get(finding.field, finding.field)
        if finding.is_question:
            reader.ask(finding.says)
        else:
            label = f"{_FIELDS[key].label}: "
            says = finding.says.partition(": ")[2] or finding.says
            reader.refuse(key, says.removeprefix(label))


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
    """Fingerprints: which rows stand already, and which are twins within the file."""
    met: dict[str, int] = {}
    for row in rows:
        sample = row.record
        if row.problems:
            continue
        sample.fingerprint = fingerprint_of(sample)
        stands = books.standing.get(sample.fingerprint)
        if stands is not None:
            row.known_as = f"{stands} of {sample.sampled_on}"
        elif sample.fingerprint in met:
            shown = f"{sample.result_as_reported} {sample.unit_as_reported}"
            row.problems.append(
                Problem(
                    "Sample number",
                    sample.reference,
                    f"row {met[sample.fingerprint]} is the same line ({shown}); if it is another "
                    "sample, give each its sample number. For every row, {row} stands for the "
                    "row number.",
                )
            )
        else:
            met[sample.fingerprint] = row.number
            _ask_reference(row, books)


def _ask_reference(row: PreviewRow, books: SampleBooks) -> None:
    sample = row.record
    stands = books.references.get((sample.task_agent_id, folded(sample.reference)))
    if sample.reference and stands is not None:
        row.questions.append(
            f"Sample number {sample.reference} stands already, with {stands}. "
            "To correct a sample, correct it on its own page."
        )


def _ask_slips(rows: Iterable[PreviewRow], books: SampleBooks) -> None:
    """A result hundreds of times off the middle of its group is asked about."""
    groups: dict[tuple[int, str], list[PreviewRow]] = defaultdict(list)
    for row in rows:
        if row.status == NEW:
            groups[row.record.task_agent_id, row.record.unit].append(row)
    for key, found in groups.items():
        values = [row.record.value for row in found if not row.record.is_censored]
        values += books.values.get(key, [])
        if len(values) < _FEWEST_FOR_SLIP:
            continue
        middle = median(values)
        for row in found:
            value, is_censored = row.record.value, row.record.is_censored
            if value >= middle * SLIP or (value <= middle / SLIP and not is_censored):
                row.questions.append(
                    f"Result: {row.record.result_as_reported} {row.record.unit_as_reported} is "
                    f"over {SLIP:g} times off the middle of its group, {near(middle)} "
                    f"{unit_sign(key[1])}; did a unit slip by 1000?"
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
        _check(reader, sample, today)
        reader.row.record = sample
        reader.row.shows = _shows(sample)
        rows.append(reader.row)
    _settle(rows, books)
    _ask_slips(rows, books)
    return Preview(COLUMNS, rows)
