"""The one gate for numbers: everything that enters the library is checked here, in one wording.

>>> float(require("efficiency", 0.97, at_least=0.0, at_most=1.0))
0.97
>>> require("efficiency", 1.2, at_least=0.0, at_most=1.0)
Traceback (most recent call last):
    ...
ValueError: efficiency: 1.2 is not allowed; it must be 0 to 1
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats: TypeAlias = NDArray[np.float64]

NUMERIC_KINDS = "iuf"


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

    NaN and infinity are never allowed; neither are text, booleans, None, complex numbers and masked
    entries, because each of them stands for something unknown.

    Args:
        name: the argument as the caller spells it.
        value: any shape; 0-d for a scalar.
        at_least: smallest allowed value.
        at_most: largest allowed value.
        above: every value must be greater than this.
        below: every value must be less than this.

    Returns:
        float64, the shape of `value`.

    Raises:
        ValueError: an entry is not a finite number inside the range.
    """
    allowed = _range_text(at_least, at_most, above=above, below=below)
    numbers = _as_floats(name, value, allowed)
    is_good = np.isfinite(numbers)
    # Each line reads "good if"; an unordered comparison with NaN is false and so refuses.
    if at_least is not None:
        is_good &= numbers >= at_least
    if at_most is not None:
        is_good &= numbers <= at_most
    if above is not None:
        is_good &= numbers > above
    if below is not None:
        is_good &= numbers < below
    if not is_good.all():
        raise ValueError(_refusal(name, f"{numbers[~is_good].flat[0]:.12g}", allowed))
    return numbers


def _as_floats(name: str, value: ArrayLike, allowed: str) -> Floats:
    if np.ma.is_masked(value):
        raise ValueError(_refusal(name, "a masked value", allowed))
    try:
        raw = np.asarray(value)
    except ValueError as error:
        raise ValueError(_refusal(name, "a ragged list", allowed)) from error
    if raw.size and raw.dtype.kind not in NUMERIC_KINDS:
        raise ValueError(_refusal(name, repr(raw.flat[0]), allowed))
    return raw.astype(np.float64)


def _refusal(name: str, shown: str, allowed: str) -> str:
    return f"{name}: {shown} is not allowed; it must be {allowed}"


def _range_text(
    at_least: float | None, at_most: float | None, *, above: float | None, below: float | None
) -> str:
    if at_least is not None and at_most is not None:
        return f"{at_least:g} to {at_most:g}"
    ends = []
    if at_least is not None:
        ends.append(f"{at_least:g} or more")
    if above is not None:
        ends.append(f"more than {above:g}")
    if at_most is not None:
        ends.append(f"{at_most:g} or less")
    if below is not None:
        ends.append(f"less than {below:g}")
    return " and ".join(ends) if ends else "a finite number"


def plain(values: ArrayLike) -> Floats:
    """The values as float64; a 0-d array becomes a scalar that is also a Python float."""
    result: Floats = np.asarray(values, dtype=np.float64)[()]
    return result
