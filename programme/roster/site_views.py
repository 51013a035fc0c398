"""The site's own pages: what holds here, its settings, its members."""

from django.contrib import messages
from django.contrib.auth.models import User
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_GET, require_http_methods, require_POST

from programme.roster import site_actions
from programme.roster.access import SiteRequest, site_page
from programme.roster.models import Membership
from programme.roster.site_forms import MemberForm, SiteForm
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


@site_page("site")
@require_http_methods(["GET", "POST"])
def members(request: SiteRequest) -> HttpResponse:
    form = MemberForm(request.POST or None)
    if form.is_valid():
        name, role = form.cleaned_data["username"], form.cleaned_data["role"]
        user = form.user or User.objects.create_user(name, password=form.cleaned_data["password"])
        try:
            row = site_actions.add_member(request.site, user, role=role, by=request.user)
        except ValueError as fault:
            form.add_error("role", str(fault))
        else:
            messages.success(request, f"{name} is {row.get_role_display().lower()} here.")
            return redirect("site:members", request.site.code)
    rows = Membership.objects.filter(site=request.site).select_related("user").order_by("user")
    status = 422 if form.is_bound else 200
    context = {"form": form, "members": rows}
    return render(request, "roster/site_members.html", context, status=status)


@site_page("site")
@require_POST
def member_remove(request: SiteRequest, pk: int) -> HttpResponse:
    rows = Membership.objects.filter(site=request.site).select_related("user", "site")
    row = get_object_or_404(rows, pk=pk)
    try:
        site_actions.remove_member(row, by=request.user)
    except ValueError as fault:
        messages.error(request, str(fault))
    else:
        messages.success(request, f"{row.user.username} no longer belongs to this site.")
    return redirect("site:members", request.site.code)
