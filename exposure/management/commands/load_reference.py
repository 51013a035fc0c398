"""Lay the shipped agents and limits into the database, as often as you like."""

from pathlib import Path
from typing import Any

from django.core.management.base import BaseCommand, CommandError, CommandParser

from exposure.reference import load_reference


class Command(BaseCommand):
    """`manage.py load_reference [--folder PATH]`."""

    help = "Load the shipped agents and exposure limits; a site's own rows are never touched."

    def add_arguments(self, parser: CommandParser) -> None:
        """One option: where the files are."""
        parser.add_argument(
            "--folder", type=Path, help="folder of agents.csv and limits.csv; default: fixtures"
        )

    def handle(self, *_args: Any, **options: Any) -> None:
        """Load and say what was done."""
        try:
            done = load_reference(options["folder"])
        except (ValueError, FileNotFoundError) as fault:
            raise CommandError(f"nothing was loaded: {fault}") from fault
        self.stdout.write(f"agents: {done.agents}")
        self.stdout.write(f"limits: {done.limits}")
        if options["verbosity"] > 1:
            for name in (*done.agents.changed, *done.limits.changed):
                self.stdout.write(f"changed: {name}")
