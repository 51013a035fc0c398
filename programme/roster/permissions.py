"""Which role may do what at a site."""

from django.contrib.auth.base_user import AbstractBaseUser
from django.core.exceptions import PermissionDenied

from programme.roster.models import Membership, Role, Site

ACTS = {
    "see": "see the site",
    "see clearance limits": "see the work limits of a clearance",
    "roster": "add and change workers, training and seal notes",
    "clearance": "record a clinician's recommendation",
    "tasks": "add and change tasks and their agents",
    "limits": "add agents and limits",
    "samples": "record, correct and import air samples",
    "fit tests": "record, correct and import fit tests",
    "equipment": "add and change respirators",
    "assign": "assign assemblies and crews, record filter changes",
    "site": "change the site's settings and members",
    "summary": "print the compliance summary",
}

_COORDINATOR = {
    "see",
    "see clearance limits",
    "roster",
    "clearance",
    "tasks",
    "equipment",
    "assign",
}
_HYGIENIST = {
    "see",
    "see clearance limits",
    "tasks",
    "limits",
    "samples",
    "fit tests",
    "equipment",
    "assign",
}
ROLE_ACTS: dict[str, frozenset[str]] = {
    Role.COORDINATOR: frozenset(_COORDINATOR | {"summary"}),
    Role.HYGIENIST: frozenset(_HYGIENIST | {"summary"}),
    Role.MANAGER: frozenset({"see", "summary"}),
    Role.ADMINISTRATOR: frozenset(ACTS),
}


def role_at(user: AbstractBaseUser, site: Site) -> str | None:
    """The user's role at the site, or None."""
    return Membership.objects.filter(user=user, site=site).values_list("role", flat=True).first()


def may(role: str | None, act: str) -> bool:
    """Whether this role may do this act; an unknown act raises.

    Raises:
        ValueError: no such act.
    """
    if act not in ACTS:
        raise ValueError(f"act: {act!r} is not known; known are {', '.join(sorted(ACTS))}")
    return role is not None and act in ROLE_ACTS.get(role, frozenset())


def require(user: AbstractBaseUser, act: str, site: Site) -> None:
    """Let the act pass or raise.

    Raises:
        PermissionDenied: the user's role at that site does not allow it.
    """
    role = role_at(user, site)
    if not may(role, act):
        who = Role(role).label if role else "no role here"
        raise PermissionDenied(f"You may not {ACTS[act]} at {site} ({who}).")
