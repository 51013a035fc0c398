"""Records: papers to print, the ledger and its check, files that came in."""

from datetime import date, timedelta
from typing import Any

from crispy_forms.helper import FormHelper
from crispy_forms.layout import Layout, Row, Submit
from django import forms
from django.contrib import messages
from django.db.models import Q
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.utils import timezone
from django.views.decorators.http import require_GET, require_POST

from exposure.models import Task
from programme.export import csv_response, safe_file_name
from programme.ledger.actions import head_of, verify
from programme.ledger.models import Entry
from programme.measured_fields import DayField
from programme.records.models import ImportBatch
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import page_asked, text_asked
from programme.roster.models import Role
from programme.roster.permissions import may
from programme.selection.assess import assess

A_YEAR = timedelta(days=365)
EARLIEST = date(1970, 1, 1)
LATELY = 10
LEDGER_HEADER = ("row", "at", "by", "act", "subject", "says", "reason", "hash")


class SummaryForm(forms.Form):
    """Which period and day the compliance summary is for."""

    start = DayField(label="Period from", earliest=EARLIEST)
    end = DayField(label="Period to", earliest=EARLIEST)
    judged = DayField(label="Judged for", earliest=EARLIEST)
    has_working = forms.BooleanField(
        label="with the working of every figure", required=False, initial=True
    )

    def __init__(self, *args: Any, **kwargs: Any) -> None:
        super().__init__(*args, **kwargs)
        self.helper = FormHelper()
        self.helper.form_method = "get"
        self.helper.form_action = "."
        self.helper.layout = Layout(
            Row("start", "end", "judged"), "has_working", Submit("print", "Make the summary (PDF)")
        )

    def clean(self) -> dict[str, Any]:
        found = super().clean() or {}
        start, end = found.get("start"), found.get("end")
        if start and end and start > end:
            self.add_error("end", f"Period to: {end} is not allowed; it must be {start} or later.")
        return found


def _pdf(content: bytes, name: str) -> HttpResponse:
    response = HttpResponse(content, content_type="application/pdf")
    response["Content-Disposition"] = f'attachment; filename="{safe_file_name(name, "pdf")}"'
    response["X-Content-Type-Options"] = "nosniff"
    return response


def _by(request: SiteRequest) -> str:
    return f"{request.user.get_full_name() or request.user.username}, {Role(request.role).label}"


@site_page()
@require_GET
def records(request: SiteRequest) -> HttpResponse:
    can_print = may(request.role, "summary")
    first = {"start": request.on - A_YEAR, "end": request.on, "judged": request.on}
    is_asked = can_print and "print" in request.GET
    form = SummaryForm(request.GET, initial=first) if is_asked else SummaryForm(initial=first)
    if is_asked and form.is_valid():
        return _summary(request, form.cleaned_data)
    rows = ImportBatch.objects.at(request.site)
    context = {
        "form": form if can_print else None,
        "head": head_of(request.site.code),
        "batches": rows[:LATELY],
        "tasks": Task.objects.at(request.site).active(request.on),
    }
    return render(request, "records/records.html", context, status=422 if form.is_bound else 200)


def _summary(request: SiteRequest, asked: dict[str, Any]) -> HttpResponse:
    # reportlab is heavy: only who prints loads it.
    from programme.records.papers.summary import Scope, compliance_summary

    scope = Scope(
        site=request.site,
        start=asked["start"],
        end=asked["end"],
        on=asked["judged"],
        by=_by(request),
        printed_at=timezone.now(),
        has_working=asked["has_working"],
    )
    name = f"{request.site.code} compliance {scope.start} to {scope.end}"
    return _pdf(compliance_summary(scope), name)


@site_page()
@require_GET
def shift_sheet(request: SiteRequest, pk: int) -> HttpResponse:
    from programme.records.papers.shift import shift_sheet as sheet

    rows = Task.objects.for_user(request.user).at(request.site).select_related("site")
    task = get_object_or_404(rows, pk=pk)
    chain = assess(task, on=request.on)
    content = sheet(chain, by=_by(request), printed_at=timezone.now())
    return _pdf(content, f"{task.code} shift sheet {request.on}")


@site_page()
@require_GET
def ledger(request: SiteRequest) -> HttpResponse:
    q = text_asked(request, "q")
    rows = Entry.objects.filter(chain=request.site.code).order_by("-serial")
    if not may(request.role, "see clearance limits"):
        rows = rows.exclude(subject_kind="roster.clearance")
    if q:
        rows = rows.filter(
            Q(act__icontains=q) | Q(says__icontains=q) | Q(by__icontains=q) | Q(reason__icontains=q)
        )
    if request.GET.get("format") == "csv":
        cells = (
            (r.serial, r.at.isoformat(), r.by, r.act, r.subject_kind, r.says, r.reason, r.hash)
            for r in rows.iterator()
        )
        return csv_response(f"{request.site.code}-ledger", LEDGER_HEADER, cells)
    context = {"page": page_asked(request, rows), "q": q, "head": head_of(request.site.code)}
    return render(request, "records/ledger.html", context)


@site_page()
@require_POST
def ledger_check(request: SiteRequest) -> HttpResponse:
    verdict = verify(request.site.code)
    if verdict.is_whole:
        says = f"The ledger is whole: {verdict.rows} rows, head {verdict.head}."
        messages.success(request, says)
    else:
        messages.error(request, "The ledger fails its check: " + "; ".join(verdict.faults))
    return redirect("records:ledger", request.site.code)
