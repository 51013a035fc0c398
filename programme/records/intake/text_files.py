"""CSV, TSV and semicolon files: encoding told, separator found, every line with its number."""

import csv
import io
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field

from charset_normalizer import from_bytes

from programme.records.intake.limits import (
    MAX_CELL_CHARACTERS,
    CannotRead,
    check_shape,
)

DELIMITERS = {"\t": "tab", ";": "semicolon", ",": "comma", "|": "upright bar"}
# Encodings of one byte a letter (or safe around separators) that a site may choose from.
ENCODINGS = {
    "cp1252": "Western European (Windows)",
    "iso8859_15": "Western European (ISO 8859-15)",
    "cp1250": "Central European (Windows)",
    "iso8859_2": "Central European (ISO 8859-2)",
    "cp1251": "Cyrillic (Windows)",
    "cp1253": "Greek (Windows)",
    "cp1254": "Turkish (Windows)",
    "mac_roman": "Western European (Macintosh)",
    "cp850": "Western European (DOS)",
    "shift_jis": "Japanese (Shift JIS)",
    "gb18030": "Chinese (GB 18030)",
}
# Every byte has one letter here and back again, so a guess can be changed after reading.
BYTEWISE = "latin-1"
_MARKS = (
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe\x00\x00", "utf-32"),
    (b"\x00\x00\xfe\xff", "utf-32"),
    (b"\xff\xfe", "utf-16"),
    (b"\xfe\xff", "utf-16"),
)
_SAMPLE_BYTES = 200_000
_SAMPLE_LINES = 50


@dataclass
class TextTable:
    """Rows of a text file.

    Attributes:
        rows: `[line number, cell, ...]` each, blank lines left out.
        notes: texts of leading comment lines, without their "#".
        encoding: as read, or as guessed where `is_sure` is false (cells are then bytewise).
        delimiter: one character.
    """

    rows: list[list] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    encoding: str = "utf-8"
    is_sure: bool = True
    delimiter: str = ","


def _guess(data: bytes) -> str:
    best = from_bytes(data[:_SAMPLE_BYTES], cp_isolation=list(ENCODINGS)).best()
    return best.encoding if best is not None and best.encoding in ENCODINGS else "cp1252"


def decoded(data: bytes) -> tuple[str, str, bool]:
    """The text, its encoding, and whether that is sure; an unsure text is bytewise (Latin-1).

    Raises:
        CannotRead: the mark at the start promises an encoding the rest does not keep.
    """
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            try:
                return data.decode(encoding), encoding.removesuffix("-sig"), True
            except UnicodeDecodeError as error:
                raise CannotRead(
                    f"File: it begins as {encoding} but byte {error.start + 1} is not; "
                    "save it again as UTF-8."
                ) from error
    try:
        return data.decode("utf-8"), "utf-8", True
    except UnicodeDecodeError:
        return data.decode(BYTEWISE), _guess(data), False


def recoded(text: str, encoding: str) -> str:
    """A bytewise text in the encoding that was chosen; a sign it does not have shows as U+FFFD."""
    return text.encode(BYTEWISE).decode(encoding, errors="replace")


def _widths(lines: list[str], delimiter: str) -> Counter[int]:
    try:
        return Counter(len(row) for row in csv.reader(lines, delimiter=delimiter) if row)
    except csv.Error:
        return Counter()


def found_delimiter(text: str) -> str:
    """The separator that cuts the first lines into the same number of columns most often."""
    head = io.StringIO(text, newline="")
    lines = [line for line in head if line.strip() and not line.startswith("#")][:_SAMPLE_LINES]
    best, best_score = ",", (0.0, 0)
    for delimiter in DELIMITERS:
        widths = _widths(lines, delimiter)
        if not widths:
            continue
        width, times = widths.most_common(1)[0]
        score = (times / sum(widths.values()), width)
        if width > 1 and score > best_score:
            best, best_score = delimiter, score
    return best


def _refuse_nul(text: str) -> None:
    place = text.find("\x00")
    if place < 0:
        return
    line = text.count("\n", 0, place) + 1
    raise CannotRead(
        f"File: line {line} holds a NUL sign, so it is no text table; "
        "save it as CSV in UTF-8, or as XLSX."
    )


def _after_comments(text: str, notes: list[str]) -> Iterator[str]:
    """The lines; comment lines at the head give an empty line, so that numbers stay true."""
    is_head = True
    for line in io.StringIO(text, newline=""):
        if is_head and line.startswith("#"):
            notes.append(line.lstrip("#").strip())
            yield "\n"
            continue
        is_head = is_head and not line.strip()
        yield line


def _checked(cells: list[str], number: int) -> list:
    for cell in cells:
        if len(cell) > MAX_CELL_CHARACTERS:
            raise CannotRead(
                f"File: line {number} has a cell of {len(cell)} characters; "
                f"at most {MAX_CELL_CHARACTERS} are allowed."
            )
    return [number, *(cell.strip() for cell in cells)]


def _rows(lines: Iterator[str], delimiter: str) -> Iterator[list]:
    reader = csv.reader(lines, delimiter=delimiter, strict=True)
    before = 0
    try:
        for cells in reader:
            number, before = before + 1, reader.line_num
            if any(cell.strip() for cell in cells):
                yield _checked(cells, number)
    except csv.Error as error:
        raise CannotRead(
            f"File: line {before + 1} cannot be read ({error}); "
            'a cell that begins with " must end with one.'
        ) from error


def read_text(data: bytes, *, delimiter: str = "") -> TextTable:
    """Read a text table.

    Args:
        data: the file as it came.
        delimiter: one of `DELIMITERS`; empty finds it.

    Raises:
        CannotRead: NUL, open quotes, a cell, row or column over its limit.
    """
    text, encoding, is_sure = decoded(data)
    _refuse_nul(text)
    table = TextTable(encoding=encoding, is_sure=is_sure)
    table.delimiter = delimiter or found_delimiter(text)
    widest = 0
    for row in _rows(_after_comments(text, table.notes), table.delimiter):
        table.rows.append(row)
        widest = max(widest, len(row) - 1)
        check_shape("File", len(table.rows), widest)
    return table
