import contextlib
import csv
import io
import json
import os
import socket
import sqlite3
import subprocess
import sys
from datetime import date

import pytest
import yaml
from django.conf import settings
from django.core.management import CommandError, call_command
from django.db import connection
from django.db.models import Count
from django.test.utils import CaptureQueriesContext

from exposure.models import Sample, Task
from exposure.reference import load_reference
from programme.fit.models import FitTest
from programme.ledger.actions import verify
from programme.ledger.models import Entry
from programme.records.demo.loader import is_loaded, load_demo, real_sites
from programme.roster.models import Role, Site, Training, Worker
from programme.selection.assess import assess, assess_site
from programme.selection.chain import LINKS
from tests.ledger.test_ledger import without_guard

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
    assert Task.objects.count() >= 6


def test_the_planted_mismatches_are_of_every_severity_and_link():
    load_reference()
    load_demo(DAYS[0])
    made = [
        m
        for site in Site.objects.all()
        for chain in assess_site(site, on=DAYS[0])
        for m in chain.mismatches
    ]
    assert {m.severity for m in made} == {"stop", "fix", "plan"}
    assert {m.link for m in made} == set(LINKS)
    assert len({m.code for m in made}) >= 14


@pytest.mark.parametrize("task", ["sand-mixing", "mortar-raking"])
def test_some_chains_hold_entirely(yard, task):
    of = Task.objects.get(code=task)
    chain = assess(of, on=DAYS[0])
    assert chain.state == "holds"
    assert chain.may_start == len(chain.crew)


def test_every_fit_test_has_all_its_exercises(yard):
    counts = set(FitTest.objects.annotate(n=Count("exercises")).values_list("protocol", "n"))
    assert counts == {("modified_cnc_elastomeric", 4), ("ambient_aerosol_cnc", 7)}


def test_nobody_is_tested_trained_or_sampled_before_starting_here(yard):
    first = Worker.objects.order_by("active_from").values_list("active_from", flat=True)[0]
    assert not FitTest.objects.filter(tested_on__lt=first).exists()
    assert not Sample.objects.filter(sampled_on__lt=first).exists()
    assert not Training.objects.filter(trained_on__lt=first).exists()


def test_a_real_site_called_like_the_demo_is_not_taken_for_it():
    Site.objects.create(code="tarnbeck", name="Tarnbeck Works", rule_pack="us-2026-1")
    assert not is_loaded()
    assert real_sites() == ["tarnbeck"]


@pytest.mark.parametrize("words", [(), ("--reset",)], ids=["load", "reset"])
def test_the_demo_touches_no_database_that_holds_a_real_site(words, settings):
    settings.IS_PLAIN_HTTP = True
    Site.objects.create(code="mill", name="Mill", rule_pack="us-2026-1")
    with pytest.raises(CommandError, match=r"database: it holds mill, which this command did not"):
        call_command("demo", "--no-serve", *words)
    assert Site.objects.count() == 1


def test_invented_sites_are_no_real_ones(yard):
    printed("make_site", "trial", "--workers", "2", "--tasks", "1")
    assert real_sites() == []
    assert verify("trial").is_whole


def run_demo(folder, *words, **environment):
    kept = {k: v for k, v in os.environ.items() if not k.startswith(("HALEWARD_", "DATABASE_"))}
    command = [sys.executable, str(settings.BASE_DIR / "manage.py"), "demo", *words]
    env = {**kept, "HALEWARD_VAR": str(folder), "HALEWARD_TESTING": "1", **environment}
    return subprocess.run(command, env=env, capture_output=True, text=True, check=False)  # noqa: S603


def in_folder(folder, statement):
    with contextlib.closing(sqlite3.connect(folder / "haleward.sqlite3")) as database:
        row = database.execute(statement).fetchone()
        database.commit()
    return row


def test_one_command_prepares_all_a_second_keeps_the_records_and_a_reset_begins_anew(tmp_path):
    folder = tmp_path / "var"
    first = run_demo(folder, "--no-serve")
    assert first.returncode == 0, first.stderr
    for word in ("http://127.0.0.1:8000/", "corin", "hedda", "mara", "ada", "demo only"):
        assert word in first.stdout
    in_folder(folder, "update roster_worker set job = 'changed' where personnel_number = 'T001'")
    count = "select count(*) from roster_worker where job = 'changed'"
    assert run_demo(folder, "--no-serve").returncode == 0
    assert in_folder(folder, count) == (1,)
    assert run_demo(folder, "--no-serve", "--reset").returncode == 0
    assert in_folder(folder, count) == (0,)


def test_a_taken_port_is_named(tmp_path):
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        result = run_demo(tmp_path, "--port", str(port))
    assert result.returncode == 1
    assert f"--port: {port} is in use; choose another" in result.stderr


@pytest.mark.parametrize(
    ("environment", "says"),
    [
        ({"HALEWARD_SECRET_KEY": "x" * 60}, "HALEWARD_PLAIN_HTTP: not set"),
        ({"HALEWARD_PLAIN_HTTP": "0", "HALEWARD_SECRET_KEY": "x" * 60}, "HALEWARD_PLAIN_HTTP: not"),
    ],
    ids=["near a real site", "switched off"],
)
def test_where_a_secret_is_set_the_demo_asks_for_plain_http_in_words(tmp_path, environment, says):
    result = run_demo(tmp_path, "--no-serve", **environment)
    assert result.returncode == 1
    assert says in result.stderr
    assert not list(tmp_path.iterdir())


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
    assert [row["link"] for row in rows] == [*LINKS, *LINKS]


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (
            ("tarnbeck", "--task", "fettling", "--on", "2001-01-01"),
            r"--on: 2001-01-01 is not a day",
        ),
        (("nowhere",), r"site: 'nowhere' is not known; known are ardle-yard, tarnbeck"),
        (("tarnbeck", "--task", "x"), r"--task: 'x' is not a task of Tarnbeck Works"),
        (("tarnbeck", "--on", "31/04/2026"), r"'31/04/2026' is not a date; write it like"),
    ],
    ids=["before the task began", "site", "task", "day"],
)
def test_a_wrong_argument_is_named_with_what_is_allowed(yard, words, says):
    with pytest.raises(CommandError, match=says) as refused:
        call_command("assess", *words)
    # A word that the parser itself refuses ends the real command with 2 by the parser.
    assert refused.value.returncode == 2 or "--on" in words


def test_a_day_without_any_task_is_not_a_pass(yard):
    status, text = printed("assess", "tarnbeck", "--on", "2001-01-01")
    assert status == 1
    assert "No active task" in text


def test_the_ledger_command_prints_the_head(yard):
    status, text = printed("verify_ledger", "tarnbeck")
    assert status == 0
    assert verify("tarnbeck").head in text


@pytest.mark.parametrize(
    ("change", "status", "says"),
    [
        (lambda head: head, 0, "whole"),
        (lambda head: head.partition("-")[0] + "-" + "0" * 16, 1, "rewritten since"),
    ],
    ids=["as printed", "other digits"],
)
def test_the_digits_on_paper_are_compared_with_their_row(yard, change, status, says):
    head = verify("tarnbeck").head
    got, text = printed("verify_ledger", "tarnbeck", "--expect", change(head))
    assert got == status
    assert says in text


def test_an_older_paper_still_agrees_after_more_rows(yard):
    row = Entry.objects.get(chain="tarnbeck", serial=40)
    status, _ = printed("verify_ledger", "tarnbeck", "--expect", f"40-{row.hash[:16]}")
    assert status == 0


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("nowhere",), r"site: 'nowhere' has no ledger; known are ardle-yard, programme"),
        (("--expect", "40-0a1b2c3d4e5f6071"), r"--expect: .* name the site too"),
        (("tarnbeck", "--expect", "forty"), r"'forty' is not a head; write it like"),
    ],
    ids=["site", "no site", "head"],
)
def test_verify_ledger_names_a_wrong_argument(yard, words, says):
    with pytest.raises(CommandError, match=says):
        call_command("verify_ledger", *words)


def test_a_changed_row_is_a_fault(yard):
    without_guard()
    Entry.objects.filter(chain="tarnbeck", serial=7).update(says="never happened")
    status, text = printed("verify_ledger")
    assert status == 1
    assert "row 7 was changed after it was written" in text


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("Bad Code!",), r"code: 'Bad Code!'"),
        (("tarnbeck",), r"code: 'tarnbeck' is taken"),
        (("x", "--workers", "0"), r"'0' is not allowed; a whole number from 1 to"),
        (("x", "--seed", "-1"), r"'-1' is not allowed; a whole number from 0"),
    ],
    ids=["code", "taken", "workers", "seed"],
)
def test_make_site_names_a_wrong_argument(yard, words, says):
    with pytest.raises(CommandError, match=says):
        call_command("make_site", *words)


def test_a_paper_with_a_later_row_than_the_ledger_is_told(yard):
    status, text = printed("verify_ledger", "tarnbeck", "--expect", "999999-0a1b2c3d4e5f6071")
    assert status == 1
    assert "is missing" in text


def test_a_trial_site_of_any_size_can_be_made(yard):
    printed("make_site", "trial", "--workers", "12", "--tasks", "3")
    chains = assess_site(Site.objects.get(code="trial"), on=Site.objects.get(code="trial").today())
    assert [len(chain.crew) for chain in chains] == [4, 4, 4]


def test_the_judging_of_a_site_costs_the_same_queries_whatever_its_size(yard):
    counts = {}
    for tasks, workers in ((3, 10), (3, 100), (30, 10), (30, 100)):
        code = f"trial-{tasks}-{workers}"
        printed("make_site", code, "--workers", str(workers), "--tasks", str(tasks))
        site = Site.objects.get(code=code)
        with CaptureQueriesContext(connection) as queries:
            assess_site(site, on=site.today())
        counts[code] = len(queries)
    assert len(set(counts.values())) == 1, counts
