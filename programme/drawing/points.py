"""Results of a group as a strip of points on a log axis, with the limit and the estimates."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from programme.figures import near

WIDTH, HEIGHT = 720.0, 150.0
LEFT, RIGHT = 20.0, 20.0
ROW_Y, AXIS_Y = 62.0, 108.0
STACK = 9.0
NEAR_PX = 7.0


@dataclass(frozen=True)
class Mark:
    """One result: where it stands, and whether it lies below detection."""

    x: float
    y: float
    is_below: bool
    says: str


@dataclass(frozen=True)
class Line:
    """A figure drawn as an upright line, with its words in one of three rows."""

    x: float
    label: str
    kind: str
    label_y: float
    anchor: str


@dataclass(frozen=True)
class Tick:
    """A power of ten, or two or five times one, on the axis."""

    x: float
    label: str


@dataclass(frozen=True)
class Drawn:
    """The whole picture."""

    marks: tuple[Mark, ...]
    lines: tuple[Line, ...]
    ticks: tuple[Tick, ...]
    width: float = WIDTH
    height: float = HEIGHT
    axis_y: float = AXIS_Y


class _Axis:
    def __init__(self, values: Sequence[float]) -> None:
        self.low = math.log10(min(values)) - 0.15
        self.high = max(math.log10(max(values)) + 0.15, self.low + 0.6)

    def x(self, value: float) -> float:
        share = (math.log10(value) - self.low) / (self.high - self.low)
        return round(LEFT + share * (WIDTH - LEFT - RIGHT), 1)

    def ticks(self) -> tuple[Tick, ...]:
        wide = self.high - self.low > 3
        made = []
        for power in range(math.floor(self.low), math.ceil(self.high) + 1):
            for times in (1,) if wide else (1, 2, 5):
                value = times * 10.0**power
                if self.low <= math.log10(value) <= self.high:
                    made.append(Tick(self.x(value), near(value)))
        return tuple(made)


def _stacked(values: Sequence[tuple[float, bool]], axis: _Axis) -> tuple[Mark, ...]:
    marks: list[Mark] = []
    for value, is_below in sorted(values):
        x = axis.x(value)
        close = [mark for mark in marks if abs(mark.x - x) < NEAR_PX]
        y = ROW_Y + 34 - STACK * len(close)
        says = f"below {near(value)}" if is_below else near(value)
        marks.append(Mark(x, max(y, 36.0), is_below, says))
    return tuple(marks)


def points(picture: Any) -> Drawn:
    """The picture of one group: `detected`, `below`, `limit`, `gm`, `x95`, `upper70`, `upper95`.

    All in one unit, above 0; a figure that is NaN is left out.
    """
    figures = [
        (picture.limit, "limit", "limit"),
        (picture.gm, "geometric mean", "gm"),
        (picture.x95, "95th percentile", "x95"),
        (picture.upper70, "70 % upper limit", "upper"),
        (picture.upper95, "95 % upper limit", "upper"),
    ]
    known = [row for row in figures if row[0] > 0 and math.isfinite(row[0])]
    results = [(v, False) for v in picture.detected] + [(v, True) for v in picture.below]
    axis = _Axis([value for value, _ in results] + [row[0] for row in known])
    lines = []
    for index, (value, label, kind) in enumerate(sorted(known)):
        x = axis.x(value)
        anchor = "start" if x < WIDTH * 0.25 else "end" if x > WIDTH * 0.75 else "middle"
        lines.append(Line(x, f"{label} {near(value)}", kind, 12.0 + 12.0 * (index % 3), anchor))
    return Drawn(_stacked(results, axis), tuple(lines), axis.ticks())
