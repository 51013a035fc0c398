# make demo        start the demo on this machine (PORT=9000 make demo for another port)
# make demo-reset  the same, after putting the demo's records back to their first day
# make check       format, lint, types, import arrows, migrations, system check
# make test        everything: check, the suite on SQLite, the database and browser tests on PostgreSQL

PYTHON ?= python3
V := .venv
# The checks need no records of this machine, so they get an empty database in memory.
CHECK_ENV := HALEWARD_TESTING=1 HALEWARD_PLAIN_HTTP=1 DATABASE_URL=sqlite://:memory:

.PHONY: demo demo-reset setup check test
.DEFAULT_GOAL := demo

demo: $(V)/.run
	@HALEWARD_PLAIN_HTTP=$${HALEWARD_PLAIN_HTTP:-1} $(V)/bin/python manage.py demo $(if $(PORT),--port $(PORT))

demo-reset: $(V)/.run
	@HALEWARD_PLAIN_HTTP=$${HALEWARD_PLAIN_HTTP:-1} $(V)/bin/python manage.py demo --reset $(if $(PORT),--port $(PORT))

setup: $(V)/.test

check: $(V)/.test
	$(V)/bin/ruff format --check .
	$(V)/bin/ruff check .
	$(CHECK_ENV) $(V)/bin/mypy
	$(CHECK_ENV) $(V)/bin/lint-imports
	$(CHECK_ENV) $(V)/bin/python manage.py makemigrations --check --dry-run
	$(CHECK_ENV) $(V)/bin/python manage.py check --fail-level WARNING

test: check
	$(V)/bin/python -m tests.rig.run

$(V)/.made:
	@PYTHON=$(PYTHON) VENV=$(V) sh tests/rig/make_venv.sh
	@touch $@

$(V)/.run: $(V)/.made pyproject.toml .constraints
	@VENV=$(V) sh tests/rig/install.sh .
	@touch $@

$(V)/.test: $(V)/.made pyproject.toml .constraints
	@VENV=$(V) sh tests/rig/install.sh '.[test]'
	@touch $@ $(V)/.run
