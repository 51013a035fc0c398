"""One door for every file: what it is, is told by what it holds, not by its name."""

import hashlib
from dataclasses import dataclass
from typing import Any

from programme.records.intake.limits import CannotRead, check_size
from programme.records.intake.text_files import DELIMITERS, read_text
from programme.records.intake.workbook import read_workbook

_SIGNATURES = (
    (b"\xd0\xcf\x11\xe0", "an old or password-protected workbook; save it as .xlsx or CSV"),
    (b"%PDF", "a PDF; the table itself is needed, as CSV or XLSX"),
    (b"\x89PNG", "a picture; the table itself is needed, as CSV or XLSX"),
    (b"\xff\xd8\xff", "a picture; the table itself is needed, as CSV or XLSX"),
    (b"\x1f\x8b", "a packed file; unpack it first"),
    (b"{\\rtf", "a text document; the table itself is needed, as CSV or XLSX"),
)


@dataclass(frozen=True)
class FileRead:
    """A file as it is kept until it is stored.

    Attributes:
        table: `{"sheets": {name: [[row number, cell, ...], ...]}, "notes": {name: [text]},
            "formulas": {name: ["C5"]}}`.
        reading: how it was read: format, encoding, delimiter, sheet, header row.
        sha256: of the bytes.
    """

    table: dict[str, Any]
    reading: dict[str, Any]
    sha256: str


def _from_text(data: bytes, delimiter: str) -> tuple[dict[str, Any], dict[str, Any]]:
    text = read_text(data, delimiter=delimiter)
    table = {"sheets": {"": text.rows}, "notes": {"": text.notes}, "formulas": {}}
    reading = {
        "format": "text",
        "encoding": text.encoding,
        "is_encoding_sure": text.is_sure,
        "delimiter": text.delimiter,
    }
    return table, reading


def _from_workbook(data: bytes) -> tuple[dict[str, Any], dict[str, Any]]:
    sheets = read_workbook(data)
    table = {
        "sheets": {sheet.name: sheet.rows for sheet in sheets},
        "notes": {sheet.name: sheet.notes for sheet in sheets},
        "formulas": {sheet.name: sheet.formulas for sheet in sheets},
    }
    return table, {"format": "xlsx", "encoding": "utf-8", "is_encoding_sure": True}


def read_file(data: bytes, *, delimiter: str = "") -> FileRead:
    """Read a CSV, TSV, semicolon or XLSX file.

    Args:
        data: the bytes as they came.
        delimiter: one of `DELIMITERS` for a text file; empty finds it.

    Raises:
        CannotRead: empty, too large, of another kind, damaged, or without a row below its header.
        ValueError: `delimiter` is not known.
    """
    check_size(len(data))
    if delimiter and delimiter not in DELIMITERS:
        raise ValueError(
            f"delimiter: {delimiter!r} is not allowed; {', '.join(DELIMITERS.values())}"
        )
    for signature, what in _SIGNATURES:
        if data.startswith(signature):
            raise CannotRead(f"File: it is {what}.")
    if data.startswith(b"PK"):
        table, reading = _from_workbook(data)
    else:
        table, reading = _from_text(data, delimiter)
    sheets = table["sheets"]
    if not any(sheets.values()):
        raise CannotRead("File: it is empty; a header line and one row at least are needed.")
    if all(len(rows) < 2 for rows in sheets.values()):
        raise CannotRead("File: it has a header only; one row below it at least is needed.")
    if len(sheets) == 1:
        reading["sheet"] = next(iter(sheets))
    return FileRead(table, reading, hashlib.sha256(data).hexdigest())
