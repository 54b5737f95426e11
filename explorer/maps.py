"""Maps: quantities over any two inputs, outlines and frontiers as iso-lines of quantities."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .design import Requirement
from .domain import InputError, quoted, real_number
from .evaluate import Evaluation
from .inputs import INPUTS
from .registry import REGISTRY

Array = NDArray[np.float64]

#: Iso-lines on which the regime changes: quantity, level, name.
FRONTIERS = (
    ("strong_ratio", 1.0, "strong coupling"),
    ("funnelling_ratio", 1.0, "Γ = κ"),
    ("splitting_ratio", 1.0, "visible doublet"),
)


#: What the ends of an axis must do.
RISES = "must rise from a low to a high number"


@dataclass(frozen=True)
class Axis:
    """One axis of a map: input, lowest and highest value in SI, logarithmic or not, cells."""

    name: str
    low: float
    high: float
    log: bool = True
    count: int = 256

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or self.name not in INPUTS or INPUTS[self.name].whole:
            raise InputError(f"{quoted(self.name)} is no input that can be an axis")
        for end in ("low", "high"):
            object.__setattr__(self, end, self._number(end))
        if self.low >= self.high:
            raise InputError(f"the axis {self.name} {RISES}", self.name)
        if self.log and self.low <= 0:
            raise InputError(
                f"the axis {self.name} is logarithmic and must start above 0", self.name
            )
        if not isinstance(self.count, int | np.integer) or not 2 <= self.count <= 2048:
            raise InputError(
                f"the axis {self.name} takes 2 to 2048 cells, not {quoted(self.count)}", self.name
            )
        object.__setattr__(self, "count", int(self.count))

    def _number(self, end: str) -> float:
        number = real_number(getattr(self, end))
        if number is None or not np.isfinite(number):
            raise InputError(f"the axis {self.name} {RISES}", self.name)
        return number

    @cached_property
    def values(self) -> Array:
        """Values at the centres of the cells, SI, ascending."""
        fractions = (np.arange(self.count) + 0.5) / self.count
        return np.asarray(self.at(fractions))

    def at(self, fraction: Any) -> Any:
        """Value at a fraction 0..1 of the axis."""
        if self.log:
            return self.low * (self.high / self.low) ** np.asarray(fraction)
        return self.low + (self.high - self.low) * np.asarray(fraction)

    def fraction(self, value: Any) -> Any:
        """Fraction 0..1 of the axis at a value; outside the axis beyond 0 or 1."""
        if self.log:
            with np.errstate(divide="ignore", invalid="ignore"):
                return np.log(np.asarray(value) / self.low) / np.log(self.high / self.low)
        return (np.asarray(value) - self.low) / (self.high - self.low)


def mesh(x: Axis, y: Axis) -> dict[str, Array]:
    """The two axes as point entries, shapes (1, nx) and (ny, 1): point | mesh(x, y) is a map."""
    if x.name == y.name:
        raise InputError(f"a map needs two different inputs; both axes are {x.name}", x.name)
    return {x.name: x.values[None, :], y.name: y.values[:, None]}


@dataclass(frozen=True, eq=False)
class Map:
    """Quantities over two inputs. `values`: name -> array (ny, nx), row 0 lowest, NaN: no number."""

    x: Axis
    y: Axis
    values: Mapping[str, NDArray[Any]]
    margin: Array | None
    binding: NDArray[np.int64] | None
    caution: NDArray[np.bool_]

    def lines(self, name: str, levels: Sequence[float]) -> list[list[Array]]:
        """Iso-lines of a quantity: for each level the polylines, (n, 2) in fractions of the axes."""
        return isolines(self.values[name], levels, log=REGISTRY.shown(name).log)

    def outline(self) -> list[Array]:
        """Border of the region that meets every requirement, in fractions of the axes."""
        if self.margin is None:
            return []
        framed = np.pad(self.margin, 1, constant_values=-1e-9)
        ny, nx = self.margin.shape
        found = _polylines(framed, [0.0])[0]
        scale = np.array([nx, ny], dtype=float)
        return [np.clip((line - 0.5) / scale, 0.0, 1.0) for line in found]


def _polylines(field: Array, levels: Sequence[float]) -> list[list[Array]]:
    """Polylines of each level in units of cells: the centre of cell (0, 0) is (0, 0)."""
    import contourpy

    generator = contourpy.contour_generator(z=np.ma.masked_invalid(field))
    return [[np.asarray(line) for line in generator.lines(level)] for level in levels]


def isolines(field: NDArray[Any], levels: Sequence[float], log: bool = False) -> list[list[Array]]:
    """Iso-lines of an array (ny, nx) in fractions of its axes, one list of polylines a level."""
    values = np.asarray(field, dtype=float)
    wanted = [float(level) for level in levels]
    if log:
        with np.errstate(divide="ignore", invalid="ignore"):
            values = np.log(values)
        wanted = [float(np.log(level)) if level > 0 else float("nan") for level in wanted]
    scale = np.array([values.shape[1], values.shape[0]], dtype=float)
    return [[(line + 0.5) / scale for line in lines] for lines in _polylines(values, wanted)]


def margins(found: Mapping[str, Any], requirements: Sequence[Requirement]) -> list[Any]:
    """How far each requirement is met: above 0 met, below 0 missed, NaN no number.

    The natural logarithm of the ratio of value and limit where both are positive, else their
    difference; in the own shape of each quantity. found: the quantities by name.
    """
    margin = []
    for requirement in requirements:
        value = np.asarray(found[requirement.quantity], dtype=float)
        sign = 1.0 if requirement.at_least is not None else -1.0
        limit = requirement.limit
        with np.errstate(divide="ignore", invalid="ignore"):
            if limit > 0:
                ratio = np.log(np.maximum(value, 1e-300) / limit)
                margin.append(sign * np.where(np.isnan(value), np.nan, ratio))
            else:
                margin.append(sign * (value - limit))
    return margin


def make_map(
    point: Mapping[str, Any],
    x: Axis,
    y: Axis,
    wanted: Iterable[str],
    requirements: Sequence[Requirement] = (),
    cautions: Iterable[str] = (),
) -> Map:
    """Quantities of a point over two inputs, with the margin of the requirements.

    point: input name -> SI value, no arrays (entries for the two axes are replaced). wanted:
    quantities. Requirements give `margin` (the smallest, see `margins`) and `binding` (whose it is);
    `caution` is true where any of `cautions` holds. Raises InputError.
    """
    work = Evaluation({**point, **mesh(x, y)})
    shape = (y.count, x.count)
    shown, marks = list(wanted), list(cautions)
    needed = dict.fromkeys([*shown, *(entry.quantity for entry in requirements), *marks])
    worked = {name: work.result(name) for name in needed}
    values = {name: np.broadcast_to(worked[name], shape) for name in shown}
    margin = binding = None
    if requirements:
        found = margins(worked, requirements)
        margin = np.broadcast_to(found[0], shape)
        binding = np.zeros(shape, dtype=np.int64)
        for index, other in enumerate(found[1:], start=1):
            worse = ~(other >= margin)
            binding = np.where(worse, index, binding)
            margin = np.where(worse, other, margin)
    caution = np.zeros(shape, dtype=bool)
    for name in marks:
        caution |= worked[name]
    return Map(x, y, values, margin, binding, caution)


def stacked(bands: Sequence[Map], y: Axis) -> Map:
    """One map from bands of its rows, lowest first; `y` is the axis of the whole."""
    if len(bands) == 1:
        return bands[0]

    def joined(arrays: Sequence[Any]) -> Any:
        return None if arrays[0] is None else np.concatenate(arrays)

    first = bands[0]
    values = {name: joined([band.values[name] for band in bands]) for name in first.values}
    return Map(
        first.x,
        y,
        values,
        joined([band.margin for band in bands]),
        joined([band.binding for band in bands]),
        joined([band.caution for band in bands]),
    )
