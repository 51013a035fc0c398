"""A site and the people who keep its respirators."""

import pytest

from tests.builders import client_for, make_site, make_user


@pytest.fixture
def site(db):
    return make_site()


@pytest.fixture
def coordinator(site):
    return make_user("coordinator", site)


@pytest.fixture
def page(coordinator):
    """The browser of the safety coordinator."""
    return client_for(coordinator)
