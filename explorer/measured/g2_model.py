r"""Expected coincidences: peaks of a pulsed source, the dip of a continuous one, with jitter.

A peak is the density :math:`e^{-|t|/\tau}/2\tau` convolved with a Gaussian; its integral is closed,
so that bins are integrated exactly.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .noise import Array


def peak_integral(*, delay: Array, decay: float, jitter: float, tail: Array | None = None) -> Array:
    r"""Integral of a peak from −∞ to each delay.

    .. math:: \Phi(t/\sigma) + \tfrac12 (E(-t) - E(t)), \quad
       E(t) = \tfrac12 e^{\sigma^2/2\tau^2 - t/\tau}\,{\rm erfc}\frac{\sigma/\tau - t/\sigma}{\sqrt2}

    delay, decay τ [s], jitter σ: standard deviation of the Gaussian [s], 0 for none. Beyond eight
    σ of Gaussian and shift the pure exponential is used, right to 1e-15. tail: e^(−|t|/τ), if known.
    """
    distance = np.abs(delay)
    tail = np.exp(-distance / decay) if tail is None else tail
    if jitter <= 0:
        return np.asarray(np.where(delay < 0, tail / 2, 1 - tail / 2))
    ratio = jitter / decay
    if ratio > 30:  # all of it is near, and the factor of the tail could overflow
        return _near(delay / jitter, ratio)
    half = np.exp(ratio**2 / 2) / 2 * tail
    result = np.where(delay < 0, half, 1 - half)
    near = distance <= (8 + ratio) * jitter
    if near.any():
        result[near] = _near(delay[near] / jitter, ratio)
    return np.asarray(result)


def _near(place: Array, ratio: float) -> Array:
    """The integral by the closed form; place: delay over σ, ratio: σ over τ."""
    from scipy.special import ndtr

    return np.asarray(ndtr(place) + (_wing(-place, ratio) - _wing(place, ratio)) / 2)


def _wing(place: Array, ratio: float) -> Array:
    """E of the formula, by whichever form neither overflows nor loses digits."""
    from scipy.special import erfc, erfcx

    argument = (ratio - place) / np.sqrt(2)
    direct = np.exp(np.minimum(ratio**2 / 2 - place * ratio, 0.0)) * erfc(np.minimum(argument, 0.0))
    scaled = np.exp(-(place**2) / 2) * erfcx(np.maximum(argument, 0.0))
    return np.asarray(np.where(argument > 0, scaled, direct) / 2)


@dataclass(frozen=True)
class Train:
    """Peaks of a pulsed source, without end on both sides.

    period, decay, jitter (standard deviation), centre [s]. central: the peak at zero delay over the
    far ones. bunching: by how much near side peaks stand above far ones, falling as e^(−|nT|/reach).
    """

    period: float
    decay: float
    jitter: float
    centre: float
    central: float
    bunching: float = 0.0
    reach: float = 1.0

    def integral(self, delay: Array) -> Array:
        """Peaks, in units of a far one, from some delay far below to each of the delays, (n,)."""
        period = self.period
        place = delay - self.centre
        cell = np.rint(place / period)
        first, last = int(cell[0]), int(cell[-1])
        weights, left, right = self._weights(first, last)
        index = (cell - first).astype(np.int64)
        inner = self._cell(place - cell * period, weights[index], left[index], right[index])
        edge = np.full(weights.shape, period / 2)
        whole = self._cell(edge, weights, left, right) - self._cell(-edge, weights, left, right)
        below = np.concatenate([[0.0], np.cumsum(whole)[:-1]])
        start = self._cell(-edge, weights, left, right)
        return np.asarray(below[index] + inner - start[index])

    def _weights(self, first: int, last: int) -> tuple[Array, Array, Array]:
        """Of the peaks first..last: their areas, and what all peaks to the left and right leave there.

        Sums over all further peaks are geometric, the central one apart.
        """
        number = np.arange(first, last + 1)
        keep, fade = np.exp(-self.period / self.decay), np.exp(-self.period / self.reach)
        near = self.bunching * np.exp(-np.abs(number) * self.period / self.reach)
        weights = np.where(number == 0, self.central, 1 + near)
        left, right = np.zeros(number.size), np.zeros(number.size)
        left[0] = self._beyond(-first, keep, fade)
        right[-1] = self._beyond(last, keep, fade)
        for at in range(1, number.size):
            left[at] = weights[at - 1] + keep * left[at - 1]
            right[-1 - at] = weights[-at] + keep * right[-at]
        return weights, left, right

    def _beyond(self, number: int, keep: float, fade: float) -> float:
        """Σ over j >= 0 of keep^j times the area of peak number + 1 + j."""
        if number >= 0:
            far = self.bunching * fade ** (number + 1) / (1 - keep * fade)
            return float(1 / (1 - keep) + far)
        total, factor = 0.0, 1.0
        for one in range(number + 1, 1):
            total += factor * (self.central if one == 0 else 1 + self.bunching * fade ** abs(one))
            factor *= keep
        return total + factor * self._beyond(0, keep, fade)

    def _cell(self, place: Array, weights: Array, left: Array, right: Array) -> Array:
        """Integral within the cell of a peak, up to a place counted from the peak."""
        tail = np.exp(-np.abs(place) / self.decay)
        own = peak_integral(delay=place, decay=self.decay, jitter=self.jitter, tail=tail)
        total = weights * own
        if self.period > 600 * self.decay:
            return np.asarray(total)
        keep = np.exp(-self.period / self.decay)
        near, far = keep / tail, keep * tail
        after = place >= 0
        both = right * np.where(after, near, far) - left * np.where(after, far, near)
        return np.asarray(total + np.exp((self.jitter / self.decay) ** 2 / 2) / 2 * both)


def dip_share(*, edges: Array, decay: float, jitter: float, centre: float) -> Array:
    r"""Mean over each bin of :math:`e^{-|t|/\tau}` convolved with a Gaussian of unit area.

    edges: of n bins, (n + 1,) or two rows (2, n) [s]; jitter: standard deviation [s].
    """
    low, high = (edges[:-1], edges[1:]) if edges.ndim == 1 else (edges[0], edges[1])
    upper = peak_integral(delay=high - centre, decay=decay, jitter=jitter)
    lower = peak_integral(delay=low - centre, decay=decay, jitter=jitter)
    return np.asarray(2 * decay * (upper - lower) / (high - low))
