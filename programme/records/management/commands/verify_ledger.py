"""`manage.py verify_ledger`: whether any row of the ledger was changed behind the app's back."""

import sys
from typing import Any

from django.core.management.base import BaseCommand, CommandError, CommandParser

from programme.ledger.actions import verify
from programme.ledger.models import Head


class Command(BaseCommand):
    help = "Checks the ledger of a site, or of all; exit status 1 on a fault."

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument("site", nargs="?", help="code of the site; default all")
        parser.add_argument("--expect", help="head printed on paper, row number and digits")

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        known = list(Head.objects.order_by("chain").values_list("chain", flat=True))
        if options["site"] and options["site"] not in known:
            raise CommandError(f"site: {options['site']!r} has no ledger; known are {known}")
        verdicts = [verify(chain) for chain in ([options["site"]] if options["site"] else known)]
        for one in verdicts:
            state = "whole" if one.is_whole else "; ".join(one.faults)
            self.stdout.write(f"{one.chain}: {one.rows} rows, head {one.head}: {state}")
        is_behind = bool(options["expect"]) and self._is_behind(options, verdicts[0].rows)
        if is_behind or not all(one.is_whole for one in verdicts):
            sys.exit(1)

    def _is_behind(self, options: dict[str, Any], rows: int) -> bool:
        number, _, _ = options["expect"].partition("-")
        if not options["site"] or not number.isdecimal():
            raise CommandError("--expect: give the site and a head such as 1183-0a1b2c3d4e5f6071")
        if int(number) > rows:
            self.stdout.write(f"Row {number} of the paper is missing: the ledger ends at {rows}.")
        return int(number) > rows
