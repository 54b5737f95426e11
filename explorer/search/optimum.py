"""The nearest design that meets the requirements, and the best one under them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any

import numpy as np

from ..design import Requirement
from .descent import Descent
from .found import Found, Goal, goal_of
from .scale import Array
from .starts import around, chosen, sample, screen
from .task import NEARER, Task, make_task

#: Starts of one descent.
STARTS = 8


def nearest(
    point: Mapping[str, Any], requirements: Sequence[Requirement], bounds: Mapping[str, Any]
) -> Found:
    """The design nearest to a point that meets all requirements.

    point: input name -> SI value, one design; whole values stay. bounds: input -> (low, high) in SI:
    what may change. Distances are Euclidean, each input in parts of its slider's range, in the
    logarithm where that is. Where there is none, the compromise with the largest worst margin.
    Raises InputError for bounds that are none, an empty or contradictory list, a bad point.
    """
    *_, found = nearest_steps(point, requirements, bounds)
    return found


def nearest_steps(
    point: Mapping[str, Any], requirements: Sequence[Requirement], bounds: Mapping[str, Any]
) -> Iterator[Found]:
    """The same in slices of some tens of milliseconds: the best so far after each, the answer last."""
    return _steps(make_task(point, requirements, bounds))


def best(
    point: Mapping[str, Any],
    goal: Goal | str,
    requirements: Sequence[Requirement],
    bounds: Mapping[str, Any],
) -> Found:
    """The design with the most (or least) of a quantity that meets all requirements.

    goal: a `Goal`, or the name of a quantity of which the most is wanted. The rest as in `nearest`;
    requirements may be empty. Of equals the nearest to the point. `value` is that of the goal.
    """
    *_, found = best_steps(point, goal, requirements, bounds)
    return found


def best_steps(
    point: Mapping[str, Any],
    goal: Goal | str,
    requirements: Sequence[Requirement],
    bounds: Mapping[str, Any],
) -> Iterator[Found]:
    """The same in slices of some tens of milliseconds: the best so far after each, the answer last."""
    return _steps(make_task(point, requirements, bounds, (goal_of(goal),)))


def _steps(task: Task) -> Iterator[Found]:
    if _settled(task):
        task.over = True
        yield task.found()
        return
    for _ in screen(task, sample(task.space)):
        yield task.found()
    yield from _descend(task)
    if not task.best:
        # A place that meets all may be far smaller than the spacing of the sample: look closer
        # around the least unmet.
        for _ in screen(task, around(chosen(task, 6)[1:], 1024)):
            yield task.found()
        yield from _descend(task)
    if not task.best and task.compromise is not None:
        # What only a design or two meet, to the last digit.
        for _ in screen(task, around(task.compromise[1][None], 256, 1e-16, 1e-9)):
            yield task.found()
    if task.best and not task.goals:
        for _ in draw_in(task):
            yield task.found()
    task.over = True
    yield task.found()


def _settled(task: Task) -> bool:
    """Whether there is nothing to search: nothing varies, or the point meets all as it is."""
    space = task.space
    if not space.names:
        task.look(space.start[None])
        return True
    if task.goals or np.any((space.start < 0) | (space.start > 1)):
        return False
    task.look(space.start[None])
    if task.checked_at(space.start).met:
        return True
    task.seen.clear()  # the sample begins with it
    return False


def _descend(task: Task) -> Iterator[Found]:
    """Go down from the best places known, one after the other."""
    places = chosen(task, STARTS)

    def outcome(rows: Array) -> Array:
        seen = task.look(rows)
        goal = -seen.goals[:, :1] if task.goals else np.zeros((len(rows), 1))
        return np.concatenate([goal, seen.margins - task.inner], axis=1)

    scale = (NEARER, 1e-9) if task.goals else (1.0, 1e-11)
    descent = Descent(outcome, task.space, *scale, task.inner / 2)
    task.done, task.starts = 0, len(places)
    for place in places:
        for _ in descent.steps(place):
            yield task.found()
        task.done += 1


def draw_in(task: Task) -> Iterator[None]:
    """Draw the nearest design closer: along the straight line, and input by input.

    The descents follow slopes; this takes what a kink or a step left, and puts an input that need not
    change back exactly.
    """
    parts = np.concatenate([np.logspace(-9, 0, 28), 1 - np.logspace(-9, -1, 9)])
    for _ in range(12):
        value, here = task.best[0]
        ways = [task.space.start - here]
        ways += [way for way in np.diag(ways[0]) if np.any(way)]
        places = np.concatenate([here + np.outer(parts, way) for way in ways])
        task.look(np.clip(places, 0.0, 1.0))
        yield
        if not task.best[0][0] < value:
            return
