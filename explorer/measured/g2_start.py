"""Where to start the fit of coincidences: the period, the centre, the areas of peaks, the dip."""

from __future__ import annotations

import numpy as np

from .data import Coincidences, DataError
from .noise import Array


def found_period(data: Coincidences, full: Array) -> float:
    """Period of the peaks [s], from the autocorrelation of a histogram on an even grid.

    Raises DataError where none stands out.
    """
    net = full - np.mean(full)
    size = 1 << int(np.ceil(np.log2(2 * full.size)))
    power = np.abs(np.fft.rfft(net, size)) ** 2
    alike = np.fft.irfft(power, size)[: full.size]
    lags = np.arange(full.size)
    alike = alike / np.maximum(full.size - lags, 1)
    usable = alike[: full.size // 2]
    falling = np.flatnonzero(usable < 0)
    if falling.size == 0:
        raise DataError("no period of pulses can be seen: give the period", data.name)
    # The first high maximum after the correlation has fallen below zero.
    beyond = usable[falling[0] :]
    noise = np.sqrt(2 * np.var(full) ** 2 / full.size)
    top = float(np.max(beyond))
    if top < 4 * noise:
        raise DataError("no period of pulses can be seen: give the period", data.name)
    first = int(np.argmax(beyond > 0.7 * top)) + int(falling[0])
    after = np.flatnonzero(usable[first:] < 0.5 * top)
    last = first + (int(after[0]) if after.size else 1)
    peak = first + int(np.argmax(usable[first:last]))
    return _sharpened(usable, peak, top) * data.width


def _sharpened(alike: Array, lag: int, top: float) -> float:
    """The lag of the furthest repeat that can be told, over its number."""
    best = float(lag)
    number = 2
    while (number + 0.5) * best < alike.size:
        around = round(number * best)
        half = max(int(0.2 * best), 1)
        piece = alike[around - half : around + half + 1]
        if piece.size == 0 or np.max(piece) < 0.3 * top:
            break
        best = (around - half + int(np.argmax(piece))) / number
        number += 1
    return best


def comb_centre(times: Array, counts: Array, period: float) -> float:
    """Where the peaks lie in the period [s], −period/2 to period/2: the phase of the counts."""
    phase = np.angle(np.sum(counts * np.exp(2j * np.pi * times / period)))
    return float(phase) * period / (2 * np.pi)


def window_areas(
    data: Coincidences, centre: float, period: float
) -> tuple[tuple[int, float, float], ...]:
    """Counts in windows of one period about each peak: (number, counts, error).

    Windows that reach past the data or that lack bins are left out. error: √counts where the data
    are counts.
    """
    place = (data.times - centre) / period
    number = np.rint(place).astype(np.int64)
    rows = []
    for one in range(int(number[0]), int(number[-1]) + 1):
        inside = number == one
        low, high = centre + (one - 0.5) * period, centre + (one + 0.5) * period
        ends = (
            data.times[0] - data.width / 2 <= low + data.width / 2,
            (high - data.width / 2 <= data.times[-1] + data.width / 2),
        )
        if not all(ends) or np.sum(inside) < np.floor(period / data.width - 1e-6):
            continue
        area = float(np.sum(data.counts[inside]))
        rows.append((one, area, float(np.sqrt(max(area, 1.0)))))
    return tuple(rows)


def decay_guess(place: Array, counts: Array, period: float) -> float:
    """Mean distance of the counts from their peak [s], background taken from the emptiest tenth.

    place: delay from the nearest peak [s].
    """
    bins = max(min(40, place.size // 4), 4)
    which = np.minimum((np.abs(place) / (period / 2) * bins).astype(np.int64), bins - 1)
    total = np.bincount(which, counts, bins)
    many = np.maximum(np.bincount(which, minlength=bins), 1)
    mean = total / many
    net = np.maximum(mean - np.min(mean), 0.0)
    middle = (np.arange(bins) + 0.5) / bins * period / 2
    return float(np.sum(net * middle) / max(np.sum(net), 1e-300))
