"""What may be done to workers and their papers: each act checks, writes and enters the ledger."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from django.contrib.auth.models import User
from django.db import IntegrityError, transaction
from django.utils import timezone

from programme.ledger import actions as ledger
from programme.roster.models import Clearance, SealNote, Site, Training, Worker
from programme.roster.permissions import require

SHORTEST_REASON = 8
# The ledger says that these changed, never to what.
PRIVATE = frozenset({"born_on"})

Paper = Clearance | Training | SealNote


@dataclass(frozen=True)
class Kind:
    """How a kind of paper is named and which act of `permissions.ACTS` it takes."""

    noun: str
    act: str


KINDS: dict[type, Kind] = {
    Clearance: Kind("clearance", "clearance"),
    Training: Kind("training", "roster"),
    SealNote: Kind("seal note", "roster"),
}


def reason_given(text: str) -> str:
    """The reason of a correction, trimmed.

    Raises:
        ValueError: blank or too short to be one.
    """
    reason = text.strip()
    if len(reason) < SHORTEST_REASON:
        raise ValueError(
            f"Reason: {reason!r} is not enough; say in a few words why, "
            f"at least {SHORTEST_REASON} characters"
        )
    return reason


def _refuse_number(number: str) -> ValueError:
    return ValueError(
        f"Personnel number: {number} is already taken at this site; it must be another"
    )


@transaction.atomic
def add_worker(worker: Worker, *, by: User) -> Worker:
    """Put a person on the roster.

    Raises:
        PermissionDenied: `by` may not change the roster of that site.
        ValueError: the personnel number is taken.
    """
    require(by, "roster", worker.site)
    try:
        with transaction.atomic():
            worker.save(force_insert=True)
    except IntegrityError as error:
        raise _refuse_number(worker.personnel_number) from error
    ledger.enter("worker added", chain=worker.site.code, of=worker, by=by.username)
    return worker


@transaction.atomic
def add_workers(workers: Sequence[Worker], *, site: Site, by: User, says: str = "") -> int:
    """Put many people on the roster in one go, all or none; returns how many.

    Raises:
        PermissionDenied: `by` may not change the roster of that site.
        ValueError: a personnel number is taken, or stands twice among them.
    """
    require(by, "roster", site)
    try:
        with transaction.atomic():
            rows = Worker.objects.bulk_create(workers, batch_size=500)
    except IntegrityError as error:
        raise ValueError(
            "Personnel number: one of them is already taken at this site; each must be new"
        ) from error
    ledger.enter_many(
        [ledger.Act("worker added", row, reason=says) for row in rows],
        chain=site.code,
        by=by.username,
    )
    return len(rows)


def _changes(before: Worker, after: Worker) -> dict[str, Any]:
    found: dict[str, Any] = {}
    for field in Worker._meta.concrete_fields:
        old, new = getattr(before, field.attname), getattr(after, field.attname)
        if old != new:
            found[field.name] = "changed" if field.name in PRIVATE else [str(old), str(new)]
    return found


@transaction.atomic
def change_worker(worker: Worker, *, by: User) -> Worker:
    """Save what was changed of a person; the ledger keeps what it was before.

    Raises:
        PermissionDenied: `by` may not change the roster of that site.
        ValueError: the personnel number is taken.
    """
    require(by, "roster", worker.site)
    changes = _changes(Worker.objects.select_for_update().get(pk=worker.pk), worker)
    if not changes:
        return worker
    try:
        with transaction.atomic():
            worker.save(force_update=True)
    except IntegrityError as error:
        raise _refuse_number(worker.personnel_number) from error
    fields = ", ".join(name.replace("_", " ") for name in changes)
    ledger.enter(
        "worker changed",
        chain=worker.site.code,
        of=worker,
        by=by.username,
        says=f"{worker}: {fields}",
        detail=changes,
    )
    return worker


def _enter(done: str, row: Paper, *, by: User, reason: str = "") -> None:
    """Enter an act on a paper. What a clearance says stays out of the ledger."""
    noun = KINDS[type(row)].noun
    says = str(row)
    if isinstance(row, Clearance):
        says = f"{row.worker.name}: clearance of {row.decided_on}"
    ledger.enter(
        f"{noun} {done}",
        chain=row.worker.site.code,
        of=row,
        by=by.username,
        says=says,
        reason=reason,
    )


@transaction.atomic
def record(row: Paper, *, by: User) -> Paper:
    """Record a clearance, a training or a seal note.

    Raises:
        PermissionDenied: `by` may not record that kind at the worker's site.
    """
    require(by, KINDS[type(row)].act, row.worker.site)
    row.recorded_by = by.username
    row.save(force_insert=True)
    _enter("recorded", row, by=by)
    return row


def stand_in(old: Any, new: Any, *, reason: str) -> None:
    """Save `new` in place of `old`; both stay on file. The caller holds the transaction.

    Raises:
        ValueError: `old` no longer stands: somebody replaced or withdrew it before.
    """
    rows = type(old)._default_manager.filter(pk=old.pk)
    now = timezone.now()
    # Out of force first: a record may differ from its correction in its remarks only, and the
    # database lets the same line stand once.
    if not rows.filter(replaced_by=None, withdrawn_at=None).update(withdrawn_at=now):
        raise ValueError(f"{old} was replaced or withdrawn before; correct the newest one")
    new.save(force_insert=True)
    rows.update(withdrawn_at=None, replaced_by=new, replaced_at=now, change_reason=reason)
    old.refresh_from_db()


def take_back(row: Any, *, reason: str) -> None:
    """Mark a record withdrawn. The caller holds the transaction.

    Raises:
        ValueError: it no longer stands.
    """
    rows = type(row)._default_manager.filter(pk=row.pk, replaced_by=None, withdrawn_at=None)
    if not rows.update(withdrawn_at=timezone.now(), change_reason=reason):
        raise ValueError(f"{row} was replaced or withdrawn before")
    row.refresh_from_db()


@transaction.atomic
def replace(old: Paper, new: Paper, *, by: User, reason: str) -> Paper:
    """Let `new` stand in for `old`, with the reason; both stay on file.

    Raises:
        PermissionDenied: `by` may not record that kind at the worker's site.
        ValueError: the reason is blank or too short, or `old` no longer stands.
    """
    require(by, KINDS[type(old)].act, old.worker.site)
    reason = reason_given(reason)
    new.worker = old.worker
    new.recorded_by = by.username
    stand_in(old, new, reason=reason)
    _enter("corrected", old, by=by, reason=reason)
    return new


@transaction.atomic
def withdraw(row: Paper, *, by: User, reason: str) -> Paper:
    """Withdraw a paper that should never have stood, with the reason; it stays on file.

    Raises:
        PermissionDenied: `by` may not record that kind at the worker's site.
        ValueError: the reason is blank or too short, or the paper no longer stands.
    """
    require(by, KINDS[type(row)].act, row.worker.site)
    reason = reason_given(reason)
    take_back(row, reason=reason)
    _enter("withdrawn", row, by=by, reason=reason)
    return row
