"""A real Chromium: pages that stay at home and make no complaint."""

from importlib import import_module
from urllib.parse import urlsplit

import pytest
from django.conf import settings
from django.db import connection
from playwright.sync_api import sync_playwright

from tests.builders import client_for
from tests.rig import machine

QUIET = (
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)
WIDE = {"width": 1280, "height": 900}
PHONE = {"width": 390, "height": 844}
# Long enough for a busy machine; what is not there after it does not come.
PATIENCE_MS = 10_000


@pytest.fixture(scope="session")
def chromium():
    """One browser for all tests of a process."""
    path = machine.chromium()
    assert path, "Chromium is missing; install it (Debian: apt-get install chromium)"
    flags = [*QUIET, "--no-sandbox"] if machine.is_root() else list(QUIET)
    with sync_playwright() as driver:
        browser = driver.chromium.launch(executable_path=path, args=flags)
        yield browser
        browser.close()


@pytest.fixture
def context(chromium, live_server):
    """A browser nobody has signed in to, as wide as a desk's."""
    context = chromium.new_context(viewport=WIDE, base_url=live_server.url)
    context.set_default_timeout(PATIENCE_MS)
    yield context
    context.close()


@pytest.fixture
def page(context, live_server):
    """An empty page. The test fails if it asked another host or logged an error.

    A test that means a complaint to come empties `page.complaints`.
    """
    page = context.new_page()
    page.complaints = []
    home = urlsplit(live_server.url).netloc

    def ask(request):
        address = urlsplit(request.url)
        if address.scheme in {"http", "https", "ws", "wss"} and address.netloc != home:
            page.complaints.append(f"asked another host: {request.url}")

    def hear(message):
        if message.type == "error":
            page.complaints.append(f"console: {message.text} ({message.location})")

    page.on("request", ask)
    page.on("console", hear)
    page.on("pageerror", lambda error: page.complaints.append(f"script: {error}"))
    yield page
    assert page.complaints == []


@pytest.fixture
def wide(page):
    """The page at a desk."""
    page.set_viewport_size(WIDE)
    return page


@pytest.fixture
def phone(page):
    """The page on a phone."""
    page.set_viewport_size(PHONE)
    return page


@pytest.fixture
def sign_in():
    """`sign_in(page, live_server, user)`: the page's browser carries the user's session."""

    def carry(page, live_server, user):
        cookie = client_for(user).cookies[settings.SESSION_COOKIE_NAME]
        page.context.add_cookies(
            [{"name": cookie.key, "value": cookie.value, "url": live_server.url}]
        )

    return carry


@pytest.fixture(scope="module", autouse=True)
def emptied_without_guard(django_db_setup, django_db_blocker):
    """A live-server test ends by emptying every table, which the ledger's own guard refuses."""
    if connection.vendor != "sqlite":
        yield
        return
    guard = import_module("programme.ledger.migrations.0002_entries_stay_as_written")
    with django_db_blocker.unblock(), connection.cursor() as cursor:
        for statement in guard.BACK["sqlite"]:
            cursor.execute(statement)
    yield
    with django_db_blocker.unblock(), connection.cursor() as cursor:
        for statement in guard.FORTH["sqlite"]:
            cursor.execute(statement)
