"""The read-only API: the same chains as JSON. It prints what `assess` returns and computes nothing."""

import math
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from functools import wraps
from typing import Any, cast

from django.contrib.auth.decorators import login_not_required
from django.contrib.auth.models import User
from django.http import HttpRequest, JsonResponse
from django.urls import reverse

from exposure.models import Task
from programme.roster.access import day_asked
from programme.roster.models import Site
from programme.roster.permissions import role_at
from programme.selection.assess import assess, assess_site
from programme.selection.views import seen_by


def strict(value: Any) -> Any:
    """The value as JSON knows it: NaN and infinities become null, days become text."""
    if isinstance(value, dict):
        return {str(key): strict(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [strict(one) for one in value]
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value.isoformat() if isinstance(value, date) else value


def _answer(content: Any, status: int = 200) -> JsonResponse:
    return JsonResponse(strict(content), status=status, safe=False)


def _refusal(field: str, value: str, allowed: str, *, status: int) -> JsonResponse:
    return _answer({"error": {"field": field, "value": value, "allowed": allowed}}, status)


def _endpoint(view: Callable[..., JsonResponse]) -> Callable[..., JsonResponse]:
    """GET by somebody signed in; anything else is told so in JSON."""

    @login_not_required
    @wraps(view)
    def answer(request: HttpRequest, *args: Any, **kwargs: Any) -> JsonResponse:
        if not request.user.is_authenticated:
            return _refusal("session", "none", "sign in first", status=401)
        if request.method not in {"GET", "HEAD"}:
            return _refusal("method", str(request.method), "GET", status=405)
        return view(request, *args, **kwargs)

    return answer


@dataclass(frozen=True)
class _Asked:
    """The user's own site, the day, and the role in which it is asked."""

    site: Site
    on: date
    role: str


def _of_site(view: Callable[..., JsonResponse]) -> Callable[..., JsonResponse]:
    """The view gets the user's own site and the day; another site is not found."""

    @wraps(view)
    def answer(request: HttpRequest, code: str, **rest: Any) -> JsonResponse:
        site = Site.objects.for_user(request.user).filter(code=code).first()
        if site is None:
            return _refusal("site", code, "a site you belong to", status=404)
        on, text, fault = day_asked(request, site.today())
        if fault:
            return _refusal("on", text, "a day like 2026-03-02", status=400)
        return view(_Asked(site, on, str(role_at(cast(User, request.user), site))), **rest)

    return _endpoint(answer)


@_endpoint
def index(request: HttpRequest) -> JsonResponse:
    """What there is to ask."""
    return _answer(
        {
            "sites": reverse("api:sites"),
            "chains": "/api/sites/<code>/chains/?on=YYYY-MM-DD",
            "chain": "/api/sites/<code>/tasks/<task code>/chain/?on=YYYY-MM-DD",
            "mismatches": "/api/sites/<code>/mismatches/?on=YYYY-MM-DD",
            "caution": "A decision aid, not a licence to work.",
            "user": request.user.get_username(),
        }
    )


@_endpoint
def sites(request: HttpRequest) -> JsonResponse:
    """The sites of the user."""
    rows = Site.objects.for_user(request.user)
    return _answer([{"code": s.code, "name": s.name, "rule_pack": s.rule_pack} for s in rows])


@_of_site
def chains(asked: _Asked) -> JsonResponse:
    """The chains of all active tasks."""
    found = seen_by(asked.role, assess_site(asked.site, on=asked.on))
    return _answer([chain.as_dict() for chain in found])


@_of_site
def chain(asked: _Asked, task: str) -> JsonResponse:
    """The chain of one task."""
    found = Task.objects.at(asked.site).filter(code=task).select_related("site").first()
    if found is None:
        return _refusal("task", task, f"a task of {asked.site}", status=404)
    return _answer(seen_by(asked.role, [assess(found, on=asked.on)])[0].as_dict())


@_of_site
def mismatches(asked: _Asked) -> JsonResponse:
    """Every mismatch of every active task."""
    rows = [
        {"task": one.task_code, **found}
        for one in seen_by(asked.role, assess_site(asked.site, on=asked.on))
        for link in one.as_dict()["links"]
        for found in link["mismatches"]
    ]
    return _answer(rows)
