"""Figures as people read them: value, unit and a rounding that never crosses a limit.

A fit factor or a protection factor is rounded down, a concentration or a hazard ratio up, so that
99.99 is never shown as 100. The unrounded figure is what is compared; this module only shows.
"""

import math
from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Decimal

NOT_KNOWN = "not known"
_ROUNDINGS = {"up": ROUND_CEILING, "down": ROUND_FLOOR, "near": ROUND_HALF_EVEN}


def rounded(value: float | None, *, toward: str = "near", digits: int = 3) -> str:
    """Show `value` with `digits` significant digits, rounded up, down or to the nearest.

    Args:
        value: any number; None, NaN and infinities are shown as "not known".
        toward: "up", "down" or "near".
        digits: significant digits kept, 1 or more.

    Returns:
        Plain decimal text with a narrow no-break space between thousands, without an exponent.

    Raises:
        ValueError: `toward` is none of the three.
    """
    if toward not in _ROUNDINGS:
        raise ValueError(f"toward: {toward!r} is not allowed; it may be up, down or near")
    if value is None or not math.isfinite(value):
        return NOT_KNOWN
    if value == 0:
        return "0"
    # Twelve digits first: 799.9999999999999 is 800 after a sum of reciprocals, not 799.
    exact = Decimal(f"{float(value):.12g}")
    step = Decimal(1).scaleb(exact.adjusted() - digits + 1)
    # A whole number keeps all its digits: 10 000 must not read as 1e4 rounded.
    if exact == exact.to_integral_value() and abs(exact) < 1_000_000:
        step = Decimal(1)
    shown = exact.quantize(step, rounding=_ROUNDINGS[toward])
    text = f"{shown:,f}".replace(",", "\u202f")
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return text


def up(value: float | None, digits: int = 3) -> str:
    """Concentrations, ratios, loads: rounded up."""
    return rounded(value, toward="up", digits=digits)


def down(value: float | None, digits: int = 3) -> str:
    """Fit factors, protection factors, lives: rounded down."""
    return rounded(value, toward="down", digits=digits)


def near(value: float | None, digits: int = 3) -> str:
    """Inputs that decide nothing by themselves: rounded to the nearest."""
    return rounded(value, digits=digits)


UNIT_SIGNS = {
    "mg/m3": "mg/m³",
    "ug/m3": "µg/m³",
    "f/cm3": "f/cm³",
    "m3": "m³",
    "cm2": "cm²",
    "Pa": "Pa",
}


def unit_sign(unit: str) -> str:
    """The unit as it is printed: `mg/m3` becomes `mg/m³`; an unknown unit is left alone."""
    return UNIT_SIGNS.get(unit, unit)


@dataclass(frozen=True)
class Figure:
    """One number with its unit and the direction in which it may be rounded."""

    value: float | None
    unit: str = ""
    toward: str = "near"
    digits: int = 3

    def __str__(self) -> str:
        text = rounded(self.value, toward=self.toward, digits=self.digits)
        if text == NOT_KNOWN or not self.unit:
            return text
        return f"{text} {unit_sign(self.unit)}"
