"""Numbers as people type them, with or without a unit, to SI."""

from __future__ import annotations

import math
import re

from .units import si_unit, to_si, unit_name

_INFINITE = {"∞", "inf", "infinite", "infinity", "none"}
_RAISED = "⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹"
_LOWERED = str.maketrans(_RAISED + "−", "+-0123456789-")
#: A power of ten is marked as one: 10^4, 10**4 or 10⁴; "3×1000" is a product and no number here.
_POWER = rf"10\s*(?:(?:\^|\*\*)\s*(?P<power>[+−-]?\d+)|(?P<raised>[⁺⁻]?[{_RAISED[2:]}]+))"
_NUMBER = re.compile(
    rf"(?P<sign>[+−-]?)(?:{_POWER.replace('power', 'bare').replace('raised', 'lone')}"
    r"|(?P<number>\d+(?:[.,]\d*)?|[.,]\d+)"
    rf"(?:\s*[eE]\s*(?P<exponent>[+−-]?\d+)|\s*[×x*·]\s*{_POWER})?)"
    r"(?:\s*/\s*(?P<over>\d+(?:\.\d+)?))?\s*(?P<unit>\D.*?)?"
)
_TURNS = re.compile(r"2\s*(?:π|pi)\s*[×x*·]?\s*(?P<rest>\S.*)")


class ReadingError(ValueError):
    """A text that is no number of the kind wanted; the message says what would be."""


def read_number(text: str, unit: str) -> float:
    """SI value of a number typed in a field that shows `unit`.

    Takes 650, 650 nm, 0.65 µm, 1e4, 1×10^4, 10⁴, 1/3, 40 %, ∞, and 2π × 3 GHz for an angular
    frequency; a comma counts as a decimal point. Raises ReadingError.
    """
    plain = text.strip()
    if plain.lower() in _INFINITE:
        return math.inf
    turns = _TURNS.fullmatch(plain)
    if turns and si_unit(unit) == "rad/s":
        return 2 * math.pi * read_number(turns["rest"], "Hz")
    found = _NUMBER.fullmatch(plain)
    if found is None:
        raise ReadingError(f"“{plain[:40]}” is no number; write for example {_example(unit)}")
    typed = found["unit"] or unit
    if typed[0] in "×x*·":
        raise ReadingError(f"“{plain[:40]}” is a product; write a power of ten as 3×10^4 or 3e4")
    number = _figure(found)
    if found["over"]:
        if float(found["over"]) == 0:
            raise ReadingError(f"“{plain[:40]}” divides by zero")
        number /= float(found["over"])
    try:
        name = unit_name(typed)
    except ValueError:
        raise ReadingError(f"“{typed[:20]}” is no unit that fits {unit_words(unit)}") from None
    if si_unit(name) != si_unit(unit):
        raise ReadingError(f"{typed} is no unit that fits {unit_words(unit)}")
    return to_si(number, name)


def _figure(found: re.Match[str]) -> float:
    """The number itself, without divisor and unit."""
    powers = (found[name] for name in ("exponent", "power", "raised", "bare", "lone"))
    power = next((one for one in powers if one), "0").translate(_LOWERED)
    digits = (found["number"] or "1").replace(",", ".")
    return float(f"{found['sign'].translate(_LOWERED)}{digits}e{power}")


def unit_words(unit: str) -> str:
    """A unit in a message: 'nm', or 'a plain number'."""
    return "a plain number" if unit == "1" else unit


def _example(unit: str) -> str:
    return "0.5" if unit == "1" else f"20 {unit}"
