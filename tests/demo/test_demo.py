import csv
import io
import json
from datetime import date

import pytest
import yaml
from django.conf import settings
from django.core.management import CommandError, call_command

from exposure.models import Sample
from exposure.reference import load_reference
from programme.fit.models import FitTest
from programme.ledger.actions import verify
from programme.records.demo.loader import is_loaded, load_demo
from programme.roster.models import Role, Site, Worker
from programme.selection.assess import assess_site

pytestmark = pytest.mark.django_db
DAYS = [date(2026, 12, 1), date(2027, 3, 1)]


@pytest.fixture
def yard():
    load_reference()
    load_demo(DAYS[0])


def found(on):
    numbers = dict(Worker.objects.values_list("pk", "personnel_number"))
    return {
        (site.code, chain.task_code, numbers.get(m.worker_id), m.code, m.severity)
        for site in Site.objects.order_by("code")
        for chain in assess_site(site, on=on)
        for m in chain.mismatches
    }


def planted():
    rows = yaml.safe_load((settings.FIXTURES_DIR / "demo" / "planted.yaml").read_text())
    return {tuple(row) for row in rows}


@pytest.mark.parametrize("on", DAYS, ids=str)
def test_every_planted_mismatch_is_found_and_nothing_else(on):
    load_reference()
    load_demo(on)
    assert found(on) == planted()


def test_the_scenario_is_as_large_as_a_small_works(yard):
    assert Worker.objects.count() == 60
    assert Sample.objects.count() >= 150
    assert Sample.objects.filter(is_censored=True).count() >= 5
    assert FitTest.objects.count() >= 90
    assert {row[4] for row in planted()} == {"stop", "fix", "plan"}


def test_the_scenario_has_a_sign_in_for_every_role_and_a_whole_ledger(yard):
    site = Site.objects.get(code="tarnbeck")
    assert set(site.memberships.values_list("role", flat=True)) == set(Role.values)
    assert verify("tarnbeck").is_whole
    assert is_loaded()


def printed(*words, **options):
    out = io.StringIO()
    status = 0
    try:
        call_command(*words, stdout=out, **options)
    except SystemExit as stop:
        status = stop.code
    return status, out.getvalue()


def test_the_command_line_prints_the_same_object_and_says_by_its_status_that_a_link_is_broken(yard):
    status, text = printed("assess", "tarnbeck", "--on", "2026-12-01", "--format", "json")
    assert status == 1
    chains = assess_site(Site.objects.get(code="tarnbeck"), on=DAYS[0])
    assert [row["verdict"] for row in json.loads(text)] == [chain.verdict for chain in chains]


def test_the_status_is_zero_where_all_links_hold(yard):
    status, text = printed("assess", "tarnbeck", "--task", "fettling", "--on", "2026-12-01")
    assert status == 0
    assert "Air = Limit = Ratio = Class = Face = Filter ." in text


def test_the_csv_has_a_row_for_each_link(yard):
    _, text = printed("assess", "ardle-yard", "--format", "csv", "--on", "2026-12-01")
    rows = list(csv.DictReader(io.StringIO(text)))
    assert [row["link"] for row in rows] == ["Air", "Limit", "Ratio", "Class", "Face", "Filter"]


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("nowhere",), r"site: 'nowhere' is not known; known are ardle-yard, tarnbeck"),
        (("tarnbeck", "--task", "x"), r"--task: 'x' is not a task of Tarnbeck Works"),
        (("tarnbeck", "--on", "31/04/2026"), r"'31/04/2026' is not a date; write it like"),
    ],
    ids=["site", "task", "day"],
)
def test_a_wrong_argument_is_named_with_what_is_allowed(yard, words, says):
    with pytest.raises(CommandError, match=says):
        call_command("assess", *words)


def test_the_ledger_command_prints_the_head(yard):
    status, text = printed("verify_ledger", "tarnbeck")
    assert status == 0
    assert verify("tarnbeck").head in text


def test_a_paper_with_a_later_row_than_the_ledger_is_told(yard):
    status, text = printed("verify_ledger", "tarnbeck", "--expect", "999999-0a1b2c3d4e5f6071")
    assert status == 1
    assert "is missing" in text


def test_a_trial_site_of_any_size_can_be_made(yard):
    printed("make_site", "trial", "--workers", "12", "--tasks", "3")
    chains = assess_site(Site.objects.get(code="trial"), on=Site.objects.get(code="trial").today())
    assert [len(chain.crew) for chain in chains] == [4, 4, 4]


def test_the_judging_of_a_site_costs_the_same_queries_for_3_and_30_tasks(
    yard, django_assert_max_num_queries
):
    counts = []
    for tasks, workers in ((3, 12), (30, 90)):
        printed("make_site", f"trial-{tasks}", "--workers", str(workers), "--tasks", str(tasks))
        site = Site.objects.get(code=f"trial-{tasks}")
        with django_assert_max_num_queries(15) as queries:
            assess_site(site, on=site.today())
        counts.append(len(queries))
    assert counts[0] == counts[1]
