"""What the two columns of a table are: their units, an index before them, what is said of them."""

from __future__ import annotations

import re
from typing import Final

from ..domain import quoted
from .cells import split
from .columns import KINDS, UNITS, Label, Unit, axis_unit, known_unit
from .data import DataError
from .numerals import is_number
from .table import Table
from .text import Document

_COUNTED: Final = re.compile(r"(?:counts?|cts|photons?|events?|clicks?)\s*/\s*\S", re.IGNORECASE)
_RELATIVE: Final = re.compile(r"shift|detuning|offset|relative", re.IGNORECASE)
_NUMBERING: Final = re.compile(r"channels?|ch\.?|bins?|index|pixels?|px", re.IGNORECASE)


def check_units(document: Document, units: tuple[str, str]) -> None:
    pair = isinstance(units, tuple | list) and len(units) == 2
    if not pair or not all(isinstance(one, str) for one in units):
        raise document.error(f'units is a pair such as ("nm", "counts"), not {quoted(units)}')


def _fits(label: Label, kind: str) -> bool:
    """Whether a label has a unit of the axis."""
    found = known_unit(label.unit) if label.unit else None
    return found is not None and found.family in KINDS[kind].families and found.family != "channel"


def pass_index(table: Table, kind: str, units: tuple[str, str] | None) -> None:
    """Step over a column that only counts the rows, where the header says which is the axis."""
    if table.width < 3:
        return
    label = table.label(0)
    if _fits(label, kind) or (label.axis and not _numbering(label)):
        return
    first, third = split(table.rows[:5000], table.delimiter, (0, 2))
    whole = [int(cell) for cell in first if cell.isascii() and cell.isdigit() and len(cell) < 9]
    if not whole or whole != list(range(whole[0], whole[0] + len(first))) or whole[0] > 1:
        return
    if not any(map(is_number, third)):
        return
    if _fits(table.label(1), kind):
        table.wanted, table.counted = (1, 2), True
        return
    if units is not None and units[0]:
        return
    raise table.document.error(
        "the first column only counts the rows: say which columns are wanted, such as "
        "columns=(1, 2), or give units",
        table.numbers[0],
    )


def _numbering(label: Label) -> bool:
    return bool(_NUMBERING.match(label.name or label.unit))


def units_of(table: Table, kind: str, given: tuple[str, str] | None) -> tuple[Unit, str, list[str]]:
    """Units of both columns and what is to be said of them."""
    first, second = (table.label(at) for at in table.wanted)
    value = given[1] if given and given[1] else _value_unit(second, KINDS[kind].values)
    if given and given[0]:
        try:
            return _with_width(table, axis_unit(given[0], kind), None), value, []
        except DataError as error:
            raise table.document.error(error.reason, error.line) from None
    line = table.head.units or table.head.line
    if not first.unit and _fits(second, kind):
        raise table.document.error(
            f"the unit of the axis stands at the second column, {quoted(second.text)}: say which "
            "column is the axis, such as columns=(1, 0)",
            line,
        )
    if kind == "spectrum" and _RELATIVE.search(first.text):
        raise table.document.error(
            f"{quoted(first.text)} seems to count from a line or a laser: give the wavelength itself, "
            "or the unit by units where it is absolute",
            line,
        )
    if first.unit or (_numbering(first) and "channel" in KINDS[kind].families):
        try:
            unit = axis_unit(first.unit or "channel", kind)
        except DataError as error:
            raise table.document.error(error.reason + _hint(table, kind), line) from None
        return _with_width(table, unit, line), value, []
    unit = UNITS[KINDS[kind].usual]
    return unit, value, [f"no unit in the file: taken as {unit}"]


def _hint(table: Table, kind: str) -> str:
    """Another column whose unit would fit, in words."""
    fits = [at for at, label in enumerate(table.head.labels) if _fits(label, kind)]
    return (
        f"; {quoted(table.label(fits[0]).text)} may be meant, column {fits[0]} from 0"
        if fits
        else ""
    )


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
    if (
        (found := known_unit(label.unit))
        and found.family != "channel"
        and label.text[-1:] not in ")]"
    ):
        return usual  # "Counts per 16 ps" is measured in counts
    return label.unit[:40] or usual


def called(table: Table, unit: Unit) -> list[str]:
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
