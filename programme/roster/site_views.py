"""The site's own pages: what holds here, its settings, its members."""

from django.contrib import messages
from django.core.exceptions import ValidationError
from django.db.models import QuerySet
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_GET, require_http_methods, require_POST

from programme.roster import site_actions
from programme.roster.access import SiteRequest, site_page
from programme.roster.models import Membership, Role
from programme.roster.permissions import may, role_at
from programme.roster.site_forms import MemberForm, RoleForm, SiteForm
from programme.rulepack.load import load


@site_page()
@require_GET
def about(request: SiteRequest) -> HttpResponse:
    pack = load(request.site.rule_pack)
    intervals = [
        (kind, pack.interval(kind), getattr(request.site, f"{kind}_interval_months"))
        for kind in ("fit", "training")
    ]
    context = {"pack": pack, "intervals": intervals}
    return render(request, "roster/site.html", context)


@site_page("site")
@require_http_methods(["GET", "POST"])
def settings(request: SiteRequest) -> HttpResponse:
    form = SiteForm(request.POST or None, instance=request.site)
    if form.is_valid():
        if site_actions.save_site(form.instance, by=request.user):
            messages.success(request, "Saved. Every chain is judged by the new settings from now.")
        return redirect("site:about", request.site.code)
    request.site.refresh_from_db()
    status = 422 if form.is_bound else 200
    return render(request, "roster/site_settings.html", {"form": form}, status=status)


def _add(request: SiteRequest, form: MemberForm) -> Membership:
    name, role = form.cleaned_data["username"], form.cleaned_data["role"]
    if form.user is not None:
        return site_actions.add_member(request.site, form.user, role=role, by=request.user)
    password = form.cleaned_data["password"]
    return site_actions.add_user(request.site, name, password=password, role=role, by=request.user)


def _members_of(request: SiteRequest) -> QuerySet[Membership]:
    rows = Membership.objects.filter(site=request.site).select_related("user", "site")
    return rows.order_by("user__username")


@site_page("site")
@require_http_methods(["GET", "POST"])
def members(request: SiteRequest) -> HttpResponse:
    form = MemberForm(request.POST or None)
    if form.is_valid():
        try:
            row = _add(request, form)
        except ValueError as fault:
            form.add_error("role", str(fault))
        except ValidationError as fault:
            form.add_error(None, fault)
        else:
            messages.success(request, _is_now(row))
            return _back(request)
    status = 422 if form.is_bound else 200
    context = {"form": form, "members": _members_of(request), "roles": Role.choices}
    return render(request, "roster/site_members.html", context, status=status)


@site_page("site")
@require_POST
def member_role(request: SiteRequest, pk: int) -> HttpResponse:
    row = get_object_or_404(_members_of(request), pk=pk)
    form = RoleForm(request.POST)
    if not form.is_valid():
        messages.error(request, f"Role: choose one of {', '.join(Role.labels).lower()}.")
        return _back(request)
    role = form.cleaned_data["role"]
    try:
        row = site_actions.add_member(request.site, row.user, role=role, by=request.user)
    except ValueError as fault:
        messages.error(request, str(fault))
    else:
        messages.success(request, _is_now(row))
    return _back(request)


@site_page("site")
@require_POST
def member_remove(request: SiteRequest, pk: int) -> HttpResponse:
    row = get_object_or_404(_members_of(request), pk=pk)
    try:
        site_actions.remove_member(row, by=request.user)
    except ValueError as fault:
        messages.error(request, str(fault))
    else:
        messages.success(request, f"{row.user.username} no longer belongs to this site.")
    return _back(request)


def _is_now(row: Membership) -> str:
    return f"{row.user.username} is {row.get_role_display().lower()} here."


def _back(request: SiteRequest) -> HttpResponse:
    # Whoever took their own role away may not see the members any more.
    if not may(role_at(request.user, request.site), "site"):
        return redirect("start")
    return redirect("site:members", request.site.code)
