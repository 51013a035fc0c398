"""What may be done to a site: its settings, and who belongs to it in which role."""

from typing import Any

from django.contrib.auth.models import User
from django.contrib.auth.password_validation import validate_password
from django.db import transaction

from programme.ledger import actions as ledger
from programme.ledger.changes import save_and_enter
from programme.roster.models import Membership, Role, Site
from programme.roster.permissions import require


@transaction.atomic
def save_site(site: Site, *, by: User) -> bool:
    """Save changed settings; the ledger keeps what stood before. Returns whether any changed.

    Raises:
        PermissionDenied: `by` may not change the site.
    """
    require(by, "site", site)
    return save_and_enter(site, noun="site", chain=site.code, by=by.username)


@transaction.atomic
def add_member(site: Site, user: User, *, role: str, by: User) -> Membership:
    """Give a user a role at the site, or another one; the ledger keeps the former role.

    Raises:
        PermissionDenied: `by` may not change the site.
        ValueError: it would leave the site without an administrator.
    """
    require(by, "site", site)
    _lock(site)
    row = Membership.objects.filter(site=site, user=user).first()
    if row is None:
        row = Membership.objects.create(site=site, user=user, role=role)
        _enter("role given", row, by=by, says=f"{user.username} is {_said(role)}")
        return row
    former = row.role
    if former == role:
        return row
    _keep_one(row)
    row.role = role
    row.save(update_fields=["role"])
    says = f"{user.username}: role {_said(former)} to {_said(role)}"
    _enter("role changed", row, by=by, says=says, detail={"role": [former, role]})
    return row


@transaction.atomic
def add_user(site: Site, username: str, *, password: str, role: str, by: User) -> Membership:
    """Make a new user who belongs to the site in that role; the ledger never holds the password.

    Raises:
        PermissionDenied: `by` may not change the site.
        ValidationError: the user name or the password is not allowed.
    """
    require(by, "site", site)
    user = User(username=username)
    validate_password(password, user)
    user.set_password(password)
    user.full_clean()
    user.save(force_insert=True)
    ledger.enter("user added", chain=site.code, of=user, by=by.username, says=username)
    return add_member(site, user, role=role, by=by)


@transaction.atomic
def remove_member(row: Membership, *, by: User) -> None:
    """Take a user's role at the site away; the ledger keeps that it was there.

    Raises:
        PermissionDenied: `by` may not change the site.
        ValueError: it would leave the site without an administrator.
    """
    require(by, "site", row.site)
    _lock(row.site)
    _keep_one(row)
    says = f"{row.user.username} no longer {_said(row.role)}"
    _enter("role taken", row, by=by, says=says, detail={"role": [row.role, ""]})
    row.delete()


def _said(role: str) -> str:
    return Role(role).label.lower()


def _lock(site: Site) -> None:
    # Two administrators who take each other's role at once must not both succeed.
    Site.objects.select_for_update().get(pk=site.pk)


def _enter(
    act: str, row: Membership, *, by: User, says: str, detail: dict[str, Any] | None = None
) -> None:
    ledger.enter(act, chain=row.site.code, of=row, by=by.username, says=says, detail=detail)


def _keep_one(row: Membership) -> None:
    # An administrator who may not sign in cannot put anything right.
    others = Membership.objects.filter(
        site=row.site, role=Role.ADMINISTRATOR, user__is_active=True
    ).exclude(pk=row.pk)
    if row.role == Role.ADMINISTRATOR and not others.exists():
        raise ValueError(
            f"role: {row.user.username} is the last administrator of {row.site}; name another first"
        )
