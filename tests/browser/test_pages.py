"""Every page in a real browser: at home, without complaint, usable by keyboard and reader."""

import pytest
from axe_playwright_python.sync_playwright import Axe

from tests import builders as b
from tests.selection.scene import whole

pytestmark = pytest.mark.django_db(transaction=True)

PAGES = (
    "today/",
    "tasks/",
    "tasks/{task}/",
    "tasks/{task}/crew/",
    "tasks/{task}/assembly/",
    "people/",
    "people/{worker}/",
    "people/new/",
    "samples/",
    "samples/new/",
    "samples/agents/",
    "samples/tasks/{task}/",
    "fit-tests/",
    "fit-tests/new/",
    "respirators/",
    "respirators/{assembly}/",
    "respirators/new/",
    "respirators/classes/",
    "site/",
    "site/settings/",
    "site/members/",
    "records/",
    "records/ledger/",
    "records/import/",
    "records/import/samples/new/",
)


def address(scene, page):
    filled = page.format(task=scene.task.pk, worker=scene.worker.pk, assembly=scene.assembly.pk)
    return f"/s/{scene.site.code}/{filled}"


def violations(page):
    found = Axe().run(page).response["violations"]
    return [(one["id"], [node["target"] for node in one["nodes"]][:3]) for one in found]


@pytest.fixture
def signed_in(page, live_server, sign_in):
    scene = whole()
    sign_in(page, live_server, b.make_user("administrator", scene.site))
    return scene


@pytest.mark.parametrize("where", PAGES)
def test_a_page_stays_home_and_has_no_barrier(page, signed_in, where):
    answer = page.goto(address(signed_in, where))
    assert answer.status == 200
    assert page.locator("h1").count() == 1
    assert violations(page) == []


@pytest.mark.parametrize(
    "where", ["today/", "tasks/", "tasks/{task}/", "people/", "fit-tests/new/"]
)
def test_a_page_fits_a_phone(phone, signed_in, where):
    phone.goto(address(signed_in, where))
    assert phone.evaluate("document.documentElement.scrollWidth") <= 390


@pytest.mark.parametrize("role", ["coordinator", "hygienist", "manager", "administrator"])
def test_each_role_signs_in_with_a_password_and_lands_on_a_page_of_the_site(page, role):
    scene = whole()
    user = b.make_user(role, scene.site, username=f"a-{role}")
    page.goto("/")
    page.get_by_label("User name").fill(user.username)
    page.get_by_label("Password").fill("a long enough phrase")
    page.get_by_role("button", name="Sign in").click()
    page.wait_for_url(f"**/s/{scene.site.code}/**")
    assert page.locator("nav.main a").count() == 7


def test_a_broken_link_of_the_chain_leads_to_its_working_by_keyboard(page, signed_in):
    signed_in.limit.delete()
    page.goto(address(signed_in, "tasks/{task}/"))
    assert page.locator(".verdict").inner_text().startswith("The chain breaks at Limit.")
    page.get_by_role("link", name="Class", exact=True).focus()
    page.keyboard.press("Enter")
    page.locator("#class details.working[open]").wait_for()


def test_a_worker_taken_off_can_be_put_back(page, signed_in):
    page.goto(address(signed_in, "tasks/{task}/crew/"))
    page.get_by_role("button", name="Take off").click()
    page.get_by_role("button", name="Put back").click()
    assert page.locator(".message").inner_text().endswith("is back on Relining.")


def test_every_page_works_with_scripts_off(chromium, live_server, sign_in):
    scene = whole()
    context = chromium.new_context(java_script_enabled=False, base_url=live_server.url)
    page = context.new_page()
    sign_in(page, live_server, b.make_user("coordinator", scene.site))
    page.goto(address(scene, "tasks/{task}/"))
    assert page.locator("ol.links li").count() == 6
    context.close()


@pytest.mark.parametrize("where", ["/accounts/password/change/", "/accounts/2fa/"])
def test_a_page_of_the_own_account_has_one_heading_and_no_barrier(page, signed_in, where):
    assert signed_in
    page.goto(where)
    assert page.locator("h1").count() == 1
    assert violations(page) == []
