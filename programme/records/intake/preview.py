"""Rows as they will be stored, and what is wrong or worth asking about each."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

NEW, KNOWN, BAD = "new", "known", "bad"


@dataclass(frozen=True)
class Problem:
    """Why a row cannot be stored: the column, what it holds, and what is allowed."""

    column: str
    value: str
    says: str

    def __str__(self) -> str:
        return f"{self.column}: {self.says}"


@dataclass
class PreviewRow:
    """One row of the file.

    Attributes:
        number: row number in the file.
        shows: cells as they will be stored, in the order of `Preview.columns`.
        cells: the same with the names of their columns.
        problems: the row is left out while there is any.
        questions: the row may be stored, but a person should look.
        record: the unsaved record, None if there are problems.
        parts: records that go with it (the exercises of a fit test).
        known_as: says which stored record the row already is.
    """

    number: int
    shows: list[str] = field(default_factory=list)
    cells: list[tuple[str, str]] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)
    questions: list[str] = field(default_factory=list)
    record: Any = None
    parts: list[Any] = field(default_factory=list)
    known_as: str = ""

    @property
    def status(self) -> str:
        """ "new", "known" or "bad"."""
        if self.problems:
            return BAD
        return KNOWN if self.known_as else NEW

    @property
    def word(self) -> str:
        """The status as a person reads it."""
        return {NEW: "new", KNOWN: "already recorded", BAD: "cannot be stored"}[self.status]


@dataclass
class Preview:
    """Every row of the file, judged."""

    columns: Sequence[str]
    rows: list[PreviewRow]

    def __post_init__(self) -> None:
        for row in self.rows:
            row.cells = list(zip(self.columns, row.shows, strict=True))

    def of(self, status: str) -> list[PreviewRow]:
        """The rows of one status."""
        return [row for row in self.rows if row.status == status]

    @property
    def new(self) -> list[PreviewRow]:
        """Rows that will be stored."""
        return self.of(NEW)

    @property
    def known(self) -> list[PreviewRow]:
        """Rows that stand already and are skipped."""
        return self.of(KNOWN)

    @property
    def bad(self) -> list[PreviewRow]:
        """Rows that cannot be stored."""
        return self.of(BAD)

    @property
    def asked(self) -> list[PreviewRow]:
        """Rows to be stored that a person should look at."""
        return [row for row in self.new if row.questions]
