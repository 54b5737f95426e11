"""A design that was found and is not taken yet."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ..design import Design, Origin
from ..domain import InputError
from ..evaluate import Evaluation
from ..maps import Axis


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


def found_by_search(design: Design, moved: Mapping[str, Any]) -> Design:
    """A design with the values that a search found, in as few digits as keep what it meets."""
    exact = design.with_values(**moved)
    taken = exact
    for digits in (3, 4, 5, 6, 8):
        try:
            short = design.with_values(
                **{name: float(f"{value:.{digits}g}") for name, value in moved.items()}
            )
        except InputError:  # rounded over the end of a range
            continue
        if _met(short) >= _met(exact):
            taken = short
            break
    origins = {name: Origin("typed", "", "found by a search") for name in moved}
    return replace(taken, origins={**taken.origins, **origins})


def _met(design: Design) -> int:
    """How many requirements a design meets."""
    found = design.outcome([entry.quantity for entry in design.requirements])
    return sum(bool(entry.met(found[entry.quantity])) for entry in design.requirements)
