"""Smooth functions on an even lattice, and what lies between its points.

A polynomial through the ten nearest points is followed, so a function that is analytic within r of
the real axis is right to about 900 (h/r)^10 of what it changes by over r, for a lattice of step h:
between the middle two of ten points the product of the distances is (0.5·1.5·2.5·3.5·4.5 h⁵)².
"""

import numpy as np
from numpy.polynomial import polynomial
from numpy.typing import NDArray

Floats = NDArray[np.float64]

POINTS = 10
#: Places that are followed at a time: their weights fit a processor's cache, and no product of
#: matrices is so large that it wakes the library's threads, which costs more than the product.
AT_ONCE = 2048
#: The first of the points around a place, counted from the last point before it.
FIRST = 1 - POINTS // 2

_OFFSETS = np.arange(FIRST, FIRST + POINTS)


def _powers() -> Floats:
    """Coefficients (point, power) of the polynomials that are 1 at one of the points, else 0."""
    rows = []
    for own in _OFFSETS:
        others = _OFFSETS[own != _OFFSETS]
        rows.append(polynomial.polyfromroots(others) / np.prod(own - others))
    return np.array(rows)


_POWERS = _powers()


def weights_between(fraction: Floats) -> Floats:
    """Weights (10, n) of the points around n places, each a fraction 0..1 of a step behind one."""
    weights = np.empty((POINTS, fraction.size))
    for start in range(0, fraction.size, AT_ONCE):
        some = fraction[start : start + AT_ONCE]
        powers = np.empty((POINTS, some.size))
        powers[0] = 1.0
        for index in range(1, POINTS):
            np.multiply(powers[index - 1], some, out=powers[index])
        np.matmul(_POWERS, powers, out=weights[:, start : start + AT_ONCE])
    return weights


def located(place: Floats) -> tuple[NDArray[np.intp], Floats]:
    """Of n places in steps: the first of the points around each, and their weights (10, n)."""
    before = np.floor(place)
    return before.astype(np.intp) + FIRST, weights_between(place - before)


def interpolated(table: Floats, row: NDArray[np.intp], place: Floats) -> Floats:
    """Values between the columns of a table, at places in columns.

    row: of the table, in a shape that broadcasts with the places.
    """
    shape = np.broadcast_shapes(row.shape, place.shape)
    rows = np.broadcast_to(row * table.shape[1], shape).ravel()
    places = np.broadcast_to(place, shape).ravel()
    flat, result = table.ravel(), np.empty(places.size)
    for start in range(0, places.size, AT_ONCE):
        part = slice(start, start + AT_ONCE)
        first, weights = located(places[part])
        first += rows[part]
        total = weights[0] * flat.take(first, mode="clip")
        for index in range(1, POINTS):
            first += 1
            total += weights[index] * flat.take(first, mode="clip")
        result[part] = total
    return result.reshape(shape)
