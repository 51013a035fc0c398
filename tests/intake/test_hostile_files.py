"""Whatever bytes come in, a file is read or refused by name; nothing else happens."""

import io
import zipfile

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from programme.records.intake.limits import CannotRead
from programme.records.intake.matching import plain, suggested_columns
from programme.records.intake.reader import read_file
from programme.records.intake.table import open_questions, table_of
from tests.intake.files import xlsx_bytes

WORKBOOK = xlsx_bytes([["Task", "Result"], ["a", 0.3], ["b", "<0.02"]])


def read_or_refused(data):
    try:
        read = read_file(data)
    except CannotRead as refused:
        assert str(refused)
        return
    if not open_questions(read.table, read.reading):
        table_of(read.table, read.reading)


@settings(max_examples=300, deadline=None)
@given(st.binary(max_size=400))
def test_any_bytes(data):
    read_or_refused(data)


@settings(max_examples=200, deadline=None)
@given(st.text(alphabet='ab,;\t"\n\r#=1. ', max_size=80))
def test_any_table_like_text(text):
    read_or_refused(text.encode())


@settings(max_examples=150, deadline=None)
@given(st.integers(0, len(WORKBOOK) - 1), st.binary(min_size=1, max_size=8))
def test_a_workbook_with_broken_bytes(place, broken):
    read_or_refused(WORKBOOK[:place] + broken + WORKBOOK[place + len(broken) :])


@settings(max_examples=60, deadline=None)
@given(st.binary(max_size=300))
def test_a_workbook_with_a_broken_sheet(content):
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(WORKBOOK)) as old, zipfile.ZipFile(out, "w") as new:
        for member in old.infolist():
            is_sheet = "worksheets/" in member.filename
            new.writestr(member.filename, content if is_sheet else old.read(member))
    read_or_refused(out.getvalue())


@pytest.mark.parametrize(
    ("header", "field"),
    [
        ("Result (mg/m3)", "result"),
        ("CONC.", "result"),
        ("Sampling date", "date"),
        ("Analyte", "agent"),
        ("Limit of detection", "lod"),
        ("Duration [min]", "minutes"),
        ("Lab", "laboratory"),
        ("Sample ID", "reference"),
        ("Units", "unit"),
        ("Personnel_Number", "worker"),
    ],
)
def test_a_column_is_suggested_by_what_its_header_means(header, field):
    assert suggested_columns("samples", [header]) == {field: 0}


def test_a_column_is_suggested_once():
    found = suggested_columns("samples", ["Result", "Value", "Concentration"])
    assert found == {"result": 0}


@given(st.text(max_size=40))
def test_a_header_is_made_plain_once(text):
    assert plain(plain(text)) == plain(text)
