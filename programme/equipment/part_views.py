"""Forms of facepieces, filters and cartridges and assemblies: add, change, withdraw."""

from dataclasses import dataclass
from typing import Any

from django.contrib import messages
from django.db.models import Count, F, Q
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.urls import reverse
from django.views.decorators.http import require_http_methods

from programme.equipment import actions
from programme.equipment.forms import AssemblyForm, ElementForm, FacepieceForm
from programme.equipment.models import Assembly, Element, Facepiece
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import ReasonForm, record_asked
from programme.rulepack.load import load


@dataclass(frozen=True)
class PartKind:
    """One kind of part as its pages need it."""

    model: Any
    form: Any
    noun: str

    @property
    def add_title(self) -> str:
        """Heading of the page that adds one."""
        return f"Add {'an' if self.noun[0] in 'aeiou' else 'a'} {self.noun}"


PARTS = {
    "facepiece": PartKind(Facepiece, FacepieceForm, "facepiece"),
    "element": PartKind(Element, ElementForm, "filter or cartridge"),
    "assembly": PartKind(Assembly, AssemblyForm, "assembly"),
}


def _part(request: SiteRequest, kind: str, pk: int) -> Any:
    rows = PARTS[kind].model.objects.for_user(request.user).at(request.site)
    return get_object_or_404(rows.select_related("site"), pk=pk)


def _home(request: SiteRequest, part: Any) -> str:
    if isinstance(part, Assembly) and part.pk is not None:
        return part.get_absolute_url()
    return reverse("equipment:respirators", args=[request.site.code])


def _save(part: Any, form: Any, *, by: Any) -> None:
    if isinstance(part, Facepiece):
        actions.save_facepiece(part, sizes=form.cleaned_data["sizes"], by=by)
    elif isinstance(part, Element):
        actions.save_element(part, by=by)
    else:
        actions.save_assembly(part, by=by)


def _part_form(request: SiteRequest, kind: str, part: Any) -> HttpResponse:
    what, is_new, shown_name = PARTS[kind], part.pk is None, str(part.name)
    rest = {} if kind == "facepiece" else {"pack": load(request.site.rule_pack)}
    initial = {name: record_asked(request, name) for name in ("facepiece", "element")}
    form = what.form(
        request.POST or None, instance=part, initial=initial if is_new else None, **rest
    )
    if form.is_valid():
        try:
            _save(part, form, by=request.user)
        except ValueError as refused:
            form.add_error(None, str(refused))
        else:
            messages.success(request, f"{part.name}: {'added' if is_new else 'saved'}.")
            return redirect(_home(request, part))
    context = {
        "form": form,
        "kind": kind,
        "part": part,
        "title": what.add_title if is_new else f"Change {shown_name}",
        "is_new": is_new,
        "has_facepiece": Facepiece.objects.at(request.site).filter(withdrawn_on=None).exists(),
    }
    status = 422 if form.is_bound else 200
    return render(request, "equipment/part_form.html", context, status=status)


@site_page("equipment")
@require_http_methods(["GET", "POST"])
def part_add(request: SiteRequest, kind: str) -> HttpResponse:
    return _part_form(request, kind, PARTS[kind].model(site=request.site))


@site_page("equipment")
@require_http_methods(["GET", "POST"])
def part_change(request: SiteRequest, kind: str, pk: int) -> HttpResponse:
    return _part_form(request, kind, _part(request, kind, pk))


def _hit(request: SiteRequest, part: Any) -> Any:
    """The assemblies in use that go with the part, each with how many wear it today."""
    if isinstance(part, Assembly):
        rows = Assembly.objects.filter(pk=part.pk)
    else:
        rows = part.assemblies.filter(withdrawn_on=None)
    worn = Q(crew__active_from__lte=request.site.today()) & (
        Q(crew__active_to=None) | Q(crew__active_to__gt=request.site.today())
    )
    people = Count("crew__worker", filter=worn, distinct=True)
    return rows.annotate(worn_by=people).order_by(F("worn_by").desc(), "name")


@site_page("equipment")
@require_http_methods(["GET", "POST"])
def part_withdraw(request: SiteRequest, kind: str, pk: int) -> HttpResponse:
    part = _part(request, kind, pk)
    form = ReasonForm(request.POST or None, submit=f"Withdraw this {PARTS[kind].noun}")
    if form.is_valid():
        reason, today = form.cleaned_data["reason"], request.site.today()
        try:
            gone = actions.withdraw(part, on=today, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            also = f", and {len(gone)} assemblies made of it" if gone else ""
            messages.success(request, f"{part} is withdrawn from {today}{also}.")
            return redirect("equipment:respirators", request.site.code)
    context = {"form": form, "part": part, "kind": kind, "hit": _hit(request, part)}
    status = 422 if form.is_bound else 200
    return render(request, "equipment/part_withdraw.html", context, status=status)
