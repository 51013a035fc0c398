import html
import json
import re

import pytest
from django.urls import reverse

from programme.ledger import actions as ledger
from programme.selection.assess import assess
from tests import builders as b
from tests.selection.scene import whole

pytestmark = pytest.mark.django_db
PERIOD = {"start": "2025-03-02", "end": "2026-03-02", "judged": "2026-03-02", "print": "1"}


@pytest.fixture
def scene():
    return whole()


def client(scene, role="manager"):
    return b.client_for(b.make_user(role, scene.site))


def page(scene, name, *args):
    return reverse(f"records:{name}", args=[scene.site.code, *args])


def test_the_summary_comes_as_an_attachment_with_a_safe_name(scene):
    answer = client(scene).get(page(scene, "records"), PERIOD)
    assert answer["Content-Type"] == "application/pdf"
    assert answer["Content-Disposition"].startswith("attachment")
    assert answer.content.startswith(b"%PDF")


@pytest.mark.parametrize(
    ("field", "value", "says"),
    [
        ("end", "2024-01-01", "must be 2025-03-02 or later"),
        ("start", "", "required"),
        ("judged", "31/04/2026", "31/04/2026"),
    ],
    ids=["upside down", "empty", "no date"],
)
def test_a_period_that_cannot_be_is_refused_and_shown_again(scene, field, value, says):
    answer = client(scene).get(page(scene, "records"), PERIOD | {field: value})
    assert answer.status_code == 422
    assert says in answer.content.decode()


@pytest.mark.parametrize("name", ["records", "ledger"])
def test_another_sites_records_are_not_found(scene, name):
    stranger = b.client_for(b.make_user("administrator", b.make_site("south")))
    assert stranger.get(page(scene, name)).status_code == 404
    assert client(scene).get(page(scene, name)).status_code == 200


def test_a_shift_sheet_of_another_sites_task_is_not_found(scene):
    stranger = b.client_for(b.make_user("administrator", b.make_site("south")))
    assert stranger.get(page(scene, "shift_sheet", scene.task.pk)).status_code == 404
    answer = client(scene).get(page(scene, "shift_sheet", scene.task.pk), {"on": "2026-03-02"})
    assert answer["Content-Type"] == "application/pdf"


def test_the_ledger_page_checks_the_ledger_and_says_its_head(scene):
    ledger.enter("site changed", chain=scene.site.code, of=scene.site, by="ada")
    answer = client(scene).post(page(scene, "ledger_check"), follow=True)
    assert f"head {ledger.head_of(scene.site.code)}" in answer.content.decode()


def test_the_api_prints_the_same_object(scene):
    address = f"/api/sites/{scene.site.code}/tasks/{scene.task.code}/chain/?on=2026-03-02"
    answer = client(scene).get(address)
    mine = assess(scene.task, on=b.DAY)
    assert answer.json()["verdict"] == mine.verdict
    assert answer.json()["links"][2]["figure"] == mine.links[2].figure
    assert "NaN" not in answer.content.decode()


@pytest.mark.parametrize("part", ["chains/", "mismatches/", "tasks/{task}/chain/"])
def test_the_api_is_limited_to_the_users_sites(scene, part):
    address = f"/api/sites/{scene.site.code}/{part.format(task=scene.task.code)}"
    stranger = b.client_for(b.make_user("administrator", b.make_site("south")))
    assert stranger.get(address).status_code == 404
    assert client(scene).get(address).status_code == 200


def test_the_api_names_what_it_refuses(scene):
    address = f"/api/sites/{scene.site.code}/chains/"
    one = client(scene)
    bad = one.get(address, {"on": "31/04/2026"})
    assert bad.status_code == 400
    assert json.loads(bad.content)["error"]["field"] == "on"
    assert one.post(address).status_code == 405
    one.logout()
    assert one.get(address).status_code == 401


def test_the_api_lists_its_addresses(scene):
    answer = client(scene).get("/api/")
    assert answer.json()["sites"] == "/api/sites/"
    assert client(scene).get("/api/sites/").json()[0]["code"] == scene.site.code


@pytest.mark.parametrize("where", ["today/", "tasks/", "tasks/{task}/", "today/?format=csv"])
def test_a_manager_never_reads_a_medical_reason(scene, where):
    scene.worker.clearances.update(outcome="not_able")
    where = where.format(task=scene.task.pk)
    address = f"/s/{scene.site.code}/{where}{'&' if '?' in where else '?'}on=2026-03-02"
    assert "not cleared" not in client(scene).get(address).content.decode()
    assert "not cleared" in client(scene, "coordinator").get(address).content.decode()


def test_the_api_veils_a_medical_reason_as_the_pages_do(scene):
    scene.worker.clearances.update(outcome="not_able")
    address = f"/api/sites/{scene.site.code}/chains/?on=2026-03-02"
    assert "not cleared" not in client(scene).get(address).content.decode()
    assert "not cleared" in client(scene, "coordinator").get(address).content.decode()


@pytest.mark.parametrize("role", ["coordinator", "hygienist", "manager", "administrator"])
def test_no_link_of_today_or_a_task_leads_a_role_to_a_refusal(scene, role):
    scene.worker.clearances.all().delete()
    scene.worker.trainings.all().delete()
    scene.worker.filter_changes.all().delete()
    scene.limit.delete()
    one = client(scene, role)
    for where in ("today/", f"tasks/{scene.task.pk}/"):
        text = one.get(f"/s/{scene.site.code}/{where}", {"on": "2026-03-02"}).content.decode()
        for address in set(re.findall(r'href="(/s/[^"#]+)', text)):
            assert one.get(html.unescape(address)).status_code == 200, address
