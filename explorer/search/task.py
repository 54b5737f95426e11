"""What a search asks of every place: goals, margins, and the best that it has seen."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import Requirement, all_requirements
from ..domain import InputError
from ..evaluate import Evaluation
from ..frozen import Frozen
from ..maps import margins
from .found import Found, Goal, why_best, why_met, why_missed
from .scale import Array
from .space import Space, checked_bounds, make_space

#: Margin that a search keeps inside each requirement, so that rounding breaks none.
INNER = 1e-8

#: Margins beyond this are bent, so that none is so far that the others vanish beside it.
FAR = 1e3

#: Stands for the margin, or the goal, of what has no number.
NO_NUMBER = -1e5

#: Weight of the distance where a goal comes first: of equals the nearest.
NEARER = 1e-6

#: How many of the best are kept.
KEPT = 12


def checked_requirements(requirements: Any) -> tuple[Requirement, ...]:
    """Requirements as a tuple. Raises InputError for none of them, and for a contradiction."""
    found = all_requirements(requirements)
    for name, low, high in windows(found):
        if low > high:
            raise InputError(
                f"{name} cannot be at least {low:g} and at most {high:g}: "
                "the two requirements contradict each other"
            )
    return found


def windows(requirements: Sequence[Requirement]) -> list[tuple[str, float, float]]:
    """Quantity, lowest and highest of each pair of requirements that enclose it."""
    return [
        (least.quantity, least.at_least, most.at_most)
        for least in requirements
        for most in requirements
        if least.quantity == most.quantity
        and least.at_least is not None
        and most.at_most is not None
    ]


def inner_margin(requirements: Sequence[Requirement]) -> float:
    """The margin kept inside: no more than a quarter of the narrowest window."""
    widths = [np.log(high / low) for _, low, high in windows(requirements) if low > 0]
    return float(min([INNER, *(width / 4 for width in widths)]))


@dataclass(frozen=True, eq=False)
class Seen:
    """Places (rows, n) and what they are worth: margins (rows, m), goals (rows, g; more is better),
    met (rows,) and the squared distance (rows,) from the given point within the box."""

    places: Array
    margins: Array
    goals: Array
    met: NDArray[np.bool_]
    far: Array

    @property
    def worst(self) -> Array:
        """The smallest margin of each; ∞ where nothing is required."""
        return np.asarray(self.margins.min(axis=1, initial=np.inf))


@dataclass(eq=False)
class Task:
    """One search: the box, what is required, what is aimed at, and everything seen so far."""

    space: Space
    requirements: tuple[Requirement, ...]
    goals: tuple[Goal, ...]
    #: Goals as logarithms, unless zero is the best of a quantity and occurs.
    units: list[float] = field(default_factory=list)
    seen: list[Seen] = field(default_factory=list)
    best: list[tuple[float, Array]] = field(default_factory=list)
    compromise: tuple[float, Array] | None = None
    checked: dict[bytes, Found] = field(default_factory=dict)
    inner: float = INNER
    #: Starts that have come to rest, of how many, and whether the search is over.
    done: int = 0
    starts: int = 0
    over: bool = False

    @cached_property
    def wanted(self) -> tuple[str, ...]:
        """The quantities that are asked of every place."""
        return wanted_of(self.requirements, self.goals)

    def look(self, places: Array) -> Seen:
        """Evaluate places (rows, n) and remember them."""
        work, count = self.space.evaluation(places), len(places)
        values = {
            name: np.broadcast_to(np.asarray(work.result(name), dtype=float), (count,))
            for name in self.wanted
        }
        raw = margins(values, self.requirements)
        margin = np.reshape(raw, (len(raw), count)).T
        met = np.ones(count, dtype=bool)
        for entry in self.requirements:
            met &= entry.met(values[entry.quantity])
        goals = np.empty((count, len(self.goals)))
        for at, goal in enumerate(self.goals):
            goals[:, at] = self._worth(at, goal, values[goal.quantity])
            met &= ~np.isnan(values[goal.quantity])
        far = np.sum((self.space.width * (places - self.space.start)) ** 2, axis=1)
        seen = Seen(places, bent(margin), goals, met, far)
        self._remember(seen)
        return seen

    def _worth(self, at: int, goal: Goal, value: Array) -> Array:
        """A goal as what is to become large."""
        sign = 1.0 if goal.most else -1.0
        if len(self.units) <= at:  # the first sample decides
            known = value[value > 0]
            zero = not goal.most and bool(np.any(value <= 0))
            self.units.append(float(np.median(known)) if zero and known.size else 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            worth = value / self.units[at] if self.units[at] else np.log(np.maximum(value, 1e-300))
        return np.where(np.isnan(value), NO_NUMBER, np.clip(sign * worth, NO_NUMBER, -NO_NUMBER))

    def objective(self, seen: Seen, goal: int = 0) -> Array:
        """What is to become small among designs that meet everything, (rows,), for one of the goals."""
        if self.goals:
            return np.asarray(-seen.goals[:, goal] + 0.5 * NEARER * seen.far)
        return 0.5 * seen.far

    def _remember(self, seen: Seen) -> None:
        self.seen.append(seen)
        objective = self.objective(seen)
        rows = np.flatnonzero(seen.met)
        if rows.size:
            rows = rows[np.argsort(objective[rows], kind="stable")[:KEPT]]
            known = {place.tobytes() for _, place in self.best}
            fresh = [(float(objective[at]), seen.places[at]) for at in rows]
            fresh = [entry for entry in fresh if entry[1].tobytes() not in known]
            self.best = sorted([*self.best, *fresh], key=lambda entry: entry[0])[:KEPT]
        value = seen.worst - NEARER * seen.far
        at = int(np.argmax(value))
        if self.compromise is None or value[at] > self.compromise[0]:
            self.compromise = (float(value[at]), seen.places[at])

    def everything(self) -> Seen:
        """Everything seen so far as one."""
        names = ("places", "margins", "goals", "met", "far")
        parts = [[getattr(entry, name) for entry in self.seen] for name in names]
        self.seen = [Seen(*map(np.concatenate, parts))]
        return self.seen[0]

    def found(self) -> Found:
        """The best so far, checked as one design by itself."""
        places = [place for _, place in self.best]
        found = next((made for made in map(self.checked_at, places) if made.met), None)
        if found is None:
            assert self.compromise is not None  # something has been looked at
            found = self.checked_at(self.compromise[1])
        reason = self._reason(found)
        return replace(found, reason=reason, done=self.done, starts=self.starts)

    def checked_at(self, place: Array) -> Found:
        """What the design at a place is worth, checked by itself; without its reason."""
        key = place.tobytes()
        if key not in self.checked:
            self.checked[key] = self._found_at(self.space.point(place))
        return self.checked[key]

    def _found_at(self, point: Mapping[str, Any]) -> Found:
        work = Evaluation(point)
        outcome = {name: float(work.result(name)) for name in self.wanted}
        missed = [entry for entry in self.requirements if not entry.met(outcome[entry.quantity])]
        sizes = np.nan_to_num(np.array(margins(outcome, missed), dtype=float), nan=-np.inf)
        value = outcome[self.goals[0].quantity] if self.goals else None
        return Found(
            Frozen(point),
            met=not missed and not (value is not None and np.isnan(value)),
            reason="",
            distance=self.space.distance(point),
            changes=Frozen(self.space.changes(point)),
            outcome=Frozen(outcome),
            failing=missed[int(np.argmin(sizes))] if missed else None,
            value=value,
        )

    def _reason(self, found: Found) -> str:
        if found.failing is not None:
            moved = self.space.reaches(found.failing.quantity)
            return why_missed(found.failing, found, moved=moved, over=self.over)
        if self.goals:
            goal = self.goals[0]
            return why_best(goal, float(self.space.origin.result(goal.quantity)), found)
        return why_met(found)


def wanted_of(requirements: Sequence[Requirement], goals: Sequence[Goal]) -> tuple[str, ...]:
    """The quantities of requirements and goals, each once."""
    names = [entry.quantity for entry in requirements] + [goal.quantity for goal in goals]
    return tuple(dict.fromkeys(names))


def bent(margin: Array) -> Array:
    """Margins as numbers that differences can be taken of: those beyond FAR in their logarithm."""
    size = np.abs(margin)
    with np.errstate(divide="ignore", invalid="ignore"):
        beyond = np.sign(margin) * FAR * (1 + np.log(size / FAR))
    found = np.where(size > FAR, beyond, margin)
    return np.where(np.isnan(found), NO_NUMBER, np.clip(found, NO_NUMBER, -NO_NUMBER))


def make_task(
    point: Mapping[str, Any], requirements: Any, bounds: Any, goals: tuple[Goal, ...] = ()
) -> Task:
    """A search that is ready to start. Raises InputError."""
    wanted = checked_requirements(requirements)
    if not wanted and not goals:
        raise InputError("nothing is required, so the design meets everything as it is")
    space = make_space(point, checked_bounds(bounds), wanted_of(wanted, goals))
    return Task(space, wanted, goals, inner=inner_margin(wanted))
