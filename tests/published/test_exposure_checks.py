"""The exposure statistics against published and independently computed values.

Each row of data/exposure_checks.csv carries its source, how sure it is, and its own tolerance. The
data sets in data/datasets carry their citation in the first line.
"""

import numpy as np
import pytest

from exposure.statistics.compliance import en689_preliminary
from tests.exposure_statistics.recipes import LABELS, RECIPES, Given
from tests.published.check_rows import read_rows

ROWS = read_rows("exposure_checks.csv")

# Rows that no function of the library works out, and why.
NOT_OURS = {
    "D19": "a limit of the plain mean under a normal model: never given for exposures",
    "D38": "plot correlation with other plotting positions; Blom's are used (D36, D37)",
}

NUMBERS = [row for row in ROWS if row.unit != "label" and row.id not in NOT_OURS]
VERDICTS = [row for row in ROWS if row.unit == "label"]


@pytest.mark.parametrize("row", NUMBERS, ids=lambda row: row.id)
def test_the_library_agrees_with_the_row(row):
    ours = np.squeeze(RECIPES[row.quantity](Given(row)))
    expected = float(row.printed)
    slack = row.rel_tol if expected == 0.0 else 0.0
    np.testing.assert_allclose(ours, expected, rtol=row.rel_tol, atol=slack, err_msg=row.source)


@pytest.mark.parametrize("row", VERDICTS, ids=lambda row: row.id)
def test_the_preliminary_test_gives_the_verdict_of_the_row(row):
    allowed = row.printed == "pass_if_boundary_allowed"
    ours = en689_preliminary(Given(row).listed("ratios"), 1.0, does_boundary_pass=allowed)
    assert ours == LABELS[row.printed]


def test_every_row_is_worked_out_or_left_out_with_a_reason():
    assert set(NOT_OURS) <= {row.id for row in ROWS}
    left_out = {row.id for row in ROWS} - {row.id for row in NUMBERS + VERDICTS}
    assert left_out == set(NOT_OURS)


def test_every_row_names_its_source():
    assert all(row.source and row.sure in {"verified", "computed", "memory"} for row in ROWS)
