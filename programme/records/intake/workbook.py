"""XLSX workbooks: true row numbers, formula cells named, nothing unpacked before it was counted."""

import io
import math
import re
import zipfile
from dataclasses import dataclass, field
from datetime import date, datetime, time, timedelta
from typing import Any
from xml.parsers import expat

from programme.records.intake.limits import (
    MAX_CELL_CHARACTERS,
    MAX_CELLS,
    MAX_TEXT_BYTES,
    CannotRead,
    check_shape,
)
from programme.records.intake.zip_guard import DAMAGE, check_declared, check_held, chunks

_REF = re.compile(r"([A-Z]{1,3})([0-9]{1,7})")
_ERROR_CELL = "#error"


@dataclass
class Sheet:
    """One sheet.

    Attributes:
        rows: `[row number, cell, ...]`; numbers stay numbers, days are ISO text.
        formulas: cells that hold a formula, e.g. "C5".
    """

    name: str
    rows: list[list] = field(default_factory=list)
    formulas: list[str] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


def column_letters(index: int) -> str:
    """The letters of a column, counted from 0: A, B, ..., Z, AA."""
    letters = ""
    index += 1
    while index:
        index, rest = divmod(index - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


def column_index(letters: str) -> int:
    """The column counted from 0: A is 0."""
    index = 0
    for letter in letters:
        index = index * 26 + ord(letter) - 64
    return index - 1


class _SheetScan:
    """Walks a sheet's XML once: its extent, its formula cells, its error cells."""

    def __init__(self, name: str) -> None:
        self.name = name
        self.formulas: list[str] = []
        self.errors: list[tuple[int, int]] = []
        self.cells = 0
        self._row = self._column = 0

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        """One opening tag."""
        local = tag.rpartition(":")[2]
        if local == "row":
            number = attributes.get("r", "")
            self._row = int(number) if number.isdecimal() else self._row + 1
            self._column = 0
            check_shape(f"Sheet {self.name}", self._row, 1)
        elif local == "c":
            self._cell(attributes)
        elif local == "f":
            self.formulas.append(f"{column_letters(self._column - 1)}{self._row}")

    def _cell(self, attributes: dict[str, str]) -> None:
        self._column += 1
        if match := _REF.fullmatch(attributes.get("r", "")):
            self._column = column_index(match[1]) + 1
            self._row = int(match[2])
        self.cells += 1
        check_shape(f"Sheet {self.name}", self._row, self._column)
        if self.cells > MAX_CELLS:
            raise CannotRead(f"Sheet {self.name}: at most {MAX_CELLS} cells are allowed.")
        if attributes.get("t") == "e":
            self.errors.append((self._row, self._column))


class _TextScan:
    """Walks the shared texts once: the longest of them."""

    def __init__(self) -> None:
        self.longest = self._now = 0

    def start(self, tag: str, attributes: dict[str, str]) -> None:  # noqa: ARG002 - readers share it
        """One opening tag."""
        if tag.rpartition(":")[2] == "si":
            self._now = 0

    def text(self, part: str) -> None:
        """A piece of text."""
        self._now += len(part)
        self.longest = max(self.longest, self._now)


def _no_doctype(*_: Any) -> None:
    raise CannotRead("File: a part inside declares a document type; it is not read.")


def _walk(book: zipfile.ZipFile, member: zipfile.ZipInfo, scan: Any) -> None:
    parser = expat.ParserCreate()
    parser.StartDoctypeDeclHandler = _no_doctype
    parser.StartElementHandler = scan.start
    if hasattr(scan, "text"):
        parser.CharacterDataHandler = scan.text
    try:
        for chunk in chunks(book, member):
            parser.Parse(chunk, False)
        parser.Parse(b"", True)
    except expat.ExpatError as error:
        raise CannotRead("File: a part inside cannot be read; save it again.") from error


class _Names:
    """Sheet names of the workbook part and targets of its relations."""

    def __init__(self) -> None:
        self.sheets: list[tuple[str, str]] = []
        self.targets: dict[str, str] = {}

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        """One opening tag."""
        local = tag.rpartition(":")[2]
        if local == "sheet":
            relation = next((v for k, v in attributes.items() if k.endswith(":id")), "")
            self.sheets.append((attributes.get("name", ""), relation))
        elif local == "Relationship":
            self.targets[attributes.get("Id", "")] = attributes.get("Target", "")


def _sheet_parts(book: zipfile.ZipFile) -> dict[str, zipfile.ZipInfo]:
    """Sheet name -> the part that holds it."""
    parts = {member.filename: member for member in book.infolist()}
    names = _Names()
    for part in ("xl/workbook.xml", "xl/_rels/workbook.xml.rels"):
        if part not in parts:
            raise CannotRead("File: it is not a workbook; CSV and XLSX files are read.")
        _walk(book, parts[part], names)
    found = {}
    for name, relation in names.sheets:
        target = names.targets.get(relation, "")
        path = target.lstrip("/") if target.startswith("/") else f"xl/{target}"
        if path in parts and "worksheets/" in path:
            found[name] = parts[path]
    return found


def _scan(book: zipfile.ZipFile) -> dict[str, _SheetScan]:
    """Every sheet walked, and refused here if it would swell when read."""
    check_declared(book)
    check_held(book)
    if any(name.lower().endswith("vbaproject.bin") for name in book.namelist()):
        raise CannotRead("File: it holds macros; save it as a workbook without them (.xlsx).")
    scans = {}
    for name, part in _sheet_parts(book).items():
        scans[name] = _SheetScan(name)
        _walk(book, part, scans[name])
    texts = _TextScan()
    for member in book.infolist():
        if member.filename == "xl/sharedStrings.xml":
            _walk(book, member, texts)
    cells = sum(scan.cells for scan in scans.values())
    if cells > MAX_CELLS or cells * texts.longest > MAX_TEXT_BYTES:
        raise CannotRead("File: its cells hold too much text; split it or shorten its notes.")
    return scans


def _cell(value: Any) -> Any:
    """A cell as it is kept: number, or text."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, (int, float)):
        # Kept as JSON, which knows no infinity; as text it is refused wherever a number is due.
        return value if math.isfinite(value) else str(value)
    if isinstance(value, datetime):
        return value.date().isoformat() if value.time() == time() else value.isoformat(" ")
    if isinstance(value, (date, time)):
        return value.isoformat()
    if isinstance(value, timedelta):
        return f"{value.total_seconds() / 3600:g} h"
    text = str(value).strip().replace("\x00", "\ufffd")
    if len(text) > MAX_CELL_CHARACTERS:
        raise CannotRead(
            f"File: a cell of {len(text)} characters is not allowed; "
            f"at most {MAX_CELL_CHARACTERS}. It begins {text[:30]!r}."
        )
    return text


def _filled(name: str, table: list[list[Any]], scan: _SheetScan) -> Sheet:
    sheet = Sheet(name, formulas=scan.formulas)
    errors = set(scan.errors)
    has_begun = False
    for number, cells in enumerate(table, start=1):
        kept = [
            _ERROR_CELL if (number, place) in errors else _cell(cell)
            for place, cell in enumerate(cells, start=1)
        ]
        met = [cell for cell in kept if cell != ""]
        if not met:
            continue
        if not has_begun and isinstance(met[0], str) and met[0].startswith("#") and len(met) == 1:
            sheet.notes.append(met[0].lstrip("#").strip())
            continue
        has_begun = True
        sheet.rows.append([number, *kept])
    return sheet


def read_workbook(data: bytes) -> list[Sheet]:
    """Read every sheet that holds anything.

    Raises:
        CannotRead: not a workbook, damaged, encrypted, with macros, or over a limit.
    """
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as book:
            scans = _scan(book)
    except CannotRead:
        raise
    except DAMAGE as error:
        raise CannotRead("File: it is damaged or no workbook; save it again as XLSX.") from error
    # Imported here: it costs start-up time that only an import needs to pay.
    from python_calamine import CalamineError, CalamineWorkbook

    try:
        book = CalamineWorkbook.from_filelike(io.BytesIO(data))
        sheets = []
        for name in book.sheet_names:
            if name in scans and scans[name].cells:
                # Leading empty rows are kept, or every row number in a message would be wrong.
                table = book.get_sheet_by_name(name).to_python(skip_empty_area=False)
                sheets.append(_filled(name, table, scans[name]))
    except CalamineError as error:
        raise CannotRead(f"File: it cannot be read as a workbook ({error}).") from error
    return [sheet for sheet in sheets if sheet.rows]
