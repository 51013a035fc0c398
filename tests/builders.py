"""Invented people, places and things: what a test does not name is filled in.

Every builder takes further fields of its model as keywords. Days default to `SINCE` (long ago)
for what lasts and to `DAY` for what happened; `DAY` is the day on which tests judge.
"""

import itertools
import uuid
from collections.abc import Sequence
from datetime import UTC, date, datetime, time
from typing import Any

from django.contrib.auth.models import User
from django.test import Client

from exposure.models import Agent, ExposureLimit, Sample, Task, TaskAgent
from programme.equipment.models import (
    Assembly,
    Element,
    Facepiece,
    FacepieceSize,
    FilterChange,
)
from programme.fit.models import FitExercise, FitTest
from programme.roster.models import (
    Clearance,
    Membership,
    Role,
    SealNote,
    Site,
    Training,
    Worker,
)
from programme.selection.models import CrewMember, TaskAssembly

DAY = date(2026, 3, 2)
SINCE = date(2024, 1, 8)

_numbers = itertools.count(1)


def _number() -> int:
    return next(_numbers)


def make_site(code: str = "north", rule_pack: str = "us-2026-1", **fields: Any) -> Site:
    """The site of that code, made if it is not there yet."""
    fields.setdefault("name", f"{code.capitalize()} works")
    site, _ = Site.objects.get_or_create(code=code, defaults={"rule_pack": rule_pack, **fields})
    return site


def make_user(
    role: str | None = Role.ADMINISTRATOR, site: Site | None = None, **fields: Any
) -> User:
    """A user with that role at that site; `role=None` makes one who belongs nowhere."""
    fields.setdefault("username", f"user{_number()}")
    user = User.objects.create_user(password="a long enough phrase", **fields)
    if role is not None:
        Membership.objects.create(user=user, site=site or make_site(), role=role)
    return user


def client_for(user: User) -> Client:
    """A browser in which that user is signed in."""
    client = Client()
    client.force_login(user, backend="allauth.account.auth_backends.AuthenticationBackend")
    return client


def make_worker(site: Site | None = None, name: str = "", **fields: Any) -> Worker:
    number = _number()
    fields.setdefault("personnel_number", f"W-{number:04d}")
    fields.setdefault("active_from", SINCE)
    return Worker.objects.create(
        site=site or make_site(), name=name or f"Worker {number}", **fields
    )


def make_clearance(worker: Worker, on: date = SINCE, **fields: Any) -> Clearance:
    fields.setdefault("outcome", Clearance.Outcome.ABLE)
    fields.setdefault("decided_by", "Dr Invented")
    return Clearance.objects.create(worker=worker, decided_on=on, **fields)


def make_training(worker: Worker, on: date = DAY, **fields: Any) -> Training:
    fields.setdefault("trainer", "T. Rainer")
    return Training.objects.create(worker=worker, trained_on=on, **fields)


def make_seal_note(
    worker: Worker, kind: str = "facial_hair", on: date = DAY, **fields: Any
) -> SealNote:
    return SealNote.objects.create(worker=worker, kind=kind, noted_on=on, **fields)


def make_agent(name: str = "Quartz dust", **fields: Any) -> Agent:
    fields.setdefault("key", f"NOCAS-{_number():05d}")
    fields.setdefault("kind", Agent.Kind.DUST)
    fields.setdefault("source", "invented for a test")
    fields.setdefault("sure", "site")
    return Agent.objects.create(name=name, **fields)


def make_limit(agent: Agent, value: float = 0.05, **fields: Any) -> ExposureLimit:
    defaults = {
        "list_code": "US-PEL",
        "kind": ExposureLimit.Kind.TWA,
        "fraction": "respirable",
        "unit": "mg/m3",
        "averaging_min": 480,
        "source": "invented for a test",
        "sure": "site",
    }
    return ExposureLimit.objects.create(agent=agent, value=value, **{**defaults, **fields})


def make_task(site: Site | None = None, name: str = "Relining", **fields: Any) -> Task:
    fields.setdefault("code", f"task-{_number()}")
    fields.setdefault("work_rate", "moderate")
    fields.setdefault("wear_h_per_shift", 6.0)
    fields.setdefault("oxygen", Task.Oxygen.AMBIENT)
    fields.setdefault("active_from", SINCE)
    return Task.objects.create(site=site or make_site(), name=name, **fields)


def make_task_agent(
    task: Task | None = None, agent: Agent | None = None, **fields: Any
) -> TaskAgent:
    fields.setdefault("form", TaskAgent.Form.PARTICULATE)
    fields.setdefault("fraction", "respirable")
    return TaskAgent.objects.create(task=task or make_task(), agent=agent or make_agent(), **fields)


def make_sample(
    task_agent: TaskAgent | None = None,
    value: float = 0.2,
    on: date = DAY,
    **fields: Any,
) -> Sample:
    """One personal full-shift sample in mg/m3; `is_censored=True` makes `value` its LOD."""
    censored = fields.get("is_censored", False)
    defaults = {
        "result_as_reported": f"<{value}" if censored else str(value),
        "unit": "mg/m3",
        "unit_as_reported": fields.get("unit", "mg/m3"),
        "lod": value if censored else None,
        "fingerprint": uuid.uuid4().hex,
    }
    return Sample.objects.create(
        task_agent=task_agent or make_task_agent(),
        value=value,
        sampled_on=on,
        **{**defaults, **fields},
    )


def make_facepiece(
    site: Site | None = None, sizes: Sequence[str] = ("S", "M", "L"), **fields: Any
) -> Facepiece:
    """A facepiece with its sizes; see `size_of`. A half mask unless `kind` says otherwise."""
    fields.setdefault("name", f"Facepiece {_number()}")
    fields.setdefault("kind", "half_mask")
    facepiece = Facepiece.objects.create(site=site or make_site(), **fields)
    for order, label in enumerate(sizes):
        FacepieceSize.objects.create(facepiece=facepiece, label=label, order=order)
    return facepiece


def size_of(facepiece: Facepiece, label: str = "M") -> FacepieceSize:
    return facepiece.sizes.get(label=label)


def make_element(site: Site | None = None, **fields: Any) -> Element:
    """A P100 filter unless the fields say otherwise."""
    fields.setdefault("name", f"Filter {_number()}")
    fields.setdefault("particulate_class", "P100")
    fields.setdefault("in_stock", 40)
    return Element.objects.create(site=site or make_site(), **fields)


def make_assembly(
    site: Site | None = None,
    facepiece: Facepiece | None = None,
    element: Element | None = None,
    **fields: Any,
) -> Assembly:
    """An air-purifying half mask with a P100 filter unless the fields say otherwise."""
    site = site or (facepiece.site if facepiece else make_site())
    fields.setdefault("name", f"Assembly {_number()}")
    fields.setdefault("respirator_class", "apr_half")
    fields.setdefault("approval_number", "TC-84A-0000")
    fields.setdefault("in_stock", 10)
    return Assembly.objects.create(
        site=site,
        facepiece=facepiece or make_facepiece(site),
        element=element or make_element(site),
        **fields,
    )


def make_filter_change(
    worker: Worker, assembly: Assembly, at: datetime | date = DAY, **fields: Any
) -> FilterChange:
    if not isinstance(at, datetime):
        at = datetime.combine(at, time(6), tzinfo=UTC)
    return FilterChange.objects.create(worker=worker, assembly=assembly, fitted_at=at, **fields)


# The grimace stands here in the classic protocol and does not count.
GRIMACE = 6


def make_fit_test(
    worker: Worker,
    size: FacepieceSize | None = None,
    on: date = DAY,
    *,
    fit_factors: Sequence[float | None] = (800.0,) * 7,
    **fields: Any,
) -> FitTest:
    """A quantitative test whose counted exercises read `fit_factors`; passed unless said otherwise.

    The overall figure is the harmonic mean of what was given; with a `None` among the figures
    pass `outcome="incomplete"` as well.
    """
    size = size or size_of(make_facepiece(worker.site))
    whole = bool(fit_factors) and None not in fit_factors
    overall = len(fit_factors) / sum(1 / one for one in fit_factors) if whole else None
    defaults = {
        "rule_pack": worker.site.rule_pack,
        "protocol": "ambient_aerosol_cnc",
        "overall_fit_factor": overall,
        "outcome": FitTest.Outcome.PASSED,
        "tester": "F. Tester",
        "fingerprint": uuid.uuid4().hex,
    }
    test = FitTest.objects.create(worker=worker, size=size, tested_on=on, **{**defaults, **fields})
    FitExercise.objects.bulk_create(
        FitExercise(
            test=test,
            order=order + (order >= GRIMACE),
            exercise=f"exercise {order}",
            fit_factor=figure,
        )
        for order, figure in enumerate(fit_factors, start=1)
    )
    return test


def assign(task: Task, assembly: Assembly, since: date = SINCE, **fields: Any) -> TaskAssembly:
    """Assign the assembly to the task."""
    return TaskAssembly.objects.create(task=task, assembly=assembly, active_from=since, **fields)


def make_crew(
    task: Task,
    worker: Worker,
    assembly: Assembly | None = None,
    size: FacepieceSize | None = None,
    **fields: Any,
) -> CrewMember:
    """Put the worker on the task; with an assembly and no size, size M of its facepiece."""
    if assembly is not None and size is None:
        size = assembly.facepiece.sizes.filter(label="M").first()
    fields.setdefault("active_from", SINCE)
    return CrewMember.objects.create(
        task=task, worker=worker, assembly=assembly, size=size, **fields
    )
