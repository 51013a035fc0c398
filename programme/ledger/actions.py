"""Writing in the ledger and checking it."""

import hashlib
import json
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import UTC
from typing import Any

from django.db import models, transaction
from django.utils import timezone

from programme.ledger.models import Entry, Head

ROWS_A_READ = 2000


def _canonical(row: Entry) -> bytes:
    parts = {
        "chain": row.chain,
        "serial": str(row.serial),
        "at": row.at.astimezone(UTC).isoformat(timespec="microseconds"),
        "by": row.by,
        "act": row.act,
        "subject": f"{row.subject_kind}/{row.subject_id}",
        "says": row.says,
        "reason": row.reason,
        "detail": row.detail,
    }
    return json.dumps(parts, sort_keys=True, ensure_ascii=False, default=str).encode()


def _hash(row: Entry) -> str:
    return hashlib.sha256(row.previous_hash.encode() + _canonical(row)).hexdigest()


@dataclass(frozen=True)
class Act:
    """What is to be entered: the act, what it touched and a sentence a person can read."""

    act: str
    of: models.Model
    says: str = ""
    reason: str = ""
    detail: dict[str, Any] | None = None


def enter(act: str, *, chain: str, of: models.Model, by: str, **rest: Any) -> Entry:
    """Enter one act; call it inside the transaction that makes the change.

    Args:
        act: what was done, e.g. "fit test recorded".
        chain: the site's code, or "programme".
        of: the record that was touched; it must have been saved.
        by: the user name of who did it.
        rest: `says` (a sentence; default the record's own text), `reason`, `detail` (JSON values).
    """
    return enter_many([Act(act, of, **rest)], chain=chain, by=by)[-1]


@transaction.atomic
def enter_many(acts: Sequence[Act], *, chain: str, by: str) -> list[Entry]:
    """Enter many acts of one person in one go, in order; returns their rows."""
    Head.objects.get_or_create(chain=chain)
    head = Head.objects.select_for_update().get(chain=chain)
    rows = []
    now = timezone.now()
    serial, previous = head.serial, head.hash
    for act in acts:
        serial += 1
        row = Entry(
            chain=chain,
            serial=serial,
            at=now,
            by=by,
            act=act.act,
            subject_kind=act.of._meta.label_lower,
            subject_id=str(act.of.pk),
            says=(act.says or str(act.of))[:300],
            reason=act.reason,
            detail=json.loads(json.dumps(act.detail or {}, default=str)),
            previous_hash=previous,
        )
        row.hash = previous = _hash(row)
        rows.append(row)
    Entry.objects.bulk_create(rows, batch_size=500)
    head.serial, head.hash = serial, previous
    head.save(update_fields=["serial", "hash"])
    return rows


@dataclass(frozen=True)
class Verdict:
    """What checking a chain found."""

    chain: str
    rows: int
    head: str
    faults: tuple[str, ...]

    @property
    def is_whole(self) -> bool:
        return not self.faults


def _faults(rows: Iterable[Entry]) -> Iterable[tuple[Entry, str]]:
    serial, previous = 0, ""
    for row in rows:
        if row.serial != serial + 1:
            yield row, f"row {serial + 1} is missing before row {row.serial}"
        elif row.previous_hash != previous:
            yield row, f"row {row.serial} does not follow from row {serial}"
        elif row.hash != _hash(row):
            yield row, f"row {row.serial} was changed after it was written"
        else:
            yield row, ""
        serial, previous = row.serial, row.hash


def verify(chain: str) -> Verdict:
    """Read the whole chain and say whether any row was changed, removed or inserted."""
    faults, rows, last = [], 0, ""
    entries = Entry.objects.filter(chain=chain).order_by("serial").iterator(ROWS_A_READ)
    for row, fault in _faults(entries):
        rows, last = rows + 1, row.hash
        if fault:
            faults.append(fault)
    head = Head.objects.filter(chain=chain).first()
    if head is None or (head.serial, head.hash) != (rows, last):
        known = head.serial if head else 0
        if rows or known:
            faults.append(f"the last row should be {known}, found {rows}")
    return Verdict(chain, rows, f"{rows}-{last[:16]}", tuple(faults))


def head_of(chain: str) -> str:
    """Row number and first 16 digits of the last hash: what is printed on signed pages."""
    head = Head.objects.filter(chain=chain).first()
    return f"{head.serial}-{head.hash[:16]}" if head else "0-"
