"""A site with a task, an agent and three people: what most tests here begin with."""

import pytest

from tests.builders import (
    client_for,
    make_agent,
    make_site,
    make_task,
    make_task_agent,
    make_user,
)


@pytest.fixture
def site(db):
    return make_site()


@pytest.fixture
def group(site):
    """Quartz in relining: the similar exposure group."""
    return make_task_agent(make_task(site), make_agent("Quartz", kind="dust"))


@pytest.fixture
def hygienist(site):
    return make_user("hygienist", site)


@pytest.fixture
def page(hygienist):
    """The browser of the hygienist."""
    return client_for(hygienist)
