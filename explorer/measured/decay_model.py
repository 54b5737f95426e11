"""Expected counts of a decay: exponentials integrated over bins, after a response and earlier pulses.

The response is taken as constant within each of its bins; its convolution with an exponential and
the integral over a bin are then exact, for any shift, and run as a recursive filter.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..domain import InputError
from .data import DataError, Decay, Histogram
from .noise import Array

#: Bins of an internal grid, at most: more would make a page wait.
MOST_BINS = 2_000_000


def bin_numbers(data: Histogram) -> NDArray[np.int64]:
    """Number of each bin on the even grid that starts with the first one."""
    if data.times.size < 2:
        raise DataError("a histogram of one bin cannot be fitted", data.name)
    steps = np.rint((data.times - data.times[0]) / data.width)
    numbers: NDArray[np.int64] = np.asarray(steps, dtype=np.int64)
    if np.any(np.diff(numbers) < 1):
        raise DataError("two bins lie at the same time", data.name)
    if numbers[-1] >= MOST_BINS:
        raise DataError(f"the histogram spans more than {MOST_BINS} bins", data.name)
    return numbers


def full_counts(data: Histogram) -> Array:
    """Counts on the even grid, zeros where bins are missing."""
    numbers = bin_numbers(data)
    full = np.zeros(int(numbers[-1]) + 1)
    full[numbers] = data.counts
    return full


def tail_bins(*, count: int, width: float, lifetime: float) -> Array:
    """Shares of an exponential that starts with the first bin, in `count` bins."""
    return np.asarray(np.exp(-np.arange(count) * (width / lifetime)) * -np.expm1(-width / lifetime))


def filter_weights(*, width: float, lifetime: float, part: float) -> tuple[Array, float]:
    r"""Numerator and pole of the recursive filter from excitations to detections, per bin.

    part: shift of the excitations against the bins, 0 to below 1 bin. An excitation at a fraction s
    of its bin, even over [part, 1] with weight 1 − part in that bin and over [0, part] in the next,
    is detected m bins later with the integral of :math:`e^{-t/\tau}/\tau` over that bin.
    """
    x = width / lifetime
    pole = float(np.exp(-x))

    def shares(low: float, high: float) -> tuple[float, float]:
        """Detected in the bin of the excitation, and in the one after, for s over [low, high]."""
        rest = (np.exp(-(1 - high) * x) - np.exp(-(1 - low) * x)) / x  # not yet decayed at the end
        return float(high - low - rest), float(rest * -np.expm1(-x))

    first, later = shares(part, 1.0)
    carried, carried_later = shares(0.0, part)
    direct = (first, later + carried, later * pole + carried_later)
    return np.array([direct[0], direct[1] - pole * direct[0], direct[2] - pole * direct[1]]), pole


@dataclass(frozen=True, eq=False)
class Convolved:
    """A response on the grid of the data.

    shares: of the response in each bin of the internal grid, (m,), summing to 1. before: bins of the
    internal grid before the first one of the data. part: of a bin by which the response lies later
    than its bins. count: bins of the data's grid. width [s]. period [s] of the pulses, or None.
    """

    shares: Array
    before: int
    part: float
    count: int
    width: float
    period: float | None = None

    def bins(self, lifetime: float, shift: float) -> Array:
        """Shares of an exponential decay in the bins of the data; shift of the response in bins."""
        from scipy.signal import lfilter

        shift = shift + self.part
        whole = int(np.floor(shift))
        weights, pole = filter_weights(width=self.width, lifetime=lifetime, part=shift - whole)
        length = self.before + self.count
        moved = np.zeros(length)
        start = max(whole, 0)
        piece = self.shares[max(-whole, 0) : max(length - whole, 0)][: length - start]
        moved[start : start + piece.size] = piece
        filtered = np.asarray(lfilter(weights, [1.0, -pole], moved))
        if self.period is not None:
            return filtered[self.before :] + self._earlier(filtered[-1], lifetime)
        return filtered[self.before :]

    def _earlier(self, last: float, lifetime: float) -> Array:
        """What earlier pulses leave: the tail, carried on from the last bin through the periods."""
        assert self.period is not None
        delay = self.period - self.width * np.arange(self.count)[::-1]
        return np.asarray(last * np.exp(-delay / lifetime) / -np.expm1(-self.period / lifetime))


def on_grid(data: Decay, response: Decay, shift: int, period: float | None) -> Convolved:
    """A response, freed of its background, on the bins of the data and moved by whole bins."""
    shares, first = response_shares(response, data.width)
    offset = (first - (data.times[0] - data.width / 2)) / data.width + shift
    count = int(bin_numbers(data)[-1]) + 1
    whole = int(np.floor(offset))
    spare = int(np.ceil(_spread_bins(shares))) * 6 + 8
    before = max(spare - whole, 0)
    at = before + whole
    grid = np.zeros(max(at + shares.size, before + count))
    grid[at : at + shares.size] = shares
    return Convolved(grid, before, offset - whole, count, data.width, period)


def _spread_bins(shares: Array) -> float:
    place = np.arange(shares.size)
    middle = float(np.sum(place * shares))
    return float(np.sqrt(np.sum((place - middle) ** 2 * shares)))


def response_shares(response: Decay, width: float) -> tuple[Array, float]:
    """A response without its flat background in bins of a width, summing to 1, and where they start [s]."""
    counts = full_counts(response)
    net = counts - flat_background(counts)
    low, high = _significant(net, counts)
    net = np.clip(net[low:high], 0.0, None)
    if not np.sum(net) > 0:
        raise DataError("the response holds no pulse above its background", response.name)
    start = float(response.times[0]) - response.width / 2 + low * response.width
    if abs(width / response.width - 1) > 1e-6:
        edges = response.width * np.arange(net.size + 1)
        total = np.concatenate([[0.0], np.cumsum(net)])
        wanted = width * np.arange(int(np.ceil(edges[-1] / width)) + 1)
        net = np.diff(np.interp(wanted, edges, total))
    return net / np.sum(net), start


def flat_background(counts: Array) -> float:
    """Counts per bin of what is flat: the mean of the bins that do not rise above it."""
    level = float(np.median(counts))
    for _ in range(50):
        low = counts[counts <= level + 3 * np.sqrt(level) + 1]
        if low.size == 0 or abs(float(np.mean(low)) - level) < 1e-9:
            break
        level = float(np.mean(low))
    return level


def _significant(net: Array, counts: Array) -> tuple[int, int]:
    """The bins around the peak in which a response stands above the noise of its background."""
    if not np.any(net > 0):
        return 0, net.size
    noise = np.sqrt(max(float(np.mean(counts - net)), 0.0) / 5)
    smooth = np.convolve(net, np.full(5, 0.2), "same")
    above = np.flatnonzero((smooth > 4 * noise) & (smooth > 1e-5 * float(np.max(net))))
    if above.size == 0:
        return 0, net.size
    return max(int(above[0]) - 2, 0), min(int(above[-1]) + 3, net.size)


def checked_period(period: float | None, data: Decay) -> None:
    """InputError for a period that is shorter than a few bins."""
    if period is not None and period < 4 * data.width:
        raise InputError(f"period = {period:g} s is shorter than four bins of the histogram")


def half_width(shares: Array, width: float) -> float:
    """FWHM of a response [s], by linear interpolation at half its maximum."""
    peak = int(np.argmax(shares))
    half = shares[peak] / 2
    left, right = peak, peak
    while left > 0 and shares[left - 1] >= half:
        left -= 1
    while right < shares.size - 1 and shares[right + 1] >= half:
        right += 1
    edges = [1.0, 1.0]
    for side, (inner, outer) in enumerate(((left, left - 1), (right, right + 1))):
        beyond = shares[outer] if 0 <= outer < shares.size else 0.0
        edges[side] = float((shares[inner] - half) / max(shares[inner] - beyond, 1e-300))
    return width * (right - left + edges[0] + edges[1])
