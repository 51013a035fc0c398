"""Rows of a fit-test file as fit tests; the overall figure is worked out, never taken over."""

from collections import defaultdict
from collections.abc import Iterable
from datetime import date

from programme.equipment.models import FacepieceSize
from programme.figures import down
from programme.fit.actions import Draft, Entered, drafted
from programme.fit.models import FitTest
from programme.fit.outcome import HIGHEST_FIT_FACTOR, disagreement, slots_of
from programme.measured import shown_number
from programme.records.intake.fields import EXERCISES, FIT_TESTS
from programme.records.intake.matching import Matching
from programme.records.intake.names import WorkerBook, folded, some
from programme.records.intake.preview import Preview, PreviewRow
from programme.records.intake.row_reader import RowReader
from programme.records.intake.table import Table
from programme.roster.models import Site, Worker
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import Protocol

EARLIEST = date(1970, 1, 1)
COLUMNS = (
    "Worker", "Facepiece", "Date", "Protocol", "Figures", "Overall, worked out", "As reported",
    "Outcome", "Tester",
)  # fmt: skip
_FIELDS = {field.key: field for field in FIT_TESTS}
_OUTCOMES = {
    "passed": "passed", "pass": "passed", "p": "passed", "yes": "passed", "y": "passed",
    "failed": "failed", "fail": "failed", "f": "failed", "no": "failed", "n": "failed",
    "incomplete": "incomplete", "not finished": "incomplete",
}  # fmt: skip


class FitBooks:
    """Everything rows are matched against, in three queries."""

    def __init__(self, site: Site, pack: RulePack) -> None:
        self.pack = pack
        self.workers = WorkerBook(Worker.objects.at(site))
        self.sizes: dict[str, list[FacepieceSize]] = defaultdict(list)
        for size in FacepieceSize.objects.at(site).select_related("facepiece"):
            self.sizes[folded(size.facepiece.name)].append(size)
        self.standing = set(
            FitTest.objects.at(site).in_force().values_list("worker_id", "fingerprint")
        )
        self.protocols = {
            name: protocol
            for protocol in pack.protocols
            for name in (folded(protocol.id), folded(protocol.name))
        }


def _size(reader: RowReader, books: FitBooks) -> FacepieceSize | None:
    name, label = reader.text("facepiece"), reader.text("size", at_most=20)
    if not name:
        return None
    sizes = books.sizes.get(folded(name), [])
    if not sizes:
        known = some(size.facepiece.name for rows in books.sizes.values() for size in rows)
        reader.refuse("facepiece", f"{name!r} is no facepiece here; known are {known or 'none'}.")
        return None
    if not label:
        return None
    for size in sizes:
        if folded(size.label) == folded(label):
            return size
    reader.refuse("size", f"{label!r} is no size of {name}; {some(size.label for size in sizes)}.")
    return None


def _protocol(reader: RowReader, books: FitBooks) -> Protocol | None:
    text = reader.text("protocol")
    if not text:
        return None
    protocol = books.protocols.get(folded(text))
    if protocol is None:
        known = some(row.name for row in books.pack.protocols)
        reader.refuse("protocol", f"{text!r} is no protocol of {books.pack.name}; {known}.")
    return protocol


def _figures(reader: RowReader, protocol: Protocol) -> tuple[float | None, ...]:
    """The fit factors in the order of the protocol; more figures than it has are refused."""
    slots = slots_of(protocol)
    figures = [
        reader.number(f"exercise_{place}", at_least=1, at_most=HIGHEST_FIT_FACTOR)
        for place in range(1, EXERCISES + 1)
    ]
    for place in range(len(slots) + 1, EXERCISES + 1):
        if figures[place - 1] is not None:
            reader.refuse(f"exercise_{place}", f"{protocol.name} has {len(slots)} figures only.")
    return tuple((figures + [None] * len(slots))[: len(slots)])


def _reported(reader: RowReader) -> tuple[str, float | None]:
    text = reader.text("overall", at_most=40)
    value = reader.number("overall", at_least=1, at_most=HIGHEST_FIT_FACTOR) if text else None
    return text, value


def _passed(reader: RowReader, protocol: Protocol, outcome: str) -> bool | None:
    if protocol.is_quantitative:
        return None
    if not outcome:
        reader.refuse("outcome", "is empty; a qualitative test is passed, failed or incomplete.")
    return {"passed": True, "failed": False}.get(outcome)


def _entered(reader: RowReader, books: FitBooks, today: date) -> Entered | None:
    worker = None
    if name := reader.text("worker"):
        worker, fault = books.workers.find(name)
        if worker is None:
            reader.refuse("worker", fault)
    size, protocol = _size(reader, books), _protocol(reader, books)
    day = reader.day("date", earliest=EARLIEST, latest=today, why=" (not in the future)")
    outcome = reader.choice("outcome", _OUTCOMES)
    reported, _ = _reported(reader)
    figures = _figures(reader, protocol) if protocol else ()
    is_passed = _passed(reader, protocol, outcome) if protocol else None
    texts = {
        "element_used": reader.text("element"),
        "tester": reader.text("tester"),
        "note": reader.text("note", at_most=300),
    }
    if worker is None or size is None or protocol is None or day is None:
        return None
    return Entered(
        worker, size, day, protocol.id, figures, is_passed, as_reported=reported, **texts
    )


def _ask(reader: RowReader, entered: Entered, draft: Draft) -> None:
    worker, day = entered.worker, entered.tested_on
    if worker.born_on and day <= worker.born_on:
        reader.refuse("date", f"{day} is not allowed; {worker.name} was born {worker.born_on}.")
    elif day < worker.active_from:
        reader.ask(f"{worker.name} began here on {worker.active_from}, after the test.")
    withdrawn = entered.size.facepiece.withdrawn_on
    if withdrawn and day >= withdrawn:
        reader.ask(f"{entered.size.facepiece} was withdrawn on {withdrawn}.")
    figures = [figure for figure in entered.fit_factors if figure is not None]
    if entered.fit_factors and not figures:
        reader.ask(
            "No exercise has a figure: the test is kept as incomplete, which is never a pass. "
            "An overall figure alone cannot be checked."
        )
    elif draft.judged.outcome == "incomplete":
        reader.ask(draft.judged.says)
    reported = _reported(RowReader(_FIELDS, reader.table, reader.matching, reader.line))[1]
    if says := disagreement(reported, draft.judged, figures):
        reader.ask(f"Overall: {says}")
    _ask_outcome(reader, draft)


def _ask_outcome(reader: RowReader, draft: Draft) -> None:
    text = shown_number(reader.raw("outcome"))
    said = _OUTCOMES.get(folded(text))
    if said and said != draft.judged.outcome:
        reader.ask(f"Outcome: the file says {said}; by its figures it is {draft.judged.outcome}.")


def _shows(entered: Entered, draft: Draft, protocol: Protocol) -> list[str]:
    return [
        entered.worker.name,
        str(entered.size),
        entered.tested_on.isoformat(),
        protocol.name,
        " · ".join("–" if ff is None else down(ff) for ff in entered.fit_factors),
        down(draft.judged.overall) if draft.judged.overall else "",
        entered.as_reported,
        draft.judged.outcome,
        entered.tester,
    ]


def _as_typed(reader: RowReader) -> list[str]:
    keys = ("worker", "facepiece", "date", "protocol", "", "", "overall", "outcome", "tester")
    return [shown_number(reader.raw(key)) if key else "" for key in keys]


def _row(reader: RowReader, books: FitBooks, today: date, batch: str) -> PreviewRow:
    row = reader.row
    entered = _entered(reader, books, today)
    row.shows = _as_typed(reader)
    if entered is None or row.problems:
        return row
    try:
        draft = drafted(entered, pack=books.pack, batch=batch)
    except ValueError as refused:
        reader.refuse("protocol", f"{str(refused).removeprefix('Protocol: ')}.")
        return row
    _ask(reader, entered, draft)
    row.shows = _shows(entered, draft, books.pack.protocol(entered.protocol))
    row.record = draft
    return row


def _settle(rows: Iterable[PreviewRow], books: FitBooks) -> None:
    """Which tests stand already, in the records or higher up in the file."""
    met: dict[tuple[int, str], int] = {}
    for row in rows:
        if row.problems:
            continue
        test = row.record.test
        key = (test.worker_id, test.fingerprint)
        if key in books.standing:
            row.known_as = f"{test.size} of {test.tested_on}"
        elif key in met:
            row.known_as = f"row {met[key]} of this file"
        met.setdefault(key, row.number)


def preview_fit_tests(
    table: Table, matching: Matching, *, site: Site, today: date, pack: RulePack, batch: str = ""
) -> Preview:
    """Judge every row of a fit-test file; three queries, whatever its length.

    Args:
        table: header and rows.
        matching: which column means what.
        site: whose workers and facepieces.
        today: the day at the site; a later test is refused.
        pack: gives protocols and pass levels.
        batch: kept with every test, so that all can be undone together.
    """
    books = FitBooks(site, pack)
    rows = [
        _row(RowReader(_FIELDS, table, matching, line), books, today, batch) for line in table.lines
    ]
    _settle(rows, books)
    return Preview(COLUMNS, rows)
