"""What a reader of the figures must know about the results behind them: stable words, sentences.

Only what the numbers themselves can show stands here; what the record knows (drift of the pump,
area sample, age) is flagged where the record is read.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

import numpy as np

from exposure.statistics.gate import Bools, Floats
from exposure.statistics.goodness import goodness_of_fit
from exposure.statistics.likelihood import SAME_LOG
from exposure.statistics.lognormal import SPREAD_FROM, is_complete, moments
from exposure.statistics.outliers import has_outlier
from exposure.statistics.pack import Batch

# Thresholds without another source are this program's own choice.
FEW_RESULTS: Final = 6
FEW_DETECTS: Final = 3
GSD_HIGH: Final = 4.0
GSD_ABSURD: Final = 10.0
GSD_LOW: Final = 1.2
GSD_LOW_UNDER_N: Final = 10
CENSORED_HIGH: Final = 0.5
LOD_SHARE_OF_LIMIT: Final = 0.1
ROUNDING_SHARE_OF_GM: Final = 0.2
FIT_P: Final = 0.05
UNIT_RANGE: Final = (1e-5, 1e4)
MOST_RESULTS: Final = 5000

SENTENCES: Final[Mapping[str, str]] = MappingProxyType(
    {
        "no_results": "No results.",
        "bad_value": "A result is missing, zero or negative: correct it or give its limit.",
        "limit_missing": "No limit above zero to compare with.",
        "too_many_results": "Too many for shift results: a logged shift is one result.",
        "out_of_range": "The spread is so wide that the limit of the estimate is beyond numbers.",
        "n_lt_6": "Fewer than 6 results: the prior on the spread takes part in the figure.",
        "few_detects": "Fewer than 3 results above detection.",
        "censored_high": "More than half of the results are below detection.",
        "lod_over_limit": "A detection limit is above a tenth of the limit: it shows little.",
        "lod_over_detects": "A detection limit is above all measured results: it tells nothing.",
        "detect_under_lod": "A result was measured below the detection limit of another.",
        "gsd_high": "Spread above GSD 4: look for mixed groups and split them.",
        "gsd_over_10": "Spread above GSD 10: these results are hardly one group.",
        "gsd_low": "Spread below GSD 1.2 in few results: it is probably wider.",
        "identical": "Identical results: check the rounding.",
        "rounded": "Two distinct values only, coarsely rounded: the spread is uncertain.",
        "not_lognormal": "The results do not look lognormal: mixed group, trend or outlier.",
        "outlier": "One result lies apart from the others; it is kept.",
        "prior_driven": "Another fair prior on the spread would change the figure by half or more.",
        "unit_suspect": "Results and limit differ so much that a unit may be wrong.",
    }
)


def data_flags(batch: Batch, limit: Floats, gsd: Floats) -> dict[str, Bools]:
    """Which groups each flag holds for, (G,); comparisons with what is unknown are False.

    Args:
        batch: G groups; the caller drops the flags of groups that have no figures.
        limit: (G,), above 0 or NaN.
        gsd: (G,), as shown.
    """
    n, n_censored = batch.n, batch.n_censored
    n_detected = n - n_censored
    is_under = batch.detected & (batch.bound < batch.highest_lod[:, None])
    is_over = batch.censored & (batch.bound > LOD_SHARE_OF_LIMIT * limit[:, None])
    middle = np.exp(batch.logs.sum(axis=1) / np.maximum(n, 1)) / limit
    is_tested = is_complete(batch) & (n >= FEW_RESULTS)
    return {
        "n_lt_6": n < FEW_RESULTS,
        "few_detects": (n >= FEW_RESULTS) & (n_detected < FEW_DETECTS),
        "censored_high": n_censored > CENSORED_HIGH * n,
        "lod_over_limit": is_over.any(axis=1),
        "lod_over_detects": batch.highest_lod > batch.highest,
        "detect_under_lod": is_under.any(axis=1),
        "gsd_high": gsd > GSD_HIGH,
        "gsd_over_10": gsd > GSD_ABSURD,
        "gsd_low": (gsd < GSD_LOW) & (n < GSD_LOW_UNDER_N),
        "identical": is_identical(batch),
        "rounded": is_coarse(batch),
        "not_lognormal": goodness_of_fit(batch).p < FIT_P,
        "outlier": is_tested & has_outlier(batch),
        "unit_suspect": (middle < UNIT_RANGE[0]) | (middle > UNIT_RANGE[1]),
    }


def is_identical(batch: Batch) -> Bools:
    """Two or more results, none below detection, all the same, (G,)."""
    return np.asarray(is_complete(batch) & (batch.n >= SPREAD_FROM) & (moments(batch).s == 0.0))


def is_coarse(batch: Batch) -> Bools:
    """Six or more results with two distinct values, more than a fifth of the GM apart, (G,)."""
    low = np.where(batch.mask, batch.logs, np.inf).min(axis=1, initial=np.inf)
    high = np.where(batch.mask, batch.logs, -np.inf).max(axis=1, initial=-np.inf)
    is_end = (batch.logs - low[:, None] < SAME_LOG) | (high[:, None] - batch.logs < SAME_LOG)
    has_two = is_complete(batch) & (batch.n >= FEW_RESULTS) & (is_end | ~batch.mask).all(axis=1)
    gm = np.exp(moments(batch).ybar)
    return np.asarray(has_two & (np.exp(high) - np.exp(low) > ROUNDING_SHARE_OF_GM * gm))
