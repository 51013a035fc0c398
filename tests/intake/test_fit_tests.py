"""Fit tests come in with every exercise; the overall figure is worked out again."""

from datetime import date

import pytest

from programme.records.intake.fit_tests import preview_fit_tests
from programme.records.intake.matching import Matching, suggested_columns
from programme.records.intake.reader import read_file
from programme.records.intake.table import table_of
from programme.rulepack.load import load
from tests.builders import make_facepiece, make_site, make_worker
from tests.intake.files import csv_bytes

pytestmark = pytest.mark.django_db
TODAY = date(2026, 3, 2)
HEADER = ["Worker", "Facepiece", "Size", "Protocol", "Date", "Overall", "Outcome",
          *(f"Ex {n}" for n in range(1, 10))]  # fmt: skip
# 29 CFR 1910.134 App. A: the harmonic mean of 200, 150, 90, 180, 120, 110, 200 is 137.9 (computed).
FIGURES = ["200", "150", "90", "180", "120", "", "110", "200", ""]
GOOD = {"Worker": "W-1", "Facepiece": "Half A", "Size": "m", "Protocol": "ambient_aerosol_cnc",
        "Date": "2026-02-03", "Overall": "138", "Outcome": "pass",
        **dict(zip(HEADER[7:], FIGURES, strict=True))}  # fmt: skip


@pytest.fixture
def site():
    site = make_site()
    make_worker(site, "Ana Whitlock", personnel_number="W-1", born_on=date(1990, 5, 1))
    make_facepiece(site, name="Half A")
    return site


def preview(site, *rows):
    lines = [",".join(row[name] for name in HEADER) for row in rows]
    read = read_file(csv_bytes(",".join(HEADER), *lines))
    table = table_of(read.table, read.reading)
    matching = Matching(suggested_columns("fit_tests", table.header))
    return preview_fit_tests(
        table, matching, site=site, today=TODAY, pack=load(site.rule_pack)
    ).rows


def one(site, **cells):
    return preview(site, GOOD | {name.replace("_", " "): cell for name, cell in cells.items()})[0]


def test_the_overall_figure_is_the_harmonic_mean_of_what_counts(site):
    row = one(site)
    assert row.status == "new", row.problems
    assert row.record.test.overall_fit_factor == pytest.approx(137.9, abs=0.05)
    assert (row.record.test.as_reported, row.questions) == ("138", [])


def test_the_arithmetic_mean_is_not_taken_over(site):
    assert "arithmetic mean" in " ".join(one(site, Overall="150").questions)


def test_the_outcome_of_the_file_is_checked(site):
    assert one(site, Outcome="fail").questions == [
        "Outcome: the file says failed; by its figures it is passed."
    ]


@pytest.mark.parametrize(
    ("cells", "column", "says"),
    [
        ({"Ex_2": "0"}, "Exercise 2", "0 is not allowed; 1 to 1000000000"),
        ({"Ex_2": "0.5"}, "Exercise 2", "0.5 is not allowed"),
        ({"Ex_2": "-5"}, "Exercise 2", "-5 is not allowed"),
        ({"Ex_2": "NaN"}, "Exercise 2", "is not a number"),
        ({"Ex_2": "1.2e9"}, "Exercise 2", "is not allowed"),
        ({"Ex_9": "300"}, "Exercise 9", "figures only"),
        ({"Worker": "W-9"}, "Worker", "not on the roster"),
        ({"Facepiece": "Half B"}, "Facepiece", "known are Half A"),
        ({"Size": "XXL"}, "Size", "no size of Half A; L, M, S"),
        ({"Size": ""}, "Size", "is empty"),
        ({"Protocol": "sniff"}, "Protocol", "'sniff' is no protocol"),
        ({"Date": "2026-03-03"}, "Date", "not in the future"),
        ({"Date": "1989-01-01"}, "Date", "was born 1990-05-01"),
        ({"Overall": "0"}, "Overall", "0 is not allowed"),
    ],
)
def test_a_bad_row_is_refused_by_column_value_and_what_is_allowed(site, cells, column, says):
    told = [str(problem) for problem in one(site, **cells).problems]
    assert any(text.startswith(column) and says in text for text in told), told


def test_an_overall_figure_alone_is_kept_as_incomplete_and_asked(site):
    row = one(site, **{f"Ex_{n}": "" for n in range(1, 10)})
    assert row.record.test.outcome == "incomplete"
    assert "never a pass" in row.questions[0]


def test_a_qualitative_test_needs_its_outcome(site):
    empty = {f"Ex_{n}": "" for n in range(1, 10)} | {"Protocol": "saccharin", "Overall": ""}
    assert one(site, **empty).record.test.outcome == "passed"
    assert "is empty" in str(one(site, **empty, Outcome="").problems[0])


def test_the_same_test_twice_in_a_file_is_stored_once(site):
    assert [row.status for row in preview(site, GOOD, GOOD)] == ["new", "known"]
