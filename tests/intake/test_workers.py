"""A roster comes in row by row; nobody is taken for somebody else."""

from datetime import date

import pytest

from programme.records.intake.matching import Matching, suggested_columns
from programme.records.intake.reader import read_file
from programme.records.intake.table import table_of
from programme.records.intake.workers import preview_workers
from tests.builders import make_site, make_worker
from tests.intake.files import csv_bytes

pytestmark = pytest.mark.django_db
TODAY = date(2026, 3, 2)
HEADER = "Name,Personnel number,Job,Company,Contractor,Born on,Start date,End date"


def preview(*lines):
    read = read_file(csv_bytes(HEADER, *lines))
    table = table_of(read.table, read.reading)
    matching = Matching(suggested_columns("workers", table.header))
    return preview_workers(table, matching, site=make_site(), today=TODAY).rows


def test_a_good_row_becomes_a_worker():
    (row,) = preview("Zoë O'Neil,W-7,Mason,Brickwork Co,yes,1990-05-01,2024-01-08,")
    worker = row.record
    assert row.status == "new", row.problems
    assert (worker.name, worker.employer, worker.is_contractor) == (
        "Zoë O'Neil",
        "Brickwork Co",
        True,
    )


@pytest.mark.parametrize(
    ("line", "column", "says"),
    [
        (",W-7,,,,,2024-01-08,", "Name", "is empty"),
        ("Ana,,,,,,2024-01-08,", "Personnel number", "is empty"),
        ("Ana,#7,,,,,2024-01-08,", "Personnel number", "letters, digits, space"),
        ("Ana,W-7,,,,2026-03-03,2024-01-08,", "Born on", "not in the future"),
        ("Ana,W-7,,,,2024-02-01,2024-01-08,", "Born on", "must be before the first day"),
        ("Ana,W-7,,,,03/04/1990,2024-01-08,", "Born on", "can be read as"),
        ("Ana,W-7,,,,1/5/90,2024-01-08,", "Born on", "four digits"),
        ("Ana,W-7,,,,,,", "First day here", "is empty"),
        ("Ana,W-7,,,,,2024-01-08,2023-01-08", "No longer here from", "after the first day"),
        ("Ana,W-7,,,maybe,,2024-01-08,", "Contractor", "yes or no"),
        ("A\u200bna,W-7,,,,,2024-01-08,", "Name", "U+200B"),
    ],
)
def test_a_bad_row_is_refused_by_column_and_what_is_allowed(line, column, says):
    told = [str(problem) for problem in preview(line)[0].problems]
    assert any(text.startswith(column) and says in text for text in told), told


def test_a_number_that_stands_twice_in_the_file_is_refused():
    rows = preview("Ana,W-7,,,,,2024-01-08,", "Ben,W-7,,,,,2024-01-08,")
    assert str(rows[1].problems[0]).endswith("W-7 stands in row 2 too; once only.")


def test_a_number_of_somebody_else_is_refused():
    make_worker(make_site(), "Carla Dunn", personnel_number="W-7")
    assert "already belongs to Carla Dunn" in str(preview("Ana,W-7,,,,,2024-01-08,")[0].problems[0])


def test_a_person_who_stands_is_skipped_and_what_differs_is_told():
    make_worker(make_site(), "Ana", personnel_number="W-7", job="Mason")
    (row,) = preview("ana,W-7,Welder,,,,2024-01-08,")
    assert row.status == "known"
    assert row.questions == ["Job: Welder here, Mason stands; it stays."]


def test_the_same_name_under_another_number_is_asked():
    make_worker(make_site(), "Ana", personnel_number="W-6")
    (row,) = preview("Ana,W-7,,,,,2024-01-08,")
    assert (row.status, len(row.questions)) == ("new", 1)


def test_1000_people_take_one_query(django_assert_num_queries):
    make_site()
    lines = [f"Person {n},P-{n},,,,,2024-01-08," for n in range(1_000)]
    read = read_file(csv_bytes(HEADER, *lines))
    table = table_of(read.table, read.reading)
    matching, site = Matching(suggested_columns("workers", table.header)), make_site()
    with django_assert_num_queries(1):
        found = preview_workers(table, matching, site=site, today=TODAY)
    assert len(found.new) == 1_000
