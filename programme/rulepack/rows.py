"""The rows of a rule pack: frozen, typed, each with the source it rests on and how sure that is.

What a field may hold is written beside it (`allowed=`); the loader refuses anything else.
"""

from dataclasses import Field, dataclass, field
from typing import Any

SURE = ("verified", "computed", "memory")

FAMILIES = ("air_purifying", "powered_air_purifying", "supplied_air", "scba")
MODES = ("negative_pressure", "powered", "demand", "continuous_flow", "pressure_demand")
TIGHT_INLETS = ("filtering_facepiece", "quarter_mask", "half_mask", "full_facepiece")
INLETS = (*TIGHT_INLETS, "helmet_or_hood", "loose_fitting_facepiece", "suit")
EYE_COVERING_INLETS = ("full_facepiece", "helmet_or_hood", "suit")
METHODS = ("quantitative", "qualitative")
OIL = ("no", "limited", "yes")


def one_of(*allowed: str) -> Any:
    """A required field that holds one of these."""
    return field(metadata={"allowed": allowed})


def some_of(*allowed: str) -> Any:
    """A field that holds any number of these, none if not given."""
    return field(default=(), metadata={"allowed": allowed})


def allowed_in(spec: "Field[Any]") -> tuple[str, ...]:
    """The values a field may hold; empty if any value of its type will do."""
    allowed: tuple[str, ...] = spec.metadata.get("allowed", ())
    return allowed


@dataclass(frozen=True, kw_only=True)
class Row:
    """What every row carries: the clause or page it rests on, and how sure that is.

    Attributes:
        source: citation, fit to be printed.
        sure: "verified" (read in the cited text), "computed" (derived from it) or "memory"
            (recalled, to be confirmed).
        note: what a reader should know besides.
    """

    source: str
    sure: str = one_of(*SURE)
    note: str = ""

    @property
    def is_unconfirmed(self) -> bool:
        """Whether the row is recalled rather than read: to be shown as such wherever it is used."""
        return self.sure == "memory"


@dataclass(frozen=True, kw_only=True)
class RespiratorClass(Row):
    """One class of respirator and the protection it is assigned.

    Attributes:
        elements: the element classes the assigned factor holds for, e.g. "P3" or "gas+P3";
            empty if the factor does not depend on the element.
        apf_with_maker_evidence: factor where the maker's study is on file, or None.
        apf_particulate_only: factor against particles alone, where it is higher, or None;
            its own mark is `apf_particulate_only_sure`.
        idlh: permitted where the air is immediately dangerous to life or health.
        has_auxiliary_supply: carries its own air for the way out.
    """

    id: str
    name: str
    family: str = one_of(*FAMILIES)
    mode: str = one_of(*MODES)
    inlet: str = one_of(*INLETS)
    apf: int
    apf_with_maker_evidence: int | None = None
    apf_particulate_only: int | None = None
    apf_particulate_only_sure: str = field(default="", metadata={"allowed": ("", *SURE)})
    elements: tuple[str, ...] = ()
    idlh: bool = False
    has_auxiliary_supply: bool = False

    @property
    def is_tight(self) -> bool:
        """Seals against the face, so it needs a fit test and a shaven seal."""
        return self.inlet in TIGHT_INLETS

    @property
    def covers_eyes(self) -> bool:
        """Keeps the air from the eyes; a loose-fitting facepiece is not counted as doing so."""
        return self.inlet in EYE_COVERING_INLETS

    @property
    def is_air_purifying(self) -> bool:
        """Cleans the air around the wearer, powered or not; brings no oxygen."""
        return self.family in {"air_purifying", "powered_air_purifying"}

    @property
    def is_negative_pressure(self) -> bool:
        """The wearer draws the air in, so the pressure inside falls below that outside."""
        return self.mode in {"negative_pressure", "demand"}

    def apf_when(self, *, has_maker_evidence: bool, is_particulate_only: bool = False) -> int:
        """The factor that holds for this assembly: the printed one unless a condition raises it."""
        factors = [self.apf]
        if has_maker_evidence and self.apf_with_maker_evidence is not None:
            factors.append(self.apf_with_maker_evidence)
        if is_particulate_only and self.apf_particulate_only is not None:
            factors.append(self.apf_particulate_only)
        return max(factors)

    def takes_element(self, particulate_class: str, *, has_gas: bool) -> bool:
        """Whether the factor holds with an element of that particulate class, gas part or both.

        Args:
            particulate_class: class of the pack, "" if the element filters no particles.
            has_gas: whether the element takes up gases or vapours.
        """
        parts = (["gas"] if has_gas else []) + ([particulate_class] if particulate_class else [])
        return not self.elements or "+".join(parts) in self.elements


@dataclass(frozen=True, kw_only=True)
class ParticulateFilter(Row):
    """One class of particulate filter.

    Attributes:
        series: what the use limits are written for, e.g. "N".
        efficiency_min: least efficiency in its certification test, 0 to 1.
        oil: "no" (never with oil aerosol), "limited" (for a limited time) or "yes".
        oil_sure: the mark of `oil` where it differs from the row's; else "".
        rank: for comparing within one pack, higher is better.
    """

    id: str
    series: str
    efficiency_min: float
    oil: str = one_of(*OIL)
    oil_sure: str = field(default="", metadata={"allowed": ("", *SURE)})
    rank: int
    hepa_equivalent: bool
    colour: str = ""


@dataclass(frozen=True, kw_only=True)
class GasElement(Row):
    """One type of gas or vapour cartridge, canister or filter.

    Attributes:
        covers: codes of need, as agents carry them, that this type answers.
        agents: CAS numbers it is made for, whatever their need.
        label_must_name_agent: the approval label has to name the very gas.
        classed: comes in capacity classes, each with its ceiling.
        includes_particulate: particulate class it always carries, or "".
    """

    id: str
    name: str
    colour: str
    covers: tuple[str, ...] = ()
    agents: tuple[str, ...] = ()
    label_must_name_agent: bool = False
    classed: bool = False
    includes_particulate: str = ""
    is_single_use: bool = False
    max_hours: float | None = None


@dataclass(frozen=True, kw_only=True)
class GasClass(Row):
    """A capacity class of gas filters and the highest concentration it may meet."""

    number: int
    max_ppm: float


@dataclass(frozen=True, kw_only=True)
class LowBoiling(Row):
    """Vapours boiling at or below a point break through ordinary organic-vapour elements early.

    Attributes:
        boiling_point_c: degrees Celsius at 101.3 kPa.
        ordinary_elements: the elements that are not made for such vapours.
    """

    boiling_point_c: float
    ordinary_elements: tuple[str, ...]


@dataclass(frozen=True, kw_only=True)
class MaxUse(Row):
    """The highest concentration in which an element may be used for one agent (or any: cas "")."""

    elements: tuple[str, ...]
    cas: str = ""
    max_ppm: float


@dataclass(frozen=True, kw_only=True)
class NotForCartridge(Row):
    """Agents that an air-purifying element does not hold, with the exceptions there are.

    Attributes:
        except_elements: gas elements made for it all the same.
        allowed_with_schedule: an element will do if a change schedule from objective data exists.
    """

    name: str
    cas: tuple[str, ...]
    reason: str
    except_elements: tuple[str, ...] = ()
    allowed_with_schedule: bool = False


@dataclass(frozen=True, kw_only=True)
class PassLevel(Row):
    """What a fit test must reach on one kind of facepiece by one method.

    Attributes:
        allowed: whether the method may be used on this kind at all.
        min_fit_factor: least overall fit factor; None where the method gives no figure.
        each_exercise_must_pass: every exercise has to reach it, not only the overall figure.
        apf_cap: the assigned factor a pass is good for at most, or None.
        apf_cap_families: respirator families to which the cap applies.
    """

    facepiece: str = one_of(*TIGHT_INLETS)
    method: str = one_of(*METHODS)
    allowed: bool
    min_fit_factor: float | None
    each_exercise_must_pass: bool
    apf_cap: int | None = None
    apf_cap_families: tuple[str, ...] = some_of(*FAMILIES)

    def cap_for(self, respirator: RespiratorClass) -> int | None:
        """The cap that a pass by this method puts on that class, or None."""
        return self.apf_cap if respirator.family in self.apf_cap_families else None


@dataclass(frozen=True, kw_only=True)
class Exercise:
    """One exercise of a protocol.

    Attributes:
        seconds: how long; None where the protocol fixes no time.
        counted: enters the overall fit factor.
        readings: how many figures it yields (0: nothing is measured).
    """

    id: str
    name: str
    seconds: int | None
    counted: bool
    readings: int = 1
    how: str = ""


@dataclass(frozen=True, kw_only=True)
class Protocol(Row):
    """A fit test protocol: which facepieces, which exercises in which order."""

    id: str
    name: str
    method: str = one_of(*METHODS)
    applies_to: tuple[str, ...] = some_of(*TIGHT_INLETS)
    exercises: tuple[Exercise, ...]
    needs: str = ""

    @property
    def is_quantitative(self) -> bool:
        return self.method == "quantitative"

    @property
    def counted_exercises(self) -> tuple[Exercise, ...]:
        """The exercises whose figures enter the overall fit factor."""
        return tuple(one for one in self.exercises if one.counted)

    @property
    def total_seconds(self) -> int | None:
        """Time of all exercises, or None where the protocol does not fix every one."""
        times = [one.seconds for one in self.exercises]
        return None if None in times else sum(one or 0 for one in times)


@dataclass(frozen=True, kw_only=True)
class Interval(Row):
    """How long something stays good, in calendar months; None: no fixed time."""

    id: str
    months: int | None
    rule: str


@dataclass(frozen=True, kw_only=True)
class Retention(Row):
    """How long a kind of record is kept: years, or None where an event ends it."""

    id: str
    years: int | None
    rule: str


@dataclass(frozen=True, kw_only=True)
class AltitudeBand(Row):
    """Oxygen band in which any atmosphere-supplying respirator will do, up to an altitude."""

    above_ft: int
    up_to_ft: int
    oxygen_min_percent: float
    oxygen_max_percent: float


@dataclass(frozen=True, kw_only=True)
class Oxygen(Row):
    """Least oxygen for air-purifying respirators, and what altitude allows below it."""

    min_percent: float
    altitude_bands: tuple[AltitudeBand, ...] = ()
    enriched_air_above_ft: int | None = None


@dataclass(frozen=True, kw_only=True)
class Idlh(Row):
    """Rules for air that is immediately dangerous to life or health."""

    unknown_is_idlh: bool
    service_life_min: int | None


@dataclass(frozen=True, kw_only=True)
class PoweredFlow(Row):
    """Blower flows at which the filters of powered respirators are tested, L/min."""

    tight_l_min: float
    loose_l_min: float

    def flow_l_min(self, *, is_tight: bool) -> float:
        """The flow drawn through the filters of a tight- or a loose-fitting device."""
        return self.tight_l_min if is_tight else self.loose_l_min


@dataclass(frozen=True, kw_only=True)
class ListReference(Row):
    """The air for which a limit list prints ppm and mg/m3 of a vapour side by side."""

    list_code: str
    molar_volume_l_mol: float


@dataclass(frozen=True, kw_only=True)
class FilterUseLimit(Row):
    """How long a particulate filter series may be used, with or without oil aerosol.

    Attributes:
        hours: of use; None where no time is fixed.
        days: since first use, whichever comes first; None where none is fixed.
        loading_mg: mass on one filter; None where none is fixed.
    """

    series: str
    oil: bool
    hours: float | None = None
    days: int | None = None
    loading_mg: float | None = None
    rule: str


@dataclass(frozen=True, kw_only=True)
class Clause(Row):
    """A requirement by topic: what it asks in our words; `source` is the citation."""

    code: str
    rule: str


@dataclass(frozen=True, kw_only=True)
class Pending(Row):
    """A change of the law under way, to be checked before relying on the pack."""

    topic: str
    effect: str
