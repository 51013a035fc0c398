"""What may be done to fit tests: record, correct by replacement, withdraw; one or many."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import date

from django.contrib.auth.models import User
from django.db import IntegrityError, transaction

from programme.equipment.models import FacepieceSize
from programme.fit.models import FitExercise, FitTest
from programme.fit.outcome import (
    Judged,
    allowed_protocols,
    fingerprint_of,
    judge_exercises,
    judge_qualitative,
    slots_of,
)
from programme.ledger import actions as ledger
from programme.roster.actions import reason_given, stand_in, take_back
from programme.roster.models import Site, Worker
from programme.roster.permissions import require
from programme.rulepack.pack import RulePack


@dataclass(frozen=True)
class Entered:
    """A fit test as it was entered: by form, grid or file.

    Attributes:
        fit_factors: one for each figure of the protocol (`slots_of`), None where not measured;
            empty for a qualitative protocol.
        is_passed: what the tester saw in a qualitative test; None for a quantitative one.
        as_reported: the overall figure as paper or file has it, kept as text.
    """

    worker: Worker
    size: FacepieceSize
    tested_on: date
    protocol: str
    fit_factors: tuple[float | None, ...] = ()
    is_passed: bool | None = None
    as_reported: str = ""
    element_used: str = ""
    tester: str = ""
    note: str = ""


@dataclass(frozen=True)
class Draft:
    """A fit test worked out and ready to be stored."""

    test: FitTest
    exercises: tuple[FitExercise, ...]
    judged: Judged


def judged(entered: Entered, *, pack: RulePack) -> Judged:
    """What the entered test comes to under that pack.

    Raises:
        ValueError: no such protocol, no pass level, or figures that do not fit the protocol.
    """
    protocol = pack.protocol(entered.protocol)
    kind = entered.size.facepiece.kind
    level = pack.pass_level(kind, protocol.method)
    if level is None or protocol not in allowed_protocols(pack, kind):
        raise ValueError(
            f"Protocol: {protocol.name} is not allowed for a "
            f"{entered.size.facepiece.get_kind_display()}"
        )
    if not protocol.is_quantitative:
        return judge_qualitative(is_passed=entered.is_passed)
    return judge_exercises(protocol, entered.fit_factors, level)


def drafted(entered: Entered, *, pack: RulePack, batch: str = "") -> Draft:
    """Work out the test: overall, outcome, exercises and fingerprint; nothing is stored.

    Raises:
        ValueError: as `judged`.
    """
    found = judged(entered, pack=pack)
    test = FitTest(
        worker=entered.worker,
        size=entered.size,
        tested_on=entered.tested_on,
        rule_pack=pack.name,
        protocol=entered.protocol,
        overall_fit_factor=found.overall,
        as_reported=entered.as_reported,
        outcome=found.outcome,
        element_used=entered.element_used,
        tester=entered.tester,
        note=entered.note,
        fingerprint=fingerprint_of(
            size_id=entered.size.pk,
            tested_on=entered.tested_on,
            protocol=entered.protocol,
            fit_factors=entered.fit_factors,
            outcome=found.outcome,
        ),
        batch=batch,
    )
    slots = slots_of(pack.protocol(entered.protocol))
    exercises = tuple(
        FitExercise(
            test=test,
            order=slot.order,
            exercise=slot.exercise,
            reading=slot.reading,
            fit_factor=figure,
            is_counted=slot.is_counted,
        )
        for slot, figure in zip(slots, entered.fit_factors, strict=True)
    )
    return Draft(test, exercises, found)


def recorded_already(worker: Worker, fingerprint: str) -> FitTest | None:
    """The standing test of that worker with these very figures, if there is one."""
    return FitTest.objects.in_force().filter(worker=worker, fingerprint=fingerprint).first()


def _require(drafts: Iterable[Draft], *, site: Site, by: User) -> None:
    require(by, "fit tests", site)
    for draft in drafts:
        if draft.test.worker.site_id != site.pk or draft.test.size.facepiece.site_id != site.pk:
            raise ValueError(f"{draft.test}: worker and facepiece must belong to {site}")


def _says(test: FitTest) -> str:
    return f"{test.worker.name}: {test.outcome} on {test.size}, {test.tested_on}"


def _store_exercises(drafts: Iterable[Draft]) -> None:
    rows = []
    for draft in drafts:
        for exercise in draft.exercises:
            exercise.test_id = draft.test.pk
            rows.append(exercise)
    FitExercise.objects.bulk_create(rows, batch_size=500)


@transaction.atomic
def record_fit_test(draft: Draft, *, by: User) -> FitTest:
    """Store one fit test with its exercises.

    Raises:
        PermissionDenied: `by` may not record fit tests at the worker's site.
        ValueError: worker and facepiece are of two sites, or the same test stands already.
    """
    site = draft.test.worker.site
    _require([draft], site=site, by=by)
    draft.test.recorded_by = by.username
    try:
        with transaction.atomic():
            draft.test.save(force_insert=True)
    except IntegrityError as error:
        raise ValueError(f"{draft.test}: this fit test is already recorded") from error
    _store_exercises([draft])
    ledger.enter(
        "fit test recorded", chain=site.code, of=draft.test, by=by.username, says=_says(draft.test)
    )
    return draft.test


@transaction.atomic
def record_fit_tests(drafts: Sequence[Draft], *, site: Site, by: User) -> list[FitTest]:
    """Store many fit tests of one site in one go, all or none.

    Raises:
        PermissionDenied: `by` may not record fit tests at that site.
        ValueError: one is of another site, or stands already.
    """
    _require(drafts, site=site, by=by)
    for draft in drafts:
        draft.test.recorded_by = by.username
    try:
        with transaction.atomic():
            tests = FitTest.objects.bulk_create([draft.test for draft in drafts], batch_size=500)
    except IntegrityError as error:
        raise ValueError(
            "Fit tests: one of them is already recorded; nothing was stored"
        ) from error
    _store_exercises(drafts)
    ledger.enter_many(
        [ledger.Act("fit test recorded", test, says=_says(test)) for test in tests],
        chain=site.code,
        by=by.username,
    )
    return tests


@transaction.atomic
def replace_fit_test(old: FitTest, draft: Draft, *, by: User, reason: str) -> FitTest:
    """Let a new test stand in for `old`, with the reason; both stay on file.

    Raises:
        PermissionDenied: `by` may not correct fit tests of that site.
        ValueError: the reason is blank or too short, `old` no longer stands, the worker differs,
            or the correction equals another test that stands.
    """
    site = old.worker.site
    _require([draft], site=site, by=by)
    reason = reason_given(reason)
    if draft.test.worker != old.worker:
        raise ValueError("Worker: a correction keeps the worker; withdraw the test instead")
    draft.test.recorded_by = by.username
    draft.test.batch = old.batch
    try:
        with transaction.atomic():
            stand_in(old, draft.test, reason=reason)
    except IntegrityError as error:
        raise ValueError(f"{draft.test}: this fit test is already recorded") from error
    _store_exercises([draft])
    ledger.enter(
        "fit test corrected",
        chain=site.code,
        of=old,
        by=by.username,
        says=f"{_says(old)}; now {_says(draft.test)}",
        reason=reason,
        detail={"replaced_by": draft.test.pk},
    )
    return draft.test


@transaction.atomic
def withdraw_fit_test(test: FitTest, *, by: User, reason: str) -> FitTest:
    """Withdraw a test that should never have stood, with the reason; it stays on file.

    Raises:
        PermissionDenied: `by` may not correct fit tests of that site.
        ValueError: the reason is blank or too short, or the test no longer stands.
    """
    site = test.worker.site
    require(by, "fit tests", site)
    reason = reason_given(reason)
    take_back(test, reason=reason)
    ledger.enter(
        "fit test withdrawn",
        chain=site.code,
        of=test,
        by=by.username,
        says=_says(test),
        reason=reason,
    )
    return test
