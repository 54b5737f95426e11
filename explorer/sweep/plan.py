"""Plans of sweeps: which rows a table has. No plan holds its rows; each is worked out from its index."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..combine import PARTS
from ..design import Design, Unknown
from ..domain import InputError, finite_number, quoted, shown
from ..inputs import INPUTS
from ..sampling import whole_seed
from ..scatter import Spread, check_scatter
from .axes import Slow, base_point, number_axis, plain, record_column, whole_column
from .blocks import Block, Chunk, Layout, digits, layout
from .draws import MOST, Draw, Drawn, correlated, whole_number
from .faults import PlanError, own_numbers

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Plan:
    """The rows of a table; made by `factorial` and `sampled`.

    base: the point of all rows, SI. slow: columns of whole values and records. axes: number columns,
    the last varying fastest. draw: what is drawn in place of axes.
    """

    base: Mapping[str, Any]
    slow: tuple[Slow, ...]
    axes: Mapping[str, Array]
    draw: Draw | None = None

    @property
    def sizes(self) -> tuple[int, ...]:
        """Groups of whole values and records, then entries of each number axis."""
        groups = math.prod(len(column.labels) for column in self.slow)
        fast = (self.draw.count,) if self.draw else (len(values) for values in self.axes.values())
        return groups, *fast

    @property
    def rows(self) -> int:
        """Rows of the table."""
        return math.prod(self.sizes)

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the input columns: records and whole values, then numbers."""
        numbers = self.draw.names if self.draw else tuple(self.axes)
        return (*(column.name for column in self.slow), *numbers)

    def layout(self, chunk: int) -> Layout:
        """How the rows are cut into chunks of at most `chunk` rows."""
        return layout(self.sizes, chunk)

    def chunk(self, cut: Layout, index: int) -> Chunk:
        """The blocks of a chunk, none across two sets of whole values or records."""
        outer, run = cut.place(index)
        if cut.at == 0:
            return tuple(self._block(group, (), None) for group in range(run.start, run.stop))
        return (self._block(outer[0], outer[1:], run),)

    def _block(self, group: int, outer: tuple[int, ...], run: slice | None) -> Block:
        """Rows of a group: single entries of the outer axes, a run of the next, all of the rest."""
        fixed, labels = self.group(group)
        if self.draw:
            run = run or slice(0, self.draw.count)
            return Block(fixed, labels, (), (Drawn(self.draw, run.start, run.stop),))
        names = list(self.axes)
        for name, index in zip(names, outer, strict=False):
            fixed[name] = float(self.axes[name][index])
        rest = names[len(outer) :]
        pieces = [{name: self.axes[name]} for name in rest]
        if run is not None:
            pieces[0] = {rest[0]: self.axes[rest[0]][run]}
        return Block(fixed, labels, tuple(names[: len(outer)]), tuple(pieces))

    def group(self, group: int) -> tuple[dict[str, Any], tuple[tuple[str, str], ...]]:
        """The entries and labels of one set of whole values and records; records come first."""
        places = digits(group, [len(column.labels) for column in self.slow])
        chosen = list(zip(self.slow, places, strict=True))
        fixed = dict(self.base)
        for column, place in sorted(chosen, key=lambda pair: pair[0].name not in PARTS):
            if column.labels[place] or column.name not in PARTS:  # '' is the base's own part
                fixed = {name: value for name, value in fixed.items() if name not in column.drops}
            fixed |= column.entries[place]
        return fixed, tuple((column.name, column.labels[place]) for column, place in chosen)

    def fingerprint(self, wanted: Iterable[str]) -> str:
        """A hash of everything that the table follows from, but for the version of this package."""
        digest = hashlib.sha256()
        slow = [
            [column.name, column.labels, column.drops, [plain(entry) for entry in column.entries]]
            for column in self.slow
        ]
        draw = self.draw and [
            self.draw.count,
            self.draw.seed,
            list(self.draw.ranges.items()),
            list(self.draw.scatter.items()),
            sorted((str(pair), value) for pair, value in self.draw.correlation.items()),
        ]
        digest.update(repr([plain(self.base), slow, draw, list(wanted)]).encode())
        for name, values in self.axes.items():
            digest.update(name.encode() + values.tobytes())
        return digest.hexdigest()

    def words(self) -> dict[str, str]:
        """Each input column in words, for people who find the table later."""
        found = {column.name: ", ".join(column.labels) for column in self.slow}
        for name, values in self.axes.items():
            ends = f"{shown(values[0], INPUTS[name])} to {shown(values[-1], INPUTS[name])}"
            found[name] = f"{len(values)} values, {ends}"
        if self.draw:
            for name, range_ in self.draw.ranges.items():
                ends = f"{shown(range_.low, INPUTS[name])} to {shown(range_.high, INPUTS[name])}"
                found[name] = f"{self.draw.count} draws, {ends}, seed {self.draw.seed}"
            for name, one in self.draw.scatter.items():
                found[name] = f"{self.draw.count} draws, {one.kind} scatter, seed {self.draw.seed}"
        return {
            name: text if len(text) <= 200 else f"{text[:199]}…" for name, text in found.items()
        }


def factorial(base: Mapping[str, Any] | Design, /, *, scaled: bool = False, **axes: Any) -> Plan:
    """Every combination of the values of some inputs, the last varying fastest.

    base: input name -> SI value, or a `Design`. axes: input name -> SI numbers; words of a choice or
    other whole values (a list, or a mapping from the label that stands in the table; None: not given);
    `emitter=`, `resonator=`, `optic=` -> keys of records ('': the base's own part). "all" stands for
    every word of a choice and for every record that has what decides. Whole values and records vary
    slowest. A record replaces the base's values of its part, an axis those of a record. scaled:
    resonators follow the emission. Raises PlanError.
    """
    return _plan(base, axes, scaled, None)


def sampled(
    base: Mapping[str, Any] | Design,
    /,
    count: int,
    seed: int = 0,
    ranges: Mapping[str, Any] | None = None,
    scatter: Mapping[str, Spread] | None = None,
    *,
    correlation: Mapping[Any, float] | None = None,
    scaled: bool = False,
    **axes: Any,
) -> Plan:
    """Random rows: `count` scrambled Sobol draws, the same for every set of whole values and records.

    ranges: input name -> (low, high), SI, or `Unknown`; even on the scale of the input's slider.
    scatter, correlation: as `scattered` has them, about the base's values. axes: whole values and
    records as in `factorial`, no numbers. Raises PlanError.
    """
    for name in axes:
        if name in INPUTS and not INPUTS[name].whole:
            raise PlanError(f"{name} is a number: in a sampled plan give it a range", name)
    try:
        draw = Draw(
            whole_number(count, "count", 1, MOST),
            whole_seed(seed),
            {name: _range(name, given) for name, given in _mapping(ranges, "ranges").items()},
            dict(_mapping(scatter, "scatter")),
            dict(_mapping(correlation, "correlation")),
        )
        check_scatter(draw.scatter)
        correlated(draw.scatter, draw.correlation)
    except InputError as error:
        raise PlanError(str(error), error.name) from error
    if not draw.names:
        raise PlanError("a sampled plan needs ranges or scatter: nothing is drawn")
    twice = draw.ranges.keys() & draw.scatter.keys()
    if twice:
        raise PlanError(f"{min(twice)} has a range and a scatter; give it one of them", min(twice))
    return _plan(base, axes, scaled, draw)


def _plan(base: Any, axes: Mapping[str, Any], scaled: bool, draw: Draw | None) -> Plan:
    slow, fast = [], {}
    try:
        point = base_point(base)
        for name, given in axes.items():
            if name in PARTS:
                slow.append(record_column(name, given, scaled))
            elif name not in INPUTS:
                known = ", ".join([*PARTS, *sorted(INPUTS)])
                raise PlanError(f"{quoted(name)} is no input; an axis is one of: {known}")
            elif INPUTS[name].whole:
                slow.append(whole_column(name, given))
            else:
                fast[name] = number_axis(name, given)
    except InputError as error:
        raise PlanError(str(error), error.name) from error
    if not axes and draw is None:
        raise PlanError("a plan needs an axis: an input with its values, or records")
    return Plan(point, tuple(slow), fast, draw)


def _mapping(given: Any, what: str) -> Mapping[Any, Any]:
    if given is not None and not isinstance(given, Mapping):
        raise PlanError(f"{what} = {quoted(given)} is no mapping from names")
    return given or {}


def _range(name: Any, given: Any) -> Unknown:
    """A range of an input, SI."""
    if name not in INPUTS:
        raise PlanError(f"ranges names {quoted(name)}, which is no input")
    if INPUTS[name].whole:
        raise PlanError(f"{name} is no number, so it has no range", name)
    pair = (given.low, given.high) if isinstance(given, Unknown) else given
    if isinstance(pair, str | Mapping) or not hasattr(pair, "__len__") or len(pair) != 2:
        raise PlanError(
            f"the range of {name} is a low and a high number, not {quoted(given)}", name
        )
    low, high = (finite_number(end, f"the range of {name}") for end in pair)
    own_numbers(name, [low, high])
    if low > high:
        entry = INPUTS[name]
        text = f"{shown(low, entry)} to {shown(high, entry)}"
        raise PlanError(f"the range of {name} runs backwards: {text}", name)
    return Unknown(low, high)
