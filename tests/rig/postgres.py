"""A PostgreSQL server that lives as long as a `with` block and leaves nothing behind."""

import pwd
import shutil
import signal
import subprocess
import tempfile
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any
from urllib.parse import quote

from tests.rig.machine import is_root

START_LIMIT_S = 60
# The data of a test need not outlive a power cut, so nothing waits for the disk.
ALL_TRUSTED = ("-A", "trust", "-U", "test")
QUICK = ("fsync=off", "synchronous_commit=off", "full_page_writes=off")


@contextmanager
def running(programs: Path) -> Iterator[str]:
    """Start a server on a socket in a new folder; gives its address for DATABASE_URL.

    Args:
        programs: the folder that holds `initdb` and `postgres`.

    Raises:
        RuntimeError: the server ended or did not answer within `START_LIMIT_S`.
    """
    # A socket's path may hold about 100 characters: hence the system's short folder.
    home = Path(tempfile.mkdtemp(prefix="hw-pg-", dir=_short_folder()))
    as_whom: dict[str, Any] = {}
    try:
        if is_root():  # PostgreSQL refuses to run as root
            nobody = pwd.getpwnam("nobody")
            as_whom = {"user": nobody.pw_uid, "group": nobody.pw_gid, "extra_groups": []}
            shutil.chown(home, nobody.pw_uid, nobody.pw_gid)
        yield from _serve(programs, home, as_whom)
    finally:
        shutil.rmtree(home, ignore_errors=True)


def _short_folder() -> str:
    folder = tempfile.gettempdir()
    return folder if len(folder) < 60 else "/var/tmp"  # noqa: S108 - mkdtemp makes a private one


def _serve(programs: Path, home: Path, as_whom: dict[str, Any]) -> Iterator[str]:
    data = home / "data"
    subprocess.run(
        [programs / "initdb", "-D", data, "--no-sync", "--locale=C.UTF-8", *ALL_TRUSTED],
        check=True,
        stdout=subprocess.DEVNULL,
        cwd=home,
        **as_whom,
    )
    settings = ("listen_addresses=", f"unix_socket_directories={home}", *QUICK)
    with (home / "log").open("wb") as log:
        server = subprocess.Popen(
            [programs / "postgres", "-D", data]
            + [word for setting in settings for word in ("-c", setting)],
            stdout=log,
            stderr=log,
            stdin=subprocess.DEVNULL,
            cwd=home,
            start_new_session=True,  # Ctrl-C ends the tests first, then the server
            **as_whom,
        )
    try:
        _wait_for(server, programs, home)
        yield f"postgres://test@{quote(str(home), safe='')}/postgres"
    finally:
        server.send_signal(signal.SIGQUIT)
        server.wait()


def _wait_for(server: subprocess.Popen[bytes], programs: Path, home: Path) -> None:
    asks = [programs / "psql", "-h", home, "-U", "test", "-c", "select 1", "postgres"]
    give_up_at = time.monotonic() + START_LIMIT_S
    while subprocess.run(asks, check=False, capture_output=True).returncode:
        if server.poll() is not None or time.monotonic() > give_up_at:
            raise RuntimeError(f"PostgreSQL did not start:\n{(home / 'log').read_text()}")
        time.sleep(0.05)
