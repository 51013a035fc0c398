"""Lists as CSV: one writer for the whole house, so that no exported cell runs as a formula."""

import csv
import io
import math
import re
import unicodedata
from collections.abc import Iterable, Sequence
from datetime import date, datetime
from typing import Any

from django.http import HttpResponse

# A spreadsheet reads a cell as a formula by its first sign, also behind quotes and spaces.
_FORMULA = re.compile(r"'*[\t\r\n]|['\"\s]*[=+\-@\uff1d\uff0b\uff0d\uff20]")
_REAL_NUMBER = re.compile(r"[+-]?[0-9]+(?:\.[0-9]+)?(?:[eE][+-]?[0-9]{1,3})?")
LONGEST_NAME = 80


def defused(text: str) -> str:
    """The text with an apostrophe before it where a spreadsheet would run it as a formula.

    Text that is a plain number stays as it is: -5 is a number, not a formula.
    """
    if _FORMULA.match(text) and not _REAL_NUMBER.fullmatch(text):
        return "'" + text
    return text


def undefused(text: str) -> str:
    """The text before `defused`: what our own export brings back on import."""
    return text[1:] if text.startswith("'") and _FORMULA.match(text[1:]) else text


def cell_text(value: Any) -> str:
    """One cell as it is exported: empty for what is not known, ISO dates, yes and no."""
    if value is None or (isinstance(value, float) and not math.isfinite(value)):
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, (int, float)):
        return repr(value)
    if isinstance(value, (datetime, date)):
        return value.isoformat()
    return defused(str(value))


def csv_text(header: Sequence[str], rows: Iterable[Sequence[Any]]) -> str:
    """Header and rows as comma separated text, lines ended by CR LF (RFC 4180)."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow([cell_text(name) for name in header])
    writer.writerows([cell_text(cell) for cell in row] for row in rows)
    return out.getvalue()


def safe_file_name(name: str, ending: str = "") -> str:
    """A file name without folders, controls or signs a file system or header trips over.

    Args:
        name: any text, e.g. a person's or a site's name.
        ending: "csv", "xlsx", "pdf"; put on where the name has none.

    Returns:
        ASCII letters, digits, ".", "_" and "-"; never empty, at most 80 characters.
    """
    ascii_name = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    stem = re.sub(r"[^A-Za-z0-9._-]+", "-", ascii_name).strip("-._")
    if ending:
        stem = stem.removesuffix(f".{ending}")
    stem = stem[:LONGEST_NAME].strip("-._") or "list"
    # Names a desktop system keeps for its devices, whatever comes after the dot.
    if re.fullmatch(r"(?i)(con|prn|aux|nul|com[0-9]|lpt[0-9])", stem.split(".")[0]):
        stem = f"list-{stem}"
    return f"{stem}.{ending}" if ending else stem


def csv_response(name: str, header: Sequence[str], rows: Iterable[Sequence[Any]]) -> HttpResponse:
    """A CSV file to download: UTF-8 without a byte order mark, cells defused.

    Args:
        name: shown name of the file; made safe here, ".csv" is put on.
        header: column names.
        rows: cells as text, numbers, dates, booleans or None.
    """
    answer = HttpResponse(csv_text(header, rows), content_type="text/csv; charset=utf-8")
    answer["Content-Disposition"] = f'attachment; filename="{safe_file_name(name, "csv")}"'
    return answer
