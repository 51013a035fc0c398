"""`manage.py first_site CODE NAME --rules PACK --administrator USER`: a site and who runs it."""

import getpass
import sys
import zoneinfo
from typing import Any

from django.contrib.auth.models import User
from django.contrib.auth.password_validation import validate_password
from django.core.exceptions import ValidationError
from django.core.management.base import BaseCommand, CommandError, CommandParser
from django.db import transaction

from programme.ledger import actions as ledger
from programme.roster.models import Membership, Role, Site
from programme.rulepack.load import available


class Command(BaseCommand):
    help = "Makes a site and its programme administrator; asks for the password."

    def add_arguments(self, parser: CommandParser) -> None:
        packs = [info.name for info in available()]
        parser.add_argument("code", help="short name in addresses, e.g. tarnbeck")
        parser.add_argument("name", help="name of the workplace")
        parser.add_argument("--rules", choices=packs, required=True, help="rule pack")
        parser.add_argument("--administrator", required=True, help="user name to make or to use")
        parser.add_argument("--time-zone", default="UTC", help="e.g. Europe/London")

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        zone = options["time_zone"]
        if zone not in zoneinfo.available_timezones():
            raise CommandError(f"--time-zone: {zone!r} is not known; e.g. Europe/London or UTC")
        site = Site(
            code=options["code"],
            name=options["name"],
            rule_pack=options["rules"],
            time_zone=zone,
        )
        try:
            site.full_clean()
        except ValidationError as fault:
            raise CommandError("; ".join(fault.messages)) from None
        user = User.objects.filter(username=options["administrator"]).first()
        password = None if user else self._password(options["administrator"])
        with transaction.atomic():
            site.save()
            if user is None:
                user = User.objects.create_user(options["administrator"], password=password)
            Membership.objects.create(user=user, site=site, role=Role.ADMINISTRATOR)
            says = f"{site} under {site.rule_pack}, administrator {user.username}"
            ledger.enter("site made", chain=site.code, of=site, by=user.username, says=says)
        self.stdout.write(f"{says}. Sign in at the start page.")

    def _password(self, username: str) -> str:
        if sys.stdin.isatty():
            password = getpass.getpass("Password: ")
            if getpass.getpass("Once more: ") != password:
                raise CommandError("password: the two entries differ; nothing was made")
        else:
            password = sys.stdin.readline().rstrip("\n")
        try:
            validate_password(password, User(username=username))
        except ValidationError as fault:
            raise CommandError("password: " + "; ".join(fault.messages)) from None
        return password
