"""What the figures of one fit test come to: overall fit factor, outcome, and the sentence for it.

Pure: the page, its preview and the import all judge by these few functions.
"""

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from statistics import fmean

from filtration.leak import overall_fit_factor
from programme.figures import down
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import PassLevel, Protocol

PASSED, FAILED, INCOMPLETE = "passed", "failed", "incomplete"
HIGHEST_FIT_FACTOR = 1e9
# A printed overall figure is rounded to two or three digits (common practice).
AGREES_WITHIN = 0.01
NOT_A_PROTECTION_FACTOR = (
    "A fit factor is measured on one face in one test; it is not a protection factor and "
    "promises no level of protection at work."
)


@dataclass(frozen=True)
class Slot:
    """One figure that a protocol asks for: exercise, reading, and whether it counts."""

    order: int
    exercise: str
    label: str
    reading: int = 1
    is_counted: bool = True

    @property
    def key(self) -> str:
        """Name of its box in a form and of its column in an import."""
        return f"ff_{self.order}_{self.reading}"


@dataclass(frozen=True)
class Judged:
    """What a test came to.

    Attributes:
        overall: harmonic mean of the counted figures; None where one is missing or none is due.
        outcome: "passed", "failed" or "incomplete".
        says: a sentence with the figure and the pass level.
        lowest: lowest counted figure, None if there is none.
    """

    overall: float | None
    outcome: str
    says: str
    lowest: float | None = None

    @property
    def is_passed(self) -> bool:
        return self.outcome == PASSED


def slots_of(protocol: Protocol) -> tuple[Slot, ...]:
    """Every figure that the protocol asks for, in its order; none for a qualitative protocol."""
    if not protocol.is_quantitative:
        return ()
    return tuple(
        Slot(
            order,
            exercise.id,
            exercise.name if exercise.readings == 1 else f"{exercise.name}, reading {reading}",
            reading,
            exercise.counted,
        )
        for order, exercise in enumerate(protocol.exercises, start=1)
        for reading in range(1, exercise.readings + 1)
    )


def allowed_protocols(pack: RulePack, facepiece_kind: str) -> tuple[Protocol, ...]:
    """The protocols by which the pack lets that kind of facepiece be tested, in its order."""
    found = []
    for protocol in pack.protocols_for(facepiece_kind):
        level = pack.pass_level(facepiece_kind, protocol.method)
        if level is not None and level.allowed:
            found.append(protocol)
    return tuple(found)


def judge_exercises(
    protocol: Protocol, fit_factors: Sequence[float | None], level: PassLevel
) -> Judged:
    """Judge a quantitative test by its figures.

    Args:
        protocol: which figures count.
        fit_factors: one for each of `slots_of(protocol)`, in order; None where not measured.
        level: the pass level of the facepiece tested.

    Returns:
        `incomplete` while a counted figure is missing, whatever the others show.

    Raises:
        ValueError: not as many figures as the protocol has, or one outside 1 to 1e9 or NaN.

    Source: harmonic mean 29 CFR 1910.134 App. A I.C.7(d) (verified).
    """
    if level.min_fit_factor is None:
        raise ValueError(f"level: none for a {level.facepiece} tested by {protocol.name}")
    slots = slots_of(protocol)
    if len(fit_factors) != len(slots):
        raise ValueError(
            f"fit_factors: {len(fit_factors)} given; {protocol.name} has {len(slots)} figures"
        )
    for slot, figure in zip(slots, fit_factors, strict=True):
        if figure is not None and not 1 <= figure <= HIGHEST_FIT_FACTOR:
            raise ValueError(f"{slot.label}: {figure} is not allowed; 1 to 1 000 000 000")
    pairs = zip(slots, fit_factors, strict=True)
    counted = [(slot, figure) for slot, figure in pairs if slot.is_counted]
    missing = [slot.label for slot, figure in counted if figure is None]
    figures = [figure for _, figure in counted if figure is not None]
    if missing or not figures:
        return Judged(None, INCOMPLETE, _missing(missing), min(figures, default=None))
    known = [(slot.label, figure) for slot, figure in counted if figure is not None]
    least_in_each = level.min_fit_factor if level.each_exercise_must_pass else None
    return _against(known, least=level.min_fit_factor, least_in_each=least_in_each)


def _missing(labels: Sequence[str]) -> str:
    if not labels:
        return "Incomplete: the protocol has no exercise that counts."
    return f"Incomplete: no figure for {', '.join(labels)}. An incomplete test is never a pass."


def _against(
    figures: Sequence[tuple[str, float]], *, least: float, least_in_each: float | None
) -> Judged:
    overall = float(overall_fit_factor([figure for _, figure in figures]))
    label, lowest = min(figures, key=lambda pair: pair[1])
    against = f"{down(overall)} against {down(least)}"
    if overall >= least and least_in_each is not None and not lowest >= least_in_each:
        says = (
            f"Failed: {against} overall, but {label} reached {down(lowest)} and every exercise "
            f"must reach {down(least_in_each)}."
        )
        return Judged(overall, FAILED, says, lowest)
    outcome = PASSED if overall >= least else FAILED
    return Judged(overall, outcome, f"{outcome.capitalize()}, {against}.", lowest)


def judge_qualitative(*, is_passed: bool | None) -> Judged:
    """Judge a qualitative test by what the tester saw; None is incomplete."""
    if is_passed is None:
        return Judged(None, INCOMPLETE, "Incomplete: neither passed nor failed is ticked.")
    outcome = PASSED if is_passed else FAILED
    return Judged(None, outcome, f"{outcome.capitalize()} (qualitative test).")


def disagreement(reported: float | None, judged: Judged, figures: Sequence[float]) -> str:
    """How a reported overall figure disagrees with the worked-out one; empty if it does not."""
    if reported is None or judged.overall is None:
        return ""
    if abs(reported - judged.overall) <= AGREES_WITHIN * judged.overall:
        return ""
    hint = ""
    if figures and abs(reported - fmean(figures)) <= AGREES_WITHIN * fmean(figures):
        hint = " It is the arithmetic mean, which overstates the fit."
    return (
        f"reported {down(reported)}, worked out {down(judged.overall)} from the exercises; the "
        f"worked-out figure governs.{hint}"
    )


def fingerprint_of(
    *,
    size_id: int,
    tested_on: date,
    protocol: str,
    fit_factors: Sequence[float | None],
    outcome: str,
) -> str:
    """What makes two lines of one worker the same test."""
    figures = ",".join("-" if figure is None else repr(float(figure)) for figure in fit_factors)
    text = f"{size_id}|{tested_on.isoformat()}|{protocol}|{figures}|{outcome}"
    return hashlib.sha256(text.encode()).hexdigest()
