"""The start page, and the pages that change people and their papers."""

from dataclasses import dataclass
from typing import Any

from django.contrib import messages
from django.http import Http404, HttpRequest, HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_GET, require_http_methods

from programme.roster import actions
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import ReasonForm
from programme.roster.forms import (
    ClearanceForm,
    PaperForm,
    SealNoteForm,
    TrainingForm,
    WorkerForm,
)
from programme.roster.models import Clearance, Role, SealNote, Site, Training, Worker
from programme.roster.permissions import require
from programme.rulepack.load import load

START_PAGES: dict[str, str] = {
    Role.COORDINATOR: "selection:today",
    Role.HYGIENIST: "exposure:samples",
    Role.MANAGER: "records:records",
    Role.ADMINISTRATOR: "selection:today",
}


@require_GET
def start(request: HttpRequest) -> HttpResponse:
    """Send a signed-in user to the start page of their role at their last or only site."""
    sites = list(Site.objects.for_user(request.user))
    last = "" if "choose" in request.GET else request.session.get("site")
    site = next((one for one in sites if one.code == last), None)
    if site is None and len(sites) == 1:
        site = sites[0]
    if site is None:
        return render(request, "roster/sites.html", {"choices": sites})
    role = site.memberships.get(user_id=request.user.pk or 0).role
    return redirect(START_PAGES[role], site.code)


def worker_of(request: SiteRequest, pk: int) -> Worker:
    """The worker of the request's own site, or not found."""
    rows = Worker.objects.for_user(request.user).at(request.site).select_related("site")
    return get_object_or_404(rows, pk=pk)


def _answer(request: SiteRequest, template: str, context: dict[str, Any]) -> HttpResponse:
    form = context["form"]
    return render(request, template, context, status=422 if form.is_bound else 200)


@site_page("roster")
@require_http_methods(["GET", "POST"])
def worker_add(request: SiteRequest) -> HttpResponse:
    form = WorkerForm(
        request.POST or None,
        instance=Worker(site=request.site),
        today=request.site.today(),
    )
    if form.is_valid():
        try:
            worker = actions.add_worker(form.instance, by=request.user)
        except ValueError as refused:
            form.add_error("personnel_number", str(refused))
        else:
            messages.success(request, f"{worker.name} is on the roster.")
            return redirect(worker)
    return _answer(request, "roster/worker_form.html", {"form": form, "worker": None})


@site_page("roster")
@require_http_methods(["GET", "POST"])
def worker_change(request: SiteRequest, pk: int) -> HttpResponse:
    worker = worker_of(request, pk)
    shown_name = worker.name
    form = WorkerForm(request.POST or None, instance=worker, today=request.site.today())
    if form.is_valid():
        try:
            actions.change_worker(form.instance, by=request.user)
        except ValueError as refused:
            form.add_error("personnel_number", str(refused))
        else:
            messages.success(request, f"{worker.name}: saved.")
            return redirect(worker)
    context = {"form": form, "worker": worker, "shown_name": shown_name}
    return _answer(request, "roster/worker_form.html", context)


@dataclass(frozen=True)
class PaperKind:
    """One kind of paper as its pages need it."""

    model: type[Clearance] | type[Training] | type[SealNote]
    form: type[PaperForm]

    @property
    def noun(self) -> str:
        return actions.KINDS[self.model].noun

    @property
    def act(self) -> str:
        return actions.KINDS[self.model].act


PAPERS = {
    "clearance": PaperKind(Clearance, ClearanceForm),
    "training": PaperKind(Training, TrainingForm),
    "seal-note": PaperKind(SealNote, SealNoteForm),
}


def _kind(request: SiteRequest, name: str) -> PaperKind:
    if name not in PAPERS:
        raise Http404(name)
    require(request.user, PAPERS[name].act, request.site)
    return PAPERS[name]


def _paper_form(
    request: SiteRequest, kind: PaperKind, worker: Worker, *, old: Any = None
) -> PaperForm:
    rest: dict[str, Any] = {"worker": worker, "today": request.site.today(), "old": old}
    if kind.model is Training:
        pack = load(request.site.rule_pack)
        families = dict.fromkeys(row.family for row in pack.classes)
        rest["families"] = [(name, name.replace("_", " ")) for name in families]
    initial = None
    if old is not None:
        initial = {name: getattr(old, name) for name in kind.form._meta.fields or ()}
    return kind.form(request.POST or None, initial=initial, **rest)


def _old(request: SiteRequest, kind: PaperKind, *, worker: Worker, row: int) -> Any:
    rows = kind.model.objects.for_user(request.user)
    return get_object_or_404(rows.select_related("worker__site"), pk=row, worker=worker)


@site_page("see")
@require_http_methods(["GET", "POST"])
def paper_add(request: SiteRequest, pk: int, kind: str) -> HttpResponse:
    paper, worker = _kind(request, kind), worker_of(request, pk)
    form = _paper_form(request, paper, worker)
    if form.is_valid():
        actions.record(form.instance, by=request.user)
        messages.success(request, f"{worker.name}: {paper.noun} recorded.")
        return redirect(worker)
    context = {"form": form, "worker": worker, "kind": paper, "old": None}
    return _answer(request, "roster/paper_form.html", context)


@site_page("see")
@require_http_methods(["GET", "POST"])
def paper_correct(request: SiteRequest, pk: int, *, kind: str, row: int) -> HttpResponse:
    paper, worker = _kind(request, kind), worker_of(request, pk)
    old = _old(request, paper, worker=worker, row=row)
    if not old.stands:
        messages.error(request, "This record was replaced or withdrawn; correct the newest one.")
        return redirect(worker)
    form = _paper_form(request, paper, worker, old=old)
    if form.is_valid():
        reason = form.cleaned_data["reason"]
        try:
            actions.replace(old, form.instance, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, f"{worker.name}: {paper.noun} corrected; both are on file.")
            return redirect(worker)
    context = {"form": form, "worker": worker, "kind": paper, "old": old}
    return _answer(request, "roster/paper_form.html", context)


@site_page("see")
@require_http_methods(["GET", "POST"])
def paper_withdraw(request: SiteRequest, pk: int, *, kind: str, row: int) -> HttpResponse:
    paper, worker = _kind(request, kind), worker_of(request, pk)
    old = _old(request, paper, worker=worker, row=row)
    form = ReasonForm(request.POST or None, submit=f"Withdraw this {paper.noun}")
    if form.is_valid():
        try:
            actions.withdraw(old, by=request.user, reason=form.cleaned_data["reason"])
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, f"{worker.name}: {paper.noun} withdrawn; it stays on file.")
            return redirect(worker)
    context = {"form": form, "worker": worker, "kind": paper, "old": old}
    return _answer(request, "roster/paper_withdraw.html", context)
