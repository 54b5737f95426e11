"""Nodes for averages over a Gaussian of rational functions of the detuning squared.

The integrand has structure around zero detuning, anywhere from far narrower to far wider than the
Gaussian, and falls off like powers from there; the Gaussian may be centred far away. Lengths here
are in units of the Gaussian's standard deviation sigma (in units of the detuning where it is far
away). The rules are trapezium sums in a variable that makes all of it smooth, or Gauss-Hermite
where it is smooth as it is, so they converge exponentially. Weights are not normalised, for they
serve ratios of averages.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.polynomial.hermite_e import hermegauss
from numpy.typing import NDArray

Array = NDArray[np.float64]

CELLS_PER_GROUP = 1024  # cells that meet all nodes at once: temporaries of some 0.5 MB
REACH = 6.75  # standard deviations; beyond it lies 1.5e-11 of a Gaussian
FAR = 18.0  # beyond so many sigma the structure at zero carries below 1e-20 of the average
COARSE, FINE = 0.75, 0.25  # steps: of a bare Gaussian; where a width is as narrow as the map's


def narrowest(coefficients: Array) -> Array:
    """A length that no root of the polynomials comes much nearer to zero than; at most 4.

    coefficients (powers of t^2, cells), none negative. A root r of t^2 has
    |r| >= min over k of (c0/ck)^(1/k) / 2, and with at most three coefficients it does not lie
    within 90 degrees of the positive axis, so t = sqrt(r) stays 45 degrees off the real one.
    """
    least = np.full(coefficients.shape[1], 16.0)
    for power, value in enumerate(coefficients[1:], start=1):
        root = np.divide(coefficients[0], value, out=np.full_like(value, np.inf), where=value > 0)
        least = np.minimum(least, root ** (1 / power))
    width: Array = np.sqrt(np.maximum(least, 1e-36))
    return width


def rules(narrow: Array, distance: Array) -> Iterator[tuple[NDArray[np.intp], Array, Array]]:
    """Indices of cells with nodes in common, the nodes and the weights.

    narrow, distance (of the Gaussian's centre from zero): (cells,). Nodes and weights are
    (nodes, 1) or (nodes, cells with nodes in common). Widths are rounded down to powers of four
    and distances up to multiples of three, so that the nodes of a cell depend on that cell alone.
    """
    level = np.floor(np.log2(narrow) / 2).astype(np.intp)
    step = np.ceil(np.minimum(distance, FAR) / 3).astype(np.intp)
    far = distance > FAR
    lowest = level.min(initial=0)
    key = np.where(far, 0, 1 + step + 8 * (level - lowest))
    for member in np.flatnonzero(np.bincount(key)):
        inside = np.flatnonzero(key == member)
        width, reach = 4.0 ** ((member - 1) // 8 + lowest), 3.0 * ((member - 1) % 8) + REACH
        for start in range(0, inside.size, CELLS_PER_GROUP):
            cells = inside[start : start + CELLS_PER_GROUP]
            if member == 0:
                yield cells, *_far_rule(distance[cells])
            else:
                yield cells, *_near_rule(width, reach, distance[cells])


def _far_rule(distance: Array) -> tuple[Array, Array]:
    """Gauss-Hermite nodes around a centre at 1, for a Gaussian of standard deviation 1/distance.

    The poles lie over FAR/sqrt(2) standard deviations off, so ten nodes are exact to rounding.
    """
    offset, weights = hermegauss(10)
    return 1 + offset[:, np.newaxis] / distance, weights[:, np.newaxis]


def _near_rule(width: float, reach: float, distance: Array) -> tuple[Array, Array]:
    """Nodes from zero on, for an even integrand: t = asinh(width sinh u), equal steps in u.

    The step in t grows from width in proportion to t until it is 1 and then stays, so that the
    structure, its far wings and the Gaussian are all smooth in u.
    """
    slope = min(width, 1.0)
    step = COARSE if width > 1 else FINE
    count = np.ceil(np.arcsinh(np.sinh(reach) / slope) / step)
    u = step * np.arange(count + 1)[:, np.newaxis]
    t = np.arcsinh(slope * np.sinh(u))
    measure = slope * np.cosh(u) / np.cosh(t)
    measure[0] /= 2
    centre = distance if distance.min() < distance.max() else distance[:1]
    return t, measure * np.exp(-np.square(t - centre) / 2) * (1 + np.exp(-2 * t * centre))
