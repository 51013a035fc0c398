"""People as the chain judges them: the list, one person's page, the pocket card."""

from typing import Any

from django.db.models import Q
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, render
from django.views.decorators.http import require_GET

from programme.export import csv_response
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import Head, in_order, page_asked, sort_asked, text_asked
from programme.roster.models import Worker
from programme.roster.permissions import may
from programme.selection.assess import verdicts_of
from programme.selection.person import (
    READINESS,
    STATES,
    PersonRow,
    history_of,
    papers_of,
    people_rows,
    saying_of,
)

SORTS = {
    "name": lambda row: row.worker.name.casefold(),
    "number": lambda row: row.worker.personnel_number,
    "employer": lambda row: row.worker.employer.casefold(),
    "ready": lambda row: row.order,
    "until": lambda row: row.lapses_on,
}
HEADER = (
    "personnel number",
    "name",
    "job",
    "employer",
    "contractor",
    "first day",
    "no longer here from",
    "readiness",
    "tasks may start",
    "tasks",
    "first date to lapse",
)


def _worker(request: SiteRequest, pk: int) -> Worker:
    rows = Worker.objects.for_user(request.user).at(request.site).select_related("site")
    return get_object_or_404(rows, pk=pk)


def _asked(request: SiteRequest) -> dict[str, str]:
    """The filters as asked; what is not allowed counts as not asked."""
    state = request.GET.get("state", "here")
    ready = request.GET.get("ready", "")
    whose = request.GET.get("whose", "")
    return {
        "q": text_asked(request, "q"),
        "state": state if state in STATES else "here",
        "ready": ready if ready in READINESS else "",
        "whose": whose if whose in {"own", "contractor"} else "",
    }


def _workers(request: SiteRequest, asked: dict[str, str]) -> Any:
    rows = Worker.objects.for_user(request.user).at(request.site).select_related("site")
    if asked["q"]:
        q = asked["q"]
        rows = rows.filter(
            Q(name__icontains=q)
            | Q(personnel_number__icontains=q)
            | Q(job__icontains=q)
            | Q(employer__icontains=q)
        )
    if asked["whose"]:
        rows = rows.filter(is_contractor=asked["whose"] == "contractor")
    if asked["state"] == "here":
        rows = rows.active(request.on)
    elif asked["state"] == "left":
        rows = rows.filter(active_to__lte=request.on)
    elif asked["state"] == "coming":
        rows = rows.filter(active_from__gt=request.on)
    return rows


def _csv(request: SiteRequest, rows: list[PersonRow]) -> HttpResponse:
    cells = (
        (
            row.worker.personnel_number,
            row.worker.name,
            row.worker.job,
            row.worker.employer,
            row.worker.is_contractor,
            row.worker.active_from,
            row.worker.active_to,
            row.says,
            row.may,
            row.of,
            row.lapses_on,
        )
        for row in rows
    )
    return csv_response(f"{request.site.code}-people-{request.on}", HEADER, cells)


@site_page()
@require_GET
def people(request: SiteRequest) -> HttpResponse:
    """Everybody of the site, with what they may start."""
    asked = _asked(request)
    rows = people_rows(_workers(request, asked), site=request.site, on=request.on)
    if asked["ready"]:
        rows = [row for row in rows if row.ready == asked["ready"]]
    sort = sort_asked(request, SORTS, "name")
    rows = in_order(rows, sort, SORTS)
    if request.GET.get("format") == "csv":
        return _csv(request, rows)
    heads = [
        Head("Name", "name", sort),
        Head("Number", "number", sort),
        Head("Job"),
        Head("Employer", "employer", sort),
        Head("May start", "ready", sort),
        Head("First date to lapse", "until", sort),
    ]
    context = {
        "page": page_asked(request, rows),
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "states": STATES,
        "readiness": READINESS,
        "has_any": bool(rows) or Worker.objects.at(request.site).exists(),
    }
    return render(request, "roster/people.html", context)


@site_page()
@require_GET
def person(request: SiteRequest, pk: int) -> HttpResponse:
    """What this person may do today, with what, until when; and the papers behind it."""
    worker = _worker(request, pk)
    sees_limits = may(request.role, "see clearance limits")
    tasks = [
        saying_of(chain, verdict, sees_medical=sees_limits)
        for chain, verdict in verdicts_of(worker, on=request.on)
    ]
    context = {
        "worker": worker,
        "tasks": tasks,
        "may_some": sum(task.may_start for task in tasks),
        "papers": papers_of(worker, on=request.on),
        "sees_limits": sees_limits,
        "history": history_of(worker),
    }
    return render(request, "roster/person.html", context)


@site_page()
@require_GET
def card(request: SiteRequest, pk: int) -> HttpResponse:
    """The pocket card: one a task that the person may start."""
    worker = _worker(request, pk)
    # A card is carried in the open: it says what may be done, never what may not, nor why.
    tasks = [
        saying_of(chain, verdict, sees_medical=False)
        for chain, verdict in verdicts_of(worker, on=request.on)
        if verdict.may_start
    ]
    return render(request, "roster/card.html", {"worker": worker, "tasks": tasks})
