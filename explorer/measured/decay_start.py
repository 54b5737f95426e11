"""Where to start the fit of a decay: the tail, the alignment of a response, lifetimes to begin with."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from .noise import Array

#: A bin that the peak and the rise are read from holds at least this many counts, if there are such.
CLEAR = 100.0

#: Lifetimes that are tried first.
TRIES = 16


def coarse(counts: Array) -> tuple[int, Array]:
    """Counts in bins joined until the fullest is clear: how many were joined, and the joined ones."""
    joined, many = counts, 1
    while joined.size > 16 and np.max(joined) < min(CLEAR, np.sum(counts) / 8):
        many *= 2
        joined = np.add.reduceat(counts, np.arange(0, counts.size, many))
    return many, joined


def rise_and_peak(counts: Array) -> tuple[float, float]:
    """Where the counts pass half of their maximum, and where the maximum is; in bins."""
    many, joined = coarse(counts)
    peak = int(np.argmax(joined))
    low = float(np.min(joined[: peak + 1]))
    half = low + (float(joined[peak]) - low) / 2
    before = np.flatnonzero(joined[: peak + 1] < half)
    edge = int(before[-1]) + 1 if before.size else 0
    lower = float(joined[edge - 1]) if edge else 0.0
    part = (half - lower) / max(float(joined[edge]) - lower, 1e-300) if edge else 0.0
    return (edge - 0.5 + part) * many, (peak + 0.5) * many


def tail_start(counts: Array) -> int:
    """First bin past the rise: as far after the peak as the peak is after half of the rise.

    The fullest bin itself is left out, since it was chosen for being so.
    """
    many, joined = coarse(counts)
    edge, peak = rise_and_peak(counts)
    after = int(np.ceil((peak + max(peak - edge, 0.0)) / many - 1e-9))
    return min(max(after, int(np.argmax(joined)) + 1) * many, counts.size)


@dataclass(frozen=True)
class Start:
    """A first guess. lifetimes [s], events of each, counts of the background per bin, shift in bins."""

    lifetimes: tuple[float, ...]
    events: tuple[float, ...]
    background: float
    shift: float = 0.0
    misfit: float = 0.0


def best_start(
    bins: Callable[[float, float], Array],
    counts: Array,
    lifetimes: Array,
    shifts: Array,
    components: int,
) -> Start:
    """The best of a table of lifetimes and shifts, events and background by least squares.

    bins: (lifetime, shift) -> shares of the events in the fitted bins. Weights are those of the
    counts, at least 1.
    """
    from scipy.optimize import nnls

    weight = 1 / np.sqrt(np.maximum(counts, 1.0))
    found: list[Start] = []
    for shift in shifts:
        columns = [bins(float(one), float(shift)) for one in lifetimes] + [np.ones(counts.size)]
        matrix = np.stack(columns, axis=1) * weight[:, None]
        stacked = np.column_stack([matrix, counts * weight])
        triangle: Array = np.asarray(np.linalg.qr(stacked, mode="r"))
        for first in range(len(lifetimes)):
            for second in range(first) if components == 2 else (first,):
                use = [*sorted({first, second}, reverse=True), len(lifetimes)]
                height, misfit = nnls(triangle[:, use], triangle[:, -1])
                chosen = tuple(float(lifetimes[one]) for one in use[:-1])
                events = tuple(float(one) for one in height[:-1])
                found.append(Start(chosen, events, float(height[-1]), float(shift), float(misfit)))
    return min(found, key=lambda one: one.misfit)
