"""The chain as shapes: six links on a level line; at the first broken one the rest hangs lower.

Pure geometry in drawing units, y downwards. A path is a list of steps: ("M", x, y), ("L", x, y) and
("A", r, x, y), the last a clockwise half or quarter turn of radius r. Shape and position carry the
state; nothing here has a colour.
"""

from collections.abc import Sequence
from dataclasses import dataclass

HOLDS, DUE_SOON, BROKEN = "holds", "due soon", "broken"

CELL = 160.0
LINK_W, LINK_H = 112.0, 42.0
TOP = 10.0
DROP = 46.0
FULL, THIN = 7.0, 3.0
GAP = 12.0
NOTCH = 11.0

Step = tuple[str | float, ...]


@dataclass(frozen=True)
class Stroke:
    """One open line of the drawing."""

    steps: tuple[Step, ...]
    width: float

    @property
    def svg(self) -> str:
        """The steps as the `d` of an SVG path."""
        words = []
        for kind, *numbers in self.steps:
            if kind == "A":
                r, x, y = numbers
                words.append(f"A{r:g} {r:g} 0 0 1 {x:g} {y:g}")
            else:
                words.append(f"{kind}{numbers[0]:g} {numbers[1]:g}")
        return "".join(words)

    @property
    def box(self) -> tuple[float, float, float, float]:
        """Left, top, right, bottom, the width of the stroke included."""
        xs, ys = [], []
        for kind, *numbers in self.steps:
            x, y = (float(value) for value in numbers[-2:])
            xs.append(x)
            ys.append(y)
            if kind == "A":
                r = float(numbers[0])
                # A half turn bulges by its radius to the side on which the link is round.
                xs += [x - r, x + r] if len(ys) > 1 and abs(ys[-2] - y) > r else []
        half = self.width / 2
        return min(xs) - half, min(ys) - half, max(xs) + half, max(ys) + half


@dataclass(frozen=True)
class DrawnLink:
    """One link: its strokes, and where its words may begin."""

    state: str
    is_after: bool
    strokes: tuple[Stroke, ...]
    left: float
    words_top: float


def first_broken(states: Sequence[str]) -> int:
    """Index of the first broken link, or the number of links where all hold."""
    return next((i for i, state in enumerate(states) if state == BROKEN), len(states))


def _closed(x: float, y: float, width: float, *, is_notched: bool) -> Stroke:
    r = LINK_H / 2
    left, right, low = x + r, x + LINK_W - r, y + LINK_H
    steps: list[Step] = [("M", left, y), ("L", right, y), ("A", r, right, low)]
    if is_notched:
        middle = (left + right) / 2
        steps += [
            ("L", middle + NOTCH, low),
            ("L", middle, low - NOTCH),
            ("L", middle - NOTCH, low),
        ]
    steps += [("L", left, low), ("A", r, left, y)]
    return Stroke(tuple(steps), width)


def _open(x: float, y: float, *, drop: float, width: float) -> tuple[Stroke, Stroke]:
    """A link torn open: the near half at `y`, the far half `drop` lower and a little apart."""
    r, low = LINK_H / 2, y + LINK_H
    left, right, middle = x + r, x + LINK_W - r, x + LINK_W / 2
    near = Stroke(
        (
            ("M", middle - GAP / 2 - 8, low),
            ("L", left, low),
            ("A", r, left, y),
            ("L", middle - GAP / 2, y),
        ),
        width,
    )
    far = Stroke(
        (
            ("M", middle + GAP / 2 + 8, y + drop),
            ("L", right, y + drop),
            ("A", r, right, low + drop),
            ("L", middle + GAP / 2, low + drop),
        ),
        width,
    )
    return near, far


def _joiner(x: float, y: float, width: float) -> Stroke:
    """The next link of the chain seen edge on, between two loops."""
    middle = y + LINK_H / 2
    return Stroke((("M", x + LINK_W - 8, middle), ("L", x + CELL + 8, middle)), width + 2)


def chain_links(states: Sequence[str]) -> tuple[DrawnLink, ...]:
    """The drawn links of these states, left to right.

    Args:
        states: "holds", "due soon" or "broken", one a link.

    Raises:
        ValueError: a state is none of the three.
    """
    odd = [state for state in states if state not in {HOLDS, DUE_SOON, BROKEN}]
    if odd:
        raise ValueError(f"states: {odd[0]!r} is not allowed; holds, due soon or broken")
    broken_at = first_broken(states)
    drawn = []
    for index, state in enumerate(states):
        is_after = index > broken_at
        x, y = index * CELL + (CELL - LINK_W) / 2, TOP + (DROP if is_after else 0.0)
        width = THIN if is_after else FULL
        if state == BROKEN:
            drop = DROP if index == broken_at else 0.0
            strokes = list(_open(x, y, drop=drop, width=width))
            end = y + drop
        else:
            strokes = [_closed(x, y, width, is_notched=state == DUE_SOON)]
            end = y
        if index < len(states) - 1:
            strokes.append(_joiner(x, end, THIN if index >= broken_at else width))
        bottom = max(stroke.box[3] for stroke in strokes)
        drawn.append(DrawnLink(state, is_after, tuple(strokes), index * CELL, bottom))
    return tuple(drawn)


def chain_size(states: Sequence[str]) -> tuple[float, float]:
    """Width and height of the drawing."""
    drop = DROP if first_broken(states) < len(states) else 0.0
    return len(states) * CELL, TOP + LINK_H + drop + FULL


@dataclass(frozen=True)
class Bar:
    """One of the six small bars in a list."""

    x: float
    y: float
    width: float
    is_hollow: bool


MINI_W, MINI_H = 93.0, 14.0


def mini_bars(states: Sequence[str]) -> tuple[Bar, ...]:
    """The chain in 93 by 14: six bars at two heights, the first broken one split in two."""
    broken_at = first_broken(states)
    bars = []
    for index in range(len(states)):
        x = index * 16.0
        if index == broken_at:
            bars += [Bar(x, 0.5, 5.5, is_hollow=False), Bar(x + 7.5, 8.0, 5.5, is_hollow=False)]
        elif index > broken_at:
            bars.append(Bar(x, 8.0, 13.0, is_hollow=True))
        else:
            bars.append(Bar(x, 0.5, 13.0, is_hollow=False))
    return tuple(bars)
