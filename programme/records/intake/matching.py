"""Which column means what: suggested from the header, chosen by a person."""

import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from programme.measured import COMMA, POINT
from programme.records.intake.fields import Field, fields_of
from programme.records.intake.table import Table

_COMMA_NUMBER = re.compile(r"<?\s*[-\u2212]?[0-9]*,[0-9]+")
_SLASH_DATE = re.compile(r"[0-9]{1,2}[-/.][0-9]{1,2}[-/.][0-9]{4}.*")
# The unit of a header such as "Result (mg/m3)" is not part of its name.
_BRACKETS = re.compile(r"[(\[].*?[)\]]")


def plain(header: str) -> str:
    """A header in lower case, without signs, accents and bracketed units."""
    folded = unicodedata.normalize("NFKD", _BRACKETS.sub(" ", header)).casefold()
    letters = "".join(sign if sign.isalnum() else " " for sign in folded if ord(sign) < 0x300)
    return " ".join(letters.split())


def _score(header: str, wanted: Field) -> int:
    name = plain(header)
    if not name:
        return 0
    if name in {plain(wanted.label), wanted.key}:
        return 100
    if name in wanted.words:
        return 90 - wanted.words.index(name)
    padded = f" {name} "
    long_words = [word for word in wanted.words if len(word) > 3 and f" {word} " in padded]
    return 30 + len(max(long_words, key=len)) if long_words else 0


def suggested_columns(kind: str, header: list[str]) -> dict[str, int]:
    """Field -> column, each column and each field once, best likeness first."""
    scored = sorted(
        (
            (-_score(name, wanted), place, at, wanted.key)
            for place, wanted in enumerate(fields_of(kind))
            for at, name in enumerate(header)
        ),
    )
    found: dict[str, int] = {}
    for likeness, _, at, key in scored:
        if likeness < 0 and key not in found and at not in found.values():
            found[key] = at
    return found


def has_comma_numbers(table: Table) -> bool:
    """Whether any text cell is a number only if its comma is a decimal mark, or may be."""
    return any(
        isinstance(cell, str) and _COMMA_NUMBER.fullmatch(cell)
        for line in table.lines
        for cell in line.cells
    )


def has_year_last_dates(table: Table) -> bool:
    """Whether any text cell is a date with its year last."""
    return any(
        isinstance(cell, str) and _SLASH_DATE.fullmatch(cell)
        for line in table.lines
        for cell in line.cells
    )


@dataclass(frozen=True)
class Matching:
    """What a person chose.

    Attributes:
        columns: field -> column, counted from 0.
        fixed: field -> one value for every row.
        decimal: "point" or "comma", for text cells.
        order: "dmy" or "mdy"; None reads only dates with one meaning.
    """

    columns: Mapping[str, int] = field(default_factory=dict)
    fixed: Mapping[str, str] = field(default_factory=dict)
    decimal: str = POINT
    order: str | None = None

    @classmethod
    def from_json(cls, kept: Mapping[str, Any]) -> "Matching":
        """The matching as a batch keeps it.

        Raises:
            ValueError: a decimal mark or date order that does not exist.
        """
        decimal, order = kept.get("decimal", POINT), kept.get("order") or None
        if decimal not in {POINT, COMMA} or order not in {None, "dmy", "mdy"}:
            raise ValueError(f"matching: {decimal!r}, {order!r} is not allowed")
        columns = {key: int(at) for key, at in kept.get("columns", {}).items()}
        return cls(columns, dict(kept.get("fixed", {})), decimal, order)

    def to_json(self) -> dict[str, Any]:
        """As `from_json` reads it."""
        return {
            "columns": dict(self.columns),
            "fixed": dict(self.fixed),
            "decimal": self.decimal,
            "order": self.order,
        }

    def has(self, key: str) -> bool:
        """Whether the field comes from a column or a fixed value."""
        return key in self.columns or key in self.fixed
