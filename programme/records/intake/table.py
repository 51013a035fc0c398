"""The file as a table: one sheet, its header and its rows, in the encoding that was chosen."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from programme.export import undefused
from programme.measured import shown_number
from programme.records.intake.text_files import ENCODINGS, recoded
from programme.records.intake.workbook import column_letters

_EXAMPLES = 3


@dataclass(frozen=True)
class Line:
    """One row of the file with its true number."""

    number: int
    cells: list[str | float]
    formulas: frozenset[int] = frozenset()

    def at(self, index: int) -> str | float:
        """The cell of that column, counted from 0; empty beyond the end of the row."""
        return self.cells[index] if index < len(self.cells) else ""


@dataclass(frozen=True)
class Table:
    """Header and rows of the sheet that is read."""

    header: list[str]
    lines: list[Line]
    notes: list[str]

    def column_name(self, index: int) -> str:
        """The column as messages name it: its header, or its letters where that is empty."""
        return self.header[index] or f"column {column_letters(index)}"

    def examples(self, index: int) -> str:
        """The first cells of a column, so that a person can tell what it holds."""
        met: list[str] = []
        for line in self.lines:
            text = shown_number(line.at(index))
            if text and text not in met:
                met.append(text if len(text) <= 24 else text[:23] + "…")
            if len(met) == _EXAMPLES:
                break
        return ", ".join(met)


def open_questions(batch_table: Mapping[str, Any], reading: Mapping[str, Any]) -> list[str]:
    """What has to be answered before the table can be matched: "sheet", "encoding"."""
    asked = []
    if reading.get("sheet") not in batch_table["sheets"]:
        asked.append("sheet")
    if not reading.get("is_encoding_sure") and not reading.get("is_encoding_chosen"):
        asked.append("encoding")
    return asked


def _cell(cell: Any, encoding: str) -> str | float:
    if not isinstance(cell, str):
        return float(cell)
    return undefused(recoded(cell, encoding) if encoding else cell)


def _formulas(cells: list[str]) -> dict[int, set[int]]:
    found: dict[int, set[int]] = {}
    for ref in cells:
        letters = ref.rstrip("0123456789")
        index = 0
        for letter in letters:
            index = index * 26 + ord(letter) - 64
        found.setdefault(int(ref[len(letters) :]), set()).add(index - 1)
    return found


def table_of(batch_table: Mapping[str, Any], reading: Mapping[str, Any]) -> Table:
    """The chosen sheet as a table.

    Args:
        batch_table: as `reader.FileRead.table`.
        reading: as `reader.FileRead.reading`, with the answers to `open_questions`.

    Raises:
        ValueError: a question is still open.
    """
    if asked := open_questions(batch_table, reading):
        raise ValueError(f"reading: {', '.join(asked)} must be chosen first")
    sheet = reading["sheet"]
    encoding = "" if reading["is_encoding_sure"] else reading["encoding"]
    rows = batch_table["sheets"][sheet]
    formulas = _formulas(batch_table.get("formulas", {}).get(sheet, []))
    lines = [
        Line(
            row[0],
            [_cell(cell, encoding) for cell in row[1:]],
            frozenset(formulas.get(row[0], ())),
        )
        for row in rows
    ]
    notes = [str(_cell(note, encoding)) for note in batch_table["notes"].get(sheet, [])]
    first = next(
        (at for at, line in enumerate(lines) if line.number >= reading.get("header_row", 0)), 0
    )
    header = [shown_number(cell) for cell in lines[first].cells]
    below, later_notes = _without_comments(lines[first + 1 :])
    widest = max([len(header), *(len(line.cells) for line in below)])
    header += [""] * (widest - len(header))
    return Table(header, below, notes + later_notes)


def _without_comments(lines: list[Line]) -> tuple[list[Line], list[str]]:
    """A row whose only cell begins with "#" is a comment; one with more cells is data."""
    kept, notes = [], []
    for line in lines:
        met = [cell for cell in line.cells if cell != ""]
        if len(met) == 1 and len(line.cells) > 1 and str(met[0]).startswith("#"):
            notes.append(str(met[0]).lstrip("#").strip())
        else:
            kept.append(line)
    return kept, notes


def encoding_examples(batch_table: Mapping[str, Any]) -> list[tuple[str, str]]:
    """Encodings to choose from, each with how the first words that depend on it would read."""
    words: list[str] = []
    for rows in batch_table["sheets"].values():
        for row in rows:
            words += [cell for cell in row[1:] if isinstance(cell, str) and not cell.isascii()]
            if len(words) >= _EXAMPLES:
                break
    shown = words[:_EXAMPLES]
    return [
        (key, f"{label}: " + ", ".join(recoded(word, key)[:30] for word in shown))
        for key, label in ENCODINGS.items()
    ]
