"""What may be done to a site: its settings, and who belongs to it in which role."""

from django.contrib.auth.models import User
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
    """Give a user a role at the site, or another one.

    Raises:
        PermissionDenied: `by` may not change the site.
        ValueError: it would leave the site without an administrator.
    """
    require(by, "site", site)
    row = Membership.objects.select_for_update().filter(site=site, user=user).first()
    if row is not None and role != Role.ADMINISTRATOR:
        _keep_one(site, row)
    row, _ = Membership.objects.update_or_create(site=site, user=user, defaults={"role": role})
    says = f"{user.username} is {row.get_role_display().lower()}"
    ledger.enter("role given", chain=site.code, of=row, by=by.username, says=says)
    return row


@transaction.atomic
def remove_member(row: Membership, *, by: User) -> None:
    """Take a user's role at the site away; the ledger keeps that it was there.

    Raises:
        PermissionDenied: `by` may not change the site.
        ValueError: it would leave the site without an administrator.
    """
    require(by, "site", row.site)
    _keep_one(row.site, row)
    says = f"{row.user.username} no longer {row.get_role_display().lower()}"
    ledger.enter("role taken", chain=row.site.code, of=row, by=by.username, says=says)
    row.delete()


def _keep_one(site: Site, row: Membership) -> None:
    others = Membership.objects.filter(site=site, role=Role.ADMINISTRATOR).exclude(pk=row.pk)
    if row.role == Role.ADMINISTRATOR and not others.exists():
        raise ValueError(
            f"role: {row.user.username} is the last administrator of {site}; name another first"
        )
