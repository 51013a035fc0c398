"""Agents, their limits, the tasks in which they are met, and what was measured there."""

from datetime import date, time

from django.core.validators import MaxValueValidator, MinValueValidator
from django.db import models
from django.db.models import F, Q
from django.urls import reverse

from programme.roster.models import (
    Replaceable,
    ReplaceableRows,
    Site,
    SiteRows,
    Worker,
    WorkRate,
    active_on,
)


class Sure(models.TextChoices):
    VERIFIED = "verified", "verified"
    COMPUTED = "computed", "computed"
    MEMORY = "memory", "unconfirmed"
    SITE = "site", "entered by the site"


class YesNoUnknown(models.TextChoices):
    YES = "yes", "yes"
    NO = "no", "no"
    UNKNOWN = "unknown", "not known"


class AgentQuerySet(models.QuerySet["Agent"]):
    def at(self, site: Site) -> "AgentQuerySet":
        """The shipped agents and those the site added."""
        return self.filter(Q(site=None) | Q(site=site))


class Agent(models.Model):
    """An airborne agent; shipped with a source, or added by a site with one."""

    class Kind(models.TextChoices):
        DUST = "dust", "dust"
        FUME = "fume", "fume"
        MIST = "mist", "mist"
        FIBRE = "fibre", "fibre"
        VAPOUR = "vapour", "vapour"
        GAS = "gas", "gas"
        BIOAEROSOL = "bioaerosol", "bioaerosol"

    key = models.CharField(
        max_length=40,
        help_text="CAS registry number; entries without one begin with NOCAS-",
    )
    site = models.ForeignKey(
        Site, on_delete=models.PROTECT, null=True, blank=True, related_name="own_agents"
    )
    name = models.CharField(max_length=120)
    kind = models.CharField(max_length=12, choices=Kind.choices)
    synonyms = models.TextField(blank=True)
    molar_mass_g_mol = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(5000)],
    )
    boiling_point_c = models.FloatField(null=True, blank=True)
    vapour_pressure_kpa_20c = models.FloatField(null=True, blank=True)
    liquid_density_kg_m3 = models.FloatField(null=True, blank=True)
    refractive_index = models.FloatField(null=True, blank=True)
    idlh_value = models.FloatField(null=True, blank=True)
    idlh_unit = models.CharField(max_length=10, blank=True)
    warning_properties = models.CharField(max_length=12, default="unknown")
    eye_irritant = models.CharField(
        max_length=8, choices=YesNoUnknown.choices, default=YesNoUnknown.UNKNOWN
    )
    skin_notation = models.CharField(
        max_length=8, choices=YesNoUnknown.choices, default=YesNoUnknown.UNKNOWN
    )
    carcinogen_note = models.CharField(max_length=200, blank=True)
    us_filter_need = models.CharField(max_length=40, blank=True)
    en_filter_need = models.CharField(max_length=40, blank=True)
    is_oil_aerosol = models.BooleanField(default=False)
    source = models.CharField(max_length=300)
    sure = models.CharField(max_length=10, choices=Sure.choices)
    sure_by_column = models.JSONField(default=dict, blank=True)
    remarks = models.TextField(blank=True)

    objects = AgentQuerySet.as_manager()

    class Meta:
        ordering = ["name"]
        constraints = [
            models.UniqueConstraint(
                fields=["key"], condition=Q(site=None), name="one_shipped_agent_a_key"
            ),
            models.UniqueConstraint(
                fields=["site", "key"],
                name="one_site_agent_a_key",
                violation_error_message="The site has an agent with this number already.",
            ),
            models.CheckConstraint(
                name="agent_molar_mass_1_to_5000",
                condition=Q(molar_mass_g_mol=None)
                | Q(molar_mass_g_mol__gte=1, molar_mass_g_mol__lte=5000),
                violation_error_message="Molar mass must be 1 to 5000 g/mol.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    @property
    def cas(self) -> str:
        return "" if self.key.startswith("NOCAS-") else self.key

    @property
    def is_particulate(self) -> bool:
        return self.kind in {"dust", "fume", "mist", "fibre", "bioaerosol"}


class Unit(models.TextChoices):
    """Units in which a limit or a stored result may stand."""

    MG_M3 = "mg/m3", "mg/m³"
    PPM = "ppm", "ppm"
    F_CM3 = "f/cm3", "f/cm³"


class Fraction(models.TextChoices):
    TOTAL = "total", "total"
    INHALABLE = "inhalable", "inhalable"
    THORACIC = "thoracic", "thoracic"
    RESPIRABLE = "respirable", "respirable"
    VAPOUR = "vapour", "gas or vapour"


class LimitQuerySet(models.QuerySet["ExposureLimit"]):
    def at(self, site: Site) -> "LimitQuerySet":
        return self.filter(Q(site=None) | Q(site=site))


class ExposureLimit(models.Model):
    """One limit of one list, with its edition and source. Editions coexist."""

    class Kind(models.TextChoices):
        TWA = "TWA", "8-hour average"
        STEL = "STEL", "short-term average"
        CEILING = "C", "ceiling"

    agent = models.ForeignKey(Agent, on_delete=models.PROTECT, related_name="limits")
    site = models.ForeignKey(
        Site, on_delete=models.PROTECT, null=True, blank=True, related_name="own_limits"
    )
    list_code = models.CharField(max_length=20, help_text="e.g. US-PEL; SITE for the site's own")
    edition = models.CharField(max_length=40, blank=True)
    kind = models.CharField(max_length=4, choices=Kind.choices)
    fraction = models.CharField(max_length=12, choices=Fraction.choices)
    value = models.FloatField(validators=[MinValueValidator(1e-12), MaxValueValidator(1e6)])
    unit = models.CharField(max_length=10, choices=Unit.choices)
    averaging_min = models.PositiveSmallIntegerField()
    note = models.CharField(max_length=200, blank=True)
    source = models.CharField(max_length=300)
    sure = models.CharField(max_length=10, choices=Sure.choices)
    withdrawn_on = models.DateField(null=True, blank=True)

    objects = LimitQuerySet.as_manager()

    class Meta:
        ordering = ["agent", "list_code", "kind", "value"]
        constraints = [
            models.CheckConstraint(
                name="limit_above_0_to_1e6",
                condition=Q(value__gt=0, value__lte=1e6),
                violation_error_message="A limit must be above 0 and at most 1 000 000.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.agent}: {self.value:g} {self.unit} ({self.list_code} {self.kind})"


class TaskQuerySet(SiteRows):
    def active(self, on: date):
        return self.filter(active_on(on))


class Task(models.Model):
    """Work that needs a respirator: how hard, how long, in what atmosphere."""

    class Oxygen(models.TextChoices):
        AMBIENT = "ambient", "open or well ventilated: ordinary air"
        MEASURED = "measured", "measured"
        UNKNOWN = "unknown", "confined or doubtful, not measured"

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="tasks")
    code = models.SlugField(max_length=40)
    name = models.CharField(max_length=120)
    description = models.TextField(blank=True)
    work_rate = models.CharField(max_length=20, choices=WorkRate.choices)
    wear_h_per_shift = models.FloatField(
        "Hours worn a shift",
        validators=[MinValueValidator(0.05), MaxValueValidator(24)],
        help_text="h, 0.05 to 24: how long the task is done, respirator on",
    )
    shift_h = models.FloatField(
        "Shift length",
        default=8.0,
        validators=[MinValueValidator(0.25), MaxValueValidator(24)],
        help_text="h, 0.25 to 24",
    )
    shifts_per_week = models.FloatField(
        default=5.0,
        validators=[MinValueValidator(0.1), MaxValueValidator(21)],
        help_text="shifts a week in which one worker does the task, 0.1 to 21",
    )
    starts_at = models.TimeField("Shift starts", default=time(6, 0))
    temperature_c = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(-40), MaxValueValidator(80)],
        help_text="°C, -40 to 80; empty means the site's",
    )
    humidity_percent = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0), MaxValueValidator(100)],
        help_text="% relative humidity, 0 to 100",
    )
    oxygen = models.CharField(max_length=12, choices=Oxygen.choices, default=Oxygen.UNKNOWN)
    oxygen_percent = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0), MaxValueValidator(100)],
        help_text="% by volume, needed where measured",
    )
    is_idlh = models.BooleanField("immediately dangerous to life or health", default=False)
    has_oil_aerosol = models.BooleanField("oil aerosol in the air", default=False)
    irritates_eyes = models.BooleanField("the air irritates the eyes", default=False)
    changed_on = models.DateField(
        null=True,
        blank=True,
        help_text="last change of process, material or control; older samples no longer count",
    )
    active_from = models.DateField()
    active_to = models.DateField(null=True, blank=True)

    objects = TaskQuerySet.as_manager()

    class Meta:
        ordering = ["name"]
        constraints = [
            models.UniqueConstraint(
                fields=["site", "code"],
                name="task_code_once_a_site",
                violation_error_message="This task code is already used at this site.",
            ),
            models.CheckConstraint(
                name="task_hours_fit_a_day",
                condition=Q(wear_h_per_shift__gte=0.05, wear_h_per_shift__lte=24)
                & Q(shift_h__gte=0.25, shift_h__lte=24)
                & Q(shifts_per_week__gte=0.1, shifts_per_week__lte=21),
                violation_error_message="Hours worn 0.05 to 24, shift 0.25 to 24 h, "
                "shifts a week 0.1 to 21.",
            ),
            models.CheckConstraint(
                name="task_worn_no_longer_than_shift",
                condition=Q(wear_h_per_shift__lte=F("shift_h")),
                violation_error_message="Hours worn cannot be more than the shift length.",
            ),
            models.CheckConstraint(
                name="task_oxygen_percent_where_measured",
                condition=~Q(oxygen="measured")
                | Q(
                    oxygen_percent__isnull=False,
                    oxygen_percent__gte=0,
                    oxygen_percent__lte=100,
                ),
                violation_error_message="Give the measured oxygen, 0 to 100 %.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    def get_absolute_url(self) -> str:
        return reverse("selection:task", args=[self.site.code, self.pk])


class TaskAgentRows(SiteRows):
    site_path = "task__site"


class TaskAgent(models.Model):
    """One agent met in one task: its form there, and the particle size if it has one."""

    class Form(models.TextChoices):
        PARTICULATE = "particulate", "particles"
        GAS = "gas", "gas or vapour"
        BOTH = "both", "particles and vapour together"

    task = models.ForeignKey(Task, on_delete=models.PROTECT, related_name="agents")
    agent = models.ForeignKey(Agent, on_delete=models.PROTECT, related_name="task_agents")
    form = models.CharField(max_length=12, choices=Form.choices)
    fraction = models.CharField(max_length=12, choices=Fraction.choices)
    mmad_um = models.FloatField(
        "Mass median aerodynamic diameter",
        null=True,
        blank=True,
        validators=[MinValueValidator(0.001), MaxValueValidator(100)],
        help_text="µm, 0.001 to 100",
    )
    gsd = models.FloatField(
        "Geometric standard deviation of size",
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(10)],
    )
    size_source = models.CharField(max_length=200, blank=True)
    dust_load_mg_m3 = models.FloatField(
        "All dust drawn into the filter",
        null=True,
        blank=True,
        validators=[MinValueValidator(0), MaxValueValidator(10000)],
        help_text="mg/m³, inhalable, all agents together; a respirable sample understates it",
    )
    cake = models.CharField(
        "Kind of deposit",
        max_length=20,
        blank=True,
        choices=[
            ("coarse_dust", "coarse dust, over 10 µm"),
            ("fine_dust", "fine mineral dust, 2 to 5 µm"),
            ("fume", "welding or metal fume"),
        ],
    )

    objects = TaskAgentRows.as_manager()

    class Meta:
        ordering = ["task", "agent__name"]
        constraints = [
            models.UniqueConstraint(
                fields=["task", "agent", "fraction"],
                name="agent_and_fraction_once_a_task",
                violation_error_message="The task has this agent and fraction already.",
            ),
            models.CheckConstraint(
                name="particle_size_is_physical",
                condition=(Q(mmad_um=None) | Q(mmad_um__gte=0.001, mmad_um__lte=100))
                & (Q(gsd=None) | Q(gsd__gte=1, gsd__lte=10)),
                violation_error_message="Diameter 0.001 to 100 µm, GSD 1 to 10.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.agent} in {self.task}"


class SampleRows(ReplaceableRows):
    site_path = "task_agent__task__site"


class Sample(Replaceable):
    """One air sample result of one similar exposure group: as reported, and as read."""

    class Where(models.TextChoices):
        PERSONAL = "personal", "personal, breathing zone"
        AREA = "area", "area"
        INSIDE = "inside", "inside the facepiece"

    class Span(models.TextChoices):
        FULL = "full", "full shift"
        PARTIAL = "partial", "part of the shift, taken as representative"
        SHORT = "short", "short term (15 min)"
        CEILING = "ceiling", "ceiling (instant)"

    task_agent = models.ForeignKey(TaskAgent, on_delete=models.PROTECT, related_name="samples")
    worker = models.ForeignKey(
        Worker, on_delete=models.PROTECT, null=True, blank=True, related_name="samples"
    )
    sampled_on = models.DateField()
    where = models.CharField(max_length=12, choices=Where.choices, default=Where.PERSONAL)
    span = models.CharField(max_length=12, choices=Span.choices, default=Span.FULL)
    minutes = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0.1), MaxValueValidator(1440)],
        help_text="min, 0.1 to 1440",
    )
    flow_l_min = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0.001), MaxValueValidator(100)],
    )
    volume_l = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0.001), MaxValueValidator(1e5)],
    )
    result_as_reported = models.CharField(max_length=40)
    unit_as_reported = models.CharField(max_length=20)
    value = models.FloatField(help_text="the result, or the detection limit where below it")
    is_censored = models.BooleanField(default=False, help_text="below the detection limit")
    lod = models.FloatField("Detection limit", null=True, blank=True)
    unit = models.CharField(max_length=10, choices=Unit.choices)
    method = models.CharField(max_length=120, blank=True)
    laboratory = models.CharField(max_length=120, blank=True)
    reference = models.CharField("Sample number", max_length=60, blank=True)
    note = models.TextField(blank=True)
    fingerprint = models.CharField(max_length=64, editable=False, db_index=True)
    batch = models.CharField(max_length=40, blank=True, editable=False)

    objects = SampleRows.as_manager()

    class Meta:
        ordering = ["-sampled_on", "-pk"]
        constraints = [
            models.CheckConstraint(
                name="sample_above_0_to_1e6",
                condition=Q(value__gt=0, value__lte=1e6),
                violation_error_message="A result must be above 0 and at most 1 000 000.",
            ),
            models.CheckConstraint(
                name="sample_lod_above_0_to_1e6",
                condition=Q(lod=None) | Q(lod__gt=0, lod__lte=1e6),
                violation_error_message="A detection limit must be above 0 and at most 1 000 000.",
            ),
            models.CheckConstraint(
                name="censored_sample_has_lod",
                condition=Q(is_censored=False) | Q(lod__isnull=False, lod__gt=0, lod__lte=1e6),
                violation_error_message="A result below detection needs its detection limit.",
            ),
            models.CheckConstraint(
                name="sample_minutes_within_a_day",
                condition=Q(minutes=None) | Q(minutes__gt=0, minutes__lte=1440),
                violation_error_message="Minutes must be above 0 and at most 1440.",
            ),
            # The same line twice does not double the data, unless one was corrected or withdrawn.
            models.UniqueConstraint(
                fields=["task_agent", "fingerprint"],
                condition=Q(replaced_by=None, withdrawn_at=None),
                name="sample_line_once",
                violation_error_message="This sample is already recorded.",
            ),
        ]
        indexes = [models.Index(fields=["task_agent", "sampled_on"])]

    def __str__(self) -> str:
        return f"{self.task_agent}: {self.result_as_reported} {self.unit_as_reported}"
