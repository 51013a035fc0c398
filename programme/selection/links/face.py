"""Face: who on the crew may wear it today?"""

from dataclasses import dataclass
from datetime import date, timedelta

from programme.equipment.models import Assembly
from programme.figures import down, near
from programme.roster.models import Clearance, SealNote, WorkRate
from programme.roster.months import months_after
from programme.rulepack.rows import RespiratorClass
from programme.selection.chain import (
    DUE_SOON,
    MEDICAL,
    PLAN,
    CrewVerdict,
    Link,
    Mismatch,
    Remedy,
    Row,
    Working,
    state_of,
)
from programme.selection.facts import CrewFact, FitFact, TaskFacts
from programme.selection.links.filter import Schedule
from programme.selection.links.ratio import Demand
from programme.selection.links.words import Finder

WORK_ORDER = [choice.value for choice in WorkRate]


@dataclass(frozen=True)
class Until:
    """A day on which something of this worker lapses, and what."""

    day: date
    what: str


class _Wearer:
    """Judges one member of the crew for the whole of the shift."""

    def __init__(self, facts: TaskFacts, member: CrewFact, asked: Demand) -> None:
        self.facts, self.member, self.asked = facts, member, asked
        self.pack, self.worker, self.last = facts.pack, member.worker, facts.last_day
        self.find = Finder(facts.pack, "Face")
        self.found: list[Mismatch] = []
        self.until: list[Until] = []
        self.fit: FitFact | None = None

    def say(self, code: str, says: str, *remedies: Remedy, severity: str = "stop", **more) -> None:
        make = self.find.stop if severity == "stop" else self.find.fix
        line = f"{self.worker.name}: {says}"
        one = make(
            code,
            line,
            *remedies,
            worker_id=self.worker.id,
            worker=self.worker.name,
            **more,
        )
        self.found.append(one)

    def judge(self) -> None:
        assembly = self.member.assembly
        crew = Remedy("Change the crew", "selection:crew", (self.facts.task.pk,))
        left = self.worker.active_to
        if self.worker.active_from > self.facts.on or (left and left <= self.last):
            self.say(
                "worker-inactive",
                "does not work here on that day.",
                crew,
                clause="programme",
            )
        self.medical(assembly)
        self.training(assembly)
        if assembly is None:
            self.say(
                "crew-assembly",
                "no assembly is recorded.",
                crew,
                clause="class-missing",
            )
            return
        if assembly.pk not in {one.pk for one in self.facts.assigned}:
            says = f"wears {assembly.name}, which is not assigned to this task."
            self.say(
                "crew-other-assembly",
                says,
                crew,
                severity="fix",
                clause="class-missing",
            )
        if assembly.facepiece.is_tight:
            self.seal()
            self.fit_test(assembly)

    def _of_class(self, assembly: Assembly | None) -> RespiratorClass | None:
        return self.pack.find_class(assembly.respirator_class) if assembly else None

    def medical(self, assembly: Assembly | None) -> None:
        """Able, and within the limits in work terms."""
        one = self.worker.clearance
        record = Remedy("Record a clearance", "roster:clearance_add", (self.worker.id,))
        if one is None:
            self.say("medical-missing", "no medical clearance.", record)
            return
        if one.outcome == Clearance.Outcome.NOT_ABLE:
            self.say("medical-not-able", "not cleared for respirator use.", record)
            return
        if one.expires_on:
            self.until.append(Until(one.expires_on, "clearance"))
            if self.last >= one.expires_on:
                says = f"clearance ran out on {one.expires_on}."
                self.say("medical-expired", says, record)
        reason = self._beyond(one, self._of_class(assembly))
        if reason:
            self.say(
                "medical-limits",
                f"the clearance does not cover this: {reason}.",
                record,
            )

    def _beyond(self, one: Clearance, of_class: RespiratorClass | None) -> str:
        task = self.facts.task
        limits = (one.heaviest_work, one.max_hours_a_shift)
        if one.outcome == Clearance.Outcome.ABLE_WITH_LIMITS and not (
            one.no_negative_pressure or one.no_scba or any(limits)
        ):
            return "its limits are not recorded"
        if one.no_negative_pressure and of_class and of_class.is_negative_pressure:
            return "no negative-pressure respirator"
        if one.no_scba and of_class and of_class.family == "scba":
            return "no self-contained apparatus"
        if one.heaviest_work and WORK_ORDER.index(task.work_rate) > WORK_ORDER.index(
            one.heaviest_work
        ):
            return f"work up to {one.get_heaviest_work_display()}"
        if one.max_hours_a_shift is not None and not task.wear_h_per_shift <= one.max_hours_a_shift:
            return f"up to {near(one.max_hours_a_shift)} h a shift"
        return ""

    def training(self, assembly: Assembly | None) -> None:
        one = self.worker.training
        record = Remedy("Record training", "roster:training_add", (self.worker.id,))
        if one is None or not one.is_demonstrated:
            self.say("training-missing", "no respirator training.", record)
            return
        expires = months_after(one.trained_on, self._interval("training"))
        self.until.append(Until(expires, "training"))
        if self.last >= expires:
            self.say("training-expired", f"training ran out on {expires}.", record)
        of_class = self._of_class(assembly)
        if one.families and of_class and of_class.family not in one.families:
            says = f"training does not cover {of_class.family.replace('_', '-')} respirators."
            self.say("training-type", says, record)

    def _interval(self, kind: str) -> int:
        own = getattr(self.facts.site, f"{kind}_interval_months")
        law = self.pack.interval(kind).months
        # A site may tighten the law, never loosen it.
        return min(value for value in (own, law) if value) if (own or law) else 0

    def seal(self) -> None:
        note = self.worker.hair_note
        if note is not None and note.kind == SealNote.Kind.FACIAL_HAIR:
            shave = Remedy("Note a clear face", "roster:seal_note_add", (self.worker.id,))
            loose = Remedy(
                "Offer a loose-fitting respirator",
                "selection:crew",
                (self.facts.task.pk,),
            )
            says = f"facial hair at the seal, noted {note.noted_on}."
            self.say("facial-hair", says, shave, loose)

    def fit_test(self, assembly: Assembly) -> None:
        """A passed test, in date, on this facepiece and size, high enough for it."""
        book = Remedy("Record a fit test", "fit:test_add", (), f"?worker={self.worker.id}")
        if self.member.size_id is None or self.member.size_facepiece_id != assembly.facepiece_id:
            crew = Remedy("Choose the size", "selection:crew", (self.facts.task.pk,))
            self.say(
                "size-missing",
                f"no size of {assembly.facepiece.name} is recorded.",
                crew,
                clause="fit-size",
            )
            return
        same = [t for t in self.worker.fit_tests if t.size_id == self.member.size_id]
        if not same:
            self._none_on_size(assembly, book)
            return
        self.fit = same[0]
        self._outcome(self.fit, assembly, book)
        changed = self.worker.face_changed_on
        if changed and changed > self.fit.tested_on:
            self.say(
                "face-changed",
                f"the face changed on {changed}, after the fit test.",
                book,
            )

    def _none_on_size(self, assembly: Assembly, book: Remedy) -> None:
        passed = [
            test
            for test in self.worker.fit_tests
            if test.facepiece_id == assembly.facepiece_id and test.outcome == "passed"
        ]
        if not passed:
            self.say("fit-missing", f"no fit test on {assembly.facepiece.name}.", book)
            return
        sizes = ", ".join(sorted({test.size for test in passed}))
        swap = Remedy(f"Assign size {passed[0].size}", "selection:crew", (self.facts.task.pk,))
        says = f"fit test passed on size {sizes}, size {self.member.size} assigned."
        self.say("fit-size", says, swap, book)

    def _outcome(self, test: FitFact, assembly: Assembly, book: Remedy) -> None:
        protocol = self.pack.find_protocol(test.protocol)
        if test.outcome != "passed" or protocol is None:
            code = "fit-incomplete" if test.outcome == "incomplete" else "fit-low"
            says = f"the last fit test, {test.tested_on}, was not passed ({test.outcome})."
            if protocol is None:
                code, says = (
                    "fit-protocol",
                    f"its protocol is not one of {self.pack.title}.",
                )
            self.say(code, says, book)
            return
        if assembly.facepiece.kind not in protocol.applies_to:
            says = f"{protocol.name} is no test of a {assembly.facepiece.get_kind_display()}."
            self.say("fit-protocol", says, book, source=protocol.source, sure=protocol.sure)
        wanted = sum(one.readings for one in protocol.counted_exercises)
        if protocol.is_quantitative and test.counted < wanted:
            says = f"the fit test of {test.tested_on} has {test.counted} of {wanted} figures."
            self.say("fit-incomplete", says, book)
        expires = months_after(test.tested_on, self._interval("fit"))
        self.until.append(Until(expires, "fit test"))
        if self.last >= expires:
            self.say("fit-expired", f"fit test ran out on {expires}.", book)
        self._level(test, assembly, protocol.method, book)

    def _level(self, test: FitFact, assembly: Assembly, method: str, book: Remedy) -> None:
        level = self.pack.pass_level(assembly.facepiece.kind, method)
        is_quantitative = method == "quantitative"
        # A level that is not known is no permission.
        has_rule = level is not None and not (is_quantitative and level.min_fit_factor is None)
        if level is None or not level.allowed or not has_rule:
            says = f"a {method} test does not count on a {assembly.facepiece.get_kind_display()}."
            self.say("fit-method", says, book)
            return
        least = level.min_fit_factor
        if is_quantitative and least is not None:
            overall, lowest = test.overall_fit_factor, test.lowest_fit_factor
            if overall is None or not overall >= least:
                says = f"fit factor {down(overall)} is under {down(least)}."
                self.say("fit-low", says, book, source=level.source, sure=level.sure)
            elif level.each_exercise_must_pass and not (lowest or 0) >= least:
                says = f"one exercise gave {down(lowest)}, under {down(least)}."
                self.say("fit-exercise-low", says, book, source=level.source, sure=level.sure)
        of_class = self._of_class(assembly)
        cap = level.cap_for(of_class) if of_class else None
        # Not `>`: an unknown ratio is not under the cap.
        if cap is not None and not self.asked.ratio <= cap:
            says = f"a {method} test supports APF {down(cap)} at most here."
            self.say("apf-cap-fit-method", says, book, source=level.source, sure=level.sure)


def verdict(
    facts: TaskFacts,
    member: CrewFact,
    asked: Demand,
    *,
    task_breaks: bool,
    schedule: Schedule,
) -> CrewVerdict:
    """May this member start: nothing against the person, the filter or the task itself."""
    wearer = _Wearer(facts, member, asked)
    wearer.judge()
    of_filter = schedule.of(member)
    found = (*wearer.found, *of_filter.mismatches)
    against = [one for one in found if one.severity != PLAN]
    first = min(wearer.until, key=lambda one: one.day, default=None)
    name = member.assembly.name if member.assembly else "nothing recorded"
    size = f", size {member.size}" if member.size else ""
    return CrewVerdict(
        worker_id=member.worker.id,
        worker=member.worker.name,
        personnel_number=member.worker.personnel_number,
        may_start=not against and not task_breaks,
        wears=f"{name}{size}",
        fit_factor=wearer.fit.overall_fit_factor if wearer.fit else None,
        good_until=first.day if first else None,
        good_until_says=first.what if first else "",
        filter_due_on=of_filter.due_on,
        filter_says=of_filter.says,
        mismatches=found,
        is_medical=any(one.code.startswith(MEDICAL) for one in against),
    )


def judge(facts: TaskFacts, crew: tuple[CrewVerdict, ...]) -> Link:
    """The Face link of the whole crew; people only, the filters have a link of their own."""
    find = Finder(facts.pack, "Face")
    if not crew:
        remedy = Remedy("Put workers on the task", "selection:crew", (facts.task.pk,))
        says = "Nobody is on this task."
        missing = find.stop("crew-empty", says, remedy, clause="programme")
        return Link("Face", state_of((missing,)), "nobody", "no crew recorded", (missing,))
    found = tuple(m for one in crew for m in one.mismatches if m.link == "Face")
    may = sum(
        1
        for one in crew
        if not any(m.link == "Face" and m.severity != PLAN for m in one.mismatches)
    )
    days = [one.good_until for one in crew if one.good_until and one.good_until > facts.on]
    first = min(days, default=None)
    soon = first is not None and first - facts.on <= timedelta(days=facts.site.due_soon_days)
    state = state_of(found, is_due_soon=soon)
    basis = f"next to lapse {first}" if first and state == DUE_SOON else "cleared, trained, fitted"
    if may < len(crew):
        basis = f"{len(crew) - may} may not wear it"
    working = _working(facts)
    return Link(
        "Face",
        state,
        f"{may} of {len(crew)}",
        basis,
        found,
        (working,),
        due_on=first,
        due_says="first fit test, training or clearance to lapse",
    )


def _working(facts: TaskFacts) -> Working:
    pack, rows = facts.pack, []
    for kind in ("fit", "training"):
        law, own = pack.interval(kind), getattr(facts.site, f"{kind}_interval_months")
        text = f"{law.months} months" if law.months else "no fixed time"
        if own:
            text += f"; the site's own: {own} months"
        rows.append(Row(f"{kind.capitalize()} interval", text, law.source, law.sure))
    for kind in sorted({a.facepiece.kind for a in facts.assigned if a.facepiece.is_tight}):
        level = pack.pass_level(kind, "quantitative")
        if level is not None and level.min_fit_factor is not None:
            each = ", in every exercise" if level.each_exercise_must_pass else ", overall"
            rows.append(
                Row(
                    f"Pass level, {kind.replace('_', ' ')}",
                    f"{down(level.min_fit_factor)}{each}",
                    level.source,
                    level.sure,
                )
            )
    rows.append(Row("Judged through", f"the end of the shift, {facts.last_day}"))
    clause = pack.clause("fit-missing")
    return Working(
        title="Who may wear it",
        formula="overall fit factor = number of counted exercises ÷ sum of (1 ÷ fit factor)",
        rows=tuple(rows),
        source=clause.source,
        sure=clause.sure,
        note="A fit factor is not a protection factor: the class keeps its assigned factor.",
    )
