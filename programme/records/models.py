"""Files brought in, and papers printed."""

from django.db import models

from programme.roster.models import Site, SiteRows


class ImportBatch(models.Model):
    """A file on its way in: kept as it came, stored only when its preview was confirmed."""

    class Kind(models.TextChoices):
        WORKERS = "workers", "workers"
        SAMPLES = "samples", "air samples"
        FIT_TESTS = "fit_tests", "fit tests"

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="imports")
    kind = models.CharField(max_length=12, choices=Kind.choices)
    file_name = models.CharField(max_length=200)
    sha256 = models.CharField(max_length=64, db_index=True)
    table = models.JSONField(help_text="header and rows as read, text only")
    reading = models.JSONField(default=dict, help_text="encoding, delimiter, decimal mark, sheet")
    matching = models.JSONField(default=dict, help_text="field -> column number or fixed value")
    started_at = models.DateTimeField(auto_now_add=True)
    started_by = models.CharField(max_length=150)
    stored_at = models.DateTimeField(null=True, blank=True)
    rows_stored = models.PositiveIntegerField(default=0)
    undone_at = models.DateTimeField(null=True, blank=True)

    objects = SiteRows.as_manager()

    class Meta:
        ordering = ["-started_at"]
        verbose_name_plural = "import batches"

    def __str__(self) -> str:
        return f"{self.file_name} ({self.kind})"
