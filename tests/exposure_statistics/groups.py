"""Groups of results for tests, and the published ones."""

import numpy as np

from exposure.statistics.pack import pack
from tests.published.check_rows import read_commented

# Full-shift welding fume, mg/m3, as printed in course notes on exposure statistics.
WELDING_FUME = [0.84, 0.98, 0.42, 1.16, 1.36, 2.66]


def batch_of(*groups):
    """A batch of groups; "<0.2" is below its limit, a number is a result."""
    rows = [(row, one) for row, group in enumerate(groups) for one in group]
    below = [isinstance(one, str) for _, one in rows]
    values = [float(one[1:]) if isinstance(one, str) else one for _, one in rows]
    return pack(values, below, [row for row, _ in rows], n_groups=len(groups))


def random_batch(rng, n_groups, *, longest=30, share_censored=1 / 3):
    """Lognormal groups of 0 to `longest` results; some have nondetects at a few limits."""
    n = rng.integers(0, longest + 1, n_groups)
    group = np.repeat(np.arange(n_groups), n)
    sigma, mu = rng.uniform(0.3, 1.3, n_groups), rng.normal(-2.0, 1.0, n_groups)
    x = np.exp(mu[group] + sigma[group] * rng.standard_normal(group.size))
    lod = np.exp(mu[group]) * rng.choice([0.5, 1.0, 2.0], group.size)
    below = (rng.random(n_groups) < share_censored)[group] & (x < lod)
    return pack(np.where(below, lod, x), below, group, n_groups=n_groups, lod=lod)


def edge_case(name):
    """Results of one case of the edge-case data set, in the notation of `batch_of`."""
    lines = read_commented("datasets/computed_pathological.csv")
    return [
        f"<{line['value']}" if line["censored"] == "1" else float(line["value"])
        for line in lines
        if line["case"] == name
    ]
