"""What may be done to samples: recorded, corrected, withdrawn, each in the ledger."""

import math
from datetime import date

import pytest
from django.core.exceptions import PermissionDenied
from django.db import IntegrityError, connection, transaction
from django.test.utils import CaptureQueriesContext

from exposure import actions
from exposure.actions import Line, fingerprint
from exposure.models import Sample
from programme.ledger.actions import verify
from programme.ledger.models import Entry
from tests.builders import DAY, make_sample, make_site, make_user, make_worker

pytestmark = pytest.mark.django_db
REASON = "unit misread on the sheet"
LINE = Line(
    site="north",
    task="relining",
    agent="14808-60-7",
    worker="W-1",
    sampled_on=DAY,
    reference="L-17",
    result=0.25,
    is_censored=False,
    unit="mg/m3",
    minutes=455.0,
)


def new(group, text="0.25", **fields):
    value = float(text.lstrip("<"))
    defaults = {"value": value, "unit": "mg/m3", "unit_as_reported": "mg/m3", "sampled_on": DAY}
    if text.startswith("<"):
        defaults |= {"is_censored": True, "lod": value}
    return Sample(task_agent=group, result_as_reported=text, **{**defaults, **fields})


def with_(**fields):
    return fingerprint(Line(**{**LINE.__dict__, **fields}))


@pytest.mark.parametrize(
    "fields",
    [
        {"site": "south"},
        {"task": "tapping"},
        {"agent": "7439-92-1"},
        {"worker": ""},
        {"sampled_on": date(2026, 3, 1)},
        {"reference": "L-18"},
        {"result": 0.26},
        {"is_censored": True},
        {"unit": "ppm"},
        {"minutes": None},
    ],
    ids=lambda fields: next(iter(fields)),
)
def test_lines_that_differ_in_one_thing_are_two_samples(fields):
    assert with_(**fields) != fingerprint(LINE)


def test_a_line_is_the_same_however_it_is_written():
    assert with_(reference=" l-17 ", result=250 / 1000, minutes=455) == fingerprint(LINE)


def test_a_sample_is_stored_and_entered(group, hygienist):
    sample = actions.record_sample(new(group), by=hygienist)
    entry = Entry.objects.get()
    assert (entry.act, entry.subject_id) == ("sample recorded", str(sample.pk))
    assert sample.recorded_by == hygienist.username


@pytest.mark.parametrize(
    ("role", "where"),
    [("coordinator", "north"), ("manager", "north"), ("hygienist", "south")],
    ids=["coordinator", "manager", "hygienist of another site"],
)
def test_nobody_else_records_corrects_or_withdraws(group, role, where):
    old, user = make_sample(group), make_user(role, make_site(where))
    for act in (
        lambda: actions.record_sample(new(group), by=user),
        lambda: actions.record_samples([new(group)], site=group.task.site, by=user),
        lambda: actions.replace_sample(old, new(group), by=user, reason=REASON),
        lambda: actions.withdraw_sample(old, by=user, reason=REASON),
    ):
        with pytest.raises(PermissionDenied):
            act()
    assert Sample.objects.get().stands


def test_the_same_line_is_refused_the_second_time(group, hygienist):
    actions.record_sample(new(group), by=hygienist)
    with pytest.raises(ValueError, match="already recorded for this task"):
        actions.record_sample(new(group, "0.250"), by=hygienist)
    assert Entry.objects.count() == Sample.objects.count() == 1


def test_a_sample_number_tells_two_equal_results_apart(group, hygienist):
    actions.record_sample(new(group, "<0.02", reference="1"), by=hygienist)
    assert actions.record_sample(new(group, "<0.02", reference="2"), by=hygienist).pk


def test_many_samples_are_stored_in_one_go_each_with_its_entry(group, hygienist):
    rows = [new(group, str(0.1 + n / 100)) for n in range(30)]
    count = actions.record_samples(rows, site=group.task.site, by=hygienist, batch="March")
    assert count == Sample.objects.filter(batch="March").count() == Entry.objects.count() == 30
    assert verify("north").is_whole


def test_one_bad_line_stores_none_of_many(group, hygienist):
    with pytest.raises(ValueError, match="nothing was stored"):
        actions.record_samples(
            [new(group), new(group, "0.3"), new(group)], site=group.task.site, by=hygienist
        )
    assert not Sample.objects.exists()
    assert not Entry.objects.exists()


def test_a_sample_of_another_site_is_not_slipped_in(group):
    south = make_site("south")
    with pytest.raises(ValueError, match="is not a task of South works"):
        actions.record_samples([new(group)], site=south, by=make_user("hygienist", south))


def test_a_correction_keeps_both_and_the_reason(group, hygienist):
    old = actions.record_sample(new(group, "250"), by=hygienist)
    correct = actions.replace_sample(old, new(group), by=hygienist, reason=REASON)
    old.refresh_from_db()
    assert (old.replaced_by, old.change_reason) == (correct, REASON)
    assert list(Sample.objects.in_force()) == [correct]
    assert Entry.objects.get(act="sample corrected").reason == REASON


def test_a_correction_of_the_note_only_is_possible(group, hygienist):
    old = actions.record_sample(new(group), by=hygienist)
    assert actions.replace_sample(old, new(group, note="rain"), by=hygienist, reason=REASON).stands


def test_of_two_corrections_the_second_is_told(group, hygienist):
    old = actions.record_sample(new(group), by=hygienist)
    actions.replace_sample(old, new(group, "0.3"), by=hygienist, reason=REASON)
    with pytest.raises(ValueError, match="correct the newest one"):
        actions.replace_sample(old, new(group, "0.4"), by=hygienist, reason=REASON)


@pytest.mark.parametrize("reason", ["", "   ", "x", "slip"])
def test_a_reason_of_a_letter_is_none(group, hygienist, reason):
    old = actions.record_sample(new(group), by=hygienist)
    with pytest.raises(ValueError, match="Reason"):
        actions.withdraw_sample(old, by=hygienist, reason=reason)
    assert Sample.objects.get().stands


def test_a_withdrawn_line_may_be_recorded_again(group, hygienist):
    old = actions.record_sample(new(group), by=hygienist)
    actions.withdraw_sample(old, by=hygienist, reason=REASON)
    assert actions.record_sample(new(group), by=hygienist).stands


BAD = [math.nan, math.inf, -math.inf, 0.0, -1.0, 2e6]


@pytest.mark.parametrize("bad", BAD)
@pytest.mark.parametrize("field", ["value", "lod", "minutes"])
def test_a_figure_that_cannot_be_is_refused_by_name(group, hygienist, field, bad):
    with pytest.raises(ValueError, match=r"^(Result|Detection limit|Minutes): .* is not allowed"):
        actions.record_sample(new(group, **{field: bad}), by=hygienist)
    with pytest.raises(ValueError, match="is not allowed"):
        actions.record_samples([new(group, **{field: bad})], site=group.task.site, by=hygienist)
    assert not Sample.objects.exists()


def test_below_detection_without_its_limit_is_refused(group, hygienist):
    with pytest.raises(ValueError, match=r"^Detection limit: none"):
        actions.record_sample(new(group, is_censored=True), by=hygienist)


@pytest.mark.parametrize("bad", BAD)
def test_the_database_itself_refuses_a_result_that_cannot_be(group, bad):
    with pytest.raises(IntegrityError), transaction.atomic():
        make_sample(group, value=bad)
    with pytest.raises(IntegrityError), transaction.atomic():
        Sample.objects.bulk_create([new(group, value=bad, fingerprint="a")])


@pytest.mark.parametrize("bad", BAD)
@pytest.mark.parametrize("field", ["lod", "minutes"])
def test_the_database_itself_never_keeps_a_figure_that_cannot_be(group, field, bad):
    # SQLite binds NaN as NULL: what is kept then is "not recorded".
    try:
        with transaction.atomic():
            kept = make_sample(group, **{field: bad})
    except IntegrityError:
        return
    kept.refresh_from_db()
    assert getattr(kept, field) is None


def test_recording_many_costs_the_same_queries_for_3_and_30(group, hygienist):
    worker = make_worker(group.task.site)
    actions.record_sample(new(group, "0.5"), by=hygienist)
    counts = []
    for start, size in ((1, 3), (100, 30)):
        rows = [new(group, str(start + n), worker=worker) for n in range(size)]
        with CaptureQueriesContext(connection) as seen:
            actions.record_samples(rows, site=group.task.site, by=hygienist)
        counts.append(len(seen))
    assert counts[0] == counts[1]
