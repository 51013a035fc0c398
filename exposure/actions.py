"""What may be done to samples, agents, limits and tasks: check, write, enter in the ledger."""

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

from django.contrib.auth.models import User
from django.db import IntegrityError, transaction

from exposure.cas import read_cas
from exposure.models import Agent, ExposureLimit, Sample, Sure, Task, TaskAgent
from programme.ledger import actions as ledger
from programme.ledger.changes import save_and_enter
from programme.roster.actions import reason_given, stand_in, take_back
from programme.roster.models import Site
from programme.roster.permissions import require

SITE_LIST = "SITE"
ROWS_A_WRITE = 500
LARGEST = 1e6
MINUTES_A_DAY = 1440


@dataclass(frozen=True, kw_only=True)
class Line:
    """What makes two lines the same sample, however their numbers were written.

    Attributes:
        site: site code.
        task: task code.
        agent: agent key (CAS number).
        worker: personnel number, "" for none.
        sampled_on: day of the sample.
        reference: sample number, "" for none; letter case and outer spaces do not count.
        result: in `unit`; the detection limit where censored.
        is_censored: below the detection limit.
        unit: a member of `Unit`: 250 µg/m3 and 0.25 mg/m3 are one result.
        minutes: min sampled, if known.
    """

    site: str
    task: str
    agent: str
    worker: str
    sampled_on: date
    reference: str
    result: float
    is_censored: bool
    unit: str
    minutes: float | None


def fingerprint(line: Line) -> str:
    """64 hexadecimal digits that stand for the line: equal lines, equal digits."""
    parts = (
        line.site,
        line.task,
        line.agent,
        line.worker,
        line.sampled_on.isoformat(),
        line.reference.strip().casefold(),
        f"{'<' if line.is_censored else ''}{line.result:.9g}",
        str(line.unit),
        "" if line.minutes is None else f"{line.minutes:.6g}",
    )
    return hashlib.sha256("\x1f".join(parts).encode()).hexdigest()


def fingerprint_of(sample: Sample) -> str:
    """The fingerprint of a sample, saved or not."""
    row = sample.task_agent
    return fingerprint(
        Line(
            site=row.task.site.code,
            task=row.task.code,
            agent=row.agent.key,
            worker=sample.worker.personnel_number if sample.worker else "",
            sampled_on=sample.sampled_on,
            reference=sample.reference,
            result=sample.value,
            is_censored=sample.is_censored,
            unit=sample.unit,
            minutes=sample.minutes,
        )
    )


def _twin(sample: Sample) -> ValueError:
    return ValueError(
        f"Result: {sample.result_as_reported} {sample.unit_as_reported} of {sample.sampled_on} is "
        "already recorded for this task, agent and person; if it is another sample, give its "
        "sample number"
    )


def _refuse_figures(sample: Sample) -> None:
    """Refuse what cannot be; a NaN too, which one database would keep as nothing."""
    where = f"{sample.result_as_reported} {sample.unit_as_reported}"
    # Not `<=` and `>`: a NaN must be refused.
    if not 0 < sample.value <= LARGEST:
        raise ValueError(f"Result: {where} is not allowed; above 0 and at most 1 000 000")
    if sample.lod is not None and not 0 < sample.lod <= LARGEST:
        raise ValueError(
            f"Detection limit: {sample.lod} is not allowed; above 0, at most 1 000 000"
        )
    if sample.is_censored and sample.lod is None:
        raise ValueError(f"Detection limit: none; {where} is below detection and needs it")
    if sample.minutes is not None and not 0 < sample.minutes <= MINUTES_A_DAY:
        raise ValueError(f"Minutes: {sample.minutes} is not allowed; above 0 and at most 1440")


def _prepare(sample: Sample, *, by: User) -> None:
    _refuse_figures(sample)
    sample.fingerprint = fingerprint_of(sample)
    sample.recorded_by = by.username


@transaction.atomic
def record_sample(sample: Sample, *, by: User) -> Sample:
    """Record one sample.

    Raises:
        PermissionDenied: `by` may not record samples at the site of its task.
        ValueError: the same line is recorded already.
    """
    site = sample.task_agent.task.site
    require(by, "samples", site)
    _prepare(sample, by=by)
    try:
        with transaction.atomic():
            sample.save(force_insert=True)
    except IntegrityError as error:
        raise _twin(sample) from error
    ledger.enter("sample recorded", chain=site.code, of=sample, by=by.username)
    return sample


@transaction.atomic
def record_samples(samples: Sequence[Sample], *, site: Site, by: User, batch: str = "") -> int:
    """Record many samples of one site, all or none; returns how many.

    Args:
        samples: unsaved; `task_agent` (with its task and agent) and `worker` should be loaded.
        site: the site of all of them.
        by: who records them.
        batch: name of the import; kept with each sample and in the ledger.

    Raises:
        PermissionDenied: `by` may not record samples at that site.
        ValueError: one belongs to another site, or a line is recorded already or stands twice.
    """
    require(by, "samples", site)
    for sample in samples:
        if sample.task_agent.task.site_id != site.pk:
            raise ValueError(f"task: {sample.task_agent.task} is not a task of {site}")
        _prepare(sample, by=by)
        sample.batch = batch
    try:
        with transaction.atomic():
            rows = Sample.objects.bulk_create(samples, batch_size=ROWS_A_WRITE)
    except IntegrityError as error:
        raise ValueError(
            "Samples: one line is recorded already, stands twice or is out of range; "
            "nothing was stored"
        ) from error
    detail = {"batch": batch} if batch else {}
    acts = [ledger.Act("sample recorded", row, detail=detail) for row in rows]
    if acts:
        ledger.enter_many(acts, chain=site.code, by=by.username)
    return len(rows)


@transaction.atomic
def replace_sample(old: Sample, new: Sample, *, by: User, reason: str) -> Sample:
    """Let `new` stand in for `old`, with the reason; both stay on file.

    Raises:
        PermissionDenied: `by` may not correct samples at that site.
        ValueError: the reason is blank or too short, `old` no longer stands, `new` belongs to
            another site, or equals a third sample.
    """
    site = old.task_agent.task.site
    require(by, "samples", site)
    reason = reason_given(reason)
    if new.task_agent.task.site_id != site.pk:
        raise ValueError(f"task: {new.task_agent.task} is not a task of {site}")
    _prepare(new, by=by)
    try:
        with transaction.atomic():
            stand_in(old, new, reason=reason)
    except IntegrityError as error:
        raise _twin(new) from error
    ledger.enter(
        "sample corrected",
        chain=site.code,
        of=old,
        by=by.username,
        says=f"{old} is replaced by record {new.pk}: {new}",
        reason=reason,
        detail={"replaced_by": new.pk},
    )
    return new


@transaction.atomic
def withdraw_sample(sample: Sample, *, by: User, reason: str) -> Sample:
    """Withdraw a sample that should never have stood; it stays on file.

    Raises:
        PermissionDenied: `by` may not correct samples at that site.
        ValueError: the reason is blank or too short, or the sample no longer stands.
    """
    site = sample.task_agent.task.site
    require(by, "samples", site)
    reason = reason_given(reason)
    take_back(sample, reason=reason)
    ledger.enter("sample withdrawn", chain=site.code, of=sample, by=by.username, reason=reason)
    return sample


@transaction.atomic
def add_agent(agent: Agent, *, site: Site, by: User) -> Agent:
    """Add an agent of the site's own, with its source.

    Raises:
        PermissionDenied: `by` may not add agents at that site.
        ValueError: a wrong CAS number, a key that is shipped or there already, or no source.
    """
    require(by, "limits", site)
    if agent.cas:
        agent.key = read_cas(agent.key)
    if not agent.source.strip():
        raise ValueError("Source: empty; say where the figures come from")
    known = Agent.objects.at(site).filter(key=agent.key).first()
    if known is not None:
        raise ValueError(f"CAS number: {agent.key} is already there as {known}")
    agent.site, agent.sure = site, Sure.SITE
    agent.save(force_insert=True)
    ledger.enter("agent added", chain=site.code, of=agent, by=by.username, says=agent.name)
    return agent


@transaction.atomic
def add_limit(limit: ExposureLimit, *, site: Site, by: User) -> ExposureLimit:
    """Add a limit of the site's own to an agent it can see, with its source.

    Raises:
        PermissionDenied: `by` may not add limits at that site.
        ValueError: the agent belongs to another site, or no source is given.
    """
    require(by, "limits", site)
    if limit.agent.site_id not in {None, site.pk}:
        raise ValueError(f"agent: {limit.agent} is not an agent of {site}")
    if not limit.source.strip():
        raise ValueError("Source: empty; say where the limit comes from")
    limit.site, limit.sure, limit.list_code = site, Sure.SITE, SITE_LIST
    limit.save(force_insert=True)
    ledger.enter("limit added", chain=site.code, of=limit, by=by.username)
    return limit


@transaction.atomic
def withdraw_limit(limit: ExposureLimit, *, on: date, by: User, reason: str) -> ExposureLimit:
    """Let a limit of the site's own end; from `on` it no longer counts.

    Raises:
        PermissionDenied: `by` may not change limits at that site.
        ValueError: a shipped limit, one withdrawn before, or no reason.
    """
    if limit.site is None:
        raise ValueError(
            f"limit: {limit} is a published one; a site can add a stricter limit, not remove this"
        )
    require(by, "limits", limit.site)
    reason = reason_given(reason)
    rows = ExposureLimit.objects.filter(pk=limit.pk, withdrawn_on=None)
    if not rows.update(withdrawn_on=on):
        raise ValueError(f"limit: {limit} was withdrawn before")
    limit.refresh_from_db()
    ledger.enter("limit withdrawn", chain=limit.site.code, of=limit, by=by.username, reason=reason)
    return limit


@transaction.atomic
def save_task(task: Task, *, by: User) -> Task:
    """Add a task, or save what was changed of one; the ledger keeps before and after.

    Raises:
        PermissionDenied: `by` may not change tasks at that site.
        ValueError: the task code is taken at that site.
    """
    require(by, "tasks", task.site)
    if Task.objects.at(task.site).filter(code=task.code).exclude(pk=task.pk).exists():
        raise ValueError(f"Code: {task.code} is already a task of {task.site}; choose another")
    save_and_enter(task, noun="task", chain=task.site.code, by=by.username)
    return task


@transaction.atomic
def save_task_agent(row: TaskAgent, *, by: User) -> TaskAgent:
    """Add an agent to a task, or save what was changed of it.

    Raises:
        PermissionDenied: `by` may not change tasks at that site.
        ValueError: the agent is another site's, or stands in the task with that fraction already.
    """
    site = row.task.site
    require(by, "tasks", site)
    if row.agent.site_id not in {None, site.pk}:
        raise ValueError(f"Agent: {row.agent} is not an agent of {site}")
    twins = TaskAgent.objects.at(site).filter(task=row.task, agent=row.agent, fraction=row.fraction)
    if twins.exclude(pk=row.pk).exists():
        raise ValueError(
            f"Agent: {row.agent}, {row.get_fraction_display()} fraction, is in this task already"
        )
    save_and_enter(row, noun="task agent", chain=site.code, by=by.username)
    return row


@transaction.atomic
def remove_task_agent(row: TaskAgent, *, by: User, reason: str) -> None:
    """Take an agent that was added by mistake off a task; one with samples stays.

    Raises:
        PermissionDenied: `by` may not change tasks at that site.
        ValueError: samples rest on it, or no reason.
    """
    site = row.task.site
    require(by, "tasks", site)
    reason = reason_given(reason)
    if row.samples.exists():
        raise ValueError(f"Agent: {row.agent} has samples in this task; it cannot be taken off")
    ledger.enter("task agent removed", chain=site.code, of=row, by=by.username, reason=reason)
    row.delete()
