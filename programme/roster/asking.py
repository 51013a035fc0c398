"""Forms that ask back, lists that sort and turn pages: what pages of several rooms share."""

import calendar
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any, TypeVar

from crispy_forms.helper import FormHelper
from crispy_forms.layout import ButtonHolder, Layout, Submit
from django import forms
from django.core.paginator import Page, Paginator
from django.http import HttpRequest
from django.utils.html import format_html
from django.utils.safestring import SafeString

ROWS_A_PAGE = 100
# Digits of the largest record number that any database keeps.
LONGEST_NUMBER = 18
Row = TypeVar("Row")


class AskingForm(forms.Form):
    """A form that may ask back: what is possible but unlikely is stored after a tick only."""

    is_meant = forms.BooleanField(required=False, label="Yes, this is meant")

    def set_layout(self, *parts: Any, submit: str, also: Sequence[Submit] = ()) -> None:
        """Lay out the form; the tick stands before the buttons once a question was asked."""
        self.helper = FormHelper()
        self.helper.layout = Layout(*parts, ButtonHolder(Submit("send", submit), *also))
        if self.is_bound and self.data.get(self.add_prefix("is_meant")):
            self._show_tick()

    def _show_tick(self) -> None:
        if "is_meant" not in self.helper.layout.fields:
            self.helper.layout.insert(len(self.helper.layout.fields) - 1, "is_meant")

    def ask(self, field: str | None, question: str) -> None:
        """Refuse for now and ask; a ticked box answers every question of the form."""
        if not self.cleaned_data.get("is_meant"):
            self.add_error(field, question)
            self._show_tick()


class ReasonForm(forms.Form):
    """Why a record is withdrawn."""

    reason = forms.CharField(
        label="Reason",
        max_length=1000,
        widget=forms.Textarea(attrs={"rows": 2}),
        help_text="kept with the record and in the ledger",
    )

    def __init__(self, *args: Any, submit: str = "Withdraw", **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.helper = FormHelper()
        self.helper.layout = Layout("reason", Submit("send", submit))


def with_offer(message: str, name: str, value: object) -> SafeString:
    """A refusal with the likeliest meaning as a button that sends the form with it.

    The button stands after the box, so what it sends is read last and wins.
    """
    return format_html(
        '{} <button type="submit" class="offer" name="{}" value="{}">Use {}</button>',
        message,
        name,
        value,
        value,
    )


def same_day_past(day: date, today: date) -> date:
    """The same month and day in the latest year that does not lie after today."""
    for year in (today.year, today.year - 1):
        last = calendar.monthrange(year, day.month)[1]
        past = date(year, day.month, min(day.day, last))
        if past <= today:
            return past
    return today


def future_refused(label: str, name: str, *, day: date, today: date) -> SafeString:
    """The refusal of a day that lies in the future, with the likeliest day meant."""
    message = f"{label}: {day} lies in the future; it may be up to {today}."
    return with_offer(message, name, same_day_past(day, today))


@dataclass(frozen=True)
class Head:
    """One column head: what it sorts by, how it is sorted now, and what a click asks for."""

    label: str
    key: str = ""
    now: str = ""
    is_number: bool = False

    @property
    def aria_sort(self) -> str:
        """The value of `aria-sort`."""
        if not self.key or self.now.lstrip("-") != self.key:
            return "none"
        return "descending" if self.now.startswith("-") else "ascending"

    @property
    def sort_next(self) -> str:
        """The value of `sort` that a click asks for."""
        return f"-{self.key}" if self.now == self.key else self.key


def text_asked(request: HttpRequest, name: str) -> str:
    """The text in the address under that name, trimmed, at most 120 characters, without NUL."""
    return request.GET.get(name, "").replace("\x00", "").strip()[:120]


def sort_asked(request: HttpRequest, allowed: Mapping[str, Any], default: str) -> str:
    """The sort key in `?sort=`, with "-" for downwards; `default` for any that is not allowed."""
    asked = request.GET.get("sort", "")
    return asked if asked.removeprefix("-") in allowed else default


def record_asked(request: HttpRequest, name: str) -> int | None:
    """The record number in `?name=`; None for any that cannot be one."""
    asked = request.GET.get(name, "")
    is_number = asked.isascii() and asked.isdecimal() and len(asked) <= LONGEST_NUMBER
    return int(asked) if is_number else None


def in_order(rows: Sequence[Row], sort: str, keys: Mapping[str, Callable[[Row], Any]]) -> list[Row]:
    """The rows sorted by that key; what is not known (None) comes last either way."""
    key = keys[sort.lstrip("-")]
    known = [row for row in rows if key(row) is not None]
    known.sort(key=key, reverse=sort.startswith("-"))
    return known + [row for row in rows if key(row) is None]


def page_asked(request: HttpRequest, rows: Any) -> Page:
    """The page in `?page=`; the first for any that cannot be read, the last beyond the end."""
    return Paginator(rows, ROWS_A_PAGE).get_page(request.GET.get("page"))
