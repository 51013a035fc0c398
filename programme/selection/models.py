"""Which assemblies are assigned to a task, and who wears what there."""

from datetime import date

from django.db import models
from django.db.models import F, Q

from exposure.models import Task
from programme.equipment.models import Assembly, FacepieceSize
from programme.roster.models import SiteRows, Worker, active_on


class OfTask(SiteRows):
    site_path = "task__site"

    def active(self, on: date):
        return self.filter(active_on(on))


class TaskAssembly(models.Model):
    """An assembly assigned to a task over a time; ended with a reason, never deleted."""

    task = models.ForeignKey(Task, on_delete=models.PROTECT, related_name="assemblies")
    assembly = models.ForeignKey(Assembly, on_delete=models.PROTECT, related_name="assignments")
    active_from = models.DateField()
    active_to = models.DateField(null=True, blank=True)
    recorded_by = models.CharField(max_length=150, blank=True)
    reason = models.CharField(max_length=300, blank=True)

    objects = OfTask.as_manager()

    class Meta:
        ordering = ["task", "-active_from"]
        verbose_name_plural = "task assemblies"
        constraints = [
            models.UniqueConstraint(
                fields=["task", "assembly"],
                condition=Q(active_to=None),
                name="assembly_assigned_once_at_a_time",
                violation_error_message="This assembly is assigned to the task already.",
            ),
            models.CheckConstraint(
                name="assignment_ends_after_it_begins",
                condition=Q(active_to=None) | Q(active_to__gte=F("active_from")),
                violation_error_message="The end must not be earlier than the start.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.assembly} for {self.task}"


class CrewMember(models.Model):
    """A worker on a task, with the assembly and the size of facepiece they wear there."""

    task = models.ForeignKey(Task, on_delete=models.PROTECT, related_name="crew")
    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="crews")
    assembly = models.ForeignKey(
        Assembly, on_delete=models.PROTECT, null=True, blank=True, related_name="crew"
    )
    size = models.ForeignKey(
        FacepieceSize,
        on_delete=models.PROTECT,
        null=True,
        blank=True,
        related_name="crew",
    )
    active_from = models.DateField()
    active_to = models.DateField(null=True, blank=True)
    recorded_by = models.CharField(max_length=150, blank=True)
    reason = models.CharField(max_length=300, blank=True)

    objects = OfTask.as_manager()

    class Meta:
        ordering = ["task", "worker__name"]
        constraints = [
            models.UniqueConstraint(
                fields=["task", "worker"],
                condition=Q(active_to=None),
                name="worker_once_on_a_task",
                violation_error_message="This worker is on the task already.",
            ),
            models.CheckConstraint(
                name="crew_ends_after_it_begins",
                condition=Q(active_to=None) | Q(active_to__gte=F("active_from")),
                violation_error_message="The end must not be earlier than the start.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.worker} on {self.task}"
