"""What is typed about samples, and the form that asks back and reads a sample from its boxes."""

import hashlib
from collections.abc import Sequence
from datetime import date
from typing import Any

from crispy_forms.layout import Field, Submit
from django import forms
from django.http import QueryDict

from exposure.models import Agent, Sample, TaskAgent, Unit
from exposure.plausible import findings, former_results
from exposure.units import normalise
from programme.measured import Reading
from programme.measured_fields import DayField, MeasuredField, ResultField
from programme.roster.asking import AskingForm, with_offer
from programme.roster.models import Site, Worker

EARLIEST = date(1970, 1, 1)
UNIT_CHOICES = (
    ("", "choose"),
    ("mg/m3", "mg/m³"),
    ("ug/m3", "µg/m³"),
    ("ppm", "ppm"),
    ("ppb", "ppb"),
    ("f/cm3", "f/cm³ (fibres)"),
)
LARGEST = 1e6


class KeepingForm(AskingForm):
    """Asks, and keeps what was asked: a tick answers those questions, not ones not yet seen."""

    is_meant = forms.BooleanField(required=False, label="Keep it as typed")
    asked = forms.CharField(required=False, widget=forms.HiddenInput, max_length=64)

    def set_layout(self, *parts: Any, submit: str, also: Sequence[Submit] = ()) -> None:
        """Lay out the form with what was asked in a hidden box."""
        self._questions: list[tuple[str | None, str]] = []
        super().set_layout(*parts, Field("asked"), submit=submit, also=also)

    def ask(self, field: str | None, question: str) -> None:
        """Note a question; `settle` asks them all at once."""
        self._questions.append((field, question))

    def settle(self) -> None:
        """Ask what was noted, unless just these questions were asked before and the tick stands."""
        if not self._questions:
            return
        digest = hashlib.sha256(
            "\n".join(says for _, says in sorted(self._questions, key=str)).encode()
        ).hexdigest()
        if self.cleaned_data.get("is_meant") and self.cleaned_data.get("asked") == digest:
            return
        for field, says in self._questions:
            self.add_error(field, says)
        self._show_tick()
        data = QueryDict(mutable=True)
        data.update(self.data)
        data[self.add_prefix("asked")] = digest
        data.pop(self.add_prefix("is_meant"), None)
        self.data = data


def task_agents_at(site: Site) -> Any:
    """The similar exposure groups of a site, as a list to choose from."""
    rows = TaskAgent.objects.at(site).select_related("task__site", "agent")
    return rows.order_by("task__name", "agent__name", "fraction")


class GroupChoice(forms.ModelChoiceField):
    """A choice of task and agent; what is not in the list is named as such."""

    def label_from_instance(self, obj: Any) -> str:
        """Task, agent and fraction."""
        return f"{obj.task.name}: {obj.agent.name}, {obj.get_fraction_display()}"


class SampleForm(KeepingForm):
    """One air sample of one similar exposure group."""

    task_agent = GroupChoice(
        queryset=TaskAgent.objects.none(),
        label="Task and agent",
        error_messages={
            "required": "Task and agent: none is chosen; choose one of the list.",
            "invalid_choice": "Task and agent: %(value)s is not an agent of any task here; choose "
            "one of the list, or add the agent to its task first.",
        },
    )
    sampled_on = DayField(label="Sampled on", earliest=EARLIEST)
    worker = forms.ModelChoiceField(
        queryset=Worker.objects.none(),
        required=False,
        empty_label="nobody (area sample, or not recorded)",
        label="Worn by",
        error_messages={"invalid_choice": "Worn by: %(value)s is nobody on this roster."},
    )
    where = forms.ChoiceField(choices=Sample.Where.choices, label="Where")
    span = forms.ChoiceField(choices=Sample.Span.choices, label="Span")
    minutes = MeasuredField(
        label="Minutes sampled", unit="min", at_least=0.1, at_most=1440, required=False
    )
    flow_l_min = MeasuredField(
        label="Flow", unit="L/min", at_least=0.001, at_most=100, required=False
    )
    volume_l = MeasuredField(
        label="Volume", unit="L", at_least=0.001, at_most=100_000, required=False
    )
    result = ResultField(
        lod_from="lod",
        label="Result",
        max_length=40,
        help_text="as the laboratory reports it: a number above 0, <0.02 or ND",
        error_messages={"required": "Result: empty; enter a number, or <value if below detection."},
    )
    lod = MeasuredField(
        label="Detection limit",
        above=0,
        at_most=LARGEST,
        required=False,
        help_text="in the unit of the result; needed with ND",
    )
    unit = forms.ChoiceField(
        choices=UNIT_CHOICES,
        label="Unit",
        error_messages={
            "required": "Unit: none is chosen; it must be mg/m3, ug/m3, ppm, ppb or f/cm3.",
            "invalid_choice": "Unit: %(value)s is not allowed; it must be mg/m3, ug/m3, ppm, ppb "
            "or f/cm3.",
        },
    )
    method = forms.CharField(required=False, max_length=120, label="Method")
    laboratory = forms.CharField(required=False, max_length=120, label="Laboratory")
    reference = forms.CharField(
        required=False, max_length=60, label="Sample number", help_text="as on the laboratory sheet"
    )
    note = forms.CharField(
        required=False, max_length=2000, label="Note", widget=forms.Textarea(attrs={"rows": 2})
    )

    def __init__(
        self, *args: Any, site: Site, today: date, old: Sample | None = None, **kwargs: Any
    ) -> None:
        super().__init__(*args, **kwargs)
        self.site, self.today, self.old = site, today, old
        self.sample: Sample | None = None
        self.fields["task_agent"].queryset = task_agents_at(site)  # type: ignore[attr-defined]
        self.fields["worker"].queryset = Worker.objects.at(site)  # type: ignore[attr-defined]
        names = [name for name in self.fields if name not in {"is_meant", "asked"}]
        if old is not None:
            # An import may have met a unit written otherwise: it stays as it was reported.
            was = old.unit_as_reported
            if was not in dict(UNIT_CHOICES):
                self.fields["unit"].choices = [*UNIT_CHOICES, (was, was)]  # type: ignore[attr-defined]
            self.fields["reason"] = reason_field("Reason for the correction")
            names.append("reason")
        self.set_layout(*names, submit="Record the correction" if old else "Record sample")

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        reading, unit, row = (found.get(name) for name in ("result", "unit", "task_agent"))
        if not (isinstance(reading, Reading) and unit and row and found.get("sampled_on")):
            return found
        sample = self._read(reading, unit)
        if not 0 < sample.value <= LARGEST:
            self.add_error("result", f"Result: {reading.as_reported} {unit} is beyond 1 000 000.")
            return found
        former = former_results(row, unit=sample.unit, without=self.old.pk if self.old else None)
        for one in findings(sample, today=self.today, former=former):
            says = with_offer(one.says, *one.offer) if one.offer else one.says
            if one.is_question:
                self.ask(one.field, says)
            else:
                self.add_error(one.field, says)
        if not self.errors:
            self.settle()
        self.sample = sample
        return found

    def _read(self, reading: Reading, unit_text: str) -> Sample:
        found = self.cleaned_data
        value, unit = normalise(reading.value, unit_text)
        lod = None if reading.lod is None else normalise(reading.lod, unit_text)[0]
        kept = ("task_agent", "worker", "sampled_on", "minutes", "flow_l_min", "volume_l")
        texts = ("where", "span", "method", "laboratory", "reference", "note")
        return Sample(
            **{name: found.get(name) for name in kept},
            **{name: found.get(name, "") for name in texts},
            result_as_reported=reading.as_reported,
            unit_as_reported=unit_text,
            value=value,
            is_censored=reading.is_censored,
            lod=lod,
            unit=Unit(unit),
        )


def typed(sample: Sample) -> dict[str, Any]:
    """What a correction form shows first: the sample as it was reported."""
    names = ("task_agent", "sampled_on", "worker", "where", "span", "minutes", "flow_l_min")
    texts = ("volume_l", "method", "laboratory", "reference", "note")
    found = {name: getattr(sample, name) for name in (*names, *texts)}
    is_bare = sample.is_censored and not sample.result_as_reported.startswith("<")
    lod = None
    if sample.lod is not None and (is_bare or not sample.is_censored):
        one = normalise(1.0, sample.unit_as_reported)[0]
        lod = float(f"{sample.lod / one:.12g}")
    return found | {
        "result": sample.result_as_reported,
        "lod": lod,
        "unit": sample.unit_as_reported,
    }


def reason_field(label: str) -> forms.CharField:
    """The box for a reason; the action refuses one that is too short."""
    return forms.CharField(
        label=label,
        max_length=1000,
        widget=forms.Textarea(attrs={"rows": 2}),
        help_text="kept with the record and in the ledger",
    )


class AgentChoice(forms.ModelChoiceField):
    """A choice of agent with its number, so that two of like name are told apart."""

    def label_from_instance(self, obj: Agent) -> str:
        """Name and CAS number."""
        return f"{obj.name} ({obj.cas})" if obj.cas else obj.name
