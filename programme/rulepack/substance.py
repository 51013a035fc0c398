"""What the law adds for single substances, each part with its own source and mark."""

from dataclasses import dataclass

from programme.rulepack.rows import INLETS, Row, one_of, some_of


@dataclass(frozen=True, kw_only=True)
class RankRule(Row):
    """The lowest rank of particulate filter that a substance allows."""

    rank_min: int


@dataclass(frozen=True, kw_only=True)
class InletRule(Row):
    """Inlets barred for a substance."""

    barred: tuple[str, ...] = some_of(*INLETS)


@dataclass(frozen=True, kw_only=True)
class BarRule(Row):
    """Something a substance rules out, and why."""

    reason: str


@dataclass(frozen=True, kw_only=True)
class EyeRule(Row):
    """The eyes have to be covered: always, or only where the air irritates them.

    Attributes:
        goggles_suffice: a half mask will do together with gas-proof goggles.
    """

    only_if_irritating: bool
    goggles_suffice: bool = False


@dataclass(frozen=True, kw_only=True)
class ExtendedShiftRule(Row):
    """Above `above_h` the limit is `numerator_ug_m3_h` divided by the hours worked that day."""

    above_h: float
    numerator_ug_m3_h: float

    def limit_ug_m3(self, shift_h: float) -> float | None:
        """The shift's own limit in ug/m3, or None while the printed limit rules."""
        return self.numerator_ug_m3_h / shift_h if shift_h > self.above_h else None


@dataclass(frozen=True, kw_only=True)
class ShiftRule(Row):
    """The element is replaced at the latest with the shift.

    Attributes:
        esli_extends: an end-of-service-life indicator may carry it further.
    """

    esli_extends: bool = False


@dataclass(frozen=True, kw_only=True)
class ActionLevel(Row):
    """Exposure from which the substance standard asks for surveillance and sampling."""

    value: float
    unit: str = one_of("mg/m3", "ppm", "f/cm3")


@dataclass(frozen=True, kw_only=True)
class MonitoringRule(Row):
    """How often exposure is measured again, in calendar months."""

    from_action_level_months: int
    above_limit_months: int
    rule: str


@dataclass(frozen=True, kw_only=True)
class ElementHours(Row):
    """A row of a substance's own table: up to that level, these classes and element hours.

    Attributes:
        max_ppm: top of the row.
        hours: replace an element after so long; None where no element is used.
        classes: respirator classes the row lists; those of a higher row will do as well.
    """

    max_ppm: float
    hours: float | None
    classes: tuple[str, ...]


@dataclass(frozen=True, kw_only=True)
class Substance:
    """What the law adds for one substance; every part has its own source and mark."""

    id: str
    name: str
    cas: tuple[str, ...]
    particulate_rank: RankRule | None = None
    inlets: InletRule | None = None
    air_purifying: BarRule | None = None
    eyes: EyeRule | None = None
    extended_shift: ExtendedShiftRule | None = None
    change_each_shift: ShiftRule | None = None
    action_level: ActionLevel | None = None
    monitoring: MonitoringRule | None = None
    element_hours: tuple[ElementHours, ...] = ()

    def hours_at(self, ppm: float) -> ElementHours | None:
        """The lowest row of the substance's table that covers `ppm`; None if none does."""
        rows = sorted(self.element_hours, key=lambda row: row.max_ppm)
        return next((row for row in rows if ppm <= row.max_ppm), None)
