"""Small files as tests need them, built in memory."""

import io
import zipfile

import xlsxwriter


def csv_bytes(*lines, encoding="utf-8", end="\n"):
    return end.join(lines).encode(encoding) + end.encode(encoding)


def xlsx_bytes(*sheets, formulas=()):
    """`sheets` are lists of rows; `formulas` are (cell, formula, stored value) of the first one."""
    out = io.BytesIO()
    book = xlsxwriter.Workbook(out, {"in_memory": True, "default_date_format": "yyyy-mm-dd"})
    pages = []
    for number, rows in enumerate(sheets, start=1):
        page = book.add_worksheet(f"Sheet{number}")
        pages.append(page)
        for at, row in enumerate(rows):
            for place, cell in enumerate(row):
                if cell is not None:
                    page.write(at, place, cell)
    for cell, formula, value in formulas:
        pages[0].write_formula(cell, formula, value=value)
    book.close()
    return out.getvalue()


def with_part(data, name, content, *, declared=None):
    """The workbook with one more part; `declared` is a false size in its directory entry."""
    out = io.BytesIO(data)
    with zipfile.ZipFile(out, "a", zipfile.ZIP_DEFLATED) as book:
        book.writestr(name, content)
        if declared is not None:
            book.getinfo(name).file_size = declared
    return out.getvalue()
