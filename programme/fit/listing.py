"""The list of fit tests: what may be filtered and sorted, and its rows as cells of a file."""

from collections.abc import Iterable
from datetime import timedelta
from typing import Any

from django.db.models import Exists, OuterRef, Q, QuerySet

from programme.fit.models import FitTest
from programme.fit.validity import interval_months, last_lapsed_day, validity_of
from programme.roster.access import SiteRequest
from programme.roster.asking import text_asked
from programme.roster.models import Site
from programme.rulepack.pack import RulePack

SORTS = {
    "day": "tested_on",
    "name": "worker__name",
    "facepiece": "size__facepiece__name",
    "factor": "overall_fit_factor",
    "outcome": "outcome",
}
HEADS = (
    ("Day", "day"),
    ("Worker", "name"),
    ("Facepiece and size", "facepiece"),
    ("Fit factor", "factor"),
    ("Outcome", "outcome"),
)
DUE = {"lapsed": "lapsed", "soon": "due soon", "valid": "valid"}
HEADER = (
    "personnel number",
    "name",
    "facepiece",
    "size",
    "date of test",
    "protocol",
    "overall fit factor",
    "overall as reported",
    "outcome",
    "valid through",
    "filter or adaptor used",
    "tested by",
    "state",
)


def asked_of(request: SiteRequest) -> dict[str, str]:
    """The filters as asked; what is not allowed counts as not asked."""
    asked = {name: text_asked(request, name) for name in ("q", "facepiece")}
    outcome, due = request.GET.get("outcome", ""), request.GET.get("due", "")
    asked["outcome"] = outcome if outcome in FitTest.Outcome.values else ""
    asked["due"] = due if due in DUE else ""
    asked["all"] = "1" if request.GET.get("all") else ""
    if not (asked["facepiece"].isascii() and asked["facepiece"].isdigit()):
        asked["facepiece"] = ""
    return asked


def order_of(sort: str) -> list[str]:
    """The columns to order by for a sort key that was allowed."""
    sign = "-" if sort.startswith("-") else ""
    return [f"{sign}{SORTS[sort.lstrip('-')]}", "-tested_on", "-pk"]


def _due(rows: Any, due: str, *, months: int | None, request: SiteRequest) -> Any:
    """Passed tests only, and of each worker and size the newest: an older one is not due."""
    newer = FitTest.objects.in_force().filter(
        worker=OuterRef("worker"),
        size=OuterRef("size"),
        outcome=FitTest.Outcome.PASSED,
        tested_on__gt=OuterRef("tested_on"),
        tested_on__lte=request.on,
    )
    rows = rows.filter(
        ~Exists(newer),
        outcome=FitTest.Outcome.PASSED,
        replaced_by=None,
        withdrawn_at=None,
        tested_on__lte=request.on,
    )
    if months is None:
        return rows if due == "valid" else rows.none()
    lapsed = last_lapsed_day(request.on, months)
    soon = last_lapsed_day(request.on + timedelta(days=request.site.due_soon_days), months)
    if due == "lapsed":
        return rows.filter(tested_on__lte=lapsed)
    rows = rows.filter(tested_on__gt=lapsed)
    return rows.filter(tested_on__lte=soon) if due == "soon" else rows


def rows_of(request: SiteRequest, asked: dict[str, str], *, pack: RulePack) -> QuerySet[FitTest]:
    """The tests of the site that the filters let through."""
    rows = FitTest.objects.for_user(request.user).at(request.site)
    rows = rows.select_related("worker__site", "size__facepiece")
    if not asked["all"]:
        rows = rows.in_force()
    if asked["q"]:
        q = asked["q"]
        rows = rows.filter(
            Q(worker__name__icontains=q)
            | Q(worker__personnel_number__icontains=q)
            | Q(size__facepiece__name__icontains=q)
        )
    if asked["facepiece"]:
        rows = rows.filter(size__facepiece_id=int(asked["facepiece"][:18]))
    if asked["outcome"]:
        rows = rows.filter(outcome=asked["outcome"])
    if asked["due"]:
        months = interval_months(pack, request.site)
        rows = _due(rows, asked["due"], months=months, request=request)
    return rows


def usual_tester(request: SiteRequest) -> str:
    """Who tested, as this user wrote it last; empty before the first time."""
    mine = FitTest.objects.at(request.site).filter(recorded_by=request.user.get_username())
    return mine.order_by("-pk").values_list("tester", flat=True).first() or ""


def _state(test: FitTest) -> str:
    if test.replaced_by_id is not None:
        return f"replaced by {test.replaced_by_id}"
    return "stands" if test.stands else "withdrawn"


def cells(rows: QuerySet[FitTest], *, pack: RulePack, site: Site) -> Iterable[tuple[Any, ...]]:
    """The rows as cells under `HEADER`."""
    today = site.today()
    for test in rows.iterator(2000):
        valid = validity_of(test, pack=pack, on=today)
        yield (
            test.worker.personnel_number,
            test.worker.name,
            test.size.facepiece.name,
            test.size.label,
            test.tested_on,
            test.protocol,
            test.overall_fit_factor,
            test.as_reported,
            test.outcome,
            valid.through,
            test.element_used,
            test.tester,
            _state(test),
        )
