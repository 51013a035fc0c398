"""The library as a whole: it stands alone, its examples run, its names are all there."""

import doctest
import importlib
import pkgutil
import subprocess
import sys

import pytest

import filtration

MODULES = [module.name for module in pkgutil.iter_modules(filtration.__path__, "filtration.")]


@pytest.mark.parametrize("name", MODULES)
def test_every_module_shows_an_example_that_runs(name):
    found = doctest.testmod(importlib.import_module(name))
    assert found.attempted > 0
    assert found.failed == 0


def test_every_public_name_exists_once():
    assert len(set(filtration.__all__)) == len(filtration.__all__)
    assert all(hasattr(filtration, name) for name in filtration.__all__)


def test_the_library_brings_in_neither_the_web_nor_slow_modules():
    script = (
        "import sys, filtration; "
        "heavy = {'django', 'programme', 'exposure', 'scipy.optimize', 'scipy.stats'}; "
        "print(*sorted(heavy & set(sys.modules)))"
    )
    ran = subprocess.run(  # noqa: S603 - our own interpreter and text
        [sys.executable, "-c", script], check=False, capture_output=True, text=True
    )
    assert (ran.returncode, ran.stdout.strip()) == (0, "")
