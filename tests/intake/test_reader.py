"""A file is read whole and as it is, or refused with the limit it met."""

import io
import tracemalloc
import zipfile
from datetime import date

import pytest

from programme.records.intake.limits import CannotRead, check_size
from programme.records.intake.reader import read_file
from programme.records.intake.table import open_questions, table_of
from tests.intake.files import csv_bytes, with_part, xlsx_bytes

PLAIN = ("Task,Result", "Relining,0.31")


def table(data, **reading):
    read = read_file(data)
    return table_of(read.table, read.reading | reading)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-32"])
def test_a_marked_or_plain_unicode_file_is_read(encoding):
    data = "Task,Worker\nRelining,Zoë Größe\n".encode(encoding)
    assert table(data).lines[0].cells == ["Relining", "Zoë Größe"]


def test_a_byte_order_mark_is_no_part_of_the_header():
    assert table("\ufeffTask,Result\na,1\n".encode()).header == ["Task", "Result"]


def test_an_encoding_that_can_only_be_guessed_is_asked_about():
    read = read_file("Task,Worker\nRelining,Zoë Größe\n".encode("cp1252"))
    assert read.reading["is_encoding_sure"] is False
    assert open_questions(read.table, read.reading) == ["encoding"]


@pytest.mark.parametrize(
    ("encoding", "name"),
    [
        ("cp1252", "Zoë Größe"),
        ("iso8859_2", "Łukasz Żak"),
        ("cp1251", "Юлия"),
        ("shift_jis", "山田"),
    ],
)
def test_the_chosen_encoding_gives_the_letters_back(encoding, name):
    data = f"Task,Worker\nRelining,{name}\n".encode(encoding)
    chosen = table(data, encoding=encoding, is_encoding_chosen=True)
    assert chosen.lines[0].cells[1] == name


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
def test_the_separator_is_found(delimiter):
    data = csv_bytes(f"Task{delimiter}Result", f"Relining{delimiter}3", f"x{delimiter}4")
    assert table(data).header == ["Task", "Result"]


def test_semicolons_win_over_decimal_commas():
    found = table(csv_bytes("Task;Result;LOD", "Relining;0,31;0,02", "Relining;1,5;0,02"))
    assert found.lines[0].cells == ["Relining", "0,31", "0,02"]


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_any_line_end_is_read(end):
    assert len(table(csv_bytes(*PLAIN, "Relining,2", end=end)).lines) == 2


def test_row_numbers_are_those_of_the_file():
    data = csv_bytes("# note", "", "Task,Note", "a,x", "", 'b,"two', 'lines"', "c,y")
    assert [line.number for line in table(data).lines] == [4, 6, 8]


def test_comment_lines_are_kept_as_notes():
    found = table(csv_bytes("# Source: a paper, 1989", *PLAIN, "# end,"))
    assert found.notes == ["Source: a paper, 1989", "end"]
    assert len(found.lines) == 1


def test_a_data_row_that_begins_with_a_hash_is_not_lost():
    assert len(table(csv_bytes("Number,Result", "#12,0.3")).lines) == 1


def test_our_own_export_brings_its_text_back():
    assert table(csv_bytes("Name,No", "'=1+1,1")).lines[0].cells[0] == "=1+1"


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"", "it is empty"),
        (b"\n\n  \n", "it is empty"),
        (b"Task,Result\n", "a header only"),
        (b"Task,Result\na,\x001\n", "line 2 holds a NUL"),
        ("Task,Result\na,1\n".encode("utf-16-le"), "NUL"),
        (b"Task\na\n" + b"x" * 3_000 + b"\n", "line 3 has a cell of 3000 characters"),
        (b"x" * 2_000_000, "a cell"),
        (b"a," * 300 + b"\n1\n", "more than 200 columns"),
        (b"a,b\n" + b"1,2\n" * 20_001, "more than 20000 rows"),
        (b'Task,Result\na,"1\nb,2\n', "line 2 cannot be read"),
        (b"\xff\xfeT\x00a", "begins as utf-16"),
        (b"%PDF-1.7 x", "a PDF"),
        (b"\xd0\xcf\x11\xe0old", "old or password-protected workbook"),
        (b"PK\x03\x04 nonsense", "damaged or no workbook"),
        (b"\x1f\x8b\x08", "a packed file"),
    ],
)
def test_an_unreadable_file_is_refused_by_name(data, says):
    with pytest.raises(CannotRead, match=says):
        read_file(data)


@pytest.mark.parametrize("size", [20 * 2**20 + 1, 200 * 2**20])
def test_a_large_file_is_refused_with_the_limit(size):
    with pytest.raises(CannotRead, match="at most 20 MB"):
        check_size(size)


def test_a_workbook_keeps_numbers_days_and_row_numbers():
    data = xlsx_bytes(
        [[None], [None], [None, "Task", "Result", "Day"], [None, "a", 0.31, date(2026, 3, 4)]]
    )
    found = table(data)
    assert found.header == ["", "Task", "Result", "Day"]
    assert (found.lines[0].number, found.lines[0].cells) == (4, ["", "a", 0.31, "2026-03-04"])


def test_several_sheets_are_asked_about():
    read = read_file(xlsx_bytes([["a"], [1]], [["b"], [2]]))
    assert open_questions(read.table, read.reading) == ["sheet"]
    assert table_of(read.table, read.reading | {"sheet": "Sheet2"}).header == ["b"]


def test_an_empty_second_sheet_is_no_question():
    read = read_file(xlsx_bytes([["a"], [1]], []))
    assert open_questions(read.table, read.reading) == []


def test_formula_cells_are_found():
    data = xlsx_bytes([["Task", "Result"], ["a", None]], formulas=[("B2", "=1/3", 0.33)])
    found = table(data)
    assert found.lines[0].formulas == {1}
    assert found.lines[0].cells[1] == 0.33


def test_a_bomb_is_refused_by_what_it_declares():
    data = with_part(xlsx_bytes([["a"], [1]]), "xl/media/x.bin", b"0" * 210 * 2**20)
    tracemalloc.start()
    with pytest.raises(CannotRead, match="at most 200 MB"):
        read_file(data)
    assert tracemalloc.get_traced_memory()[1] < 50 * 2**20
    tracemalloc.stop()


def test_a_tightly_packed_file_is_refused_by_its_ratio():
    data = with_part(xlsx_bytes([["a"], [1]]), "xl/media/x.bin", b"0" * 30 * 2**20)
    with pytest.raises(CannotRead, match="at most 100 times"):
        read_file(data)


def test_a_lying_size_is_found_by_counting():
    data = with_part(xlsx_bytes([["a"], [1]]), "xl/media/x.bin", b"0" * 10**6, declared=10)
    with pytest.raises(CannotRead, match="does not have the size it declares"):
        read_file(data)


@pytest.mark.parametrize("name", ["../x", "/etc/x", "xl\\..\\..\\x", "C:/x"])
def test_a_part_that_leads_outside_is_refused(name):
    with pytest.raises(CannotRead, match="leads outside"):
        read_file(with_part(xlsx_bytes([["a"], [1]]), name, b"x"))


def test_macros_are_refused():
    data = with_part(xlsx_bytes([["a"], [1]]), "xl/vbaProject.bin", b"x")
    with pytest.raises(CannotRead, match="macros"):
        read_file(data)


def test_more_parts_than_allowed_are_refused():
    out = io.BytesIO(xlsx_bytes([["a"], [1]]))
    with zipfile.ZipFile(out, "a") as book:
        for number in range(1_000):
            book.writestr(f"xl/x/{number}", b"")
    with pytest.raises(CannotRead, match="at most 1000"):
        read_file(out.getvalue())


def sheet_with(xml):
    """A workbook whose only sheet is that XML."""
    out = io.BytesIO()
    plain = xlsx_bytes([["a"], [1]])
    with zipfile.ZipFile(io.BytesIO(plain)) as old, zipfile.ZipFile(out, "w") as new:
        for member in old.infolist():
            content = xml if "worksheets/" in member.filename else old.read(member)
            new.writestr(member.filename, content)
    return out.getvalue()


def test_one_cell_far_away_does_not_swell_the_table():
    xml = b'<worksheet><sheetData><row r="1048576"><c r="XFD1048576"><v>1</v></c></row></sheetData></worksheet>'
    with pytest.raises(CannotRead, match="more than 20000 rows"):
        read_file(sheet_with(xml))


def test_entities_are_refused():
    xml = b'<!DOCTYPE x [<!ENTITY a "aaaa">]><worksheet><sheetData/></worksheet>'
    with pytest.raises(CannotRead, match="document type"):
        read_file(sheet_with(xml))
