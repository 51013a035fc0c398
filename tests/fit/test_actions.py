"""What may be done to fit tests."""

import pytest
from django.core.exceptions import PermissionDenied

from programme.fit import actions
from programme.fit.actions import Entered, drafted
from programme.fit.models import FitExercise, FitTest
from programme.fit.outcome import slots_of
from programme.ledger.models import Entry
from programme.rulepack.load import load
from tests.builders import (
    DAY,
    make_facepiece,
    make_site,
    make_user,
    make_worker,
    size_of,
)

pytestmark = pytest.mark.django_db
CLASSIC = "ambient_aerosol_cnc"
REASON = "size misread on the sheet"


def draft_of(worker, size, figure=800.0, **fields):
    pack = load(worker.site.rule_pack)
    protocol = fields.pop("protocol", CLASSIC)
    count = len(slots_of(pack.protocol(protocol)))
    fields.setdefault("fit_factors", (figure,) * count)
    fields.setdefault("tested_on", DAY)
    return drafted(Entered(worker, size, protocol=protocol, **fields), pack=pack)


@pytest.fixture
def worker():
    return make_worker(name="Ana Whitlock")


@pytest.fixture
def size(worker):
    return size_of(make_facepiece(worker.site))


def test_a_test_is_stored_with_every_exercise_and_entered(worker, size):
    test = actions.record_fit_test(draft_of(worker, size), by=make_user("hygienist"))
    assert (test.outcome, test.overall_fit_factor) == ("passed", pytest.approx(800))
    assert test.exercises.count() == 8
    assert test.exercises.filter(is_counted=False).get().exercise == "grimace"
    assert Entry.objects.get().act == "fit test recorded"


@pytest.mark.parametrize(
    ("role", "where"),
    [("coordinator", "north"), ("manager", "north"), ("hygienist", "south")],
    ids=["coordinator", "manager", "hygienist of another site"],
)
def test_nobody_but_the_sites_hygienist_or_administrator_records(role, where, worker, size):
    with pytest.raises(PermissionDenied):
        actions.record_fit_test(draft_of(worker, size), by=make_user(role, make_site(where)))
    assert not FitTest.objects.exists()


def test_a_facepiece_of_another_site_is_refused(worker):
    elsewhere = size_of(make_facepiece(make_site("south")))
    with pytest.raises(ValueError, match="must belong to North works"):
        actions.record_fit_test(draft_of(worker, elsewhere), by=make_user())


def test_a_protocol_that_is_not_for_the_facepiece_is_refused(worker):
    filtering = size_of(make_facepiece(worker.site, kind="filtering_facepiece"))
    with pytest.raises(ValueError, match=r"^Protocol: .* is not allowed for a filtering facepiece"):
        draft_of(worker, filtering, protocol="cnp_redon")


def test_the_same_test_twice_is_refused_and_stored_once(worker, size):
    user = make_user()
    actions.record_fit_test(draft_of(worker, size), by=user)
    with pytest.raises(ValueError, match="already recorded"):
        actions.record_fit_test(draft_of(worker, size), by=user)
    assert FitTest.objects.count() == 1
    assert Entry.objects.count() == 1


def test_many_tests_are_stored_in_one_go_all_or_none(worker, size):
    user = make_user()
    drafts = [draft_of(worker, size, figure) for figure in (200.0, 300.0, 300.0)]
    with pytest.raises(ValueError, match="nothing was stored"):
        actions.record_fit_tests(drafts, site=worker.site, by=user)
    assert not FitExercise.objects.exists()
    stored = actions.record_fit_tests(
        [draft_of(worker, size, figure) for figure in (200.0, 300.0)], site=worker.site, by=user
    )
    assert [test.exercises.count() for test in stored] == [8, 8]
    assert Entry.objects.count() == 2


def test_storing_many_costs_the_same_queries_for_2_and_20(
    worker, size, django_assert_max_num_queries
):
    drafts = [draft_of(worker, size, 200.0 + n) for n in range(20)]
    user = make_user()
    with django_assert_max_num_queries(20):
        actions.record_fit_tests(drafts, site=worker.site, by=user)


def test_a_correction_replaces_and_keeps_the_old_one(worker, size):
    user = make_user()
    old = actions.record_fit_test(draft_of(worker, size), by=user)
    large = size.facepiece.sizes.get(label="L")
    new = actions.replace_fit_test(old, draft_of(worker, large), by=user, reason=REASON)
    assert (old.stands, old.replaced_by, old.change_reason) == (False, new, REASON)
    assert old.exercises.count() == new.exercises.count() == 8


def test_a_correction_of_the_remarks_only_is_allowed(worker, size):
    user = make_user()
    old = actions.record_fit_test(draft_of(worker, size), by=user)
    new = actions.replace_fit_test(
        old, draft_of(worker, size, note="probe changed"), by=user, reason=REASON
    )
    assert list(FitTest.objects.in_force()) == [new]


def test_a_correction_never_moves_a_test_to_another_worker(worker, size):
    user = make_user()
    old = actions.record_fit_test(draft_of(worker, size), by=user)
    other = draft_of(make_worker(worker.site), size)
    with pytest.raises(ValueError, match="a correction keeps the worker"):
        actions.replace_fit_test(old, other, by=user, reason=REASON)


def test_the_second_of_two_corrections_is_refused(worker, size):
    user = make_user()
    old = actions.record_fit_test(draft_of(worker, size), by=user)
    stale = FitTest.objects.get(pk=old.pk)
    actions.replace_fit_test(old, draft_of(worker, size, 700.0), by=user, reason=REASON)
    with pytest.raises(ValueError, match="was replaced or withdrawn before"):
        actions.replace_fit_test(stale, draft_of(worker, size, 600.0), by=user, reason=REASON)
    assert FitTest.objects.count() == 2


def test_a_withdrawn_test_may_be_recorded_again(worker, size):
    user = make_user()
    test = actions.record_fit_test(draft_of(worker, size), by=user)
    actions.withdraw_fit_test(test, by=user, reason="recorded for the wrong person")
    assert actions.record_fit_test(draft_of(worker, size), by=user).stands


def test_an_incomplete_test_is_stored_and_never_passed(worker, size):
    figures = (800.0,) * 7 + (None,)
    draft = draft_of(worker, size, fit_factors=figures)
    test = actions.record_fit_test(draft, by=make_user())
    assert (test.outcome, test.overall_fit_factor) == ("incomplete", None)
