"""What a search found, in numbers and in one sentence."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import Requirement, written
from ..domain import InputError, quoted
from ..frozen import Frozen
from ..inputs import INPUTS
from ..registry import REGISTRY
from ..units import text

#: Digits of values in a sentence, and the most where fewer would not tell two apart.
DIGITS, MOST_DIGITS = 3, 12


@dataclass(frozen=True)
class Goal:
    """A quantity of which the most is wanted, or the least. Raises InputError for what is no number."""

    quantity: str
    most: bool = True

    def __post_init__(self) -> None:
        known = REGISTRY.quantities.get(self.quantity) if isinstance(self.quantity, str) else None
        if known is None or known.kind != "number":
            raise InputError(f"{quoted(self.quantity)} is no quantity that can be a goal")
        if not isinstance(self.most, bool):
            raise InputError(f"the most or the least of {self.quantity}: most is True or False")


def goal_of(given: Any) -> Goal:
    """A goal, or the most of a quantity that is given by its name. Raises InputError."""
    return given if isinstance(given, Goal) else Goal(given)


@dataclass(frozen=True)
class Found:
    """The best design of a search so far.

    point: input name -> SI value, complete: what was given with what changed. met: it meets every
    requirement, checked by itself; else it is the compromise with the largest worst margin (see
    `maps.margins`). reason: one sentence. distance: from the given point, each input on the scale of
    its slider. changes: input -> (before, after), SI. outcome: the required quantities and the goal
    there, SI. failing: the requirement that is missed by most, or None. value: of the goal, or None.
    done of starts: how far the search is.
    """

    point: Mapping[str, Any]
    met: bool
    reason: str
    distance: float
    changes: Mapping[str, tuple[float, float]] = field(default_factory=Frozen)
    outcome: Mapping[str, float] = field(default_factory=Frozen)
    failing: Requirement | None = None
    value: float | None = None
    done: int = 0
    starts: int = 0


@dataclass(frozen=True, eq=False)
class Front:
    """Designs of which none is better in one of two goals without being worse in the other.

    points: input name -> SI value each, complete, all requirements met, ordered from the best of the
    second goal to the best of the first. values: (n, 2), SI. goals: the two. reason: why there is
    none, or how many there are. done of starts: how far the search is.
    """

    points: tuple[Mapping[str, Any], ...]
    values: NDArray[np.float64]
    goals: tuple[Goal, Goal]
    reason: str
    done: int = 0
    starts: int = 0


def label(name: str, point: Mapping[str, Any]) -> str:
    """A quantity's label; in free space there is no fibre."""
    free = point.get("destination", INPUTS["destination"].default) != "fibre"
    if free and name == "rate_in_fibre":
        return "Photons/s behind the optics"
    return REGISTRY.quantities[name].label


def apart(one: float, other: float, unit: str) -> tuple[str, str]:
    """Two values in as few digits as tell them apart."""
    pairs = (
        (text(one, unit, count), text(other, unit, count)) for count in range(DIGITS, MOST_DIGITS)
    )
    return next((pair for pair in pairs if pair[0] != pair[1]), (text(one, unit, MOST_DIGITS),) * 2)


def said_changes(changes: Mapping[str, tuple[float, float]]) -> str:
    """'Quality factor 25 → 60 and Mode volume 1 (λ/n)³ → 0.5 (λ/n)³'."""
    parts = []
    for name, (before, after) in changes.items():
        pairs = (
            (_short(name, before, count), _short(name, after, count)) for count in range(4, 18)
        )
        one, other = next(
            (pair for pair in pairs if pair[0] != pair[1]), (repr(before), repr(after))
        )
        parts.append(f"{INPUTS[name].label} {one} → {other}")
    return _listed(parts)


def _short(name: str, value: float, digits: int) -> str:
    return written(name, float(f"{value:.{digits}g}"), 17 if digits > 12 else 12)


def _listed(parts: Sequence[str]) -> str:
    return " and ".join([", ".join(parts[:-1]), parts[-1]] if len(parts) > 1 else parts)


def why_missed(requirement: Requirement, found: Found, *, moved: bool, over: bool) -> str:
    """'Not reachable within these bounds: … is furthest: at best 12 M/s of 20 M/s wanted.'

    moved: whether any input within the bounds reaches the quantity. over: the search is at its end.
    """
    unit = REGISTRY.quantities[requirement.quantity].unit
    best, limit = apart(found.outcome[requirement.quantity], requirement.limit, unit)
    word = "wanted" if requirement.at_least is not None else "allowed"
    name = label(requirement.quantity, found.point)
    start = "Not reachable within these bounds" if over else "Not reached yet"
    end = "" if moved else "; none of these inputs changes it"
    return f"{start}: {name} is furthest: at best {best} of {limit} {word}{end}."


def why_met(found: Found) -> str:
    """What a design that meets everything changed."""
    if not found.changes:
        return "The design meets every requirement as it is."
    return f"Every requirement is met with {said_changes(found.changes)}."


def why_best(goal: Goal, before: float, found: Found) -> str:
    """What the best design for a goal changed; before: the goal at the given point."""
    name, unit = label(goal.quantity, found.point), REGISTRY.quantities[goal.quantity].unit
    after = found.outcome[goal.quantity]
    if math.isnan(after):
        return f"{name} has no number within these bounds."
    word = f"the {'largest' if goal.most else 'smallest'} found within these bounds"
    if not found.changes:
        return f"{name} is {text(after, unit)}, {word}, with nothing changed."
    first, last = apart(before, after, unit)
    return f"{name} goes from {first} to {last}, {word}, with {said_changes(found.changes)}."


def why_front(
    goals: tuple[Goal, Goal], values: NDArray[np.float64], point: Mapping[str, Any]
) -> str:
    """The ends of a front: '24 designs, from … 12 M/s at … 0.03 to 25 M/s at 0.1.'"""
    names = [label(goal.quantity, point) for goal in goals]
    units = [REGISTRY.quantities[goal.quantity].unit for goal in goals]
    first, last = (
        [text(value, unit) for value, unit in zip(row, units, strict=True)]
        for row in values[[0, -1]]
    )
    start = f"{names[0]} {first[0]} at {names[1]} {first[1]}"
    if len(values) == 1:
        return f"One design is the best in both: {start}."
    return f"{len(values)} designs, from {start} to {last[0]} at {last[1]}."
