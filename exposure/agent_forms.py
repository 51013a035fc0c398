"""What is typed about agents and limits: a site's own, each with its source."""

import re
from typing import Any

from django import forms

from exposure.cas import CheckDigitError, read_cas
from exposure.forms import KeepingForm
from exposure.models import Agent, ExposureLimit, Fraction, Unit, YesNoUnknown
from programme.figures import near, unit_sign
from programme.measured_fields import MeasuredField
from programme.roster.asking import with_offer
from programme.roster.models import Site

# A limit this many times away from another of its kind is asked about: a unit may have slipped.
SLIP = 300.0
KINDS = {"TWA": "time-weighted average", "STEL": "short-term average", "C": "ceiling"}
IDLH_UNITS = (("", "not known"), ("mg/m3", "mg/m³"), ("ppm", "ppm"))


class AgentForm(KeepingForm):
    """An agent of the site's own."""

    name = forms.CharField(max_length=120, label="Name")
    cas = forms.CharField(
        required=False,
        max_length=20,
        label="CAS number",
        help_text="for example 7439-92-1; empty if there is none",
    )
    kind = forms.ChoiceField(choices=Agent.Kind.choices, label="Kind")
    synonyms = forms.CharField(required=False, max_length=500, label="Other names")
    molar_mass_g_mol = MeasuredField(
        label="Molar mass", unit="g/mol", at_least=1, at_most=5000, required=False
    )
    idlh_value = MeasuredField(
        label="Immediately dangerous (IDLH) from", above=0, at_most=1e6, required=False
    )
    idlh_unit = forms.ChoiceField(choices=IDLH_UNITS, required=False, label="Unit of IDLH")
    eye_irritant = forms.ChoiceField(
        choices=YesNoUnknown.choices, initial="unknown", label="Irritates the eyes"
    )
    skin_notation = forms.ChoiceField(
        choices=YesNoUnknown.choices, initial="unknown", label="Taken up through the skin"
    )
    is_oil_aerosol = forms.BooleanField(required=False, label="Oil aerosol")
    filter_need = forms.MultipleChoiceField(
        required=False,
        label="Filter need",
        widget=forms.CheckboxSelectMultiple,
        help_text="nothing ticked means not known, and no filter is offered for it",
    )
    source = forms.CharField(max_length=300, label="Source", help_text="where the figures are from")
    remarks = forms.CharField(
        required=False, max_length=1000, label="Remarks", widget=forms.Textarea(attrs={"rows": 2})
    )

    def __init__(
        self, *args: Any, site: Site, needs: tuple[str, ...], scheme: str, **kwargs: Any
    ) -> None:
        super().__init__(*args, **kwargs)
        self.site, self.scheme = site, scheme
        self.fields["filter_need"].choices = [(one, one) for one in needs]  # type: ignore[attr-defined]
        names = [name for name in self.fields if name not in {"is_meant", "asked"}]
        self.set_layout(*names, submit="Add agent")

    def clean_cas(self) -> str:
        text = self.cleaned_data["cas"].strip()
        if not text:
            return ""
        try:
            number = read_cas(text)
        except CheckDigitError as refused:
            says = with_offer(f"{refused}.", "cas", refused.likely)
            raise forms.ValidationError(says) from refused
        except ValueError as refused:
            raise forms.ValidationError(str(refused)) from refused
        known = Agent.objects.at(self.site).filter(key=number).first()
        if known is not None:
            raise forms.ValidationError(f"CAS number: {number} is already there as {known}.")
        return number

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        name = found.get("name", "")
        is_gas = found.get("kind") in {Agent.Kind.GAS, Agent.Kind.VAPOUR}
        value, unit = found.get("idlh_value"), found.get("idlh_unit")
        if bool(value) != bool(unit):
            self.add_error("idlh_unit", "Unit of IDLH: give the value and its unit, or neither.")
        if unit == Unit.PPM and not is_gas:
            self.add_error("idlh_unit", "Unit of IDLH: ppm is for gases and vapours; use mg/m3.")
        if name and Agent.objects.at(self.site).filter(name__iexact=name).exists():
            self.ask("name", f"Name: {name} is already an agent here. Another one is meant?")
        if not self.errors:
            self.settle()
        return found

    def agent(self) -> Agent:
        """The agent as typed, unsaved."""
        found = self.cleaned_data
        slug = re.sub(r"[^A-Z0-9]+", "-", found["name"].upper()).strip("-")[:24]
        need = "+".join(found["filter_need"])
        plain = ("name", "kind", "synonyms", "molar_mass_g_mol", "idlh_value", "idlh_unit")
        more = ("eye_irritant", "skin_notation", "is_oil_aerosol", "source", "remarks")
        return Agent(
            key=found["cas"] or f"NOCAS-{slug or 'AGENT'}",
            **{f"{self.scheme}_filter_need": need},
            **{name: found[name] for name in (*plain, *more)},
        )


class LimitForm(KeepingForm):
    """A limit of the site's own for one agent."""

    kind = forms.ChoiceField(choices=tuple(KINDS.items()), label="Kind")
    fraction = forms.ChoiceField(choices=Fraction.choices, label="Fraction")
    value = MeasuredField(label="Limit", above=0, at_most=1e6)
    unit = forms.ChoiceField(choices=(("", "choose"), *Unit.choices), label="Unit")
    averaging_min = MeasuredField(
        label="Averaged over",
        unit="min",
        at_least=0,
        at_most=1440,
        required=False,
        help_text="min, 0 to 1440; empty: 480 for an 8-hour average, 15 short-term, 0 ceiling",
    )
    edition = forms.CharField(required=False, max_length=40, label="Edition or date")
    source = forms.CharField(
        max_length=300, label="Source", help_text="document, clause or decision it rests on"
    )
    note = forms.CharField(required=False, max_length=200, label="Note")

    def __init__(self, *args: Any, agent: Agent, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.agent = agent
        names = [name for name in self.fields if name not in {"is_meant", "asked"}]
        self.set_layout(*names, submit="Add limit")

    def clean(self) -> dict[str, Any]:
        found = super().clean() or self.cleaned_data
        unit, fraction = found.get("unit"), found.get("fraction")
        if unit == Unit.PPM and self.agent.is_particulate:
            self.add_error(
                "unit", f"Unit: ppm is not allowed for {self.agent}; it must be mg/m3 or f/cm3."
            )
        if unit == Unit.F_CM3 and self.agent.kind != Agent.Kind.FIBRE:
            self.add_error(
                "unit", f"Unit: f/cm3 is not allowed for {self.agent}, which is not a fibre."
            )
        if fraction == Fraction.VAPOUR and self.agent.is_particulate:
            self.add_error(
                "fraction",
                f"Fraction: {self.agent} is not a gas or vapour; choose a dust fraction.",
            )
        if not self.errors:
            self._compare()
            self.settle()
        return found

    def _compare(self) -> None:
        found = self.cleaned_data
        for other in self.agent.limits.filter(kind=found["kind"], unit=found["unit"], site=None):
            times = found["value"] / other.value
            if not 1 / SLIP < times < SLIP:
                sign = unit_sign(found["unit"])
                self.ask(
                    "value",
                    f"Limit: {near(found['value'])} {sign} is far from {near(other.value)} {sign} "
                    f"({other.list_code}). Did a unit slip by 1000? Mend it, or tick below.",
                )
                return

    def limit(self) -> ExposureLimit:
        """The limit as typed, unsaved."""
        found = self.cleaned_data
        usual = {"TWA": 480, "STEL": 15, "C": 0}[found["kind"]]
        minutes = found["averaging_min"]
        names = ("kind", "fraction", "value", "unit", "edition", "source", "note")
        return ExposureLimit(
            agent=self.agent,
            averaging_min=usual if minutes is None else round(minutes),
            **{name: found[name] for name in names},
        )
