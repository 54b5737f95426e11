"""A given angular pattern: power inside an angle, its angles, its overlap with a fibre.

Powers are over the largest one. Linear between the given angles, constant below the first, zero
above the last. One pattern a point, so arrays here are of apertures and fibres, not of patterns.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..whole import Pattern
from .quadrature import legendre

#: Most pieces of a pattern that a fibre overlap follows; finer ones are sampled at as many.
PIECES = 720


@lru_cache(maxsize=32)
def _pieces(
    pattern: Pattern,
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Angles from 0, powers over the largest, and the power inside each angle."""
    angles, powers = pattern.angles, pattern.powers / pattern.powers.max()
    if angles[0] > 0:
        angles, powers = np.r_[0.0, angles], np.r_[powers[0], powers]
    inside = np.r_[0.0, np.cumsum(_piece(angles[:-1], angles[1:], angles, powers))]
    return angles, powers, inside


def _piece(low: Any, high: Any, angles: Any, powers: Any) -> Any:
    """∫ power sin θ dθ between angles that lie within one piece each."""
    nodes, weights = legendre(10)
    theta = low[..., None] + (high - low)[..., None] * nodes
    values = np.interp(theta, angles, powers, right=0.0) * np.sin(theta)
    return (values * weights).sum(axis=-1) * (high - low)


def power_inside(pattern: Pattern, sine: Any) -> Any:
    """∫ power sin θ dθ from the axis to the angle with this sine; arrays of sines allowed."""
    angles, powers, inside = _pieces(pattern)
    theta = np.minimum(np.arcsin(np.asarray(sine, dtype=float)), angles[-1])
    index = np.clip(np.searchsorted(angles, theta, side="right") - 1, 0, angles.size - 2)
    return inside[index] + _piece(angles[index], theta, angles, powers)


def outermost_angle(pattern: Pattern, level: float) -> float:
    """The outermost angle [rad] at which the power reaches `level` of the largest."""
    angles, powers, _ = _pieces(pattern)
    last = int(np.flatnonzero(powers >= level)[-1])
    if last == angles.size - 1:
        return float(angles[-1])
    share = (powers[last] - level) / (powers[last] - powers[last + 1])
    return float(angles[last] + share * (angles[last + 1] - angles[last]))


@lru_cache(maxsize=32)
def _pupil(pattern: Pattern, sine: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """sin² of the nodes inside the aperture, and amplitude times weight at each.

    The variable c = √cos θ keeps the integrand smooth up to grazing angles.
    """
    angles, powers, _ = _pieces(pattern)
    edge = min(float(np.arcsin(sine)), float(angles[-1]))
    cuts = np.unique(np.r_[angles[angles < edge], edge, np.linspace(0, edge, 25)])
    if cuts.size > PIECES:
        cuts = np.linspace(0, edge, PIECES)
    c = np.sqrt(np.cos(cuts))
    nodes, weights = legendre(8)
    inner = (c[:-1, None] + np.diff(c)[:, None] * nodes).ravel()
    weight = (-np.diff(c)[:, None] * weights).ravel()
    sine2 = 1 - inner**4
    power = np.interp(np.arccos(np.clip(inner**2, 0, 1)), angles, powers, right=0.0)
    return sine2, np.sqrt(power) * 2 * inner**2 * weight


def pupil_overlap(pattern: Pattern, b2: Any, sine: Any, tilt: Any) -> Any:
    """4 b2 [∫ √P e^{−b2 t²} (1−t²)^{−1/4} J0(tilt·t) t dt]², broadcasting over the fibre's numbers."""
    from scipy.special import j0

    b2, sine, tilt = np.broadcast_arrays(b2, sine, tilt)
    result = np.empty(b2.shape)
    for index in np.ndindex(b2.shape):
        sine2, amplitude = _pupil(pattern, float(sine[index]))
        field = amplitude * np.exp(-b2[index] * sine2) * j0(tilt[index] * np.sqrt(sine2))
        result[index] = 4 * b2[index] * field.sum() ** 2
    return result[()]


def best_match(pattern: Pattern, sine: Any) -> Any:
    """b2 of the fibre that takes most of a pattern without an offset; arrays of sines allowed."""
    sines = np.asarray(sine, dtype=float)
    found = {value: _best_single(pattern, value) for value in map(float, np.unique(sines))}
    return np.vectorize(found.__getitem__, otypes=[float])(sines)[()]


@lru_cache(maxsize=64)
def _best_single(pattern: Pattern, sine: float) -> float:
    from scipy.optimize import minimize_scalar

    sine2, amplitude = _pupil(pattern, sine)

    def loss(logarithm: float) -> float:
        b2 = np.exp(logarithm)
        return -float(np.log(b2) + 2 * np.log((amplitude * np.exp(-b2 * sine2)).sum()))

    grid = np.linspace(np.log(0.05 / sine**2), np.log(1e6 / sine**2), 200)
    start = int(np.argmin([loss(value) for value in grid]))
    bounds = (grid[max(start - 1, 0)], grid[min(start + 1, grid.size - 1)])
    return float(np.exp(minimize_scalar(loss, bounds=bounds, method="bounded").x))
