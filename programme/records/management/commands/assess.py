"""`manage.py assess SITE`: the protection chains of a site, as the pages show them."""

import csv
import json
import sys
from argparse import ArgumentTypeError
from datetime import date
from typing import Any

from django.core.management.base import BaseCommand, CommandError, CommandParser

from exposure.models import Task
from programme.export import defused
from programme.records.api import strict
from programme.roster.models import Site
from programme.selection.assess import assess_site
from programme.selection.chain import Chain

BROKEN_STATUS, WRONG_ARGUMENT = 1, 2
HEADER = ("site", "task", "on", "link", "state", "waits on", "figure", "basis", "mismatches")


def _day(text: str) -> date:
    try:
        return date.fromisoformat(text)
    except ValueError:
        raise ArgumentTypeError(f"{text!r} is not a date; write it like 2026-03-02") from None


class Command(BaseCommand):
    help = "Prints protection chains; status 1 when a link is broken or nothing was judged."

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument("site", help="code of the site")
        parser.add_argument("--task", help="code of one task; default all active ones")
        parser.add_argument("--on", type=_day, help="day to judge for, default the site's today")
        parser.add_argument("--format", choices=("table", "json", "csv"), default="table")

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        site = Site.objects.filter(code=options["site"]).first()
        if site is None:
            known = ", ".join(Site.objects.values_list("code", flat=True)) or "none yet"
            says = f"site: {options['site']!r} is not known; known are {known}"
            raise CommandError(says, returncode=WRONG_ARGUMENT)
        on = options["on"] or site.today()
        chains = assess_site(site, on=on, tasks=self._tasks(site, options["task"], on))
        getattr(self, f"_{options['format']}")(chains)
        # Nothing judged is not "all hold".
        if not chains or not all(chain.holds for chain in chains):
            sys.exit(BROKEN_STATUS)

    def _tasks(self, site: Site, code: str | None, on: date) -> list[Task] | None:
        if code is None:
            return None
        tasks = list(Task.objects.at(site).filter(code=code))
        if not tasks:
            says = f"--task: {code!r} is not a task of {site}; list them with --format csv"
            raise CommandError(says, returncode=WRONG_ARGUMENT)
        if not Task.objects.at(site).active(on).filter(code=code).exists():
            says = f"--on: {on} is not a day on which {code!r} is done; choose one while it is"
            raise CommandError(says, returncode=WRONG_ARGUMENT)
        return tasks

    def _json(self, chains: list[Chain]) -> None:
        plain = strict([chain.as_dict() for chain in chains])
        self.stdout.write(json.dumps(plain, ensure_ascii=False, indent=1, allow_nan=False))

    def _csv(self, chains: list[Chain]) -> None:
        writer = csv.writer(self.stdout, lineterminator="\n")
        writer.writerow(HEADER)
        for chain in chains:
            for link in chain.links:
                says = " | ".join(m.says for m in link.mismatches)
                row = (chain.site_code, chain.task_code, chain.on, link.name, link.state)
                rest = (link.waits_on, link.figure, link.basis, says)
                writer.writerow([defused(str(cell)) for cell in (*row, *rest)])

    def _table(self, chains: list[Chain]) -> None:
        if not chains:
            self.stdout.write("No active task on that day.")
        for chain in chains:
            self.stdout.write(f"{chain.task} ({chain.task_code}), {chain.on}: {chain.verdict}")
            self.stdout.write(f"  {chain.as_text}")
            for link in chain.links:
                self.stdout.write(
                    f"  {link.name:<7}{link.state_says:<28}{link.figure}; {link.basis}"
                )
            for one in chain.mismatches:
                mark = " (unconfirmed)" if one.is_unconfirmed else ""
                self.stdout.write(f"    {one.severity}: {one.says} [{one.source}{mark}]")
            self.stdout.write("")
