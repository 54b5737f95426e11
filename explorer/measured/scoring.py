"""Fisher scoring within limits: steps to the best fit, its covariance, and profiles.

The steps solve the score equations Jᵀ V⁻¹ (y − μ) = 0, which are those of maximum likelihood for
Poisson counts and of least squares for even noise, with Marquardt's damping.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from .noise import Array, Noise

NDArrayBool = NDArray[np.bool_]

#: Half the distance of the difference quotients, in steps of the parameters.
REACH = 1e-4

#: A step is the last where the deviance is expected to fall by less than this.
ENOUGH = 1e-9

#: Marquardt's damping at the start.
DAMPING = 1.0

#: Closer than this to a limit, in steps of a parameter, is at the limit.
TOUCH = 1e-7


@dataclass(frozen=True, eq=False)
class Problem:
    """A model in scaled parameters. low, high: limits, (k,). size: of even noise, squared."""

    model: Callable[[Array], Array]
    noise: Noise
    low: Array
    high: Array
    size: float = 1.0

    def objective(self, place: Array) -> float:
        """The deviance, over the squared size of even noise; ∞ outside the limits."""
        if np.any(place < self.low - TOUCH) or np.any(place > self.high + TOUCH):
            return math.inf
        try:
            value = self.noise.deviance(self.model(place)) / self.size
        except (OverflowError, ZeroDivisionError):  # so far out that the model has no number
            return math.inf
        return value if np.isfinite(value) else math.inf

    def slopes(self, place: Array, free: NDArrayBool) -> Array:
        """Derivatives of the model by its free parameters, (n, k); zeros for the others."""
        slopes = np.zeros((self.noise.values.size, place.size))
        for index in np.flatnonzero(free):
            slopes[:, index] = self._slope(place, int(index), REACH)
        return slopes

    def rough_slopes(self, place: Array, free: NDArrayBool, expected: Array) -> Array:
        """The same to one side only; expected: the model at the place."""
        slopes = np.zeros((self.noise.values.size, place.size))
        for index in np.flatnonzero(free):
            moved = place.copy()
            reach = REACH if place[index] + REACH <= self.high[index] else -REACH
            moved[index] += reach
            slopes[:, index] = (self.model(moved) - expected) / reach
        return slopes

    def fine_slopes(self, place: Array, free: NDArrayBool) -> Array:
        """The same with an error of the fourth order in the distance."""
        slopes = np.zeros((self.noise.values.size, place.size))
        for index in np.flatnonzero(free):
            near, far = (self._slope(place, int(index), reach) for reach in (5 * REACH, 10 * REACH))
            slopes[:, index] = (4 * near - far) / 3
        return slopes

    def _slope(self, place: Array, index: int, reach: float) -> Array:
        right, left = place.copy(), place.copy()
        right[index] = min(place[index] + reach, self.high[index])
        left[index] = max(place[index] - reach, self.low[index])
        distance = max(right[index] - left[index], 1e-300)
        return np.asarray((self.model(right) - self.model(left)) / distance)

    def touching(self, place: Array) -> NDArrayBool:
        """Which parameters lie at a limit."""
        return np.asarray((place - self.low < TOUCH) | (self.high - place < TOUCH))


def score_steps(
    problem: Problem,
    place: Array,
    free: NDArrayBool,
    *,
    damping: float = DAMPING,
    enough: float = ENOUGH,
    most: int = 200,
    care: int = 1,
) -> Generator[None, None, Array]:
    """From a place to the best fit of the free parameters, one yield a step; returns the place.

    damping: Marquardt's, to begin with; small where the place is near. enough: a step is the last
    where the deviance falls by less than this, or by what was foretold to this. most: steps. care:
    with which slopes are taken.
    """
    value = problem.objective(place)
    for _ in range(most):
        yield None
        equations = _equations(problem, place, free, care)
        gain, foretold = 0.0, 0.0
        for _ in range(24):
            step = _step(problem, place, free, equations, damping)
            trial = np.clip(place + step, problem.low, problem.high)
            moved = problem.objective(trial)
            if moved <= value:
                ahead = equations[0] @ step
                foretold = float(2 * ahead @ equations[1] - ahead @ ahead)
                gain, place, value = value - moved, trial, moved
                damping = max(damping / 5, 1e-12)
                break
            damping = min(3 * damping, 1e12)
        little = enough * (value / problem.noise.values.size if problem.noise.even else 1.0)
        if gain <= little or (damping < 1e-5 and abs(gain - foretold) <= little):
            break
    return place


def _equations(
    problem: Problem, place: Array, free: NDArrayBool, care: int = 1
) -> tuple[Array, Array]:
    """R and Qᵀr of the weighted slopes of all parameters and the weighted residuals.

    Columns of parameters that are not free are zero. Triangular, so that no digits are lost as they
    are in the normal equations. care: of the slopes, 0 to 2.
    """
    expected = problem.model(place)
    weight = 1 / np.sqrt(problem.noise.variance(expected) * problem.size)
    if care == 0:
        slopes = problem.rough_slopes(place, free, expected)
    else:
        slopes = (problem.slopes if care == 1 else problem.fine_slopes)(place, free)
    orthogonal, triangle = np.linalg.qr(weight[:, None] * slopes)
    return triangle, orthogonal.T @ (weight * (problem.noise.values - expected))


def _step(
    problem: Problem,
    place: Array,
    free: NDArrayBool,
    equations: tuple[Array, Array],
    damping: float,
) -> Array:
    """A damped step of the parameters that no limit stops."""
    triangle, push = equations
    score = triangle.T @ push
    below, above = place <= problem.low, place >= problem.high
    stopped = (below & (score < 0)) | (above & (score > 0))
    lengths = np.sqrt(np.sum(triangle**2, axis=0))
    lengths = np.maximum(lengths, 1e-8 * max(float(np.max(lengths)), 1e-150))
    step = np.zeros(place.size)
    for _ in range(place.size):
        moving = free & ~stopped
        step = np.zeros(place.size)
        if not moving.any():
            break
        rows = np.vstack([triangle[:, moving], np.diag(np.sqrt(damping) * lengths[moving])])
        right = np.concatenate([push, np.zeros(int(moving.sum()))])
        step[moving] = np.linalg.lstsq(rows, right, rcond=1e-14)[0]
        out = (below & (step < 0)) | (above & (step > 0))
        if not out.any():
            break
        stopped = stopped | out
    return step


def covariance(problem: Problem, place: Array, free: NDArrayBool) -> Array:
    """Inverse of the Fisher information of the free parameters, zeros elsewhere, (k, k)."""
    triangle, _ = _equations(problem, place, free, care=2)
    part = triangle[:, free]
    lengths = np.maximum(np.sqrt(np.sum(part**2, axis=0)), 1e-100)
    inverse = np.linalg.pinv(part / lengths, rcond=1e-11) / lengths[:, None]
    full = np.zeros((place.size, place.size))
    full[np.ix_(free, free)] = inverse @ inverse.T
    return full


def profile_end(
    problem: Problem, best: Array, index: int, direction: Array, rise: float, first: float
) -> Generator[None, None, tuple[float, bool]]:
    """Where the deviance, least over the other parameters, has risen by `rise`, on one side.

    direction: change of all parameters with this one along the profile, from the covariance, (k,).
    first: a guess of the distance, with its sign. Returns the place and whether it was found; the
    limit, and True, where the deviance rises by less up to there.
    """
    others = np.ones(best.size, dtype=bool)
    others[index] = False
    limit = float(problem.high[index] if first > 0 else problem.low[index])
    search = _Search(float(best[index]), first, limit, rise)
    base, start = problem.objective(best), best
    for _ in range(12):
        trial = search.trial()
        place = np.clip(start + direction * (trial - start[index]), problem.low, problem.high)
        place[index] = trial
        place = yield from score_steps(
            problem, place, others, damping=1e-6, enough=1e-4 * rise, most=10, care=0
        )
        if search.told(problem.objective(place) - base):
            return search.inside, True
        if trial == search.inside:
            start = place
    return search.inside, False


class _Search:
    """The search for where a profile has risen enough: the root of the rise is almost straight."""

    def __init__(self, best: float, first: float, limit: float, rise: float) -> None:
        self.best, self.step, self.limit, self.rise = best, first, limit, rise
        self.inside, self.low = best, 0.0
        self.outside, self.high = math.nan, math.nan
        self.last = best

    def trial(self) -> float:
        """The next place to look at."""
        if math.isnan(self.outside):
            reach = self.inside + self.step
            self.last = min(reach, self.limit) if self.step > 0 else max(reach, self.limit)
        else:
            part = (math.sqrt(self.rise) - self.low) / max(self.high - self.low, 1e-300)
            self.last = self.inside + min(max(part, 0.02), 0.98) * (self.outside - self.inside)
        return self.last

    def told(self, risen: float) -> bool:
        """Takes the rise at the last trial; whether `inside` is now the end."""
        root = math.sqrt(max(risen, 0.0))
        near = abs(risen - self.rise) < 1e-3 * self.rise
        if risen > self.rise and not near:
            self.outside, self.high = self.last, root
            return abs(self.outside - self.inside) < 1e-6 * abs(self.outside - self.best)
        if math.isnan(self.outside) and not near:
            # As far again as the root still has to rise, but not too far at once.
            ahead = (math.sqrt(self.rise) - root) / max(root - self.low, 1e-300)
            self.step *= min(max(1.02 * ahead, 0.02), 3.0)
        self.inside, self.low = self.last, root
        return near or self.inside == self.limit
