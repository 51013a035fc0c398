"""Forms of tasks and of the agents met in them; their list and page judge, and stand elsewhere."""

from typing import Any

from django.contrib import messages
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_http_methods

from exposure import actions
from exposure.models import Agent, Task, TaskAgent
from exposure.reference import typical_sizes
from exposure.task_forms import TaskAgentForm, TaskForm
from exposure.views import task_at
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import ReasonForm, record_asked


def _answer(request: SiteRequest, template: str, context: dict[str, Any]) -> HttpResponse:
    status = 422 if context["form"].is_bound else 200
    return render(request, template, context, status=status)


def _task_form(request: SiteRequest, task: Task) -> HttpResponse:
    is_new, shown_name, today = task.pk is None, task.name, request.site.today()
    initial = {"active_from": today} if is_new else None
    form = TaskForm(request.POST or None, instance=task, today=today, initial=initial)
    if form.is_valid():
        try:
            actions.save_task(form.instance, by=request.user)
        except ValueError as refused:
            form.add_error("code", str(refused))
        else:
            messages.success(request, f"{task.name}: {'added' if is_new else 'saved'}.")
            return redirect(task)
    context = {"form": form, "task": task, "is_new": is_new, "shown_name": shown_name}
    return _answer(request, "exposure/task_form.html", context)


@site_page("tasks")
@require_http_methods(["GET", "POST"])
def task_add(request: SiteRequest) -> HttpResponse:
    return _task_form(request, Task(site=request.site))


@site_page("tasks")
@require_http_methods(["GET", "POST"])
def task_edit(request: SiteRequest, pk: int) -> HttpResponse:
    return _task_form(request, task_at(request, pk))


def _task_agent_form(request: SiteRequest, row: TaskAgent) -> HttpResponse:
    is_new = row.pk is None
    initial = {"agent": record_asked(request, "agent")} if is_new else None
    form = TaskAgentForm(request.POST or None, instance=row, sizes=typical_sizes(), initial=initial)
    if form.is_valid():
        try:
            actions.save_task_agent(form.instance, by=request.user)
        except ValueError as refused:
            form.add_error("agent", str(refused))
        else:
            messages.success(request, f"{row.agent}: {'added' if is_new else 'saved'}.")
            return redirect(row.task)
    context = {
        "form": form,
        "task": row.task,
        "row": row,
        "is_new": is_new,
        "has_agents": Agent.objects.at(request.site).exists(),
        "can_remove": not is_new and not row.samples.exists(),
    }
    return _answer(request, "exposure/task_agent_form.html", context)


def _task_agent(request: SiteRequest, pk: int) -> TaskAgent:
    rows = TaskAgent.objects.for_user(request.user).at(request.site)
    row: TaskAgent = get_object_or_404(rows.select_related("task__site", "agent"), pk=pk)
    return row


@site_page("tasks")
@require_http_methods(["GET", "POST"])
def task_agent_add(request: SiteRequest, pk: int) -> HttpResponse:
    return _task_agent_form(request, TaskAgent(task=task_at(request, pk)))


@site_page("tasks")
@require_http_methods(["GET", "POST"])
def task_agent_edit(request: SiteRequest, pk: int) -> HttpResponse:
    return _task_agent_form(request, _task_agent(request, pk))


@site_page("tasks")
@require_http_methods(["GET", "POST"])
def task_agent_remove(request: SiteRequest, pk: int) -> HttpResponse:
    row = _task_agent(request, pk)
    form = ReasonForm(request.POST or None, submit="Take it off this task")
    if form.is_valid():
        try:
            actions.remove_task_agent(row, by=request.user, reason=form.cleaned_data["reason"])
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, f"{row.agent} is off {row.task}.")
            return redirect(row.task)
    context = {"form": form, "row": row, "task": row.task}
    return _answer(request, "exposure/task_agent_remove.html", context)
