"""The sturdiest design: the one of which most fabricated devices pass, within bounds.

The share of devices is a count, so it has no slope to follow. The box is sampled evenly, then ever
closer around the best place; the last few are compared with many devices each.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import replace
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

#: Places of one round, devices of each, and rounds, each half as wide as the one before.
PLACES, DEVICES, ROUNDS = 128, 256, 9

#: Pieces of a round, so that none takes long.
PIECES = 8

#: Places that are compared with many devices at last.
LAST = 8

#: Of designs of which as many devices pass the nearer one is taken: a share for a whole box apart.
NEARER = 0.01


def sturdiest(design: Design, bounds: Mapping[str, Any], count: int = 4096, seed: int = 0) -> Found:
    """The design within bounds of which most devices meet every requirement.

    design: with its scatter, correlation and requirements. bounds: input -> (low, high), SI: what may
    change. count, seed: devices of the last comparison, see `yield_of`. `value` of what is found is
    the share that passes; `met` whether the design itself meets everything. Of designs that do
    equally well the nearer one. Raises InputError.
    """
    *_, last = sturdiest_steps(design, bounds, count, seed)
    return last


def sturdiest_steps(
    design: Design, bounds: Mapping[str, Any], count: int = 4096, seed: int = 0
) -> Iterator[Found]:
    """The same, the best so far after each piece of some ten milliseconds."""
    if not design.requirements:
        raise InputError("the design requires nothing, so every device passes")
    whole_count(count)
    ends = checked_bounds(bounds)
    space = make_space(design.point, ends, [entry.quantity for entry in design.requirements])
    return _steps(design, space, ends, count, seed)


def _steps(
    design: Design, space: Space, bounds: Mapping[str, Any], count: int, seed: int
) -> Iterator[Found]:
    start = np.clip(space.start, 0.0, 1.0)
    found = _found(design, space, start, _yield(design, space, start[None], count, seed), 0, 0)
    if not space.names:
        yield found
        return
    near = start
    for step in nearest_steps(design.point, design.requirements, bounds):
        yield found
        near = np.clip(_place(space, step), 0.0, 1.0)
    kept: list[tuple[float, Array]] = []
    for turn, places in enumerate(_rounds(space, (start, near), kept)):
        parts = []
        for part in np.array_split(places, PIECES):
            parts.append(_yield(design, space, part, DEVICES, seed).share)
            yield replace(found, done=turn, starts=ROUNDS)
        drawn = np.concatenate(parts)
        worth = drawn - NEARER * np.linalg.norm((places - start) * space.width, axis=1)
        kept += list(zip(worth.tolist(), places, strict=True))
        kept.sort(key=lambda pair: -pair[0])
        del kept[LAST:]
    last = np.array([start, *(place for _, place in kept)])
    shares = []
    for place in last:
        shares.append(_yield(design, space, place[None], count, seed))
        yield replace(found, done=ROUNDS, starts=ROUNDS)
    far = np.linalg.norm((last - start) * space.width, axis=1)
    best = int(np.argmax([float(one.share[0]) for one in shares] - NEARER * far))
    yield _found(design, space, last[best], shares[best], ROUNDS, ROUNDS)


def _rounds(
    space: Space, seeds: tuple[Array, Array], kept: list[tuple[float, Array]]
) -> Iterator[Array]:
    """Places to look at, (PLACES, n): first the whole box, then ever closer around the best."""
    from scipy.stats import qmc

    size = len(space.names)
    for turn in range(ROUNDS):
        drawn = qmc.Sobol(size, scramble=True, rng=turn).random(PLACES)
        if turn == 0:
            yield np.concatenate([drawn, np.array(seeds)])
            continue
        best = kept[0][1]
        reach = 0.5**turn
        yield np.clip(best + reach * (2 * drawn - 1), 0.0, 1.0)


def _yield(design: Design, space: Space, places: Array, count: int, seed: int) -> Yield:
    """The devices that pass at places, arrays of shape (rows,)."""
    values = space.values(places)
    entries = {name: values[:, at] for at, name in enumerate(space.names)}
    point = {**design.point, **space.settled, **entries}
    asked = (design.scatter, design.requirements)
    return yield_of(point, *asked, count, seed, design.correlation)


def _place(space: Space, found: Found) -> Array:
    """The place of a design that another search found."""
    values = [
        float(found.point.get(name, before))
        for name, before in zip(space.names, space.before, strict=True)
    ]
    return np.asarray(space.places(np.array([values]))[0])


def _found(
    design: Design, space: Space, place: Array, drawn: Yield, done: int, starts: int
) -> Found:
    """A place as a design, with the devices that pass there in words."""
    point = space.point(place)
    changes = space.changes(point)
    here = Design(point)
    outcome = here.outcome([entry.quantity for entry in design.requirements])
    met = all(bool(entry.met(outcome[entry.quantity])) for entry in design.requirements)
    share = float(np.ravel(drawn.share)[0])
    said = f"{100 * share:.3g} of 100 devices pass, the most within these bounds"
    said += f", with {said_changes(changes)}." if changes else ", with nothing changed."
    return Found(
        point, met, said, space.distance(point), changes, outcome, None, share, done, starts
    )
