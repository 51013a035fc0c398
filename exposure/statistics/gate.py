"""The gate for single numbers that steer a calculation: a level, a temperature, a shift length.

Results of samples do not pass here: a bad result spoils its own group only (see `pack`).
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats: TypeAlias = NDArray[np.float64]
Bools: TypeAlias = NDArray[np.bool_]
Ints: TypeAlias = NDArray[np.int64]
Objects: TypeAlias = NDArray[np.object_]
Status: TypeAlias = NDArray[np.int8]


def require(
    name: str,
    value: ArrayLike,
    *,
    at_least: float | None = None,
    at_most: float | None = None,
    above: float | None = None,
    below: float | None = None,
) -> Floats:
    """The value as a float64 array, or a refusal that names argument, value and range.

    Args:
        name: the argument as the caller spells it.
        value: any shape; 0-d for a scalar. NaN and infinity are never allowed.
        at_least: smallest allowed value.
        at_most: largest allowed value.
        above: every value must be greater than this.
        below: every value must be less than this.

    Raises:
        ValueError: an entry is not a finite number inside the range.
    """
    numbers = np.asarray(value, dtype=np.float64)
    bounds = (
        ("at least", at_least, np.greater_equal),
        ("at most", at_most, np.less_equal),
        ("above", above, np.greater),
        ("below", below, np.less),
    )
    asked = [(words, bound, test) for words, bound, test in bounds if bound is not None]
    is_good = np.isfinite(numbers)
    for _, bound, test in asked:
        is_good &= test(numbers, bound)
    if not is_good.all():
        allowed = " and ".join(f"{words} {bound:g}" for words, bound, _ in asked)
        shown = f"{numbers[~is_good].flat[0]:.12g}"
        raise ValueError(f"{name}: {shown} is not allowed; it must be {allowed or 'finite'}")
    return numbers


def require_choice(name: str, value: str, known: Iterable[str]) -> str:
    """The value if it is one of the known words.

    Raises:
        ValueError: it is not; the message lists the known words.
    """
    words = sorted(known)
    if value not in words:
        raise ValueError(f"{name}: {value!r} is not allowed; it must be one of {', '.join(words)}")
    return value
