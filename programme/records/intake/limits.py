"""How much one file may hold; every refusal names the limit it met."""

MAX_BYTES = 20 * 1024 * 1024
MAX_UNPACKED_BYTES = 200 * 1024 * 1024
MAX_MEMBERS = 1_000
MAX_RATIO = 100
MAX_ROWS = 20_000
MAX_COLUMNS = 200
MAX_CELLS = 400_000
MAX_CELL_CHARACTERS = 2_000
MAX_TEXT_BYTES = 400 * 1024 * 1024


class CannotRead(ValueError):
    """The file cannot be read; the message says what was met and what is allowed."""


def megabytes(size: int) -> str:
    """A size as it is printed: "20 MB"."""
    return f"{size / 1024 / 1024:.0f} MB"


def check_size(size: int) -> None:
    """Refuse a file before anything of it is read.

    Args:
        size: bytes, as declared or counted.

    Raises:
        CannotRead: nothing in it, or more than 20 MB.
    """
    if size <= 0:
        raise CannotRead("File: it is empty; a header line and one row at least are needed.")
    if size > MAX_BYTES:
        raise CannotRead(
            f"File: {megabytes(size)} is not allowed; at most {megabytes(MAX_BYTES)}. "
            "Split it, or leave out sheets that are not needed."
        )


def check_shape(where: str, rows: int, columns: int) -> None:
    """Refuse a table with more rows or columns than are kept.

    Raises:
        CannotRead: over 20 000 rows, 200 columns or 400 000 cells.
    """
    if rows > MAX_ROWS:
        raise CannotRead(f"{where}: more than {MAX_ROWS} rows are not allowed; split the file.")
    if columns > MAX_COLUMNS:
        raise CannotRead(
            f"{where}: more than {MAX_COLUMNS} columns are not allowed; leave out what is not needed."
        )
    if rows * columns > MAX_CELLS:
        raise CannotRead(f"{where}: more than {MAX_CELLS} cells are not allowed; split the file.")
