"""Run the whole suite: on SQLite, then what touches the database or a browser on PostgreSQL.

`python -m tests.rig.run` runs both; further words go to pytest. Ends with an error if a test
failed or was skipped, or if a run held no tests.
"""

import os
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from xml.etree import ElementTree

from tests.rig import machine, postgres

PROCESSES = os.environ.get("TEST_PROCESSES", "2")
ON_POSTGRES = ("-m", "database or browser")


def main(words: list[str]) -> int:
    """Both runs; the number of those that went wrong."""
    # Being told to end still stops the server and removes its folder.
    signal.signal(signal.SIGTERM, lambda *_: sys.exit(143))
    # Without a font every text is nothing wide, and a page that spills over would not show it.
    os.environ["CHROMIUM"] = machine.need("Chromium", machine.chromium, "chromium fonts-liberation")
    programs = machine.need("PostgreSQL", machine.postgres_bin, "postgresql")
    wrong = [not run("SQLite", {"DATABASE_URL": ""}, words)]
    with postgres.running(programs) as address:
        wrong.append(not run("PostgreSQL", {"DATABASE_URL": address}, [*ON_POSTGRES, *words]))
    return sum(wrong)


def run(name: str, environment: dict[str, str], words: list[str]) -> bool:
    """One run of pytest; whether all of it passed and nothing was skipped."""
    print(f"\n== Tests on {name}", flush=True)
    began = time.monotonic()
    with tempfile.TemporaryDirectory() as folder:
        report = Path(folder) / "report.xml"
        pytest = [sys.executable, "-m", "pytest", "-q", "-n", PROCESSES, f"--junitxml={report}"]
        ended = subprocess.run(
            [*pytest, *words],
            check=False,
            env={**os.environ, **environment},
            stdin=subprocess.DEVNULL,
        )
        skipped = skips(report)
    for one in skipped:
        print(f"SKIPPED {one}")
    is_good = ended.returncode == 0 and not skipped
    says = "passed" if is_good else "FAILED"
    print(f"== {name}: {says} in {time.monotonic() - began:.0f} s", flush=True)
    return is_good


def skips(report: Path) -> list[str]:
    """The tests of a report that were skipped or expected to fail, with the reason given."""
    if not report.exists():
        return []
    cases = ElementTree.parse(report).iter("testcase")  # noqa: S314 - written by our own pytest
    return [
        f"{case.get('classname')}::{case.get('name')}: {mark.get('message')}"
        for case in cases
        for mark in case.findall("skipped")
    ]


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
