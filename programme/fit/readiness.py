"""What stands in the way of a fit test, said before the first figure is typed."""

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date

from programme.equipment.models import Facepiece, FacepieceKind
from programme.roster.models import Clearance, SealNote, Worker
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import Clause


@dataclass(frozen=True)
class Hindrance:
    """One thing in the way; `clause` is the rule it rests on, None for plain sense."""

    says: str
    clause: Clause | None = None


def _clearance(worker: Worker, *, pack: RulePack, on: date) -> Iterator[Hindrance]:
    newest = worker.clearances.in_force().filter(decided_on__lte=on).first()
    if newest is None:
        says = f"{worker.name} has no clearance on file; the evaluation comes before the test."
        yield Hindrance(says, pack.clause("fit-before-clearance"))
    elif newest.outcome == Clearance.Outcome.NOT_ABLE:
        says = f"{worker.name} is not cleared. Ask the programme administrator."
        yield Hindrance(says, pack.clause("medical-not-able"))
    elif newest.expires_on is not None and newest.expires_on <= on:
        says = f"{worker.name}'s clearance was to be reviewed by {newest.expires_on}."
        yield Hindrance(says, pack.clause("medical-expired"))


def _seal(worker: Worker, *, pack: RulePack, on: date) -> Iterator[Hindrance]:
    notes = worker.seal_notes.in_force().filter(noted_on__lte=on)
    newest = notes.exclude(kind=SealNote.Kind.FACE_CHANGE).first()
    if newest is not None and newest.kind == SealNote.Kind.FACIAL_HAIR:
        says = f"Facial hair across the seal was noted on {newest.noted_on}: no test until shaved."
        yield Hindrance(says, pack.clause("facial-hair"))


def hindrances(
    worker: Worker, facepiece: Facepiece, *, pack: RulePack, on: date
) -> list[Hindrance]:
    """What stands in the way of testing that worker on that facepiece that day; may be empty."""
    found = [*_clearance(worker, pack=pack, on=on), *_seal(worker, pack=pack, on=on)]
    if worker.active_to is not None and worker.active_to <= on:
        found.append(Hindrance(f"{worker.name} no longer works here from {worker.active_to}."))
    if facepiece.withdrawn_on is not None and facepiece.withdrawn_on <= on:
        found.append(Hindrance(f"{facepiece} was withdrawn on {facepiece.withdrawn_on}."))
    if worker.wears_spectacles and facepiece.kind == FacepieceKind.FULL:
        says = f"{worker.name} wears spectacles: a full facepiece needs its own lens insert."
        found.append(Hindrance(says, pack.clause("spectacles")))
    return found
