"""Lines to cells: what stands between columns, and cells to numbers, whatever their decimal sign."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from .data import Array

#: What may stand between columns, in the order in which it is tried, and in words. A comma with a
#: space behind it goes before a comma where every other comma is a decimal one.
DELIMITERS: Final = {
    "\t": "tabulators",
    ";": "semicolons",
    ", ": "commas with a space",
    ",": "commas",
    " ": "spaces",
}

#: Longest cell that can be a number.
LONGEST: Final = 64

#: Lines of which the way of writing is judged.
_SAMPLED: Final = 2000

#: Wider tables are cut line by line to the columns that are wanted, before memory is asked for.
_WIDEST: Final = 64

_POWER: Final = r"(?:[eEdD][+-]?\d{1,4})?"
#: A number with either decimal sign, thousands in groups or not.
_NUMBER: Final = re.compile(rf"[+-]?(?:\d[\d.,'’ ]*|[.,]\d+){_POWER}")
_MISSING: Final = re.compile(
    r"|[+-]?(?:nan|inf|infinity|1\.#\w+)|n/?a|null|none|missing|-+|\?"
    r"|#(?:n/?a|div/0!?|value!?|num!?|ref!?|name\?|null!?)",
    re.IGNORECASE,
)
_GROUPED: Final = re.compile(r"^[+-]?[1-9]\d{0,2}(?:[ '’]\d{3})+(?=[.,]|$)", re.MULTILINE)
_WITH_SPACE: Final = re.compile(r"\s*[+-]?\d+(?:,\d+)?(?:, +[+-]?\d+(?:,\d+)?)+\s*")


def is_number(cell: str) -> bool:
    """Whether a cell may be a number in some way of writing."""
    return 0 < len(cell) <= LONGEST and _NUMBER.fullmatch(cell) is not None


def is_missing(cell: str) -> bool:
    """Whether a cell is empty or one of the usual words for no number."""
    return len(cell) <= 16 and _MISSING.fullmatch(cell) is not None


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
            found = sum(_holds(cut(line, delimiter, most), wanted) for line in sample)
        if found > score:
            best, score = delimiter, found
    return best


def _with_space(line: str) -> bool:
    return (
        len(line) < 1000
        and line.count(",") > line.count(", ")
        and bool(_WITH_SPACE.fullmatch(line))
    )


def _holds(cells: list[str], wanted: tuple[int, int] | None) -> bool:
    """Whether the wanted cells, or any two, are numbers."""
    if wanted is None:
        return sum(is_number(cell) for cell in cells) >= 2
    return len(cells) > max(wanted) and all(is_number(cells[at]) for at in wanted)


def split(lines: Sequence[str], delimiter: str, wanted: tuple[int, int]) -> list[list[str]]:
    """The two wanted columns of cells, one list each; '' where a line has no such cell."""
    plain = delimiter != ", " and not any('"' in line for line in lines)
    if plain and max(wanted) < _WIDEST and max(map(len, lines), default=0) < 64 * _WIDEST:
        return _by_pandas(lines, delimiter, wanted)
    most = max(wanted) + 1
    columns: list[list[str]] = [[], []]
    for line in lines:
        cells = cut(line, delimiter, most)
        for column, at in zip(columns, wanted, strict=True):
            column.append(cells[at][: LONGEST + 1] if at < len(cells) else "")
    return columns


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
        names=range(last + 1),
        usecols=range(last + 1),
        index_col=False,
        dtype=object,
        keep_default_na=False,
        na_filter=False,
        quoting=csv.QUOTE_NONE,
        skip_blank_lines=False,
        engine="c",
    )
    return [[cell.strip() for cell in frame[at].tolist()] for at in wanted]


@dataclass(frozen=True)
class Writing:
    """How numbers are written: the decimal sign, and the sign between thousands, '' for none."""

    decimal: str
    thousands: str = ""

    def __str__(self) -> str:
        decimal = {".": "decimal point", ",": "decimal comma"}[self.decimal]
        between = {"": "", ".": ", points between thousands", ",": ", commas between thousands"}
        return decimal + between[self.thousands]

    @property
    def pattern(self) -> str:
        """Of a whole cell, without marks of its ends."""
        decimal, power = re.escape(self.decimal), _POWER
        number = rf"(?:\d+(?:{decimal}\d*)?|{decimal}\d+){power}"
        if not self.thousands:
            return rf"[+-]?{number}"
        groups = rf"[1-9]\d{{0,2}}(?:{re.escape(self.thousands)}\d{{3}})+(?:{decimal}\d*)?"
        return rf"[+-]?(?:{groups}|{number})"


_POINT, _COMMA = Writing(".", ","), Writing(",", ".")


def writings(columns: Sequence[Sequence[str]]) -> list[Writing]:
    """The ways in which the numbers of a file may be written; more than one only where all fit."""
    text = "\n".join("\n".join(column) for column in columns)
    if "," not in text:
        twice = re.search(r"\.\d{3}\.", text) and not _some(_POINT, _COMMA, text)
        return [_COMMA if twice and _some(_COMMA, _POINT, text) else Writing(".")]
    both = [one for one in (_COMMA, _POINT) if _some(one, _other(one), text)]
    if len(both) == 2:
        both = [max(both, key=lambda one: len(_only(one, _other(one)).findall(text)))]
    elif not both:
        fits = [one for one in (_COMMA, _POINT) if all(_even(one, column) for column in columns)]
        both = fits or [_COMMA, _POINT]
    return [one if one.thousands in text else Writing(one.decimal) for one in both]


def _other(one: Writing) -> Writing:
    return _POINT if one is _COMMA else _COMMA


def _only(one: Writing, other: Writing) -> re.Pattern[str]:
    """Of cells that are numbers in one way of writing and none in the other."""
    return re.compile(rf"^(?!{other.pattern}$){one.pattern}$", re.MULTILINE)


def _some(one: Writing, other: Writing, text: str) -> bool:
    return _only(one, other).search(text) is not None


def _even(writing: Writing, column: Sequence[str]) -> bool:
    """Whether a column in which both signs may mean thousands is written alike throughout.

    All numbers of 1000 and more are grouped, or none is; as many decimals stand everywhere.
    """
    for sign in (",", "."):
        marked = [cell for cell in column if sign in cell]
        bare = [cell.lstrip("+-") for cell in column if cell.lstrip("+-").isdigit()]
        if not marked:
            continue
        if sign == writing.thousands and any(len(cell) > 3 for cell in bare):
            return False
        if sign == writing.decimal and any(cell.strip("0") for cell in bare):
            return False
    return True


def numbers(column: Sequence[str], writing: Writing) -> tuple[Array, list[str]]:
    """Values of cells, NaN for what is no finite number, and the cells with a decimal point."""
    if writing.thousands:
        column = [cell.replace(writing.thousands, "") for cell in _checked(column, writing)]
    text = "\n".join(column)
    if writing.decimal == ",":
        # A point is no decimal sign here, so a cell that holds one is no number.
        text = text.replace(".", "_").replace(",", ".")
    if " " in text or "'" in text or "’" in text:
        text = _GROUPED.sub(lambda found: re.sub("[ '’]", "", found[0]), text)
    cells = text.split("\n")
    if "_" not in text:
        try:
            values = np.array(list(map(float, cells)), dtype=np.float64)
        except ValueError:
            pass
        else:
            return np.where(np.isfinite(values), values, np.nan), cells
    return np.array([_number(cell) for cell in cells], dtype=np.float64), cells


def _checked(column: Sequence[str], writing: Writing) -> list[str]:
    """Cells, with those that are no number written so replaced by ''."""
    fits = re.compile(writing.pattern)
    return [cell if len(cell) <= LONGEST and fits.fullmatch(cell) else "" for cell in column]


_WRITTEN: Final = re.compile(Writing(".").pattern)


def _number(cell: str) -> float:
    if len(cell) > LONGEST or not _WRITTEN.fullmatch(cell):
        return float("nan")
    value = float(cell.replace("d", "e").replace("D", "e"))
    return value if np.isfinite(value) else float("nan")
