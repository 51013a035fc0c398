"""A day's paper: several people, one protocol, entered as one sheet, stored all or none."""

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date

from django import forms
from django.db.models import QuerySet

from programme.equipment.models import TIGHT_KINDS, FacepieceSize
from programme.fit.actions import Draft
from programme.fit.forms import Chosen, FitTestForm
from programme.fit.outcome import Judged, Slot, allowed_protocols, slots_of
from programme.measured_fields import DayField
from programme.roster.models import Site, Worker
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import Protocol

ROWS = 12
TICKS = (("", "not finished"), ("yes", "passed"), ("no", "failed"))


class HeadForm(forms.Form):
    """What all tests of the sheet have in common."""

    tested_on = DayField(label="Date of tests", earliest=date(1970, 1, 1))
    tester = forms.CharField(max_length=120, label="Tested by")
    element_used = forms.CharField(
        max_length=120, required=False, label="Filter or adaptor used in the tests"
    )
    is_meant = forms.BooleanField(required=False, label="Yes, what was asked below is meant")


@dataclass(frozen=True)
class Cell:
    """One box of a row: its name, its exercise and what was typed."""

    name: str
    label: str
    value: str


@dataclass
class Line:
    """One row of the sheet as it was typed, with what it came to or what is wrong."""

    number: int
    worker: str
    size: str
    cells: list[Cell]
    ticked: str = ""
    errors: list[str] = field(default_factory=list)
    draft: Draft | None = None
    judged: Judged | None = None

    @property
    def is_blank(self) -> bool:
        typed = [self.worker, self.size, self.ticked, *(cell.value for cell in self.cells)]
        return not any(typed)


def _no_worker(line: Line) -> str:
    met = f"{line.worker} is nobody who works here; " if line.worker else ""
    return f"Row {line.number}, worker: {met}give the personnel number."


@dataclass
class DaySheet:
    """The sheet of one protocol: whom and what it offers, and what was typed into it."""

    site: Site
    pack: RulePack
    protocol: Protocol
    on: date
    typed: Mapping[str, str]

    def __post_init__(self) -> None:
        self.is_bound = bool(self.typed)
        self.head = HeadForm(self.typed or None)
        self.slots: tuple[Slot, ...] = slots_of(self.protocol)
        self.workers: QuerySet[Worker] = (
            Worker.objects.at(self.site).active(self.on).select_related("site")
        )
        self.sizes: list[FacepieceSize] = [
            size
            for size in FacepieceSize.objects.at(self.site)
            .filter(facepiece__kind__in=TIGHT_KINDS, facepiece__withdrawn_on=None)
            .select_related("facepiece")
            if self.protocol in allowed_protocols(self.pack, size.facepiece.kind)
        ]
        self.lines = [self._line(number) for number in range(1, ROWS + 1)]
        if self.is_bound:
            self._work_out()

    @property
    def ticks(self) -> tuple[tuple[str, str], ...]:
        """What a tester may have seen in a qualitative test."""
        return TICKS

    @property
    def drafts(self) -> list[Draft]:
        return [line.draft for line in self.lines if line.draft is not None]

    @property
    def is_ready(self) -> bool:
        """Everything typed can be stored, and there is something."""
        no_faults = self.head.is_valid() and not any(line.errors for line in self.lines)
        return self.is_bound and no_faults and bool(self.drafts)

    def _line(self, number: int) -> Line:
        def value(name: str) -> str:
            return str(self.typed.get(f"r{number}_{name}", "")).strip()

        cells = [Cell(f"r{number}_{slot.key}", slot.label, value(slot.key)) for slot in self.slots]
        return Line(number, value("worker"), value("size"), cells, value("is_passed"))

    def _typed_lines(self) -> Iterator[Line]:
        return (line for line in self.lines if not line.is_blank)

    def _work_out(self) -> None:
        workers = {one.personnel_number: one for one in self.workers}
        sizes = {str(size.pk): size for size in self.sizes}
        for line in self._typed_lines():
            worker, size = workers.get(line.worker), sizes.get(line.size)
            if worker is None:
                line.errors.append(_no_worker(line))
            if size is None:
                line.errors.append(f"Row {line.number}: choose a facepiece and size.")
            if worker is not None and size is not None:
                self._work_out_line(line, Chosen(self.site, worker, size, self.protocol, self.pack))

    def _work_out_line(self, line: Line, chosen: Chosen) -> None:
        shared = ("tested_on", "tester", "element_used", "is_meant")
        data = {name: self.typed.get(name, "") for name in shared}
        for slot, cell in zip(self.slots, line.cells, strict=True):
            data[slot.key] = cell.value
        data["is_passed"] = line.ticked
        form = FitTestForm(data, chosen=chosen, today=self.site.today())
        line.judged = form.worked_out()
        if form.is_valid():
            line.draft = form.draft
        for name, messages in form.errors.items():
            if name != "tested_on" or "tested_on" not in self.head.errors:
                line.errors += [f"Row {line.number}: {message}" for message in messages]
