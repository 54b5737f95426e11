"""The sturdiest design: the one of which most fabricated devices pass, within bounds.

The share of devices is a count, so it has no slope to follow. The box is sampled evenly, then ever
closer around the best places, half of the time along the way in which those lie. Few devices tell a
good place from a bad one, and many the best of the good ones, where nearly all of few would pass.
"""

from __future__ import annotations

from collections.abc import Generator, Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .design import Design
from .domain import InputError
from .sampling import whole_count
from .search import Found, nearest_steps
from .search.found import said_changes
from .search.space import Space, checked_bounds, make_space
from .yields import Yield, yield_of

Array = NDArray[np.float64]

#: Rounds: places, devices of each, and how far from the best one, in parts of the box (0: all of it).
ROUNDS = (
    (128, 128, 0.0),
    *((64, 128, reach) for reach in (0.25, 0.12, 0.06, 0.03)),
    *((32, 1024, reach) for reach in (0.12, 0.06, 0.03)),
)

#: Devices of one piece of work.
PIECE = 2048

#: The best places whose spread is followed, and how much wider than that it is looked.
BEST, WIDER = 12, 1.6

#: Places that are compared with all devices at last.
LAST = 8

#: Of designs of which nearly as many devices pass the nearer one is taken: a share for a slider's length.
NEARER = 0.002


def sturdiest(design: Design, bounds: Mapping[str, Any], count: int = 4096, seed: int = 0) -> Found:
    """The design within bounds of which most devices meet every requirement.

    design: with its scatter, correlation and requirements. bounds: input -> (low, high), SI: what may
    change. count, seed: devices of the last comparison, see `yield_of`. `value` of what is found is
    the share that passes; `met` whether the design itself meets everything. Of designs that do nearly
    equally well the nearer one (see NEARER). Where no device passes anywhere and no design meets
    everything, the compromise of `nearest_steps`. Raises InputError.
    """
    *_, last = sturdiest_steps(design, bounds, count, seed)
    return last


def sturdiest_steps(
    design: Design, bounds: Mapping[str, Any], count: int = 4096, seed: int = 0
) -> Iterator[Found]:
    """The same, the best so far after each piece of some ten milliseconds."""
    if not isinstance(design, Design):
        raise InputError("the sturdiest design is sought from a Design")
    if not design.requirements:
        raise InputError("the design requires nothing, so every device passes")
    whole_count(count)
    ends = checked_bounds(bounds)
    space = make_space(design.point, ends, [entry.quantity for entry in design.requirements])
    near = nearest_steps(design.point, design.requirements, ends)
    return _Climb(design, space, count, seed).steps(near)


@dataclass(eq=False)
class _Climb:
    """One search: what is sought, the best places so far, and the best design among them."""

    design: Design
    space: Space
    count: int
    seed: int
    #: What places are worth, and the places, best first.
    kept: list[tuple[float, Array]] = field(default_factory=list)
    top: float = -np.inf
    found: Found = field(init=False)

    @property
    def start(self) -> Array:
        """The place of the design, within the bounds."""
        return np.asarray(np.clip(self.space.start, 0.0, 1.0))

    def steps(self, near_steps: Iterator[Found]) -> Iterator[Found]:
        """The best so far, again and again. near_steps: the search for the nearest that meets all."""
        self._compare(self.start, 0)
        yield self.found
        if not self.space.names:
            return
        nearest = self.found
        for step in near_steps:
            nearest = step
            yield self.found
        near = self._place(nearest)
        self._compare(near, 0)
        for turn, (_, devices, _) in enumerate(ROUNDS):
            if (
                turn and devices != ROUNDS[turn - 1][1]
            ):  # few devices flatter the best of many places
                again = np.array([place for _, place in self.kept[:BEST]])
                self.kept.clear()
                yield from self._look(again, devices)
            yield from self._look(self._places(turn, (self.start, near)), devices)
            self._compare(self.kept[0][1], turn + 1)
            yield self.found
        for _, place in self.kept[1:LAST]:
            self._compare(place, len(ROUNDS))
            yield self.found
        if self.found.value == 0 and not nearest.met:
            yield replace(nearest, value=0.0, done=len(ROUNDS), starts=len(ROUNDS))

    def _look(self, places: Array, devices: int) -> Generator[Found, None, None]:
        """See what places (rows, n) are worth by so many devices, and remember the best."""
        for part in np.array_split(places, -(-len(places) * devices // PIECE)):
            worth = self._worth(part, self._yield(part, devices).share)
            self.kept += zip(worth.tolist(), part, strict=True)
            yield self.found
        self.kept.sort(key=lambda pair: -pair[0])
        del self.kept[2 * BEST :]

    def _places(self, turn: int, seeds: tuple[Array, Array]) -> Array:
        """Where to look: in the whole box at first, then around the best and the way they lie."""
        from scipy.special import ndtri
        from scipy.stats import qmc

        rows, _, reach = ROUNDS[turn]
        size = len(self.space.names)
        drawn = qmc.Sobol(size, scramble=True, rng=turn).random(rows)
        if not reach:
            return np.concatenate([drawn, np.array(seeds)])
        best = np.array([place for _, place in self.kept[:BEST]])
        around = best[0] + reach * (2 * drawn[::2] - 1)
        spread = np.atleast_2d(np.cov(best.T)) + np.eye(size) * (reach / 5) ** 2
        scores = ndtri(np.clip(drawn[1::2], 1e-6, 1 - 1e-6))
        along = best.mean(axis=0) + WIDER * scores @ np.linalg.cholesky(spread).T
        return np.asarray(np.clip(np.concatenate([around, along]), 0.0, 1.0))

    def _worth(self, places: Array, share: Any) -> Array:
        """Shares of devices at places, the nearer the better."""
        far = np.linalg.norm((places - self.start) * self.space.width, axis=1)
        return np.asarray(share - NEARER * far)

    def _compare(self, place: Array, done: int) -> None:
        """Take a place for the best if it is, by all devices."""
        drawn = self._yield(place[None], self.count)
        worth = float(self._worth(place[None], drawn.share)[0])
        if worth > self.top:
            self.top, self.found = worth, self._made(place, drawn)
        self.found = replace(self.found, done=done, starts=len(ROUNDS))

    def _yield(self, places: Array, count: int) -> Yield:
        """The devices that pass at places, arrays of shape (rows,)."""
        values, design = self.space.values(places), self.design
        entries = {name: values[:, at] for at, name in enumerate(self.space.names)}
        point = {**design.point, **self.space.settled, **entries}
        asked = (design.scatter, design.requirements)
        return yield_of(point, *asked, count, self.seed, design.correlation)

    def _place(self, found: Found) -> Array:
        """The place of a design that another search found."""
        before = zip(self.space.names, self.space.before, strict=True)
        values = [float(found.point.get(name, value)) for name, value in before]
        return np.asarray(np.clip(self.space.places(np.array([values]))[0], 0.0, 1.0))

    def _made(self, place: Array, drawn: Yield) -> Found:
        """A place as a design, with the devices that pass there in words."""
        point = self.space.point(place)
        changes, wanted = self.space.changes(point), self.design.requirements
        outcome = Design(point).outcome([entry.quantity for entry in wanted])
        met = all(bool(entry.met(outcome[entry.quantity])) for entry in wanted)
        said = f"{_hundred(drawn)} of 100 devices pass, the most found within these bounds"
        said += f", with {said_changes(changes)}." if changes else ", with nothing changed."
        share = float(np.ravel(drawn.share)[0])
        return Found(
            point, met, said, self.space.distance(point), changes, outcome, None, share, 0, 0
        )


def _hundred(drawn: Yield) -> str:
    """A share as so many of a hundred; that of all draws need not be all."""
    share, low, high = (
        100 * float(np.ravel(end)[0]) for end in (drawn.share, drawn.low, drawn.high)
    )
    if share > 99.9 and low < 100:
        return "Over 99.9"
    if share < 0.1 and high > 0:
        return "Under 0.1"
    return f"{share:.3g}"
