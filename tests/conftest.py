"""What every test gets: quick password hashing, an empty cache, and its markers."""

import os

# The settings read the environment once, so this comes before anything of Django.
os.environ["HALEWARD_TESTING"] = "1"
os.environ["HALEWARD_PLAIN_HTTP"] = "1"
os.environ["DJANGO_SETTINGS_MODULE"] = "programme.settings"
# The browser driver keeps an event loop in the test's thread, which Django would refuse.
os.environ["DJANGO_ALLOW_ASYNC_UNSAFE"] = "true"

from pathlib import Path

import django
import pytest
from django.core.cache import cache
from django.test import override_settings

django.setup()

BROWSER_TESTS = Path(__file__).parent / "browser"
DATABASE_FIXTURES = {"db", "transactional_db", "live_server", "django_db_setup"}


def pytest_collection_modifyitems(items):
    for item in items:
        if DATABASE_FIXTURES & set(item.fixturenames) or item.get_closest_marker("django_db"):
            item.add_marker("database")
        if item.path.is_relative_to(BROWSER_TESTS):
            item.add_marker("browser")


@pytest.fixture(scope="session", autouse=True)
def quick_settings():
    """Slow password hashing and a cache in the database would test nothing here."""
    with override_settings(
        PASSWORD_HASHERS=["django.contrib.auth.hashers.MD5PasswordHasher"],
        CACHES={"default": {"BACKEND": "django.core.cache.backends.locmem.LocMemCache"}},
    ):
        yield


@pytest.fixture(autouse=True)
def empty_cache(quick_settings):
    """The sign-in slow-down of one test is not felt by the next."""
    cache.clear()
