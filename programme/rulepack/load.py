"""Read a rule pack from its file, strictly: one unknown key or missing mark refuses it all.

A message names the file, the place in it, what was met and what is allowed.
"""

import types
import typing
from collections.abc import Iterator
from dataclasses import MISSING, Field, fields, is_dataclass
from functools import cache
from pathlib import Path
from typing import Any, TypeVar

import yaml

from programme.rulepack.pack import RulePack, RulePackInfo
from programme.rulepack.rows import RespiratorClass, allowed_in

RULES = Path(__file__).resolve().parents[2] / "fixtures" / "rules"

NEVER_EMPTY = {"source", "id", "code", "name", "rule"}

T = TypeVar("T")


class RulePackError(ValueError):
    """A rule pack file that does not say what a rule pack has to say."""


def _refuse(where: str, value: object, allowed: str) -> RulePackError:
    return RulePackError(f"{where}: {value!r}; {allowed}")


def _number(value: object, kind: type, where: str) -> Any:
    # True is an int to Python, never to a rule pack; nan and inf are no rules either.
    is_number = isinstance(value, int | float) and not isinstance(value, bool)
    if kind is int:
        is_number = is_number and isinstance(value, int)
    if not is_number or not abs(float(typing.cast("float", value))) < float("inf"):
        raise _refuse(where, value, f"it must be a{'n' if kind is int else ''} {kind.__name__}")
    return kind(value)


def _sequence(value: object, kind: Any, where: str, *, allowed: tuple[str, ...]) -> tuple[Any, ...]:
    if not isinstance(value, list):
        raise _refuse(where, value, "it must be a list")
    found = []
    for index, one in enumerate(value):
        name = one.get("id") or one.get("code") or index if isinstance(one, dict) else index
        found.append(_value(one, kind, f"{where}[{name}]", allowed=allowed))
    return tuple(found)


def _scalar(value: object, kind: Any, where: str, *, allowed: tuple[str, ...]) -> Any:
    if kind in (int, float):
        return _number(value, kind, where)
    if not isinstance(value, kind):
        raise _refuse(where, value, f"it must be a {kind.__name__}")
    if allowed and value not in allowed:
        raise _refuse(where, value, f"it must be one of {', '.join(filter(None, allowed))}")
    return value


def _value(value: object, kind: Any, where: str, *, allowed: tuple[str, ...] = ()) -> Any:
    if typing.get_origin(kind) in (types.UnionType, typing.Union):
        if value is None:
            return None
        kind = next(one for one in typing.get_args(kind) if one is not type(None))
    if typing.get_origin(kind) is tuple:
        return _sequence(value, typing.get_args(kind)[0], where, allowed=allowed)
    if is_dataclass(kind):
        return _row(value, typing.cast("type[Any]", kind), where)
    return _scalar(value, kind, where, allowed=allowed)


def _is_required(spec: "Field[Any]") -> bool:
    return spec.default is MISSING and spec.default_factory is MISSING


def _row(value: object, kind: type[T], where: str) -> T:
    if not isinstance(value, dict):
        raise _refuse(where, value, "it must be a mapping")
    specs = {spec.name: spec for spec in fields(typing.cast("Any", kind))}
    hints = typing.get_type_hints(kind)
    for key in value:
        if key not in specs:
            raise _refuse(f"{where}.{key}", value[key], f"keys are {', '.join(specs)}")
    for name, spec in specs.items():
        if name not in value and _is_required(spec):
            raise RulePackError(f"{where}.{name}: missing; every such row must give it")
        if name in NEVER_EMPTY and value.get(name, "given") == "":
            raise _refuse(f"{where}.{name}", "", "it must not be empty")
    return kind(
        **{
            key: _value(one, hints[key], f"{where}.{key}", allowed=allowed_in(specs[key]))
            for key, one in value.items()
        }
    )


def _refuse_twice(where: str, names: list[str]) -> None:
    for name in names:
        if names.count(name) > 1:
            raise _refuse(where, name, "it must stand once only")


def _check_names(pack: RulePack, where: str) -> None:
    _refuse_twice(f"{where}.clauses", [row.code for row in pack.clauses])
    _refuse_twice(f"{where}.substances.cas", [cas for row in pack.substances for cas in row.cas])
    levels = [f"{row.facepiece} {row.method}" for row in pack.pass_levels]
    _refuse_twice(f"{where}.pass_levels", levels)
    for key in (
        "classes",
        "particulate_filters",
        "gas_elements",
        "protocols",
        "intervals",
        "retention",
        "substances",
    ):
        _refuse_twice(f"{where}.{key}", [row.id for row in getattr(pack, key)])


def _known(where: str, values: typing.Iterable[str], known: typing.Iterable[str]) -> None:
    known = tuple(known)
    for value in values:
        if value not in known:
            raise _refuse(where, value, f"it must be one of {', '.join(known)}")


def _element_parts(row: RespiratorClass) -> Iterator[str]:
    for element in row.elements:
        yield from element.split("+")


def _check_references(pack: RulePack, where: str) -> None:
    filters = [row.id for row in pack.particulate_filters]
    elements = [row.id for row in pack.gas_elements]
    classes = [row.id for row in pack.classes]
    for row in pack.classes:
        _known(f"{where}.classes[{row.id}].elements", _element_parts(row), ["gas", *filters])
    for gas in pack.gas_elements:
        _known(f"{where}.gas_elements[{gas.id}].covers", gas.covers, pack.gas_needs)
    for use in pack.max_use:
        _known(f"{where}.max_use.elements", use.elements, elements)
    ordinary = pack.low_boiling.ordinary_elements
    _known(f"{where}.low_boiling.ordinary_elements", ordinary, elements)
    for agent in pack.not_for_cartridge:
        _known(f"{where}.not_for_cartridge.except_elements", agent.except_elements, elements)
    for substance in pack.substances:
        for hours in substance.element_hours:
            _known(f"{where}.substances[{substance.id}].classes", hours.classes, classes)


def _check_figures(pack: RulePack, where: str) -> None:
    for row in pack.classes:
        if not row.apf >= 1:
            raise _refuse(f"{where}.classes[{row.id}].apf", row.apf, "it must be 1 or more")
    for one in pack.particulate_filters:
        if not 0 < one.efficiency_min < 1:
            place = f"{where}.particulate_filters[{one.id}].efficiency_min"
            raise _refuse(place, one.efficiency_min, "it must be between 0 and 1")
    for level in pack.pass_levels:
        if level.method == "quantitative" and level.allowed and level.min_fit_factor is None:
            place = f"{where}.pass_levels[{level.facepiece}].min_fit_factor"
            raise _refuse(place, None, "a quantitative test needs a figure")


def _read(text: str, where: str) -> dict[str, Any]:
    try:
        found = yaml.safe_load(text)
    except yaml.YAMLError as error:
        raise RulePackError(f"{where}: not readable as YAML; {error}") from error
    if not isinstance(found, dict):
        raise _refuse(where, type(found).__name__, "a rule pack is a mapping")
    return found


def parse(text: str, *, name: str) -> RulePack:
    """A rule pack from the text of its file.

    Args:
        text: YAML.
        name: name of the pack, for messages and for `RulePack.name`.

    Raises:
        RulePackError: a key is unknown or missing, or a value is not allowed.
    """
    found = _read(text, name)
    if "name" in found:
        raise _refuse(f"{name}.name", found["name"], "the name of a pack is that of its file")
    pack = _row({"name": name, **found}, RulePack, name)
    if name != f"{pack.id}-{pack.edition}":
        raise _refuse(f"{name}.edition", pack.edition, "a file is named after id and edition")
    _check_names(pack, name)
    _check_references(pack, name)
    _check_figures(pack, name)
    return pack


def _names() -> list[str]:
    return sorted(path.stem for path in RULES.glob("*.yaml"))


@cache
def load(name: str) -> RulePack:
    """The rule pack of that name, e.g. "us-2026-1"; read once and then kept.

    Raises:
        ValueError: there is no such pack (the message lists those there are).
        RulePackError: its file is not a proper rule pack.
    """
    if name not in _names():
        raise ValueError(f"rule pack: {name!r}; it must be one of {', '.join(_names())}")
    return parse((RULES / f"{name}.yaml").read_text(encoding="utf-8"), name=name)


def available() -> list[RulePackInfo]:
    """The rule packs that are shipped, in the order of their names."""
    return [load(name).info for name in _names()]
