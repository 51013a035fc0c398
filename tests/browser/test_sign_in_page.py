"""The door of the house."""

from tests.builders import make_site, make_user


def test_a_stranger_is_led_to_the_sign_in_page(page):
    page.goto("/")
    assert "/accounts/login/" in page.url
    assert page.locator("input[type=password]").is_visible()


def test_a_user_signs_in_with_a_password_on_a_phone(phone):
    user = make_user(site=make_site())
    phone.goto("/accounts/login/")
    phone.locator("input[name=login]").fill(user.username)
    phone.locator("input[name=password]").fill("a long enough phrase")
    phone.locator("input[name=password]").press("Enter")
    phone.wait_for_url("**/s/north/**")


def test_a_session_carries_a_user_in(wide, live_server, sign_in):
    sign_in(wide, live_server, make_user(site=make_site()))
    wide.goto("/")
    assert "/s/north/" in wide.url
