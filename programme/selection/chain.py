"""The protection chain as an object: what `assess` returns and everything else only prints."""

from collections.abc import Iterable
from dataclasses import asdict, dataclass, field, replace
from datetime import date
from typing import Any

LINKS = ("Air", "Limit", "Ratio", "Class", "Face", "Filter")

HOLDS = "holds"
DUE_SOON = "due soon"
BROKEN = "broken"

STOP = "stop"
FIX = "fix"
PLAN = "plan"
SEVERITIES = (STOP, FIX, PLAN)
SEVERITY_SAYS = {
    STOP: "No work under this assignment",
    FIX: "Correct before next use",
    PLAN: "Correct on a dated plan",
}


@dataclass(frozen=True)
class Remedy:
    """One way to mend a mismatch: what to do and the page that does it.

    `page` names a URL pattern of ours and `args` its arguments after the site's code; the pages
    turn them into an address, other readers ignore them.
    """

    says: str
    page: str = ""
    args: tuple[int | str, ...] = ()
    query: str = ""


@dataclass(frozen=True)
class Mismatch:
    """One thing that does not fit: a stable code, how bad, in words, what mends it, on whose word.

    Attributes:
        code: stable, e.g. "fit-missing"; never reused for another meaning.
        severity: "stop", "fix" or "plan".
        link: the link it breaks, one of `LINKS`.
        says: a sentence with names and numbers.
        remedies: in order of ease.
        source: clause; `sure` is its mark (verified, computed, memory).
        worker_id: the person concerned, if it concerns one.
        due_on: the day on which a plan becomes a break, if there is one.
    """

    code: str
    severity: str
    link: str
    says: str
    remedies: tuple[Remedy, ...] = ()
    source: str = ""
    sure: str = "computed"
    worker_id: int | None = None
    worker: str = ""
    due_on: date | None = None

    @property
    def severity_says(self) -> str:
        return SEVERITY_SAYS[self.severity]

    @property
    def is_unconfirmed(self) -> bool:
        return self.sure == "memory"


@dataclass(frozen=True)
class Row:
    """One line of a working: what it is and what it is worth, already with its unit."""

    label: str
    text: str
    source: str = ""
    sure: str = ""

    @property
    def is_unconfirmed(self) -> bool:
        return self.sure == "memory"


@dataclass(frozen=True)
class Working:
    """How one figure came about: title with the figure, formula, inputs with units, source."""

    title: str
    formula: str
    rows: tuple[Row, ...]
    source: str = ""
    sure: str = "computed"
    note: str = ""
    figures: dict[str, float | str | None] = field(default_factory=dict)

    @property
    def is_unconfirmed(self) -> bool:
        return self.sure == "memory"


@dataclass(frozen=True)
class Link:
    """One of the six links, judged."""

    name: str
    state: str
    figure: str
    basis: str
    mismatches: tuple[Mismatch, ...] = ()
    workings: tuple[Working, ...] = ()
    due_on: date | None = None
    due_says: str = ""
    waits_on: str = ""

    @property
    def is_broken(self) -> bool:
        return self.state == BROKEN

    @property
    def anchor(self) -> str:
        return self.name.lower()

    @property
    def state_says(self) -> str:
        said = "BROKEN" if self.is_broken else self.state
        return f"{said} · waits on {self.waits_on}" if self.waits_on else said


@dataclass(frozen=True)
class CrewVerdict:
    """May this worker start this task that day, in what, until when, and if not, why."""

    worker_id: int
    worker: str
    personnel_number: str
    may_start: bool
    wears: str
    fit_factor: float | None
    good_until: date | None
    good_until_says: str
    filter_due_on: date | None
    filter_says: str
    mismatches: tuple[Mismatch, ...] = ()
    is_medical: bool = False

    @property
    def why_not(self) -> str:
        return "; ".join(m.says for m in self.mismatches if m.severity != PLAN)


@dataclass(frozen=True)
class Choice:
    """An assembly on the site's shelf that would answer the task, or why it would not."""

    assembly_id: int
    name: str
    class_name: str
    apf: float | None
    answers: bool
    why_not: str
    in_stock: int
    is_assigned: bool
    wearers_tested: int


@dataclass(frozen=True)
class Chain:
    """The whole line of reasoning of one task on one day."""

    site_code: str
    site: str
    task_id: int
    task_code: str
    task: str
    on: date
    rule_pack: str
    rule_pack_title: str
    edition: str
    links: tuple[Link, ...]
    crew: tuple[CrewVerdict, ...]
    choices: tuple[Choice, ...] = ()

    @property
    def holds(self) -> bool:
        return not any(link.is_broken for link in self.links)

    @property
    def first_break(self) -> Link | None:
        return next((link for link in self.links if link.is_broken), None)

    @property
    def mismatches(self) -> tuple[Mismatch, ...]:
        return tuple(m for link in self.links for m in link.mismatches)

    @property
    def may_start(self) -> int:
        """How many of the crew may start: nobody while a link before Face is broken."""
        return sum(1 for one in self.crew if one.may_start)

    @property
    def state(self) -> str:
        if not self.holds:
            return BROKEN
        return DUE_SOON if any(link.state == DUE_SOON for link in self.links) else HOLDS

    @property
    def verdict(self) -> str:
        """The sentence that heads every picture of this chain."""
        of = f"{self.may_start} of {len(self.crew)} may start."
        broken = self.first_break
        if broken is None:
            soon = [link for link in self.links if link.state == DUE_SOON]
            also = f" {', '.join(link.name for link in soon)} due soon." if soon else ""
            return f"All six links hold. {of}{also}"
        return f"The chain breaks at {broken.name}. {of}"

    @property
    def as_text(self) -> str:
        """The chain in one line of plain text, for mail and terminals."""
        parts = []
        for link in self.links:
            parts.append(link.name)
            parts.append("#" if link.is_broken else "=")
        return " ".join(parts[:-1]) + (" #" if self.links[-1].is_broken else " .")

    def as_dict(self) -> dict[str, Any]:
        """Everything as plain values, for JSON: what the pages show, unrounded figures included."""
        plain = asdict(self)
        plain.update(
            on=self.on.isoformat(),
            holds=self.holds,
            state=self.state,
            verdict=self.verdict,
            first_break=self.first_break.name if self.first_break else None,
            may_start=self.may_start,
        )
        return plain


MEDICAL = "medical-"
ASK = "ask the programme administrator"


def _veiled(one: Mismatch) -> Mismatch:
    if not one.code.startswith(MEDICAL):
        return one
    return replace(
        one, code="medical", says=f"{one.worker}: {ASK}.", remedies=(), source="", sure=""
    )


def veiled(chain: Chain) -> Chain:
    """The same chain for a reader who may not see why a clearance stands in the way."""
    return replace(
        chain,
        links=tuple(
            replace(link, mismatches=tuple(map(_veiled, link.mismatches))) for link in chain.links
        ),
        crew=tuple(
            replace(one, mismatches=tuple(map(_veiled, one.mismatches))) for one in chain.crew
        ),
    )


def state_of(mismatches: Iterable[Mismatch], *, is_due_soon: bool = False) -> str:
    """Broken by any stop or fix; due soon by a plan or a date near; else it holds."""
    severities = {m.severity for m in mismatches}
    if severities & {STOP, FIX}:
        return BROKEN
    return DUE_SOON if severities or is_due_soon else HOLDS
