"""One fit for all kinds of measured data: maximum likelihood, and intervals from its profile.

Fisher scoring goes to the best fit, Migrad of Minuit (James & Roos, Comput. Phys. Commun. 10, 343
(1975)) confirms or betters it, and MINOS follows the likelihood of one parameter, the others at
their best, until it has fallen by what the level asks. Where MINOS gives up, profiles by scoring
take its place. Everything in slices, so that a page stays alive.
"""

from __future__ import annotations

import math
from collections import deque
from collections.abc import Callable, Generator, Iterator, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, TypeVar

import numpy as np

from ..built import Estimate
from ..domain import InputError, finite_number
from .data import DataError
from .minos import confirmed, interval, sigmas_of
from .noise import Array, Noise
from .scoring import ENOUGH, Problem, covariance, score_steps

Result = TypeVar("Result")

#: Once more intervals than this have an end that was not found, the others are not searched for.
MOST_UNSURE = 2


@dataclass(frozen=True)
class Parameter:
    """A number to fit. step: a change that matters, by which it is scaled; > 0."""

    name: str
    start: float
    step: float
    low: float = -math.inf
    high: float = math.inf


@dataclass(frozen=True, eq=False)
class Fit:
    """A best fit. values, errors (standard errors) in the order of the parameters, (k,).

    estimates: of the parameters that were asked for. expected: the model, (n,). deviance: or the sum
    of squares where the noise is even, of which `size` is then the standard deviation. at_limit:
    parameters that lie at a limit. unsure: those with an end of the interval that was not found.
    valid: whether Migrad confirms the minimum.
    """

    names: tuple[str, ...]
    values: Array
    errors: Array
    covariance: Array
    expected: Array
    deviance: float
    size: float
    estimates: dict[str, Estimate] = field(default_factory=dict)
    at_limit: frozenset[str] = frozenset()
    unsure: frozenset[str] = frozenset()
    valid: bool = True

    def __getitem__(self, name: str) -> float:
        return float(self.values[self.names.index(name)])

    def normal(self, name: str, level: float) -> Estimate:
        """A parameter with an interval from its standard error."""
        value, half = self[name], sigmas_of(level, None) * self.error(name)
        return Estimate(value, value - half, value + half)

    def error(self, name: str) -> float:
        """Standard error of a parameter."""
        return float(self.errors[self.names.index(name)])


def checked_level(level: Any) -> float:
    """A level of confidence, or InputError."""
    number = finite_number(level, "level")
    if not 0.5 <= number <= 0.9999:
        raise InputError(f"level = {number:g} is outside its range: from 0.5 to 0.9999")
    return number


def finish(steps: Iterator[Result | None]) -> Result:
    """What a fit in slices yields last."""
    last = deque(steps, maxlen=1).pop()
    assert last is not None
    return last


@dataclass(frozen=True, eq=False)
class _Scaled:
    """A problem in units of the steps of its parameters."""

    names: tuple[str, ...]
    origin: Array
    steps: Array
    limits: Array
    problem: Problem

    @classmethod
    def of(
        cls, model: Callable[[Array], Array], noise: Noise, parameters: Sequence[Parameter]
    ) -> _Scaled:
        if noise.values.size <= len(parameters):
            raise DataError(
                f"{noise.values.size} points are too few to fit {len(parameters)} numbers"
            )
        steps = np.array([one.step for one in parameters])
        origin = np.array([one.start for one in parameters])
        limits = np.array([(one.low, one.high) for one in parameters])
        low, high = (limits[:, 0] - origin) / steps, (limits[:, 1] - origin) / steps

        def within(place: Array) -> Array:
            """The model; rounding does not carry a parameter over its limit."""
            return model(np.clip(origin + steps * place, limits[:, 0], limits[:, 1]))

        problem = Problem(within, noise, low, high)
        return cls(tuple(one.name for one in parameters), origin, steps, limits, problem)

    def begun(self, most: int, rough: bool = False) -> Generator[None, None, Array]:
        """Scoring from where the parameters start; rough: until steps hardly matter."""
        problem, size = self.problem, len(self.names)
        place = np.clip(np.zeros(size), problem.low, problem.high)
        enough, care = (1.0, 0) if rough else (ENOUGH, 1)
        free = np.ones(size, dtype=bool)
        return (yield from score_steps(problem, place, free, most=most, enough=enough, care=care))

    def sized(self, place: Array) -> _Scaled:
        """The same with the size of even noise, as a place leaves it."""
        problem = self.problem
        if not problem.noise.even:
            return self
        values = problem.noise.values
        least = 1e-28 * float(np.mean(values**2)) + 1e-300
        squared = max(problem.objective(place) / (values.size - place.size), least)
        return replace(self, problem=replace(problem, size=squared))

    def estimate(self, index: int, place: Array, ends: tuple[float, float]) -> Estimate:
        """A value with its interval, unscaled."""
        three = self.origin[index] + self.steps[index] * np.array([ends[0], place[index], ends[1]])
        low, value, high = np.clip(three, *self.limits[index]).tolist()
        return Estimate(value, min(low, value), max(high, value))


def sketch_steps(
    model: Callable[[Array], Array], noise: Noise, parameters: Sequence[Parameter], most: int = 40
) -> Generator[None, None, tuple[Array, float]]:
    """A fit by a few steps of scoring alone, in slices; returns the parameters and the deviance."""
    scaled = _Scaled.of(model, noise, parameters)
    place = yield from scaled.begun(most, rough=True)
    values = scaled.origin + scaled.steps * place
    values = np.clip(values, scaled.limits[:, 0], scaled.limits[:, 1])
    return values, scaled.problem.objective(place)


def fit_steps(
    model: Callable[[Array], Array],
    noise: Noise,
    parameters: Sequence[Parameter],
    *,
    wanted: Sequence[str] = (),
    level: float = 0.95,
) -> Generator[None, None, Fit]:
    """A best fit in slices; returns it.

    model: parameters (k,) -> expected values (n,). wanted: parameters that get an interval. Raises
    DataError where there are no more points than parameters.
    """
    scaled = _Scaled.of(model, noise, parameters)
    place = yield from scaled.begun(200)
    scaled = scaled.sized(place)
    problem, names, steps = scaled.problem, scaled.names, scaled.steps
    minuit, place, valid = yield from confirmed(problem, place, names)
    touching = problem.touching(place)
    spread = covariance(problem, place, ~touching)
    expected = problem.model(place)
    deviance, degrees = noise.deviance(expected), noise.values.size - len(names)
    sigmas = sigmas_of(level, degrees if noise.even else None)
    estimates: dict[str, Estimate] = {}
    unsure: set[str] = set()
    for name in wanted:
        index = names.index(name)
        if len(unsure) > MOST_UNSURE:  # nothing is determined: do not search for ever
            half = sigmas * math.sqrt(spread[index, index])
            ends, sure = (place[index] - half, place[index] + half), False
        else:
            ends, sure = yield from interval(problem, minuit, place, index, sigmas, spread)
        estimates[name] = scaled.estimate(index, place, ends)
        if not sure:
            unsure.add(name)
    return Fit(
        names,
        np.clip(scaled.origin + steps * place, scaled.limits[:, 0], scaled.limits[:, 1]),
        steps * np.sqrt(np.diag(spread)),
        spread * np.outer(steps, steps),
        expected,
        deviance,
        math.sqrt(deviance / degrees) if noise.even else 1.0,
        estimates,
        frozenset(name for name, touch in zip(names, touching, strict=True) if touch),
        frozenset(unsure),
        valid,
    )
