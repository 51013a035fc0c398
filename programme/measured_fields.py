"""Form fields for measured numbers, results and days; all read by `programme.measured`."""

from datetime import date
from typing import Any

from django import forms
from django.core.exceptions import ValidationError
from django.forms.utils import pretty_name

from programme.figures import unit_sign
from programme.measured import (
    POINT,
    Reading,
    Refused,
    read_date,
    read_number,
    read_result,
    shown_number,
)


def range_text(
    at_least: float | None, at_most: float | None, *, unit: str = "", above: float | None = None
) -> str:
    """What is allowed, as a person reads it: "0.001 to 100 L/min", "above 0, at most 5 mg/m³"."""
    low = None if at_least is None else shown_number(at_least)
    high = None if at_most is None else shown_number(at_most)
    if low is not None and high is not None:
        text = f"{low} to {high}"
    else:
        parts = []
        if above is not None:
            parts.append(f"above {shown_number(above)}")
        if low is not None:
            parts.append(f"at least {low}")
        if high is not None:
            parts.append(f"at most {high}")
        text = ", ".join(parts) or "a number"
    return f"{text} {unit_sign(unit)}".strip()


class _Named(forms.CharField):
    """A text field that can say its own name in a refusal and keeps what was typed."""

    _name = ""
    _form: forms.BaseForm | None = None

    def __init__(self, **kwargs: Any) -> None:
        kwargs.setdefault("max_length", 60)
        super().__init__(**kwargs)

    def get_bound_field(self, form: forms.BaseForm, field_name: str) -> forms.BoundField:
        self._name = str(self.label or pretty_name(field_name))
        self._form = form
        return super().get_bound_field(form, field_name)

    def _refuse(self, text: object, allowed: str) -> ValidationError:
        start = f"{self._name}: " if self._name else ""
        return ValidationError(f"{start}{text} is not allowed; {allowed}", code="invalid")

    def validate(self, value: Any) -> None:
        if self.required and value is None:
            raise ValidationError(self.error_messages["required"], code="required")

    def run_validators(self, value: Any) -> None:
        """The text was checked before it was read; the value has no text validators."""

    def _text(self, value: Any) -> str:
        text = str(super().to_python(value) or "")
        if "\x00" in text or len(text) > (self.max_length or len(text)):
            raise self._refuse(repr(text[:20]), f"at most {self.max_length} characters")
        return text


class MeasuredField(_Named):
    """A measured number with its unit and its range; cleans to a float, or None where empty.

    Args:
        unit: as kept, e.g. "L/min" or "mg/m3"; shown with the range under the field.
        at_least: smallest value allowed, itself allowed.
        at_most: largest value allowed, itself allowed.
        above: value that must be exceeded.
        decimal: "point", "comma" or "either".
    """

    def __init__(
        self,
        *,
        unit: str = "",
        at_least: float | None = None,
        at_most: float | None = None,
        above: float | None = None,
        decimal: str = POINT,
        **kwargs: Any,
    ) -> None:
        self.unit, self.at_least, self.at_most = unit, at_least, at_most
        self.above, self.decimal = above, decimal
        self.allowed = range_text(at_least, at_most, unit=unit, above=above)
        if unit or (at_least, at_most, above) != (None, None, None):
            kwargs.setdefault("help_text", self.allowed)
        super().__init__(**kwargs)

    def widget_attrs(self, widget: forms.Widget) -> dict[str, str]:
        return super().widget_attrs(widget) | {"inputmode": "decimal", "autocomplete": "off"}

    def to_python(self, value: Any) -> float | None:  # type: ignore[override]
        text = self._text(value)
        if not text:
            return None
        try:
            number = read_number(text, decimal=self.decimal)
        except Refused as refused:
            raise self._refuse(text, f"{self.allowed} ({refused.allowed})") from refused
        is_in = (
            (self.at_least is None or number >= self.at_least)
            and (self.at_most is None or number <= self.at_most)
            and (self.above is None or number > self.above)
        )
        if not is_in:
            raise self._refuse(text, self.allowed)
        return number

    def prepare_value(self, value: Any) -> Any:
        return shown_number(value) if isinstance(value, (int, float)) else value

    def has_changed(self, initial: Any, data: Any) -> bool:
        try:
            return bool(self.to_python(data) != initial)
        except ValidationError:
            return True


class ResultField(_Named):
    """A sample result: a number above 0, "<0.02", or "ND" with its limit; cleans to a `Reading`.

    Args:
        lod_from: name of the form's field that holds the detection limit, if it has one.
        decimal: "point", "comma" or "either".
    """

    def __init__(self, *, lod_from: str = "", decimal: str = POINT, **kwargs: Any) -> None:
        self.lod_from, self.decimal = lod_from, decimal
        kwargs.setdefault("help_text", "a number above 0; below detection as <0.02")
        super().__init__(**kwargs)

    def _lod_text(self) -> str:
        if not self.lod_from or self._form is None or not self._form.is_bound:
            return ""
        return str(self._form.data.get(self._form.add_prefix(self.lod_from)) or "")

    def to_python(self, value: Any) -> Reading | None:  # type: ignore[override]
        text = self._text(value)
        if not text:
            return None
        try:
            return read_result(text, self._lod_text(), decimal=self.decimal)
        except Refused as refused:
            start = f"{self._name}: " if self._name else ""
            raise ValidationError(f"{start}{refused}", code="invalid") from refused

    def prepare_value(self, value: Any) -> Any:
        return value.as_reported if isinstance(value, Reading) else value


class DayField(_Named):
    """A day; cleans to a date, or None where empty. A browser's date box sends the ISO form.

    Args:
        order: "dmy" or "mdy" where dates with the year last are expected; None asks.
        earliest: first day allowed.
        latest: last day allowed.
    """

    def __init__(
        self,
        *,
        order: str | None = None,
        earliest: date | None = None,
        latest: date | None = None,
        **kwargs: Any,
    ) -> None:
        self.order, self.earliest, self.latest = order, earliest, latest
        kwargs.setdefault("widget", forms.DateInput(format="%Y-%m-%d", attrs={"type": "date"}))
        super().__init__(**kwargs)

    def to_python(self, value: Any) -> date | None:  # type: ignore[override]
        if isinstance(value, date):
            return value
        text = self._text(value)
        if not text:
            return None
        try:
            day = read_date(text, order=self.order)
        except Refused as refused:
            raise self._refuse(text, refused.allowed) from refused
        if self.earliest is not None and day < self.earliest:
            raise self._refuse(text, f"not before {self.earliest}")
        if self.latest is not None and day > self.latest:
            raise self._refuse(text, f"not after {self.latest}")
        return day
