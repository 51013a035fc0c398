"""The rig itself: a real server comes and goes, and nothing is passed over in silence."""

import os
import subprocess
import sys
from pathlib import Path

import psycopg2
import pytest
from django.conf import settings

from tests.rig import machine, postgres, run

ROOT = Path(__file__).parent.parent


def server_folder(address):
    return Path(address.split("@")[1].split("/")[0].replace("%2F", "/"))


def connected(address):
    return psycopg2.connect(host=str(server_folder(address)), user="test", dbname="postgres")


def test_a_server_answers_in_utf8_and_leaves_nothing_behind():
    with postgres.running(machine.postgres_bin()) as address:
        connection = connected(address)
        assert connection.info.parameter_status("server_encoding") == "UTF8"
        connection.close()
    assert not server_folder(address).exists()


def test_a_server_is_removed_also_when_the_tests_fail():
    with pytest.raises(ZeroDivisionError), postgres.running(machine.postgres_bin()) as address:
        raise ZeroDivisionError
    assert not server_folder(address).exists()
    with pytest.raises(psycopg2.OperationalError):
        connected(address)


@pytest.mark.parametrize(
    ("body", "found"),
    [
        ("def test_it(): pass", []),
        ("import pytest\ndef test_it(): pytest.skip('no reason')", ["no reason"]),
        ("import pytest\n@pytest.mark.xfail\ndef test_it(): assert 0", [""]),
    ],
    ids=["passed", "skipped", "expected to fail"],
)
def test_the_driver_sees_every_test_that_did_not_run(tmp_path, body, found):
    (tmp_path / "test_one.py").write_text(body)
    report = tmp_path / "report.xml"
    alone = [sys.executable, "-m", "pytest", "-q", "-p", "no:django", "-p", "no:cacheprovider"]
    subprocess.run(
        [*alone, "-c", os.devnull, f"--rootdir={tmp_path}", f"--junitxml={report}", tmp_path],
        check=True,
        capture_output=True,
        env={**os.environ, "PYTEST_ADDOPTS": ""},
    )
    assert [skip.rpartition(": ")[2] for skip in run.skips(report)] == found


def test_what_is_missing_is_named_with_its_package(monkeypatch):
    monkeypatch.setenv("PATH", "")
    with pytest.raises(machine.Missing, match="Thing is missing; install it .*some-package"):
        machine.need("Thing", lambda: None, "some-package")


def test_the_suite_runs_on_the_engine_it_was_given():
    engine = settings.DATABASES["default"]["ENGINE"]
    is_postgres = os.environ.get("DATABASE_URL", "").startswith("postgres")
    assert engine.endswith("postgresql" if is_postgres else "sqlite3")


def test_ci_runs_what_a_person_runs():
    script = ROOT / ".ci" / "run"
    assert os.access(script, os.X_OK)
    assert "make test" in script.read_text()


def test_every_pinned_package_has_one_version_and_the_project_none():
    names = [line.split("==")[0] for line in (ROOT / ".constraints").read_text().split()]
    assert len(names) == len(set(names))
    assert "haleward" not in names
