"""The fields name themselves, what was typed and what is allowed, and keep what was typed."""

from datetime import date

import pytest
from django import forms

from programme.measured_fields import DayField, MeasuredField, ResultField


class AirForm(forms.Form):
    flow = MeasuredField(unit="L/min", at_least=0.001, at_most=100, required=False)
    limit = MeasuredField(unit="mg/m3", above=0, required=False)
    result = ResultField(lod_from="lod", required=False)
    lod = forms.CharField(required=False)
    taken = DayField(latest=date(2026, 3, 31), required=False)


def fault(name, **data):
    form = AirForm(data)
    assert not form.is_valid()
    return form.errors[name][0]


@pytest.mark.parametrize(
    ("name", "typed", "says"),
    [
        ("flow", "22 000", "Flow: 22 000 is not allowed; 0.001 to 100 L/min"),
        ("flow", "101", "Flow: 101 is not allowed; 0.001 to 100 L/min"),
        ("flow", "-0", "Flow: -0 is not allowed; 0.001 to 100 L/min"),
        ("flow", "NaN", "Flow: NaN is not allowed; 0.001 to 100 L/min"),
        ("limit", "0", "Limit: 0 is not allowed; above 0 mg/m³"),
        ("result", "0", "enter the detection limit as <value"),
        ("result", "ND", "Result: 'ND' needs its detection limit"),
        ("taken", "2026-04-01", "Taken: 2026-04-01 is not allowed; not after 2026-03-31"),
        ("taken", "03/04/2026", "say which comes first"),
    ],
)
def test_the_refusal_names_field_value_and_what_is_allowed(name, typed, says):
    assert says in fault(name, **{name: typed})


def test_what_was_typed_stays_in_the_box():
    form = AirForm({"flow": "22 000"})
    assert 'value="22 000"' in str(form["flow"])


def test_the_values_come_out_as_numbers_and_readings():
    form = AirForm({"flow": "2.0", "result": "ND", "lod": "0.02", "taken": "2026-03-04"})
    assert form.is_valid(), form.errors
    cleaned = form.cleaned_data
    assert (cleaned["flow"], cleaned["result"].lod, cleaned["limit"]) == (2.0, 0.02, None)
    assert cleaned["taken"] == date(2026, 3, 4)


def test_an_empty_required_number_is_asked_for():
    field = MeasuredField(unit="min")
    with pytest.raises(forms.ValidationError, match="required"):
        field.clean("")


def test_a_stored_number_is_shown_without_a_false_decimal():
    form = AirForm(initial={"flow": 2.0})
    assert 'value="2"' in str(form["flow"])


def test_unit_and_range_stand_under_the_field():
    assert AirForm()["flow"].help_text == "0.001 to 100 L/min"
