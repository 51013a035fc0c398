"""What may be done to respirators: check, write, enter in the ledger."""

from collections.abc import Iterable, Sequence
from datetime import date

from django.contrib.auth.models import User
from django.db import IntegrityError, transaction
from django.db.models import ProtectedError

from programme.equipment.fitting import misfits
from programme.equipment.models import (
    Assembly,
    Element,
    Facepiece,
    FacepieceSize,
    FilterChange,
)
from programme.ledger import actions as ledger
from programme.ledger.changes import save_and_enter
from programme.roster.actions import reason_given, take_back
from programme.roster.models import Site
from programme.roster.permissions import require
from programme.rulepack.load import load

Part = Facepiece | Element | Assembly
NOUNS: dict[type, str] = {
    Facepiece: "facepiece",
    Element: "filter or cartridge",
    Assembly: "assembly",
}


def _save(part: Part, *, by: User) -> None:
    noun = NOUNS[type(part)]
    try:
        with transaction.atomic():
            save_and_enter(part, noun=noun, chain=part.site.code, by=by.username)
    except IntegrityError as error:
        raise ValueError(
            f"Name: the site has a {noun} of the name {part.name} already, or a figure is out of "
            "range"
        ) from error


def _set_sizes(facepiece: Facepiece, labels: Sequence[str]) -> list[str]:
    """Make the sizes these, in this order; returns what was done in words."""
    known = {size.label: size for size in facepiece.sizes.all()}
    done = []
    for label in set(known) - set(labels):
        try:
            known[label].delete()
        except ProtectedError as error:
            raise ValueError(
                f"Sizes: {label} is not allowed to go; fit tests or crews rest on it"
            ) from error
        done.append(f"size {label} taken off")
    for order, label in enumerate(labels):
        size = known.get(label)
        if size is None:
            FacepieceSize.objects.create(facepiece=facepiece, label=label, order=order)
            done.append(f"size {label} added")
        elif size.order != order:
            size.order = order
            size.save(update_fields=["order"])
    return done


@transaction.atomic
def save_facepiece(facepiece: Facepiece, *, sizes: Sequence[str], by: User) -> Facepiece:
    """Add or change a facepiece and its sizes.

    Args:
        facepiece: new or changed; its kind may not change once an assembly is made of it.
        sizes: labels, smallest first; at least one, none twice.
        by: who does it.

    Raises:
        PermissionDenied: `by` may not change respirators at that site.
        ValueError: no size, one twice, one in use that is left out, a name or kind not allowed.
    """
    require(by, "equipment", facepiece.site)
    if not sizes or len(set(sizes)) != len(sizes):
        raise ValueError("Sizes: give at least one, each once, for example S, M, L or one size")
    if facepiece.pk is not None:
        was = Facepiece.objects.get(pk=facepiece.pk)
        if was.kind != facepiece.kind and facepiece.assemblies.exists():
            raise ValueError(
                f"Kind: {facepiece.get_kind_display()} is not allowed; assemblies are made of it "
                f"as a {was.get_kind_display()}. Add another facepiece"
            )
    _save(facepiece, by=by)
    done = _set_sizes(facepiece, sizes)
    if done:
        ledger.enter(
            "facepiece sizes set",
            chain=facepiece.site.code,
            of=facepiece,
            by=by.username,
            says=f"{facepiece}: {', '.join(done)}",
            detail={"sizes": list(sizes)},
        )
    return facepiece


@transaction.atomic
def save_element(element: Element, *, by: User) -> Element:
    """Add or change a filter or cartridge.

    Raises:
        PermissionDenied: `by` may not change respirators at that site.
        ValueError: it filters nothing, its types are not of the site's rule pack, an assembly it
            is part of would no longer belong together, or its name is taken.
    """
    require(by, "equipment", element.site)
    pack = load(element.site.rule_pack)
    if not (element.particulate_class or element.gas_elements):
        raise ValueError("Particulate class: none, and no gas type; it must be one or both")
    if element.particulate_class:
        pack.particulate_filter(element.particulate_class)
    for one in element.gas_elements:
        pack.gas_element(one)
    _save(element, by=by)
    for assembly in element.assemblies.filter(withdrawn_on=None).select_related("facepiece"):
        assembly.element = element
        found = misfits(assembly, pack)
        if found:
            raise ValueError(f"{assembly} would no longer belong together: {found[0].says}")
    return element


@transaction.atomic
def save_assembly(assembly: Assembly, *, by: User) -> Assembly:
    """Add or change an assembly whose parts belong together by the site's rule pack.

    Raises:
        PermissionDenied: `by` may not change respirators at that site.
        ValueError: a part of another site, parts that do not belong together, or a taken name.
    """
    require(by, "equipment", assembly.site)
    parts: Iterable[Part | None] = (assembly.facepiece, assembly.element)
    if any(part is not None and part.site_id != assembly.site_id for part in parts):
        raise ValueError(f"Facepiece: a part is not of {assembly.site}")
    found = misfits(assembly, load(assembly.site.rule_pack))
    if found:
        raise ValueError(" ".join(one.says for one in found))
    _save(assembly, by=by)
    return assembly


def _withdraw(part: Part, *, on: date, by: User, reason: str) -> None:
    rows = type(part)._default_manager.filter(pk=part.pk, withdrawn_on=None)
    if not rows.update(withdrawn_on=on):
        raise ValueError(f"{part} was withdrawn before")
    part.refresh_from_db()
    ledger.enter(
        f"{NOUNS[type(part)]} withdrawn",
        chain=part.site.code,
        of=part,
        by=by.username,
        says=f"{part}, from {on}",
        reason=reason,
    )


@transaction.atomic
def withdraw(part: Part, *, on: date, by: User, reason: str) -> list[Assembly]:
    """Withdraw a part from use from that day, and every assembly made of it.

    Args:
        part: a facepiece, an element or an assembly; it stays on file.
        on: first day on which it no longer counts.
        by: who does it.
        reason: why, in a few words.

    Returns:
        The assemblies that went with it (not `part` itself).

    Raises:
        PermissionDenied: `by` may not change respirators at that site.
        ValueError: withdrawn before, or no reason.
    """
    require(by, "equipment", part.site)
    reason = reason_given(reason)
    _withdraw(part, on=on, by=by, reason=reason)
    if isinstance(part, Assembly):
        return []
    gone = list(part.assemblies.filter(withdrawn_on=None).select_related("site"))
    for assembly in gone:
        _withdraw(assembly, on=on, by=by, reason=f"{part} withdrawn: {reason}")
    return gone


def _refuse_twin(change: FilterChange) -> None:
    twins = FilterChange.objects.in_force().filter(
        worker=change.worker, assembly=change.assembly, fitted_at=change.fitted_at
    )
    if twins.exists():
        raise ValueError(f"Fitted at: a change of {change} is already in the log")


@transaction.atomic
def record_filter_change(change: FilterChange, *, by: User) -> FilterChange:
    """Enter in the log that a worker fitted a new filter or cartridge.

    Raises:
        PermissionDenied: `by` may not record filter changes at that site.
        ValueError: worker and assembly are not of one site, there is nothing to change in the
            assembly, or the same change is in the log.
    """
    site: Site = change.worker.site
    require(by, "assign", site)
    if change.assembly.site_id != site.pk:
        raise ValueError(f"Assembly: {change.assembly} is not of {site}")
    if change.assembly.element_id is None:
        raise ValueError(f"Assembly: {change.assembly} has no filter or cartridge to change")
    _refuse_twin(change)
    change.recorded_by = by.username
    change.save(force_insert=True)
    ledger.enter("filter changed", chain=site.code, of=change, by=by.username)
    return change


@transaction.atomic
def withdraw_filter_change(change: FilterChange, *, by: User, reason: str) -> FilterChange:
    """Take a line out of the change log that should never have stood; it stays on file.

    Raises:
        PermissionDenied: `by` may not record filter changes at that site.
        ValueError: withdrawn before, or no reason.
    """
    site: Site = change.worker.site
    require(by, "assign", site)
    reason = reason_given(reason)
    take_back(change, reason=reason)
    ledger.enter(
        "filter change withdrawn", chain=site.code, of=change, by=by.username, reason=reason
    )
    return change
