"""Adding or changing a record so that the ledger keeps what stood before."""

from typing import Any

from django.db import models

from programme.ledger import actions as ledger


def changes_of(before: models.Model, after: models.Model) -> dict[str, list[Any]]:
    """Field -> [before, after] as text, for every field that differs."""
    found = {}
    for field in after._meta.concrete_fields:
        old, new = getattr(before, field.attname), getattr(after, field.attname)
        if old != new:
            found[field.name] = [str(old), str(new)]
    return found


def save_and_enter(record: models.Model, *, noun: str, chain: str, by: str) -> bool:
    """Add the record, or save what was changed of it; call it inside a transaction.

    Args:
        record: new, or with changed fields.
        noun: what it is called in the ledger, e.g. "task".
        chain: the site's code.
        by: user name.

    Returns:
        Whether anything was written.
    """
    if record.pk is None:
        record.save(force_insert=True)
        ledger.enter(f"{noun} added", chain=chain, of=record, by=by)
        return True
    before = type(record)._default_manager.select_for_update().get(pk=record.pk)
    changes = changes_of(before, record)
    if not changes:
        return False
    record.save(force_update=True)
    told = (
        f"{type(record)._meta.get_field(name).verbose_name} {old or 'empty'} to {new or 'empty'}"  # type: ignore[union-attr]
        for name, (old, new) in changes.items()
    )
    ledger.enter(
        f"{noun} changed",
        chain=chain,
        of=record,
        by=by,
        says=f"{record}: {', '.join(told)}",
        detail=changes,
    )
    return True
