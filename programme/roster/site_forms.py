"""What is typed about a site and its members."""

import zoneinfo
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Submit
from django import forms
from django.contrib.auth.models import User
from django.contrib.auth.password_validation import validate_password

from programme.measured_fields import MeasuredField
from programme.roster.asking import AskingForm
from programme.roster.models import Role, Site
from programme.rulepack.load import available, load

INTERVALS = {"fit_interval_months": "fit", "training_interval_months": "training"}


class WholeField(MeasuredField):
    """A whole number with its unit and its range; cleans to an int, or None where empty."""

    def to_python(self, value: Any) -> int | None:  # type: ignore[override]
        number = super().to_python(value)
        if number is None:
            return None
        if not number.is_integer():
            raise self._refuse(value, f"{self.allowed}, whole")
        return int(number)


class SiteForm(AskingForm, forms.ModelForm):
    """Settings of a site. A site may tighten its rule pack, never loosen it."""

    rule_pack = forms.ChoiceField(label="Rule pack")
    adopted_limit_lists = forms.MultipleChoiceField(
        label="Further limit lists the site holds itself to",
        required=False,
        widget=forms.CheckboxSelectMultiple,
    )
    time_zone = forms.ChoiceField(label="Time zone")
    temperature_c = MeasuredField(label="Air temperature", unit="°C", at_least=-40, at_most=60)
    altitude_m = MeasuredField(label="Altitude", unit="m", at_least=-450, at_most=5500)
    pressure_kpa = MeasuredField(
        label="Air pressure",
        unit="kPa",
        at_least=50,
        at_most=110,
        required=False,
        help_text="50 to 110 kPa; leave empty to work it out from the altitude",
    )
    due_soon_days = WholeField(label="Due soon, ahead", unit="days", at_least=1, at_most=120)
    fit_interval_months = WholeField(
        label="Fit test at least every",
        unit="months",
        at_least=1,
        at_most=24,
        required=False,
        help_text="1 to 24 months, only if shorter than the rule pack's; empty: the rule pack's",
    )
    training_interval_months = WholeField(
        label="Training at least every",
        unit="months",
        at_least=1,
        at_most=24,
        required=False,
        help_text="1 to 24 months, only if shorter than the rule pack's; empty: the rule pack's",
    )
    sample_age_months = WholeField(
        label="Samples count for",
        unit="months",
        at_least=1,
        at_most=60,
        help_text="1 to 60 months (common practice: 36)",
    )
    filter_max_shifts = WholeField(
        label="Particulate filters changed after",
        unit="shifts",
        at_least=1,
        at_most=200,
        required=False,
    )
    cartridge_max_shifts = WholeField(
        label="Cartridges changed after", unit="shifts", at_least=1, at_most=60, required=False
    )
    breathing_limit_pa = MeasuredField(
        label="Breathing resistance of a loaded filter, at 85 L/min",
        unit="Pa",
        at_least=20,
        at_most=1500,
    )

    class Meta:
        model = Site
        fields = (
            "name",
            "rule_pack",
            "adopted_limit_lists",
            "statistic",
            "time_zone",
            "temperature_c",
            "altitude_m",
            "pressure_kpa",
            "due_soon_days",
            "fit_interval_months",
            "training_interval_months",
            "sample_age_months",
            "filter_max_shifts",
            "cartridge_max_shifts",
            "breathing_limit_pa",
        )
        labels = {"statistic": "Exposure statistic"}

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        packs = [(info.name, f"{info.title}, edition {info.edition}") for info in available()]
        self.fields["rule_pack"].choices = packs
        zones = sorted(zoneinfo.available_timezones())
        self.fields["time_zone"].choices = [(zone, zone) for zone in zones]
        lists = sorted({code for name, _ in packs for code in load(name).adoptable_limit_lists})
        self.fields["adopted_limit_lists"].choices = [(code, code) for code in lists]
        self.set_layout(*self.Meta.fields, submit="Save settings")

    def clean(self) -> dict[str, Any]:
        found = super().clean() or {}
        name = found.get("rule_pack")
        if not name:
            return found
        pack = load(name)
        for field, kind in INTERVALS.items():
            law, own = pack.interval(kind).months, found.get(field)
            if law and own and own > law:
                says = (
                    f"{self.fields[field].label}: {own} months is not allowed; {law} at most by "
                    f"{pack.title}: a site may tighten a rule, never loosen it."
                )
                self.add_error(field, says)
        odd = set(found.get("adopted_limit_lists", [])) - set(pack.adoptable_limit_lists)
        if odd:
            allowed = ", ".join(pack.adoptable_limit_lists) or "none"
            says = f"Limit lists: {', '.join(sorted(odd))} is not allowed; {pack.title}: {allowed}."
            self.add_error("adopted_limit_lists", says)
        if name != self.initial.get("rule_pack"):
            question = (
                f"Every chain will be judged anew under {pack.title}, and every assembly needs a "
                "class of that pack. Is that meant?"
            )
            self.ask("rule_pack", question)
        return found


class RoleForm(forms.Form):
    """Another role for a member."""

    role = forms.ChoiceField(choices=Role.choices)


class MemberForm(forms.Form):
    """A user for the site: one who is known already, or a new one with a first password."""

    username = forms.CharField(
        label="User name", max_length=150, validators=[User.username_validator]
    )
    role = forms.ChoiceField(choices=Role.choices)
    password = forms.CharField(
        label="First password",
        required=False,
        strip=False,
        widget=forms.PasswordInput(attrs={"autocomplete": "new-password"}),
        help_text="only for a new user: 9 or more characters; they change it after signing in",
    )
    password_again = forms.CharField(
        label="First password again",
        required=False,
        strip=False,
        widget=forms.PasswordInput(attrs={"autocomplete": "new-password"}),
    )

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.user: User | None = None
        self.helper = FormHelper()
        self.helper.layout = Layout(*self.fields, Submit("add", "Give the role"))

    def clean_username(self) -> str:
        name = str(User.normalize_username(self.cleaned_data["username"]))
        # Sign-in reads names without regard to case: "Ann" and "ann" must stay one user.
        known = User.objects.filter(username__iexact=name)
        self.user = known.filter(username=name).first() or known.first()
        return name

    def clean(self) -> dict[str, Any]:
        found = super().clean() or {}
        name, password = found.get("username"), found.get("password")
        if not name:
            return found
        if self.user is not None:
            if password:
                says = f"First password: {name} is a user already and keeps the present password."
                self.add_error("password", f"{says} Leave it empty.")
        elif not password:
            self.add_error("password", f"First password: empty; {name} is new and needs one.")
        elif password != found.get("password_again"):
            self.add_error("password_again", "First password again: it differs from the first.")
        else:
            self._judge_password(password, User(username=name))
        return found

    def _judge_password(self, password: str, user: User) -> None:
        try:
            validate_password(password, user)
        except forms.ValidationError as fault:
            self.add_error("password", fault)
