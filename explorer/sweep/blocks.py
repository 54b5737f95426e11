"""Blocks of rows that are evaluated together, and how the rows of a plan are cut into chunks of blocks."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .draws import Drawn

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Block:
    """Rows that share their whole values: a grid of pieces, the last one varying fastest.

    fixed: entries of the point that all rows share, SI. labels: columns of whole values and records,
    with what stands in them. outer: number columns that are the same in all rows, so in `fixed`.
    pieces: one axis each, either arrays of one length by input name, or drawn rows. Small enough to
    send: what is drawn is drawn where the block is evaluated.
    """

    fixed: Mapping[str, Any]
    labels: tuple[tuple[str, str], ...]
    outer: tuple[str, ...]
    pieces: tuple[Mapping[str, Array] | Drawn, ...]

    @property
    def shape(self) -> tuple[int, ...]:
        """Rows along each piece."""
        return tuple(
            len(piece) if isinstance(piece, Drawn) else len(next(iter(piece.values())))
            for piece in self.pieces
        )

    @property
    def rows(self) -> int:
        """Rows of the block."""
        return math.prod(self.shape)

    def names_along(self, axis: int) -> tuple[str, ...]:
        """The number columns that vary along a piece."""
        piece = self.pieces[axis]
        return piece.draw.names if isinstance(piece, Drawn) else tuple(piece)

    @property
    def names(self) -> tuple[str, ...]:
        """All number columns in their order."""
        axes = (name for axis in range(len(self.pieces)) for name in self.names_along(axis))
        return (*self.outer, *axes)

    def point(self) -> tuple[dict[str, Any], dict[str, Array]]:
        """The point of all rows, and its number columns in their order, each along its own axis.

        Raises InputError where nothing can be drawn about the shared entries.
        """
        point = dict(self.fixed)
        columns = {name: np.asarray(self.fixed[name], dtype=float) for name in self.outer}
        for axis, piece in enumerate(self.pieces):
            found, more = piece.columns(self.fixed) if isinstance(piece, Drawn) else (piece, {})
            shape = [-1 if place == axis else 1 for place in range(len(self.pieces))]
            for name, values in found.items():
                columns[name] = np.asarray(values, dtype=float).reshape(shape)
            point |= more
        return {**point, **columns}, columns


#: What is handed to a worker and stored at a time: consecutive blocks.
Chunk = tuple[Block, ...]


@dataclass(frozen=True)
class Layout:
    """How rows of a grid are cut into chunks, each worked out from its index.

    sizes: of the groups of whole values and records, then of the number axes. A chunk is a run of at
    most `step` entries of axis `at`, with everything that varies faster.
    """

    sizes: tuple[int, ...]
    at: int
    step: int

    @property
    def pieces(self) -> int:
        """Chunks along the axis that is cut."""
        return -(-self.sizes[self.at] // self.step)

    @property
    def count(self) -> int:
        """Chunks of the whole table."""
        return math.prod(self.sizes[: self.at]) * self.pieces

    def place(self, index: int) -> tuple[tuple[int, ...], slice]:
        """Indices of the axes before the one that is cut, and the run along that one."""
        outer, piece = divmod(index, self.pieces)
        start = piece * self.step
        run = slice(start, min(start + self.step, self.sizes[self.at]))
        return digits(outer, self.sizes[: self.at]), run

    def start(self, index: int) -> int:
        """Index of the first row of a chunk."""
        outer, piece = divmod(index, self.pieces)
        inner = math.prod(self.sizes[self.at + 1 :])
        return (outer * self.sizes[self.at] + piece * self.step) * inner


def layout(sizes: Sequence[int], chunk: int) -> Layout:
    """Cut a grid into even chunks of at most `chunk` rows."""
    at, inner = len(sizes) - 1, 1
    while at > 0 and inner * sizes[at] <= chunk:
        inner *= sizes[at]
        at -= 1
    most = max(1, chunk // inner)
    pieces = -(-sizes[at] // most)
    return Layout(tuple(sizes), at, -(-sizes[at] // pieces))


def digits(index: int, sizes: Sequence[int]) -> tuple[int, ...]:
    """An index as digits of mixed radix, the last varying fastest."""
    found = []
    for size in reversed(sizes):
        index, digit = divmod(index, size)
        found.append(digit)
    return tuple(reversed(found))
