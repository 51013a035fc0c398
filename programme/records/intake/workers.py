"""Rows of a roster file as workers."""

from collections import Counter
from datetime import date

from django.core.exceptions import ValidationError

from programme.records.intake.fields import WORKERS
from programme.records.intake.matching import Matching
from programme.records.intake.preview import Preview, PreviewRow
from programme.records.intake.row_reader import RowReader
from programme.records.intake.table import Table
from programme.roster.models import Site, Worker

EARLIEST = date(1970, 1, 1)
OLDEST_BIRTH = date(1920, 1, 1)
LATEST = date(2100, 1, 1)
COLUMNS = ("Name", "Personnel number", "Job", "Employer", "Contractor", "Born on", "From", "To")
_FIELDS = {field.key: field for field in WORKERS}
_KEY_OF = {"personnel_number": "number", "name": "name", "job": "job", "employer": "employer"}
# What a later file may say otherwise without changing what stands.
_COMPARED = {"job": "job", "employer": "employer", "born_on": "date of birth",
             "active_from": "first day"}  # fmt: skip


def _worker(reader: RowReader, site: Site, today: date) -> Worker:
    name = reader.text("name")
    number = reader.text("number", at_most=40)
    born = reader.day("born", earliest=OLDEST_BIRTH, latest=today, why=" (not in the future)")
    start = reader.day("from", earliest=EARLIEST, latest=LATEST)
    end = reader.day("to", earliest=EARLIEST, latest=LATEST)
    if born and start and born >= start:
        reader.refuse("born", f"{born} is not allowed; it must be before the first day, {start}.")
    if start and end and end <= start:
        reader.refuse("to", f"{end} is not allowed; it must be after the first day, {start}.")
    if start and start > today:
        reader.ask(f"The first day, {start}, lies in the future.")
    return Worker(
        site=site,
        name=name,
        personnel_number=number,
        job=reader.text("job"),
        employer=reader.text("employer"),
        is_contractor=reader.yes_or_no("contractor"),
        born_on=born,
        active_from=start,
        active_to=end,
        wears_spectacles=reader.yes_or_no("spectacles"),
    )


def _check_model(reader: RowReader, worker: Worker) -> None:
    if reader.row.problems:
        return
    try:
        worker.clean_fields(exclude=["site"])
    except ValidationError as error:
        for name, says in error.message_dict.items():
            reader.refuse(_KEY_OF.get(name, "number"), " ".join(says))


def _compare(reader: RowReader, worker: Worker, stands: Worker) -> None:
    """The number stands already: the same person is skipped, another one is refused."""
    if stands.name.casefold() != worker.name.casefold():
        reader.refuse(
            "number",
            f"{worker.personnel_number} already belongs to {stands.name}; it must be another.",
        )
        return
    reader.row.known_as = str(stands)
    for attribute, label in _COMPARED.items():
        new, old = getattr(worker, attribute), getattr(stands, attribute)
        if new and new != old:
            reader.ask(f"{label.capitalize()}: {new} here, {old or 'nothing'} stands; it stays.")


def _shows(worker: Worker) -> list[str]:
    days = (worker.born_on, worker.active_from, worker.active_to)
    return [
        worker.name,
        worker.personnel_number,
        worker.job,
        worker.employer,
        "yes" if worker.is_contractor else "no",
        *(day.isoformat() if day else "" for day in days),
    ]


def preview_workers(table: Table, matching: Matching, *, site: Site, today: date) -> Preview:
    """Judge every row of a roster file; one query, whatever its length.

    Args:
        table: header and rows.
        matching: which column means what.
        site: whose roster.
        today: the day at the site.
    """
    standing = {worker.personnel_number: worker for worker in Worker.objects.at(site)}
    names = Counter(worker.name.casefold() for worker in standing.values())
    first_row: dict[str, int] = {}
    rows: list[PreviewRow] = []
    for line in table.lines:
        reader = RowReader(_FIELDS, table, matching, line)
        worker = _worker(reader, site, today)
        _check_model(reader, worker)
        number = worker.personnel_number
        if number and number in first_row:
            reader.refuse("number", f"{number} stands in row {first_row[number]} too; once only.")
        elif number in standing:
            _compare(reader, worker, standing[number])
        elif worker.name and names[worker.name.casefold()]:
            reader.ask(f"{worker.name} is on the roster already, under another number.")
        first_row.setdefault(number, line.number)
        if number not in standing:
            names[worker.name.casefold()] += 1
        reader.row.shows = _shows(worker)
        reader.row.record = worker
        rows.append(reader.row)
    return Preview(COLUMNS, rows)
