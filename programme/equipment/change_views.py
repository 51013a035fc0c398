"""The log of filter changes: the list, a new line, taking a line back."""

from typing import Any

from django.contrib import messages
from django.db.models import F, Q, QuerySet
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_GET, require_http_methods

from programme.equipment import actions
from programme.equipment.forms import FilterChangeForm
from programme.equipment.models import Assembly, FilterChange
from programme.export import csv_response
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import (
    Head,
    ReasonForm,
    page_asked,
    record_asked,
    sort_asked,
    text_asked,
)
from programme.roster.models import Worker, active_on

SORTS = {"at": "fitted_at", "worker": "worker__name", "assembly": "assembly__name"}
HEADER = (
    "personnel number",
    "worker",
    "assembly",
    "filter or cartridge",
    "fitted at",
    "shifts worn since",
    "lot",
    "note",
    "recorded by",
    "withdrawn at",
    "reason",
)


def _rows(request: SiteRequest) -> QuerySet[FilterChange]:
    rows = FilterChange.objects.for_user(request.user).at(request.site)
    found: QuerySet[FilterChange] = rows.select_related("worker__site", "assembly__element")
    return found


def _asked(request: SiteRequest) -> dict[str, Any]:
    return {
        "q": text_asked(request, "q"),
        "worker": record_asked(request, "worker"),
        "assembly": record_asked(request, "assembly"),
        "state": "all" if request.GET.get("state") == "all" else "standing",
    }


def _matching(rows: QuerySet[FilterChange], asked: dict[str, Any]) -> QuerySet[FilterChange]:
    if asked["state"] == "standing":
        rows = rows.filter(replaced_by=None, withdrawn_at=None)
    if asked["worker"] is not None:
        rows = rows.filter(worker=asked["worker"])
    if asked["assembly"] is not None:
        rows = rows.filter(assembly=asked["assembly"])
    if asked["q"]:
        q = asked["q"]
        rows = rows.filter(
            Q(worker__name__icontains=q)
            | Q(worker__personnel_number__icontains=q)
            | Q(lot__icontains=q)
        )
    return rows


def _csv(request: SiteRequest, rows: QuerySet[FilterChange]) -> HttpResponse:
    cells = (
        (
            one.worker.personnel_number,
            one.worker.name,
            one.assembly.name,
            one.assembly.element.name if one.assembly.element else None,
            one.fitted_at,
            one.shifts_used,
            one.lot,
            one.note,
            one.recorded_by,
            one.withdrawn_at,
            one.change_reason,
        )
        for one in rows.iterator(2000)
    )
    return csv_response(f"{request.site.code}-filter-changes-{request.on}", HEADER, cells)


@site_page()
@require_GET
def changes(request: SiteRequest) -> HttpResponse:
    asked = _asked(request)
    sort = sort_asked(request, SORTS, "-at")
    key = F(SORTS[sort.lstrip("-")])
    by = key.desc() if sort.startswith("-") else key.asc()
    rows = _matching(_rows(request), asked).order_by(by, "-pk")
    if request.GET.get("format") == "csv":
        return _csv(request, rows)
    heads = [
        Head("Fitted", "at", sort),
        Head("Worker", "worker", sort),
        Head("Assembly", "assembly", sort),
        Head("Filter or cartridge"),
        Head("Shifts worn since", is_number=True),
        Head("Lot and note"),
    ]
    context = {
        "page": page_asked(request, rows),
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "assemblies": Assembly.objects.at(request.site).exclude(element=None),
        "has_any": FilterChange.objects.at(request.site).exists(),
        "zone": request.site.time_zone,
    }
    return render(request, "equipment/changes.html", context)


def _first(request: SiteRequest) -> dict[str, Any]:
    """The worker a link came from, and the assembly that worker wears if there is just one."""
    pk, assembly = record_asked(request, "worker"), record_asked(request, "assembly")
    worker = Worker.objects.at(request.site).filter(pk=pk).first() if pk else None
    if worker is not None and assembly is None:
        crews = worker.crews.filter(active_on(request.site.today()), assembly__isnull=False)
        worn = set(crews.values_list("assembly", flat=True))
        assembly = worn.pop() if len(worn) == 1 else None
    return {"worker": pk, "assembly": assembly}


@site_page("assign")
@require_http_methods(["GET", "POST"])
def filter_change(request: SiteRequest) -> HttpResponse:
    form = FilterChangeForm(request.POST or None, site=request.site, initial=_first(request))
    if form.is_valid():
        try:
            change = actions.record_filter_change(form.change(), by=request.user)
        except ValueError as refused:
            form.add_error("fitted_at", str(refused))
        else:
            messages.success(request, f"In the log: {change}.")
            return redirect(change.worker)
    context = {
        "form": form,
        "has_assembly": Assembly.objects.at(request.site)
        .filter(withdrawn_on=None, element__isnull=False)
        .exists(),
    }
    status = 422 if form.is_bound else 200
    return render(request, "equipment/filter_change.html", context, status=status)


@site_page("assign")
@require_http_methods(["GET", "POST"])
def change_withdraw(request: SiteRequest, pk: int) -> HttpResponse:
    change = get_object_or_404(_rows(request), pk=pk)
    form = ReasonForm(request.POST or None, submit="Withdraw this line")
    if form.is_valid():
        reason = form.cleaned_data["reason"]
        try:
            actions.withdraw_filter_change(change, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, "Withdrawn; it stays on file and no longer counts.")
            return redirect("equipment:changes", request.site.code)
    context = {"form": form, "change": change}
    status = 422 if form.is_bound else 200
    return render(request, "equipment/change_withdraw.html", context, status=status)
