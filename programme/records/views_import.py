"""Bringing a file in, step by step: read, match, look, store; and taking it back."""

from collections.abc import Callable
from typing import Any

from django.contrib import messages
from django.core.exceptions import RequestDataTooBig
from django.http import Http404, HttpResponse
from django.shortcuts import get_object_or_404, redirect, render
from django.views.decorators.csrf import csrf_exempt, csrf_protect
from django.views.decorators.http import require_GET, require_http_methods, require_POST

from exposure.models import Task, TaskAgent
from programme.equipment.models import FacepieceSize
from programme.export import csv_response, safe_file_name
from programme.records.forms import MatchForm, ReadingForm, StartForm, StoreForm
from programme.records.intake import batches
from programme.records.intake.error_file import error_rows, xlsx_bytes
from programme.records.intake.fields import fields_of
from programme.records.intake.limits import MAX_BYTES, megabytes
from programme.records.intake.preview import Preview
from programme.records.intake.table import open_questions
from programme.records.intake.text_files import DELIMITERS
from programme.records.models import ImportBatch
from programme.roster.access import SiteRequest, site_page
from programme.roster.asking import ReasonForm, page_asked
from programme.roster.permissions import may, require
from programme.rulepack.load import load

# Room for the form around the file.
LARGEST_REQUEST = MAX_BYTES + 1024 * 1024
XLSX_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"
WORDS = {"workers": "people", "samples": "air samples", "fit_tests": "fit tests"}


def _kind(request: SiteRequest, kind: str) -> str:
    kind = kind.replace("-", "_")
    if kind not in batches.ACTS:
        raise Http404(kind)
    require(request.user, batches.ACTS[kind], request.site)
    return kind


def _batch(request: SiteRequest, pk: int) -> ImportBatch:
    """The batch of the request's own site and of a kind the user may bring in."""
    rows = ImportBatch.objects.for_user(request.user).at(request.site).select_related("site")
    batch = get_object_or_404(rows, pk=pk)
    _kind(request, batch.kind)
    return batch


def _show_start(request: SiteRequest, kind: str, form: StartForm, status: int) -> HttpResponse:
    context = {"form": form, "kind": kind, "word": WORDS[kind], "fields": fields_of(kind)}
    return render(request, "records/import_start.html", context, status=status)


@csrf_protect
def _start(request: SiteRequest, kind: str) -> HttpResponse:
    form = StartForm(request.POST or None, request.FILES or None)
    if not form.is_bound or not form.is_valid() or form.read is None:
        return _show_start(request, kind, form, 422 if request.method == "POST" else 200)
    batch = batches.begin(
        form.read, kind=kind, file_name=form.file_name, site=request.site, by=request.user
    )
    if open_questions(batch.table, batch.reading):
        return redirect("records:import_reading", request.site.code, batch.pk)
    return redirect("records:import_match", request.site.code, batch.pk)


# Exempt here and protected in `_start`: the token stands in the body, and a body over the limit
# must be refused before it is read.
@csrf_exempt
@site_page()
@require_http_methods(["GET", "POST"])
def import_start(request: SiteRequest, kind: str) -> HttpResponse:
    """Ask for a file or pasted rows, and read them."""
    kind = _kind(request, kind)
    declared = request.META.get("CONTENT_LENGTH") or "0"
    if not declared.isdigit() or int(declared) > LARGEST_REQUEST:
        return _too_large(request, kind)
    try:
        return _start(request, kind)
    except RequestDataTooBig:
        return _too_large(request, kind)


def _too_large(request: SiteRequest, kind: str) -> HttpResponse:
    messages.error(
        request,
        f"File: it was not read; at most {megabytes(MAX_BYTES)} are allowed "
        "(1 MB of pasted rows). Split it, or leave out what is not needed.",
    )
    return _show_start(request, kind, StartForm(), 413)


@site_page()
@require_http_methods(["GET", "POST"])
def import_reading(request: SiteRequest, pk: int) -> HttpResponse:
    """Ask which sheet, and in which letters."""
    batch = _batch(request, pk)
    form = ReadingForm(request.POST or None, table=batch.table, reading=batch.reading)
    if not form.fields:
        return redirect("records:import_match", request.site.code, pk)
    if form.is_valid():
        batches.choose(batch, form.answers)
        return redirect("records:import_match", request.site.code, pk)
    context = {"form": form, "batch": batch, "word": WORDS[batch.kind]}
    status = 422 if form.is_bound else 200
    return render(request, "records/import_reading.html", context, status=status)


def _sample_choices(request: SiteRequest) -> dict[str, list[tuple[str, str]]]:
    tasks = Task.objects.at(request.site).values_list("code", "name")
    groups = TaskAgent.objects.at(request.site).values_list("agent__key", "agent__name")
    return {"task": list(tasks), "agent": sorted(set(groups), key=lambda pair: pair[1])}


def _fit_choices(request: SiteRequest) -> dict[str, list[tuple[str, str]]]:
    sizes = FacepieceSize.objects.at(request.site).values_list("facepiece__name", "label")
    pack = load(request.site.rule_pack)
    return {
        "facepiece": sorted({(name, name) for name, _ in sizes}),
        "size": sorted({(label, label) for _, label in sizes}),
        "protocol": [(one.id, one.name) for one in pack.protocols],
    }


_CHOICES: dict[str, Callable[[SiteRequest], dict[str, list[tuple[str, str]]]]] = {
    "samples": _sample_choices,
    "fit_tests": _fit_choices,
    "workers": lambda _request: {},
}


@site_page()
@require_http_methods(["GET", "POST"])
def import_match(request: SiteRequest, pk: int) -> HttpResponse:
    """Ask which column means what."""
    batch = _batch(request, pk)
    if open_questions(batch.table, batch.reading):
        return redirect("records:import_reading", request.site.code, pk)
    if batch.stored_at:
        return redirect("records:import_preview", request.site.code, pk)
    table = batches.table_in(batch)
    form = MatchForm(
        request.POST or None,
        kind=batch.kind,
        table=table,
        kept=batch.matching,
        choices=_CHOICES[batch.kind](request),
    )
    if form.is_valid():
        batches.match(batch, form.matching)
        return redirect("records:import_preview", request.site.code, pk)
    context = {"form": form, "batch": batch, "word": WORDS[batch.kind], "table": table}
    context["separator"] = DELIMITERS.get(batch.reading.get("delimiter", ""), "")
    if batch.kind == ImportBatch.Kind.FIT_TESTS:
        context["protocols"] = load(request.site.rule_pack).protocols
    return render(
        request, "records/import_match.html", context, status=422 if form.is_bound else 200
    )


SHOWN = {"all": "every row", "bad": "rows that cannot be stored", "asked": "rows with questions",
         "known": "rows already recorded", "new": "rows that will be stored"}  # fmt: skip


def _is_ready(batch: ImportBatch) -> bool:
    return bool(batch.matching) and not open_questions(batch.table, batch.reading)


def _show_preview(
    request: SiteRequest, batch: ImportBatch, preview: Preview, form: StoreForm
) -> HttpResponse:
    before = batches.stored_before(batch)
    shown = request.GET.get("show", "")
    if shown not in SHOWN:
        shown = "all"
    # What needs a person stands on top.
    order = [*preview.bad, *preview.asked]
    rest = [row for row in preview.rows if not row.problems and row not in order]
    rows = {"all": [*order, *rest]}.get(shown) or getattr(preview, shown, [])
    context = {
        "batch": batch,
        "word": WORDS[batch.kind],
        "preview": preview,
        "form": form,
        "before": before,
        "page": page_asked(request, rows),
        "shown": shown,
        "choices": SHOWN,
        "reason_form": ReasonForm(submit="Take the whole file back"),
    }
    status = 422 if form.is_bound else 200
    return render(request, "records/import_preview.html", context, status=status)


@site_page()
@require_GET
def import_preview(request: SiteRequest, pk: int) -> HttpResponse:
    """Show every row as it will be stored; nothing is stored by looking."""
    batch = _batch(request, pk)
    if not _is_ready(batch):
        return redirect("records:import_match", request.site.code, pk)
    preview = batches.judge(batch)
    form = StoreForm(preview=preview, is_again=batches.stored_before(batch) is not None)
    return _show_preview(request, batch, preview, form)


@site_page()
@require_POST
def import_store(request: SiteRequest, pk: int) -> HttpResponse:
    """Store the new rows, all or none."""
    batch = _batch(request, pk)
    if not _is_ready(batch):
        return redirect("records:import_match", request.site.code, pk)
    preview = batches.judge(batch)
    is_again = batches.stored_before(batch) is not None
    form = StoreForm(request.POST, preview=preview, is_again=is_again)
    if batch.stored_at is None and not form.is_valid():
        return _show_preview(request, batch, preview, form)
    try:
        stored = batches.store(batch, by=request.user, leave_out_bad=bool(preview.bad))
    except ValueError as refused:
        messages.error(request, f"Nothing was stored. {refused}.")
        return redirect("records:import_preview", request.site.code, pk)
    says = f"{len(stored.new)} rows stored"
    if stored.known:
        says += f", {len(stored.known)} were recorded already"
    if stored.bad:
        says += f", {len(stored.bad)} left out"
    messages.success(request, f"{batch.file_name}: {says}.")
    return redirect("records:import_preview", request.site.code, pk)


@site_page()
@require_GET
def import_errors(request: SiteRequest, pk: int) -> HttpResponse:
    """Download the rows that cannot be stored, each with what is wrong."""
    batch = _batch(request, pk)
    if not _is_ready(batch):
        return redirect("records:import_match", request.site.code, pk)
    header, rows = error_rows(batches.table_in(batch), batches.judge(batch))
    name = f"{batch.file_name.rsplit('.', 1)[0]}-errors"
    if request.GET.get("format") != "xlsx":
        return csv_response(name, header, rows)
    answer = HttpResponse(xlsx_bytes(header, rows), content_type=XLSX_TYPE)
    answer["Content-Disposition"] = f'attachment; filename="{safe_file_name(name, "xlsx")}"'
    return answer


@site_page()
@require_POST
def import_undo(request: SiteRequest, pk: int) -> HttpResponse:
    """Take a whole stored file back, with the reason."""
    batch = _batch(request, pk)
    form = ReasonForm(request.POST)
    reason = form.cleaned_data["reason"] if form.is_valid() else ""
    try:
        taken = batches.undo(batch, by=request.user, reason=reason)
    except ValueError as refused:
        messages.error(request, f"Nothing was taken back. {refused}.")
    else:
        kept = batch.rows_stored - taken
        says = f"{batch.file_name}: {taken} rows taken back"
        if kept:
            says += (
                f"; {kept} stay, because they were corrected since or other records rest on them"
            )
        messages.success(request, f"{says}.")
    return redirect("records:import_preview", request.site.code, pk)


@site_page()
@require_GET
def imports(request: SiteRequest) -> HttpResponse:
    """The files that came in, newest first."""
    rows = ImportBatch.objects.for_user(request.user).at(request.site).defer("table")
    kinds = {kind: word for kind, word in WORDS.items() if _may(request, kind)}
    kind = request.GET.get("kind", "")
    asked = [kind] if kind in kinds else list(kinds)
    context: dict[str, Any] = {
        "page": page_asked(request, rows.filter(kind__in=asked)),
        "kinds": kinds,
        "kind": kind,
    }
    return render(request, "records/imports.html", context)


def _may(request: SiteRequest, kind: str) -> bool:
    return may(request.role, batches.ACTS[kind])
