"""The filtration library against published and independently computed values.

Each row of data/filtration_checks.csv carries its source, how sure it is, and its own tolerance.
"""

import numpy as np
import pytest

from tests.filtration.recipes import recipe_for
from tests.published.check_rows import read_rows

ROWS = read_rows("filtration_checks.csv")

# Rows with a number and a tolerance that no function of the library works out, and why.
NOT_OURS = {
    "mpps-pub-3": "measured on facepieces of other construction; see test_filtration_media.py",
    "mpps-pub-4": "measured on facepieces of other construction; see test_filtration_media.py",
    "mpps-pub-5": "measured after solvent discharge; real webs keep finer fibres and some charge",
    "mpps-pub-6": "measured on one mask and two ventilation filters; webs not described",
    "leak-cho-slope": "a slope through published values; see test_filtration_leak.py",
    "br-pair": "a certification flow: rule pack, not physics",
    "lim-84-in": "a legal limit: rule pack",
    "lim-84-in-pa": "a legal limit: rule pack",
    "lim-84-ex": "a legal limit: rule pack",
    "lim-149-FFP1-30": "a legal limit: rule pack",
    "lim-149-FFP1-95": "a legal limit: rule pack",
    "lim-149-FFP2-95": "a legal limit: rule pack",
    "lim-149-FFP3-30": "a legal limit: rule pack",
    "lim-149-ex": "a legal limit: rule pack",
    "pen-149-FFP2": "a legal limit: rule pack",
    "pen-143-P3": "a legal limit: rule pack",
    "pen-84-95": "a legal limit: rule pack",
    "pen-84-100": "a legal limit: rule pack",
    "load-niosh": "a use limitation: rule pack",
    "load-niosh-pair": "a use limitation: rule pack",
    "wpf-nelson-5": "measured workplace factors; see test_filtration_protection.py",
    "wpf-nelson-lt10": "measured workplace factors; see test_filtration_protection.py",
    "wpf-nelson-gsd": "a slope through two percentiles; see test_filtration_protection.py",
    "wpf-nicas-pub": "a published conclusion over seven studies whose data are not at hand",
}

WORKED_OUT = [row for row in ROWS if not row.is_fact and recipe_for(row) is not None]


@pytest.mark.parametrize("row", WORKED_OUT, ids=lambda row: row.id)
def test_the_library_agrees_with_the_row(row):
    ours = recipe_for(row)(row)
    np.testing.assert_allclose(ours, row.expected, rtol=row.rel_tol, err_msg=row.source)


def test_every_row_is_worked_out_or_a_fact_or_left_out_with_a_reason():
    unaccounted = {
        row.id
        for row in ROWS
        if not row.is_fact and recipe_for(row) is None and row.id not in NOT_OURS
    }
    assert unaccounted == set()


def test_no_row_is_left_out_that_could_be_worked_out():
    assert not set(NOT_OURS) & {row.id for row in WORKED_OUT}
    assert set(NOT_OURS) <= {row.id for row in ROWS}


def test_every_row_names_its_source():
    assert all(row.source and row.sure in {"verified", "computed", "memory"} for row in ROWS)
