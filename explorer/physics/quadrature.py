"""Gauss–Legendre sums that stay small: the nodes are a leading axis that never leaves."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

#: Values held at once while a sum runs.
BLOCK = 400_000


@cache
def legendre(count: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Nodes and weights of Gauss–Legendre quadrature on 0..1."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return (nodes + 1) / 2, weights / 2


@cache
def panels(edges: tuple[float, ...], count: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The same on 0..1, cut at `edges`, with `count` nodes a panel."""
    nodes, weights = legendre(count)
    cuts = np.array(edges)
    widths = np.diff(cuts)
    return (
        (cuts[:-1, None] + widths[:, None] * nodes).ravel(),
        (widths[:, None] * weights).ravel(),
    )


def integral(
    integrand: Callable[[Any], Any],
    low: Any,
    high: Any,
    rule: tuple[NDArray[np.float64], NDArray[np.float64]],
    size: int,
) -> Any:
    """∫ integrand from `low` to `high`, arrays that broadcast with what the integrand returns.

    integrand: takes an array with a leading axis of nodes. size: number of cells of the result,
    which decides how many nodes are worked on at once.
    """
    nodes, weights = rule
    step = max(1, BLOCK // max(1, size))
    total: Any = 0.0
    dimensions = max(np.ndim(low), np.ndim(high))
    for start in range(0, nodes.size, step):
        chosen = slice(start, start + step)
        lead = (-1,) + (1,) * dimensions
        x = low + (high - low) * nodes[chosen].reshape(lead)
        values = integrand(x)
        weight = weights[chosen].reshape((-1,) + (1,) * (np.ndim(values) - 1))
        total = total + np.sum(values * weight, axis=0)
    return total * (high - low)
