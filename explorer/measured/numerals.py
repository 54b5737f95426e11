"""Cells to numbers, whatever their decimal sign and the sign between their thousands."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from .data import Array

#: Longest cell that can be a number.
LONGEST: Final = 64

_POWER: Final = r"(?:[eEdD][+-]?\d{1,4})?"
#: A number with either decimal sign, thousands in groups or not.
_NUMBER: Final = re.compile(
    rf"[+-]?(?:(?:\d+(?:[.,]\d*)?|[.,]\d+){_POWER}"
    r"|[1-9]\d{0,2}(?P<sign>[.,'’ ])\d{3}(?:(?P=sign)\d{3})*(?:[.,]\d*)?)"
)
_MISSING: Final = re.compile(
    r"|[+-]?(?:nan|inf|infinity|1\.#\w+)|n/?a|null|none|missing|-{1,3}|\?"
    r"|#(?:n/?a|div/0!?|value!?|num!?|ref!?|name\?|null!?)",
    re.IGNORECASE,
)
_GROUPED: Final = re.compile(r"^[+-]?[1-9]\d{0,2}(?:[ '’]\d{3})+(?=[.,]|$)", re.MULTILINE)


def is_number(cell: str) -> bool:
    """Whether a cell may be a number in some way of writing."""
    return 0 < len(cell) <= LONGEST and _NUMBER.fullmatch(cell) is not None


def is_missing(cell: str) -> bool:
    """Whether a cell is empty or one of the usual words for no number."""
    return len(cell) <= 16 and _MISSING.fullmatch(cell) is not None


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
        return [_COMMA if _points_part_thousands(columns, text) else Writing(".")]
    both = [one for one in (_COMMA, _POINT) if _some(one, _other(one), text)]
    if len(both) == 2:
        both = [max(both, key=lambda one: len(_only(one, _other(one)).findall(text)))]
    elif not both:
        for strictly in (False, True):
            both = both or [
                one
                for one in (_COMMA, _POINT)
                if all(_even(one, column, decimals=not strictly) for column in columns)
            ]
        both = both or [_COMMA, _POINT]
    return [one if one.thousands in text else Writing(one.decimal) for one in both]


def _points_part_thousands(columns: Sequence[Sequence[str]], text: str) -> bool:
    """Whether, in a file without commas, points can only stand between thousands."""
    if "." not in text or _some(_POINT, _COMMA, text):
        return False
    if _some(_COMMA, _POINT, text):
        return True
    point, comma = (
        all(_even(one, column, decimals=True) for column in columns) for one in (_POINT, _COMMA)
    )
    return comma and not point


def _other(one: Writing) -> Writing:
    return _POINT if one is _COMMA else _COMMA


def _only(one: Writing, other: Writing) -> re.Pattern[str]:
    """Of cells that are numbers in one way of writing and none in the other."""
    return re.compile(rf"^(?!{other.pattern}$){one.pattern}$", re.MULTILINE)


def _some(one: Writing, other: Writing, text: str) -> bool:
    return _only(one, other).search(text) is not None


def _even(writing: Writing, column: Sequence[str], *, decimals: bool) -> bool:
    """Whether a column in which both signs may mean thousands is written alike throughout.

    All numbers of 1000 and more are grouped, or none is; and where `decimals` is asked for, decimals
    stand everywhere but at zero.
    """
    for sign in (",", "."):
        marked = [cell for cell in column if sign in cell]
        bare = [cell.lstrip("+-") for cell in column if cell.lstrip("+-").isdigit()]
        if not marked:
            continue
        if sign == writing.thousands and any(len(cell) > 3 for cell in bare):
            return False
        if decimals and sign == writing.decimal and any(cell.strip("0") for cell in bare):
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
