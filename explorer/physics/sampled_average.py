r"""Measured spectra that wander: the overlap that, held still, gives the averaged outcome.

With R = A·O the share of the mode is κ/(γ+κ) · cO/(1+cO), c = A(γ+κ)/(γκ), and the rate into the
light κ · cO/(1+cO), c = A/κ. So every average over shifts is one function of c and κ,

.. math:: \bar O(c, \kappa) = \Big\langle \frac{O}{1+cO} \Big\rangle \Big/
          \Big\langle \frac{1}{1+cO} \Big\rangle,
          \quad \Big\langle \frac{cO}{1+cO} \Big\rangle = \frac{c\bar O}{1+c\bar O}

whose logarithm is analytic in log c and log κ where |Im log c| + 2|Im log κ| < π: the averages are of
numbers from one half plane. It is followed on even lattices of both; so is the light inside a filter,
⟨P/(1+cO)⟩ over ⟨O/(1+cO)⟩. On these lattices the sum over shifts is a matrix product.
"""

from collections.abc import Callable
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .lattice import POINTS, interpolated, located
from .sampled import SampledLine
from .sampled_pieces import Floats
from .sampled_shifts import (
    BINS,
    LINEWIDTHS,
    LOWEST,
    SHARED,
    STRENGTHS,
    column,
    deviation_level,
    passing,
)
from .sampled_still import still_overlap, still_window
from .wandering import REACH

#: Strengths worked out at a time; beyond these logarithms of c the averages do not change with it.
BLOCK, WEAKEST, STRONGEST = 32, -26.0, 102.0

Place = tuple[float, float, float, float]  # detuning, deviation, edges of the filter [rad/s]


@lru_cache(maxsize=32)
def _kernel(block: int) -> Floats:
    """1/(1+cO) for each overlap of the lattice and each strength of a block."""
    total = np.add.outer(np.arange(BINS) + LOWEST, block * BLOCK + np.arange(BLOCK))
    return np.asarray(1 / (1 + np.exp(total * STRENGTHS)))


_OVERLAPS = np.exp((np.arange(BINS) + LOWEST) * STRENGTHS)


class Average:
    """Averages of one spectrum at one detuning and deviation, on the lattices of κ and c."""

    def __init__(self, line: SampledLine, place: Place, filtered: bool) -> None:
        self._line, self._filtered = line, filtered
        self._offset, self._sigma, *edges = place
        self._window = (edges[0], edges[1])
        self._deviations = deviation_level(self._sigma)
        self._sums: dict[int, tuple[Floats, Floats]] = {}
        self._logarithms: dict[tuple[int, int], Floats] = {}

    def at(self, kappa: Floats, strength: Floats) -> Floats:
        """The average for linewidths and strengths c that broadcast."""
        distinct, row = np.unique(kappa, return_inverse=True)
        place = np.clip(np.log(strength), WEAKEST, STRONGEST) / STRENGTHS
        place = np.where(np.isnan(place), 0.0, place)
        if not place.size:
            return np.zeros(np.broadcast_shapes(kappa.shape, place.shape))
        first = int(np.floor(place.min()) - POINTS // 2) // BLOCK
        last = int(np.floor(place.max()) + POINTS // 2) // BLOCK
        table = self._table(distinct, range(first, last + 1))
        found = interpolated(table, row.reshape(kappa.shape), place - first * BLOCK)
        return np.asarray(np.exp(found))

    def _table(self, kappa: Floats, blocks: range) -> Floats:
        """Logarithms of the average for some linewidths (rows), at the strengths of some blocks."""
        first, weights = located(np.log(kappa) / LINEWIDTHS)
        around = first[:, np.newaxis] + np.arange(POINTS)
        levels, which = np.unique(around // SHARED, return_inverse=True)
        self._fill([int(level) for level in levels], blocks)
        known = np.concatenate(
            [np.stack([self._logarithms[int(level), block] for level in levels]) for block in blocks],
            axis=2,
        )
        rows = known.reshape(-1, known.shape[2])
        index = which.reshape(around.shape) * SHARED + around % SHARED
        total = weights[0][:, np.newaxis] * rows[index[:, 0]]
        for point in range(1, POINTS):
            total += weights[point][:, np.newaxis] * rows[index[:, point]]
        return np.asarray(total)

    def _fill(self, levels: list[int], blocks: range) -> None:
        """Work out what is not known yet."""
        for block in blocks:
            missing = [level for level in levels if (level, block) not in self._logarithms]
            if not missing:
                continue
            for level in missing:
                if level not in self._sums:
                    self._sums[level] = self._summed(level)
            weight, other = (
                np.concatenate([self._sums[level][part] for level in missing]) for part in (0, 1)
            )
            kernel = _kernel(block)
            overlap = (weight * _OVERLAPS) @ kernel
            if self._filtered:
                found = np.log(np.maximum(other @ kernel, 1e-300) / overlap)
            else:
                found = np.log(overlap / (weight @ kernel))
            for level, values in zip(missing, found.reshape(-1, SHARED, BLOCK), strict=True):
                self._logarithms[level, block] = values

    def _summed(self, level: int) -> tuple[Floats, Floats]:
        """Gaussian weights of all shifts, and the light inside the filter, put on the overlaps."""
        shared = column(self._line, level, self._deviations)
        ends = [
            shared.places.number(-self._offset + side * REACH * self._sigma) for side in (-1, 1)
        ]
        first, last = int(np.floor(ends[0])), int(np.ceil(ends[1]))
        place, apart, *rest = shared.overlaps.between(first, last)
        gauss = np.exp(-(((place + self._offset) / self._sigma) ** 2) / 2) * apart
        begins = np.stack(rest[:SHARED]).astype(np.intp)
        begins += BINS * np.arange(SHARED)[:, np.newaxis]
        weights = np.stack(rest[SHARED:]).reshape(POINTS, SHARED, -1) * (gauss / gauss.sum())
        index = begins + np.arange(POINTS)[:, np.newaxis, np.newaxis]

        def put(values: Floats) -> Floats:
            found = np.bincount(index.ravel(), values.ravel(), SHARED * BINS)
            return np.asarray(found).reshape(SHARED, BINS)

        if not self._filtered:
            return put(weights), np.empty((SHARED, 0))
        inside = passing(self._line, level, self._deviations, self._window)
        return put(weights), put(weights * inside.between(first, last))


@lru_cache(maxsize=32)
def _average(line: SampledLine, place: Place, filtered: bool) -> Average:
    return Average(line, place, filtered)


def wandering_overlap(
    line: SampledLine,
    *,
    detuning: ArrayLike,
    sigma: ArrayLike,
    kappa: ArrayLike,
    strength: ArrayLike,
) -> Floats:
    """The overlap that gives the averaged outcome: of ⟨cO/(1+cO)⟩, c = strength, 0 and ∞ allowed.

    detuning, sigma, kappa [rad/s], strength [1]: any broadcastable shapes.
    """

    def one(place: Place, kappa: Floats, strength: Floats) -> Floats:
        if place[1] == 0:
            return still_overlap(line, -place[0], kappa) + 0 * strength
        return _average(line, place, False).at(kappa, strength)

    return _each_place(one, (detuning, sigma, 0.0, 0.0), kappa, strength)


def wandering_window(
    line: SampledLine,
    *,
    detuning: ArrayLike,
    sigma: ArrayLike,
    kappa: ArrayLike,
    strength: ArrayLike,
    lower: ArrayLike,
    upper: ArrayLike,
) -> Floats:
    """Share of the mode's light between two distances from the resonance, as `wandering_overlap`.

    Weighted with the share of the mode: ⟨cP/(1+cO)⟩ over ⟨cO/(1+cO)⟩, P the overlap inside.
    """

    def one(place: Place, kappa: Floats, strength: Floats) -> Floats:
        detuning, sigma, lower, upper = place
        if sigma > 0:
            return _average(line, place, True).at(kappa, strength)
        passed = still_window(line, -detuning, kappa, lower - detuning, upper - detuning)
        return passed / still_overlap(line, -detuning, kappa) + 0 * strength

    return _each_place(one, (detuning, sigma, lower, upper), kappa, strength)


def _each_place(
    function: Callable[[Place, Floats, Floats], Floats],
    place: tuple[ArrayLike, ArrayLike, ArrayLike, ArrayLike],
    kappa: ArrayLike,
    strength: ArrayLike,
) -> Floats:
    """The function of each distinct place, put together."""
    columns = [np.asarray(value, np.float64) for value in place]
    kappa, strength = np.asarray(kappa, np.float64), np.asarray(strength, np.float64)
    shape = np.broadcast_shapes(kappa.shape, strength.shape, *(one.shape for one in columns))
    if all(one.size == 1 for one in columns):
        found = function(_place(columns), kappa, strength)
        return np.asarray(np.broadcast_to(found, shape))
    rows = np.stack([np.broadcast_to(one, shape).ravel() for one in columns], axis=-1)
    kappas, strengths = (np.broadcast_to(one, shape).ravel() for one in (kappa, strength))
    distinct, which = np.unique(rows, axis=0, return_inverse=True)
    result = np.empty(len(rows))
    order = np.argsort(which.ravel(), kind="stable")
    ends = np.searchsorted(which.ravel()[order], np.arange(len(distinct) + 1))
    for number, row in enumerate(distinct):
        cells: NDArray[np.intp] = order[ends[number] : ends[number + 1]]
        result[cells] = function(_place(list(row)), kappas[cells], strengths[cells])
    return result.reshape(shape)


def _place(columns: list[Floats]) -> Place:
    detuning, sigma, lower, upper = (float(np.asarray(one).item()) for one in columns)
    return detuning, sigma, lower, upper
