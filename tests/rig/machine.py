"""Programs of this machine that the tests need: found, installed where allowed, or asked for."""

import os
import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TypeVar

Found = TypeVar("Found", str, Path)

CHROMIUM_NAMES = ("chromium", "chromium-browser", "google-chrome")
NO_MORE = ("--no-install-recommends",)
DEBIAN_POSTGRES = Path("/usr/lib/postgresql")


class Missing(SystemExit):
    """A program is not there and could not be installed; the message says what to install."""


def chromium() -> str | None:
    """Path of a Chromium: the one named by CHROMIUM, else the first found."""
    if named := os.environ.get("CHROMIUM"):
        return shutil.which(named)
    return next(filter(None, map(shutil.which, CHROMIUM_NAMES)), None)


def postgres_bin() -> Path | None:
    """Folder of PostgreSQL's programs: TEST_POSTGRES_BIN, the newest of Debian, or the PATH's."""
    if named := os.environ.get("TEST_POSTGRES_BIN"):
        return Path(named) if _is_postgres_bin(Path(named)) else None
    debian = [path for path in DEBIAN_POSTGRES.glob("*/bin") if _is_postgres_bin(path)]
    if debian:
        return max(debian, key=lambda path: float(path.parent.name))
    on_path = shutil.which("postgres")
    folder = Path(on_path).resolve().parent if on_path else None
    return folder if folder and _is_postgres_bin(folder) else None


def _is_postgres_bin(folder: Path) -> bool:
    return (folder / "initdb").exists() and (folder / "postgres").exists()


def need(what: str, find: Callable[[], Found | None], packages: str) -> Found:
    """What `find` finds, after installing the Debian packages as root if need be.

    Raises:
        Missing: neither found nor installable.
    """
    if found := find():
        return found
    if os.geteuid() == 0 and shutil.which("apt-get"):
        print(f"{what} is missing: installing {packages}", flush=True)
        environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
        for command in (["update", "-q"], ["install", "-qy", *NO_MORE, *packages.split()]):
            subprocess.run(
                ["apt-get", *command], env=environment, check=False, stdin=subprocess.DEVNULL
            )
        if found := find():
            return found
    raise Missing(f"{what} is missing; install it (Debian: apt-get install {packages})")


def is_root() -> bool:
    """Whether this process is root's (never on Windows)."""
    return sys.platform != "win32" and os.geteuid() == 0
