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
        ("fit_interval_months", "18", "never loosen it"),
        ("training_interval_months", "13", "12 at most"),
        ("temperature_c", "nan", "Air temperature: nan is not allowed; -40 to 60"),
        ("pressure_kpa", "-3", "Air pressure: -3 is not allowed; 50 to 110"),
        ("due_soon_days", "-1", "Due soon, ahead: -1 is not allowed; 1 to 120"),
        ("sample_age_months", "NaN", "Samples count for: NaN is not allowed; 1 to 60"),
        ("cartridge_max_shifts", "1.5", "1 to 60 shifts, whole"),
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


PHRASE = "nine or more letters"
HEDDA = {
    "username": "hedda",
    "role": "hygienist",
    "password": PHRASE,
    "password_again": PHRASE,
}


@pytest.mark.parametrize("value", ["6", "12"])
def test_a_tighter_or_equal_interval_is_kept(value):
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    client.post(page(site, "settings"), filled(site, fit_interval_months=value))
    site.refresh_from_db()
    assert site.fit_interval_months == int(value)


def test_an_own_interval_that_the_new_pack_finds_loose_is_refused():
    site = b.make_site(rule_pack="gb-2026-1", fit_interval_months=24)
    client = b.client_for(b.make_user("administrator", site))
    changed = filled(site, rule_pack="us-2026-1", is_meant="on")
    assert client.post(page(site, "settings"), changed).status_code == 422


def test_a_new_user_gets_a_role_and_a_first_password():
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    client.post(page(site, "members"), HEDDA)
    row = Membership.objects.get(user__username="hedda")
    assert (row.role, row.user.check_password(PHRASE)) == (Role.HYGIENIST, True)


def test_the_ledger_holds_the_new_user_and_never_the_password():
    site = b.make_site()
    b.client_for(b.make_user("administrator", site)).post(page(site, "members"), HEDDA)
    entries = Entry.objects.filter(act__in=["user added", "role given"])
    assert entries.count() == 2
    assert not any(PHRASE in f"{entry.says}{entry.detail}" for entry in entries)


@pytest.mark.parametrize(
    "changed",
    [
        {"password": "", "password_again": ""},
        {"password_again": "nine or more lettres"},
        {"password": "short", "password_again": "short"},
        {"password": "password1", "password_again": "password1"},
        {"username": "hed da"},
        {"username": "hed\x00da"},
        {"role": "emperor"},
    ],
    ids=["none", "differs", "short", "common", "space in name", "nul in name", "no such role"],
)
def test_a_faulty_new_user_is_refused_and_not_made(changed):
    site = b.make_site()
    client = b.client_for(b.make_user("administrator", site))
    assert client.post(page(site, "members"), HEDDA | changed).status_code == 422
    assert Membership.objects.filter(site=site).count() == 1


def test_a_known_user_is_added_whatever_the_case_and_keeps_the_password():
    site = b.make_site()
    known = b.make_user(None, username="hedda")
    client = b.client_for(b.make_user("administrator", site))
    assert client.post(page(site, "members"), HEDDA).status_code == 422
    client.post(page(site, "members"), {"username": "Hedda", "role": "manager"})
    assert Membership.objects.get(site=site, user=known).role == Role.MANAGER


@pytest.mark.parametrize("name", ["member_role", "member_remove"])
@pytest.mark.parametrize(
    ("role", "status"),
    [("administrator", 302), ("coordinator", 403), ("manager", 403)],
    ids=["may", "coordinator", "manager"],
)
def test_only_the_administrator_changes_a_member(name, role, status):
    site = b.make_site()
    row = Membership.objects.get(user=b.make_user("hygienist", site))
    client = b.client_for(b.make_user(role, site))
    answer = client.post(page(site, name, row.pk), {"role": "manager"})
    stands = Membership.objects.filter(pk=row.pk, role="hygienist").exists()
    assert (answer.status_code, stands) == (status, status == 403)


def test_another_role_stands_in_the_ledger_with_the_former_one():
    site = b.make_site()
    row = Membership.objects.get(user=b.make_user("hygienist", site))
    client = b.client_for(b.make_user("administrator", site))
    client.post(page(site, "member_role", row.pk), {"role": "manager"})
    assert Entry.objects.get(act="role changed").detail["role"] == ["hygienist", "manager"]


def test_a_removed_member_stands_in_the_ledger():
    site = b.make_site()
    row = Membership.objects.get(user=b.make_user("hygienist", site))
    b.client_for(b.make_user("administrator", site)).post(page(site, "member_remove", row.pk))
    assert Entry.objects.get(act="role taken").detail["role"] == ["hygienist", ""]


@pytest.mark.parametrize("name", ["member_role", "member_remove"])
@pytest.mark.parametrize("idle", [False, True], ids=["alone", "beside one who may not sign in"])
def test_the_last_administrator_stays(name, idle):
    site = b.make_site()
    user = b.make_user("administrator", site)
    if idle:
        b.make_user("administrator", site, is_active=False)
    row = Membership.objects.get(user=user)
    b.client_for(user).post(page(site, name, row.pk), {"role": "manager"})
    assert Membership.objects.filter(pk=row.pk, role="administrator").exists()


def test_whoever_removes_themselves_lands_on_a_page_they_may_see():
    site = b.make_site()
    b.make_user("administrator", site)
    user = b.make_user("administrator", site)
    row = Membership.objects.get(user=user)
    answer = b.client_for(user).post(page(site, "member_remove", row.pk), follow=True)
    assert answer.status_code == 200


@pytest.mark.parametrize("name", ["member_role", "member_remove"])
def test_a_member_row_of_another_site_is_not_found(name):
    site, south = b.make_site(), b.make_site("south")
    row = Membership.objects.get(user=b.make_user("administrator", south))
    client = b.client_for(b.make_user("administrator", site))
    answer = client.post(page(site, name, row.pk), {"role": "manager"})
    assert answer.status_code == 404
