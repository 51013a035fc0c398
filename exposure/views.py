"""Samples: the list, one sample with its history, recording, correcting, withdrawing."""

from typing import Any

from django.contrib import messages
from django.db.models import F, Q, QuerySet
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.urls import reverse
from django.views.decorators.http import require_GET, require_http_methods

from exposure import actions
from exposure.forms import SampleForm, task_agents_at, typed
from exposure.models import Sample, Task, TaskAgent
from exposure.units import convert, site_molar_volume_l_mol, site_pressure_kpa
from programme.export import csv_response
from programme.ledger.models import Entry
from programme.measured import Refused, read_date
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import (
    Head,
    ReasonForm,
    page_asked,
    record_asked,
    sort_asked,
    text_asked,
)

SORTS = {
    "date": "sampled_on",
    "task": "task_agent__task__name",
    "agent": "task_agent__agent__name",
    "worker": "worker__name",
    "result": "value",
    "number": "reference",
}
STATES = {
    "standing": "counted",
    "replaced": "replaced",
    "withdrawn": "withdrawn",
    "all": "all of them",
}
HEADER = (
    "sample number",
    "sampled on",
    "task code",
    "task",
    "CAS number",
    "agent",
    "fraction",
    "personnel number",
    "worn by",
    "where",
    "span",
    "minutes",
    "flow L/min",
    "volume L",
    "result as reported",
    "unit as reported",
    "result",
    "below detection",
    "detection limit",
    "unit",
    "method",
    "laboratory",
    "note",
    "state",
    "reason",
    "record",
)


def samples_at(request: SiteRequest) -> QuerySet[Sample]:
    """The samples of the request's site with what their lines show."""
    rows = Sample.objects.for_user(request.user).at(request.site)
    found: QuerySet[Sample] = rows.select_related(
        "task_agent__task__site", "task_agent__agent", "worker", "replaced_by"
    )
    return found


def sample_of(request: SiteRequest, pk: int) -> Sample:
    """One sample of the request's own site, or not found."""
    return get_object_or_404(samples_at(request), pk=pk)


def state_of(sample: Sample) -> str:
    """counted, replaced or withdrawn."""
    if sample.replaced_by_id is not None:
        return STATES["replaced"]
    return STATES["withdrawn"] if sample.withdrawn_at else STATES["standing"]


def _day(request: SiteRequest, name: str, label: str) -> tuple[str, Any]:
    text = request.GET.get(name, "").strip()[:40]
    if not text:
        return "", None
    try:
        return text, read_date(text)
    except Refused as refused:
        messages.error(request, f"{label}: {refused}")
        return text, None


def _asked(request: SiteRequest) -> dict[str, Any]:
    """The filters as asked; what is not allowed counts as not asked."""
    get = request.GET.get
    state, below, where = get("state", ""), get("below", ""), get("where", "")
    start, first = _day(request, "from", "Sampled from")
    end, last = _day(request, "to", "Sampled to")
    return {
        "q": text_asked(request, "q"),
        "task": record_asked(request, "task"),
        "agent": record_asked(request, "agent"),
        "below": below if below in {"yes", "no"} else "",
        "where": where if where in Sample.Where.values else "",
        "state": state if state in STATES else "standing",
        "from": start,
        "to": end,
        "first": first,
        "last": last,
    }


def _matching(rows: QuerySet[Sample], asked: dict[str, Any]) -> QuerySet[Sample]:
    states = {
        "standing": Q(replaced_by=None, withdrawn_at=None),
        "replaced": ~Q(replaced_by=None),
        "withdrawn": ~Q(withdrawn_at=None),
        "all": Q(),
    }
    q = asked["q"]
    given = {
        "task_agent__task": asked["task"],
        "task_agent__agent": asked["agent"],
        "where": asked["where"] or None,
        "sampled_on__gte": asked["first"],
        "sampled_on__lte": asked["last"],
        "is_censored": {"yes": True, "no": False}.get(asked["below"]),
    }
    rows = rows.filter(states[asked["state"]])
    rows = rows.filter(**{name: value for name, value in given.items() if value is not None})
    if q:
        rows = rows.filter(
            Q(reference__icontains=q) | Q(worker__name__icontains=q) | Q(laboratory__icontains=q)
        )
    return rows


def _csv(request: SiteRequest, rows: QuerySet[Sample]) -> HttpResponse:
    cells = (
        (
            one.reference,
            one.sampled_on,
            one.task_agent.task.code,
            one.task_agent.task.name,
            one.task_agent.agent.cas,
            one.task_agent.agent.name,
            one.task_agent.fraction,
            one.worker.personnel_number if one.worker else None,
            one.worker.name if one.worker else None,
            one.where,
            one.span,
            one.minutes,
            one.flow_l_min,
            one.volume_l,
            one.result_as_reported,
            one.unit_as_reported,
            one.value,
            one.is_censored,
            one.lod,
            one.unit,
            one.method,
            one.laboratory,
            one.note,
            state_of(one),
            one.change_reason,
            one.pk,
        )
        for one in rows.iterator(2000)
    )
    return csv_response(f"{request.site.code}-samples-{request.site.today()}", HEADER, cells)


@site_page()
@require_GET
def samples(request: SiteRequest) -> HttpResponse:
    asked = _asked(request)
    rows = _matching(samples_at(request), asked)
    sort = sort_asked(request, SORTS, "-date")
    key = F(SORTS[sort.lstrip("-")])
    by = key.desc(nulls_last=True) if sort.startswith("-") else key.asc(nulls_last=True)
    rows = rows.order_by(by, "-pk")
    if request.GET.get("format") == "csv":
        return _csv(request, rows)
    groups = list(task_agents_at(request.site))
    heads = [
        Head("Sampled", "date", sort),
        Head("Task", "task", sort),
        Head("Agent", "agent", sort),
        Head("Worn by", "worker", sort),
        Head("Where and span"),
        Head("Result as reported", "result", sort, is_number=True),
        Head("Sample number", "number", sort),
    ]
    context = {
        "page": page_asked(request, rows),
        "heads": heads,
        "asked": asked,
        "sort": sort,
        "states": STATES,
        "wheres": Sample.Where.choices,
        "tasks": sorted({row.task for row in groups}, key=str),
        "agents": sorted({row.agent for row in groups}, key=str),
        "has_any": Sample.objects.at(request.site).exists(),
        "has_group": bool(groups),
    }
    return render(request, "exposure/samples.html", context)


def _other_unit(sample: Sample) -> tuple[float, str] | None:
    """The result in the other of ppm and mg/m3 in the air of the site, where that is possible."""
    row = sample.task_agent
    other = {"ppm": "mg/m3", "mg/m3": "ppm"}.get(sample.unit)
    if other is None or row.form != TaskAgent.Form.GAS:
        return None
    volume = site_molar_volume_l_mol(row.task.site)
    try:
        value = convert(
            sample.value, row.agent, source=sample.unit, target=other, molar_volume=volume
        )
    except ValueError:
        return None
    return value, other


def _versions(sample: Sample) -> list[Sample]:
    """The sample, what it replaced and what replaced it, oldest first."""
    found = [sample]
    while (older := Sample.objects.filter(replaced_by=found[0]).first()) is not None:
        found.insert(0, older)
    while found[-1].replaced_by is not None:
        found.append(found[-1].replaced_by)
    return found


@site_page()
@require_GET
def sample(request: SiteRequest, pk: int) -> HttpResponse:
    one = sample_of(request, pk)
    versions = _versions(one)
    history = Entry.objects.filter(
        chain=request.site.code,
        subject_kind="exposure.sample",
        subject_id__in=[str(row.pk) for row in versions],
    ).order_by("-serial")
    context = {
        "sample": one,
        "state": state_of(one),
        "other": _other_unit(one),
        "newest": versions[-1],
        "older": [row for row in versions if row.replaced_by_id == one.pk],
        "history": history,
        "site_kpa": site_pressure_kpa(request.site),
    }
    return render(request, "exposure/sample.html", context)


def _first(request: SiteRequest) -> dict[str, Any]:
    """What a new form shows: the group a link came from, and the last campaign's usual answers."""
    group, task = record_asked(request, "task_agent"), record_asked(request, "task")
    if group is None and task is not None:
        first = task_agents_at(request.site).filter(task=task).first()
        group = first.pk if first else None
    return {"task_agent": group, "worker": record_asked(request, "worker")}


@site_page("samples")
@require_http_methods(["GET", "POST"])
def sample_add(request: SiteRequest) -> HttpResponse:
    form = SampleForm(
        request.POST or None,
        site=request.site,
        today=request.site.today(),
        initial=_first(request),
    )
    if form.is_valid() and form.sample is not None:
        try:
            one = actions.record_sample(form.sample, by=request.user)
        except ValueError as refused:
            form.add_error("reference", str(refused))
        else:
            messages.success(request, f"Recorded: {one}.")
            return redirect("exposure:sample", request.site.code, one.pk)
    context = {"form": form, "old": None, "has_group": task_agents_at(request.site).exists()}
    return render(request, "exposure/sample_form.html", context, status=_status(form))


def _status(form: Any) -> int:
    return 422 if form.is_bound else 200


@site_page("samples")
@require_http_methods(["GET", "POST"])
def sample_replace(request: SiteRequest, pk: int) -> HttpResponse:
    old = sample_of(request, pk)
    if not old.stands:
        messages.error(request, f"{old} was {state_of(old)} before; correct the newest one.")
        return redirect("exposure:sample", request.site.code, _versions(old)[-1].pk)
    form = SampleForm(
        request.POST or None,
        site=request.site,
        today=request.site.today(),
        old=old,
        initial=typed(old),
    )
    if form.is_valid() and form.sample is not None:
        reason = form.cleaned_data["reason"]
        try:
            new = actions.replace_sample(old, form.sample, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, "Corrected; both records stay on file.")
            return redirect("exposure:sample", request.site.code, new.pk)
    context = {"form": form, "old": old, "has_group": True}
    return render(request, "exposure/sample_form.html", context, status=_status(form))


@site_page("samples")
@require_http_methods(["GET", "POST"])
def sample_withdraw(request: SiteRequest, pk: int) -> HttpResponse:
    old = sample_of(request, pk)
    form = ReasonForm(request.POST or None, submit="Withdraw this sample")
    if form.is_valid():
        try:
            actions.withdraw_sample(old, by=request.user, reason=form.cleaned_data["reason"])
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, "Withdrawn; it stays on file and no longer counts.")
            return redirect("exposure:sample", request.site.code, old.pk)
    context = {"form": form, "what": f"sample {old}", "back": _sample_url(old)}
    return render(request, "exposure/withdraw.html", context, status=_status(form))


def _sample_url(one: Sample) -> str:
    return reverse("exposure:sample", args=[one.task_agent.task.site.code, one.pk])


def task_at(request: SiteRequest, pk: int) -> Task:
    """A task of the request's own site, or not found."""
    rows = Task.objects.for_user(request.user).at(request.site).select_related("site")
    task: Task = get_object_or_404(rows, pk=pk)
    return task
