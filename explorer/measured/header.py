"""The lines above a table: what its columns are called, and in which units they are."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final

from .cells import DELIMITERS, cut
from .columns import Label, is_units_row, known_unit, read_label, unit_inside
from .numerals import is_number

#: Lines above the table in which its header may stand, and cells of it that are looked at.
_ABOVE: Final = 4
MOST_CELLS: Final = 1000


@dataclass(frozen=True)
class Header:
    """labels: of all columns, empty where there is no header. line, units: where they stand."""

    labels: list[Label] = field(default_factory=list)
    line: int | None = None
    units: int | None = None


def read_header(
    above: Sequence[str], delimiter: str, wanted: tuple[int, int], width: int
) -> Header:
    """Labels and units from the lines above the table. width: cells in a row."""
    filled = [at for at in range(max(0, len(above) - 50), len(above)) if above[at].strip()]
    found = []
    for at in reversed(filled[-_ABOVE:]):
        cells = header_cells(above[at][:100_000], delimiter, width)
        if len(cells) > max(wanted) and not is_number(cells[wanted[0]]):
            found.append((at + 1, cells))
    for at, (number, cells) in enumerate(found):
        if is_units_row([cells[one] for one in wanted]):
            return _with_units_row(number, cells, next(iter(found[at + 1 :]), None))
    named = [Header([read_label(cell) for cell in cells], number) for number, cells in found]
    for header in named:
        if any(label.axis for label in header.labels):
            return header
    if named:
        return named[0]
    return _loose(above[filled[-1]], filled[-1] + 1) if filled else Header()


def _with_units_row(number: int, units: list[str], names: tuple[int, list[str]] | None) -> Header:
    """The header of a row of units, and of the row of names above it where there is one."""
    titles = [*(names[1] if names else []), *[""] * len(units)]
    labels = [
        Label(f"{name} {unit}".strip(), name, _bare(unit))
        for name, unit in zip(titles, units, strict=False)
    ]
    return Header(labels, names[0] if names else number, number)


def _loose(line: str, number: int) -> Header:
    """A line of words right above the table that is parted in no way, but names a unit."""
    unit = unit_inside(line[:500])
    return Header([Label(line.strip()[:80], "", unit)], number) if unit else Header()


def _bare(unit: str) -> str:
    plain = unit.strip(" \t\"'")
    return plain[1:-1].strip() if plain[:1] in "([{" and plain[-1:] in ")]}" else plain


def header_cells(line: str, delimiter: str, width: int | None) -> list[str]:
    """Cells of a header, which may be a remark or be parted in another way than the rows."""
    text = line.lstrip(" #%!*/'" + ("" if delimiter == ";" else ";")).rstrip()
    usual = _merged(cut(text, delimiter, MOST_CELLS), width)
    if width is None or (len(usual) == width and delimiter != " "):
        return usual
    ways = [_merged(cut(text, other, MOST_CELLS), width) for other in DELIMITERS if other != " "]
    ways += [re.split(r"\s{2,}|\t", text), re.split(r"(?<=[\])])\s+", text), usual, text.split()]
    for cells in ways:
        plain = not any(map(_unit_alone, cells[1:]))
        if len(cells) == width and (plain or is_units_row(cells)):
            return [cell.strip() for cell in cells]
    return usual if delimiter != " " and len(usual) > 1 and not any(map(is_number, usual)) else []


def _merged(cells: list[str], width: int | None) -> list[str]:
    """Cells of a header in which a unit behind a comma belongs to the label before it."""
    while len(cells) > (width or 2) and not cells[-1]:
        cells = cells[:-1]
    if width is None or len(cells) <= width:
        return cells
    merged: list[str] = []
    for at, cell in enumerate(cells):
        if _unit_alone(cell) and merged and merged[-1] and len(merged) + len(cells) - at > width:
            merged[-1] = f"{merged[-1]}, {cell}" if known_unit(cell) else f"{merged[-1]} {cell}"
        else:
            merged.append(cell)
    return merged


def _unit_alone(cell: str) -> bool:
    """Whether a cell is a unit, or in brackets, without a name before it."""
    return cell[:1] in ("(", "[") or known_unit(cell) is not None
