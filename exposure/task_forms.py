"""What is typed about tasks and the agents met in them."""

from datetime import date
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Submit
from django import forms

from exposure.forms import EARLIEST, AgentChoice
from exposure.models import Agent, Fraction, Task, TaskAgent
from exposure.reference import TypicalSize
from programme.measured_fields import DayField, MeasuredField


class TaskForm(forms.ModelForm):
    """A task: how hard, how long, in what atmosphere."""

    wear_h_per_shift = MeasuredField(
        label="Hours worn a shift",
        unit="h",
        at_least=0.05,
        at_most=24,
        help_text="h, 0.05 to 24: how long the task is done, respirator on",
    )
    shift_h = MeasuredField(label="Shift length", unit="h", at_least=0.25, at_most=24, initial=8.0)
    shifts_per_week = MeasuredField(
        label="Shifts a week",
        at_least=0.1,
        at_most=21,
        initial=5.0,
        help_text="0.1 to 21: in how many one worker does the task",
    )
    starts_at = forms.TimeField(
        label="Shift starts",
        initial="06:00",
        widget=forms.TimeInput(format="%H:%M", attrs={"type": "time"}),
    )
    temperature_c = MeasuredField(
        label="Air temperature",
        unit="°C",
        at_least=-40,
        at_most=80,
        required=False,
        help_text="°C, -40 to 80; empty means the site's",
    )
    humidity_percent = MeasuredField(
        label="Relative humidity", unit="%", at_least=0, at_most=100, required=False
    )
    oxygen_percent = MeasuredField(
        label="Measured oxygen",
        unit="% by volume",
        at_least=0,
        at_most=100,
        required=False,
        help_text="% by volume, 0 to 100; needed where measured",
    )
    changed_on = DayField(
        required=False,
        label="Last changed on",
        earliest=EARLIEST,
        help_text="change of process, material or control; older samples no longer count",
    )
    active_from = DayField(label="Done here from", earliest=EARLIEST)
    active_to = DayField(
        required=False, label="No longer done from", help_text="empty while it is done"
    )

    class Meta:
        model = Task
        fields = (
            "name",
            "code",
            "description",
            "work_rate",
            "wear_h_per_shift",
            "shift_h",
            "shifts_per_week",
            "starts_at",
            "temperature_c",
            "humidity_percent",
            "oxygen",
            "oxygen_percent",
            "is_idlh",
            "has_oil_aerosol",
            "irritates_eyes",
            "changed_on",
            "active_from",
            "active_to",
        )
        labels = {
            "code": "Code",
            "work_rate": "Work rate",
            "oxygen": "Oxygen",
            "is_idlh": "Immediately dangerous to life or health",
            "has_oil_aerosol": "Oil aerosol in the air",
            "irritates_eyes": "The air irritates the eyes",
        }
        help_texts = {"code": "letters, digits, - and _; used in imports and exports"}
        widgets = {"description": forms.Textarea(attrs={"rows": 2})}

    def __init__(self, *args: Any, today: date, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.today = today
        self.helper = FormHelper()
        submit = "Add task" if self.instance.pk is None else "Save task"
        self.helper.layout = Layout(*self.Meta.fields, Submit("send", submit))

    def clean_code(self) -> str:
        code = str(self.cleaned_data["code"])
        others = Task.objects.at(self.instance.site).exclude(pk=self.instance.pk)
        taken = others.filter(code=code).first()
        if taken is not None:
            raise forms.ValidationError(
                f"Code: {code} already belongs to {taken.name}; it must be another."
            )
        return code

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        worn, shift = found.get("wear_h_per_shift"), found.get("shift_h")
        if worn and shift and worn > shift:
            self.add_error(
                "wear_h_per_shift",
                f"Hours worn a shift: {worn:g} is not allowed; at most the shift, {shift:g} h.",
            )
        is_measured = found.get("oxygen") == Task.Oxygen.MEASURED
        if is_measured and found.get("oxygen_percent") is None and "oxygen_percent" in found:
            self.add_error("oxygen_percent", "Measured oxygen: empty; it must be 0 to 100 %.")
        start, end, changed = (found.get(n) for n in ("active_from", "active_to", "changed_on"))
        if start and end and end <= start:
            self.add_error(
                "active_to",
                f"No longer done from: {end} is not allowed; it must be later than {start}.",
            )
        if changed and changed > self.today:
            self.add_error(
                "changed_on", f"Last changed on: {changed} lies in the future, today {self.today}."
            )
        return found


class TaskAgentForm(forms.ModelForm):
    """One agent in one task; a typical particle size may be taken over with its source."""

    agent = AgentChoice(
        queryset=Agent.objects.none(),
        label="Agent",
        error_messages={
            "invalid_choice": "Agent: %(value)s is not known; choose one of the list, or add it."
        },
    )
    typical = forms.ChoiceField(
        required=False,
        label="Typical size to take over",
        help_text="fills the diameter, spread and source left empty below",
    )
    mmad_um = MeasuredField(
        label="Mass median aerodynamic diameter",
        unit="µm",
        at_least=0.001,
        at_most=100,
        required=False,
    )
    gsd = MeasuredField(
        label="Geometric standard deviation of size",
        at_least=1,
        at_most=10,
        required=False,
        help_text="1 to 10",
    )
    dust_load_mg_m3 = MeasuredField(
        label="All dust drawn into the filter",
        unit="mg/m3",
        at_least=0,
        at_most=10000,
        required=False,
        help_text="mg/m³ inhalable, 0 to 10000, all agents together; "
        "a respirable sample understates it",
    )

    class Meta:
        model = TaskAgent
        fields = (
            "agent",
            "form",
            "fraction",
            "typical",
            "mmad_um",
            "gsd",
            "size_source",
            "dust_load_mg_m3",
            "cake",
        )
        labels = {"form": "Form in this task", "size_source": "Source of the size"}

    def __init__(self, *args: Any, sizes: list[TypicalSize], **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.sizes = {size.id: size for size in sizes}
        self.fields["typical"].choices = [  # type: ignore[attr-defined]
            ("", "none"),
            *((size.id, size.says) for size in sizes),
        ]
        self.fields["agent"].queryset = Agent.objects.at(self.instance.task.site)  # type: ignore[attr-defined]
        is_new = self.instance.pk is None
        # What was measured as one agent and fraction must not become another's.
        self.fields["agent"].disabled = not is_new
        self.fields["fraction"].disabled = not is_new and self.instance.samples.exists()
        self.helper = FormHelper()
        self.helper.layout = Layout(
            *self.Meta.fields, Submit("send", "Add agent" if is_new else "Save")
        )

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        agent, form, fraction = (found.get(name) for name in ("agent", "form", "fraction"))
        if agent and form:
            self._compare(agent, form, fraction)
        size = self.sizes.get(found.get("typical") or "")
        if size is not None and found.get("mmad_um") is None and "mmad_um" in found:
            found["mmad_um"], found["size_source"] = size.mmad_um, size.cited
            found["gsd"] = found.get("gsd") or size.gsd
        if found.get("mmad_um") is not None and not found.get("size_source"):
            self.add_error(
                "size_source", "Source of the size: empty; say where the diameter comes from."
            )
        return found

    def _compare(self, agent: Agent, form: str, fraction: str | None) -> None:
        is_vapour = fraction == Fraction.VAPOUR
        if agent.is_particulate and form == TaskAgent.Form.GAS:
            self.add_error(
                "form", f"Form: {agent} is a {agent.kind}; it must be particles or both together."
            )
        elif agent.kind == Agent.Kind.GAS and form == TaskAgent.Form.PARTICULATE:
            self.add_error("form", f"Form: {agent} is a gas; it must be gas or vapour.")
        elif form == TaskAgent.Form.GAS and fraction and not is_vapour:
            self.add_error("fraction", "Fraction: it must be gas or vapour for this form.")
        elif form == TaskAgent.Form.PARTICULATE and is_vapour:
            self.add_error(
                "fraction",
                "Fraction: gas or vapour is not allowed for particles; it must be respirable, "
                "thoracic, inhalable or total.",
            )
