"""Units that people write, exactly to SI and back.

A unit that differs from its SI unit by a power of ten is converted by shifting the decimal
exponent of the shortest text that names the number, never by a multiplication: 650 nm becomes
``float("650e-9")``, and comes back as 650. Angles in degrees are the one multiplication.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from decimal import Decimal
from typing import Final

#: Power of ten between a unit and its SI unit. Units of one family share an SI unit.
EXPONENTS: Final[dict[str, tuple[str, int]]] = {
    "1": ("1", 0),
    "%": ("1", -2),
    "m": ("m", 0),
    "mm": ("m", -3),
    "µm": ("m", -6),
    "nm": ("m", -9),
    "pm": ("m", -12),
    "fm": ("m", -15),
    "s": ("s", 0),
    "ms": ("s", -3),
    "µs": ("s", -6),
    "ns": ("s", -9),
    "ps": ("s", -12),
    "fs": ("s", -15),
    "1/s": ("1/s", 0),
    "k/s": ("1/s", 3),
    "M/s": ("1/s", 6),
    "G/s": ("1/s", 9),
    "T/s": ("1/s", 12),
    "P/s": ("1/s", 15),
    "Hz": ("1/s", 0),
    "kHz": ("1/s", 3),
    "MHz": ("1/s", 6),
    "GHz": ("1/s", 9),
    "THz": ("1/s", 12),
    "PHz": ("1/s", 15),
    "rad/s": ("rad/s", 0),
    "rad": ("rad", 0),
    "mrad": ("rad", -3),
    "K": ("K", 0),
    "eV": ("eV", 0),
    "meV": ("eV", -3),
    "µeV": ("eV", -6),
    "(λ/n)³": ("(λ/n)³", 0),
    "λ/n": ("λ/n", 0),
    "°": ("rad", 0),
}

#: Other spellings that people and keyboards produce.
SPELLINGS: Final[dict[str, str]] = {
    "": "1",
    "um": "µm",
    "us": "µs",
    "ueV": "µeV",
    "deg": "°",
    "(lambda/n)^3": "(λ/n)³",
    "lambda/n": "λ/n",
    "μm": "µm",
    "μs": "µs",
    "μeV": "µeV",
    "/s": "1/s",
}

#: Units that a number chooses from when it is written, by power of ten: all of them can be read back.
#: None is below a rate of 1/s: "m/s" would be read as metres a second.
_LADDERS: Final[dict[str, dict[int, str]]] = {
    "m": {-15: "fm", -12: "pm", -9: "nm", -6: "µm", -3: "mm", 0: "m"},
    "s": {-15: "fs", -12: "ps", -9: "ns", -6: "µs", -3: "ms", 0: "s"},
    "eV": {-6: "µeV", -3: "meV", 0: "eV"},
    "1/s": {0: "/s", 3: "k/s", 6: "M/s", 9: "G/s", 12: "T/s", 15: "P/s"},
    "Hz": {0: "Hz", 3: "kHz", 6: "MHz", 9: "GHz", 12: "THz", 15: "PHz"},
}


def unit_name(unit: str) -> str:
    """The spelling used inside for a unit as somebody typed it; ValueError if it is not known."""
    name = SPELLINGS.get(unit, unit)
    if name not in EXPONENTS:
        raise ValueError(f"unknown unit {unit!r}; known: {', '.join(EXPONENTS)}")
    return name


def si_unit(unit: str) -> str:
    """The SI unit behind a unit: 'nm' -> 'm'."""
    return EXPONENTS[unit_name(unit)][0]


def _shifted(value: float, exponent: int) -> float:
    if exponent == 0 or not math.isfinite(value) or value == 0:
        return value
    return float(Decimal(repr(value)).scaleb(exponent))


def to_si(value: float, unit: str) -> float:
    """SI value of a number written in `unit`: to_si(650, "nm") == 6.5e-07 exactly."""
    name = unit_name(unit)
    if name == "°":
        return math.radians(value)
    return _shifted(float(value), EXPONENTS[name][1])


def from_si(value: float, unit: str) -> float:
    """Number to write in `unit` for an SI value; to_si(from_si(x)) is x again (see `exact_in`)."""
    name = unit_name(unit)
    if name == "°":
        return math.degrees(value)
    return _shifted(float(value), -EXPONENTS[name][1])


def _digits(value: float, count: int) -> str:
    """`value` with `count` significant digits, no exponent between 1e-3 and 1e6."""
    if value == 0:
        return "0"
    size = abs(value)
    if size < 1e-3 or size >= 1e6:
        mantissa, power = f"{value:.{count - 1}e}".split("e")
        return f"{mantissa}×10{int(power):d}".replace("×10", "×10^")
    rounded = float(f"{value:.{count - 1}e}")
    places = max(0, count - 1 - math.floor(math.log10(abs(rounded))))
    return f"{rounded:.{places}f}"


def _prefixed(value: float, ladder: Mapping[int, str], count: int) -> str:
    """`value` in the unit of a ladder that suits its size."""
    rounded = float(f"{value:.{count - 1}e}")
    power = 3 * math.floor(math.log10(abs(rounded)) / 3)
    power = min(max(power, min(ladder)), max(ladder))
    return f"{_digits(_shifted(rounded, -power), count)} {ladder[power]}"


def text(value: float, unit: str, digits: int = 3) -> str:
    """An SI value as people write it: 8.4 M/s, 23 nm, 1.2 ns, 35°.

    value: SI number. unit: SI unit, or '1', '%', 'rad', 'rad/s', '(λ/n)³', 'λ/n'.
    Rates, lengths and times choose their prefix; angles are in degrees; an angular frequency is
    written as 2π times a frequency; infinity is '∞', not-a-number is 'no number'. A finite number is
    written as `reading.read_number` reads it.
    """
    if math.isnan(value):
        return "no number"
    if math.isinf(value):
        return "∞" if value > 0 else "−∞"
    name = si_unit(unit) if unit not in ("%",) else "%"
    if name == "%":
        return f"{_digits(value * 100, digits)} %"
    if name == "rad":
        return f"{_digits(math.degrees(value), digits)}°"
    if value == 0:
        return {"1": "0", "1/s": "0 /s"}.get(name, f"0 {name}")
    if name == "rad/s":
        return "2π × " + _prefixed(value / (2 * math.pi), _LADDERS["Hz"], digits)
    if name in _LADDERS:
        return _prefixed(value, _LADDERS[name], digits)
    return _digits(value, digits) + ("" if name == "1" else f" {name}")
