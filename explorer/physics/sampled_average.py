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
from functools import cache, lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .lattice import POINTS, interpolated, located
from .sampled import SampledLine
from .sampled_pieces import Floats, parts
from .sampled_shifts import (
    LINEWIDTHS,
    SHARED,
    STRENGTHS,
    Places,
    column,
    deviation_level,
    largest_deviation,
    passing,
)
from .sampled_still import still_overlap, still_window
from .wandering import REACH

#: Strengths worked out at a time; beyond these logarithms of c the averages do not change with it.
BLOCK, WEAKEST, STRONGEST = 64, -26.0, 102.0
#: Products of matrices up to this size stay on one thread: waking others costs more than they do.
UNTHREADED = 2**17
#: Least light inside a filter, of all light: its logarithm is followed.
LEAST = 1e-300

Place = tuple[float, float, float, float]  # detuning, deviation, edges of the filter [rad/s]


#: First and last point of the lattices of overlaps and of strengths, whole blocks of the latter.
_OVERLAPS, _POINTS = (-388, 12), (-3 * BLOCK, 9 * BLOCK)


@cache
def _kernel() -> Floats:
    """1/(1+cO) for every overlap (rows) and every strength of the lattices."""
    total = np.add.outer(np.arange(*_OVERLAPS), np.arange(*_POINTS))
    return np.asarray(1 / (1 + np.exp(total * STRENGTHS)))


class _Sums(NamedTuple):
    """Gaussian weights of all shifts, put on overlaps from the lattice point `lowest` on."""

    lowest: int
    weights: Floats  # (SHARED, overlaps)
    passed: Floats  # the same times the light inside the filter; as the weights without one

    def logarithms(self, blocks: range, filtered: bool) -> Floats:
        """Logarithms of the average (SHARED, strengths) at the strengths of some blocks."""
        lattice = self.lowest + np.arange(self.weights.shape[1])
        weights = self.weights * np.exp(lattice * STRENGTHS)
        other = self.passed if filtered else self.weights
        found = np.empty((SHARED, len(blocks) * BLOCK))
        rows = slice(self.lowest - _OVERLAPS[0], self.lowest - _OVERLAPS[0] + lattice.size)
        start = blocks[0] * BLOCK - _POINTS[0]
        for part in parts(found.shape[1], max(BLOCK, UNTHREADED // self.weights.size)):
            columns = found[:, part]
            kernel = _kernel()[rows, start + part.start :][:, : columns.shape[1]]
            known, compared = weights @ kernel, other @ kernel
            columns[:] = np.maximum(compared, LEAST) / known if filtered else known / compared
        return np.log(found)


class Average:
    """Averages of one spectrum at one detuning and deviation, on the lattices of κ and c."""

    def __init__(self, line: SampledLine, place: Place, filtered: bool) -> None:
        self._line, self._filtered = line, filtered
        self._offset, self._sigma, *edges = place
        self._window = (edges[0], edges[1])
        self._deviations = deviation_level(self._sigma)
        self._sums: dict[int, _Sums] = {}
        self._blocks = range(0)
        self._known: dict[int, Floats] = {}  # logarithms of the average at those strengths

    def at(self, kappa: Floats, strength: Floats) -> Floats:
        """The average for linewidths and strengths c that broadcast."""
        shape = np.broadcast_shapes(kappa.shape, strength.shape)
        if 0 in shape:
            return np.zeros(shape)
        if kappa.size < strength.size:
            distinct, row = kappa.ravel(), np.arange(kappa.size)
        else:
            distinct, row = np.unique(kappa, return_inverse=True)
        with np.errstate(divide="ignore", invalid="ignore"):
            place = np.clip(np.log(strength), WEAKEST, STRONGEST) / STRENGTHS
        place = np.where(np.isnan(place), 0.0, place)
        first = (int(np.floor(place.min())) - POINTS // 2) // BLOCK
        last = (int(np.floor(place.max())) + POINTS // 2) // BLOCK
        table = self._table(distinct, range(first, last + 1))
        found = interpolated(table, row.reshape(kappa.shape), place - first * BLOCK)
        return np.asarray(np.exp(found))

    def _table(self, kappa: Floats, blocks: range) -> Floats:
        """Logarithms of the average for some linewidths (rows), at the strengths of some blocks."""
        first, weights = located(np.log(kappa) / LINEWIDTHS)
        steps = {*range(0, POINTS, SHARED), POINTS - 1}
        levels = sorted({level for n in steps for level in ((first + n) // SHARED).tolist()})
        known = np.concatenate([self._row(level, blocks) for level in levels])
        start = (blocks[0] - self._blocks[0]) * BLOCK
        known = known[:, start : start + len(blocks) * BLOCK]
        numbers = np.add.outer(np.array(levels) * SHARED, np.arange(SHARED)).ravel()
        begin = np.searchsorted(numbers, first)
        total = weights[0][:, np.newaxis] * known[begin]
        for point in range(1, POINTS):
            total += weights[point][:, np.newaxis] * known[begin + point]
        return np.asarray(total)

    def _row(self, level: int, blocks: range) -> Floats:
        """Logarithms for a group of linewidths, at least at the strengths of some blocks."""
        if not self._blocks or blocks[0] < self._blocks[0] or blocks[-1] > self._blocks[-1]:
            ends = [*blocks, *self._blocks]
            self._blocks, self._known = range(min(ends), max(ends) + 1), {}
        if level not in self._known:
            if level not in self._sums:
                self._sums[level] = self._summed(level)
            self._known[level] = self._sums[level].logarithms(self._blocks, self._filtered)
        return self._known[level]

    def _summed(self, level: int) -> _Sums:
        places = Places.of(self._line, level, self._deviations, self._filtered)
        shared = column(self._line, level, places)
        reach = REACH * largest_deviation(self._deviations)  # the same for all of them
        ends = [places.number(side * reach - self._offset) for side in (-1, 1)]
        first, last = int(np.floor(ends[0])), int(np.ceil(ends[1]))
        known = shared.overlaps.between(first, last)
        place, apart = known[:2]
        gauss = np.exp(-(((place + self._offset) / self._sigma) ** 2) / 2) * apart
        begins = known[2 : 2 + SHARED]
        lowest = int(begins.min())
        count = int(begins.max()) + POINTS - lowest
        index = begins.astype(np.intp)
        index += (np.arange(SHARED) * count - lowest)[:, np.newaxis]
        weights = known[2 + SHARED :].reshape(POINTS, SHARED, -1) * (gauss / gauss.sum())

        def put(values: Floats) -> Floats:
            # The points of one place follow each other: what is put first lies before the rest.
            total = np.zeros(SHARED * count)
            for point in range(POINTS):
                found = np.bincount(index.ravel(), values[point].ravel(), total.size - point)
                total[point:] += found[: total.size - point]
            return total.reshape(SHARED, count)

        sums = put(weights)
        if not self._filtered:
            return _Sums(lowest, sums, sums)
        inside = passing(self._line, level, places, self._window)
        return _Sums(lowest, sums, put(weights * inside.between(first, last)))


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
            return still_overlap(line, -place[0], kappa)
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
        return passed / still_overlap(line, -detuning, kappa)

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
