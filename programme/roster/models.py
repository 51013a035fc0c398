"""Sites, who works in the app, and the people who wear respirators."""

import zoneinfo
from datetime import date, datetime

from django.conf import settings
from django.core.validators import MaxValueValidator, MinValueValidator, RegexValidator
from django.db import models
from django.db.models import F, Q
from django.urls import reverse
from django.utils import timezone

FAR_FUTURE = date(9999, 1, 1)


def active_on(on: date) -> Q:
    """Rows whose `active_from`..`active_to` holds that day; `active_to` is the first day off."""
    return Q(active_from__lte=on) & (Q(active_to=None) | Q(active_to__gt=on))


class SiteQuerySet(models.QuerySet["Site"]):
    def for_user(self, user) -> "SiteQuerySet":
        """The sites this user belongs to; none for anybody signed out."""
        if not user.is_authenticated:
            return self.none()
        return self.filter(memberships__user=user).distinct()


class Site(models.Model):
    """One workplace, its rules and its policy. A policy may tighten a rule pack, never loosen it."""

    class Statistic(models.TextChoices):
        UPPER_70 = "upper70", "95th percentile, upper 70 % limit (default)"
        UPPER_95 = "upper95", "95th percentile, upper 95 % limit (stricter)"

    code = models.SlugField(max_length=40, unique=True)
    name = models.CharField(max_length=120)
    rule_pack = models.CharField(max_length=40, help_text="name of a rule pack, e.g. us-2026-1")
    adopted_limit_lists = models.JSONField(
        default=list,
        blank=True,
        help_text="further limit lists the site holds itself to",
    )
    time_zone = models.CharField(max_length=60, default="UTC")
    temperature_c = models.FloatField(
        "Air temperature",
        default=25.0,
        validators=[MinValueValidator(-40), MaxValueValidator(60)],
        help_text="°C, -40 to 60",
    )
    pressure_kpa = models.FloatField(
        "Air pressure",
        null=True,
        blank=True,
        validators=[MinValueValidator(50), MaxValueValidator(110)],
        help_text="kPa, 50 to 110; leave empty to work it out from the altitude",
    )
    altitude_m = models.FloatField(
        "Altitude",
        default=0.0,
        validators=[MinValueValidator(-450), MaxValueValidator(5500)],
        help_text="m above sea level, -450 to 5500",
    )
    statistic = models.CharField(
        max_length=20, choices=Statistic.choices, default=Statistic.UPPER_70
    )
    due_soon_days = models.PositiveSmallIntegerField(
        default=30, validators=[MinValueValidator(1), MaxValueValidator(120)]
    )
    fit_interval_months = models.PositiveSmallIntegerField(
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(24)],
        help_text="months; only if shorter than the rule pack's",
    )
    training_interval_months = models.PositiveSmallIntegerField(
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(24)],
        help_text="months; only if shorter than the rule pack's",
    )
    sample_age_months = models.PositiveSmallIntegerField(
        default=36,
        validators=[MinValueValidator(1), MaxValueValidator(60)],
        help_text="months after which a sample no longer counts (common practice: 36)",
    )
    filter_max_shifts = models.PositiveSmallIntegerField(
        null=True,
        blank=True,
        validators=[MinValueValidator(1), MaxValueValidator(200)],
        help_text="site policy: shifts after which any particulate filter is changed",
    )
    cartridge_max_shifts = models.PositiveSmallIntegerField(
        null=True,
        blank=True,
        default=1,
        validators=[MinValueValidator(1), MaxValueValidator(60)],
        help_text="site policy: shifts after which any cartridge is changed",
    )
    breathing_limit_pa = models.FloatField(
        "Breathing resistance limit",
        default=343.2,
        validators=[MinValueValidator(20), MaxValueValidator(1500)],
        help_text="Pa at 85 L/min for a loaded filter, 20 to 1500; site policy",
    )

    objects = SiteQuerySet.as_manager()

    class Meta:
        ordering = ["name"]
        constraints = [
            models.CheckConstraint(
                name="site_air_is_earthly",
                condition=Q(temperature_c__gte=-40, temperature_c__lte=60)
                & Q(altitude_m__gte=-450, altitude_m__lte=5500)
                & (Q(pressure_kpa=None) | Q(pressure_kpa__gte=50, pressure_kpa__lte=110)),
                violation_error_message="Temperature -40 to 60 °C, altitude -450 to 5500 m, "
                "pressure 50 to 110 kPa.",
            ),
        ]

    def __str__(self) -> str:
        return self.name

    def get_absolute_url(self) -> str:
        return reverse("selection:today", args=[self.code])

    def today(self, now: datetime | None = None) -> date:
        """The date at the site, not at the server."""
        moment = now or timezone.now()
        return moment.astimezone(zoneinfo.ZoneInfo(self.time_zone)).date()


class Role(models.TextChoices):
    COORDINATOR = "coordinator", "Site safety coordinator"
    HYGIENIST = "hygienist", "Occupational hygienist"
    MANAGER = "manager", "Manager"
    ADMINISTRATOR = "administrator", "Programme administrator"


class Membership(models.Model):
    """One user's role at one site."""

    user = models.ForeignKey(
        settings.AUTH_USER_MODEL, on_delete=models.CASCADE, related_name="memberships"
    )
    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="memberships")
    role = models.CharField(max_length=20, choices=Role.choices)

    class Meta:
        ordering = ["site", "user"]
        constraints = [
            models.UniqueConstraint(fields=["user", "site"], name="one_role_a_user_and_site"),
        ]

    def __str__(self) -> str:
        return f"{self.user} at {self.site}: {self.get_role_display()}"


class SiteRows(models.QuerySet):
    """A queryset of records that belong to a site by `site_path`."""

    site_path = "site"

    def for_user(self, user):
        """Only what belongs to the user's own sites."""
        if not user.is_authenticated:
            return self.none()
        return self.filter(**{f"{self.site_path}__in": Site.objects.for_user(user)})

    def at(self, site: Site):
        """Only what belongs to this site."""
        return self.filter(**{self.site_path: site})


class ReplaceableRows(SiteRows):
    """Records that are corrected by a later one; `in_force` leaves out what no longer stands."""

    def in_force(self):
        return self.filter(replaced_by=None, withdrawn_at=None)


class Replaceable(models.Model):
    """A record that is never edited: a later one replaces it, or it is withdrawn, with a reason."""

    recorded_at = models.DateTimeField(auto_now_add=True)
    recorded_by = models.CharField(max_length=150, blank=True, editable=False)
    replaced_by = models.OneToOneField(
        "self",
        models.PROTECT,
        null=True,
        blank=True,
        editable=False,
        related_name="replaces",
    )
    replaced_at = models.DateTimeField(null=True, blank=True, editable=False)
    withdrawn_at = models.DateTimeField(null=True, blank=True, editable=False)
    change_reason = models.TextField(blank=True, editable=False)

    class Meta:
        abstract = True

    @property
    def stands(self) -> bool:
        return self.replaced_by_id is None and self.withdrawn_at is None


class WorkerQuerySet(SiteRows):
    def active(self, on: date):
        return self.filter(active_on(on))


class Worker(models.Model):
    """A person who may wear a respirator."""

    site = models.ForeignKey(Site, on_delete=models.PROTECT, related_name="workers")
    personnel_number = models.CharField(
        max_length=40,
        validators=[
            RegexValidator(
                r"^[0-9A-Za-z][0-9A-Za-z ._/-]*$",
                "Personnel number: letters, digits, space and . _ / - only.",
            )
        ],
    )
    name = models.CharField(max_length=120)
    job = models.CharField(max_length=120, blank=True)
    employer = models.CharField(
        max_length=120, blank=True, help_text="leave empty for the site's own employees"
    )
    is_contractor = models.BooleanField("contractor", default=False)
    born_on = models.DateField("born on", null=True, blank=True)
    active_from = models.DateField()
    active_to = models.DateField(
        null=True,
        blank=True,
        help_text="first day on which the person no longer works here",
    )
    wears_spectacles = models.BooleanField(default=False)

    objects = WorkerQuerySet.as_manager()

    class Meta:
        ordering = ["name", "personnel_number"]
        constraints = [
            models.UniqueConstraint(
                fields=["site", "personnel_number"],
                name="personnel_number_once_a_site",
                violation_error_message="This personnel number is already taken at this site.",
            ),
            models.CheckConstraint(
                name="worker_leaves_after_start",
                condition=Q(active_to=None) | Q(active_to__gt=F("active_from")),
                violation_error_message="The last day must be later than the first.",
            ),
            models.CheckConstraint(
                name="worker_born_before_start",
                condition=Q(born_on=None) | Q(born_on__lt=F("active_from")),
                violation_error_message="The date of birth must be earlier than the first day.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.name} ({self.personnel_number})"

    def get_absolute_url(self) -> str:
        return reverse("selection:person", args=[self.site.code, self.pk])


class WorkerRecords(ReplaceableRows):
    site_path = "worker__site"


class WorkRate(models.TextChoices):
    RESTING = "resting", "resting"
    LOW = "low", "low"
    MODERATE = "moderate", "moderate"
    HIGH = "high", "high"
    VERY_HIGH = "very_high", "very high"


class Clearance(Replaceable):
    """The reviewing clinician's written recommendation: ability, limits, dates. Never the reasons."""

    class Outcome(models.TextChoices):
        ABLE = "able", "able"
        ABLE_WITH_LIMITS = "able_with_limits", "able with limits"
        NOT_ABLE = "not_able", "not able"

    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="clearances")
    outcome = models.CharField(max_length=20, choices=Outcome.choices)
    decided_on = models.DateField()
    expires_on = models.DateField(
        null=True, blank=True, help_text="next review set by the clinician, if any"
    )
    no_negative_pressure = models.BooleanField("no negative-pressure respirator", default=False)
    no_scba = models.BooleanField("no self-contained breathing apparatus", default=False)
    heaviest_work = models.CharField(max_length=20, choices=WorkRate.choices, blank=True)
    max_hours_a_shift = models.FloatField(
        null=True,
        blank=True,
        validators=[MinValueValidator(0.25), MaxValueValidator(24)],
    )
    follow_up_needed = models.BooleanField(default=False)
    copy_given = models.BooleanField("worker has a copy", default=False)
    decided_by = models.CharField("physician or other licensed professional", max_length=120)

    objects = WorkerRecords.as_manager()

    class Meta:
        ordering = ["-decided_on", "-pk"]
        constraints = [
            models.CheckConstraint(
                name="clearance_ends_after_it_begins",
                condition=Q(expires_on=None) | Q(expires_on__gt=F("decided_on")),
                violation_error_message="The review date must be later than the decision.",
            ),
            models.CheckConstraint(
                name="clearance_hours_within_a_day",
                condition=Q(max_hours_a_shift=None)
                | Q(max_hours_a_shift__gte=0.25, max_hours_a_shift__lte=24),
                violation_error_message="Hours a shift must be 0.25 to 24.",
            ),
        ]

    def __str__(self) -> str:
        return f"{self.worker.name}: {self.get_outcome_display()}, {self.decided_on}"


class Training(Replaceable):
    """Respirator training with demonstrated knowledge."""

    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="trainings")
    trained_on = models.DateField()
    families = models.JSONField(
        default=list,
        blank=True,
        help_text="respirator families covered; empty means all",
    )
    trainer = models.CharField(max_length=120)
    is_demonstrated = models.BooleanField("knowledge demonstrated", default=True)
    note = models.CharField(max_length=300, blank=True)

    objects = WorkerRecords.as_manager()

    class Meta:
        ordering = ["-trained_on", "-pk"]

    def __str__(self) -> str:
        return f"{self.worker.name}: trained {self.trained_on}"


class SealNote(Replaceable):
    """What was seen of a face that bears on the seal, and from which day."""

    class Kind(models.TextChoices):
        FACIAL_HAIR = "facial_hair", "facial hair crosses the seal"
        CLEAN_SHAVEN = "clean_shaven", "face is clear where the seal lies"
        FACE_CHANGE = "face_change", "face changed (scar, teeth, surgery, weight)"

    worker = models.ForeignKey(Worker, on_delete=models.PROTECT, related_name="seal_notes")
    noted_on = models.DateField()
    kind = models.CharField(max_length=20, choices=Kind.choices)
    noted_by = models.CharField(max_length=120, blank=True)

    objects = WorkerRecords.as_manager()

    class Meta:
        ordering = ["-noted_on", "-pk"]

    def __str__(self) -> str:
        return f"{self.worker.name}: {self.get_kind_display()}, {self.noted_on}"
