"""Fit tests: the list, one test, entry with its preview, correction and withdrawal."""

from typing import Any

from django.contrib import messages
from django.http import HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.http import require_GET, require_http_methods, require_POST

from programme.equipment.models import Facepiece
from programme.export import csv_response
from programme.fit import actions, listing
from programme.fit.day import DaySheet
from programme.fit.forms import ChoiceForm, Chosen, FitTestForm, initial_of
from programme.fit.models import FitTest
from programme.fit.outcome import NOT_A_PROTECTION_FACTOR, slots_of
from programme.fit.readiness import hindrances
from programme.fit.validity import validity_of
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import Head, ReasonForm, page_asked, sort_asked
from programme.rulepack.load import load


def _test(request: SiteRequest, pk: int) -> FitTest:
    rows = FitTest.objects.for_user(request.user).at(request.site)
    related = rows.select_related("worker__site", "size__facepiece", "replaced_by")
    return get_object_or_404(related, pk=pk)


@site_page()
@require_GET
def tests(request: SiteRequest) -> HttpResponse:
    pack = load(request.site.rule_pack)
    asked = listing.asked_of(request)
    sort = sort_asked(request, listing.SORTS, "-day")
    rows = listing.rows_of(request, asked, pack=pack).order_by(*listing.order_of(sort))
    if request.GET.get("format") == "csv":
        cells = listing.cells(rows, pack=pack, site=request.site)
        return csv_response(f"{request.site.code}-fit-tests", listing.HEADER, cells)
    page = page_asked(request, rows)
    context = {
        "page": page,
        "lines": [(test, validity_of(test, pack=pack, on=request.on)) for test in page],
        "heads": [Head(*head, now=sort) for head in listing.HEADS] + [Head("Valid")],
        "asked": asked,
        "sort": sort,
        "facepieces": Facepiece.objects.at(request.site),
        "due_choices": listing.DUE,
        "outcomes": FitTest.Outcome.choices,
        "has_any": FitTest.objects.at(request.site).exists(),
    }
    return render(request, "fit/tests.html", context)


@site_page()
@require_GET
def test(request: SiteRequest, pk: int) -> HttpResponse:
    found = _test(request, pk)
    pack = load(found.rule_pack)
    protocol = pack.find_protocol(found.protocol)
    labels = {}
    level = None
    if protocol is not None:
        labels = {(slot.order, slot.reading): slot.label for slot in slots_of(protocol)}
        level = pack.pass_level(found.size.facepiece.kind, protocol.method)
    exercises = [
        (labels.get((row.order, row.reading), row.exercise), row) for row in found.exercises.all()
    ]
    context = {
        "test": found,
        "worker": found.worker,
        "protocol": protocol,
        "pack": pack,
        "level": level,
        "exercises": exercises,
        "counted": sum(row.is_counted and row.fit_factor is not None for _, row in exercises),
        "valid": validity_of(found, pack=load(request.site.rule_pack), on=request.on),
        "replaces": FitTest.objects.filter(replaced_by=found).first(),
        "caution": NOT_A_PROTECTION_FACTOR,
    }
    return render(request, "fit/test.html", context)


def _chosen(request: SiteRequest, data: Any) -> tuple[ChoiceForm, Chosen | None]:
    pack = load(request.site.rule_pack)
    choice = ChoiceForm(data or None, site=request.site, pack=pack, on=request.on)
    return choice, choice.chosen()


def _entry_page(
    request: SiteRequest,
    choice: ChoiceForm,
    *,
    form: FitTestForm | None = None,
    old: FitTest | None = None,
) -> HttpResponse:
    """The entry page as it stands; 422 where something was refused."""
    context: dict[str, Any] = {
        "choice": choice,
        "form": form,
        "old": old,
        "caution": NOT_A_PROTECTION_FACTOR,
    }
    is_refused = choice.is_bound and bool(choice.errors)
    if form is not None:
        chosen = form.chosen
        kind = chosen.size.facepiece.kind
        context |= {
            "chosen": chosen,
            "level": chosen.pack.pass_level(kind, chosen.protocol.method),
            "hindrances": hindrances(
                chosen.worker, chosen.size.facepiece, pack=chosen.pack, on=request.on
            ),
        }
        if form.is_bound:
            context |= {"judged": form.worked_out(), "unreadable": form.unreadable}
            is_refused = "work_out" not in request.POST
    return render(request, "fit/entry.html", context, status=422 if is_refused else 200)


def _tell(request: SiteRequest, stored: FitTest, says: str) -> None:
    valid = validity_of(stored, pack=load(request.site.rule_pack), on=request.on)
    messages.success(request, f"{stored.worker.name}, {stored.size}: {says} {valid.says}".strip())


@site_page("fit tests")
@require_http_methods(["GET", "POST"])
def test_add(request: SiteRequest) -> HttpResponse:
    has_choice = any(request.GET.get(name) for name in ("worker", "size"))
    choice, chosen = _chosen(request, request.GET if has_choice else None)
    if chosen is None:
        return _entry_page(request, choice)
    today = request.site.today()
    initial = {"tested_on": today, "tester": listing.usual_tester(request)}
    form = FitTestForm(request.POST or None, chosen=chosen, today=today, initial=initial)
    if form.is_valid() and form.draft and "work_out" not in request.POST:
        try:
            stored = actions.record_fit_test(form.draft, by=request.user)
        except ValueError as refused:
            form.add_error(None, str(refused))
        else:
            _tell(request, stored, form.draft.judged.says)
            return redirect(stored)
    return _entry_page(request, choice, form=form)


@site_page("fit tests")
@require_POST
def preview(request: SiteRequest) -> HttpResponse:
    """What the figures typed so far come to: a part of the entry page, nothing is stored."""
    _, chosen = _chosen(request, request.GET)
    if chosen is None:
        return HttpResponse("Choose a worker and a size first.", status=422)
    form = FitTestForm(request.POST, chosen=chosen, today=request.site.today())
    kind = chosen.size.facepiece.kind
    context = {
        "judged": form.worked_out(),
        "unreadable": form.unreadable,
        "chosen": chosen,
        "level": chosen.pack.pass_level(kind, chosen.protocol.method),
    }
    return render(request, "fit/_worked_out.html", context)


@site_page("fit tests")
@require_http_methods(["GET", "POST"])
def test_correct(request: SiteRequest, pk: int) -> HttpResponse:
    old = _test(request, pk)
    if not old.stands:
        messages.error(request, "This test was replaced or withdrawn; correct the newest one.")
        return redirect(old.replaced_by or old)
    asked = {"worker": old.worker_id, "size": old.size_id, "protocol": old.protocol}
    asked |= {name: request.GET[name] for name in ("size", "protocol") if request.GET.get(name)}
    choice, chosen = _chosen(request, asked)
    if chosen is None:
        return _entry_page(request, choice, old=old)
    form = FitTestForm(
        request.POST or None,
        chosen=chosen,
        today=request.site.today(),
        old=old,
        initial=initial_of(old, slots_of(chosen.protocol)),
    )
    if form.is_valid() and form.draft and "work_out" not in request.POST:
        reason = form.cleaned_data["reason"]
        try:
            stored = actions.replace_fit_test(old, form.draft, by=request.user, reason=reason)
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            _tell(request, stored, form.draft.judged.says)
            return redirect(stored)
    return _entry_page(request, choice, form=form, old=old)


@site_page("fit tests")
@require_http_methods(["GET", "POST"])
def test_withdraw(request: SiteRequest, pk: int) -> HttpResponse:
    found = _test(request, pk)
    form = ReasonForm(request.POST or None, submit="Withdraw this fit test")
    if form.is_valid():
        try:
            actions.withdraw_fit_test(found, by=request.user, reason=form.cleaned_data["reason"])
        except ValueError as refused:
            form.add_error("reason", str(refused))
        else:
            messages.success(request, "Fit test withdrawn; it stays on file.")
            return redirect(found)
    status = 422 if form.is_bound else 200
    return render(request, "fit/withdraw.html", {"form": form, "test": found}, status=status)


@site_page("fit tests")
@require_http_methods(["GET", "POST"])
def day(request: SiteRequest) -> HttpResponse:
    """A day's paper: several people, one protocol."""
    pack = load(request.site.rule_pack)
    protocol = pack.find_protocol(request.GET.get("protocol", "")) or pack.protocols[0]
    sheet = DaySheet(request.site, pack, protocol, request.on, request.POST)
    refused = ""
    if sheet.is_ready and "work_out" not in request.POST:
        try:
            stored = actions.record_fit_tests(sheet.drafts, site=request.site, by=request.user)
        except ValueError as error:
            refused = str(error)
        else:
            passed = sum(test.outcome == FitTest.Outcome.PASSED for test in stored)
            messages.success(request, f"{len(stored)} fit tests recorded, {passed} passed.")
            return redirect("fit:tests", request.site.code)
    elif sheet.is_bound and not any(not line.is_blank for line in sheet.lines):
        refused = "Nothing was typed: fill in at least one row."
    is_refused = sheet.is_bound and "work_out" not in request.POST
    context = {
        "sheet": sheet,
        "pack": pack,
        "refused": refused,
        "caution": NOT_A_PROTECTION_FACTOR,
    }
    return render(request, "fit/day.html", context, status=422 if is_refused else 200)
