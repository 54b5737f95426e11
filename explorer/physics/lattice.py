"""Smooth functions on an even lattice, and what lies between its points.

A polynomial through the eight nearest points is followed, so a function that is analytic within r of
the real axis is right to about 40 (h/r)^8 of what it changes by over r, for a lattice of step h:
between the middle two of eight points the product of the distances is (0.5·1.5·2.5·3.5 h⁴)².
"""

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

POINTS = 8
#: The first of the points around a place, counted from the last point before it.
FIRST = 1 - POINTS // 2

_OFFSETS = np.arange(FIRST, FIRST + POINTS)
_SCALES = [
    float(1 / np.prod([own - other for other in _OFFSETS if other != own])) for own in _OFFSETS
]


def weights_between(fraction: Floats) -> Floats:
    """Weights (8, …) of the points around each place, a fraction 0..1 of a step behind a point."""
    distances = [fraction - offset for offset in _OFFSETS]
    weights = np.empty((POINTS, *np.shape(fraction)))
    ahead = np.ones(np.shape(fraction))
    for index in range(POINTS):
        weights[index] = ahead
        ahead = ahead * distances[index]
    behind = np.ones(np.shape(fraction))
    for index in reversed(range(POINTS)):
        weights[index] *= behind * _SCALES[index]
        behind = behind * distances[index]
    return weights


def located(place: Floats) -> tuple[NDArray[np.intp], Floats]:
    """Of places in steps: the first of the eight points around each, and the weights of the eight."""
    before = np.floor(place)
    return before.astype(np.intp) + FIRST, weights_between(place - before)


def interpolated(table: Floats, row: NDArray[np.intp], place: Floats) -> Floats:
    """Values between the columns of a table: rows that broadcast with the places, in columns."""
    first, weights = located(place)
    first = first + row * table.shape[1]
    flat = table.ravel()
    total = weights[0] * flat[first]
    for index in range(1, POINTS):
        total += weights[index] * flat[first + index]
    return total
