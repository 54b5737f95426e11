"""Lines to cells: what stands between the columns of a file."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from typing import Final

from .numerals import LONGEST, is_number

#: What may stand between columns, in the order in which it is tried, and in words. A comma with a
#: space behind it goes before a comma where every other comma is a decimal one.
DELIMITERS: Final = {
    "\t": "tabulators",
    ";": "semicolons",
    "|": "bars",
    ", ": "commas with a space",
    ",": "commas",
    " ": "spaces",
}

#: Lines of which the way of writing is judged.
_SAMPLED: Final = 2000

#: Wider tables are cut line by line to the columns that are wanted, before memory is asked for.
_WIDEST: Final = 64

_WITH_SPACE: Final = re.compile(r"\s*[+-]?\d+(?:,\d+)?(?:, +[+-]?\d+(?:,\d+)?)+\s*")


def cut(line: str, delimiter: str, most: int) -> list[str]:
    """The first cells of a line, without quotes and outer spaces, `most` of them at most."""
    if '"' in line and delimiter != " ":
        try:
            parts = next(csv.reader([line], delimiter=delimiter[0], skipinitialspace=True), [])
        except csv.Error:  # a cell longer than any number
            parts = line.replace('"', "").split(delimiter, most)
    elif delimiter == " ":
        parts = line.replace('"', "").split(None, most)
    else:
        parts = line.split(delimiter, most)
    return [part.strip() for part in parts[:most]]


def delimiter_of(lines: Sequence[str], wanted: tuple[int, int] | None) -> str | None:
    """What stands between the columns: what makes numbers of the wanted ones in most lines.

    wanted: positions, or None where any two will do. None where no line holds two numbers.
    """
    step = max(1, len(lines) // _SAMPLED)
    sample = [line for line in lines[::step] if line.strip()]
    most = 50 if wanted is None else max(wanted) + 1
    best, score = None, 0
    for delimiter in DELIMITERS:
        if delimiter == ", ":
            found = sum(bool(_with_space(line)) for line in sample)
        else:
            found = sum(
                _holds(cut(line, delimiter, most), wanted, spaces=delimiter != ",")
                for line in sample
            )
        if found > score:
            best, score = delimiter, found
    return best


def _with_space(line: str) -> bool:
    return (
        len(line) < 1000
        and line.count(",") > line.count(", ")
        and bool(_WITH_SPACE.fullmatch(line))
    )


def _holds(cells: list[str], wanted: tuple[int, int] | None, *, spaces: bool) -> bool:
    """Whether the wanted cells, or any two, are numbers. spaces: whether these may hold some."""
    if not spaces:
        cells = ["" if " " in cell else cell for cell in cells]
    if wanted is None:
        return sum(is_number(cell) for cell in cells) >= 2
    return len(cells) > max(wanted) and all(is_number(cells[at]) for at in wanted)


def split(lines: Sequence[str], delimiter: str, wanted: tuple[int, int]) -> list[list[str]]:
    """The two wanted columns of cells, one list each; '' where a line has no such cell."""
    plain = delimiter != ", " and not any('"' in line for line in lines)
    if plain and max(wanted) < _WIDEST and max(map(len, lines), default=0) < 64 * _WIDEST:
        return _by_pandas(lines, delimiter, wanted)
    if delimiter not in (" ", ", ") and (columns := _by_csv(lines, delimiter, wanted)):
        return columns
    most = max(wanted) + 1
    columns = [[], []]
    for line in lines:
        cells = cut(line, delimiter, most)
        for column, at in zip(columns, wanted, strict=True):
            column.append(_short(cells[at]) if at < len(cells) else "")
    return columns


def _by_csv(
    lines: Sequence[str], delimiter: str, wanted: tuple[int, int]
) -> list[list[str]] | None:
    """The same in one go where every line closes its quotes; None where one does not."""
    columns: list[list[str]] = [[], []]
    try:
        for cells in csv.reader(lines, delimiter=delimiter, skipinitialspace=True):
            for column, at in zip(columns, wanted, strict=True):
                column.append(_short(cells[at].strip()) if at < len(cells) else "")
    except csv.Error:
        return None
    return columns if len(columns[0]) == len(lines) else None


def _by_pandas(lines: Sequence[str], delimiter: str, wanted: tuple[int, int]) -> list[list[str]]:
    """The same by the C parser of pandas, for lines without quotes."""
    import pandas as pd

    last = max(wanted)
    if last < max((line.count(delimiter) for line in lines), default=0) and delimiter != " ":
        lines = [delimiter.join(line.split(delimiter, last + 1)[: last + 1]) for line in lines]
    elif delimiter == " ":
        lines = ["\t".join(line.split(None, last + 1)[: last + 1]) for line in lines]
        delimiter = "\t"
    frame = pd.read_csv(
        io.StringIO("\n".join(lines) + "\n"),
        sep=delimiter,
        header=None,
        names=list(range(last + 1)),
        usecols=list(range(last + 1)),
        index_col=False,
        dtype=object,
        keep_default_na=False,
        na_filter=False,
        quoting=csv.QUOTE_NONE,
        skip_blank_lines=False,
        engine="c",
    )
    return [[_short(cell.strip()) for cell in frame[at].tolist()] for at in wanted]


def _short(cell: str) -> str:
    """A cell, cut with a mark where it is too long for a number."""
    return cell if len(cell) <= LONGEST else f"{cell[:LONGEST]}…"
