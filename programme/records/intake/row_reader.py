"""Reads the fields of one row; every refusal is kept with its column, so that none hides another."""

import unicodedata
from collections.abc import Mapping
from datetime import date

from programme.measured import (
    POINT,
    Reading,
    Refused,
    read_date,
    read_number,
    read_result,
    shown_number,
)
from programme.measured_fields import range_text
from programme.records.intake.fields import Field
from programme.records.intake.matching import Matching
from programme.records.intake.preview import PreviewRow, Problem
from programme.records.intake.table import Line, Table
from programme.records.intake.workbook import column_letters

_YES = frozenset({"yes", "y", "true", "1", "x"})
_NO = frozenset({"no", "n", "false", "0", ""})
_ERROR_CELL = "#error"
# In a value for every row it stands for the row number, so that equal lines can be told apart.
ROW_MARK = "{row}"


def _bad_sign(text: str) -> str:
    """The first control, override or zero-width sign that has no place in a record."""
    for sign in text:
        is_hidden = unicodedata.category(sign) in {"Cc", "Cf", "Cs", "Co"}
        if sign == "\ufffd" or (is_hidden and sign not in "\n\t"):
            return f"U+{ord(sign):04X}"
    return ""


class RowReader:
    """The fields of one row, read one by one."""

    def __init__(
        self, fields: Mapping[str, Field], table: Table, matching: Matching, line: Line
    ) -> None:
        self.fields, self.table, self.matching, self.line = fields, table, matching, line
        self.row = PreviewRow(line.number)
        self._note_formulas()

    def _note_formulas(self) -> None:
        for at in sorted(self.line.formulas & set(self.matching.columns.values())):
            ref, cell = f"{column_letters(at)}{self.line.number}", self.line.at(at)
            if cell == "":
                self.row.problems.append(
                    Problem(
                        self.table.column_name(at),
                        ref,
                        f"{ref} holds a formula without a stored value; paste the value there.",
                    )
                )
            else:
                self.row.questions.append(
                    f"{ref} holds a formula; its stored value {shown_number(cell)} is taken."
                )

    def column(self, key: str) -> str:
        """How messages name the field's column."""
        at = self.matching.columns.get(key)
        label = self.fields[key].label
        if at is None:
            return f"{label} (for every row)" if key in self.matching.fixed else label
        name = self.table.column_name(at)
        return label if name.casefold() == label.casefold() else f"{label} (column {name!r})"

    def raw(self, key: str) -> str | float:
        """The cell or fixed value; empty if the field is not matched."""
        if key in self.matching.columns:
            return self.line.at(self.matching.columns[key])
        fixed = self.matching.fixed.get(key, "")
        return fixed.replace(ROW_MARK, str(self.line.number))

    def refuse(self, key: str, says: str, *, value: str | None = None) -> None:
        """Keep a problem with the field's column and value."""
        shown = shown_number(self.raw(key)) if value is None else value
        self.row.problems.append(Problem(self.column(key), shown, says))

    def ask(self, question: str) -> None:
        """Keep a question about the row."""
        self.row.questions.append(question)

    def text(self, key: str, *, at_most: int = 120) -> str:
        """The field as clean text (NFC); empty where it is empty, refused or required."""
        text = unicodedata.normalize("NFC", shown_number(self.raw(key)))
        if text == _ERROR_CELL:
            self.refuse(key, "the cell holds a spreadsheet error; put the value there.")
        elif sign := _bad_sign(text):
            self.refuse(key, f"the sign {sign} is not allowed; write the text without it.")
        elif len(text) > at_most:
            self.refuse(key, f"{len(text)} characters are not allowed; at most {at_most}.")
        elif not text and self.fields[key].is_required:
            self.refuse(key, "is empty; a value is needed.")
        else:
            return text
        return ""

    def _decimal(self, key: str) -> str:
        # A value typed for all rows follows the form's own rule: a point.
        return self.matching.decimal if key in self.matching.columns else POINT

    def number(self, key: str, *, at_least: float, at_most: float, unit: str = "") -> float | None:
        """The field as a number within its range, None where empty or refused."""
        raw = self.raw(key)
        if raw == "":
            return None
        allowed = range_text(at_least, at_most, unit=unit)
        try:
            value = read_number(raw, decimal=self._decimal(key))
        except Refused as refused:
            self.refuse(key, f"{refused}. Allowed is {allowed}.")
            return None
        if not at_least <= value <= at_most:
            self.refuse(key, f"{shown_number(raw)} is not allowed; {allowed}.")
            return None
        return value

    def day(self, key: str, *, earliest: date, latest: date, why: str = "") -> date | None:
        """The field as a day within its range, None where empty or refused."""
        raw = self.raw(key)
        if raw == "":
            if self.fields[key].is_required:
                self.refuse(key, "is empty; a date is needed, for example 2026-03-04.")
            return None
        if not isinstance(raw, str):
            self.refuse(key, f"{shown_number(raw)} is a number, not a date cell; write 2026-03-04.")
            return None
        try:
            day = read_date(raw, order=self.matching.order)
        except Refused as refused:
            self.refuse(key, f"{refused}.")
            return None
        if not earliest <= day <= latest:
            self.refuse(key, f"{day} is not allowed; {earliest} to {latest}{why}.")
            return None
        return day

    def yes_or_no(self, key: str) -> bool:
        """The field as yes or no; empty is no."""
        text = shown_number(self.raw(key)).casefold()
        if text not in _YES | _NO:
            self.refuse(key, f"{text!r} is not allowed; yes or no (1 or 0).")
        return text in _YES

    def choice(self, key: str, spellings: Mapping[str, str]) -> str:
        """The field as one of its choices; `spellings` maps what is written to what is kept."""
        text = self.text(key)
        if not text:
            return ""
        kept = spellings.get(" ".join(text.casefold().split()))
        if kept is None:
            allowed = ", ".join(dict.fromkeys(spellings.values()))
            self.refuse(key, f"{text!r} is not allowed; one of {allowed}.")
            return ""
        return kept

    def _limit(self, key: str) -> str | float:
        """The detection limit as a number, or empty; raises what `read_number` raises."""
        raw = self.raw(key)
        return raw if raw == "" else read_number(raw, decimal=self._decimal(key))

    def _flagged(self, key: str, censored: str) -> str | float | None:
        """The result with "<" where the flag says so; None where both contradict each other."""
        raw = self.raw(key)
        if not self.matching.has(censored):
            return raw
        is_flagged = self.yes_or_no(censored)
        is_below = shown_number(raw).startswith("<")
        if is_below and not is_flagged:
            self.refuse(censored, f"0 does not go with the result {raw}; give one of the two.")
            return None
        is_figure = not isinstance(raw, str) or raw.strip()[:1].isdigit()
        return f"<{shown_number(raw)}" if is_flagged and is_figure else raw

    def result(self, key: str, *, lod: str, censored: str) -> Reading | None:
        """A sample result with its detection limit and its flag, None where refused."""
        if self.raw(key) == "":
            self.refuse(key, "is empty; a number above 0, or below detection as <0.02.")
            return None
        raw = self._flagged(key, censored)
        if raw is None:
            return None
        # A number cell has a point, whatever the mark of the text cells.
        is_cell_number = not isinstance(self.raw(key), str)
        decimal = POINT if is_cell_number else self._decimal(key)
        try:
            return read_result(raw, self._limit(lod), decimal=decimal)
        except Refused as refused:
            self.refuse(key, f"{refused}.")
            return None
