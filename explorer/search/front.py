"""What one goal costs of another: designs of which none is better in both."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..design import Requirement
from ..domain import InputError, quoted
from .descent import Descent
from .found import Found, Front, Goal, goal_of, why_front
from .scale import Array
from .starts import chosen, sample, screen
from .task import NEARER, Task, bent, make_task

#: Weight of the other goal: of equals in the one the better in the other.
OTHER = 1e-6

#: Starts of each end.
ENDS = 4

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
    """The same in slices of some tens of milliseconds: what is known of the front after each."""
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
    ends = [Aim(0), Aim(1)]
    places = [chosen(task, ENDS, aim.goal) for aim in ends]
    task.done, task.starts = 0, sum(map(len, places))
    for aim, some in zip(ends, places, strict=True):
        yield from _descend(task, aim, some)
    if not task.best:
        return
    for share in (3, 1):
        aims = [*ends, *_levels(task, (count - 2) // share)]
        task.done, task.starts = 0, len(aims)
        for aim in aims:
            yield from _descend(task, aim, [_nearby(task, aim)])
    for aim in aims:
        made = task.checked_at(_nearby(task, aim))
        kept += [made] if made not in kept else []
        yield


def _descend(task: Task, aim: Aim, places: Iterable[Array]) -> Iterator[None]:
    """Go down from places (n,), one after the other, towards an aim."""

    def outcome(rows: Array) -> Array:
        seen = task.look(rows)
        one, other = seen.goals[:, aim.goal], seen.goals[:, 1 - aim.goal]
        columns = [-one - OTHER * other, *(seen.margins - task.inner).T, bent(other - aim.level)]
        return np.stack(columns, axis=1)

    descent = Descent(outcome, task.space, NEARER, 1e-9, task.inner / 2)
    for place in places:
        yield from descent.steps(place)
        task.done += 1


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
    seen = task.everything()
    goals = seen.goals[seen.met]
    return np.asarray(goals[unbeaten(goals)])


def unbeaten(worth: Array) -> Array:
    """Which rows (k, 2) no other one beats in both, from the best of the second to that of the first."""
    order = np.lexsort((-worth[:, 1], -worth[:, 0]))
    other = worth[order, 1]
    ahead = np.concatenate([[-np.inf], np.maximum.accumulate(other)[:-1]])[: len(other)]
    return np.asarray(order[other > ahead][::-1])


def _nearby(task: Task, aim: Aim) -> Array:
    """The place (n,) of the best design that is known for an aim."""
    seen = task.everything()
    fits = seen.met & (seen.goals[:, 1 - aim.goal] >= aim.level)
    worth = seen.goals[:, aim.goal] + OTHER * seen.goals[:, 1 - aim.goal]
    return np.asarray(seen.places[np.argmax(np.where(fits, worth, -np.inf))])


def _front(task: Task, goals: tuple[Goal, Goal], kept: Sequence[Found]) -> Front:
    """The designs that none of the others beats, in order; of those alike in both goals the first."""
    rows = [entry for entry in kept if entry.met]
    values = np.array([[entry.outcome[goal.quantity] for goal in goals] for entry in rows])
    values = values.reshape(-1, 2)
    order: list[int] = []
    for at in unbeaten(values * [1.0 if goal.most else -1.0 for goal in goals]):
        if not order or not np.allclose(values[at], values[order[-1]], rtol=ALIKE, atol=0):
            order.append(int(at))
    reason = why_front(goals, values[order], task.space.given) if order else task.found().reason
    points = tuple(rows[at].point for at in order)
    return Front(points, values[order], goals, reason, task.done, task.starts)
