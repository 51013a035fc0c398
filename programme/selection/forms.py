"""What is typed about assignments and crews."""

from datetime import date
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Submit
from django import forms

from exposure.models import Task
from programme.equipment.models import Assembly, FacepieceSize
from programme.measured_fields import DayField
from programme.roster.models import Worker


class AssignForm(forms.Form):
    """An assembly of the site's shelf for a task."""

    assembly = forms.ModelChoiceField(queryset=Assembly.objects.none())
    since = DayField(label="From")

    def __init__(self, *args: Any, task: Task, on: date, **kwargs: Any) -> None:
        kwargs.setdefault("initial", {"since": on})
        super().__init__(*args, **kwargs)
        shelf = Assembly.objects.at(task.site).filter(withdrawn_on=None)
        taken = task.assemblies.filter(active_to=None).values("assembly")
        self.fields["assembly"].queryset = shelf.exclude(pk__in=taken)
        self.helper = FormHelper()
        self.helper.layout = Layout("assembly", "since", Submit("assign", "Assign"))


class EndForm(forms.Form):
    """The end of an assignment."""

    on = DayField(label="First day without it")
    reason = forms.CharField(max_length=300, help_text="kept with the assignment and in the ledger")

    def __init__(self, *args: Any, on: date, **kwargs: Any) -> None:
        kwargs.setdefault("initial", {"on": on})
        super().__init__(*args, **kwargs)
        self.helper = FormHelper()
        self.helper.layout = Layout("on", "reason", Submit("end", "End the assignment"))


class CrewForm(forms.Form):
    """A worker on a task, with what they wear there."""

    worker = forms.ModelChoiceField(queryset=Worker.objects.none())
    assembly = forms.ModelChoiceField(
        queryset=Assembly.objects.none(), help_text="of those assigned to the task"
    )
    size = forms.ModelChoiceField(
        queryset=FacepieceSize.objects.none(),
        required=False,
        help_text="of that assembly's facepiece; not needed where it fits loosely",
    )
    since = DayField(label="From")

    def __init__(self, *args: Any, task: Task, on: date, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.fields["since"].initial = on
        workers = Worker.objects.at(task.site).active(on)
        self.fields["worker"].queryset = workers
        assigned = Assembly.objects.at(task.site).filter(
            assignments__task=task, assignments__active_to=None
        )
        self.fields["assembly"].queryset = assigned.select_related("facepiece").distinct()
        self.fields["size"].queryset = (
            FacepieceSize.objects.filter(facepiece__assemblies__in=assigned)
            .select_related("facepiece")
            .distinct()
        )
        self.helper = FormHelper()
        self.helper.layout = Layout(
            "worker", "assembly", "size", "since", Submit("put", "Put on the crew")
        )

    def clean(self) -> dict[str, Any]:
        found = super().clean() or {}
        assembly, size = found.get("assembly"), found.get("size")
        if assembly and assembly.facepiece.is_tight:
            sizes = assembly.facepiece.sizes.all()
            allowed = ", ".join(one.label for one in sizes) or "none recorded"
            if size is None:
                self.add_error("size", f"Size: empty; it must be one of {allowed}.")
            elif size.facepiece_id != assembly.facepiece_id:
                says = f"Size: {size} is not of {assembly.facepiece}; it must be one of {allowed}."
                self.add_error("size", says)
        return found
