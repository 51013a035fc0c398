"""Assigning assemblies and crews: every change is a new row or an end, with a ledger entry."""

from datetime import date

from django.contrib.auth.models import User
from django.db import transaction

from exposure.models import Task
from programme.equipment.models import Assembly, FacepieceSize
from programme.ledger import actions as ledger
from programme.roster.models import Worker
from programme.roster.permissions import require
from programme.selection.models import CrewMember, TaskAssembly


@transaction.atomic
def assign(task: Task, assembly: Assembly, *, since: date, by: User) -> TaskAssembly:
    """Assign an assembly to a task from that day on.

    Raises:
        PermissionDenied: `by` may not assign at that site.
        ValueError: the assembly belongs to another site, or is assigned already.
    """
    require(by, "assign", task.site)
    if assembly.site_id != task.site_id:
        raise ValueError(f"assembly: {assembly} is not of {task.site}")
    if TaskAssembly.objects.filter(task=task, assembly=assembly, active_to=None).exists():
        raise ValueError(f"assembly: {assembly} is assigned to {task} already")
    row = TaskAssembly(task=task, assembly=assembly, active_from=since, recorded_by=by.username)
    row.full_clean()
    row.save()
    says = f"{assembly} assigned to {task} from {since}"
    ledger.enter("assembly assigned", chain=task.site.code, of=row, by=by.username, says=says)
    return row


@transaction.atomic
def end_assignment(row: TaskAssembly, *, on: date, reason: str, by: User) -> None:
    """End an assignment: `on` is the first day without it.

    Raises:
        PermissionDenied: `by` may not assign at that site.
        ValueError: the reason is blank, or the assignment has ended already.
    """
    require(by, "assign", row.task.site)
    if not reason.strip():
        raise ValueError("reason: blank; say why the assignment ends")
    day = max(on, row.active_from)
    ended = TaskAssembly.objects.filter(pk=row.pk, active_to=None)
    if not ended.update(active_to=day, reason=reason.strip()):
        raise ValueError(f"assignment: {row} has ended already")
    ledger.enter(
        "assembly taken off",
        chain=row.task.site.code,
        of=row,
        by=by.username,
        says=f"{row.assembly} no longer for {row.task} from {day}",
        reason=reason,
    )


@transaction.atomic
def put_on_crew(
    task: Task,
    worker: Worker,
    *,
    assembly: Assembly | None,
    size: FacepieceSize | None,
    since: date,
    by: User,
) -> CrewMember:
    """Put a worker on a task, or change what the worker wears there, from that day on.

    A worker who is on the task already gets a new row; the old one ends on the same day.

    Raises:
        PermissionDenied: `by` may not assign at that site.
        ValueError: worker, assembly or size belongs elsewhere.
    """
    require(by, "assign", task.site)
    if worker.site_id != task.site_id or (assembly and assembly.site_id != task.site_id):
        raise ValueError(f"worker: {worker} and {assembly} must be of {task.site}")
    if size is not None and (assembly is None or size.facepiece_id != assembly.facepiece_id):
        raise ValueError(f"size: {size} is no size of {assembly}")
    was = CrewMember.objects.filter(task=task, worker=worker, active_to=None).first()
    if was is not None:
        CrewMember.objects.filter(pk=was.pk).update(
            active_to=max(since, was.active_from), reason="changed what is worn"
        )
    row = CrewMember(
        task=task,
        worker=worker,
        assembly=assembly,
        size=size,
        active_from=since,
        recorded_by=by.username,
    )
    row.full_clean()
    row.save()
    wears = f"{assembly or 'nothing recorded'}{f', size {size.label}' if size else ''}"
    ledger.enter(
        "crew changed" if was else "put on crew",
        chain=task.site.code,
        of=row,
        by=by.username,
        says=f"{worker.name} on {task} from {since}, wears {wears}",
    )
    return row


@transaction.atomic
def take_off_crew(row: CrewMember, *, on: date, by: User, reason: str = "") -> None:
    """Take a worker off a task: `on` is the first day without them.

    Raises:
        PermissionDenied: `by` may not assign at that site.
        ValueError: the worker is off already.
    """
    require(by, "assign", row.task.site)
    day = max(on, row.active_from)
    ended = CrewMember.objects.filter(pk=row.pk, active_to=None)
    if not ended.update(active_to=day, reason=reason.strip()):
        raise ValueError(f"crew: {row} has ended already")
    ledger.enter(
        "taken off crew",
        chain=row.task.site.code,
        of=row,
        by=by.username,
        says=f"{row.worker.name} off {row.task} from {day}",
        reason=reason,
    )
