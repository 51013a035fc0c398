"""Loads the demo scenario through the same actions that the pages use, so that the ledger is filled."""

from datetime import date, datetime, time, timedelta
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import yaml
from django.conf import settings
from django.contrib.auth.models import User
from django.db import connection, transaction
from django.db.models import QuerySet
from scipy.special import ndtri

from exposure.actions import record_samples, save_task, save_task_agent
from exposure.models import Agent, Sample, Task, TaskAgent
from programme.equipment.models import (
    Assembly,
    Element,
    Facepiece,
    FacepieceSize,
    FilterChange,
)
from programme.fit.actions import Entered, drafted, record_fit_tests
from programme.fit.outcome import slots_of
from programme.ledger import actions as ledger
from programme.ledger.models import Entry
from programme.roster.actions import add_workers
from programme.roster.models import Clearance, Membership, SealNote, Site, Training, Worker
from programme.rulepack.load import load
from programme.selection.actions import assign, put_on_crew

SCENARIO = settings.FIXTURES_DIR / "demo" / "tarnbeck.yaml"
SIZES = ("S", "M", "M", "M", "L")
PROTOCOLS = {"us-2026-1": "modified_cnc_elastomeric", "gb-2026-1": "ambient_aerosol_cnc"}
# Who stands in the ledger as the maker of an invented site.
MAKER, TRIAL_MAKER = "demo", "trial"
INVENTED = "invented site made"
YEARS_BACK = 2
TRAINED_DAYS_AGO, FITTED_DAYS_AGO, SECOND_TEST_DAYS_AGO = 90, 80, 440
FILTER_DAYS_AGO = 1
# Only so many people have an older test on file as well.
WITH_FORMER_TEST = 46


def read() -> dict[str, Any]:
    """The scenario as plain values."""
    with SCENARIO.open(encoding="utf-8") as file:
        return dict(yaml.safe_load(file))


def is_loaded() -> bool:
    """Whether the scenario's first site is there already, made by this loader."""
    code = read()["sites"][0]["code"]
    return _invented().filter(chain=code, by=MAKER).exists()


def real_sites() -> list[str]:
    """Codes of the sites that neither the demo nor `make_site` made; none before the tables are."""
    if Site._meta.db_table not in connection.introspection.table_names():
        return []
    invented = set(_invented().values_list("chain", flat=True))
    codes = Site.objects.order_by("code").values_list("code", flat=True)
    return [code for code in codes if code not in invented]


def _invented() -> QuerySet[Entry]:
    # A site's name proves nothing: a real one may be called the same. Its first row in the ledger
    # does, and only the two makers of invented sites write this act.
    return Entry.objects.filter(serial=1, act=INVENTED)


@transaction.atomic
def load_demo(today: date | None = None) -> list[dict[str, str]]:
    """Load the scenario; days are counted back from `today` (default: the site's own).

    Returns:
        The sign-ins: username, role, password.
    """
    plan = read()
    users = [
        User.objects.create_user(row["username"], password=row["password"]) for row in plan["users"]
    ]
    names = [name.strip() for name in plan["names"].split(",")]
    for row in plan["sites"]:
        _SiteLoader(row, names, plan["users"], users, today).load()
    return [dict(row) for row in plan["users"]]


class _SiteLoader:
    """Fills one site."""

    def __init__(
        self,
        plan: dict[str, Any],
        names: list[str],
        roles: list[dict[str, str]],
        users: list[User],
        today: date | None,
    ) -> None:
        self.plan, self.names = plan, names
        self.site = Site.objects.create(
            code=plan["code"],
            name=plan["name"],
            rule_pack=plan["rules"],
            time_zone=plan["time_zone"],
            temperature_c=plan["temperature_c"],
            altitude_m=plan["altitude_m"],
        )
        for user, row in zip(users, roles, strict=True):
            Membership.objects.create(user=user, site=self.site, role=row["role"])
        self.by = users[-1]
        self.pack = load(plan["rules"])
        self.today = today or self.site.today()
        self.since = date(self.today.year - YEARS_BACK, 1, 8)
        self.people: dict[int, dict[str, Any]] = plan.get("people", {})
        self.rng = np.random.default_rng(20260)

    def load(self) -> None:
        """Shelf, tasks, samples, people, papers, fit tests, crews and filters."""
        says = f"{self.site} under {self.site.rule_pack}"
        ledger.enter(INVENTED, chain=self.site.code, of=self.site, by=MAKER, says=says)
        self.shelf()
        self.make_workers()
        self.make_tasks()
        self.papers()
        self.fit_tests()
        self.crews()

    def ago(self, days: int) -> date:
        return self.today - timedelta(days=days)

    def of_person(self, number: int, key: str, default: Any) -> Any:
        return self.people.get(number, {}).get(key, default)

    def shelf(self) -> None:
        self.sizes: dict[str, dict[str, FacepieceSize]] = {}
        facepieces = {}
        for row in self.plan["facepieces"]:
            one = Facepiece.objects.create(site=self.site, name=row["name"], kind=row["kind"])
            facepieces[one.name] = one
            self.sizes[one.name] = {
                label: FacepieceSize.objects.create(facepiece=one, label=label, order=order)
                for order, label in enumerate(row["sizes"])
            }
        elements = {
            row["name"]: Element.objects.create(site=self.site, **row)
            for row in self.plan["elements"]
        }
        self.assemblies = {}
        for row in self.plan["assemblies"]:
            self.assemblies[row["name"]] = Assembly.objects.create(
                site=self.site,
                name=row["name"],
                respirator_class=row["class"],
                facepiece=facepieces[row["facepiece"]],
                element=elements.get(row.get("element", "")),
                approval_number=row["approval"],
                maker_evidence=row.get("maker_evidence", ""),
                service_life_min=row.get("service_life_min"),
                in_stock=row["in_stock"],
            )

    def make_workers(self) -> None:
        first = self.plan["first_worker"]
        numbers = range(first, first + self.plan["workers"])
        rows = [
            Worker(
                site=self.site,
                personnel_number=f"{self.site.code[:1].upper()}{number:03d}",
                name=self.names[number - 1],
                job="yard hand" if number % 3 else "fitter",
                employer="Ferrow Contracting (invented)" if number % 7 == 0 else "",
                is_contractor=number % 7 == 0,
                active_from=self.since,
            )
            for number in numbers
        ]
        add_workers(rows, site=self.site, by=self.by)
        found = {one.personnel_number: one for one in Worker.objects.at(self.site)}
        self.workers = {n: found[f"{self.site.code[:1].upper()}{n:03d}"] for n in numbers}

    def make_tasks(self) -> None:
        self.tasks: dict[str, Task] = {}
        samples: list[Sample] = []
        for row in self.plan["tasks"]:
            changed = row.get("changed_days_ago")
            task = Task(
                site=self.site,
                code=row["code"],
                name=row["name"],
                work_rate=row["work_rate"],
                wear_h_per_shift=row["wear_h"],
                shift_h=row.get("shift_h", 8),
                shifts_per_week=row.get("shifts_per_week", 5),
                oxygen=row.get("oxygen", "ambient"),
                oxygen_percent=row.get("oxygen_percent"),
                is_idlh=row.get("is_idlh", False),
                irritates_eyes=row.get("irritates_eyes", False),
                changed_on=self.ago(changed) if changed else None,
                active_from=self.since,
            )
            self.tasks[task.code] = save_task(task, by=self.by)
            for agent in row["agents"]:
                samples += self._agent(task, agent, row["crew"])
            assign(task, self.assemblies[row["assembly"]], since=self.since, by=self.by)
        record_samples(samples, site=self.site, by=self.by)

    def _agent(self, task: Task, row: dict[str, Any], crew: list[int]) -> list[Sample]:
        of = TaskAgent(
            task=task,
            agent=Agent.objects.get(key=row["cas"], site=None),
            form=row["form"],
            fraction=row["fraction"],
            mmad_um=row.get("mmad_um"),
            gsd=row.get("gsd"),
            dust_load_mg_m3=row.get("dust_load"),
            cake=row.get("cake", ""),
        )
        of = save_task_agent(of, by=self.by)
        below = row.get("below", [])
        count = row.get("n", 0)
        # Quantiles, not draws: the same spread on every machine, and no result of mere chance.
        shares = (np.arange(1, count - len(below) + 1) - 0.5) / max(count - len(below), 1)
        spread = np.log(row.get("spread", 1.5))
        logs = np.log(row.get("gm", 1.0)) + spread * ndtri(shares)
        results = [(float(f"{value:.2g}"), False) for value in np.exp(logs)]
        results += [(float(value), True) for value in below]
        order = self.rng.permutation(len(results))
        return [
            self._sample(of, results[int(i)], at, row, crew) for at, i in enumerate(order, start=1)
        ]

    def _sample(
        self,
        of: TaskAgent,
        result: tuple[float, bool],
        at: int,
        row: dict[str, Any],
        crew: list[int],
    ) -> Sample:
        value, is_below = result
        unit = row.get("unit", "mg/m3")
        worker = self.workers[crew[at % len(crew)]]
        return Sample(
            task_agent=of,
            worker=worker,
            sampled_on=self.ago(row.get("days_ago", 30) + 9 * at),
            minutes=420,
            result_as_reported=f"{'<' if is_below else ''}{value:g}",
            unit_as_reported=unit,
            value=value,
            is_censored=is_below,
            lod=value if is_below else None,
            unit=unit,
            laboratory="invented laboratory",
            reference=f"{of.task.code}-{at:02d}",
        )

    def papers(self) -> None:
        clearances: list[Clearance] = []
        trainings: list[Training] = []
        notes: list[SealNote] = []
        for number, worker in self.workers.items():
            cleared = self.of_person(number, "clearance", "able")
            if cleared != "none":
                clearances.append(
                    Clearance(
                        worker=worker,
                        outcome="able_with_limits" if cleared == "no_scba" else "able",
                        no_scba=cleared == "no_scba",
                        decided_on=self.since,
                        decided_by="Dr N. Vented (invented)",
                        copy_given=True,
                        recorded_by=self.by.username,
                    )
                )
            trainings.append(
                Training(
                    worker=worker,
                    trained_on=self.ago(
                        self.of_person(number, "training_days_ago", TRAINED_DAYS_AGO + number)
                    ),
                    families=self.of_person(number, "training_families", []),
                    trainer="C. Orin (invented)",
                    recorded_by=self.by.username,
                )
            )
            if self.of_person(number, "hair", default=False):
                notes.append(SealNote(worker=worker, noted_on=self.ago(2), kind="facial_hair"))
            changed = self.of_person(number, "face_changed_days_ago", None)
            if changed is not None:
                notes.append(
                    SealNote(worker=worker, noted_on=self.ago(changed), kind="face_change")
                )
        made: list[tuple[str, Clearance | Training | SealNote]] = []
        made += [("clearance", row) for row in Clearance.objects.bulk_create(clearances)]
        made += [("training", row) for row in Training.objects.bulk_create(trainings)]
        made += [("seal note", row) for row in SealNote.objects.bulk_create(notes)]
        acts = [
            ledger.Act(f"{what} recorded", row, says=f"{what}: {row.worker.name}")
            for what, row in made
        ]
        ledger.enter_many(acts, chain=self.site.code, by=self.by.username)

    def fit_tests(self) -> None:
        protocol = PROTOCOLS[self.site.rule_pack]
        slots = slots_of(self.pack.protocol(protocol))
        entered = []
        for row in self.plan["tasks"]:
            facepiece = self.assemblies[row["assembly"]].facepiece
            if not facepiece.is_tight:
                continue
            for number in row["crew"]:
                size = self.sizes[facepiece.name][SIZES[number % len(SIZES)]]
                factors = self.of_person(number, "fit_factors", None)
                base = 600 if facepiece.kind == "half_mask" else 2400
                made = factors or [base + 37 * ((number * 7 + i * 11) % 13) for i in range(9)]
                days = [self.of_person(number, "fit_days_ago", FITTED_DAYS_AGO + number)]
                if number <= WITH_FORMER_TEST:
                    days.append(SECOND_TEST_DAYS_AGO + number)
                for ago in days:
                    figures = tuple(float(one) for one in made[: len(slots)])
                    if ago >= SECOND_TEST_DAYS_AGO:
                        figures = tuple(float(base + 200 + 10 * i) for i in range(len(slots)))
                    entered.append(
                        Entered(
                            worker=self.workers[number],
                            size=size,
                            tested_on=self.ago(ago),
                            protocol=protocol,
                            fit_factors=figures,
                            tester="H. Edda (invented)",
                        )
                    )
        drafts = [drafted(one, pack=self.pack) for one in entered]
        record_fit_tests(drafts, site=self.site, by=self.by)

    def crews(self) -> None:
        zone = ZoneInfo(self.site.time_zone)
        changes = []
        for row in self.plan["tasks"]:
            assembly = self.assemblies[row["assembly"]]
            for number in row["crew"]:
                tested = SIZES[number % len(SIZES)]
                label = self.of_person(number, "size_worn", tested)
                put_on_crew(
                    self.tasks[row["code"]],
                    self.workers[number],
                    assembly=assembly,
                    size=self.sizes[assembly.facepiece.name].get(label),
                    since=self.since,
                    by=self.by,
                )
                days = self.of_person(number, "filter_days_ago", FILTER_DAYS_AGO)
                if assembly.element_id and self.of_person(number, "filter", "known") != "none":
                    fitted = datetime.combine(self.ago(days), time(5, 50), tzinfo=zone)
                    changes.append(
                        FilterChange(
                            worker=self.workers[number],
                            assembly=assembly,
                            fitted_at=fitted,
                            recorded_by=self.by.username,
                        )
                    )
        rows = FilterChange.objects.bulk_create(changes)
        acts = [ledger.Act("filter change recorded", row) for row in rows]
        ledger.enter_many(acts, chain=self.site.code, by=self.by.username)
