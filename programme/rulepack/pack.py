"""A rule pack: the law of one jurisdiction in one edition, as frozen rows that can be asked."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Protocol as Shape
from typing import TypeVar

from programme.rulepack.rows import (
    METHODS,
    Clause,
    FilterUseLimit,
    GasClass,
    GasElement,
    Idlh,
    Interval,
    ListReference,
    LowBoiling,
    MaxUse,
    NotForCartridge,
    Oxygen,
    ParticulateFilter,
    PassLevel,
    Pending,
    PoweredFlow,
    Protocol,
    RespiratorClass,
    Retention,
)
from programme.rulepack.substance import Substance


class _Named(Shape):
    @property
    def id(self) -> str: ...


N = TypeVar("N", bound=_Named)


def _found(what: str, wanted: str, rows: Sequence[N]) -> N:
    for row in rows:
        if row.id == wanted:
            return row
    known = ", ".join(row.id for row in rows)
    raise ValueError(f"{what}: {wanted!r} is not in this rule pack; it must be one of {known}")


@dataclass(frozen=True, kw_only=True)
class RulePackInfo:
    """What a list of rule packs shows."""

    name: str
    title: str
    jurisdiction: str
    edition: str


@dataclass(frozen=True, kw_only=True)
class RulePack:
    """Everything one jurisdiction requires in one edition.

    Attributes:
        name: name of its file, e.g. "us-2026-1"; what a site and an assessment remember.
        need_scheme: which of an agent's filter needs this pack speaks: "us" or "en".
        gas_needs: codes of need that a gas element may answer.
        limit_lists: limit lists that bind, most binding first.
        adoptable_limit_lists: further lists a site may hold itself to.
    """

    name: str
    id: str
    title: str
    jurisdiction: str
    edition: str
    caution: str
    limit_lists: tuple[str, ...]
    adoptable_limit_lists: tuple[str, ...]
    default_due_soon_days: int
    need_scheme: str = field(metadata={"allowed": ("us", "en")})
    particulate_need: str
    supplied_air_need: str
    gas_needs: tuple[str, ...]
    classes: tuple[RespiratorClass, ...]
    particulate_filters: tuple[ParticulateFilter, ...]
    gas_elements: tuple[GasElement, ...]
    gas_classes: tuple[GasClass, ...]
    low_boiling: LowBoiling
    max_use: tuple[MaxUse, ...]
    not_for_cartridge: tuple[NotForCartridge, ...]
    pass_levels: tuple[PassLevel, ...]
    protocols: tuple[Protocol, ...]
    intervals: tuple[Interval, ...]
    retention: tuple[Retention, ...]
    oxygen: Oxygen
    idlh: Idlh
    substances: tuple[Substance, ...]
    filter_use_limits: tuple[FilterUseLimit, ...]
    powered_flow: PoweredFlow
    list_references: tuple[ListReference, ...]
    clauses: tuple[Clause, ...]
    pending: tuple[Pending, ...] = ()

    @property
    def info(self) -> RulePackInfo:
        return RulePackInfo(
            name=self.name,
            title=self.title,
            jurisdiction=self.jurisdiction,
            edition=self.edition,
        )

    def respirator_class(self, class_id: str) -> RespiratorClass:
        """The class of that id; an unknown one raises ValueError with those there are."""
        return _found("respirator class", class_id, self.classes)

    def find_class(self, class_id: str) -> RespiratorClass | None:
        """The class of that id, or None: for what was recorded under another pack."""
        return next((row for row in self.classes if row.id == class_id), None)

    def particulate_filter(self, filter_id: str) -> ParticulateFilter:
        """The particulate class of that id; an unknown one raises ValueError."""
        return _found("particulate filter", filter_id, self.particulate_filters)

    def find_particulate_filter(self, filter_id: str) -> ParticulateFilter | None:
        """The particulate class of that id, or None."""
        return next((row for row in self.particulate_filters if row.id == filter_id), None)

    def gas_element(self, element_id: str) -> GasElement:
        """The gas element of that id; an unknown one raises ValueError."""
        return _found("gas element", element_id, self.gas_elements)

    def find_gas_element(self, element_id: str) -> GasElement | None:
        """The gas element of that id, or None."""
        return next((row for row in self.gas_elements if row.id == element_id), None)

    def protocol(self, protocol_id: str) -> Protocol:
        """The protocol of that id; an unknown one raises ValueError."""
        return _found("protocol", protocol_id, self.protocols)

    def find_protocol(self, protocol_id: str) -> Protocol | None:
        """The protocol of that id, or None: for what was recorded under another pack."""
        return next((row for row in self.protocols if row.id == protocol_id), None)

    def protocols_for(self, facepiece_kind: str) -> tuple[Protocol, ...]:
        """The protocols that may be used on that kind of facepiece, in the pack's order."""
        return tuple(row for row in self.protocols if facepiece_kind in row.applies_to)

    def pass_level(self, facepiece_kind: str, method: str) -> PassLevel | None:
        """What a fit test by that method must reach on that kind; None if the pack has no rule.

        None is no permission: a facepiece without a pass level cannot pass.
        """
        if method not in METHODS:
            raise ValueError(f"method: {method!r}; it must be one of {', '.join(METHODS)}")
        for level in self.pass_levels:
            if (level.facepiece, level.method) == (facepiece_kind, method):
                return level
        return None

    @cached_property
    def apf_values(self) -> tuple[int, ...]:
        """Every factor the table assigns on some condition, lowest first."""
        values = {row.apf for row in self.classes}
        values |= {row.apf_with_maker_evidence or row.apf for row in self.classes}
        values |= {row.apf_particulate_only or row.apf for row in self.classes}
        return tuple(sorted(values))

    def required_apf(self, ratio: float) -> int | None:
        """The smallest factor of the table that is at least the hazard ratio.

        Args:
            ratio: exposure over limit, dimensionless, 0 or more.

        Returns:
            None if the ratio is unknown (NaN) or above every factor.
        """
        if ratio < 0:
            raise ValueError(f"ratio: {ratio}; it must be 0 or more")
        return next((apf for apf in self.apf_values if apf >= ratio), None)

    def classes_with_apf(
        self,
        required_apf: float,
        *,
        has_maker_evidence: bool = False,
        is_particulate_only: bool = False,
    ) -> tuple[RespiratorClass, ...]:
        """The classes assigned at least that factor, lowest first; none for an unknown one."""

        def factor(row: RespiratorClass) -> int:
            return row.apf_when(
                has_maker_evidence=has_maker_evidence, is_particulate_only=is_particulate_only
            )

        # Not `<`: a NaN must choose nothing.
        return tuple(
            sorted((row for row in self.classes if factor(row) >= required_apf), key=factor)
        )

    def needs(self, text: str) -> tuple[str, ...]:
        """The codes of an agent's filter need ("OV+particulate"), or ValueError for unknown ones.

        An empty text gives no codes: the need is not known.
        """
        codes = tuple(code.strip() for code in text.split("+") if code.strip())
        known = (self.particulate_need, self.supplied_air_need, *self.gas_needs)
        for code in codes:
            if code not in known:
                raise ValueError(f"filter need: {code!r}; it must be one of {', '.join(known)}")
        return codes

    def gas_elements_for(self, needs: Sequence[str], *, cas: str) -> tuple[GasElement, ...]:
        """The gas elements that answer every gas need, or are made for that very agent.

        Args:
            needs: codes as `needs` gives them; particles and supplied air are left out here.
            cas: of the agent, "" if it has none.
        """
        wanted = {code for code in needs if code in self.gas_needs}
        return tuple(
            row
            for row in self.gas_elements
            if (cas and cas in row.agents) or (wanted and wanted <= set(row.covers))
        )

    def covers_gas(self, element_ids: Sequence[str], *, needs: Sequence[str], cas: str) -> bool:
        """Whether these gas elements, taken together, are of the type the agent needs.

        An agent whose gas need is not known, and an element the pack does not know, count as no.
        """
        elements = [row for row in self.gas_elements if row.id in element_ids]
        if any(cas and cas in row.agents for row in elements):
            return True
        wanted = {code for code in needs if code in self.gas_needs}
        covered = {code for row in elements for code in row.covers}
        return bool(wanted) and wanted <= covered

    def element_caps(
        self, element_ids: Sequence[str], *, cas: str, gas_class: int | None = None
    ) -> tuple[MaxUse | GasClass, ...]:
        """Every ceiling in ppm on using these elements for that agent, lowest first.

        A classed element whose class is not recorded gets the ceiling of the lowest class.
        """
        caps: list[MaxUse | GasClass] = [
            row
            for row in self.max_use
            if row.cas in {"", cas} and set(row.elements) & set(element_ids)
        ]
        if any(row.classed for row in self.gas_elements if row.id in element_ids):
            lowest = min((row.number for row in self.gas_classes), default=0)
            number = gas_class if gas_class is not None else lowest
            caps += [row for row in self.gas_classes if row.number == number]
        return tuple(sorted(caps, key=lambda row: row.max_ppm))

    def not_for(self, cas: str, element_ids: Sequence[str] = ()) -> NotForCartridge | None:
        """Why that agent is not for an air-purifying element such as these, or None."""
        for row in self.not_for_cartridge:
            if cas in row.cas and not set(row.except_elements) & set(element_ids):
                return row
        return None

    def substance(self, cas: str) -> Substance | None:
        """What the law adds for the substance of that CAS number, or None."""
        return next((row for row in self.substances if cas and cas in row.cas), None)

    def filter_use_limit(self, series: str, *, has_oil: bool) -> FilterUseLimit | None:
        """The use limit of that filter series with or without oil aerosol, or None."""
        for row in self.filter_use_limits:
            if row.series == series and row.oil == has_oil:
                return row
        return None

    def list_reference(self, list_code: str) -> ListReference:
        """The reference air of that list; that of the most binding list for a site's own limits."""
        wanted = {list_code: 0, self.limit_lists[0]: 1}
        rows = [row for row in self.list_references if row.list_code in wanted]
        return min(rows, key=lambda row: wanted[row.list_code])

    def interval(self, interval_id: str) -> Interval:
        """The interval of that id; an unknown one raises ValueError."""
        return _found("interval", interval_id, self.intervals)

    def retained(self, retention_id: str) -> Retention:
        """How long that kind of record is kept; an unknown one raises ValueError."""
        return _found("retention", retention_id, self.retention)

    @cached_property
    def _clauses_by_code(self) -> dict[str, Clause]:
        return {row.code: row for row in self.clauses}

    def clause(self, code: str) -> Clause:
        """The clause on that topic; an unknown one raises ValueError with those there are."""
        try:
            return self._clauses_by_code[code]
        except KeyError:
            known = ", ".join(self._clauses_by_code)
            raise ValueError(f"clause: {code!r}; it must be one of {known}") from None

    def allows_any_supplied_air(self, oxygen_percent: float, *, altitude_m: float) -> bool:
        """Whether low oxygen at that altitude still lets any atmosphere-supplying respirator do.

        Args:
            oxygen_percent: by volume, 0 to 100; NaN counts as no.
            altitude_m: above sea level; NaN counts as no.
        """
        altitude_ft = altitude_m / 0.3048
        return any(
            band.above_ft < altitude_ft <= band.up_to_ft
            and band.oxygen_min_percent <= oxygen_percent <= band.oxygen_max_percent
            for band in self.oxygen.altitude_bands
        )
