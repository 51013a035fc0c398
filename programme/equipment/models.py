"""Facepieces and sizes, filters and cartridges, approved assemblies, filter changes."""

from django.core.validators import MaxValueValidator, MinValueValidator
from django.db import models
from django.db.models import Q
from django.urls import reverse

from programme.roster.models import Replaceable, ReplaceableRows, Site, SiteRows, Worker


class FacepieceKind(models.TextChoices):
    FILTERING = "filtering_facepiece", "filtering facepiece"
    QUARTER = "quarter_mask", "quarter mask"
    HALF = "half_mask", "half mask"
    FULL = "full_facepiece", "full facepiece"
    HOOD = "helmet_or_hood", "helmet or hood"
    LOOSE = "loose_fitting_facepiece", "loose-fitting facepiece"


TIGHT_KINDS = frozenset({"filtering_facepiece", "quarter_mask", "half_mask", "full_facepiece"})


class Facepiece(models.Model):
    """A model of facepiece that the site keeps."""

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="facepieces")
    name = models.CharField(max_length=120, help_text="maker, model and style as on the label")
    kind = models.CharField(max_length=30, choices=FacepieceKind.choices)
    withdrawn_on = models.DateField(null=True, blank=True)

    objects = SiteRows.as_manager()

    class Meta:
        ordering = ["name"]
        constraints = [
            models.UniqueConstraint(
                fields=["site", "name"],
                name="facepiece_once_a_site",
                violation_error_message="The site has a facepiece of this name already.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    @property
    def is_tight(self) -> bool:
        return self.kind in TIGHT_KINDS


class SizeRows(SiteRows):
    site_path = "facepiece__site"


class FacepieceSize(models.Model):
    """One size of a facepiece; what a fit test is valid for."""

    facepiece = models.ForeignKey(Facepiece, on_delete=models.PROTECT, related_name="sizes")
    label = models.CharField(max_length=20)
    order = models.PositiveSmallIntegerField(default=0)

    objects = SizeRows.as_manager()

    class Meta:
        ordering = ["facepiece", "order", "label"]
        constraints = [
            models.UniqueConstraint(fields=["facepiece", "label"], name="size_once_a_facepiece"),
        ]

    def __str__(self) -> str:
        return f"{self.facepiece.name}, {self.label}"


class Element(models.Model):
    """A filter, cartridge or combined element, as its data sheet gives it."""

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="elements")
    name = models.CharField(max_length=120)
    particulate_class = models.CharField(
        max_length=20,
        blank=True,
        help_text="class of the rule pack, e.g. P100; empty if none",
    )
    gas_elements = models.JSONField(
        default=list,
        blank=True,
        help_text="gas elements of the rule pack, e.g. OV; empty if none",
    )
    gas_class = models.PositiveSmallIntegerField(
        null=True, blank=True, validators=[MinValueValidator(1), MaxValueValidator(3)]
    )
    is_pair = models.BooleanField("used in pairs", default=False)
    area_cm2 = models.FloatField(
        "Filter area, all elements together",
        null=True,
        blank=True,
        validators=[MinValueValidator(5), MaxValueValidator(20000)],
        help_text="cm², 5 to 20 000",
    )
    clean_resistance_pa = models.FloatField(
        "Resistance when new at 85 L/min",
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(1000)],
        help_text="Pa, 1 to 1000",
    )
    maker_max_h = models.FloatField(
        "Maker's time limit in use",
        null=True,
        blank=True,
        validators=[MinValueValidator(0.1), MaxValueValidator(5000)],
        help_text="h, 0.1 to 5000",
    )
    cartridge_life_h = models.FloatField(
        "Cartridge life from objective data",
        null=True,
        blank=True,
        validators=[MinValueValidator(0.05), MaxValueValidator(1000)],
        help_text="h at the conditions of the task, 0.05 to 1000",
    )
    cartridge_life_source = models.CharField(
        max_length=300,
        blank=True,
        help_text="where the life comes from: maker's data, test, model",
    )
    has_esli = models.BooleanField("end-of-service-life indicator", default=False)
    in_stock = models.PositiveIntegerField(default=0)
    withdrawn_on = models.DateField(null=True, blank=True)

    objects = SiteRows.as_manager()

    class Meta:
        ordering = ["name"]
        constraints = [
            models.UniqueConstraint(
                fields=["site", "name"],
                name="element_once_a_site",
                violation_error_message="The site has a filter or cartridge of this name already.",
            ),
            models.CheckConstraint(
                name="element_figures_are_physical",
                condition=(Q(area_cm2=None) | Q(area_cm2__gte=5, area_cm2__lte=20000))
                & (
                    Q(clean_resistance_pa=None)
                    | Q(clean_resistance_pa__gte=1, clean_resistance_pa__lte=1000)
                )
                & (Q(maker_max_h=None) | Q(maker_max_h__gte=0.1, maker_max_h__lte=5000))
                & (
                    Q(cartridge_life_h=None)
                    | Q(cartridge_life_h__gte=0.05, cartridge_life_h__lte=1000)
                ),
                violation_error_message="Area 5 to 20 000 cm², resistance 1 to 1000 Pa, "
                "maker's limit 0.1 to 5000 h, cartridge life 0.05 to 1000 h.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    @property
    def is_gas(self) -> bool:
        return bool(self.gas_elements)


class Assembly(models.Model):
    """An approved whole: facepiece with element or air supply, in one respirator class."""

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="assemblies")
    name = models.CharField(max_length=160)
    respirator_class = models.CharField(max_length=40, help_text="class of the rule pack")
    facepiece = models.ForeignKey(Facepiece, on_delete=models.PROTECT, related_name="assemblies")
    element = models.ForeignKey(
        Element,
        on_delete=models.PROTECT,
        null=True,
        blank=True,
        related_name="assemblies",
    )
    approval_number = models.CharField(
        max_length=60,
        blank=True,
        help_text="of the whole assembly, as on its approval label",
    )
    maker_evidence = models.CharField(
        max_length=200,
        blank=True,
        help_text="document that shows a higher factor, where the rule pack allows it",
    )
    service_life_min = models.PositiveSmallIntegerField(
        null=True,
        blank=True,
        help_text="min, certified life of a self-contained supply",
    )
    in_stock = models.PositiveIntegerField(default=0)
    withdrawn_on = models.DateField(null=True, blank=True)

    objects = SiteRows.as_manager()

    class Meta:
        ordering = ["name"]
        verbose_name_plural = "assemblies"
        constraints = [
            models.UniqueConstraint(
                fields=["site", "name"],
                name="assembly_once_a_site",
                violation_error_message="The site has an assembly of this name already.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    def get_absolute_url(self) -> str:
        return reverse("equipment:assembly", args=[self.site.code, self.pk])


class ChangeRows(ReplaceableRows):
    site_path = "worker__site"


class FilterChange(Replaceable):
    """A worker fitted a new filter or cartridge to an assembly."""

    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="filter_changes")
    assembly = models.ForeignKey(Assembly, on_delete=models.PROTECT, related_name="changes")
    fitted_at = models.DateTimeField()
    shifts_used = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0), MaxValueValidator(2000)],
        help_text="shifts worn since, if counted; else worked out from the task's shifts a week",
    )
    lot = models.CharField(max_length=40, blank=True)
    note = models.CharField(max_length=200, blank=True)

    objects = ChangeRows.as_manager()

    class Meta:
        ordering = ["-fitted_at", "-pk"]
        constraints = [
            models.CheckConstraint(
                name="shifts_used_0_to_2000",
                condition=Q(shifts_used=None) | Q(shifts_used__gte=0, shifts_used__lte=2000),
                violation_error_message="Shifts used must be 0 to 2000.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.worker.name}: {self.assembly} at {self.fitted_at:%Y-%m-%d %H:%M}"
