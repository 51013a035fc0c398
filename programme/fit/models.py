"""Fit tests: one worker, one facepiece and size, one day, with every exercise kept."""

from django.core.validators import MaxValueValidator, MinValueValidator
from django.db import models
from django.db.models import Q
from django.urls import reverse

from programme.equipment.models import FacepieceSize
from programme.roster.models import Replaceable, ReplaceableRows, Worker


class FitTestRows(ReplaceableRows):
    site_path = "worker__site"


class FitTest(Replaceable):
    """One fit test. The overall fit factor is worked out from its exercises, never typed."""

    class Outcome(models.TextChoices):
        PASSED = "passed", "passed"
        FAILED = "failed", "failed"
        INCOMPLETE = "incomplete", "incomplete"

    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="fit_tests")
    size = models.ForeignKey(FacepieceSize, on_delete=models.PROTECT, related_name="fit_tests")
    tested_on = models.DateField()
    rule_pack = models.CharField(max_length=40)
    protocol = models.CharField(max_length=40, help_text="protocol of the rule pack")
    overall_fit_factor = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(1e9)],
        help_text="harmonic mean of the counted exercises; empty for a qualitative test",
    )
    as_reported = models.CharField(
        "Overall figure as reported",
        max_length=40,
        blank=True,
        help_text="from paper or file",
    )
    outcome = models.CharField(max_length=12, choices=Outcome.choices)
    element_used = models.CharField(max_length=120, blank=True)
    tester = models.CharField(max_length=120, blank=True)
    note = models.CharField(max_length=300, blank=True)
    fingerprint = models.CharField(max_length=64, editable=False, db_index=True)
    batch = models.CharField(max_length=40, blank=True, editable=False)

    objects = FitTestRows.as_manager()

    class Meta:
        ordering = ["-tested_on", "-pk"]
        constraints = [
            models.CheckConstraint(
                name="fit_factor_between_1_and_1e9",
                condition=Q(overall_fit_factor=None)
                | Q(overall_fit_factor__gte=1, overall_fit_factor__lte=1e9),
                violation_error_message="Fit factor must be 1 to 1 000 000 000.",
            ),
            models.UniqueConstraint(
                fields=["worker", "fingerprint"],
                condition=Q(replaced_by=None, withdrawn_at=None),
                name="fit_test_line_once",
                violation_error_message="This fit test is already recorded.",
            ),
        ]
        indexes = [models.Index(fields=["worker", "size", "tested_on"])]

    def __str__(self) -> str:
        return f"{self.worker.name}, {self.size}, {self.tested_on}: {self.outcome}"

    def get_absolute_url(self) -> str:
        return reverse("fit:test", args=[self.worker.site.code, self.pk])


class FitExercise(models.Model):
    """One exercise of a test, in the order of its protocol."""

    test = models.ForeignKey(FitTest, on_delete=models.PROTECT, related_name="exercises")
    order = models.PositiveSmallIntegerField()
    exercise = models.CharField(max_length=40, help_text="exercise of the protocol")
    reading = models.PositiveSmallIntegerField(default=1)
    fit_factor = models.FloatField(
        null=True, blank=True, validators=[MinValueValidator(1), MaxValueValidator(1e9)]
    )
    is_counted = models.BooleanField(default=True, help_text="counts in the overall fit factor")

    class Meta:
        ordering = ["test", "order", "reading"]
        constraints = [
            models.UniqueConstraint(
                fields=["test", "order", "reading"],
                name="one_figure_an_exercise_and_reading",
            ),
            models.CheckConstraint(
                name="exercise_fit_factor_between_1_and_1e9",
                condition=Q(fit_factor=None) | Q(fit_factor__gte=1, fit_factor__lte=1e9),
                violation_error_message="Fit factor must be 1 to 1 000 000 000.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.exercise}: {self.fit_factor}"
