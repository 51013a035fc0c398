"""Exposure statistics of 10 000 groups against a plain loop over scipy.

Run: python -m tests.bench.bench_exposure_statistics

The loop is timed on a few groups and multiplied up; the output says so. Each line also compares
the figures of both ways on those groups.
"""

import sys
import time

import numpy as np
from scipy import stats

from exposure.statistics.censored import tobit, x95_limit
from exposure.statistics.decisions import describe
from exposure.statistics.goodness import goodness_of_fit
from exposure.statistics.lognormal import utl
from tests.exposure_statistics.groups import random_batch

GROUPS = 10_000
LOOPED = 60


def timed(work):
    start = time.perf_counter()
    result = work()
    return result, time.perf_counter() - start


def fit_one(results, below):
    logs = np.log(results)
    data = stats.CensoredData(uncensored=logs[~below], left=logs[below])
    mu, _ = stats.norm.fit(data)
    return mu


def limit_one(results, _below):
    logs = np.log(results)
    n = logs.size
    k = stats.nct.ppf(0.95, n - 1, stats.norm.ppf(0.95) * np.sqrt(n)) / np.sqrt(n)
    return np.exp(logs.mean() + k * logs.std(ddof=1))


def p_one(results, _below):
    return stats.shapiro(np.log(results)).pvalue


def compare(name, batch, *, ours, one, rows):
    """Time the whole batch and a loop over some of its rows; print both and the largest gap."""
    together, seconds = timed(lambda: ours(batch))
    groups = [
        (batch.bound[row, batch.mask[row]], batch.censored[row, batch.mask[row]]) for row in rows
    ]
    looped, loop_seconds = timed(lambda: np.array([one(*group) for group in groups]))
    whole_loop = loop_seconds * len(batch.n) / len(rows)
    gap = np.max(np.abs(looped - together[rows]) / (1e-9 + np.abs(looped)))
    sys.stdout.write(
        f"{name:32} {len(batch.n)} groups {seconds:7.3f} s; loop {whole_loop:8.1f} s "
        f"(from {len(rows)} groups); {whole_loop / seconds:6.0f} times; gap {gap:.1e}\n"
    )


def main():
    rng = np.random.default_rng(1)
    mixed = random_batch(rng, GROUPS, share_censored=1.0)
    complete = random_batch(rng, GROUPS, share_censored=0.0)
    n_detected = mixed.n - mixed.n_censored
    fitted = np.flatnonzero((n_detected >= 5) & (mixed.n_censored >= 2))[:LOOPED]
    full = np.flatnonzero(complete.n >= 6)[:LOOPED]
    compare("fit with nondetects", mixed, ours=lambda b: tobit(b).mu, one=fit_one, rows=fitted)
    compare("tolerance limit", complete, ours=lambda b: utl(b, conf=0.95), one=limit_one, rows=full)
    compare("Shapiro-Wilk p", complete, ours=lambda b: goodness_of_fit(b).p, one=p_one, rows=full)
    limits = timed(lambda: x95_limit(mixed, conf=0.95, method="calibrated"))[1]
    sys.stdout.write(f"{'upper limit with nondetects':32} {GROUPS} groups {limits:7.3f} s\n")
    for count in (400, GROUPS):
        batch = random_batch(rng, count)
        seconds = timed(lambda batch=batch: describe(batch, 0.5))[1]
        sys.stdout.write(f"{'describe, a third censored':32} {count} groups {seconds:7.3f} s\n")


if __name__ == "__main__":
    main()
