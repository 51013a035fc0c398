"""Groups of results as arrays: G groups in rows, their results padded to N columns.

>>> batch = pack([0.2, 0.05, 0.4], [False, True, False], [0, 0, 2], n_groups=3)
>>> batch.n.tolist(), batch.n_censored.tolist()
([2, 0, 1], [1, 0, 0])
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from exposure.statistics.gate import Bools, Floats, Ints

# Rows of similar length are worked on together, so that one long group does not pad the others.
BUCKET_ENDS = (5, 10, 20, 40, 100, 400)


@dataclass(frozen=True)
class Batch:
    """Results of G groups, padded to N.

    Attributes:
        values: (G, N), the result, or the detection limit of a result below it; one unit a group.
        mask: (G, N), True where there is a result; False is padding.
        censored: (G, N), True where the result is below detection.
        lod: (G, N), limit of detection of each result, NaN where not known (detects only).
    """

    values: Floats
    mask: Bools
    censored: Bools
    lod: Floats

    @cached_property
    def n(self) -> Ints:
        """Results in each group, (G,)."""
        return np.asarray(self.mask.sum(axis=1))

    @cached_property
    def n_censored(self) -> Ints:
        """Results below detection in each group, (G,)."""
        return np.asarray(self.censored.sum(axis=1))

    @cached_property
    def detected(self) -> Bools:
        """True where a result was measured, (G, N)."""
        return self.mask & ~self.censored

    @cached_property
    def bound(self) -> Floats:
        """The number that speaks for each result, (G, N): its value, or what it is below.

        Value and detection limit of a nondetect should agree; where they differ the larger counts,
        and a nondetect without a detection limit has none (NaN).
        """
        return np.where(self.censored, np.maximum(self.values, self.lod), self.values)

    @cached_property
    def is_sound(self) -> Bools:
        """True for groups whose every number is finite and above 0, (G,); also if empty."""
        is_good = np.isfinite(self.bound) & (self.bound > 0.0)
        return np.asarray((is_good | ~self.mask).all(axis=1))

    @cached_property
    def logs(self) -> Floats:
        """Natural logarithm of `bound`, (G, N); 0 in the padding and in unsound groups."""
        is_usable = self.mask & self.is_sound[:, None]
        return np.log(np.where(is_usable, self.bound, 1.0))

    @cached_property
    def highest(self) -> Floats:
        """Highest detected result, (G,); NaN if none was detected or a number is bad."""
        top = np.where(self.detected, self.bound, -np.inf).max(axis=1, initial=-np.inf)
        return np.where(np.isfinite(top) & self.is_sound, top, np.nan)

    @cached_property
    def highest_lod(self) -> Floats:
        """Highest limit among the nondetects, (G,); NaN if there are none or a number is bad."""
        top = np.where(self.censored, self.bound, -np.inf).max(axis=1, initial=-np.inf)
        return np.where(np.isfinite(top) & self.is_sound, top, np.nan)

    @cached_property
    def n_telling(self) -> Ints:
        """Results in each group without nondetects whose limit is above every detect, (G,).

        "Below 5" tells next to nothing where all else is below 0.1; it must not make a group of
        three results pass for one of six. Where nothing was detected all results count.
        """
        is_idle = self.censored & (self.bound > self.highest[:, None])
        return np.asarray(self.n - is_idle.sum(axis=1))

    def rows(self, index: NDArray[np.int64] | Bools) -> Batch:
        """The same results for some of the groups, without columns that are only padding."""
        mask = self.mask[index]
        width = int(mask.sum(axis=1).max(initial=0))
        return Batch(
            self.values[index, :width],
            mask[:, :width],
            self.censored[index, :width],
            self.lod[index, :width],
        )


def pack(
    values: ArrayLike,
    censored: ArrayLike,
    group: ArrayLike,
    *,
    n_groups: int,
    lod: ArrayLike | None = None,
) -> Batch:
    """Sort flat results into their groups.

    Bad results (NaN, zero, negative) are kept: they mark their group as unsound, and no figure is
    given for it.

    Args:
        values: (M,), the result, or the detection limit of a result below it.
        censored: (M,), True where the result is below detection.
        group: (M,), whole numbers 0 to `n_groups` - 1; a group may have no results.
        n_groups: number of groups, 0 or more.
        lod: (M,), limit of detection of each result, NaN for a detect where it is not known. If
            left out, the value of a nondetect is its limit and that of a detect is not known.

    Raises:
        ValueError: lengths differ, or a group number is out of range.
    """
    number = np.asarray(values, dtype=np.float64)
    is_censored = np.asarray(censored, dtype=bool)
    row = np.asarray(group, dtype=np.int64)
    limit = np.where(is_censored, number, np.nan) if lod is None else np.asarray(lod, np.float64)
    lengths = {array.shape for array in (number, is_censored, row, limit)}
    if len(lengths) > 1 or number.ndim != 1:
        raise ValueError(f"values: shapes {sorted(lengths)} differ; all must be flat and as long")
    if row.size and not (row.min() >= 0 and row.max() < n_groups):
        outside = row[(row < 0) | (row >= n_groups)][0]
        raise ValueError(f"group: {outside} is not allowed; it must be 0 to {n_groups - 1}")
    order = np.argsort(row, kind="stable")
    counts = np.bincount(row, minlength=n_groups)
    column = np.arange(row.size) - np.repeat(np.cumsum(counts) - counts, counts)
    shape = (n_groups, int(counts.max(initial=0)))
    place = (row[order], column)
    batch = Batch(np.ones(shape), np.zeros(shape, bool), np.zeros(shape, bool), np.ones(shape))
    batch.lod[:] = np.nan
    batch.values[place] = number[order]
    batch.mask[place] = True
    batch.censored[place] = is_censored[order]
    batch.lod[place] = limit[order]
    return batch


def buckets(batch: Batch) -> Iterator[tuple[Ints, Batch]]:
    """Groups of similar length, each with the rows it came from; empty groups are left out."""
    ends = np.searchsorted(BUCKET_ENDS, batch.n)
    for end in np.unique(ends[batch.n > 0]):
        index = np.flatnonzero((ends == end) & (batch.n > 0))
        yield index, batch.rows(index)


def without_highest(batch: Batch) -> Batch:
    """The batch with the highest detect of each group taken out, for showing both answers.

    An extreme result is never dropped from the figures that decide; this is the second figure.
    """
    top = np.where(batch.detected, batch.bound, -np.inf)
    is_top = np.zeros_like(batch.mask)
    if batch.mask.shape[1]:
        is_top[np.arange(len(top)), top.argmax(axis=1)] = True
    keep = batch.mask & ~(is_top & batch.detected)
    group, column = np.nonzero(keep)
    return pack(
        batch.values[group, column],
        batch.censored[group, column],
        group,
        n_groups=len(keep),
        lod=batch.lod[group, column],
    )
