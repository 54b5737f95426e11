"""Overlaps of a measured spectrum at places that slow wandering brings to the resonance.

Places are frequencies of the resonance in the frame of the spectrum [rad/s]. They stand on an even
lattice of a coordinate that crowds them about the main peak, and neither the detuning nor the
deviation moves them: a Gaussian over them only changes its weights. So what is worked out here serves
all detunings, all deviations of one octave's half, both transitions, and every strength of coupling.

The places do not follow the samples, whose errors average out: at least five a sample or six a
linewidth about the peak, and at most 768 over 18 deviations. Seen: 1e-9 for a resonator wider than two
samples; for a narrower one 1e-5 on a smooth spectrum, 1e-4 with 3 % of noise up to a deviation of 40
samples and 3e-3 beyond 100; 1e-2 where a single sample stands out of nothing. Nor do they follow a filter: where the spectrum is over a hundred times narrower than its
wandering, the light inside is right to 1e-2 of the whole only.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from .lattice import POINTS, located
from .sampled import SampledLine
from .sampled_pieces import Floats
from .wandering import REACH, SMOOTH

#: Step of the lattice of linewidths in log κ, and how many of its columns share their places.
LINEWIDTHS, SHARED = 0.125, 5
#: Step of the lattices of overlaps and of strengths, in their logarithms.
STRENGTHS = 0.2
#: Lowest overlap of the lattice.
LOWEST = 1e-33
#: Fewest places over 18 deviations, without and with a filter, the most, and how many are worked out
#: at a time.
FEWEST, MOST, BLOCK = (64, 256), 768, 64
#: Most places that are kept: a detuning that moves on and on leaves the first ones behind.
LONGEST = 3 * MOST


def deviation_level(sigma: float) -> int:
    """Number of the half octave that a deviation lies in, below its upper end."""
    return math.ceil(2 * math.log2(sigma))


def largest_deviation(level: int) -> float:
    """Upper end of a half octave of deviations [rad/s]."""
    return float(2.0 ** (level / 2))


@dataclass(frozen=True)
class Places:
    """The even lattice of places about the peak of a line, for a range of linewidths and deviations.

    The coordinate of a place x is asinh(y) + ry with y = (x − peak)/width, as in `wandering`.
    """

    peak: float
    width: float
    ratio: float
    spacing: float

    @classmethod
    def of(cls, line: SampledLine, level: int, deviations: int, filtered: bool) -> "Places":
        """level: number of a group of SHARED linewidths; deviations: of `deviation_level`."""
        left, right = line.half_maximum
        narrow, wide = np.exp(np.array([level, level + 1]) * (SHARED * LINEWIDTHS))
        step = max(line.step / 5, narrow / 6)
        feature = (right - left) / 2 + max(wide / 2, line.step)
        sigma = largest_deviation(deviations)
        ratio = feature / (SMOOTH * sigma)
        ends = 2 * (np.arcsinh(REACH * sigma / feature) + ratio * REACH * sigma / feature)
        wanted = step / feature * (1 + ratio)
        spacing = np.clip(wanted, ends / MOST, ends / FEWEST[filtered])
        return cls((left + right) / 2, feature, float(ratio), float(spacing))

    def number(self, place: float) -> float:
        """Where on the lattice a place is."""
        y = (place - self.peak) / self.width
        return (math.asinh(y) + self.ratio * y) / self.spacing

    def at(self, numbers: Floats) -> tuple[Floats, Floats]:
        """Places of lattice points, and how far apart they stand there [rad/s].

        With v = asinh(y) the coordinate is v + r sinh(v): convex, so Newton's steps come down to it
        from either of two bounds.
        """
        wanted = np.abs(numbers) * self.spacing
        v = np.minimum(wanted, np.arcsinh(wanted / self.ratio))
        for _ in range(12):
            v = v - (v + self.ratio * np.sinh(v) - wanted) / (1 + self.ratio * np.cosh(v))
        apart = self.width * np.cosh(v) / (1 + self.ratio * np.cosh(v)) * self.spacing
        return self.peak + self.width * np.copysign(np.sinh(v), numbers), apart


class Growing:
    """Values at consecutive points of a lattice, in blocks, worked out where they are asked for."""

    def __init__(self, make: Callable[[Floats], Floats]) -> None:
        self._make = make  # lattice points (n) to values (m, n)
        self._start = 0
        self._values: Floats = np.empty((0, 0))

    def between(self, first: int, last: int) -> Floats:
        """Values (m, n) from the block of one point to the block of another."""
        start, stop = first // BLOCK * BLOCK, (last // BLOCK + 1) * BLOCK
        end = self._start + self._values.shape[1]
        if (
            not self._values.size
            or start > end
            or stop < self._start
            or (end - self._start > LONGEST)
        ):
            self._start, self._values = start, self._fresh(start, stop)
        else:
            parts = [self._values]
            if start < self._start:
                parts.insert(0, self._fresh(start, self._start))
            if stop > end:
                parts.append(self._fresh(end, stop))
            if len(parts) > 1:
                self._values = np.concatenate(parts, axis=1)
            self._start = min(start, self._start)
        return self._values[:, start - self._start : stop - self._start]

    def _fresh(self, start: int, stop: int) -> Floats:
        return self._make(np.arange(start, stop, dtype=np.float64))


@dataclass(frozen=True)
class Column:
    """SHARED neighbouring linewidths of a line with the places they share.

    Of each place and linewidth the overlap is put on the lattice of overlaps: where the eight
    points around its logarithm begin, and their weights.
    """

    kappa: Floats
    overlaps: Growing  # place, distance, beginnings (SHARED), weights (POINTS · SHARED)


@lru_cache(maxsize=256)
def column(line: SampledLine, level: int, places: Places) -> Column:
    """The column of a group of linewidths at some places."""
    kappa = np.exp((level * SHARED + np.arange(SHARED)) * LINEWIDTHS)

    def make(numbers: Floats) -> Floats:
        place, apart = places.at(numbers)
        overlap = line.rows(_rows(place, kappa, -np.inf, np.inf)).reshape(SHARED, -1)
        overlap = np.maximum(overlap, LOWEST)
        first, weights = located(np.log(overlap).ravel() / STRENGTHS)
        rows = (first.reshape(SHARED, -1), weights.reshape(POINTS * SHARED, -1))
        return np.concatenate([[place, apart], *rows])

    return Column(kappa, Growing(make))


@lru_cache(maxsize=256)
def passing(line: SampledLine, level: int, places: Places, window: tuple[float, float]) -> Growing:
    """Of the same places and linewidths the overlap (SHARED, n) inside a filter.

    window: its edges from the resonance [rad/s].
    """
    shared = column(line, level, places)

    def make(numbers: Floats) -> Floats:
        place, _ = places.at(numbers)
        return line.rows(_rows(place, shared.kappa, *window)).reshape(SHARED, -1)

    return Growing(make)


def _rows(place: Floats, kappa: Floats, lower: float, upper: float) -> Floats:
    columns = np.broadcast_arrays(place, kappa[:, np.newaxis], place + lower, place + upper)
    return np.stack([values.ravel() for values in columns], axis=-1)
