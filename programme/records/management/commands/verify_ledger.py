"""`manage.py verify_ledger`: whether any row of the ledger was changed behind the app's back."""

import re
import sys
from argparse import ArgumentTypeError
from typing import Any

from django.core.management.base import BaseCommand, CommandError, CommandParser

from programme.ledger.actions import verify
from programme.ledger.models import Entry, Head

WRONG_ARGUMENT = 2
PAPER_HEAD = re.compile(r"([1-9][0-9]{0,17})-([0-9a-f]{16})")


def _head(text: str) -> tuple[int, str]:
    found = PAPER_HEAD.fullmatch(text.strip().lower())
    if found is None:
        raise ArgumentTypeError(f"{text!r} is not a head; write it like 1183-0a1b2c3d4e5f6071")
    return int(found[1]), found[2]


class Command(BaseCommand):
    help = "Checks the ledger of a site, or of all; exit status 1 on a fault."

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument("site", nargs="?", help="code of the site; default all")
        parser.add_argument(
            "--expect", type=_head, help="head printed on paper, row number and digits"
        )

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        known = list(Head.objects.order_by("chain").values_list("chain", flat=True))
        site, expect = options["site"], options["expect"]
        if site and site not in known:
            says = f"site: {site!r} has no ledger; known are {', '.join(known) or 'none yet'}"
            raise CommandError(says, returncode=WRONG_ARGUMENT)
        if expect and not site:
            says = f"--expect: {expect[0]}-{expect[1]} is of one site; name the site too"
            raise CommandError(says, returncode=WRONG_ARGUMENT)
        verdicts = [verify(chain) for chain in ([site] if site else known)]
        for one in verdicts:
            state = "whole" if one.is_whole else "; ".join(one.faults)
            self.stdout.write(f"{one.chain}: {one.rows} rows, head {one.head}: {state}")
        if not verdicts:
            self.stdout.write("There is no ledger yet.")
        agrees = not expect or self._agrees(site, *expect)
        if not (agrees and all(one.is_whole for one in verdicts)):
            sys.exit(1)

    def _agrees(self, chain: str, serial: int, digits: str) -> bool:
        """Whether the row printed on paper is still there with the same digits."""
        row = Entry.objects.filter(chain=chain, serial=serial).first()
        if row is None:
            self.stdout.write(f"Row {serial} of the paper is missing from the ledger.")
            return False
        if not row.hash.startswith(digits):
            shown = row.hash[: len(digits)]
            self.stdout.write(f"Row {serial} is {shown}, the paper says {digits}: rewritten since.")
            return False
        return True
