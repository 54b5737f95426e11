"""A design that was found and is not taken yet."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from decimal import ROUND_CEILING, ROUND_FLOOR, Decimal
from itertools import islice, product
from typing import Any

import numpy as np

from ..design import Design, Origin
from ..domain import InputError
from ..evaluate import Evaluation
from ..maps import Axis

#: Digits in which a found value may be taken, and ways to round that are tried with each.
DIGITS, WAYS = (3, 4, 5, 6, 8), 16


@dataclass(frozen=True, eq=False)
class Proposal:
    """point: complete, SI. words: beside it on the map. path: the designs that it was chosen from."""

    point: Mapping[str, Any]
    words: str
    path: tuple[Mapping[str, Any], ...] = ()

    def on(self, x: Axis, y: Axis) -> dict[str, Any]:
        """Where it lies on a map, in fractions of the axes, as the canvas takes it."""
        return {
            "place": _place(self.point, x, y),
            "path": [_place(point, x, y) for point in self.path],
            "text": self.words,
        }


def _place(point: Mapping[str, Any], x: Axis, y: Axis) -> list[float]:
    work = Evaluation(point)
    found = [float(axis.fraction(float(work.value(axis.name)))) for axis in (x, y)]
    return [float(value) for value in np.clip(np.nan_to_num(found), -0.05, 1.05)]


def moved_to(design: Design, point: Mapping[str, Any]) -> dict[str, float]:
    """The inputs that a complete point has other values of than a design."""
    return {
        name: value
        for name, value in point.items()
        if name not in design.point or design.point[name] != value
    }


def found_by_search(design: Design, moved: Mapping[str, Any]) -> Design:
    """A design with the values that a search found, in as few digits as keep what it meets."""
    taken = design.with_values(**moved)
    met = _met(taken)
    for short in _shortened(design, moved):
        if met <= _met(short):
            taken = short
            break
    origins = {name: Origin("typed", "", "found by a search") for name in moved}
    return replace(taken, origins={**taken.origins, **origins})


def _shortened(design: Design, moved: Mapping[str, Any]) -> Iterator[Design]:
    """The same in few digits: with more and more of them, rounded to the next and then either way."""
    names = list(moved)
    for digits in DIGITS:
        ways = [_rounded(moved[name], digits) for name in names]
        for chosen in islice(product(*ways), WAYS):
            try:
                yield design.with_values(**dict(zip(names, chosen, strict=True)))
            except InputError:  # rounded over the end of a range
                continue


def _rounded(value: float, digits: int) -> list[float]:
    """A value in few digits, the nearest first."""
    if not np.isfinite(value) or value == 0:
        return [value]
    exact = Decimal(value)
    step = Decimal(1).scaleb(exact.adjusted() - digits + 1)
    ends = [float(exact.quantize(step, rounding)) for rounding in (ROUND_FLOOR, ROUND_CEILING)]
    return sorted(dict.fromkeys(ends), key=lambda end: abs(end - value))


def _met(design: Design) -> set[int]:
    """Which of its requirements a design meets."""
    found = design.outcome([entry.quantity for entry in design.requirements])
    return {
        at for at, entry in enumerate(design.requirements) if bool(entry.met(found[entry.quantity]))
    }
