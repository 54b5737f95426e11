"""Rows in the order of their axis, with repeated ones made one."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from .data import Array, Dropped
from .pairs import Pairs, Rows

#: Largest level of a decibel scale that is taken for one.
_MOST_DECIBELS: Final = 1000.0
#: Names of such a scale, in lower case.
_LEVELS: Final = ("db", "dbm", "dbi", "decibel", "decibels", "dbr", "dbc")


@dataclass(frozen=True)
class Series:
    """Rows in ascending order of an axis without repetition.

    axis, values, lines, repeats (how many rows were averaged): (n,).
    """

    axis: Array
    values: Array
    lines: Rows
    repeats: Array
    notes: list[str]
    dropped: list[Dropped]


def order_note(axis: Array, *, rising: bool = True) -> list[str]:
    """What is said of an axis that was sorted. rising: whether it is expected to rise in the file."""
    steps = np.diff(axis)
    if (steps >= 0).all() or (not rising and (steps <= 0).all()):
        return []
    if (steps <= 0).all():
        return ["the axis runs backwards in the file: sorted"]
    return ["the axis is not in order in the file: sorted"]


def averaged(pairs: Pairs, axis: Array, values: Array, *, rising: bool = True) -> Series:
    """Rows sorted by `axis`, those of the same place averaged and listed as dropped.

    axis: in any unit, (n,), of the rows of `pairs`; values: (n,).
    """
    order = np.argsort(axis, kind="stable")
    places, rows, lines = axis[order], values[order], pairs.lines[order]
    new = np.concatenate(([True], np.diff(places) > 0))
    starts = np.flatnonzero(new)
    repeats = np.diff(np.append(starts, places.size)).astype(np.float64)
    notes = order_note(axis, rising=rising)
    if starts.size == places.size:
        return Series(places, rows, lines, repeats, notes, [])
    mean = np.add.reduceat(rows, starts) / repeats
    notes.append(f"rows that repeat a place on the axis: {places.size - starts.size}, averaged")
    return Series(
        places[starts], mean, lines[starts], repeats, notes, repeated(pairs, order, new, "averaged")
    )


def repeated(pairs: Pairs, order: Rows, new: NDArray[np.bool_], what: str) -> list[Dropped]:
    """Rows that repeat the place of an earlier one. order: of the rows; new: (n,), in that order."""
    first = np.maximum.accumulate(np.where(new, np.arange(new.size), 0))
    again = np.flatnonzero(~new)
    rows, earlier = order[again], order[first[again]]
    places, lines = pairs.first[rows].tolist(), pairs.lines
    found = [
        Dropped(line, f"{place:.10g} {pairs.unit} stands in line {before} already: {what}")
        for place, line, before in zip(
            places, lines[rows].tolist(), lines[earlier].tolist(), strict=True
        )
    ]
    return sorted(found, key=lambda one: one.line)


def linear(pairs: Pairs, notes: list[str]) -> Array:
    """The second column; levels in decibels become powers, relative to the highest."""
    if pairs.value_unit.strip().lower() not in _LEVELS:
        return pairs.second
    far = np.abs(pairs.second) > _MOST_DECIBELS
    if far.any():
        row = int(np.argmax(far))
        raise pairs.error(f"{pairs.second[row]:.6g} {pairs.value_unit} is no level of a power", row)
    notes.append(f"levels in {pairs.value_unit} were made powers, ten to the tenth of each")
    return np.asarray(10.0 ** ((pairs.second - pairs.second.max()) / 10.0))
