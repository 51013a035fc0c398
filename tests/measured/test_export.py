"""No exported cell runs as a formula. The signs are those of the OWASP note on CSV injection."""

import csv
import io
from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as st

from programme.export import csv_response, csv_text, defused, safe_file_name, undefused


@pytest.mark.parametrize(
    "text",
    ["=1+1", "+1+1", "-cmd", "@SUM(A1)", "\tx", "\rx", "\nx", "＝1", "'=1", ' "=1', "+49 123"],
)
def test_a_formula_gets_an_apostrophe(text):
    assert defused(text) == "'" + text


@pytest.mark.parametrize("text", ["-5", "+5", "-0.02", "1e-6", "<0.02", "O'Neil", "n.d.", ""])
def test_numbers_and_words_stay(text):
    assert defused(text) == text


@given(st.text())
def test_our_own_export_brings_the_text_back(text):
    assert undefused(defused(text)) == text


def test_cells_keep_their_meaning():
    rows = list(
        csv.reader(io.StringIO(csv_text(["a"] * 5, [[None, -0.5, True, date(2026, 3, 4), "=x"]])))
    )
    assert rows[1] == ["", "-0.5", "yes", "2026-03-04", "'=x"]


@pytest.mark.parametrize(
    ("name", "safe"),
    [
        ("../../etc/passwd", "etc-passwd.csv"),
        ('C:\\x\n"y', "C-x-y.csv"),
        ("con", "list-con.csv"),
        ("", "list.csv"),
        ("šok 😀", "sok.csv"),
        ("a" * 300, "a" * 80 + ".csv"),
        ("samples.csv", "samples.csv"),
    ],
)
def test_a_file_name_is_safe(name, safe):
    assert safe_file_name(name, "csv") == safe


def test_the_answer_is_plain_utf8_without_a_mark():
    answer = csv_response("Übung", ["µg"], [["é"]])
    assert answer.content == "µg\r\né\r\n".encode()
    assert answer["Content-Disposition"] == 'attachment; filename="Ubung.csv"'
