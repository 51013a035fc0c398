"""The ledger: one row an act, append only, each row bound to the one before it by a hash."""

from django.db import models


class Entry(models.Model):
    """One act. Rows are only ever added; `verify` finds any that were changed since."""

    chain = models.CharField(max_length=60, help_text="site code, or 'programme'")
    serial = models.PositiveBigIntegerField()
    at = models.DateTimeField()
    by = models.CharField(max_length=150)
    act = models.CharField(max_length=80)
    subject_kind = models.CharField(max_length=60)
    subject_id = models.CharField(max_length=40)
    says = models.CharField(max_length=300)
    reason = models.TextField(blank=True)
    detail = models.JSONField(default=dict)
    method = models.CharField(max_length=20, default="sha256-1")
    previous_hash = models.CharField(max_length=64)
    hash = models.CharField(max_length=64)

    class Meta:
        ordering = ["chain", "serial"]
        verbose_name_plural = "entries"
        constraints = [
            models.UniqueConstraint(fields=["chain", "serial"], name="one_entry_a_serial"),
        ]

    def __str__(self) -> str:
        return f"{self.chain} {self.serial}: {self.act}"


class Head(models.Model):
    """The last row of a chain; locked while the next one is written."""

    chain = models.CharField(max_length=60, unique=True)
    serial = models.PositiveBigIntegerField(default=0)
    hash = models.CharField(max_length=64, blank=True)

    def __str__(self) -> str:
        return f"{self.chain} {self.serial}"
