"""The rows that could not be stored, as they came, with what is wrong with each."""

import io
from collections.abc import Sequence
from typing import Any

from programme.export import cell_text
from programme.records.intake.preview import Preview
from programme.records.intake.table import Table

ADDED = ("Row in the file", "What is wrong")


def error_rows(table: Table, preview: Preview) -> tuple[list[str], list[list[Any]]]:
    """Header and rows: the original cells, then the row number and every problem.

    Good rows are left out, so that the corrected file can be brought in again.
    """
    lines = {line.number: line for line in table.lines}
    width = len(table.header)
    rows = []
    for bad in preview.bad:
        cells = list(lines[bad.number].cells)
        says = " | ".join(str(problem) for problem in bad.problems)
        rows.append([*cells, *[""] * (width - len(cells)), bad.number, says])
    return [*table.header, *ADDED], rows


def xlsx_bytes(header: Sequence[str], rows: Sequence[Sequence[Any]]) -> bytes:
    """A workbook of one sheet; text is written as text, so nothing runs as a formula."""
    # Imported here: it costs start-up time that only a download needs to pay.
    import xlsxwriter

    out = io.BytesIO()
    book = xlsxwriter.Workbook(
        out, {"in_memory": True, "strings_to_formulas": False, "strings_to_urls": False}
    )
    sheet = book.add_worksheet("Errors")
    for at, row in enumerate([header, *rows]):
        for place, cell in enumerate(row):
            if isinstance(cell, (int, float)):
                sheet.write_number(at, place, cell)
            else:
                sheet.write_string(at, place, cell_text(cell))
    book.close()
    return out.getvalue()
