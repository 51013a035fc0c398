"""The first line of every page of a site: whose site, which role, judged for which day."""

from collections.abc import Callable
from datetime import date, timedelta
from functools import wraps
from typing import Any

from django.contrib import messages
from django.contrib.auth.models import User
from django.core.exceptions import PermissionDenied
from django.http import HttpRequest, HttpResponse
from django.shortcuts import get_object_or_404

from programme.roster.models import Role, Site
from programme.roster.permissions import ACTS, may, role_at

FIRST_DAY = date(1970, 1, 1)


class SiteRequest(HttpRequest):
    """A request after `site_page`: signed in, at a site, with a role and a day."""

    user: User
    site: Site
    role: str
    on: date
    on_text: str


def day_asked(request: HttpRequest, today: date) -> tuple[date, str, str]:
    """The day in `?on=`; returns (day, text to show again, what is wrong or "")."""
    text = request.GET.get("on", "").strip()
    if not text:
        return today, "", ""
    try:
        asked = date.fromisoformat(text)
    except ValueError:
        return (
            today,
            text,
            f"Judged for: {text!r} is not a date; write it like {today}.",
        )
    if not FIRST_DAY <= asked <= today + timedelta(days=366 * 5):
        return (
            today,
            text,
            f"Judged for: {text} is not allowed; 1970-01-01 to five years ahead.",
        )
    return asked, text, ""


def site_page(
    act: str = "see",
) -> Callable[[Callable[..., HttpResponse]], Callable[..., Any]]:
    """Wrap a view `(request, ...)` under `/s/<code>/`: another site's page is not found."""

    def wrap(view: Callable[..., HttpResponse]) -> Callable[..., HttpResponse]:
        @wraps(view)
        def page(request: SiteRequest, code: str, *args: Any, **kwargs: Any) -> HttpResponse:
            request.site = get_object_or_404(Site.objects.for_user(request.user), code=code)
            request.role = str(role_at(request.user, request.site))
            request.on, request.on_text, fault = day_asked(request, request.site.today())
            # Only now: the page that says no shows site, role and day as well.
            if not may(request.role, act):
                who = Role(request.role).label.lower()
                raise PermissionDenied(f"As {who} you may not {ACTS[act]}.")
            if fault:
                messages.error(request, fault)
            request.session["site"] = code
            return view(request, *args, **kwargs)

        return page

    return wrap
