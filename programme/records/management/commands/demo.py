"""`manage.py demo`: an invented yard to try the app on, ready in one command."""

import os
import shutil
import socket
import sys
from argparse import ArgumentTypeError
from pathlib import Path
from typing import Any

from django.conf import settings
from django.core.management import call_command
from django.core.management.base import BaseCommand, CommandError, CommandParser
from django.db import connection

from programme.records.demo.loader import is_loaded, load_demo, read, real_sites

LOW_PORT, HIGH_PORT = 1024, 65535


def _port(text: str) -> int:
    if not text.isdecimal() or not LOW_PORT <= int(text) <= HIGH_PORT:
        raise ArgumentTypeError(f"{text!r} is not allowed; {LOW_PORT} to {HIGH_PORT}")
    return int(text)


class Command(BaseCommand):
    help = "Prepares the database, loads an invented yard once and serves it on this machine."

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument("--reset", action="store_true", help="start the scenario afresh")
        parser.add_argument("--port", type=_port, default=8000)
        parser.add_argument("--no-serve", action="store_true", help="prepare only")

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        if not (settings.IS_PLAIN_HTTP or settings.DEBUG):
            raise CommandError(
                "HALEWARD_PLAIN_HTTP: not set; the demo is served without TLS: set 1"
            )
        self._check_free(options)
        settings.VAR_DIR.mkdir(parents=True, exist_ok=True)
        self._refuse_real(is_reset=options["reset"])
        if options["reset"]:
            self._forget()
        call_command("migrate", verbosity=0)
        call_command("createcachetable", verbosity=0)
        if not is_loaded():
            self.stdout.write("Loading agents, limits and the invented yard ...")
            call_command("load_reference", verbosity=0)
            load_demo()
        self._collect()
        self._say(options["port"])
        if not options["no_serve"]:
            self._serve(options["port"])

    def _check_free(self, options: dict[str, Any]) -> None:
        if options["no_serve"]:
            return
        with socket.socket() as one:
            one.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
            try:
                one.bind(("127.0.0.1", options["port"]))
            except OSError:
                raise CommandError(
                    f"--port: {options['port']} is in use; choose another, "
                    f"{LOW_PORT} to {HIGH_PORT}"
                ) from None

    def _refuse_real(self, *, is_reset: bool) -> None:
        """Printed passwords never enter a real site's database, and none is ever removed."""
        real = real_sites()
        if real and (is_reset or not is_loaded()):
            does = "removes only a demo's database" if is_reset else "loads printed passwords"
            raise CommandError(
                f"database: it holds {', '.join(real)}, which this command did not make; it {does}. "
                "Choose an empty folder with HALEWARD_VAR, or another DATABASE_URL"
            )

    def _forget(self) -> None:
        if connection.vendor != "sqlite":
            raise CommandError(
                "--reset: only the demo's own SQLite file is ever removed; this is "
                f"{connection.vendor}, where you drop the database yourself"
            )
        connection.close()
        name = Path(settings.DATABASES["default"]["NAME"])
        for ending in ("", "-wal", "-shm"):
            name.with_name(name.name + ending).unlink(missing_ok=True)

    def _collect(self) -> None:
        """Collect the static files anew where any of ours is younger than the collection."""
        if os.environ.get("HALEWARD_TESTING"):
            return
        made = Path(settings.STATIC_ROOT) / "staticfiles.json"
        ours = max(p.stat().st_mtime for p in (settings.BASE_DIR / "static").rglob("*"))
        if not made.exists() or made.stat().st_mtime < ours:
            call_command("collectstatic", interactive=False, verbosity=0)

    def _say(self, port: int) -> None:
        plan = read()
        self.stdout.write("")
        self.stdout.write(f"Haleward is at http://127.0.0.1:{port}/")
        self.stdout.write("Sign in as one of these; they are for the demo only:")
        for row in plan["users"]:
            self.stdout.write(f"  {row['role']:<14} {row['username']:<7} {row['password']}")
        self.stdout.write("Everything in it is invented. Stop with Ctrl-C.")
        self.stdout.flush()

    def _serve(self, port: int) -> None:
        gunicorn = shutil.which("gunicorn", path=str(Path(sys.executable).parent))
        if gunicorn is None:
            call_command("runserver", f"127.0.0.1:{port}", use_reloader=False)
            return
        words = [
            "--workers",
            "2",
            "--threads",
            "4",
            "--no-control-socket",
            "--log-level",
            "warning",
        ]
        bind = ["--bind", f"127.0.0.1:{port}"]
        os.execv(gunicorn, [gunicorn, "programme.wsgi", *words, *bind])  # noqa: S606  our own words
