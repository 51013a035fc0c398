"""Today, the tasks, and one task with its whole chain."""

from datetime import date
from typing import Any

from django.http import HttpResponse
from django.shortcuts import get_object_or_404, render
from django.views.decorators.http import require_GET

from exposure.models import Task
from programme.export import csv_response
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import Head, in_order, page_asked, sort_asked, text_asked
from programme.roster.permissions import may
from programme.selection.agenda import against, agenda, lapses
from programme.selection.assess import assess, assess_site
from programme.selection.chain import LINKS, Chain, veiled
from programme.selection.pictures import pictures_of

STATES = {"holds": "holds", "due soon": "due soon", "broken": "broken"}
SORTS = {
    "task": lambda chain: chain.task.casefold(),
    "break": lambda chain: (
        LINKS.index(chain.first_break.name) if chain.first_break else len(LINKS),
        chain.task.casefold(),
    ),
    "crew": lambda chain: chain.may_start,
}
HEADER = (
    "task code",
    "task",
    "judged for",
    "state",
    "first break",
    *(f"{name.lower()} state" for name in LINKS),
    *(f"{name.lower()} figure" for name in LINKS),
    "crew may start",
    "crew",
    "mismatches",
)


def seen_by(role: str, chains: list[Chain]) -> list[Chain]:
    """The chains as this role may see them: medical reasons only for whom they concern."""
    return chains if may(role, "see clearance limits") else [veiled(chain) for chain in chains]


def task_of(request: SiteRequest, pk: int) -> Task:
    rows = Task.objects.for_user(request.user).at(request.site).select_related("site")
    return get_object_or_404(rows, pk=pk)


@site_page()
@require_GET
def today(request: SiteRequest) -> HttpResponse:
    chains = seen_by(request.role, assess_site(request.site, on=request.on))
    days = request.site.due_soon_days
    if request.GET.get("format") == "csv":
        return _today_csv(request, chains, days)
    context = {"agenda": agenda(chains, on=request.on, days=days), "days": days}
    return render(request, "selection/today.html", context)


def _today_csv(request: SiteRequest, chains: list[Chain], days: int) -> HttpResponse:
    rows: list[tuple[Any, ...]] = [
        (
            m.severity,
            chain.task,
            m.link,
            m.worker,
            m.says,
            m.remedies[0].says if m.remedies else "",
            m.source,
            m.sure,
            m.due_on,
        )
        for chain in chains
        for m in chain.mismatches
    ]
    rows += [
        ("due", ", ".join(one.tasks), "", one.worker, one.what, "", "", "", one.day)
        for one in lapses(chains, on=request.on, days=days)
    ]
    header = ("severity", "task", "link", "worker", "says", "remedy", "source", "mark", "day")
    return csv_response(f"{request.site.code}-today-{request.on}", header, rows)


def _asked(request: SiteRequest) -> dict[str, str]:
    state, link = request.GET.get("state", ""), request.GET.get("link", "")
    return {
        "q": text_asked(request, "q"),
        "state": state if state in STATES else "",
        "link": link if link in LINKS else "",
    }


def _matches(chain: Chain, asked: dict[str, str]) -> bool:
    broken = chain.first_break
    return (
        asked["q"].casefold() in f"{chain.task} {chain.task_code}".casefold()
        and asked["state"] in {"", chain.state}
        and asked["link"] in {"", broken.name if broken else None}
    )


@site_page()
@require_GET
def tasks(request: SiteRequest) -> HttpResponse:
    asked = _asked(request)
    every = seen_by(request.role, assess_site(request.site, on=request.on))
    chains = [chain for chain in every if _matches(chain, asked)]
    sort = sort_asked(request, SORTS, "break")
    chains = in_order(chains, sort, SORTS)
    if request.GET.get("format") == "csv":
        return csv_response(
            f"{request.site.code}-tasks-{request.on}", HEADER, map(_csv_row, chains)
        )
    heads = [
        Head("Task", "task", sort),
        Head("Chain"),
        Head("First break", "break", sort),
        Head("Crew may", "crew", sort, is_number=True),
    ]
    context = {
        "page": page_asked(request, chains),
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "states": STATES,
        "links": LINKS,
        "has_any": bool(every),
    }
    return render(request, "selection/tasks.html", context)


def _csv_row(chain: Chain) -> tuple[Any, ...]:
    return (
        chain.task_code,
        chain.task,
        chain.on,
        chain.state,
        chain.first_break.name if chain.first_break else "",
        *(link.state for link in chain.links),
        *(link.figure for link in chain.links),
        chain.may_start,
        len(chain.crew),
        " | ".join(m.says for m in against(chain)),
    )


@site_page()
@require_GET
def task(request: SiteRequest, pk: int) -> HttpResponse:
    one = task_of(request, pk)
    note = _outside(one, request.on)
    context: dict[str, Any] = {"task": one, "note": note}
    if not note:
        chain = seen_by(request.role, [assess(one, on=request.on)])[0]
        context |= {"chain": chain, "pictures": pictures_of(one, on=request.on)}
    return render(request, "selection/task.html", context)


def _outside(one: Task, on: date) -> str:
    """What to say of a day on which the task did not exist; "" where it did."""
    if on < one.active_from:
        return f"Nothing is recorded for this task on {on}. Its first day is {one.active_from}."
    if one.active_to and on >= one.active_to:
        return f"This task ended: its last day was before {one.active_to}."
    return ""
