"""Tables as text: column titles with units, exact numbers in the units that people write."""

from __future__ import annotations

import math
from collections.abc import Iterable
from itertools import repeat
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..inputs import INPUTS
from ..registry import REGISTRY
from ..units import EXPONENTS
from .blocks import Block, Chunk
from .rows import Worked, kind_of, work_out

#: Name of the last column: the input at fault where a row's inputs cannot go together.
REFUSED = "refused"

#: Most digits before the point, and zeros behind it, of a number without a power of ten.
_PLAIN = (16, 5)


def title(name: str) -> str:
    """Title of a column: name and unit, 'fast_linewidth (nm)'; inputs in the unit of the page.

    Quantities are in SI; a column without unit has its bare name.
    """
    if name in INPUTS:
        unit = INPUTS[name].shown
    else:
        unit = REGISTRY.quantities[name].unit if name in REGISTRY.quantities else "1"
    return name if unit == "1" else f"{name} ({unit})"


def power_of(name: str) -> int:
    """Power of ten from the SI value of an input to the number in its column; 0 for a quantity."""
    return -EXPONENTS[INPUTS[name].shown][1] if name in INPUTS else 0


def number_text(value: float, power: int = 0) -> str:
    """The shortest decimal of a number with its point moved: exact, and '' for not-a-number."""
    if not math.isfinite(value):
        return "" if math.isnan(value) else "inf" if value > 0 else "-inf"
    text = repr(value)
    mantissa, _, exponent = text.partition("e")
    if not exponent and not power:
        return text.removesuffix(".0")
    sign = "-" if mantissa[0] == "-" else ""
    before, _, behind = mantissa.removeprefix("-").partition(".")
    digits = (before + behind).lstrip("0")
    if not digits:
        return "0"
    place = len(before) + int(exponent or 0) + power - (len(before + behind) - len(digits))
    digits = digits.rstrip("0")
    if 0 < place <= _PLAIN[0]:
        whole = digits[:place].ljust(place, "0")
        return f"{sign}{whole}.{digits[place:]}" if len(digits) > place else sign + whole
    if -_PLAIN[1] < place <= 0:
        return f"{sign}0.{'0' * -place}{digits}"
    point = f"{digits[0]}.{digits[1:]}" if len(digits) > 1 else digits
    return f"{sign}{point}e{place - 1}"


def quoted_cell(text: str) -> str:
    """A text as a cell: in quotes where it holds what separates cells."""
    if not any(sign in text for sign in ',"\r\n'):
        return text
    return '"' + text.replace('"', '""') + '"'


def head(columns: Iterable[str], wanted: Iterable[str]) -> bytes:
    """The first line of a table."""
    names = [name if name not in INPUTS else title(name) for name in columns]
    titles = [*names, *(title(name) for name in wanted), REFUSED]
    return (",".join(map(quoted_cell, titles)) + "\n").encode()


def number_texts(values: Any, name: str) -> list[str]:
    """Texts of the values of an input, SI, in its column's unit."""
    power, numbers = power_of(name), np.asarray(values, dtype=float).ravel()
    if not np.isfinite(numbers).all():
        return [number_text(value, power) for value in numbers.tolist()]
    texts = map(repr, numbers.tolist())
    if power:
        return [_moved(text, power) for text in texts]
    return [number_text(float(text)) if "e" in text else text.removesuffix(".0") for text in texts]


def _moved(text: str, power: int) -> str:
    """`number_text` of a float's repr: the usual case of a small number, quickly."""
    if "e" in text and text[0] != "-":
        mantissa, exponent = text.split("e")
        digits, place = mantissa[0] + mantissa[2:], int(exponent) + power + 1
        if 0 < place < len(digits):
            return f"{digits[:place]}.{digits[place:]}"
    return number_text(float(text), power)


def _answer_texts(name: str, answer: NDArray[Any], worked: Worked) -> list[str]:
    """Texts of one wanted column, for all rows of a block."""
    kind = kind_of(name)
    if kind == "mask":
        cells = np.array(["false", "true"], dtype=object)[answer.astype(np.intp)]
        if worked.reason or worked.bad.any():
            cells = np.where(worked.bad, np.array("", dtype=object), cells)
    elif kind == "choice":
        cells = answer
    elif name in INPUTS:
        cells = _shaped(number_texts(answer, name), answer.shape)
    else:
        texts = list(map(repr, answer.ravel().tolist()))
        if not np.isfinite(answer).all():
            texts = ["" if text == "nan" else text for text in texts]
        if answer.shape == worked.shape:
            return texts
        cells = _shaped(texts, answer.shape)
    return np.broadcast_to(cells, worked.shape).ravel().tolist()


def _shaped(texts: list[str], shape: tuple[int, ...]) -> NDArray[Any]:
    cells = np.empty(len(texts), dtype=object)
    cells[:] = texts
    return cells.reshape(shape)


def _input_texts(block: Block, worked: Worked) -> list[str]:
    """The input cells of all rows, joined: of each axis once, then every combination."""
    parts = [quoted_cell(label) for _, label in block.labels]
    parts += [number_texts(worked.columns[name], name)[0] for name in block.outer]
    rows: list[str] | None = [",".join(parts)] if parts else None
    for axis, size in enumerate(worked.shape):
        along = [
            number_texts(np.broadcast_to(worked.columns[name].ravel(), (size,)), name)
            for name in block.names_along(axis)
        ]
        cells = list(map(",".join, zip(*along, strict=True)))
        rows = cells if rows is None else [f"{row},{cell}" for row in rows for cell in cells]
    return rows or []


def csv_rows(chunk: Chunk, wanted: tuple[str, ...]) -> tuple[bytes, int, str]:
    """Rows of a chunk as lines of text, how many are refused, and the reason of the first."""
    lines: list[bytes] = []
    refused, reason = 0, ""
    for block in chunk:
        worked = work_out(block, wanted)
        columns = [_input_texts(block, worked)]
        columns += [_answer_texts(name, worked.found[name], worked) for name in wanted]
        names: Iterable[str] = repeat("")
        if worked.refused:
            names = np.broadcast_to(worked.culprit, worked.shape).ravel().tolist()
        text = "\n".join(map(",".join, zip(*columns, names, strict=False)))
        lines += [text.encode(), b"\n"]
        refused, reason = refused + worked.refused, reason or worked.reason
    return b"".join(lines), refused, reason
