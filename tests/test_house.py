"""What the whole house keeps to, held by reading its files."""

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

HOUSE = Path(__file__).resolve().parent.parent
CODE = [
    path
    for room in ("programme", "exposure", "filtration")
    for path in sorted((HOUSE / room).rglob("*.py"))
    if "migrations" not in path.parts
]
VIEWS = [path for path in CODE if "views" in path.stem]
TEMPLATES = sorted((HOUSE / "templates").rglob("*.*"))
STATIC = [path for path in sorted((HOUSE / "static").rglob("*")) if path.is_file()]
SLOW_TO_IMPORT = (
    "scipy.stats",
    "scipy.optimize",
    "reportlab",
    "python_calamine",
    "xlsxwriter",
)


def found(pattern, paths):
    """The lines that hold the pattern, as file:line: text."""
    searched = re.compile(pattern)
    return [
        f"{path.relative_to(HOUSE)}:{number}: {line.strip()}"
        for path in paths
        for number, line in enumerate(path.read_text("utf-8").splitlines(), start=1)
        if searched.search(line)
    ]


def kept_files():
    """Every text file under version control, or about to be."""
    listed = subprocess.run(
        ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],  # noqa: S607 - the git of the PATH
        cwd=HOUSE,
        capture_output=True,
        check=True,
    )
    paths = {HOUSE / name for name in listed.stdout.decode().split("\0") if name}
    return sorted(path for path in paths if path.is_file() and path != Path(__file__).resolve())


@pytest.mark.parametrize(
    ("pattern", "paths"),
    [
        (r"\.objects\.all\(\)", VIEWS),
        (r"\bmark_safe\b|\bSafe(String|Text)\(", CODE),
        (r"\|\s*safe(seq)?\b|\bautoescape\s+off\b", TEMPLATES),
        (r"\bRawSQL\b|\.extra\(|\.objects\.raw\(", CODE),
        (r"\bexcept( Base)?Exception\b|\bexcept\s*:", CODE),
        (r"\bdate\.today\(\)|\bdatetime\.now\(\)|\butcnow\(\)", CODE),
        (r"\sstyle\s*=", TEMPLATES),
        (r"<style\b", TEMPLATES),
        (r"<script(?![^>]*\ssrc=)", TEMPLATES),
        (r"\son[a-z]+\s*=\s*[\"']", TEMPLATES),
        (r"https?://(?!www\.w3\.org/(2000/svg|1999/xlink))|[\"']//\w", [*TEMPLATES, *STATIC]),
    ],
    ids=[
        "every-view-begins-at-its-site",
        "no-text-is-declared-markup",
        "no-template-switches-escaping-off",
        "no-sql-is-pasted-together",
        "no-error-is-swallowed-whole",
        "no-judgement-asks-the-clock",
        "no-style-in-a-tag",
        "no-style-in-a-page",
        "no-script-in-a-page",
        "no-handler-in-a-tag",
        "nothing-from-another-host",
    ],
)
def test_the_house_holds_no_line_of_this_kind(pattern, paths):
    assert paths, "nothing was searched"
    assert found(pattern, paths) == []


def test_a_page_that_checks_its_form_token_late_does_check_it():
    exempt = found(r"^@csrf_exempt", CODE)
    assert len(found(r"^@csrf_protect", CODE)) >= len(exempt)


def test_the_files_of_the_browser_are_our_own_and_readable():
    assert {path.suffix for path in STATIC} <= {".css", ".js", ".svg"}
    assert [path.name for path in STATIC if ".min." in path.name] == []
    assert found(r"^.{400,}$", STATIC) == []
    assert found(r"(?i)copyright|@license|@preserve|sourceMappingURL", STATIC) == []


# The names are put together here so that this file does not hold what it looks for.
MACHINE_PATHS = "|".join(["/wo" + "rk/", "/tm" + "p/", "/ro" + "ot/", r"/home/\w"])
REGISTRY_HOSTS = "|".join(
    ["py" + r"pi\.org", "python" + "hosted", r"npm" + r"js\.", r"deb\.debian"]
)


@pytest.mark.parametrize(
    "pattern",
    [
        MACHINE_PATHS,
        REGISTRY_HOSTS,
        r"(?i)\b(lec" + "ture|tran" + r"script)s?\b",
        r"(?i)\bthis (issue|brief)\b",
    ],
    ids=["a-path-of-one-machine", "a-package-host", "a-talk-as-a-source", "an-order-as-a-source"],
)
def test_no_kept_file_names(pattern):
    texts = [path for path in kept_files() if b"\0" not in path.read_bytes()]
    assert found(pattern, texts) == []


def test_no_file_of_code_grows_out_of_hand():
    sizes = {
        str(path.relative_to(HOUSE)): len(path.read_text("utf-8").splitlines()) for path in CODE
    }
    assert {name: lines for name, lines in sizes.items() if lines > 500} == {}


def test_the_database_driver_is_the_one_that_was_asked_for():
    from django.db.backends.postgresql.psycopg_any import is_psycopg3

    assert not is_psycopg3


@pytest.mark.parametrize("command", ["check", "showmigrations"])
def test_starting_leaves_the_slow_libraries_alone(command):
    script = (
        "import sys; from django.core.management import execute_from_command_line as run; "
        f"run(['manage.py', {command!r}]); "
        f"print(sorted(set({SLOW_TO_IMPORT!r}) & set(sys.modules)))"
    )
    started = subprocess.run(
        [sys.executable, "-c", script],
        cwd=HOUSE,
        env={**os.environ, "DATABASE_URL": "sqlite://:memory:"},
        capture_output=True,
        text=True,
        check=True,
    )
    assert started.stdout.splitlines()[-1] == "[]"
