"""Values and rows that cannot be: an axis outside its own range, inputs that do not go together.

The rules are those of `evaluate`, applied to all rows of a block at once, so that a few rows that
cannot be cost no more than the others.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import JOINT
from ..domain import FARTHEST, InputError, number_of, refuse_first
from ..evaluate import SIDES, Evaluation, limits_of
from ..inputs import INPUTS
from ..registry import Input, parameters

Array = NDArray[np.float64]


class PlanError(InputError):
    """A sweep that cannot be started; the message says in one sentence what is in the way."""


def _outside(entry: Input, value: Any, low: Any, high: Any) -> NDArray[np.bool_]:
    """Where numbers lie outside a range, or are none."""
    under = value <= low if entry.low_open else value < low
    over = (value >= high if entry.high_open else value > high) & np.isfinite(value)
    wild = ~(np.isfinite(value) | (entry.infinite & (value == np.inf)))
    tiny = (value < 1 / FARTHEST) & entry.low_open
    return np.asarray(under | over | wild | tiny)


def _widest(entry: Input) -> tuple[float, float]:
    """The least and the greatest value that an input may have whatever the others are, SI."""

    def end(given: Any, without: float, choose: Callable[[Any], float]) -> float:
        if not callable(given):
            return float(given) if np.isfinite(given) else without
        names = parameters(given)
        corners = itertools.product(*((INPUTS[name].low, INPUTS[name].high) for name in names))
        return choose(given(**dict(zip(names, corner, strict=True))) for corner in corners)

    return end(entry.low, -FARTHEST, min), end(entry.high, FARTHEST, max)


def own_numbers(name: str, given: Any) -> Array:
    """Values of an input as an array; InputError for one that it can never have."""
    entry = INPUTS[name]
    values = number_of(entry, given)
    low, high = _widest(entry)
    bad = _outside(entry, values, low, high)
    if bad.any():
        refuse_first(entry, values, bad, low, high, "")
    return values


def _end(given: Any, without: float, point: Mapping[str, Any]) -> Any:
    """An end of a domain beside the other inputs of a point."""
    if not callable(given):
        return given if np.isfinite(given) else without
    return given(**{name: point.get(name, INPUTS[name].default) for name in parameters(given)})


def culprits(point: Mapping[str, Any]) -> NDArray[Any]:
    """The input at fault of each row, '' where none is; an object array in the shape of its inputs."""
    found: NDArray[Any] = np.array("", dtype=object)
    for name, value in point.items():
        entry = INPUTS[name]
        if entry.whole:
            continue
        low, high = _end(entry.low, -FARTHEST, point), _end(entry.high, FARTHEST, point)
        bad = _outside(entry, value, low, high)
        if bad.any():
            found = np.where(bad & (found == ""), np.array(name, dtype=object), found)
    if "reference_side" in point and "numerical_aperture" in point:
        bad = np.asarray(point["numerical_aperture"] > SIDES[point["reference_side"]])
        aperture = np.array("numerical_aperture", dtype=object)
        found = np.where(bad & (found == ""), aperture, found)
    return found


def mended(point: Mapping[str, Any], found: NDArray[Any]) -> dict[str, Any] | None:
    """The point with each row at fault given the values of one that is not; None where all are.

    Only the inputs at fault, and those that their ranges follow, grow to the shape of `found`.
    """
    bad = np.asarray(found != "")
    cell = np.unravel_index(int(np.argmin(bad)), bad.shape)
    if bad[cell]:
        return None
    faulty = set(found.ravel().tolist()) - {""}
    touched = faulty.union(*(limits_of(name) for name in faulty))
    changed = {}
    for name in touched & point.keys():
        value = np.broadcast_to(point[name], bad.shape)
        changed[name] = np.where(bad, value[cell], value)
    return {**point, **changed}


def parts_that_can_be(
    fixed: Mapping[str, Any], columns: Mapping[str, Array], rows: NDArray[np.intp]
) -> tuple[list[NDArray[np.intp]], list[tuple[NDArray[np.intp], str]]]:
    """Rows in parts that can each be evaluated, and those that cannot, with their culprit.

    For the rare faults that no rule above tells: the different values of what can be at fault are
    sorted and halved until they fit.
    """
    if not rows.size:
        return [], []
    joint = {name: column[rows] for name, column in columns.items() if name in JOINT}
    table = np.stack([np.zeros(rows.size), *joint.values()], axis=1)
    different, kind = np.unique(table, axis=0, return_inverse=True)
    kind = kind.reshape(-1)
    waiting, fitting, bad = [np.arange(len(different))], [], []
    while waiting:
        part = waiting.pop()
        values = {name: different[part, place] for place, name in enumerate(joint, start=1)}
        try:
            Evaluation({**fixed, **values})
        except InputError as error:
            if part.size == 1:
                bad.append((part, error.name or "point"))
            else:
                waiting += [part[: part.size // 2], part[part.size // 2 :]]
        else:
            fitting.append(part)
    order, ends = np.argsort(kind, kind="stable"), np.arange(len(different) + 1)
    ends = np.searchsorted(kind[order], ends)

    def of(part: NDArray[np.intp]) -> NDArray[np.intp]:
        return rows[order[ends[part[0]] : ends[part[-1] + 1]]]

    return [of(part) for part in fitting], [(of(part), name) for part, name in bad]


def reason_of(point: Mapping[str, Any]) -> str:
    """Why a single row cannot be, in the words of `evaluate`; '' where it can."""
    try:
        Evaluation(point)
    except InputError as error:
        return str(error)
    return ""
