"""Who is on a task with what, and which assemblies are assigned to it."""

from django.contrib import messages
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_http_methods, require_POST

from programme.roster.access import SiteRequest, site_page
from programme.selection import actions
from programme.selection.assess import assess
from programme.selection.forms import AssignForm, CrewForm, EndForm
from programme.selection.models import CrewMember, TaskAssembly
from programme.selection.views import task_of

LATELY = 10


@site_page("assign")
@require_http_methods(["GET", "POST"])
def crew(request: SiteRequest, pk: int) -> HttpResponse:
    task = task_of(request, pk)
    initial = {"worker": request.GET.get("worker"), "assembly": request.GET.get("assembly")}
    form = CrewForm(request.POST or None, task=task, on=request.on, initial=initial)
    if form.is_valid():
        row = actions.put_on_crew(
            task,
            form.cleaned_data["worker"],
            assembly=form.cleaned_data["assembly"],
            size=form.cleaned_data["size"],
            since=form.cleaned_data["since"],
            by=request.user,
        )
        messages.success(request, f"{row.worker.name} is on {task} from {row.active_from}.")
        return redirect("selection:crew", request.site.code, task.pk)
    rows = CrewMember.objects.at(request.site).filter(task=task)
    related = ("worker", "assembly", "size")
    context = {
        "form": form,
        "task": task,
        "chain": assess(task, on=request.on),
        "members": rows.active(request.on).select_related(*related).order_by("worker__name"),
        "lately": rows.exclude(active_to=None)
        .select_related(*related)
        .order_by("-active_to")[:LATELY],
    }
    return render(request, "selection/crew.html", context, status=422 if form.is_bound else 200)


@site_page("assign")
@require_POST
def take_off(request: SiteRequest, pk: int) -> HttpResponse:
    rows = CrewMember.objects.for_user(request.user).at(request.site)
    row = get_object_or_404(rows.select_related("task__site", "worker"), pk=pk)
    try:
        actions.take_off_crew(row, on=request.on, by=request.user)
    except ValueError as fault:
        messages.error(request, str(fault))
    else:
        says = f"{row.worker.name} is off {row.task} from {request.on}. Put back below if wrong."
        messages.success(request, says)
    return redirect("selection:crew", request.site.code, row.task_id)


@site_page("assign")
@require_POST
def put_back(request: SiteRequest, pk: int) -> HttpResponse:
    rows = (
        CrewMember.objects.for_user(request.user)
        .at(request.site)
        .select_related("task__site", "worker", "assembly", "size")
    )
    row = get_object_or_404(rows, pk=pk)
    actions.put_on_crew(
        row.task,
        row.worker,
        assembly=row.assembly,
        size=row.size,
        since=request.on,
        by=request.user,
    )
    messages.success(request, f"{row.worker.name} is back on {row.task}.")
    return redirect("selection:crew", request.site.code, row.task_id)


@site_page("assign")
@require_http_methods(["GET", "POST"])
def assign(request: SiteRequest, pk: int) -> HttpResponse:
    task = task_of(request, pk)
    initial = {"since": request.on, "assembly": request.GET.get("assembly")}
    form = AssignForm(request.POST or None, task=task, on=request.on, initial=initial)
    if form.is_valid():
        chosen = form.cleaned_data
        actions.assign(task, chosen["assembly"], since=chosen["since"], by=request.user)
        messages.success(request, f"{chosen['assembly']} is assigned to {task}.")
        return redirect("selection:assign", request.site.code, task.pk)
    rows = TaskAssembly.objects.at(request.site).filter(task=task)
    context = {
        "form": form,
        "task": task,
        "chain": assess(task, on=request.on),
        "rows": rows.select_related("assembly").order_by("active_to", "-active_from"),
    }
    return render(request, "selection/assign.html", context, status=422 if form.is_bound else 200)


@site_page("assign")
@require_http_methods(["GET", "POST"])
def assign_end(request: SiteRequest, pk: int) -> HttpResponse:
    rows = TaskAssembly.objects.for_user(request.user).at(request.site)
    row = get_object_or_404(rows.select_related("task__site", "assembly"), pk=pk)
    form = EndForm(request.POST or None, on=request.on)
    if form.is_valid():
        try:
            actions.end_assignment(row, **form.cleaned_data, by=request.user)
        except ValueError as fault:
            form.add_error(None, str(fault))
        else:
            messages.success(request, f"{row.assembly} is no longer assigned to {row.task}.")
            return redirect("selection:assign", request.site.code, row.task_id)
    context = {"form": form, "row": row}
    status = 422 if form.is_bound else 200
    return render(request, "selection/assign_end.html", context, status=status)
