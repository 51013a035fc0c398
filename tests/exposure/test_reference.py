"""Shipped agents and limits: loaded as often as you like, never over a site's own."""

import csv
import shutil

import pytest
from django.conf import settings
from django.core.management import CommandError, call_command

from exposure.models import Agent, ExposureLimit
from exposure.reference import load_reference, typical_sizes
from programme.ledger.actions import verify
from programme.ledger.models import Entry
from tests.builders import make_agent, make_limit, make_site

pytestmark = pytest.mark.django_db


@pytest.fixture
def folder(tmp_path):
    for name in ("agents.csv", "limits.csv"):
        shutil.copy(settings.FIXTURES_DIR / name, tmp_path / name)
    return tmp_path


def edit(path, change):
    with path.open(encoding="utf-8", newline="") as lines:
        rows = list(csv.DictReader(lines))
    rows = change(rows)
    with path.open("w", encoding="utf-8", newline="") as lines:
        writer = csv.DictWriter(lines, rows[0].keys())
        writer.writeheader()
        writer.writerows(rows)


def test_the_start_up_list_holds_209_agents_and_1335_limits():
    done = load_reference()
    assert (done.agents.added, done.limits.added) == (209, 1335)
    assert (Agent.objects.count(), ExposureLimit.objects.count()) == (209, 1335)


def test_loading_again_changes_nothing_and_enters_nothing():
    load_reference()
    again = load_reference()
    assert not again.is_news
    assert (again.agents.unchanged, again.limits.unchanged) == (209, 1335)
    assert Entry.objects.filter(act="reference data loaded").count() == 1


def test_every_row_keeps_its_source_and_mark():
    load_reference()
    assert not ExposureLimit.objects.filter(source="").exists()
    assert not Agent.objects.filter(source="").exists()
    assert ExposureLimit.objects.filter(sure="memory").count() == 620
    lead = Agent.objects.get(key="7439-92-1")
    assert lead.sure_by_column["filters"] == "memory"
    assert lead.sure_by_column["idlh"] == "verified"


def test_micrograms_are_kept_as_milligrams():
    # Beryllium, 29 CFR 1910.1024(c)(1): 0.2 µg/m3 as an 8-hour average. (from memory)
    load_reference()
    limit = ExposureLimit.objects.get(agent__key="7440-41-7", list_code="US-PEL", kind="TWA")
    assert (limit.value, limit.unit) == (pytest.approx(0.0002), "mg/m3")


def test_a_changed_file_changes_the_shipped_row_and_the_ledger_keeps_the_old(folder):
    load_reference(folder)

    def halve(rows):
        return [row | {"value": "0.025"} if row["cas"] == "7439-92-1" else row for row in rows[:1]]

    edit(folder / "limits.csv", lambda rows: [*halve(rows), *rows[1:]])
    done = load_reference(folder)
    assert (done.limits.added, len(done.limits.changed), done.limits.withdrawn) == (0, 1, 0)
    limit = ExposureLimit.objects.get(
        agent__key="7439-92-1", list_code="US-PEL", kind="TWA", site=None
    )
    assert limit.value == 0.025
    assert Entry.objects.get(act="shipped limit changed").detail == {"value": ["0.05", "0.025"]}
    assert verify("programme").is_whole


def test_a_limit_that_left_the_file_is_withdrawn_not_deleted(folder):
    load_reference(folder)
    edit(folder / "limits.csv", lambda rows: rows[1:])
    assert load_reference(folder).limits.withdrawn == 1
    assert ExposureLimit.objects.exclude(withdrawn_on=None).count() == 1
    assert ExposureLimit.objects.count() == 1335


def test_an_agent_that_left_the_file_stays(folder):
    load_reference(folder)
    edit(folder / "limits.csv", lambda rows: [row for row in rows if row["cas"] != "7439-92-1"])
    edit(folder / "agents.csv", lambda rows: rows[1:])
    assert load_reference(folder).agents.withdrawn == 1
    assert Agent.objects.filter(key="7439-92-1").exists()


def test_rows_of_a_site_are_never_touched():
    site = make_site()
    own = make_agent("Our lead", key="7439-92-1", site=site)
    limit = make_limit(own, 0.01, site=site, list_code="SITE")
    load_reference()
    own.refresh_from_db()
    limit.refresh_from_db()
    assert (own.name, limit.value, limit.withdrawn_on) == ("Our lead", 0.01, None)


@pytest.mark.parametrize(
    ("file", "column", "value", "says"),
    [
        ("limits.csv", "unit", "mg", "Unit: mg is not allowed"),
        ("limits.csv", "cas", "1-1-1", "is not in the file of agents"),
        ("agents.csv", "molar_mass_g_mol", "heavy", "'heavy' is not allowed"),
    ],
)
def test_a_row_that_cannot_be_read_stops_the_whole_load(folder, file, column, value, says):
    edit(folder / file, lambda rows: [rows[0] | {column: value}, *rows[1:]])
    with pytest.raises(CommandError, match=f"nothing was loaded: .*{says}"):
        call_command("load_reference", folder=folder)
    assert not Agent.objects.exists()


def test_the_command_says_what_it_did(capsys):
    call_command("load_reference")
    assert "agents: 209 in the file: 209 added" in capsys.readouterr().out


def test_typical_sizes_are_medians_of_mass_with_source_and_mark():
    sizes = typical_sizes()
    assert {size.metric for size in sizes} == {"MMAD", "MMD"}
    assert all(size.source and size.sure for size in sizes)
    grinding = next(size for size in sizes if size.id == "grind-metal")
    assert grinding.says == "hand grinding of metal: 10 µm, GSD 3 (MMAD, unconfirmed)"
    assert grinding.cited.startswith("unconfirmed: ")
