"""What every template may use: the site, the role, the main navigation, the day."""

from typing import Any

from django.http import HttpRequest
from django.urls import reverse

from programme.roster.models import Role, Site
from programme.roster.permissions import ACTS, may

NAV = (
    ("Today", "selection:today"),
    ("Tasks", "selection:tasks"),
    ("People", "selection:people"),
    ("Samples", "exposure:samples"),
    ("Fit tests", "fit:tests"),
    ("Respirators", "equipment:respirators"),
    ("Records", "records:records"),
)


PEOPLE = frozenset({"selection:people", "selection:person", "selection:card"})


def _entry_of(view: str, app: str) -> str:
    """The entry of the main navigation to which a page belongs."""
    if app == "roster" or view in PEOPLE:
        return "selection:people"
    if app == "selection":
        return "selection:today" if view == "selection:today" else "selection:tasks"
    return next((name for _, name in NAV if name.split(":")[0] == app), "")


def site_and_nav(request: HttpRequest) -> dict[str, Any]:
    """`site`, `role_label`, `nav`, `on`, `today`, `sites` and `can` (act -> bool)."""
    site = getattr(request, "site", None)
    if site is None:
        return {}
    role = getattr(request, "role", None)
    here = request.resolver_match.namespace if request.resolver_match else ""
    view = request.resolver_match.view_name if request.resolver_match else ""
    nav = []
    for label, name in NAV:
        is_here = name == _entry_of(view, here)
        nav.append({"label": label, "url": reverse(name, args=[site.code]), "is_here": is_here})
    return {
        "site": site,
        "role": role,
        "role_label": Role(role).label if role else "",
        "nav": nav,
        "on": getattr(request, "on", site.today()),
        "on_text": getattr(request, "on_text", ""),
        "kept": [(name, value) for name, value in request.GET.items() if name != "on"],
        "today": site.today(),
        "sites": Site.objects.for_user(request.user),
        "can": {act.replace(" ", "_"): may(role, act) for act in ACTS},
    }
