"""Change schedule: many reasons to change a filter, the shortest binds.

>>> dust = Limit("breathing resistance", 13.3, "30 L/min at 5 mg/m3")
>>> rule = Limit("site policy", 8.0, "one shift")
>>> schedule = shortest([dust, rule])
>>> schedule.binding.reason, [limit.reason for limit in schedule.others]
('site policy', ['breathing resistance'])
>>> int(shifts(13.3, hours_per_shift=8.0))
1
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from operator import attrgetter

import numpy as np
from numpy.typing import ArrayLike, NDArray

from filtration.require import require


@dataclass(frozen=True)
class Limit:
    """One reason to change.

    Attributes:
        reason: what runs out, in a few words.
        hours: of use until then, 0 or more; an endless limit is no limit and is refused.
        working: how the hours were found.
    """

    reason: str
    hours: float
    working: str

    def __post_init__(self) -> None:
        require("hours", self.hours, at_least=0.0)
        if not self.reason.strip():
            raise ValueError("reason: blank is not allowed; it must say what runs out")


@dataclass(frozen=True)
class Schedule:
    """The binding limit, and the others from shortest to longest."""

    binding: Limit
    others: tuple[Limit, ...]

    @property
    def hours(self) -> float:
        """Hours of use until the change."""
        return self.binding.hours


def shortest(candidates: Sequence[Limit]) -> Schedule:
    """The limit that binds, with the rest in order.

    Equal hours keep the order in which they were given.

    Args:
        candidates: one or more limits.

    Raises:
        ValueError: there is none; nothing known is not a schedule.
    """
    if not candidates:
        raise ValueError("candidates: none given; a filter with no known limit has no schedule")
    binding, *others = sorted(candidates, key=attrgetter("hours"))
    return Schedule(binding=binding, others=tuple(others))


def shifts(hours: ArrayLike, *, hours_per_shift: ArrayLike) -> NDArray[np.int64]:
    """Whole shifts that fit into the hours, rounded down; 0 means change within the shift.

    Args:
        hours: h, 0 to 1e6, any shape.
        hours_per_shift: h of use in a shift, above 0 to 24.
    """
    life = require("hours", hours, at_least=0.0, at_most=1e6)
    shift = require("hours_per_shift", hours_per_shift, above=0.0, at_most=24.0)
    whole: NDArray[np.int64] = np.floor_divide(life, shift).astype(np.int64)[()]
    return whole
