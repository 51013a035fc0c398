"""What is typed about respirators: facepieces, filters and cartridges, assemblies, changes."""

import re
import zoneinfo
from datetime import datetime, timedelta
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Submit
from django import forms
from django.utils import timezone

from programme.equipment.fitting import misfits
from programme.equipment.models import Assembly, Element, Facepiece, FilterChange
from programme.measured_fields import MeasuredField
from programme.roster.asking import AskingForm
from programme.roster.models import Site, Worker, active_on
from programme.rulepack.pack import RulePack

MOST_STOCK = 1_000_000
# A filter change entered later than this is asked about.
LONG_AGO = timedelta(days=366)
SHIFTS_A_DAY = 3
_MOMENT = re.compile(r"(?:19|20)[0-9]{2}-[0-9]{2}-[0-9]{2}[T ][0-9]{2}:[0-9]{2}(?::[0-9]{2})?")


class WholeField(MeasuredField):
    """A whole number."""

    def to_python(self, value: Any) -> int | None:  # type: ignore[override]
        number = super().to_python(value)
        if number is None:
            return None
        if number != int(number):
            raise self._refuse(value, f"a whole number, {self.allowed}")
        return int(number)


def _stock() -> WholeField:
    return WholeField(label="In stock", at_least=0, at_most=MOST_STOCK, initial=0)


class FacepieceForm(forms.ModelForm):
    sizes = forms.CharField(
        label="Sizes",
        max_length=200,
        help_text="smallest first, commas between them: S, M, L; or: one size",
    )

    class Meta:
        model = Facepiece
        fields = ("name", "kind", "sizes")
        labels = {"name": "Maker, model and style", "kind": "Kind"}

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        is_new = self.instance.pk is None
        if not is_new:
            self.initial["sizes"] = ", ".join(size.label for size in self.instance.sizes.all())
        self.helper = FormHelper()
        self.helper.layout = Layout(
            *self.Meta.fields, Submit("send", "Add facepiece" if is_new else "Save")
        )

    def clean_name(self) -> str:
        return free_name(self)

    def clean_sizes(self) -> list[str]:
        labels = [one.strip() for one in self.cleaned_data["sizes"].split(",") if one.strip()]
        twice = {one for one in labels if labels.count(one) > 1}
        if not labels:
            raise forms.ValidationError("Sizes: none; give at least one, for example one size.")
        if twice:
            raise forms.ValidationError(f"Sizes: {', '.join(sorted(twice))} stands twice.")
        if any(len(one) > 20 for one in labels):  # noqa: PLR2004 - width of the column
            raise forms.ValidationError("Sizes: a size is too long; at most 20 characters each.")
        return labels


def free_name(form: Any) -> str:
    """The name typed, refused if another part of that kind and site has it."""
    name = str(form.cleaned_data["name"]).strip()
    rows = type(form.instance).objects.at(form.instance.site).exclude(pk=form.instance.pk)
    if rows.filter(name=name).exists():
        raise forms.ValidationError(f"Name: {name} is already recorded here; it must be another.")
    return name


class ElementForm(forms.ModelForm):
    particulate_class = forms.ChoiceField(required=False, label="Particulate class")
    gas_elements = forms.MultipleChoiceField(
        required=False, label="Gas and vapour types", widget=forms.CheckboxSelectMultiple
    )
    gas_class = forms.TypedChoiceField(
        required=False,
        coerce=int,
        empty_value=None,
        label="Capacity class",
        help_text="not known counts as the lowest",
    )
    area_cm2 = MeasuredField(
        label="Filter area, all elements together",
        unit="cm2",
        at_least=5,
        at_most=20000,
        required=False,
    )
    clean_resistance_pa = MeasuredField(
        label="Resistance when new at 85 L/min", unit="Pa", at_least=1, at_most=1000, required=False
    )
    maker_max_h = MeasuredField(
        label="Maker's time limit in use", unit="h", at_least=0.1, at_most=5000, required=False
    )
    cartridge_life_h = MeasuredField(
        label="Cartridge life from objective data",
        unit="h",
        at_least=0.05,
        at_most=1000,
        required=False,
        help_text="h at the conditions of the task, 0.05 to 1000; smell is no basis",
    )
    in_stock = _stock()

    class Meta:
        model = Element
        fields = (
            "name",
            "particulate_class",
            "gas_elements",
            "gas_class",
            "is_pair",
            "area_cm2",
            "clean_resistance_pa",
            "maker_max_h",
            "cartridge_life_h",
            "cartridge_life_source",
            "has_esli",
            "in_stock",
        )
        labels = {
            "is_pair": "Used in pairs",
            "has_esli": "End-of-service-life indicator",
            "cartridge_life_source": "Where the life comes from",
        }

    def __init__(self, *args: Any, pack: RulePack, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.pack = pack
        filters = [(one.id, one.id) for one in pack.particulate_filters]
        gases = [(one.id, f"{one.id}: {one.name}") for one in pack.gas_elements]
        classes = [(one.number, str(one.number)) for one in pack.gas_classes]
        self.fields["particulate_class"].choices = [("", "none"), *filters]  # type: ignore[attr-defined]
        self.fields["gas_elements"].choices = gases  # type: ignore[attr-defined]
        self.fields["gas_class"].choices = [("", "not known or none"), *classes]  # type: ignore[attr-defined]
        names = [one for one in self.Meta.fields if one != "gas_class" or classes]
        is_new = self.instance.pk is None
        self.helper = FormHelper()
        self.helper.layout = Layout(
            *names, Submit("send", "Add filter or cartridge" if is_new else "Save")
        )

    def clean_name(self) -> str:
        return free_name(self)

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        gases, particles = found.get("gas_elements"), found.get("particulate_class")
        if not gases and not particles and not self.errors:
            self.add_error(
                "particulate_class",
                "Particulate class: none, and no gas type; it must be one or both.",
            )
        classed = {one.id for one in self.pack.gas_elements if one.classed}
        if found.get("gas_class") is not None and not classed & set(gases or ()):
            self.add_error(
                "gas_class", f"Capacity class: only for {', '.join(sorted(classed)) or 'none'}."
            )
        if found.get("cartridge_life_h") is not None:
            self._life(found, gases)
        return found

    def _life(self, found: dict[str, Any], gases: Any) -> None:
        if not gases:
            self.add_error(
                "cartridge_life_h", "Cartridge life: this has no gas type; leave it empty."
            )
        if not str(found.get("cartridge_life_source") or "").strip():
            self.add_error(
                "cartridge_life_source",
                "Where the life comes from: empty; name the maker's data, test or model.",
            )


class AssemblyForm(forms.ModelForm):
    respirator_class = forms.ChoiceField(label="Respirator class")
    service_life_min = WholeField(
        label="Certified life of a self-contained supply",
        unit="min",
        at_least=1,
        at_most=1440,
        required=False,
    )
    in_stock = _stock()

    class Meta:
        model = Assembly
        fields = (
            "name",
            "facepiece",
            "respirator_class",
            "element",
            "approval_number",
            "maker_evidence",
            "service_life_min",
            "in_stock",
        )
        labels = {
            "element": "Filter or cartridge",
            "approval_number": "Approval number",
            "maker_evidence": "Maker's evidence for a higher factor",
        }
        help_texts = {
            "element": "a filtering facepiece is its own filter: enter it under filters as well"
        }

    def __init__(self, *args: Any, pack: RulePack, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.pack = pack
        site = self.instance.site
        own = {self.instance.facepiece_id, self.instance.element_id}
        self.fields["facepiece"].queryset = in_use(Facepiece, site, own)  # type: ignore[attr-defined]
        self.fields["element"].queryset = in_use(Element, site, own)  # type: ignore[attr-defined]
        self.fields["element"].empty_label = "none: air is supplied"  # type: ignore[attr-defined]
        self.fields["respirator_class"].choices = [  # type: ignore[attr-defined]
            ("", "choose"),
            *((row.id, f"{row.name}: APF {row.apf}") for row in pack.classes),
        ]
        is_new = self.instance.pk is None
        self.helper = FormHelper()
        self.helper.layout = Layout(
            *self.Meta.fields, Submit("send", "Add assembly" if is_new else "Save")
        )

    def clean_name(self) -> str:
        return free_name(self)

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        if self.errors:
            return found
        trial = Assembly(
            site=self.instance.site, **{name: found[name] for name in self.Meta.fields}
        )
        for one in misfits(trial, self.pack):
            self.add_error(one.field, one.says)
        return found


def in_use(model: Any, site: Site, own: set[int | None]) -> Any:
    """The site's parts that are not withdrawn, and those the record has already."""
    rows = model.objects.at(site)
    return rows.filter(withdrawn_on=None) | rows.filter(pk__in=[pk for pk in own if pk])


class MomentField(forms.CharField):
    """A day and clock time at the site; cleans to an aware instant."""

    def __init__(self, **kwargs: Any) -> None:
        widget = forms.DateTimeInput(attrs={"type": "datetime-local"})
        super().__init__(max_length=40, widget=widget, **kwargs)
        self.zone: zoneinfo.ZoneInfo = zoneinfo.ZoneInfo("UTC")

    def clean(self, value: Any) -> Any:
        text = super().clean(value)
        # A day alone would be read as midnight.
        match = _MOMENT.fullmatch(text)
        try:
            moment = datetime.fromisoformat(text) if match else None
        except ValueError:
            moment = None
        if moment is None:
            raise forms.ValidationError(
                f"{self.label}: {text} is not a day and time; write it like 2026-03-02 06:00."
            )
        return moment.replace(tzinfo=self.zone)


class FilterChangeForm(AskingForm):
    """A new filter or cartridge was fitted."""

    worker = forms.ModelChoiceField(queryset=Worker.objects.none(), label="Worker")
    assembly = forms.ModelChoiceField(queryset=Assembly.objects.none(), label="Assembly")
    fitted_at = MomentField(label="Fitted at")
    shifts_used = MeasuredField(
        label="Shifts worn since",
        at_least=0,
        at_most=2000,
        required=False,
        help_text="only if counted; empty: worked out from the task's shifts a week",
    )
    lot = forms.CharField(required=False, max_length=40, label="Lot")
    note = forms.CharField(required=False, max_length=200, label="Note")

    def __init__(self, *args: Any, site: Site, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.site, self.now = site, timezone.now()
        self.fields["worker"].queryset = Worker.objects.at(site).active(site.today())  # type: ignore[attr-defined]
        self.fields["assembly"].queryset = Assembly.objects.at(site).filter(  # type: ignore[attr-defined]
            withdrawn_on=None, element__isnull=False
        )
        zone = zoneinfo.ZoneInfo(site.time_zone)
        self.fields["fitted_at"].zone = zone  # type: ignore[attr-defined]
        local = self.now.astimezone(zone)
        self.fields["fitted_at"].initial = f"{local:%Y-%m-%dT%H:%M}"
        self.fields["fitted_at"].help_text = f"day and clock time at the site ({site.time_zone})"
        names = [name for name in self.fields if name != "is_meant"]
        self.set_layout(*names, submit="Record filter change")

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        worker, assembly, at = (found.get(n) for n in ("worker", "assembly", "fitted_at"))
        if worker and at:
            self._moment(worker, at)
        if at and found.get("shifts_used"):
            days = max(0, (self.now - at).days) + 1
            if found["shifts_used"] > SHIFTS_A_DAY * days:
                self.add_error(
                    "shifts_used",
                    f"Shifts worn since: {found['shifts_used']:g} is not allowed; at most "
                    f"{SHIFTS_A_DAY * days} shifts lie between then and now.",
                )
        if worker and assembly:
            crews = assembly.crew.filter(active_on(self.site.today()), worker=worker)
            if not crews.exists():
                self.ask(
                    "assembly",
                    f"Assembly: {worker.name} is not on a crew in {assembly}. Is that so? Tick "
                    "below.",
                )
        return found

    def _moment(self, worker: Worker, at: datetime) -> None:
        day = self.site.today(at)
        if at > self.now:
            self.add_error("fitted_at", f"Fitted at: {at:%Y-%m-%d %H:%M} lies in the future.")
        elif day < worker.active_from:
            self.add_error(
                "fitted_at",
                f"Fitted at: {day} is not allowed; {worker.name} is on the roster from "
                f"{worker.active_from}.",
            )
        elif self.now - at > LONG_AGO:
            self.ask("fitted_at", f"Fitted at: {day} is over a year ago. Is that so? Tick below.")

    def change(self) -> FilterChange:
        """The change as typed, unsaved."""
        names = ("worker", "assembly", "fitted_at", "shifts_used", "lot", "note")
        return FilterChange(**{name: self.cleaned_data[name] for name in names})
