"""What the database refuses of fit tests, whoever writes."""

from math import inf, nan

import pytest
from django.db import IntegrityError, transaction

from programme.fit.models import FitExercise, FitTest
from tests.builders import make_fit_test, make_worker

pytestmark = pytest.mark.django_db
NO_FIT_FACTORS = [0.0, -1.0, 0.999, 1.000001e9, inf, -inf, nan]


@pytest.mark.parametrize("figure", NO_FIT_FACTORS)
def test_an_overall_figure_is_1_to_1e9_or_unknown(figure):
    worker = make_worker()
    try:
        with transaction.atomic():
            make_fit_test(worker, overall_fit_factor=figure)
    except IntegrityError:
        return
    # One of the databases keeps NaN as nothing at all, which no judgement takes for a pass.
    assert FitTest.objects.get().overall_fit_factor is None


@pytest.mark.parametrize("figure", NO_FIT_FACTORS)
def test_an_exercise_figure_is_1_to_1e9_or_unknown_in_bulk_too(figure):
    test = make_fit_test(make_worker(), fit_factors=())
    try:
        with transaction.atomic():
            FitExercise.objects.bulk_create(
                [FitExercise(test=test, order=1, exercise="talking", fit_factor=figure)]
            )
    except IntegrityError:
        return
    assert test.exercises.get().fit_factor is None


def test_one_worker_has_the_same_line_once_while_it_stands():
    first = make_fit_test(make_worker(), fingerprint="same")
    with pytest.raises(IntegrityError):
        make_fit_test(first.worker, first.size, fingerprint="same")


def test_two_workers_may_have_the_same_figures():
    first = make_fit_test(make_worker(), fingerprint="same")
    assert make_fit_test(make_worker(), first.size, fingerprint="same").pk


def test_an_exercise_has_one_figure_a_reading():
    test = make_fit_test(make_worker())
    with pytest.raises(IntegrityError):
        FitExercise.objects.create(test=test, order=1, exercise="talking", fit_factor=100.0)
