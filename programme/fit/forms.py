"""What is typed of a fit test: exactly the figures of its protocol, and where they came from."""

import re
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from typing import Any, cast

from crispy_forms.layout import Div, Submit
from django import forms
from django.db.models import Q
from django.urls import reverse

from programme.equipment.models import TIGHT_KINDS, FacepieceSize
from programme.fit.actions import Draft, Entered, drafted, judged, recorded_already
from programme.fit.models import FitTest
from programme.fit.outcome import (
    HIGHEST_FIT_FACTOR,
    Judged,
    Slot,
    allowed_protocols,
    disagreement,
    slots_of,
)
from programme.measured import shown_number
from programme.measured_fields import DayField, MeasuredField
from programme.roster.asking import AskingForm, future_refused
from programme.roster.models import Site, Worker, active_on
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import Protocol

ID = re.compile(r"[0-9]{1,18}")


@dataclass(frozen=True)
class Chosen:
    """Whom, on what size, by which protocol; and under which rules."""

    site: Site
    worker: Worker
    size: FacepieceSize
    protocol: Protocol
    pack: RulePack

    @property
    def query(self) -> str:
        """The choice as the query of an address."""
        return f"worker={self.worker.pk}&size={self.size.pk}&protocol={self.protocol.id}"


class ChoiceForm(forms.Form):
    """Worker, facepiece with size, and protocol; sent by GET, so the address keeps the choice."""

    worker = forms.ModelChoiceField(Worker.objects.none(), empty_label="choose a worker")
    size = forms.ModelChoiceField(
        FacepieceSize.objects.none(), label="Facepiece and size", empty_label="choose a size"
    )
    protocol = forms.ChoiceField(required=False)

    def __init__(self, data: Any, *, site: Site, pack: RulePack, on: date) -> None:
        super().__init__(data)
        self.site, self.pack = site, pack
        worker_box = cast(forms.ModelChoiceField, self.fields["worker"])
        size_box = cast(forms.ModelChoiceField, self.fields["size"])
        # Who has left, or what was withdrawn, is still there for a test entered late or corrected.
        worker_box.queryset = Worker.objects.at(site).filter(active_on(on) | self._asked("worker"))
        sizes = (
            FacepieceSize.objects.at(site)
            .filter(facepiece__kind__in=TIGHT_KINDS)
            .filter(Q(facepiece__withdrawn_on=None) | self._asked("size"))
            .select_related("facepiece")
            .order_by("facepiece__name", "order", "label")
        )
        size_box.queryset = sizes
        self.protocols = list(pack.protocols)
        kind = self._kind(sizes)
        if kind:
            self.protocols = list(allowed_protocols(pack, kind))
        cast(forms.ChoiceField, self.fields["protocol"]).choices = [
            (one.id, one.name) for one in self.protocols
        ]

    def _asked(self, name: str) -> Q:
        asked = str(self.data.get(name, ""))
        return Q(pk=int(asked)) if ID.fullmatch(asked) else Q(pk=None)

    def _kind(self, sizes: Any) -> str:
        asked = str(self.data.get("size", ""))
        size = next((one for one in sizes if str(one.pk) == asked), None)
        return size.facepiece.kind if size else ""

    def clean_protocol(self) -> Protocol | None:
        asked = self.cleaned_data["protocol"]
        return next((one for one in self.protocols if one.id == asked), None)

    def chosen(self) -> Chosen | None:
        """The whole choice, with the first allowed protocol where none was asked for."""
        if not self.is_bound or not self.is_valid():
            return None
        found = self.cleaned_data
        protocol = found["protocol"] or (self.protocols[0] if self.protocols else None)
        if protocol is None:
            self.add_error("size", "No protocol of the rule pack tests this kind of facepiece.")
            return None
        return Chosen(self.site, found["worker"], found["size"], protocol, self.pack)


class FigureField(MeasuredField):
    """A fit factor that is wanted; an empty box makes the test incomplete, not the form faulty."""

    def validate(self, value: Any) -> None:
        """Whatever could be read is taken."""


class FitTestForm(AskingForm):
    """The figures of one test in the order of its protocol; works out what they come to."""

    # The browser must let an unfinished test through; what must be there is checked here.
    use_required_attribute = False

    tested_on = DayField(label="Date of test", earliest=date(1970, 1, 1))
    tester = forms.CharField(max_length=120, label="Tested by")
    element_used = forms.CharField(
        max_length=120, required=False, label="Filter or adaptor used in the test"
    )
    as_reported = MeasuredField(
        label="Overall as reported",
        at_least=1,
        at_most=HIGHEST_FIT_FACTOR,
        required=False,
        help_text="only if paper or file gives one; the worked-out figure governs",
    )
    note = forms.CharField(max_length=300, required=False)

    def __init__(
        self, *args: Any, chosen: Chosen, today: date, old: FitTest | None = None, **kwargs: Any
    ) -> None:
        super().__init__(*args, **kwargs)
        self.chosen, self.today, self.old = chosen, today, old
        self.slots = slots_of(chosen.protocol)
        self.draft: Draft | None = None
        figures = Div(*self._add_figures(), css_class="row figures")
        last = ["as_reported", "note"] if self.slots else ["note"]
        if not self.slots:
            del self.fields["as_reported"]
        if old is not None:
            self.fields["reason"] = forms.CharField(
                label="Reason for the correction",
                max_length=1000,
                widget=forms.Textarea(attrs={"rows": 2}),
                help_text="both tests stay on file, with this reason",
            )
            last.append("reason")
        self.set_layout(
            Div("tested_on", "tester", "element_used", css_class="row"),
            figures,
            Div(*last, css_class="row"),
            submit="Record the correction" if old else "Record fit test",
            also=[Submit("work_out", "Work out", css_class="plain")],
        )
        self.helper.attrs = {
            "hx-post": f"{reverse('fit:preview', args=[chosen.site.code])}?{chosen.query}",
            "hx-trigger": "input delay:400ms",
            "hx-target": "#worked-out",
        }

    def _add_figures(self) -> list[str]:
        if not self.slots:
            self.fields["is_passed"] = forms.TypedChoiceField(
                label="Seen by the tester",
                required=False,
                choices=[("", "not finished"), ("yes", "passed"), ("no", "failed")],
                coerce=lambda text: text == "yes",
                empty_value=None,
            )
            return ["is_passed"]
        for slot in self.slots:
            self.fields[slot.key] = FigureField(
                label=slot.label,
                at_least=1,
                at_most=HIGHEST_FIT_FACTOR,
                required=slot.is_counted,
                help_text="" if slot.is_counted else "kept, does not count",
            )
        return [slot.key for slot in self.slots]

    def _figures(self) -> tuple[float | None, ...]:
        return tuple(self.cleaned_data.get(slot.key) for slot in self.slots)

    def _entered(self, tested_on: date) -> Entered:
        found = self.cleaned_data
        reported = found.get("as_reported")
        return Entered(
            worker=self.chosen.worker,
            size=self.chosen.size,
            tested_on=tested_on,
            protocol=self.chosen.protocol.id,
            fit_factors=self._figures(),
            is_passed=found.get("is_passed"),
            as_reported="" if reported is None else shown_number(reported),
            element_used=found.get("element_used", ""),
            tester=found.get("tester", ""),
            note=found.get("note", ""),
        )

    def worked_out(self) -> Judged | None:
        """What the figures typed so far come to; None while one of them cannot be read."""
        self.is_valid()
        if any(slot.key in self.errors for slot in self.slots):
            return None
        return judged(self._entered(self.today), pack=self.chosen.pack)

    @property
    def unreadable(self) -> list[str]:
        """What is wrong with the figures typed so far."""
        keys = [slot.key for slot in self.slots]
        return [str(message) for key in keys for message in self.errors.get(key, [])]

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        self._check_day(found.get("tested_on"))
        is_readable = not any(slot.key in self.errors for slot in self.slots)
        if found.get("tested_on") and is_readable:
            self.draft = drafted(self._entered(found["tested_on"]), pack=self.chosen.pack)
            self._check_figures(self.draft)
            self._check_repeat(self.draft)
        return found

    def _check_day(self, day: date | None) -> None:
        worker = self.chosen.worker
        if day is None:
            return
        if day > self.today:
            self.add_error(
                "tested_on", future_refused("Date of test", "tested_on", day=day, today=self.today)
            )
        elif worker.born_on and day <= worker.born_on:
            self.add_error(
                "tested_on",
                f"Date of test: {day} is not allowed; {worker.name} was born on {worker.born_on}.",
            )
        elif day < worker.active_from:
            self.ask(
                "tested_on",
                f"Date of test: {day} is before {worker.name}'s first day here, "
                f"{worker.active_from}. Is that so? Tick below.",
            )
        elif worker.active_to and day >= worker.active_to:
            self.ask(
                "tested_on",
                f"Date of test: {day} is after {worker.name} left, {worker.active_to}. "
                "Is that so? Tick below.",
            )

    def _check_figures(self, draft: Draft) -> None:
        figures = self._figures()
        counted = [
            figure
            for slot, figure in zip(self.slots, figures, strict=True)
            if slot.is_counted and figure is not None
        ]
        if self.slots and not counted:
            self.ask(
                self.slots[0].key,
                "No figure is entered. Store the test as incomplete? Tick below.",
            )
        says = disagreement(self.cleaned_data.get("as_reported"), draft.judged, counted)
        if says and not self.cleaned_data.get("note"):
            self.add_error("note", f"Note: say why the overall figures differ ({says})")

    def _check_repeat(self, draft: Draft) -> None:
        worker, test = self.chosen.worker, draft.test
        same = recorded_already(worker, test.fingerprint)
        if same is not None and same != self.old:
            self.add_error(
                None,
                f"This very test is on file already: {same}, recorded "
                f"{same.recorded_at:%Y-%m-%d} as number {same.pk}. Nothing was stored.",
            )
            return
        others = FitTest.objects.in_force().filter(
            worker=worker, size=test.size, tested_on=test.tested_on, protocol=test.protocol
        )
        if self.old is not None:
            others = others.exclude(pk=self.old.pk)
        other = others.first()
        if other is not None:
            self.ask(
                None,
                f"Another test of {worker.name} on {test.size} by the same protocol is on file for "
                f"{test.tested_on} ({other.outcome}, number {other.pk}). Is this a repeat? "
                "Tick below.",
            )


def initial_of(test: FitTest, slots: Iterable[Slot]) -> dict[str, Any]:
    """What a correction starts from: the test as it stands."""
    figures = {(row.order, row.reading): row.fit_factor for row in test.exercises.all()}
    found: dict[str, Any] = {
        "tested_on": test.tested_on,
        "tester": test.tester,
        "element_used": test.element_used,
        "as_reported": test.as_reported,
        "note": test.note,
        "is_passed": {"passed": "yes", "failed": "no"}.get(test.outcome, ""),
    }
    for slot in slots:
        found[slot.key] = figures.get((slot.order, slot.reading))
    return found
