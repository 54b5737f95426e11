"""Numbers as people type them, with or without a unit, to SI."""

from __future__ import annotations

import math
import re

from .units import EXPONENTS, si_unit, to_si, unit_name

_INFINITE = {"∞", "inf", "infinite", "infinity", "none"}
_NUMBER = re.compile(
    r"\s*(?P<number>[+−-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:\s*(?:[eE]|[×x*·]\s*10\^?)\s*[+−-]?\d+)?)"
    r"(?:\s*/\s*(?P<over>\d+(?:\.\d+)?))?\s*(?P<unit>\D.*?)?\s*"
)


class ReadingError(ValueError):
    """A text that is no number of the kind wanted; the message says what would be."""


def read_number(text: str, unit: str) -> float:
    """SI value of a number typed in a field that shows `unit`.

    Takes 650, 650 nm, 0.65 µm, 1e4, 1×10^4, 1/3, 40 %, ∞; a comma counts as a decimal point.
    Raises ReadingError.
    """
    plain = text.strip()
    if plain.lower() in _INFINITE:
        return math.inf
    found = _NUMBER.fullmatch(plain)
    if found is None:
        raise ReadingError(f"“{plain[:40]}” is no number; write for example {_example(unit)}")
    digits = re.sub(r"\s*[×x*·]\s*10\^?\s*", "e", found["number"])
    number = float(digits.replace(",", ".").replace("−", "-").replace(" ", ""))
    if found["over"]:
        if float(found["over"]) == 0:
            raise ReadingError(f"“{plain[:40]}” divides by zero")
        number /= float(found["over"])
    typed = found["unit"] or unit
    try:
        name = unit_name(typed)
    except ValueError:
        raise ReadingError(f"“{typed[:20]}” is no unit that fits {unit_words(unit)}") from None
    if si_unit(name) != si_unit(unit):
        raise ReadingError(f"{typed} is no unit that fits {unit_words(unit)}")
    return to_si(number, name)


def unit_words(unit: str) -> str:
    """A unit in a message: 'nm', or 'a plain number'."""
    return "a plain number" if unit == "1" else unit


def _example(unit: str) -> str:
    return "0.5" if unit == "1" else f"20 {unit}"


def units_like(unit: str) -> tuple[str, ...]:
    """The units that may be typed in a field that shows `unit`."""
    family = si_unit(unit)
    return tuple(name for name in EXPONENTS if si_unit(name) == family)
