"""Every bad row of a laboratory's sheet is named by column, value and what is allowed."""

from datetime import date

import pytest

from programme.records.intake.matching import Matching, suggested_columns
from programme.records.intake.reader import read_file
from programme.records.intake.samples import preview_samples
from programme.records.intake.table import table_of
from tests.builders import (
    make_agent,
    make_sample,
    make_site,
    make_task,
    make_task_agent,
    make_worker,
)
from tests.intake.files import csv_bytes, xlsx_bytes

pytestmark = pytest.mark.django_db
TODAY = date(2026, 3, 2)
HEADER = ["Task", "Agent", "Date", "Worker", "Result", "Unit", "LOD", "Minutes", "Flow", "Volume",
          "Where", "Span", "Sample number"]  # fmt: skip
GOOD = {
    "Task": "Relining", "Agent": "lead metal", "Date": "2026-02-03", "Worker": "W-1", "Result": "0.031",
    "Unit": "mg/m3", "LOD": "", "Minutes": "450", "Flow": "2", "Volume": "900", "Where": "personal",
    "Span": "full", "Sample number": "L-1",
}  # fmt: skip


@pytest.fixture
def site():
    site = make_site()
    task = make_task(site, code="reline")
    lead = make_agent(
        "Lead and inorganic compounds (as Pb)",
        key="7439-92-1",
        synonyms="lead metal; inorganic lead",
    )
    toluene = make_agent("Toluene", key="108-88-3", kind="vapour")
    make_task_agent(task, lead)
    make_task_agent(task, toluene, form="gas", fraction="vapour")
    make_worker(site, "Ana Whitlock", personnel_number="W-1", born_on=date(1990, 5, 1))
    return site


def preview(site, data, **chosen):
    read = read_file(data)
    table = table_of(read.table, read.reading)
    matching = Matching(suggested_columns("samples", table.header), **chosen)
    return preview_samples(table, matching, site=site, today=TODAY)


def one(site, *, decimal="point", order=None, **cells):
    row = GOOD | {name.replace("_", " "): cell for name, cell in cells.items()}
    data = csv_bytes(";".join(HEADER), ";".join(row[name] for name in HEADER))
    return preview(site, data, decimal=decimal, order=order).rows[0]


def test_a_good_row_is_read_as_it_will_be_stored(site):
    row = one(site)
    assert row.status == "new", row.problems
    sample = row.record
    assert (sample.value, sample.unit, sample.minutes, sample.worker.name) == (
        0.031, "mg/m3", 450.0, "Ana Whitlock",
    )  # fmt: skip


@pytest.mark.parametrize("agent", ["7439-92-1", "lead metal", "INORGANIC  lead", "Lead"])
def test_an_agent_is_found_by_number_synonym_or_beginning(site, agent):
    assert one(site, Agent=agent).record.task_agent.agent.key == "7439-92-1"


@pytest.mark.parametrize(
    ("result", "lod", "value", "is_censored"),
    [("<0.02", "", 0.02, True), ("ND", "0.02", 0.02, True), ("0.3", "0.02", 0.3, False)],
)
def test_below_detection_is_kept_as_such(site, result, lod, value, is_censored):
    sample = one(site, Result=result, LOD=lod).record
    assert (sample.value, sample.is_censored) == (value, is_censored)


def test_micrograms_are_kept_as_milligrams_and_as_reported(site):
    sample = one(site, Result="250", Unit="µg/m³").record
    assert (sample.value, sample.unit) == (0.25, "mg/m3")
    assert (sample.result_as_reported, sample.unit_as_reported) == ("250", "µg/m³")


def test_a_decimal_comma_is_read_when_declared(site):
    assert one(site, Result="0,031", decimal="comma").record.value == 0.031


@pytest.mark.parametrize(
    ("cells", "column", "says"),
    [
        ({"Unit": ""}, "Unit of the result", "is empty; a value is needed"),
        ({"Unit": "mg"}, "Unit of the result", "mg is not allowed; it must be mg/m3"),
        ({"Unit": "ppm"}, "Unit of the result", "ppm is for gases and vapours only"),
        ({"Result": "-0.3"}, "Result", "a result must be above 0"),
        ({"Result": "NaN"}, "Result", "is not a number"),
        ({"Result": "0"}, "Result", "enter the detection limit as <value"),
        ({"Result": "ND"}, "Result", "needs its detection limit"),
        ({"Result": ""}, "Result", "is empty"),
        ({"Result": "0,031"}, "Result", "write 0.031"),
        ({"Result": "1_000"}, "Result", "is not a number"),
        ({"Result": "2e6"}, "Result", "at most 1 000 000"),
        ({"Date": "2026-03-03"}, "Date", "not in the future"),
        ({"Date": "03/04/2025"}, "Date", "can be read as 2025-04-03 or as 2025-03-04"),
        ({"Date": "46000"}, "Date", "is not a date"),
        ({"Date": "1985-01-01"}, "Date", "is a task from"),
        ({"Worker": "W-9"}, "Worker", "'W-9' is not on the roster"),
        ({"Agent": "Unobtainium"}, "Agent", "'Unobtainium' is not known"),
        ({"Agent": "7439-92-2"}, "Agent", "must be 1"),
        ({"Task": "Painting"}, "Task", "'Painting' is no task here; known are Relining"),
        ({"Minutes": "1441"}, "Minutes", "1441 is not allowed; 0.1 to 1440 min"),
        ({"Flow": "0"}, "Flow", "0 is not allowed; 0.001 to 100 L/min"),
        ({"Where": "near"}, "Where", "'near' is not allowed; one of personal, area, inside"),
        ({"Span": ""}, "Span", "is empty"),
        ({"Sample_number": "a\u202eb"}, "Sample number", "U+202E is not allowed"),
        ({"Sample_number": "x" * 61}, "Sample number", "61 characters are not allowed; at most 60"),
    ],
)  # fmt: skip
def test_a_bad_row_is_refused_by_column_value_and_what_is_allowed(site, cells, column, says):
    row = one(site, **cells)
    assert row.status == "bad"
    told = [str(problem) for problem in row.problems]
    assert any(text.startswith(column) and says in text for text in told), told


def test_one_refusal_does_not_hide_another(site):
    row = one(site, Result="0", Minutes="x", Task="Painting", Unit="")
    assert len(row.problems) == 4


@pytest.mark.parametrize(
    ("cells", "says"),
    [
        ({"Volume": "90"}, "makes 900 L"),
        ({"Span": "short"}, "long for a short-term sample"),
        ({"Minutes": "60", "Volume": "120"}, "cover 12 % of the 8 h shift"),
    ],
)
def test_what_is_possible_but_unlikely_is_asked(site, cells, says):
    row = one(site, **cells)
    assert row.status == "new", row.problems
    assert any(says in question for question in row.questions)


def test_a_column_of_zeros_and_ones_marks_what_is_below_detection(site):
    data = csv_bytes("value,censored", "0.4,0", "0.1,1")
    fixed = {"task": "reline", "agent": "7439-92-1", "date": "2026-02-03", "unit": "mg/m3",
             "where": "personal", "span": "full"}  # fmt: skip
    rows = preview(site, data, fixed=fixed).rows
    assert [(row.record.value, row.record.is_censored) for row in rows] == [
        (0.4, False),
        (0.1, True),
    ]


def test_a_flag_against_its_result_is_refused(site):
    data = csv_bytes(
        ",".join([*HEADER, "censored"]), ",".join([*(GOOD | {"Result": "<0.02"}).values(), "0"])
    )
    assert "does not go with the result" in str(preview(site, data).rows[0].problems[0])


def test_equal_lines_of_one_file_ask_for_a_sample_number(site):
    line = ";".join((GOOD | {"Sample number": ""}).values())
    rows = preview(site, csv_bytes(";".join(HEADER), line, line)).rows
    assert [row.status for row in rows] == ["new", "bad"]
    assert "row 2 is the same line" in str(rows[1].problems[0])


def test_the_row_mark_tells_equal_lines_apart(site):
    names = HEADER[:-1]
    line = ";".join(GOOD[name] for name in names)
    found = preview(site, csv_bytes(";".join(names), line, line), fixed={"reference": "Pb-{row}"})
    assert [row.record.reference for row in found.rows] == ["Pb-2", "Pb-3"]


def test_a_unit_that_slipped_is_asked_about(site):
    lines = [";".join((GOOD | {"Result": value, "Sample number": value}).values())
             for value in ("0.03", "0.04", "0.05", "31")]  # fmt: skip
    rows = preview(site, csv_bytes(";".join(HEADER), *lines)).rows
    assert [bool(row.questions) for row in rows] == [False, False, False, True]


def test_another_site_has_its_own_tasks_and_people(site):
    assert "no task here" in str(one(make_site("south")).problems[0])


def test_two_people_of_one_name_are_told_apart_by_number(site):
    make_worker(site, "Ana Whitlock", personnel_number="W-2")
    assert "W-1, W-2" in str(one(site, Worker="Ana Whitlock").problems[0])


def test_a_formula_cell_is_named(site):
    rows = [HEADER, [GOOD[name] if name != "Result" else None for name in HEADER]]
    found = preview(site, xlsx_bytes(rows, formulas=[("E2", "=1/32", 0.03125)])).rows[0]
    assert found.record.value == 0.03125
    assert found.questions == ["E2 holds a formula; its stored value 0.03125 is taken."]


def test_number_cells_are_read_whatever_the_decimal_mark_of_text_cells(site):
    rows = [HEADER, [GOOD[name] if name != "Result" else 0.031 for name in HEADER]]
    assert preview(site, xlsx_bytes(rows), decimal="comma").rows[0].record.value == 0.031


def test_5000_rows_take_the_queries_of_one(site, django_assert_num_queries):
    lines = [";".join((GOOD | {"Sample number": f"L-{n}"}).values()) for n in range(5_000)]
    data = csv_bytes(";".join(HEADER), *lines)
    with django_assert_num_queries(5):
        found = preview(site, data)
    assert len(found.new) == 5_000


def test_a_sample_that_stands_is_already_recorded(site):
    first = one(site).record
    first.fingerprint = one(site).record.fingerprint
    first.save()
    assert one(site).status == "known"
    assert "L-1 stands already" in one(site, Result="0.05").questions[0]


def test_a_withdrawn_sample_may_come_in_again(site):
    make_sample(one(site).record.task_agent, fingerprint=one(site).record.fingerprint,
                withdrawn_at="2026-03-01T00:00Z")  # fmt: skip
    assert one(site).status == "new"
