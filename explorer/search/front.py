"""What one goal costs of another: designs of which none is better in both."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import Requirement
from ..domain import InputError, quoted
from .descent import Descent
from .found import Found, Front, Goal, goal_of, why_front
from .optimum import starts_for
from .scale import Array
from .starts import chosen, merged, sample, screen
from .task import NEARER, Seen, Task, bent, make_task

#: Weight of the other goal: of equals in the one the better in the other.
OTHER = 1e-6

#: The second start of an aim lies at least this far from the first.
APART = 0.05

#: Most designs of a front.
MOST = 200

#: Designs that differ by less in both goals, relatively, are one.
ALIKE = 1e-6


def pareto_front(
    point: Mapping[str, Any],
    goals: Sequence[Goal | str],
    requirements: Sequence[Requirement],
    bounds: Mapping[str, Any],
    count: int = 24,
) -> Front:
    """Designs that meet all requirements, of which none is better in both of two goals.

    goals: two `Goal`s, or names of quantities of which the most is wanted. count: at most so many
    designs. The rest as in `nearest`; requirements may be empty. Raises InputError.
    """
    *_, front = front_steps(point, goals, requirements, bounds, count)
    return front


def front_steps(
    point: Mapping[str, Any],
    goals: Sequence[Goal | str],
    requirements: Sequence[Requirement],
    bounds: Mapping[str, Any],
    count: int = 24,
) -> Iterator[Front]:
    """The same in slices of some ten milliseconds: what is known of the front after each."""
    pair = _pair(goals)
    if isinstance(count, bool) or not isinstance(count, int) or not 2 <= count <= MOST:
        raise InputError(f"a front has 2 to {MOST} designs, not {quoted(count)}")
    return _steps(make_task(point, requirements, bounds, pair), pair, count)


def _pair(goals: Any) -> tuple[Goal, Goal]:
    if not isinstance(goals, list | tuple) or len(goals) != 2:
        raise InputError("a front is of two goals; give two quantities")
    one, other = (goal_of(goal) for goal in goals)
    if one.quantity == other.quantity:
        raise InputError(f"both goals are {one.quantity}; a front is of two quantities")
    return one, other


@dataclass(frozen=True)
class Aim:
    """One place on the front: most of one goal with at least a level (as worth) of the other."""

    goal: int
    level: float = -np.inf


def _steps(task: Task, goals: tuple[Goal, Goal], count: int) -> Iterator[Front]:
    kept: list[Found] = []
    if task.space.names:
        for _ in _search(task, count, kept):
            yield _front(task, goals, kept)
    else:
        task.look(task.space.start[None])
        kept.append(task.found())
    task.over = True
    yield _front(task, goals, kept)


def _search(task: Task, count: int, kept: list[Found]) -> Iterator[None]:
    """Both ends, a rough front, then evenly along it; `kept` gets the designs, each checked."""
    yield from screen(task, sample(task.space))
    aims, few = [Aim(0), Aim(1)], starts_for(task) // 2
    places = [chosen(task, few, aim.goal) for aim in aims]
    problem = np.repeat([0, 1], [len(some) for some in places])
    yield from _descend(task, aims, np.concatenate(places), problem)
    if not task.best:
        return
    for share in (3, 1):
        aims = [Aim(0), Aim(1), *_levels(task, (count - 2) // share)]
        starts: list[tuple[int, Array]] = []
        for found in _warm(task, aims):
            starts += found
            yield
        who = np.array([index for index, _ in starts])
        yield from _descend(task, aims, np.array([place for _, place in starts]), who)
    for found in _warm(task, aims):
        made = [task.checked_at(place) for _, place in found[:1]]
        kept += [one for one in made if one not in kept]
        yield


def _descend(
    task: Task, aims: Sequence[Aim], places: Array, problem: NDArray[np.int64]
) -> Iterator[None]:
    """Go down from places (k, n), each towards one of the aims."""
    goal = np.array([aim.goal for aim in aims])
    level = np.array([aim.level for aim in aims])

    def outcome(rows: Array, who: NDArray[np.int64]) -> Array:
        seen, at = task.look(rows), np.arange(len(rows))
        one, other = seen.goals[at, goal[who]], seen.goals[at, 1 - goal[who]]
        beyond = bent(other - level[who])
        columns = [-one - OTHER * other, *(seen.margins - task.inner).T, beyond]
        return np.stack(columns, axis=1)

    space = task.space
    descent = Descent(outcome, places, problem, space.start, NEARER * space.width**2, space.grain)
    for _ in descent.steps():
        task.done, task.starts = int((~descent.going).sum()), len(places)
        yield
    task.done = task.starts


def _levels(task: Task, count: int) -> list[Aim]:
    """Aims evenly along the front as it is known so far.

    Each holds the goal that changes more there: the level of the other would hardly tell it apart.
    """
    corners = _outline(task)
    size = np.ptp(corners, axis=0)
    if len(corners) < 2 or not np.all(size > ALIKE):
        return []
    pieces = np.diff(corners, axis=0) / size
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*pieces.T))])
    aims = []
    for at in along[-1] * (np.arange(count) + 1) / (count + 1):
        piece = min(int(np.searchsorted(along, at, side="right")) - 1, len(pieces) - 1)
        held = int(np.argmax(np.abs(pieces[piece])))
        aims.append(Aim(1 - held, float(np.interp(at, along, corners[:, held]))))
    return aims


def _outline(task: Task) -> Array:
    """Goals (k, 2), as worth, of the designs seen that none of the others beats, in order."""
    seen = merged(task.seen)
    goals = seen.goals[seen.met]
    goals = goals[np.lexsort((-goals[:, 1], -goals[:, 0]))]
    ahead = np.concatenate([[-np.inf], np.maximum.accumulate(goals[:, 1])[:-1]])
    return np.asarray(goals[goals[:, 1] > ahead][::-1])


def _ranking(seen: Seen, aim: Aim) -> Array:
    """What is to become small of designs for an aim; ∞ where they do not serve it."""
    fits = seen.met & (seen.goals[:, 1 - aim.goal] >= aim.level)
    worth = seen.goals[:, aim.goal] + OTHER * seen.goals[:, 1 - aim.goal]
    return np.where(fits, -worth, np.inf)


def _warm(task: Task, aims: Sequence[Aim]) -> Iterator[list[tuple[int, Array]]]:
    """For each aim its number and place, of the best that is known and of the best apart from it."""
    seen = merged(task.seen)
    for index, aim in enumerate(aims):
        ranking = _ranking(seen, aim)
        first = int(np.argmin(ranking))
        near = np.abs(seen.places - seen.places[first]).max(axis=1) < APART
        second = int(np.argmin(np.where(near, np.inf, ranking)))
        yield [(index, seen.places[at]) for at in (first, second) if np.isfinite(ranking[at])]


def _front(task: Task, goals: tuple[Goal, Goal], kept: Sequence[Found]) -> Front:
    """The designs that none of the others beats, in order."""
    rows = [entry for entry in kept if entry.met]
    values = np.array([[entry.outcome[goal.quantity] for goal in goals] for entry in rows])
    values = values.reshape(-1, 2)
    sign = np.array([1.0 if goal.most else -1.0 for goal in goals])
    order = [
        at
        for at in np.lexsort((-sign[1] * values[:, 1], sign[0] * values[:, 0]))
        if not _beaten(sign * values, at)
    ]
    order = _distinct(values, order)
    reason = why_front(goals, values[order], task.space.given) if order else task.found().reason
    points = tuple(rows[at].point for at in order)
    return Front(points, values[order], goals, reason, task.done, task.starts)


def _beaten(worth: Array, at: int) -> bool:
    """Whether another design is as good in both goals and better in one."""
    as_good = np.all(worth >= worth[at], axis=1) & np.any(worth > worth[at], axis=1)
    return bool(as_good.any())


def _distinct(values: Array, order: Sequence[int]) -> list[int]:
    """Of designs that are alike in both goals the first."""
    kept: list[int] = []
    for at in order:
        if not kept or not np.allclose(values[at], values[kept[-1]], rtol=ALIKE, atol=0):
            kept.append(int(at))
    return kept
