"""What is typed about people: who they are, their clearance, training and seal notes."""

from collections.abc import Sequence
from datetime import date, timedelta
from typing import Any, cast

from django import forms

from programme.measured_fields import DayField, MeasuredField
from programme.roster.asking import AskingForm, future_refused
from programme.roster.models import Clearance, SealNote, Training, Worker

OLDEST_BIRTH = date(1920, 1, 1)
EARLIEST = date(1970, 1, 1)
# Papers brought from elsewhere are usually younger than this.
BROUGHT_ALONG = timedelta(days=366)


class WorkerForm(AskingForm, forms.ModelForm):
    """A person of the roster."""

    born_on = DayField(required=False, label="Born on", help_text="optional; guards other dates")
    active_from = DayField(label="First day here", earliest=EARLIEST)
    active_to = DayField(
        required=False,
        label="No longer here from",
        help_text="first day on which the person no longer works here; empty while they do",
    )

    class Meta:
        model = Worker
        fields = (
            "personnel_number",
            "name",
            "job",
            "employer",
            "is_contractor",
            "born_on",
            "active_from",
            "active_to",
            "wears_spectacles",
        )
        labels = {"is_contractor": "Contractor", "wears_spectacles": "Wears spectacles"}

    def __init__(self, *args: Any, today: date, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.today = today
        is_new = self.instance.pk is None
        self.set_layout(*self.Meta.fields, submit="Add worker" if is_new else "Save")

    def clean_personnel_number(self) -> str:
        number = str(self.cleaned_data["personnel_number"])
        others = Worker.objects.at(self.instance.site).exclude(pk=self.instance.pk)
        taken = others.filter(personnel_number=number).first()
        if taken is not None:
            raise forms.ValidationError(
                f"Personnel number: {number} already belongs to {taken.name}; it must be another."
            )
        return number

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        born, start, end = (found.get(name) for name in ("born_on", "active_from", "active_to"))
        if born and not OLDEST_BIRTH <= born <= self.today:
            self.add_error(
                "born_on",
                f"Born on: {born} is not allowed; {OLDEST_BIRTH} to {self.today}.",
            )
        elif born and start and born >= start:
            self.add_error(
                "born_on",
                f"Born on: {born} is not allowed; it must be earlier than the first day, {start}.",
            )
        if start and end and end <= start:
            self.add_error(
                "active_to",
                f"No longer here from: {end} is not allowed; it must be later than the first "
                f"day, {start}.",
            )
        if start and start > self.today:
            self.ask(
                "active_from",
                f"First day here: {start} lies in the future. Is that so? Tick below.",
            )
        return found


class PaperForm(AskingForm, forms.ModelForm):
    """A paper of one worker; with `old` given it is a correction and asks for its reason."""

    day = ""
    submit = ""

    def __init__(
        self, *args: Any, worker: Worker, today: date, old: Any = None, **kwargs: Any
    ) -> None:
        super().__init__(*args, **kwargs)
        self.instance.worker = worker
        self.worker, self.today, self.old = worker, today, old
        names = list(self._meta.fields or ())
        if old is not None:
            self.fields["reason"] = forms.CharField(
                label="Reason for the correction",
                max_length=1000,
                widget=forms.Textarea(attrs={"rows": 2}),
                help_text="both records stay on file, with this reason",
            )
            names.append("reason")
        self.set_layout(*names, submit="Record the correction" if old else self.submit)

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        day = found.get(self.day)
        label = str(self.fields[self.day].label)
        if not day:
            return found
        born = self.worker.born_on
        if day > self.today:
            self.add_error(self.day, future_refused(label, self.day, day=day, today=self.today))
        elif born and day <= born:
            self.add_error(
                self.day,
                f"{label}: {day} is not allowed; {self.worker.name} was born on {born}.",
            )
        elif day < self.worker.active_from - BROUGHT_ALONG:
            self.ask(
                self.day,
                f"{label}: {day} is long before {self.worker.name}'s first day here, "
                f"{self.worker.active_from}. Is that so? Tick below.",
            )
        return found


class ClearanceForm(PaperForm):
    """The clinician's written recommendation: ability and work limits, never a reason."""

    day, submit = "decided_on", "Record clearance"
    decided_on = DayField(label="Decided on", earliest=EARLIEST)
    expires_on = DayField(
        required=False,
        label="Next review on",
        help_text="only if the clinician set one",
    )
    max_hours_a_shift = MeasuredField(
        label="Most hours worn a shift",
        unit="h",
        at_least=0.25,
        at_most=24,
        required=False,
    )

    class Meta:
        model = Clearance
        fields = (
            "outcome",
            "decided_on",
            "expires_on",
            "decided_by",
            "no_negative_pressure",
            "no_scba",
            "heaviest_work",
            "max_hours_a_shift",
            "follow_up_needed",
            "copy_given",
        )
        labels = {
            "decided_by": "Physician or other licensed professional",
            "no_negative_pressure": "No negative-pressure respirator",
            "no_scba": "No self-contained breathing apparatus",
            "heaviest_work": "Heaviest work allowed",
            "follow_up_needed": "Follow-up needed",
            "copy_given": "The worker has a copy",
        }

    def clean(self) -> dict[str, Any]:
        found = super().clean()
        decided, expires = found.get("decided_on"), found.get("expires_on")
        if decided and expires and expires <= decided:
            self.add_error(
                "expires_on",
                f"Next review on: {expires} is not allowed; it must be later than {decided}.",
            )
        limits = (
            found.get("no_negative_pressure"),
            found.get("no_scba"),
            found.get("heaviest_work"),
            found.get("max_hours_a_shift"),
        )
        outcome = found.get("outcome")
        if outcome == Clearance.Outcome.ABLE_WITH_LIMITS and not any(limits):
            self.add_error("outcome", "Outcome: able with limits needs at least one limit below.")
        if outcome == Clearance.Outcome.ABLE and any(limits):
            self.add_error("outcome", "Outcome: able has no limits; choose able with limits.")
        return found


class TrainingForm(PaperForm):
    """Training with demonstrated knowledge; no family ticked means all of them."""

    day, submit = "trained_on", "Record training"
    trained_on = DayField(label="Trained on", earliest=EARLIEST)
    families = forms.MultipleChoiceField(
        required=False,
        label="Respirators covered",
        widget=forms.CheckboxSelectMultiple,
        help_text="none ticked means all",
    )

    class Meta:
        model = Training
        fields = ("trained_on", "trainer", "families", "is_demonstrated", "note")
        labels = {"is_demonstrated": "Knowledge demonstrated"}

    def __init__(self, *args: Any, families: Sequence[tuple[str, str]] = (), **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        box = cast(forms.MultipleChoiceField, self.fields["families"])
        box.choices = list(families)


class SealNoteForm(PaperForm):
    """What was seen of a face that bears on the seal."""

    day, submit = "noted_on", "Record seal note"
    noted_on = DayField(label="Seen on", earliest=EARLIEST)

    class Meta:
        model = SealNote
        fields = ("noted_on", "kind", "noted_by")
        labels = {"kind": "What was seen", "noted_by": "Seen by"}
