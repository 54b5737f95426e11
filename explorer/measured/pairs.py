"""Two columns of numbers out of a file, with their units, and what was left out and why."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from ..domain import quoted
from .cells import DELIMITERS, Writing, is_missing, is_number, numbers, split, writings
from .columns import KINDS, UNITS, Label, Unit, axis_unit, known_unit
from .data import Array, DataError, Dropped
from .table import Columns, Table, find_table
from .text import Document

Result = TypeVar("Result")

#: Numbers of rows or lines.
Rows = NDArray[np.signedinteger]

#: Largest number that is taken for one; beyond, sums would overflow.
_LARGEST: Final = 1e100

#: Largest share of the rows that may be left out.
_MOST_DROPPED: Final = 0.1

_COUNTED: Final = re.compile(r"(?:counts?|cts|photons?|events?|clicks?)\s*/\s*\S", re.IGNORECASE)
_NUMBERING: Final = re.compile(r"channels?|ch\.?|bins?|index|pixels?|px", re.IGNORECASE)


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
        _check_units(document, request.units)
    table = find_table(document, request.columns)
    if request.columns is None:
        _pass_index(table, request)
    unit, value_unit, unit_notes = _units(table, request)
    columns = split(table.rows, table.delimiter, table.wanted)
    ways = writings(columns)
    for way in ways:
        notes = [*_written(table, way, len(ways) > 1), *_called(table, unit), *unit_notes]
        pairs = _pairs(table, columns, way, request.least)
        if request.most is not None and len(pairs[0]) > request.most:
            raise document.error(
                f"more than {request.most:,} rows, the most that are read",
                int(pairs[2][request.most]),
            )
        yield Pairs(document, *pairs[:4], unit, value_unit, notes, pairs[4])


def _check_units(document: Document, units: tuple[str, str]) -> None:
    pair = isinstance(units, tuple | list) and len(units) == 2
    if not pair or not all(isinstance(one, str) for one in units):
        raise document.error(f'units is a pair such as ("nm", "counts"), not {quoted(units)}')


def _fits(label: Label, kind: str) -> bool:
    """Whether a label has a unit of the axis."""
    found = known_unit(label.unit) if label.unit else None
    return found is not None and found.family in KINDS[kind].families and found.family != "channel"


def _pass_index(table: Table, request: Request) -> None:
    """Step over a column that only counts the rows, where the header says which is the axis."""
    if table.width < 3 or request.units is not None:
        return
    label = table.label(0)
    if _fits(label, request.kind) or (label.axis and not _numbering(label)):
        return
    first, third = split(table.rows[:5000], table.delimiter, (0, 2))
    whole = [int(cell) for cell in first if cell.isascii() and cell.isdigit() and len(cell) < 9]
    if not whole or whole != list(range(whole[0], whole[0] + len(first))) or whole[0] > 1:
        return
    if not any(map(is_number, third)):
        return
    if _fits(table.label(1), request.kind):
        table.wanted, table.counted = (1, 2), True
        return
    raise table.document.error(
        "the first column only counts the rows: say which columns are wanted, such as "
        "columns=(1, 2), or give units",
        table.numbers[0],
    )


def _numbering(label: Label) -> bool:
    return bool(_NUMBERING.match(label.name or label.unit))


def _units(table: Table, request: Request) -> tuple[Unit, str, list[str]]:
    """Units of both columns and what is to be said of them."""
    kind, given = request.kind, request.units
    first, second = (table.label(at) for at in table.wanted)
    value = given[1] if given and given[1] else _value_unit(second, KINDS[kind].values)
    if given and given[0]:
        try:
            return _with_width(table, axis_unit(given[0], kind), None), value, []
        except DataError as error:
            raise table.document.error(error.reason, error.line) from None
    line = table.units or table.header
    if not first.unit and _fits(second, kind):
        raise table.document.error(
            f"the unit of the axis stands at the second column, {quoted(second.text)}: say which "
            "column is the axis, such as columns=(1, 0)",
            line,
        )
    if first.unit or (_numbering(first) and "channel" in KINDS[kind].families):
        try:
            unit = axis_unit(first.unit or "channel", kind)
        except DataError as error:
            raise table.document.error(error.reason, line) from None
        return _with_width(table, unit, line), value, []
    unit = UNITS[KINDS[kind].usual]
    return unit, value, [f"no unit in the file: taken as {unit}"]


def _with_width(table: Table, unit: Unit, line: int | None) -> Unit:
    if unit.family == "channel":
        raise table.document.error(
            "the axis counts channels: give the width of one by units, such as "
            'units=("16 ps", "counts")',
            line,
        )
    return unit


def _value_unit(label: Label, usual: str) -> str:
    """That of the second column, as the file has it, else the usual one."""
    if _COUNTED.match(label.text):
        return label.text[:40]
    return label.unit[:40] or usual


def _written(table: Table, way: Writing, doubtful: bool) -> list[str]:
    """Sentences on encoding, separators and signs in numbers."""
    notes = [
        f"{table.document.encoding} text, {DELIMITERS[table.delimiter]} between columns, {way}"
    ]
    if doubtful:
        notes.append(f"three digits behind every comma or point: {way} fits the whole file")
    if table.comments:
        notes.append(f"{table.comments} lines of remarks among the rows were passed over")
    return notes


def _called(table: Table, unit: Unit) -> list[str]:
    """Sentences on the columns: which is what, and which are not used."""
    names = [table.label(at).text for at in table.wanted]
    places = [f"column {at + 1}" for at in table.wanted]
    called = [
        f"{place} {quoted(name)}" if name else place
        for place, name in zip(places, names, strict=True)
    ]
    notes = [f"the axis is {called[0]} in {unit}, the values are {called[1]}"]
    if table.counted:
        notes.append("column 1 only counts the rows")
    others = [at for at in range(table.width) if at not in table.wanted]
    if others:
        words = [quoted(table.label(at).text) if table.label(at).text else at + 1 for at in others]
        shown = ", ".join(map(str, words[:5])) + (" and more" if len(words) > 5 else "")
        notes.append(f"columns that are not used: {shown}")
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
    reasons = [_why(columns[0][row], columns[1][row]) for row in bad.tolist()]
    dropped = [Dropped(int(lines[row]), why) for row, why in zip(bad, reasons, strict=True)]
    if bad.size > _MOST_DROPPED * lines.size:
        raise table.document.error(
            f"{bad.size} of {lines.size} rows hold no two numbers; here {reasons[0]}",
            int(lines[bad[0]]),
        )
    _refuse_second(table, first, good)
    if (left := int(good.sum())) < least:
        every = sorted([*(one.line for one in dropped), *table.numbers[:1]])
        where = dropped[0].line if dropped else every[0]
        raise table.document.error(f"only {left} rows of two numbers, {least} are needed", where)
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


def _refuse_second(table: Table, first: Array, good: NDArray[np.bool_]) -> None:
    """DataError where a second table begins: words among the rows, and the axis starts again."""
    words = [
        row
        for row in np.flatnonzero(~good).tolist()
        if sum(sign.isalpha() for sign in table.rows[row][:200]) > 3
    ]
    for row in words[:20]:
        later = np.flatnonzero(good[row:]) + row
        earlier = first[:row][good[:row]]
        if np.isin(first[later], earlier).sum() >= 3:
            raise table.document.error(
                "a second table begins here: keep one table in a file", table.numbers[row]
            )
