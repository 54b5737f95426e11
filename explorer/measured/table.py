"""Where the table of a file begins, what its columns are called, and which lines are its rows."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import Final

from ..domain import quoted
from .cells import cut, delimiter_of
from .columns import Label, read_label
from .data import DataError, Dropped
from .header import MOST_CELLS, Header, header_cells, read_header
from .numerals import is_missing, is_number
from .text import Document

#: Positions from 0 or labels of the two columns that are wanted.
Columns = tuple[int | str, int | str]

#: Rows in a run that make a table; fewer are taken only where there is no such run.
_RUN: Final = 3

_COMMENT: Final = ("#", "%", "!", "*", "//", "'", ";")


@dataclass
class Table:
    """The rows of a file.

    wanted: positions of the two columns. width: cells in the first row. head: labels of all columns,
    and the lines in which they stand. rows: the lines; numbers: theirs in the file. comments: how
    many were passed over. counted: whether the first column only counts the rows.
    """

    document: Document
    delimiter: str
    wanted: tuple[int, int]
    head: Header = field(default_factory=Header)
    rows: list[str] = field(default_factory=list)
    numbers: list[int] = field(default_factory=list)
    comments: int = 0
    width: int = 2
    counted: bool = False
    dropped: list[Dropped] = field(default_factory=list)

    def label(self, position: int) -> Label:
        """That of a column, empty where it has none."""
        labels = self.head.labels
        return labels[position] if position < len(labels) else Label("", "", "")


def find_table(document: Document, columns: Columns | None) -> Table:
    """The table of a file. columns: which two, the first two where None. Raises DataError."""
    wanted = _positions(document, columns)
    delimiter = delimiter_of(document.lines, wanted)
    if delimiter is None and any(line.count('"') > 1 for line in document.lines):
        # Rows that stand in quotes as a whole.
        bare = tuple(line.replace('"', " ") for line in document.lines)
        delimiter = delimiter_of(bare, wanted)
        document = document if delimiter is None else replace(document, lines=bare)
    if delimiter is None:
        raise _no_table(document, wanted or (0, 1))
    if wanted is None:
        wanted = _by_label(document, columns or (0, 1), delimiter)
    table = Table(document, delimiter, wanted)
    start = _start(table)
    table.width = len(cut(document.lines[start], delimiter, MOST_CELLS))
    table.head = read_header(document.lines[:start], delimiter, wanted, table.width)
    _collect(table, start)
    _refuse_two_commas(table)
    return table


def _positions(document: Document, columns: Columns | None) -> tuple[int, int] | None:
    """Positions that are given as such, (0, 1) for none; None where a label is given."""
    if columns is None:
        return 0, 1
    if isinstance(columns, str) or not isinstance(columns, Sequence) or len(columns) != 2:
        raise document.error(f"columns is a pair such as (0, 1), not {quoted(columns)}")
    for one in columns:
        whole = isinstance(one, int) and not isinstance(one, bool) and 0 <= one < MOST_CELLS
        if not whole and not isinstance(one, str):
            raise document.error(
                f"a column is a position from 0 to {MOST_CELLS - 1} or a label, not {quoted(one)}"
            )
    first, second = columns
    if first == second:
        raise document.error(f"columns names {quoted(first)} twice")
    return (first, second) if isinstance(first, int) and isinstance(second, int) else None


def _by_label(document: Document, columns: Columns, delimiter: str) -> tuple[int, int]:
    """Positions of columns that are given by label, from the first line that holds them."""
    missing = ""
    for line in document.lines[:10_000]:
        cells = header_cells(line[:100_000], delimiter, None)
        names = [_names(cell) for cell in cells]
        found: list[int] = []
        for one in columns:
            at = one if isinstance(one, int) else None
            for position, name in enumerate(names if at is None else ()):
                if " ".join(str(one).split()).lower() in name:
                    at = position
                    break
            if at is None:
                missing = missing or str(one)
                break
            found.append(at)
        if len(found) == 2 and found[0] != found[1]:
            return found[0], found[1]
    raise document.error(f"no header names the columns {quoted(columns)}")


def _names(cell: str) -> set[str]:
    label = read_label(cell)
    return {label.text.lower(), label.name.lower()} - {""}


def _no_table(document: Document, wanted: tuple[int, int]) -> DataError:
    """Why no line holds two numbers."""
    ones = 0
    first = None
    if all(not line.strip() or line.lstrip().startswith(_COMMENT) for line in document.lines):
        return document.error("every line is a remark")
    for number, line in enumerate(document.lines, 1):
        cells = line[:200].replace(";", " ").replace("\t", " ").split()
        if len(cells) == 1 and is_number(cells[0].strip('"')):
            ones, first = ones + 1, first or number
    if ones >= _RUN:
        return document.error("only one column of numbers, two are needed", first)
    head = "".join(document.lines[:5])[:500].lstrip().lower()
    if head.startswith(("<", "{", "[{")):
        return document.error("this is a page or a record in a markup language, not a table", 1)
    if wanted != (0, 1):
        return document.error(f"no line has numbers in its columns {wanted[0]} and {wanted[1]}")
    any_two = delimiter_of(document.lines, None)
    if any_two:
        at = next(
            number
            for number, line in enumerate(document.lines, 1)
            if sum(map(is_number, cut(line, any_two, 50))) >= 2
        )
        return document.error(
            "the first two columns are not both numbers; say which are wanted by columns, "
            "counted from 0",
            at,
        )
    return document.error("no line holds two columns of numbers")


def is_comment(line: str, delimiter: str) -> bool:
    """Whether a line, without outer spaces, is a remark."""
    if not line.startswith(_COMMENT):
        return (
            line[:1] == '"'
            and line.count('"') == 2
            and line[-1] == '"'
            and len(line) > 2
            and (any(sign.isalpha() for sign in line[:200]) and not is_missing(line[1:-1]))
        )
    if line[0] == ";" and delimiter == ";":
        return False
    if line[0] == "#":
        cells = cut(line, delimiter, 2)
        return not (len(cells) > 1 and is_missing(cells[0]))
    return True


def _start(table: Table) -> int:
    """Index of the first row; numbers that stand alone above go into `dropped`."""
    lines, most = table.document.lines, max(table.wanted) + 1
    run: list[int] = []
    alone: list[list[int]] = []
    sure = False
    for index, raw in enumerate(lines):
        line = raw.strip()
        if not line or is_comment(line, table.delimiter):
            continue
        cells = cut(raw, table.delimiter, most)
        pair = [cells[at] if at < len(cells) else "" for at in table.wanted]
        if any(pair) and len(cells) > 1 and all(map(_number_or_missing, pair)):
            run.append(index)
            sure = sure or all(map(is_number, pair))
            if sure and len(run) >= _RUN:
                break
        else:
            alone += [run] if sure else []
            run, sure = [], False
    else:
        return [*alone, run][0][0]
    table.dropped += [
        Dropped(index + 1, "numbers that stand alone above the table")
        for index in itertools.chain(*alone)
    ]
    return run[0]


def _number_or_missing(cell: str) -> bool:
    return is_number(cell) or is_missing(cell)


def _collect(table: Table, start: int) -> None:
    """Rows from the first one, without remarks and empty lines."""
    for number, raw in enumerate(table.document.lines[start:], start + 1):
        if not raw[:1].isdigit():
            line = raw.strip()
            if not line:
                continue
            if is_comment(line, table.delimiter):
                table.comments += 1
                continue
        table.rows.append(raw)
        table.numbers.append(number)


def _refuse_two_commas(table: Table) -> None:
    """DataError where commas seem to stand both between columns and in numbers."""
    if table.delimiter != ",":
        return
    sample = [cut(row, ",", MOST_CELLS) for row in table.rows[:50]]
    labels = len([label for label in table.head.labels if label.text])
    for cells, number in zip(sample, table.numbers, strict=False):
        full = [cell for cell in cells if cell]
        whole = all(cell.lstrip("+-").isdigit() for cell in full)
        if labels >= 2 and len(full) > labels and whole:
            raise table.document.error(
                f"{len(full)} cells under a header of {labels}: commas seem to stand both between "
                "columns and in numbers; save the file with semicolons between columns",
                number,
            )
