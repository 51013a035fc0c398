"""What stands in the way of a fit test, said before the first figure is typed."""

from datetime import date

from programme.equipment.models import Facepiece
from programme.roster.models import Clearance, SealNote, Worker
from programme.rulepack.pack import RulePack


def _clearance(worker: Worker, on: date) -> str:
    newest = worker.clearances.in_force().filter(decided_on__lte=on).first()
    if newest is None:
        return f"{worker.name} has no clearance; the evaluation comes before the test."
    if newest.outcome == Clearance.Outcome.NOT_ABLE:
        return f"{worker.name} is not cleared; ask the programme administrator."
    if newest.expires_on is not None and newest.expires_on <= on:
        return f"{worker.name}'s clearance was to be reviewed by {newest.expires_on}."
    return ""


def _seal(worker: Worker, on: date) -> str:
    notes = worker.seal_notes.in_force().filter(noted_on__lte=on)
    newest = notes.exclude(kind=SealNote.Kind.FACE_CHANGE).first()
    if newest is not None and newest.kind == SealNote.Kind.FACIAL_HAIR:
        return (
            f"Facial hair across the seal was noted on {newest.noted_on}; no test while hair "
            "crosses the seal."
        )
    return ""


def hindrances(worker: Worker, facepiece: Facepiece, *, pack: RulePack, on: date) -> list[str]:
    """What stands in the way of testing that worker on that facepiece on that day; may be empty."""
    found = [_clearance(worker, on), _seal(worker, on)]
    if worker.active_to is not None and worker.active_to <= on:
        found.append(f"{worker.name} no longer works here from {worker.active_to}.")
    if worker.wears_spectacles and facepiece.kind == "full_facepiece":
        found.append("Wears spectacles: a full facepiece needs its own lens insert.")
    if facepiece.withdrawn_on is not None and facepiece.withdrawn_on <= on:
        found.append(f"{facepiece} was withdrawn on {facepiece.withdrawn_on}.")
    return [says for says in found if says]
