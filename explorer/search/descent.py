"""Many starts go down at once: sequential quadratic steps, every trial of a round in one evaluation.

An evaluation of a thousand designs costs little more than one of ten. So slopes and curvatures come
from differences, each start tries steps of several lengths at a time, and takes the best of them.
"""

from __future__ import annotations

from collections.abc import Callable, Generator, Iterator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from .differences import COARSE, differences, pattern, probes, resolved
from .step import Array, root_inverse
from .trials import Trials

#: Reach of the first round, and the finest worth a trial, in parts of the box.
FIRST, FINEST = 0.25, 1e-13

#: Rounds after which a start is left where it is.
ROUNDS = 40

#: A start rests when its step is below this part of the box, or its gain below this part of its merit.
STILL, LITTLE = 1e-8, 1e-9

#: Starts that go for the same and came this close are one.
SAME = 1e-4

#: Places in one evaluation, and starts whose steps are worked out between two pauses.
CHUNK, FEW = 128, 8

#: places (rows, n) in 0..1, problem of each row -> objective and margins (rows, 1 + m), all numbers.
Outcome = Callable[[Array, NDArray[np.int64]], Array]


@dataclass(eq=False)
class Descent:
    """Starts on their way down: least objective among those with margins >= 0, else least unmet.

    outcome: see `Outcome`. places: (k, n). problem: of each start, handed on to `outcome`. target,
    pull: the objective has beside what `outcome` gives ½ Σ pull (place − target)². grain: finest step
    of a place (n,).
    """

    outcome: Outcome
    places: Array
    problem: NDArray[np.int64]
    target: Array
    pull: Array
    grain: Array
    #: Objective and margins of each start, and how hard each margin pressed on its last step.
    seen: Array = field(init=False)
    pressure: Array = field(init=False)
    #: How far the last round got, with the same reach on every axis and with that of its scale.
    reach: Array = field(init=False)
    #: Over what length each axis is taken as straight, and whether that is in doubt.
    fine: Array = field(init=False)
    doubt: NDArray[np.bool_] = field(init=False)
    going: NDArray[np.bool_] = field(init=False)

    def __post_init__(self) -> None:
        count = len(self.places)
        self.reach = np.full((count, 2), FIRST)
        self.fine = np.full(self.places.shape, COARSE)
        self.doubt, self.going = np.zeros(count, dtype=bool), np.ones(count, dtype=bool)

    def steps(self) -> Iterator[None]:
        """Rounds, a pause after each evaluation."""
        self.seen = self._full(self.places, (yield from self._ask(self.places, self.problem)))
        self.pressure = np.zeros((len(self.places), self.seen.shape[1] - 1))
        for _ in range(ROUNDS):
            if np.any(self.going & self.doubt):
                yield from self._probe(np.flatnonzero(self.going & self.doubt))
            who = np.flatnonzero(self.going)
            if not who.size:
                return
            yield from self._round(who)
            self._join()

    def _ask(self, places: Array, problem: NDArray[np.int64]) -> Generator[None, None, Array]:
        """The outcome at places, some at a time with a pause after each."""
        found = []
        for at in range(0, len(places), CHUNK):
            found.append(self.outcome(places[at : at + CHUNK], problem[at : at + CHUNK]))
            yield
        return np.concatenate(found)

    def _full(self, places: Array, found: Array) -> Array:
        """The outcome with the pull in the objective."""
        full = np.array(found)
        full[:, 0] += 0.5 * np.sum(self.pull * (places - self.target) ** 2, axis=-1)
        return full

    def _around(self, who: NDArray[np.int64], offsets: Array) -> Generator[None, None, Array]:
        """The outcome, without the pull, at offsets (k, p, n) from starts: (k, p, 1 + m)."""
        places = self.places[who][:, None, :] + offsets
        problem = np.repeat(self.problem[who], offsets.shape[1])
        found = yield from self._ask(places.reshape(-1, places.shape[2]), problem)
        return found.reshape(*offsets.shape[:2], -1)

    def _probe(self, who: NDArray[np.int64]) -> Iterator[None]:
        """Find over what length each axis is a parabola, where a round came to nothing."""
        offsets = probes(self.places[who], self.grain)
        fine = resolved((yield from self._around(who, offsets)), self.grain)
        changed = np.any(fine != self.fine[who], axis=1)
        self.fine[who] = fine
        self.reach[who[changed]] = FIRST
        self.doubt[who] = False

    def _model(self, who: NDArray[np.int64]) -> Generator[None, None, tuple[Array, Array]]:
        """Slopes (k, 1 + m, n) and B^(-1/2) (k, n, n) of starts: what a step is worked out from."""
        here, fine = self.places[who], self.fine[who]
        # One step for all that are fine: along a narrow valley the errors of two axes then cancel.
        h = np.where(fine < COARSE, fine.min(axis=1, keepdims=True), fine)
        h = np.maximum(h, np.minimum(1e4 * self.grain, 0.25))
        middle = np.clip(here, h, 1 - h) - here
        offsets = middle[:, None, :] + h[:, None, :] * pattern(here.shape[1])
        found = yield from self._around(who, offsets)
        slopes, curvature = differences(found, h, middle)
        slopes[:, 0] += self.pull * (here - self.target)
        curvature[:, 0] += np.diag(self.pull)
        pressed = np.einsum("km,kmij->kij", self.pressure[who], curvature[:, 1:])
        return slopes, root_inverse(curvature[:, 0] - pressed)

    def _round(self, who: NDArray[np.int64]) -> Iterator[None]:
        """Try steps of several reaches from each start; take the best that is better."""
        slopes, roots = yield from self._model(who)
        scale = self.fine / COARSE
        trials = []
        for row, at in enumerate(who):
            model = slopes[row], roots[row], self.reach[at], scale[at]
            trials.append(Trials(self.places[at], self.seen[at], *model).filled())
            if row % FEW == FEW - 1:
                yield
        yield from self._try(who, trials)
        bent = [row for row, entry in enumerate(trials) if entry.bent()]
        seconds = []
        for row in bent:
            seconds.append(trials[row].corrected())
            if len(seconds) % FEW == 0:
                yield
        yield from self._try(who[bent], seconds)
        for at, entry in zip(who, trials, strict=True):
            self._take(at, entry)

    def _try(self, who: NDArray[np.int64], trials: list[Trials]) -> Iterator[None]:
        """Evaluate the trials of several starts together."""
        counts = [len(entry.tries) for entry in trials]
        if sum(counts):
            places = np.concatenate([entry.places() for entry in trials])
            problem = np.repeat(self.problem[who], counts)
            found = self._full(places, (yield from self._ask(places, problem)))
            parts = np.split(found, np.cumsum(counts)[:-1])
            for entry, rows in zip(trials, parts, strict=True):
                entry.found = rows

    def _take(self, at: int, entry: Trials) -> None:
        """Go on from the best trial, or look closer."""
        best, before = entry.best(), float(entry.merit(self.seen[at]))
        if best is None:
            hopeless = not entry.hope() or self.reach[at].max() < FINEST
            self.going[at] = not hopeless
            self.doubt[at] = True
            self.reach[at] /= 512
            return
        self.places[at], self.seen[at], taken = best
        # What a step could not meet presses with all its weight, which says nothing once it is met.
        stale = taken.step.unmet > 1e-6 and self.seen[at, 1:].min(initial=0.0) >= 0
        self.pressure[at] = 0.0 if stale else taken.step.pressure
        self.doubt[at] = taken.reach < self.reach[at, taken.family] / 2
        self.reach[at, taken.family] = taken.reach
        still = STILL * float(self.fine[at].max()) / COARSE
        gain = before - float(entry.merit(self.seen[at]))
        self.going[at] = float(np.abs(taken.step.move).max()) > still and gain > LITTLE * abs(
            before
        )

    def _join(self) -> None:
        """Of starts that came together the lower one goes on."""
        unmet = np.maximum(-self.seen[:, 1:].min(axis=1, initial=0.0), 0.0)
        order = np.lexsort((self.seen[:, 0], unmet))
        for rank, at in enumerate(order):
            ahead = [other for other in order[:rank] if self.problem[other] == self.problem[at]]
            if self.going[at] and ahead:
                gap = np.abs(self.places[ahead] - self.places[at]).max(axis=1).min()
                self.going[at] = gap >= SAME
