"""The posterior of mean and spread of the logs, cut into slices of equal sigma.

Within a slice the log density of mu is concave. It is tabled on two even grids, below and above
its mode, and its integral is a cubic through values and slopes: smooth enough to be inverted, and
exact at the bounds of mu. All in logs less the center of `likelihood.Evidence`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.special import log_ndtr

from exposure.statistics.gate import Bools, Floats, Ints
from exposure.statistics.likelihood import Evidence, mills

COARSE_NODES: Final = 48
SIGMA_NODES: Final = 40
MU_CELLS: Final = 24

# exp(-24) of the mass lies beyond, half on each side.
LOG_REACH: Final = 24.0
# Sigma whose weight is this far below the best, in logs, carries nothing.
WEIGHT_REACH: Final = 30.0
MODE_STEPS: Final = 40
MODE_NEAR: Final = 1e-9
HALVINGS: Final = 14
INVERSIONS: Final = 42


@dataclass(frozen=True)
class Box:
    """Bounds of mu, each (G,), infinite where there are none."""

    low: Floats
    high: Floats

    def rows(self, index: Ints | Bools) -> Box:
        """The same for some of the groups."""
        return Box(self.low[index], self.high[index])


@dataclass(frozen=True)
class _Cubic:
    """An integral on an even grid: cubic Hermite through its values and their slopes."""

    start: Floats  # (G, S)
    step: Floats  # (G, S)
    integral: Floats  # (G, S, M)
    density: Floats  # (G, S, M)

    def at(self, mu: Floats) -> Floats:
        """Integral from the start to mu, (G, S); flat outside the grid."""
        cells = self.integral.shape[2] - 1
        width = np.where(self.step > 0.0, self.step, 1.0)
        place = np.clip((mu - self.start) / width, 0.0, cells)
        cell = np.minimum(place.astype(np.int64), cells - 1)
        u = place - cell
        index = cell[:, :, None] + np.array([0, 1])
        value = np.take_along_axis(self.integral, index, axis=2)
        slope = np.take_along_axis(self.density, index, axis=2) * self.step[:, :, None]
        rise = value[:, :, 1] - value[:, :, 0]
        d0, d1 = slope[:, :, 0], slope[:, :, 1]
        bend = 3.0 * rise - 2.0 * d0 - d1 + u * (d0 + d1 - 2.0 * rise)
        return np.asarray(value[:, :, 0] + u * (d0 + u * bend))


@dataclass(frozen=True)
class Slices:
    """Posterior at S values of sigma in each of G groups."""

    sigma: Floats  # (G, S)
    weight: Floats  # (G, S), sums to 1
    lower: _Cubic
    upper: _Cubic

    def cdf(self, t: Floats, *, z: float) -> Floats:
        """Chance that mu + z sigma is at or below t, (G, C) for t (G, C)."""
        whole = self.lower.integral[:, :, -1] + self.upper.integral[:, :, -1]
        share = self.weight / np.where(whole > 0.0, whole, 1.0)
        columns = [self._below(t[:, c, None] - z * self.sigma) for c in range(t.shape[1])]
        return np.stack([(share * part).sum(axis=1) for part in columns], axis=1)

    def _below(self, mu: Floats) -> Floats:
        return self.lower.at(mu) + self.upper.at(mu)

    def quantiles(self, levels: Floats, *, z: float) -> Floats:
        """Quantiles of mu + z sigma, (G, len(levels)); NaN where there is no posterior."""
        ends = self.upper.start + MU_CELLS * self.upper.step
        low = (self.lower.start + z * self.sigma).min(axis=1)
        high = (ends + z * self.sigma).max(axis=1)
        low, high = (np.repeat(edge[:, None], levels.size, axis=1) for edge in (low, high))
        for _ in range(INVERSIONS):
            middle = 0.5 * (low + high)
            is_below = self.cdf(middle, z=z) < levels
            low, high = np.where(is_below, middle, low), np.where(is_below, high, middle)
        has_one = np.asarray(np.isfinite(self.weight).all(axis=1))[:, None]
        return np.where(has_one, 0.5 * (low + high), np.nan)


def slices(
    data: Evidence,
    log_prior: Callable[[Floats], Floats],
    *,
    span: Floats,
    box: Box,
) -> Slices:
    """Cut the posterior of G groups at the values of sigma that carry it.

    Args:
        data: G groups; those without a detect need a lower bound of mu.
        log_prior: log density of ln sigma.
        span: (2, G), lowest and highest ln sigma.
        box: bounds of mu.
    """
    inner = Box((box.low - data.center)[:, None], (box.high - data.center)[:, None])
    span = _trim(data, log_prior, span=span, box=inner)
    nodes, weights = np.polynomial.legendre.leggauss(SIGMA_NODES)
    half = 0.5 * (span[1] - span[0])[:, None]
    log_sigma = span[0][:, None] + half * (nodes + 1.0)
    sigma = np.exp(log_sigma)
    mode, peak = _mode(data, sigma, inner)
    lower, upper = _tables(data, sigma, mode, peak=peak, box=inner)
    mass = lower.integral[:, :, -1] + upper.integral[:, :, -1]
    with np.errstate(divide="ignore"):
        log_weight = log_prior(log_sigma) + _of_sigma(data, log_sigma) + peak + np.log(mass)
    log_weight = log_weight + np.log(weights)
    best = log_weight.max(axis=1)[:, None]
    weight = np.exp(log_weight - np.where(np.isfinite(best), best, np.nan))
    return Slices(sigma, weight / weight.sum(axis=1)[:, None], lower, upper)


def _of_sigma(data: Evidence, log_sigma: Floats) -> Floats:
    """The part of the log-likelihood that holds sigma alone."""
    squares, m = data.squares[:, None], data.n_detected[:, None]
    return np.asarray(-m * log_sigma - 0.5 * squares * np.exp(-2.0 * log_sigma))


def _of_mu(data: Evidence, sigma: Floats, mu: Floats) -> Floats:
    """The part that holds mu too, (G, S, M) for mu (G, S, M) and sigma (G, S)."""
    u = mu / sigma[:, :, None]
    value = -0.5 * data.n_detected[:, None, None] * u * u
    for k in range(data.limits.shape[1]):
        r = (data.limits[:, k, None] / sigma)[:, :, None] - u
        value = value + data.counts[:, k, None, None] * log_ndtr(r)
    return np.asarray(value)


def _slope_of_mu(data: Evidence, sigma: Floats, mu: Floats) -> tuple[Floats, Floats]:
    """First and second derivative of `_of_mu` in u = mu/sigma, (G, S) for mu (G, S)."""
    u = mu / sigma
    m = data.n_detected[:, None]
    r = data.limits[:, None, :] / sigma[:, :, None] - u[:, :, None]
    _, slope = mills(r)
    pull = data.counts[:, None, :] * slope
    first = -m * u - pull.sum(axis=2)
    second = -m - (pull * (slope + r)).sum(axis=2)
    return first, second


def _mode(data: Evidence, sigma: Floats, box: Box) -> tuple[Floats, Floats]:
    """Mode of mu at each sigma inside the box, and `_of_mu` there.

    Newton from mu = 0, the mean of the detects: the slope is negative and concave there, so every
    step stays above the mode. Without a detect the mode is the lower bound.
    """
    mu = np.zeros_like(sigma)
    has_detect = data.n_detected[:, None] > 0
    if data.limits.shape[1]:
        for _ in range(MODE_STEPS):
            first, second = _slope_of_mu(data, sigma, mu)
            step = np.where(has_detect, first / np.where(has_detect, second, 1.0), 0.0)
            mu = mu - sigma * step
            if (np.abs(step) < MODE_NEAR).all():
                break
    mu = np.where(has_detect, np.clip(mu, box.low, box.high), box.low)
    return mu, _of_mu(data, sigma, mu[:, :, None])[:, :, 0]


def _trim(
    data: Evidence, log_prior: Callable[[Floats], Floats], *, span: Floats, box: Box
) -> Floats:
    """Narrow the span of ln sigma to what carries weight, judged at the mode of mu."""
    share = np.linspace(0.0, 1.0, COARSE_NODES)
    log_sigma = span[0][:, None] + (span[1] - span[0])[:, None] * share
    _, peak = _mode(data, np.exp(log_sigma), box)
    level = log_prior(log_sigma) + _of_sigma(data, log_sigma) + peak + log_sigma
    is_heavy = level > level.max(axis=1)[:, None] - WEIGHT_REACH
    first = np.maximum(is_heavy.argmax(axis=1) - 1, 0)
    last = COARSE_NODES - 1 - np.maximum(is_heavy[:, ::-1].argmax(axis=1) - 1, 0)
    row = np.arange(len(first))
    return np.stack([log_sigma[row, first], log_sigma[row, last]])


def _tables(
    data: Evidence, sigma: Floats, mode: Floats, *, peak: Floats, box: Box
) -> tuple[_Cubic, _Cubic]:
    ends = []
    for sign, edge in ((-1.0, box.low), (1.0, box.high)):
        reach = _reach(data, sigma, mode, peak=peak, sign=sign)
        end = mode + sign * reach
        ends.append(np.maximum(end, edge) if sign < 0 else np.minimum(end, edge))
    below = _table(data, sigma, ends[0], end=mode, peak=peak)
    above = _table(data, sigma, mode, end=ends[1], peak=peak)
    return below, above


def _reach(data: Evidence, sigma: Floats, mode: Floats, *, peak: Floats, sign: float) -> Floats:
    """How far from the mode the log density has fallen by LOG_REACH, by halving from outside."""
    detects = np.maximum(data.n_detected[:, None], 0.05)
    furthest = sigma * np.sqrt(2.0 * LOG_REACH / detects)
    if not data.limits.shape[1]:
        return np.asarray(furthest)
    # Without a detect the density falls only above the limits, from a mode far below them.
    no_detect = data.n_detected[:, None] == 0
    top = data.limits.max(axis=1)[:, None] + sigma * np.sqrt(2.0 * LOG_REACH) - mode
    outer = np.where(no_detect, np.maximum(top, 0.0), furthest)
    inner = np.zeros_like(outer)
    for _ in range(HALVINGS):
        middle = 0.5 * (inner + outer)
        fall = peak - _of_mu(data, sigma, (mode + sign * middle)[:, :, None])[:, :, 0]
        is_short = fall < LOG_REACH
        inner, outer = np.where(is_short, middle, inner), np.where(is_short, outer, middle)
        if (outer < 1.2 * inner).all():
            break
    return outer


def _table(data: Evidence, sigma: Floats, start: Floats, *, end: Floats, peak: Floats) -> _Cubic:
    """Density relative to the mode and its integral, corrected for the slopes at both ends."""
    step = np.maximum(end - start, 0.0) / MU_CELLS
    mu = start[:, :, None] + step[:, :, None] * np.arange(MU_CELLS + 1)
    density = np.exp(_of_mu(data, sigma, mu) - peak[:, :, None])
    width = step[:, :, None]
    # Fourth-order cell integrals from neighbours; one-sided cubics in the first and last cell.
    f = density
    middle = (-f[..., :-3] + 13.0 * f[..., 1:-2] + 13.0 * f[..., 2:-1] - f[..., 3:]) / 24.0
    first = (9.0 * f[..., :1] + 19.0 * f[..., 1:2] - 5.0 * f[..., 2:3] + f[..., 3:4]) / 24.0
    last = (9.0 * f[..., -1:] + 19.0 * f[..., -2:-1] - 5.0 * f[..., -3:-2] + f[..., -4:-3]) / 24.0
    cells = np.concatenate([first, middle, last], axis=2) * width
    integral = np.concatenate([np.zeros_like(cells[..., :1]), cells.cumsum(axis=2)], axis=2)
    return _Cubic(start, step, integral, density)
