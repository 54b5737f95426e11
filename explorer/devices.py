"""Many devices at once: a point, the draws of what scatters in it, and who passes, block by block.

One block of work is some draws of some cells, small enough to stay in the processor's cache; blocks
are counted as they come, so a map of any size needs little memory, and several threads can share them.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Iterator, Mapping, Sequence
from functools import cached_property
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .design import Design, Requirement, all_requirements
from .domain import InputError, quoted
from .evaluate import Evaluation
from .inputs import INPUTS
from .registry import dependencies
from .sampling import BATCHES, BUILT_ONCE, Draws, displaced, draws
from .scatter import Spread

Array = NDArray[np.float64]
Counts = NDArray[np.int64]

#: Devices times cells of one block.
BLOCK = 65_536

#: Largest block [bytes] whose release tells an allocator (that of glibc) to keep as much.
KEPT = 31 * 2**20

#: A part of the axes of a point.
Tile = tuple[slice, ...]

#: Tiles one after the other, and which devices.
Job = tuple[list[Tile], slice]


class Run:
    """A point, the draws of what scatters in it, and what is asked of each device."""

    def __init__(
        self,
        point: Mapping[str, Any] | Design,
        scatter: Mapping[str, Spread],
        requirements: Iterable[Requirement],
        count: int,
        seed: int,
        correlation: Mapping[Any, float] | None,
    ) -> None:
        self.point = point_of(point)
        self.shape = Evaluation(self.point).shape
        self.requirements = required(requirements)
        self.draws: Draws = draws(scatter, count, seed, correlation)
        self.count = self.draws.count
        self.each = self.count // BATCHES
        self.names = labels(self.requirements)
        moved = [self.reached([entry.quantity]) for entry in self.requirements]
        self.moved = [any(moved), *moved]

    def reached(self, quantities: Iterable[str]) -> bool:
        """Whether anything that scatters can change the quantities."""
        moving = set(self.draws.names)
        given = frozenset(self.point) | frozenset(BUILT_ONCE) | moving
        return any(not dependencies(name, given).isdisjoint(moving) for name in quantities)

    def tiles(self, cells: int) -> list[Tile]:
        """Parts of the axes of the point with at most so many cells each.

        The axis along which least has to be worked out anew is cut last.
        """
        sides = list(self.shape)
        for axis in sorted(range(len(sides)), key=lambda axis: axis == self.along):
            rest = max(1, math.prod(sides[:axis] + sides[axis + 1 :]))
            parts = max(1, math.ceil(sides[axis] / max(1, cells // rest)))
            sides[axis] = math.ceil(sides[axis] / parts)
        cuts = [
            [slice(start, min(start + side, length)) for start in range(0, length, side or 1)]
            for side, length in zip(sides, self.shape, strict=True)
        ]
        return list(product(*cuts))

    def stages(self) -> list[tuple[range, list[Job]]]:
        """Batches that are done together, and the jobs that this takes."""
        cells = max(int(np.prod(self.shape)), 1)
        together = max(1, min(BATCHES, BLOCK // (self.each * cells)))
        each = min(self.each * together, BLOCK)
        strips = self.strips(max(1, BLOCK // each))
        found = []
        for batch in range(0, BATCHES, together):
            batches = range(batch, min(batch + together, BATCHES))
            first, last = batches.start * self.each, batches.stop * self.each
            spans = [slice(start, min(start + each, last)) for start in range(first, last, each)]
            found.append((batches, [(strip, span) for strip in strips for span in spans]))
        return found

    @property
    def blocks(self) -> int:
        """Tiles of all jobs together."""
        return sum(len(strip) for _, jobs in self.stages() for strip, _ in jobs)

    def strips(self, cells: int) -> list[list[Tile]]:
        """The tiles in strips along the axis on which least has to be worked out anew."""
        along = self.along
        strips: dict[Any, list[Tile]] = {}
        for tile in self.tiles(cells):
            rest = tuple((part.start, part.stop) for part in tile[:along] + tile[along + 1 :])
            strips.setdefault(rest, []).append(tile)
        return list(strips.values())

    @cached_property
    def along(self) -> int:
        """The axis whose inputs reach the fewest formulas that are asked for."""
        axes = len(self.shape)
        if axes < 2:
            return 0
        needed = frozenset[str]().union(*(dependencies(e.quantity) for e in self.requirements))
        given = frozenset(self.point)
        on = [self._on(axis) for axis in range(axes)]
        reached = [
            sum(not dependencies(name, given).isdisjoint(own) for name in needed) for own in on
        ]
        return int(np.argmin(reached))

    def _on(self, axis: int) -> set[str]:
        """The inputs of the point that vary along an axis."""
        back = axis - len(self.shape)
        shapes = {
            name: np.shape(value) for name, value in self.point.items() if not INPUTS[name].whole
        }
        return {name for name, own in shapes.items() if len(own) >= -back and own[back] > 1}

    def cut(self, tile: Tile) -> dict[str, Any]:
        """The point on a tile of its axes."""
        return {
            name: value if INPUTS[name].whole else _part(np.asarray(value), tile)
            for name, value in self.point.items()
        }

    def devices(self, tile: Tile, rows: slice) -> dict[str, Any]:
        """The point of some devices on a tile."""
        return displaced(self.draws, self.cut(tile), rows)

    def values(self, tile: Tile, quantity: str) -> Array:
        """A quantity of all devices on a tile, (count, *tile), NaN where it has no number."""
        size = tuple(part.stop - part.start for part in tile)
        found = np.empty((self.count, *size))
        span = max(1, BLOCK // max(1, int(np.prod(size))))
        for start in range(0, self.count, span):
            rows = slice(start, start + span)
            found[rows] = Evaluation(self.devices(tile, rows)).result(quantity)
        return found

    def walk(self, job: Job) -> Iterator[tuple[Tile, Counts]]:
        """Of each tile the devices that meet everything, then each requirement, batch by batch.

        The counts have the shape (batches, 1 + requirements, *tile).
        """
        strip, rows = job
        last: dict[str, Any] = {}
        work = None
        for tile in strip:
            entries = self.devices(tile, rows)
            if work is None:
                work = Evaluation(entries)
            else:  # what does not vary along the strip is kept
                new = {name: v for name, v in entries.items() if not _same(v, last[name])}
                work = work.changed(new)
            last = entries
            yield tile, self._counts(work, tile, rows.stop - rows.start)

    def passes(self, job: Job) -> list[tuple[Tile, Counts]]:
        """The same of all tiles, in one go."""
        return list(self.walk(job))

    def _counts(self, work: Evaluation, tile: Tile, count: int) -> Counts:
        size = tuple(part.stop - part.start for part in tile)
        batches = max(1, count // self.each)
        found = np.empty((batches, 1 + len(self.requirements), *size), dtype=np.int64)
        every: Any = True
        for index, requirement in enumerate(self.requirements, start=1):
            met = requirement.met(np.asarray(work.result(requirement.quantity)))
            every = every & met
            found[:, index] = _counted(met, batches, count, size)
        found[:, 0] = _counted(every, batches, count, size)
        return found


def _same(one: Any, other: Any) -> bool:
    """Whether two entries of a point are alike."""
    return one is other or bool(np.array_equal(one, other))


def _part(value: Array, tile: Tile) -> Array:
    """An array on a tile of the axes that it may broadcast to."""
    own = tile[len(tile) - value.ndim :]
    return value[
        tuple(
            part if size > 1 else slice(None) for part, size in zip(own, value.shape, strict=True)
        )
    ]


def _counted(met: Any, batches: int, count: int, size: tuple[int, ...]) -> Any:
    """How many devices of each batch, along the first axis, are met: (batches, *size)."""
    each = count // batches
    if met.ndim <= len(size):  # all devices are alike in this
        return np.where(met, each, 0)
    return np.count_nonzero(met.reshape(batches, each, *met.shape[1:]), axis=1)


def keep_memory() -> None:
    """Let the allocator keep freed memory, as it does once a large block has come and gone.

    Else each thread gives its temporaries back and asks for them anew: a quarter of the time.
    """
    np.empty(KEPT, dtype=np.uint8)


def point_of(point: Mapping[str, Any] | Design) -> dict[str, Any]:
    """The entries of a point, or of a design's. Raises InputError for what is neither."""
    found = point.point if isinstance(point, Design) else point
    if not isinstance(found, Mapping):
        raise InputError(f"a point maps input names to values; got {quoted(point)}")
    return dict(found)


def required(requirements: Iterable[Requirement]) -> tuple[Requirement, ...]:
    """Requirements as a tuple, one at least. Raises InputError."""
    found = all_requirements(requirements)
    if not found:
        raise InputError("a yield needs a requirement: without one every device passes")
    return found


def labels(requirements: Sequence[Requirement]) -> tuple[str, ...]:
    """A name for each requirement: its quantity; with its sense and limit where that comes twice."""
    often = Counter(entry.quantity for entry in requirements)
    return tuple(
        entry.quantity
        if often[entry.quantity] == 1
        else f"{entry.quantity} {entry.sense} {entry.limit:.12g}"
        for entry in requirements
    )
