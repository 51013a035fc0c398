"""`manage.py make_site CODE --workers N --tasks M`: an invented site of any size, for trials."""

import itertools
import time
from argparse import ArgumentTypeError
from datetime import date, datetime, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
from django.core.exceptions import ValidationError
from django.core.management.base import BaseCommand, CommandError, CommandParser
from django.db import transaction

from exposure.models import Agent, ExposureLimit, Sample, Task, TaskAgent
from programme.equipment.models import (
    Assembly,
    Element,
    Facepiece,
    FacepieceSize,
    FilterChange,
)
from programme.fit.models import FitExercise, FitTest
from programme.ledger import actions as ledger
from programme.records.demo.loader import INVENTED, TRIAL_MAKER
from programme.roster.models import Clearance, Site, Training, Worker
from programme.rulepack.load import load
from programme.selection.models import CrewMember, TaskAssembly

RULES = "us-2026-1"
PROTOCOL = "modified_cnc_elastomeric"
SAMPLES_A_TASK = 8
MOST = 200_000
A_BATCH = 2000
FIRST_NAMES = ("Ada", "Bo", "Cai", "Dee", "Eli", "Fay", "Gus", "Hal", "Ida", "Jon", "Kit", "Lou")
LAST_NAMES = ("Ashdown", "Birk", "Calloway", "Dunmore", "Esk", "Fenwick", "Garth", "Holm", "Kell")
LAPSED_SHARE = 0.03
SIZES = ("S", "M", "L")


def _seed(text: str) -> int:
    if not text.isdecimal():
        raise ArgumentTypeError(f"{text!r} is not allowed; a whole number from 0")
    return int(text)


def _count(text: str) -> int:
    if not text.isdecimal() or not 1 <= int(text) <= MOST:
        raise ArgumentTypeError(f"{text!r} is not allowed; a whole number from 1 to {MOST}")
    return int(text)


class Command(BaseCommand):
    help = "Makes an invented site of any size, for trials of speed."

    def add_arguments(self, parser: CommandParser) -> None:
        parser.add_argument("code", help="short name of the new site")
        parser.add_argument("--workers", type=_count, default=200)
        parser.add_argument("--tasks", type=_count, default=20)
        parser.add_argument("--seed", type=_seed, default=1)

    def handle(self, *args: Any, **options: Any) -> None:  # noqa: ARG002  Django's signature
        code = options["code"]
        if Site.objects.filter(code=code).exists():
            raise CommandError(f"code: {code!r} is taken; choose another")
        site = Site(code=code, name=f"Trial site {code}", rule_pack=RULES)
        try:
            site.full_clean()
        except ValidationError as fault:
            raise CommandError(f"code: {code!r}; " + "; ".join(fault.messages)) from None
        started = time.perf_counter()
        with transaction.atomic():
            made = _Maker(site, options).make()
        spent = time.perf_counter() - started
        self.stdout.write(
            f"{made}: {options['workers']} workers, {options['tasks']} tasks in {spent:.1f} s."
        )


class _Maker:
    """Fills one site, table by table."""

    def __init__(self, site: Site, options: dict[str, Any]) -> None:
        self.rng = np.random.default_rng(options["seed"])
        self.workers_wanted, self.tasks_wanted = options["workers"], options["tasks"]
        self.pack = load(RULES)
        site.save()
        self.site = site
        says = f"{site} with {self.workers_wanted} workers and {self.tasks_wanted} tasks, invented"
        ledger.enter(INVENTED, chain=site.code, of=site, by=TRIAL_MAKER, says=says)
        self.today = self.site.today()
        self.since = date(self.today.year - 3, 1, 1)

    def make(self) -> Site:
        """Everything, from the shelf to the filters."""
        self.shelf()
        self.tasks()
        self.samples()
        self.people()
        self.papers()
        self.fit_tests()
        self.crews()
        return self.site

    def shelf(self) -> None:
        facepiece = Facepiece.objects.create(site=self.site, name="Half mask T1", kind="half_mask")
        self.sizes = [
            FacepieceSize.objects.create(facepiece=facepiece, label=label, order=order)
            for order, label in enumerate(SIZES)
        ]
        element = Element.objects.create(
            site=self.site,
            name="Filter T1",
            particulate_class="P100",
            is_pair=True,
            area_cm2=400,
            clean_resistance_pa=130,
            in_stock=500,
        )
        self.assembly = Assembly.objects.create(
            site=self.site,
            name="Half mask T1 with filter T1",
            respirator_class="apr_half",
            facepiece=facepiece,
            element=element,
            approval_number="trial",
            in_stock=500,
        )

    def tasks(self) -> None:
        agent = Agent.objects.create(
            site=self.site,
            key="NOCAS-TRIAL",
            name="Trial dust",
            kind="dust",
            source="invented for trials of speed",
            sure="site",
        )
        ExposureLimit.objects.create(
            agent=agent,
            site=self.site,
            list_code="SITE",
            kind="TWA",
            fraction="inhalable",
            value=1.0,
            unit="mg/m3",
            averaging_min=480,
            source="invented for trials of speed",
            sure="site",
        )
        self.made_tasks = Task.objects.bulk_create(
            Task(
                site=self.site,
                code=f"trial-{number}",
                name=f"Trial task {number:03d}",
                work_rate="moderate",
                wear_h_per_shift=4,
                oxygen="ambient",
                active_from=self.since,
            )
            for number in range(1, self.tasks_wanted + 1)
        )
        self.task_agents = TaskAgent.objects.bulk_create(
            TaskAgent(
                task=task, agent=agent, form="particulate", fraction="inhalable", cake="coarse_dust"
            )
            for task in self.made_tasks
        )
        TaskAssembly.objects.bulk_create(
            TaskAssembly(task=task, assembly=self.assembly, active_from=self.since)
            for task in self.made_tasks
        )

    def samples(self) -> None:
        shape = (len(self.task_agents), SAMPLES_A_TASK)
        values = np.exp(self.rng.normal(np.log(0.8), 0.6, size=shape))
        rows = (
            Sample(
                task_agent=of,
                sampled_on=self.today - timedelta(days=20 + 7 * number),
                result_as_reported=f"{value:.3g}",
                unit_as_reported="mg/m3",
                value=float(f"{value:.3g}"),
                unit="mg/m3",
                fingerprint=f"trial-{of.pk}-{number}",
            )
            for of, line in zip(self.task_agents, values, strict=True)
            for number, value in enumerate(line)
        )
        Sample.objects.bulk_create(rows, batch_size=A_BATCH)

    def people(self) -> None:
        names = itertools.product(LAST_NAMES, FIRST_NAMES)
        cycle = itertools.cycle(f"{first} {last}" for last, first in names)
        self.people_made = Worker.objects.bulk_create(
            (
                Worker(
                    site=self.site,
                    personnel_number=f"T{number:06d}",
                    name=next(cycle),
                    active_from=self.since,
                )
                for number in range(1, self.workers_wanted + 1)
            ),
            batch_size=A_BATCH,
        )

    def papers(self) -> None:
        days = self.rng.integers(5, 330, size=len(self.people_made))
        Clearance.objects.bulk_create(
            (
                Clearance(worker=one, outcome="able", decided_on=self.since, decided_by="trial")
                for one in self.people_made
            ),
            batch_size=A_BATCH,
        )
        Training.objects.bulk_create(
            (
                Training(
                    worker=one, trained_on=self.today - timedelta(days=int(day)), trainer="trial"
                )
                for one, day in zip(self.people_made, days, strict=True)
            ),
            batch_size=A_BATCH,
        )

    def fit_tests(self) -> None:
        count = len(self.people_made)
        counted = self.pack.protocol(PROTOCOL).counted_exercises
        factors = np.exp(self.rng.normal(np.log(900), 0.5, size=(count, len(counted))))
        factors = np.maximum(np.round(factors), 110.0)
        days = self.rng.integers(5, 330, size=count)
        days = np.where(self.rng.random(count) < LAPSED_SHARE, 400, days)
        self.size_of = [self.sizes[int(i)] for i in self.rng.integers(0, len(SIZES), count)]
        overall = factors.shape[1] / (1 / factors).sum(axis=1)
        tests = FitTest.objects.bulk_create(
            (
                FitTest(
                    worker=one,
                    size=size,
                    tested_on=self.today - timedelta(days=int(day)),
                    rule_pack=RULES,
                    protocol=PROTOCOL,
                    overall_fit_factor=float(ff),
                    outcome="passed",
                    fingerprint=f"trial-{one.pk}",
                )
                for one, size, day, ff in zip(
                    self.people_made, self.size_of, days, overall, strict=True
                )
            ),
            batch_size=A_BATCH,
        )
        FitExercise.objects.bulk_create(
            (
                FitExercise(test=test, order=order, exercise=one.id, fit_factor=float(value))
                for test, line in zip(tests, factors, strict=True)
                for order, (one, value) in enumerate(zip(counted, line, strict=True), start=1)
            ),
            batch_size=A_BATCH,
        )

    def crews(self) -> None:
        rows = zip(self.people_made, self.size_of, itertools.cycle(self.made_tasks))
        CrewMember.objects.bulk_create(
            (
                CrewMember(
                    task=task,
                    worker=one,
                    assembly=self.assembly,
                    size=size,
                    active_from=self.since,
                )
                for one, size, task in rows
            ),
            batch_size=A_BATCH,
        )
        fitted = datetime.combine(
            self.today - timedelta(days=1),
            datetime.min.time().replace(hour=6),
            tzinfo=ZoneInfo(self.site.time_zone),
        )
        FilterChange.objects.bulk_create(
            (
                FilterChange(worker=one, assembly=self.assembly, fitted_at=fitted)
                for one in self.people_made
            ),
            batch_size=A_BATCH,
        )
