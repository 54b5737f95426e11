"""One start after the other goes down by sequential quadratic programming, slopes from differences.

An evaluation of a thousand designs costs little more than one of ten, so a place and the differences
around it are looked at together.
"""

from __future__ import annotations

from collections.abc import Callable, Generator, Iterator
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from .scale import Array
from .space import Space

#: Steps of the differences, in parts of the box.
LEVELS = (1e-5, 1e-7, 1e-9, 1e-11)

#: Rounding of an outcome.
NOISE = 1e-12

#: Evaluations between two pauses, and pauses after which a start is left where it is.
LEG, LEGS = 15, 3

#: Starts that came this close are one.
SAME = 1e-3

#: places (rows, n) in 0..1 -> what is to become small, then margins that are to be >= 0 (rows, 1 + m).
Outcome = Callable[[Array], Array]


class _EndError(Exception):
    """A start has used up its evaluations, or is where it was to go."""


@dataclass(eq=False)
class Descent:
    """The way down: least objective among places with margins >= 0, or the largest worst margin.

    The objective is what `outcome` gives, and ½ `weight` times the squared distance from the given
    point. little: gain of a step below which a start rests. loose: how much of a margin may be
    missing. ends: where starts have come to rest.
    """

    outcome: Outcome
    space: Space
    weight: float
    little: float
    loose: float
    ends: list[Array] = field(default_factory=list)

    def steps(self, place: Array) -> Iterator[None]:
        """A start (n,) goes down; where margins stay unmet, up to where they are met and down again."""
        end = yield from self._legs(place, climbs=False)
        if end.unmet > 0 and not end.joined:
            end = yield from self._legs(end.best, climbs=True)
            if end.unmet <= 0 and not end.joined:
                end = yield from self._legs(end.best, climbs=False)
        if not end.joined:
            self.ends.append(end.best)

    def _legs(self, place: Array, *, climbs: bool) -> Generator[None, None, Leg]:
        unmet, value = np.inf, np.inf
        for _ in range(LEGS):
            leg = Leg(self, place, climbs)
            rests = leg.run()
            yield
            gains = not climbs and leg.value < value - 100 * self.little
            if rests or not (leg.unmet < 0.99 * unmet or gains):
                break
            place, unmet, value = leg.best, leg.unmet, leg.value
        return leg

    def around(self, here: Array) -> tuple[Array, Array]:
        """Outcome (1 + m,) at a place (n,), and its slopes (1 + m, n) on the scales of the inputs."""
        space, size = self.space, len(here)
        h = np.maximum(np.array(LEVELS)[:, None], np.minimum(1e4 * space.grain, 0.25))
        moves = h[:, :, None] * np.eye(size)
        ahead, behind = np.minimum(here + moves, 1.0), np.maximum(here - moves, 0.0)
        found = self.outcome(np.concatenate([here[None], *ahead, *behind]))
        up, down = found[1:].reshape(2, len(h), size, -1)
        reach = np.sum(ahead - behind, axis=2)[:, :, None]
        slopes = trusted((up - down) / reach, reach) / space.width[:, None]
        offset = space.width * (here - space.start)
        found[0, 0] += 0.5 * self.weight * float(offset @ offset)
        slopes[:, 0] += self.weight * offset
        return found[0], slopes.T.copy()  # rows in one piece: SLSQP reads them as they lie


def trusted(slopes: Array, reach: Array) -> Array:
    """Of slopes (levels, n, f) over reaches (levels, n, 1) the coarsest that the next finer confirms."""
    coarse, finer = slopes[:-1], slopes[1:]
    size = np.maximum(np.abs(coarse), np.abs(finer))
    same = np.abs(coarse - finer) <= 0.1 * size + 10 * NOISE / reach[1:]
    good = np.concatenate([same, np.ones_like(same[:1])])
    return np.asarray(np.take_along_axis(slopes, np.argmax(good, axis=0)[None], axis=0)[0])


@dataclass(eq=False)
class Leg:
    """Some evaluations of one start from the place `best` (n,).

    climbs: towards the largest worst margin, as one unknown more, until all are met; else down.
    """

    descent: Descent
    best: Array
    climbs: bool
    unmet: float = np.inf
    value: float = np.inf
    left: int = LEG
    joined: bool = False
    known: bytes = b""
    seen: Array = field(init=False)
    slopes: Array = field(init=False)

    def run(self) -> bool:
        """Go on; whether the start has come to rest."""
        from scipy.optimize import minimize

        width = self.descent.space.width
        start: Any = self.best * width
        bounds = [(0.0, float(end)) for end in width]
        margins: Any = {"type": "ineq", "fun": self._margins, "jac": self._rises}
        try:
            self._look(start)
            if self.climbs:
                start, bounds = np.append(start, self.seen[1:].min()), [*bounds, (-np.inf, np.inf)]
            minimize(
                self._objective, start, jac=self._slope, method="SLSQP", bounds=bounds,
                constraints=margins, options={"ftol": self.descent.little},
            )  # fmt: skip
        except _EndError:
            return self.left > 0
        return True

    def _look(self, x: Array) -> None:
        """Outcome and slopes at x, once for all that SLSQP asks there."""
        descent, width = self.descent, self.descent.space.width
        here = np.clip(x[: len(width)] / width, 0.0, 1.0)
        if here.tobytes() == self.known:
            return
        if not self.left:
            raise _EndError
        self.left -= 1
        self.known = here.tobytes()
        self.seen, self.slopes = descent.around(here)
        unmet = max(-float(self.seen[1:].min(initial=0.0)) - descent.loose, 0.0)
        if (unmet, self.seen[0]) < (self.unmet, self.value):
            self.best, self.unmet, self.value = here, unmet, float(self.seen[0])
        self.joined = any(np.abs(here - end).max() < SAME for end in descent.ends)
        if self.joined or (self.climbs and unmet <= 0):
            raise _EndError

    def _objective(self, x: Array) -> float:
        self._look(x)
        return float(-x[-1] if self.climbs else self.seen[0])

    def _slope(self, x: Array) -> Array:
        self._look(x)
        return np.asarray(-np.eye(len(x))[-1] if self.climbs else self.slopes[0])

    def _margins(self, x: Array) -> Array:
        self._look(x)
        return np.asarray(self.seen[1:] - (x[-1] if self.climbs else 0.0))

    def _rises(self, x: Array) -> Array:
        self._look(x)
        count = len(self.slopes) - 1
        worst = np.full((count, len(x) - self.slopes.shape[1]), -1.0)
        return np.hstack([self.slopes[1:], worst])
