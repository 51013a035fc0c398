"""A file on its way in: begun, matched, judged, stored all or none, undone as a whole."""

from collections.abc import Mapping
from typing import Any

from django.contrib.auth.models import User
from django.db import transaction
from django.db.models import ProtectedError
from django.utils import timezone

from exposure.actions import record_samples
from exposure.models import Sample
from programme.fit.actions import record_fit_tests
from programme.fit.models import FitTest
from programme.ledger import actions as ledger
from programme.records.intake.fit_tests import preview_fit_tests
from programme.records.intake.matching import Matching
from programme.records.intake.preview import Preview
from programme.records.intake.reader import FileRead
from programme.records.intake.samples import preview_samples
from programme.records.intake.table import Table, table_of
from programme.records.intake.workers import preview_workers
from programme.records.models import ImportBatch
from programme.roster.actions import add_workers, reason_given
from programme.roster.models import Site, Worker
from programme.roster.permissions import require
from programme.rulepack.load import load

ACTS = {"workers": "roster", "samples": "samples", "fit_tests": "fit tests"}


def batch_code(batch: ImportBatch) -> str:
    """What every record of the batch carries."""
    return f"import-{batch.pk}"


def begin(read: FileRead, *, kind: str, file_name: str, site: Site, by: User) -> ImportBatch:
    """Keep a file that was read; nothing of it is stored as records yet.

    Raises:
        PermissionDenied: `by` may not bring in that kind at the site.
    """
    require(by, ACTS[kind], site)
    return ImportBatch.objects.create(
        site=site,
        kind=kind,
        file_name=file_name[:200],
        sha256=read.sha256,
        table=read.table,
        reading=read.reading,
        started_by=by.username,
    )


def stored_before(batch: ImportBatch) -> ImportBatch | None:
    """The batch of the same bytes that was stored before and not undone, if there is one."""
    same = ImportBatch.objects.at(batch.site).filter(
        sha256=batch.sha256, kind=batch.kind, stored_at__isnull=False, undone_at=None
    )
    return same.exclude(pk=batch.pk).first()


def choose(batch: ImportBatch, answers: Mapping[str, Any]) -> None:
    """Keep how the file is to be read: sheet, encoding."""
    batch.reading = {**batch.reading, **answers}
    batch.save(update_fields=["reading"])


def match(batch: ImportBatch, matching: Matching) -> None:
    """Keep which column means what."""
    batch.matching = matching.to_json()
    batch.save(update_fields=["matching"])


def table_in(batch: ImportBatch) -> Table:
    """The batch's table, as it is to be read."""
    return table_of(batch.table, batch.reading)


def judge(batch: ImportBatch) -> Preview:
    """Every row as it will be stored, judged against what stands now."""
    table, matching = table_in(batch), Matching.from_json(batch.matching)
    site, today = batch.site, batch.site.today()
    if batch.kind == ImportBatch.Kind.WORKERS:
        return preview_workers(table, matching, site=site, today=today)
    if batch.kind == ImportBatch.Kind.SAMPLES:
        return preview_samples(table, matching, site=site, today=today)
    pack = load(site.rule_pack)
    return preview_fit_tests(
        table, matching, site=site, today=today, pack=pack, batch=batch_code(batch)
    )


def _store_rows(batch: ImportBatch, preview: Preview, by: User) -> None:
    records = [row.record for row in preview.new]
    code = batch_code(batch)
    if batch.kind == ImportBatch.Kind.WORKERS:
        add_workers(records, site=batch.site, by=by, says=f"from file {batch.file_name}")
        batch.reading = {**batch.reading, "workers": [worker.pk for worker in records]}
    elif batch.kind == ImportBatch.Kind.SAMPLES:
        record_samples(records, by=by, site=batch.site, batch=code)
    else:
        record_fit_tests(records, by=by, site=batch.site)


def _open(batch: ImportBatch) -> ImportBatch:
    """The batch, locked for this transaction."""
    return ImportBatch.objects.select_for_update().select_related("site").get(pk=batch.pk)


@transaction.atomic
def store(batch: ImportBatch, *, by: User, leave_out_bad: bool = False) -> Preview:
    """Store every new row of the batch, all or none.

    Args:
        batch: matched before.
        by: who confirms.
        leave_out_bad: whether rows that cannot be stored may be left out.

    Returns:
        The preview that was stored.

    Raises:
        PermissionDenied: `by` may not bring in that kind at the site.
        ValueError: stored before, nothing to store, or rows are bad and were not to be left out.
    """
    batch = _open(batch)
    require(by, ACTS[batch.kind], batch.site)
    if batch.stored_at is not None:
        raise ValueError(f"{batch}: stored on {batch.stored_at:%Y-%m-%d}; it is not stored twice")
    preview = judge(batch)
    if preview.bad and not leave_out_bad:
        raise ValueError(
            f"{len(preview.bad)} rows cannot be stored; correct them, or agree to leave them out"
        )
    if not preview.new:
        raise ValueError("There is no new row to store")
    _store_rows(batch, preview, by)
    batch.stored_at, batch.rows_stored = timezone.now(), len(preview.new)
    batch.save(update_fields=["stored_at", "rows_stored", "reading"])
    ledger.enter(
        "file brought in",
        chain=batch.site.code,
        of=batch,
        by=by.username,
        says=f"{batch}: {batch.rows_stored} rows stored, {len(preview.known)} known, "
        f"{len(preview.bad)} left out",
        detail={"sha256": batch.sha256, "matching": batch.matching},
    )
    return preview


def _withdraw(
    batch: ImportBatch, model: type[Sample] | type[FitTest], *, by: User, reason: str
) -> int:
    rows = list(model.objects.at(batch.site).in_force().filter(batch=batch_code(batch)))
    model.objects.filter(pk__in=[row.pk for row in rows]).update(
        withdrawn_at=timezone.now(), change_reason=reason
    )
    noun = model._meta.verbose_name
    acts = [ledger.Act(f"{noun} withdrawn", row, reason=reason) for row in rows]
    ledger.enter_many(acts, chain=batch.site.code, by=by.username)
    return len(rows)


def _remove_workers(batch: ImportBatch, *, by: User, reason: str) -> int:
    """Take unused people off the roster again; whoever has a record keeps it and stays."""
    removed = 0
    for worker in Worker.objects.at(batch.site).filter(pk__in=batch.reading.get("workers", [])):
        act = ledger.Act("worker removed", Worker(pk=worker.pk), says=str(worker), reason=reason)
        try:
            with transaction.atomic():
                worker.delete()
        except ProtectedError:
            continue
        ledger.enter_many([act], chain=batch.site.code, by=by.username)
        removed += 1
    return removed


@transaction.atomic
def undo(batch: ImportBatch, *, by: User, reason: str) -> int:
    """Take a whole stored batch back: its records are withdrawn, with the reason.

    People are removed only while nothing refers to them.

    Returns:
        How many records were taken back.

    Raises:
        PermissionDenied: `by` may not bring in that kind at the site.
        ValueError: not stored, undone before, or no reason.
    """
    batch = _open(batch)
    require(by, ACTS[batch.kind], batch.site)
    reason = reason_given(reason)
    if batch.stored_at is None or batch.undone_at is not None:
        raise ValueError(f"{batch}: it does not stand, so it cannot be undone")
    if batch.kind == ImportBatch.Kind.WORKERS:
        taken = _remove_workers(batch, by=by, reason=reason)
    else:
        model = Sample if batch.kind == ImportBatch.Kind.SAMPLES else FitTest
        taken = _withdraw(batch, model, by=by, reason=reason)
    batch.undone_at = timezone.now()
    batch.save(update_fields=["undone_at"])
    ledger.enter(
        "file taken back",
        chain=batch.site.code,
        of=batch,
        by=by.username,
        says=f"{batch}: {taken} of {batch.rows_stored} rows taken back",
        reason=reason,
    )
    return taken
