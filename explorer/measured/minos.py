"""Migrad confirms a best fit, MINOS gives intervals; profiles by scoring where MINOS gives up."""

from __future__ import annotations

import math
from collections.abc import Generator
from typing import Any

import numpy as np

from .noise import Array
from .scoring import Problem, covariance, profile_end, score_steps

#: Model evaluations of one slice of Migrad; fewer where there are many points.
SLICE = 150

#: MINOS runs at a stretch; where points times the square of the parameters exceed this, profiles by scoring, which can
#: be had in slices, take its place.
MINOS_WORK = 30_000

#: A limit further off than this, in steps, is kept from Minuit, whose transformation loses digits there.
DISTANT = 200.0


def sigmas_of(level: float, degrees: int | None) -> float:
    """Half the width of an interval in standard errors: normal, or Student's where noise is even."""
    from scipy import special

    if degrees is None:
        return float(special.ndtri((1 + level) / 2))
    return float(special.stdtrit(degrees, (1 + level) / 2))


def confirmed(
    problem: Problem, place: Array, names: tuple[str, ...]
) -> Generator[None, None, tuple[Any, Array, bool]]:
    """Migrad from where scoring came to rest, in slices, then scoring again for the last digits."""
    from iminuit import Minuit

    minuit = Minuit(lambda place: min(problem.objective(place), 1e30), place, name=names)
    free = np.ones(place.size, dtype=bool)
    minuit.errordef, minuit.strategy, minuit.print_level = 1.0, 1, 0
    minuit.limits = [
        (None if low < -DISTANT else low, None if high > DISTANT else high)
        for low, high in zip(problem.low, problem.high, strict=True)
    ]
    error = np.sqrt(np.diag(covariance(problem, place, free & ~problem.touching(place))))
    minuit.errors = np.clip(np.where(error > 0, error, 0.1), 1e-6, 10.0)
    calls = max(SLICE, 600_000 // problem.noise.values.size)
    for turn in range(10):
        yield None
        minuit.migrad(ncall=calls * 2 ** max(0, turn - 4), iterate=1)
        if minuit.fmin is None or not minuit.fmin.has_reached_call_limit:
            break
    found = np.clip(np.array(minuit.values), problem.low, problem.high)
    better = problem.objective(found) < problem.objective(place) - 1e-9
    best = yield from score_steps(problem, found if better else place, free, damping=1e-6, most=20)
    return minuit, best, bool(minuit.valid)


def interval(
    problem: Problem, minuit: Any, place: Array, index: int, sigmas: float, spread: Array
) -> Generator[None, None, tuple[tuple[float, float], bool]]:
    """Both ends of the interval of one parameter, scaled, and whether both are sure.

    spread: scaled covariance, (k, k).
    """
    yield None
    work = problem.noise.values.size * place.size**2
    if minuit.valid and work <= MINOS_WORK and not problem.touching(place).any():
        from scipy import special

        asked = sigmas if sigmas >= 1 else float(special.chdtr(1, sigmas**2))
        minuit.minos(minuit.parameters[index], cl=asked)
        merror = minuit.merrors[minuit.parameters[index]]
        if merror.is_valid:
            middle = minuit.values[index]
            return (middle + merror.lower, middle + merror.upper), True
    ends, sure = [], True
    variance = spread[index, index]
    guess = min(max(math.sqrt(variance), 1e-6), 1e3) if variance > 0 else 0.1
    direction = spread[index] / variance if variance > 0 else np.zeros(place.size)
    for sign in (-1.0, 1.0):
        end, found = yield from profile_end(
            problem, place, index, direction, sigmas**2, sign * sigmas * guess
        )
        ends.append(end)
        sure = sure and found
    return (ends[0], ends[1]), sure
