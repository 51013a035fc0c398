"""Time of the pages of a large invented site, beside judging its tasks one by one.

    python -m tests.bench.bench_pages --workers 20000 --tasks 300

Makes the site in a scratch SQLite file first. Run by hand; no test asserts seconds.
"""

import argparse
import os
import resource
import sys
import tempfile
import time
from collections.abc import Callable
from typing import Any

ONE_BY_ONE = 10


def timed(work: Callable[[], Any]) -> tuple[float, int, Any]:
    """Seconds, queries and the result of one run."""
    from django.db import connection
    from django.test.utils import CaptureQueriesContext

    started = time.perf_counter()
    with CaptureQueriesContext(connection) as queries:
        result = work()
    return time.perf_counter() - started, len(queries), result


def main() -> None:
    """Make the site, time the pages and the plain loop, print a table."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--workers", type=int, default=20_000)
    parser.add_argument("--tasks", type=int, default=300)
    asked = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        os.environ.update(
            HALEWARD_VAR=folder,
            HALEWARD_PLAIN_HTTP="1",
            HALEWARD_TESTING="1",
            DJANGO_SETTINGS_MODULE="programme.settings",
        )
        import django

        django.setup()
        _measure(asked.workers, asked.tasks)


def _measure(workers: int, tasks: int) -> None:
    from django.contrib.auth.models import User
    from django.core.management import call_command
    from django.test import Client

    from exposure.models import Task
    from programme.roster.models import Membership, Site
    from programme.selection.assess import assess, assess_site

    call_command("migrate", verbosity=0)
    call_command("createcachetable", verbosity=0)
    call_command("make_site", "bench", "--workers", str(workers), "--tasks", str(tasks))
    site = Site.objects.get(code="bench")
    user = User.objects.create_user("bench")
    Membership.objects.create(user=user, site=site, role="administrator")
    client = Client(SERVER_NAME="localhost")
    client.force_login(user, backend="allauth.account.auth_backends.AuthenticationBackend")
    on = site.today()
    rows = [("judge the whole site at once", *timed(lambda: assess_site(site, on=on))[:2])]
    some = list(Task.objects.at(site)[:ONE_BY_ONE])
    spent, queries, _ = timed(lambda: [assess(task, on=on) for task in some])
    share = tasks / len(some)
    rows.append(
        (f"judge task by task ({len(some)} run, scaled)", spent * share, int(queries * share))
    )
    for page in ("today", "tasks", "people"):
        timed(lambda page=page: client.get(f"/s/bench/{page}/"))
        rows.append((f"page {page}", *timed(lambda page=page: client.get(f"/s/bench/{page}/"))[:2]))
    for what, seconds, count in rows:
        sys.stdout.write(f"{what:<44}{seconds:8.2f} s {count:7d} queries\n")
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    sys.stdout.write(f"peak memory {peak:.0f} MB\n")


if __name__ == "__main__":
    main()
