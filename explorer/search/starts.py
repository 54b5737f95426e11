"""Where the descents of a search start: an even sample of the box, and the best of it."""

from __future__ import annotations

from collections.abc import Iterator
from functools import lru_cache
from itertools import product

import numpy as np

from .scale import Array
from .space import Space
from .task import Task

SEED = 20011

#: Places in one evaluation.
CHUNK = 128

#: Starts lie at least this far apart in the box, on one axis at least.
APART = 0.12

#: Most bounded inputs of which all corners are tried.
CORNERS = 6


@lru_cache(maxsize=32)
def even(count: int, columns: int, seed: int = SEED) -> Array:
    """A scrambled Sobol sequence, (count, columns); count: a power of two."""
    from scipy.stats import qmc

    drawn = np.asarray(qmc.Sobol(columns, scramble=True, rng=seed).random(count))
    drawn.setflags(write=False)
    return drawn


def sample(space: Space) -> Array:
    """Places to look at first: near the given point and all over the box, (rows, n)."""
    size = len(space.names)
    home = np.clip(space.start, 0.0, 1.0)
    count = 1024 if size <= 2 else 2048
    drawn = even(count, size + 1)
    # Every other one lies nearer to the given point, by up to a thousand times.
    shrink = np.where(np.arange(count) % 2 == 0, 1.0, 10 ** (-3 * drawn[:, -1]))
    spread = home + (drawn[:, :-1] - home) * shrink[:, None]
    # Half of both with the inputs that follow others where they would be unless given.
    half = np.arange(count) % 4 < 2
    spread = np.where(half[:, None], spread, space.following(spread))
    lines = np.tile(home, (size * 33, 1))
    for at in range(size):
        lines[at * 33 : (at + 1) * 33, at] = np.linspace(0, 1, 33)
    corners = np.array(list(product((0.0, 1.0), repeat=size))) if size <= CORNERS else lines[:0]
    first = np.stack([home, space.following(home[None])[0]])
    return np.concatenate([first, space.following(lines), lines, corners, spread])


def screen(task: Task, places: Array) -> Iterator[None]:
    """Look at places, some at a time."""
    for at in range(0, len(places), CHUNK):
        task.look(places[at : at + CHUNK])
        yield


def chosen(task: Task, count: int, goal: int = 0) -> Array:
    """Starts for a descent (k, n): the best designs, the least unmet, and some between; spread out."""
    seen = task.everything()
    objective = task.objective(seen, goal)
    unmet = np.maximum(-seen.worst, 0.0)
    rankings = [
        np.where(seen.met, objective, np.inf),
        np.where(seen.met, np.inf, unmet + 1e-6 * objective),
        np.where(seen.met, np.inf, objective + 0.3 * unmet),
        unmet,
    ]
    # The given point within the bounds, the same with what follows others, and the best known.
    leading = rankings[0] if task.best else unmet
    picked = list(dict.fromkeys([0, 1, int(np.argmin(leading))]))
    for share, ranking in zip((0.45, 0.8, 1.0, 1.0), rankings, strict=True):
        order = np.argsort(ranking, kind="stable")
        for at in order[np.isfinite(ranking[order])][:1024]:
            if len(picked) >= round(share * (count - 2)) + 2:
                break
            if np.abs(seen.places[picked] - seen.places[at]).max(axis=1).min() > APART:
                picked.append(int(at))
    return np.array(seen.places[picked])


def around(places: Array, count: int, nearest: float = 1e-6, furthest: float = 1.0) -> Array:
    """Places near those given, at distances between two parts of the box."""
    size = places.shape[1]
    drawn = even(count, size + 1, SEED + 1)
    reach = furthest * (nearest / furthest) ** drawn[:, -1]
    centre = places[np.arange(count) % len(places)]
    return np.clip(centre + (2 * drawn[:, :-1] - 1) * reach[:, None], 0.0, 1.0)
