"""Whether the parts of an assembly belong together by the rule pack."""

from dataclasses import dataclass

from programme.equipment.models import Assembly, Element, FacepieceKind
from programme.rulepack.pack import RulePack
from programme.rulepack.rows import RespiratorClass


@dataclass(frozen=True)
class Misfit:
    """One reason why an assembly may not be recorded so: the box, and what is allowed in it."""

    field: str
    says: str


def parts_of(element: Element) -> str:
    """What an element is by the pack's words: "P3", "gas+P3", "gas"."""
    parts = (["gas"] if element.is_gas else []) + (
        [element.particulate_class] if element.particulate_class else []
    )
    return "+".join(parts) or "nothing"


def classes_for(kind: str, pack: RulePack) -> tuple[RespiratorClass, ...]:
    """The classes of the pack whose inlet is that kind of facepiece."""
    return tuple(row for row in pack.classes if row.inlet == kind)


def _inlet(assembly: Assembly, row: RespiratorClass, pack: RulePack) -> list[Misfit]:
    kind = assembly.facepiece.kind
    if row.inlet == kind:
        return []
    allowed = ", ".join(one.name for one in classes_for(kind, pack)) or "no class of this rule pack"
    label = FacepieceKind(kind).label
    return [
        Misfit(
            "respirator_class",
            f"Respirator class: {row.name} is not allowed for {assembly.facepiece}, a {label}; "
            f"it may be {allowed}.",
        )
    ]


def _element(assembly: Assembly, row: RespiratorClass) -> list[Misfit]:
    element = assembly.element
    if element is None:
        if not row.is_air_purifying:
            return []
        says = f"Filter or cartridge: none; {row.name} cleans the air and needs one."
        return [Misfit("element", says)]
    if row.family == "scba":
        says = f"Filter or cartridge: {element} is not allowed; {row.name} carries its own air."
        return [Misfit("element", says)]
    if row.takes_element(element.particulate_class, has_gas=element.is_gas):
        return []
    return [
        Misfit(
            "element",
            f"Filter or cartridge: {element} ({parts_of(element)}) is not allowed; the factor of "
            f"{row.name} holds with {' or '.join(row.elements)}.",
        )
    ]


def _known(element: Element | None, pack: RulePack) -> list[Misfit]:
    """An element recorded under another pack must not pass as one of this pack."""
    if element is None:
        return []
    unknown = [one for one in element.gas_elements if pack.find_gas_element(one) is None]
    if element.particulate_class and not pack.find_particulate_filter(element.particulate_class):
        unknown.append(element.particulate_class)
    return [
        Misfit("element", f"Filter or cartridge: {one} is not a type of {pack.title}; change it.")
        for one in unknown
    ]


def _papers(assembly: Assembly, row: RespiratorClass) -> list[Misfit]:
    found = []
    if assembly.maker_evidence and row.apf_with_maker_evidence is None:
        found.append(
            Misfit(
                "maker_evidence",
                f"Maker's evidence: not allowed; {row.name} has no higher factor to show.",
            )
        )
    if assembly.service_life_min and row.family != "scba" and not row.has_auxiliary_supply:
        found.append(
            Misfit(
                "service_life_min",
                f"Certified life: not allowed; {row.name} carries no air of its own.",
            )
        )
    return found


def misfits(assembly: Assembly, pack: RulePack) -> list[Misfit]:
    """Everything that speaks against these parts in this class; empty if they belong together.

    Source: the pack's class table; 42 CFR 84 and the EN standards approve assemblies as a whole,
    so this check never stands in for the approval label.
    """
    row = pack.find_class(assembly.respirator_class)
    if row is None:
        known = ", ".join(one.id for one in pack.classes)
        says = f"Respirator class: {assembly.respirator_class} is not known; it must be {known}."
        return [Misfit("respirator_class", says)]
    return [
        *_inlet(assembly, row, pack),
        *_known(assembly.element, pack),
        *_element(assembly, row),
        *_papers(assembly, row),
    ]


def assigned_factor(assembly: Assembly, pack: RulePack) -> int | None:
    """The factor of its class, with its maker's evidence; None if the class is unknown."""
    row = pack.find_class(assembly.respirator_class)
    if row is None:
        return None
    return row.apf_when(has_maker_evidence=bool(assembly.maker_evidence.strip()))
