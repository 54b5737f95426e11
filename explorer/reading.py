"""Numbers as people type them, with or without a unit, to SI."""

from __future__ import annotations

import math
import re

from .units import si_unit, to_si, unit_name

_INFINITE = {"∞", "inf", "infinite", "infinity", "none"}
_RAISED = "⁺⁻⁰¹²³⁴⁵⁶⁷⁸⁹"
_LOWERED = str.maketrans(_RAISED, "+-0123456789")
_RAISED_POWER = re.compile(rf"(?<![\d.,])10([{_RAISED}]+)")
_BARE_POWER = re.compile(r"([+-]?)(10\s*(?:\^|\*\*))")
#: A power of ten is marked as one: "3×1000" is a product, and no number here.
_NUMBER = re.compile(
    r"(?P<number>[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+))"
    r"(?:\s*(?:[eE]|[×x*·]\s*10\s*(?:\^|\*\*))\s*(?P<power>[+-]?\d+))?"
    r"(?:\s*/\s*(?P<over>\d+(?:\.\d+)?))?\s*(?P<unit>\D.*?)?"
)
_PRODUCT = re.compile(r"\s*[×x*·]+\s*\d.*")
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
    found = _NUMBER.fullmatch(_typeset(plain))
    if found is None:
        raise ReadingError(f"“{plain[:40]}” is no number; write for example {_example(unit)}")
    typed = (found["unit"] or unit).strip()
    if _PRODUCT.fullmatch(typed):
        raise ReadingError(f"“{plain[:40]}” is a product; write a power of ten as 3×10^4 or 3e4")
    number = float(f"{found['number'].replace(',', '.')}e{found['power'] or 0}")
    if math.isinf(number):
        raise ReadingError(f"“{plain[:40]}” is too large a number")
    if found["over"]:
        if float(found["over"]) == 0:
            raise ReadingError(f"“{plain[:40]}” divides by zero")
        number /= float(found["over"])
    return to_si(number, _fitting(typed, unit))


def _typeset(text: str) -> str:
    """The same with plain minus signs and with every power of ten written as 1×10^4."""
    text = text.replace("−", "-")
    text = _RAISED_POWER.sub(lambda found: "10^" + found[1].translate(_LOWERED), text)
    return _BARE_POWER.sub(r"\g<1>1×\2", text) if _BARE_POWER.match(text) else text


def _fitting(typed: str, unit: str) -> str:
    """The name of a typed unit, which must be of the kind of `unit`."""
    try:
        name = unit_name(typed)
    except ValueError:
        name = ""
    if not name or si_unit(name) != si_unit(unit):
        raise ReadingError(f"“{typed[:20]}” is no unit that fits {unit_words(unit)}")
    return name


def unit_words(unit: str) -> str:
    """A unit in a message: 'nm', or 'a plain number'."""
    return "a plain number" if unit == "1" else unit


def _example(unit: str) -> str:
    return "0.5" if unit == "1" else f"20 {unit}"


#: A number, a sign that stands for more and less, and a width, which may be a share of the number.
_SPREAD = re.compile(
    r"\s*(?P<centre>.*\d.*?)\s*(?:±|\+/-|\+-)\s*"
    r"(?P<width>[−+-]?[\d.,]+(?:e[−+-]?\d+)?)\s*(?P<unit>.*)",
    re.IGNORECASE,
)


def read_spread(text: str, shown: str) -> tuple[float, float] | None:
    """SI value and SI width of what a person typed as '637 ± 2 nm' or '100 ± 10 %'.

    A width in % is a share of the value, unless the value is in % itself. A unit behind one of the two
    is that of both. None where it is no such thing. shown: the unit of numbers without one. Raises
    ReadingError for what cannot be read; a negative width is read as it stands.
    """
    found = _SPREAD.fullmatch(text)
    if found is None:
        return None
    alone = _NUMBER.fullmatch(_typeset(found["centre"]))
    own = ((alone and alone["unit"]) or "").strip()
    unit = found["unit"].strip()
    if unit == "%" and own != "%":
        centre = read_number(found["centre"], shown)
        return centre, abs(centre) * read_number(f"{found['width']} %", "1")
    value, width = f"{found['centre']} {'' if own else unit}", f"{found['width']} {unit or own}"
    return read_number(value.strip(), shown), read_number(width.strip(), shown)


#: Two numbers with a dash, dots or a word between them, and a unit behind.
_RANGE = re.compile(
    r"\s*(?P<low>[−-]?[\d.,]+(?:e[−+-]?\d+)?)\s*(?:–|-|\.\.\.?|…|to)\s*"
    r"(?P<high>[−-]?[\d.,]+(?:e[−+-]?\d+)?)\s*(?P<unit>.*)",
    re.IGNORECASE,
)


def read_range(text: str, shown: str) -> tuple[float, float] | None:
    """SI ends of a range that a person typed, such as '3.4–3.9 ns'; None where it is no range.

    shown: the unit of numbers without one. Raises ReadingError for a range that cannot be read.
    """
    found = _RANGE.fullmatch(text)
    if found is None:
        return None
    unit = found["unit"]
    low, high = (read_number(f"{found[end]} {unit}".strip(), shown) for end in ("low", "high"))
    if low > high:
        raise ReadingError("a range runs from its low end to its high end, such as 3.4–3.9")
    return low, high
