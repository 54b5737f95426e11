"""The inputs that a search may change, within bounds: refusals, and places 0..1 in their box."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from itertools import product
from typing import Any

import numpy as np

from ..design import JOINT
from ..domain import InputError, quoted, real_number
from ..evaluate import FOLLOWING, Evaluation, voiding
from ..inputs import INPUTS
from ..registry import dependencies
from .scale import Array, Scale

#: Relative spacing of floating-point numbers.
GRAIN = float(np.finfo(float).eps)


def checked_bounds(bounds: Any) -> dict[str, tuple[float, float]]:
    """Input -> (lowest, highest), SI. Raises InputError for what cannot bound a search."""
    if not isinstance(bounds, Mapping):
        raise InputError(f"bounds = {quoted(bounds)} is no mapping from inputs to ranges")
    if not bounds:
        raise InputError("the search has no input to change; give bounds for one at least")
    return {name: _pair(name, given) for name, given in bounds.items()}


def _pair(name: Any, given: Any) -> tuple[float, float]:
    if not isinstance(name, str) or name not in INPUTS:
        raise InputError(f"the bounds name {quoted(name)}, which is no input")
    if INPUTS[name].whole:
        raise InputError(f"{name} is no number, so a search cannot change it", name)
    if hasattr(given, "low") and hasattr(given, "high"):
        given = (given.low, given.high)
    plain = isinstance(given, tuple | list) or (isinstance(given, np.ndarray) and given.ndim == 1)
    if not plain or len(given) != 2:
        raise InputError(
            f"the bounds of {name} are a low and a high number, not {quoted(given)}", name
        )
    low, high = (real_number(end) for end in given)
    endless = INPUTS[name].infinite and high == np.inf
    if low is None or high is None or not np.isfinite(low) or not (np.isfinite(high) or endless):
        raise InputError(f"the bounds of {name} must be finite numbers; got {quoted(given)}", name)
    if low > high:
        raise InputError(f"the bounds of {name} run backwards: {low:g} to {high:g}", name)
    return low, high


def check_corners(point: Mapping[str, Any], bounds: Mapping[str, tuple[float, float]]) -> None:
    """InputError where bounds reach outside the domain of their input, beside the point's others.

    Inputs whose domains follow each other are checked at every corner of their bounds.
    """
    joint = [name for name in bounds if name in JOINT]
    cells = [{name: end} for name in bounds if name not in JOINT for end in bounds[name]]
    ends = [sorted(set(bounds[name])) for name in joint]
    cells += [dict(zip(joint, corner, strict=True)) for corner in product(*ends) if joint]
    for cell in cells:
        try:
            Evaluation({**point, **cell})
        except InputError as error:
            raise InputError(f"the bounds reach too far: {error}", error.name) from None


@dataclass(frozen=True, eq=False)
class Space:
    """The box that is searched. A place is a row of fractions 0..1, one for each of `names`.

    given: the point. bounded: the inputs that have bounds; names: those of them that vary and that the
    wanted quantities can depend on. low, high: their bounds; before: their values at the point, SI.
    settled: the values of the others, within their bounds. base: the point with what is settled,
    evaluated; origin: the point itself, evaluated.
    """

    given: Mapping[str, Any]
    bounded: tuple[str, ...]
    names: tuple[str, ...]
    low: Array
    high: Array
    before: Array
    settled: Mapping[str, float]
    base: Evaluation
    origin: Evaluation

    def _positions(self, values: Array) -> Array:
        """Positions on the scales of the inputs (n,)."""
        rows = zip(self.names, values, strict=True)
        return np.array([float(Scale(name).position(value)) for name, value in rows])

    @cached_property
    def bottom(self) -> Array:
        """The low bounds on the scales of the inputs (n,)."""
        return self._positions(self.low)

    @cached_property
    def width(self) -> Array:
        """How far the bounds lie apart on the scales of the inputs (n,)."""
        return self._positions(self.high) - self.bottom

    @cached_property
    def start(self) -> Array:
        """The place of the point (n,), outside 0..1 where it is outside its bounds."""
        return (self._positions(self.before) - self.bottom) / self.width

    def values(self, places: Array) -> Array:
        """SI values at places (rows, n), exactly the given ones and the bounds where they are meant."""
        value = np.empty_like(places)
        for column, name in enumerate(self.names):
            here = places[:, column]
            raw = Scale(name).value(self.bottom[column] + self.width[column] * here)
            raw = np.clip(raw, self.low[column], self.high[column])
            raw = np.where(here <= 0, self.low[column], raw)
            raw = np.where(here >= 1, self.high[column], raw)
            value[:, column] = np.where(here == self.start[column], self.before[column], raw)
        return value

    def places(self, values: Array) -> Array:
        """Places of SI values (rows, n)."""
        columns = [Scale(name).position(values[:, at]) for at, name in enumerate(self.names)]
        return np.asarray((np.stack(columns, axis=1) - self.bottom) / self.width)

    def evaluation(self, places: Array) -> Evaluation:
        """The point evaluated at places, arrays of shape (rows,)."""
        values = self.values(places)
        return self.base.changed({name: values[:, at] for at, name in enumerate(self.names)})

    def following(self, places: Array) -> Array:
        """The same places, with the inputs that have a default which follows others put at it."""
        loose = [at for at, name in enumerate(self.names) if name in FOLLOWING]
        if not loose:
            return places
        values = self.values(places)
        others = {name: values[:, at] for at, name in enumerate(self.names) if at not in loose}
        try:
            work = self.base.changed(others, without=[self.names[at] for at in loose])
        except InputError:
            return places  # the default cannot be here, the bounds can
        for at in loose:
            values[:, at] = work.value(self.names[at])
        found = np.array(places)
        found[:, loose] = np.clip(self.places(values)[:, loose], 0.0, 1.0)
        return found

    @cached_property
    def grain(self) -> Array:
        """The finest step of a place that a floating-point value can tell, (n,)."""
        ends = np.stack([self.low, np.where(np.isfinite(self.high), self.high, self.low)])
        size = np.max(np.abs(ends), axis=0)
        steps = [
            abs(float(Scale(name).position(at * (1 + 4 * GRAIN)) - Scale(name).position(at)))
            for name, at in zip(self.names, size, strict=True)
        ]
        return np.maximum(np.asarray(steps) / self.width, GRAIN)

    def point(self, place: Array) -> dict[str, Any]:
        """The complete point at a place (n,): what is given, with what changed.

        An input that was not given is left out where its default gives the same value, so that it
        keeps following.
        """
        values = self.values(np.asarray(place)[None])[0]
        moved = dict(self.settled) | dict(zip(self.names, map(float, values), strict=True))
        made = {
            name: value if INPUTS[name].whole else float(value)
            for name, value in self.given.items()
        }
        made |= moved
        for name in moved:
            if name not in self.given and self._follows(made, name):
                del made[name]
        return made

    @staticmethod
    def _follows(made: Mapping[str, Any], name: str) -> bool:
        """Whether an input has the same value where it is not given."""
        try:
            bare = Evaluation({key: value for key, value in made.items() if key != name})
        except InputError:
            return False
        return bool(float(bare.value(name)) == made[name])

    def reaches(self, quantity: str) -> bool:
        """Whether a quantity can depend on any input that varies."""
        return not reached([quantity], frozenset({*self.given, *self.bounded})).isdisjoint(
            self.names
        )

    def changes(self, point: Mapping[str, Any]) -> dict[str, tuple[float, float]]:
        """Bounded inputs that differ between the given point and another: (before, after), SI."""
        work = Evaluation(point)
        pairs = {
            name: (float(self.origin.value(name)), float(work.value(name))) for name in self.bounded
        }
        return {name: pair for name, pair in pairs.items() if pair[0] != pair[1]}

    def distance(self, point: Mapping[str, Any]) -> float:
        """How far a point lies from the given one, on the scales of the inputs."""
        ends = [Scale(name).position(pair) for name, pair in self.changes(point).items()]
        return float(np.linalg.norm([after - before for before, after in ends]))


def make_space(
    point: Mapping[str, Any], bounds: Mapping[str, tuple[float, float]], wanted: Iterable[str]
) -> Space:
    """The box of checked bounds around one design, for wanted quantities. Raises InputError."""
    origin = Evaluation(point)
    if origin.shape:
        raise InputError("a search starts from one design; give single numbers, no arrays")
    check_corners(point, bounds)
    reach = reached(wanted, frozenset({*point, *bounds}))
    names = tuple(name for name, (low, high) in bounds.items() if low < high and name in reach)
    inside, settled = {}, {}
    for name, (low, high) in bounds.items():
        before = float(origin.value(name))
        inside[name] = min(max(before, low), high)
        stays = inside[name] == before and name not in point and name not in FOLLOWING
        if name not in names and not stays:
            settled[name] = inside[name]
    base = Evaluation({**point, **settled, **{name: inside[name] for name in names}})
    for name in wanted:
        base.result(name)  # what does not vary is worked out once
    ends = np.array([bounds[name] for name in names], dtype=float).reshape(-1, 2)
    start = np.array([float(origin.value(name)) for name in names])
    bounded = tuple(bounds)
    return Space(point, bounded, names, ends[:, 0], ends[:, 1], start, settled, base, origin)


def reached(wanted: Iterable[str], given: frozenset[str]) -> frozenset[str]:
    """The inputs that any of the wanted quantities can depend on, where `given` have values."""
    needed = [part for name in wanted for part in (name, *voiding(name))]
    return frozenset[str]().union(*(dependencies(name, given) for name in needed))
