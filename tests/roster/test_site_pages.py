import pytest
from django.urls import reverse

from programme.ledger.models import Entry
from programme.roster.models import Membership, Role
from programme.roster.site_forms import SiteForm
from tests import builders as b

pytestmark = pytest.mark.django_db


def page(site, name, *args):
    return reverse(f"site:{name}", args=[site.code, *args])


def filled(site, **changed):
    form = SiteForm(instance=site)
    first = {name: form[name].value() for name in form.fields}
    return {k: v for k, v in (first | changed).items() if v not in (None, False)}


@pytest.mark.parametrize("name", ["settings", "members"])
@pytest.mark.parametrize(
    ("role", "status"),
    [("administrator", 200), ("coordinator", 403), ("manager", 403)],
    ids=["may", "coordinator", "manager"],
)
def test_only_the_administrator_changes_the_site(name, role, status):
    site = b.make_site()
    assert b.client_for(b.make_user(role, site)).get(page(site, name)).status_code == status


@pytest.mark.parametrize("name", ["about", "settings", "members"])
def test_another_site_is_not_found(name):
    stranger = b.make_user("administrator", b.make_site("south"))
    assert b.client_for(stranger).get(page(b.make_site(), name)).status_code == 404


def test_everybody_of_the_site_may_read_what_holds_there():
    site = b.make_site()
    answer = b.client_for(b.make_user("manager", site)).get(page(site, "about"))
    assert "United States respirator rules" in answer.content.decode()


def test_a_changed_setting_stands_in_the_ledger_with_its_former_value():
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    client.post(page(site, "settings"), filled(site, statistic="upper95"))
    site.refresh_from_db()
    assert site.statistic == "upper95"
    assert Entry.objects.get(act="site changed").detail["statistic"] == ["upper70", "upper95"]


@pytest.mark.parametrize(
    ("field", "value", "says"),
    [
        ("fit_interval_months", "18", "12 at most"),
        ("temperature_c", "nan", "-40 to 60"),
        ("pressure_kpa", "-3", "50 to 110"),
        ("breathing_limit_pa", "1e9", "20 to 1500"),
        ("adopted_limit_lists", ["EU-IOELV"], "US-NIOSH-REL"),
    ],
    ids=str,
)
def test_a_looser_or_impossible_setting_is_refused_with_what_is_allowed(field, value, says):
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    answer = client.post(page(site, "settings"), filled(site, **{field: value}))
    assert answer.status_code == 422
    assert says in answer.content.decode()


def test_another_rule_pack_is_asked_about_first():
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    changed = filled(site, rule_pack="gb-2026-1")
    assert client.post(page(site, "settings"), changed).status_code == 422
    client.post(page(site, "settings"), changed | {"is_meant": "on"})
    site.refresh_from_db()
    assert site.rule_pack == "gb-2026-1"


def test_a_new_user_gets_a_role_and_a_first_password():
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    sent = {"username": "hedda", "role": "hygienist", "password": "nine or more letters"}
    client.post(page(site, "members"), sent)
    assert Membership.objects.get(user__username="hedda").role == Role.HYGIENIST


def test_a_new_user_without_a_password_is_refused():
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    answer = client.post(page(site, "members"), {"username": "hedda", "role": "hygienist"})
    assert answer.status_code == 422


def test_the_last_administrator_stays():
    site = b.make_site()
    user = b.make_user("administrator", site)
    row = Membership.objects.get(user=user)
    b.client_for(user).post(page(site, "member_remove", row.pk))
    assert Membership.objects.filter(pk=row.pk).exists()


def test_a_member_row_of_another_site_is_not_found():
    site, south = b.make_site(), b.make_site("south")
    row = Membership.objects.get(user=b.make_user("administrator", south))
    client = b.client_for(b.make_user("administrator", site))
    assert client.post(page(site, "member_remove", row.pk)).status_code == 404
