"""Two columns of numbers out of a file, with their units, and what was left out and why."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from ..domain import quoted
from .cells import DELIMITERS, split
from .columns import Unit
from .data import Array, DataError, Dropped
from .meaning import called, check_units, pass_index, units_of
from .numerals import Writing, is_missing, is_number, numbers, writings
from .table import Columns, Table, find_table
from .text import Document

Result = TypeVar("Result")

#: Numbers of rows or lines.
Rows = NDArray[np.signedinteger]

#: Largest number that is taken for one; beyond, sums would overflow.
_LARGEST: Final = 1e100

#: Largest share of the rows that may be left out.
_MOST_DROPPED: Final = 0.1


@dataclass
class Pairs:
    """Rows of two numbers, in the order of the file.

    first, second: as in the file, (n,). lines: theirs, (n,). printed: the cells of the first column,
    with a decimal point. unit: of the first; value_unit: of the second, as the file has it. notes:
    what was understood.
    """

    document: Document
    first: Array
    second: Array
    lines: Rows
    printed: list[str]
    unit: Unit
    value_unit: str
    notes: list[str]
    dropped: list[Dropped]

    def error(self, reason: str, row: int | None = None) -> DataError:
        """The error to raise for the file, and for a row where one is at fault."""
        return self.document.error(reason, None if row is None else int(self.lines[row]))


@dataclass(frozen=True)
class Request:
    """What is to be read. kind: a key of KINDS. least, most: numbers of rows."""

    kind: str
    units: tuple[str, str] | None
    columns: Columns | None
    least: int = 5
    most: int | None = None


def understand(document: Document, request: Request, use: Callable[[Pairs], Result]) -> Result:
    """What `use` makes of the two columns, where one way of writing numbers fits the whole file.

    Raises DataError where none fits, or more than one.
    """
    done: list[Result] = []
    failed: list[DataError] = []
    for pairs in _readings(document, request):
        try:
            done.append(use(pairs))
        except DataError as error:
            failed.append(error)
    if not done:
        raise failed[0]
    if len(done) > 1:
        raise document.error(
            "a comma or point in front of three digits may part decimals or thousands here: save "
            "the file with a decimal point and without signs between thousands"
        )
    return done[0]


def _readings(document: Document, request: Request) -> Iterator[Pairs]:
    """The two columns in every way of writing that fits all cells."""
    if request.units is not None:
        check_units(document, request.units)
    table = find_table(document, request.columns)
    if request.columns is None:
        pass_index(table, request.kind, request.units)
    unit, value_unit, unit_notes = units_of(table, request.kind, request.units)
    columns = split(table.rows, table.delimiter, table.wanted)
    ways = writings(columns)
    for way in ways:
        notes = [*_written(table, way, len(ways) > 1), *called(table, unit), *unit_notes]
        pairs = _pairs(table, columns, way, request.least)
        if request.most is not None and len(pairs[0]) > request.most:
            raise document.error(
                f"more than {request.most:,} rows, the most that are read",
                int(pairs[2][request.most]),
            )
        yield Pairs(document, *pairs[:4], unit, value_unit, notes, pairs[4])


def _written(table: Table, way: Writing, doubtful: bool) -> list[str]:
    """Sentences on encoding, separators and signs in numbers."""
    notes = [
        f"{table.document.encoding} text, {DELIMITERS[table.delimiter]} between columns, {way}"
    ]
    if doubtful:
        notes.append(f"three digits behind every comma or point: {way} fits the whole file")
    if table.comments:
        lines = "line" if table.comments == 1 else "lines"
        notes.append(f"{table.comments} {lines} of remarks among the rows passed over")
    return notes


def _pairs(
    table: Table, columns: list[list[str]], way: Writing, least: int
) -> tuple[Array, Array, Rows, list[str], list[Dropped]]:
    """Both columns without rows that hold no two numbers."""
    (first, printed), (second, _) = (numbers(column, way) for column in columns)
    lines = np.array(table.numbers, dtype=np.int64)
    with np.errstate(invalid="ignore"):
        good = (np.abs(first) <= _LARGEST) & (np.abs(second) <= _LARGEST)
    bad = np.flatnonzero(~good)

    def why(row: int) -> str:
        return _why(columns[0][row], columns[1][row])

    if bad.size > _MOST_DROPPED * lines.size:
        raise table.document.error(
            f"{bad.size} of {lines.size} rows hold no two numbers; here {why(bad[0])}",
            int(lines[bad[0]]),
        )
    dropped = [Dropped(int(lines[row]), why(row)) for row in bad.tolist()]
    _refuse_second(table, columns, first, good)
    if (left := int(good.sum())) < least:
        where = dropped[0].line if dropped else table.numbers[0]
        raise table.document.error(
            f"only {left} {'row' if left == 1 else 'rows'} of two numbers, {least} are needed",
            where,
        )
    kept = np.flatnonzero(good)
    cells = [printed[row] for row in kept.tolist()] if bad.size else printed
    return first[kept], second[kept], lines[kept], cells, [*table.dropped, *dropped]


def _why(first: str, second: str) -> str:
    """Why a row is left out."""
    for cell, place in ((first, "first"), (second, "second")):
        if not cell:
            return f"the {place} cell is empty"
        if is_missing(cell):
            return f"{quoted(cell)} in the {place} cell is no number"
        if not is_number(cell):
            return f"{quoted(cell)} is no number"
    return f"{quoted(first)} and {quoted(second)} are not both numbers of a usable size"


def _refuse_second(
    table: Table, columns: list[list[str]], first: Array, good: NDArray[np.bool_]
) -> None:
    """DataError where a second table begins: words among the rows, and the axis starts again."""
    words = [
        row
        for row in np.flatnonzero(~good).tolist()
        if sum(sign.isalpha() for sign in table.rows[row][:200]) > 3
        and not all(is_missing(column[row]) for column in columns)
    ]
    for row in words[:20]:
        later = np.flatnonzero(good[row:]) + row
        earlier = first[:row][good[:row]]
        if np.isin(first[later], earlier).sum() >= 3:
            raise table.document.error(
                "a second table begins here: keep one table in a file", table.numbers[row]
            )
