"""Even bins of time: the grid that the times of a histogram lie on."""

from __future__ import annotations

from typing import Final

import numpy as np

from .axes import times
from .data import Array, Dropped
from .pairs import Pairs, Rows
from .series import order_note, repeated

#: Distance of a time from the grid, in bins, that is let pass, besides the rounding of its last digit.
_OFF: Final = 0.05
#: And the largest, rounding included.
_MOST_OFF: Final = 0.3
#: Distance, in bins, up to which the times of the file are used as they stand.
_EXACT: Final = 1e-6
#: Farthest bin from the first one.
_MOST_BINS: Final = 10_000_000


def histogram(pairs: Pairs) -> tuple[Array, Array, float, list[str], list[Dropped]]:
    """Middles of bins [s], counts, width [s], sentences, and rows that were left out.

    Raises DataError for a negative count, counts that are all zero, two counts for one time, and
    times that lie on no even grid.
    """
    _check_counts(pairs)
    order = np.argsort(pairs.first, kind="stable")
    values, counts = pairs.first[order], pairs.second[order]
    new = np.concatenate(([True], np.diff(values) > 0))
    again = np.flatnonzero(~new)
    other = again[counts[again] != counts[again - 1]]
    if other.size:
        row = int(order[other[0]])
        raise pairs.error(
            f"{pairs.first[row]:.10g} {pairs.unit} stands in line {pairs.lines[order[other[0] - 1]]} "
            "already, with another count",
            row,
        )
    dropped = repeated(pairs, order, new, "left out")
    kept = order[new]
    notes = order_note(pairs.first)
    if kept.size < 2:
        raise pairs.error("all rows have the same time", 0)
    middles, width, more = _grid(pairs, kept)
    return middles, pairs.second[kept], width, [*notes, *more], [*pairs.dropped, *dropped]


def _check_counts(pairs: Pairs) -> None:
    negative = np.flatnonzero(pairs.second < 0)
    if negative.size:
        row = int(negative[0])
        raise pairs.error(f"{pairs.second[row]:.6g} is a negative count", row)
    if not pairs.second.any():
        raise pairs.error("all counts are zero", 0)


def _grid(pairs: Pairs, kept: Rows) -> tuple[Array, float, list[str]]:
    """The grid through the times of the kept rows, which rise."""
    values = pairs.first[kept]
    numbers, start, width = _fitted(values)
    if numbers[-1] > _MOST_BINS:
        row = int(np.argmax(numbers > _MOST_BINS))
        raise pairs.error(
            f"{values[row]:.10g} {pairs.unit} lies more than {_MOST_BINS:,} bins of {width:.6g} "
            f"{pairs.unit} from the first time",
            int(kept[row]),
        )
    off = np.abs(values - start - width * numbers) / width
    allowed = np.full(off.shape, _OFF)
    if off.max() > _OFF:
        allowed = np.minimum(_OFF + 0.6 * _rounding(pairs, kept) / width, _MOST_OFF)
    if (off > allowed).any() or (np.diff(numbers) < 1).any():
        near = np.diff(numbers, prepend=numbers[0] - 1) < 1
        row = int(np.argmax(np.where(near, np.inf, off)))
        raise pairs.error(
            f"{values[row]:.10g} {pairs.unit} lies on no even grid of bins of {width:.6g} "
            f"{pairs.unit}, the usual step: a histogram has even bins",
            int(kept[row]),
        )
    notes = []
    width = float(f"{width:.12g}")
    if off.max() > _EXACT:
        values = np.array([float(f"{one:.15g}") for one in (start + width * numbers).tolist()])
        notes.append("the times are rounded in the file: the even grid through them is used")
    missing = int(numbers[-1]) + 1 - numbers.size
    if missing:
        notes.append(f"{missing} of {missing + numbers.size} bins are missing, and left out")
    step = float(times(np.array([width]), pairs.unit)[0])
    size = f"{width:.6g} {pairs.unit}" if pairs.unit.step is None else f"{width:.6g} × {pairs.unit}"
    notes.append(f"bins of {size}, times taken as their middles")
    return times(values, pairs.unit), step, notes


def _fitted(values: Array) -> tuple[Array, float, float]:
    """Numbers of bins from 0, the time of the first, and the width, by least squares."""
    steps = np.diff(values)
    width = float(np.median(steps))
    numbers = np.arange(values.size, dtype=np.float64)
    start = float(values[0])
    for _ in range(3):
        # Step by step, so that a small error of the width does not grow with the distance.
        whole = np.rint(steps / width)
        numbers = np.concatenate(([0.0], np.cumsum(whole)))
        middle = numbers.mean()
        spread = float(((numbers - middle) ** 2).sum())
        if spread <= 0:
            break
        mean = float(values.mean())
        width = float(((numbers - middle) * (values - mean)).sum()) / spread
        start = mean - width * float(middle)
    return numbers, start, width


def _rounding(pairs: Pairs, kept: Rows) -> Array:
    """Size of the last printed digit of every time, in the unit of the file, (n,)."""
    places, digits = 0, 1
    for row in kept.tolist():
        mantissa, _, power = pairs.printed[row].strip().lower().replace("d", "e").partition("e")
        whole, _, behind = mantissa.lstrip("+-").partition(".")
        exponent = int(power) if power else 0
        places = max(places, len(behind) - exponent)
        digits = max(digits, len((whole + behind).lstrip("0")))
    finest = 10.0**-places if places < 300 else 0.0
    size = np.abs(pairs.first[kept])
    with np.errstate(divide="ignore"):
        leading = np.floor(np.log10(np.where(size > 0, size, 1e-300)))
    return np.asarray(np.maximum(finest, 10.0 ** (leading + 1 - digits)))
