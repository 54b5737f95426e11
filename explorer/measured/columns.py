"""Labels and units of columns, as people write them in a header."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, replace
from typing import Final

from ..domain import quoted
from .data import DataError


@dataclass(frozen=True)
class Unit:
    """A unit of an axis. family: what it measures. exponent: power of ten to SI (wavenumbers: 1/m).

    step: of a channel number in that unit, where the axis counts channels; else None.
    """

    name: str
    family: str
    exponent: int
    step: float | None = None

    def __str__(self) -> str:
        return self.name


@dataclass(frozen=True)
class Kind:
    """What the axis of a kind of file may be. words: in a sentence. usual: the unit taken for none.

    known: units, in a sentence. values: the unit of the second column where none is named.
    """

    words: str
    families: tuple[str, ...]
    usual: str
    known: str
    values: str = "counts"


#: Letters before a unit, and their powers of ten.
_PREFIXES: Final = {
    "": 0,
    "m": -3,
    "µ": -6,
    "n": -9,
    "p": -12,
    "f": -15,
    "k": 3,
    "M": 6,
    "G": 9,
    "T": 12,
    "P": 15,
}
_WORDS: Final = {"milli": "m", "micro": "µ", "nano": "n", "pico": "p", "femto": "f"}
_LARGER: Final = {"kilo": "k", "mega": "M", "giga": "G", "tera": "T"}


def _units() -> dict[str, Unit]:
    """All units of axes by their usual name."""
    rows = (
        ("m", "length", ("", "m", "µ", "n", "p")),
        ("s", "time", ("", "m", "µ", "n", "p", "f")),
        ("eV", "energy", ("", "m", "µ")),
        ("Hz", "frequency", ("", "k", "M", "G", "T", "P")),
        ("rad", "angle", ("", "m")),
    )
    found = {
        prefix + name: Unit(prefix + name, family, _PREFIXES[prefix])
        for name, family, prefixes in rows
        for prefix in prefixes
    }
    found["Å"] = Unit("Å", "length", -10)
    found["cm-1"] = Unit("cm-1", "wavenumber", 2)
    found["°"] = Unit("°", "angle", 0)
    found["channel"] = Unit("channel", "channel", 0)
    return found


UNITS: Final = _units()


def _spellings() -> dict[str, str]:
    """Other spellings, all in lower case, and the usual name."""
    found = {name.lower(): name for name in UNITS if name not in ("PHz", "mHz", "MHz")}
    found |= {"mhz": "MHz", "phz": "PHz", "ang": "Å", "å": "Å", "\u212b".lower(): "Å"}
    for word in ("angstrom", "ångström", "ångstrom", "angström"):
        found |= {word: "Å", f"{word}s": "Å"}
    for word in ("deg", "degs", "degree", "degrees", "º", "˚", "\\degree"):
        found[word] = "°"
    for word in ("cm^-1", "cm⁻¹", "1/cm", "/cm", "cm**-1", "cm^{-1}", "cm^(-1)", "kayser"):
        found[word] = "cm-1"
    for word in ("channel", "channels", "ch", "ch.", "channel number", "channel no.", "bin"):
        found[word] = "channel"
    for word in ("bins", "bin number", "bin index", "pixel", "pixels", "px", "index"):
        found[word] = "channel"
    for stem, base in (("metre", "m"), ("meter", "m"), ("second", "s"), ("radian", "rad")):
        for word, prefix in (("", ""), *_WORDS.items()):
            if prefix + base in UNITS:
                found |= {word + stem: prefix + base, f"{word}{stem}s": prefix + base}
    for word, prefix in (("", ""), *_LARGER.items()):
        found[f"{word}hertz"] = f"{prefix}Hz"
    for word in ("micron", "microns"):
        found[word] = "µm"
    found |= {"sec": "s", "msec": "ms", "nsec": "ns", "psec": "ps", "usec": "µs", "µsec": "µs"}
    for word in ("electronvolt", "electronvolts", "electron volt", "electron volts"):
        found |= {word: "eV", f"milli{word}": "meV", f"milli-{word}": "meV"}
    return found | {name.replace("µ", "u"): real for name, real in found.items() if "µ" in name}


_SPELLINGS: Final = _spellings()

KINDS: Final = {
    "spectrum": Kind(
        "a spectrum",
        ("length", "energy", "frequency", "wavenumber"),
        "nm",
        "nm, µm, Å, eV, meV, THz, GHz or cm-1",
    ),
    "decay": Kind("a decay", ("time", "channel"), "ns", "ns, ps, µs or a bin width such as 16 ps"),
    "coincidences": Kind(
        "a histogram of coincidences",
        ("time", "channel"),
        "ns",
        "ns, ps, µs or a bin width such as 16 ps",
    ),
    "pattern": Kind("an angular pattern", ("angle",), "°", "°, rad or mrad", ""),
}

#: First words of a label that name an axis of some kind, and so are no mere index.
_AXIS: Final = re.compile(
    r"wave|lambda|λ|energy|photon|freq|wavenumber|time|delay|tau|τ|lag|t$|angle|theta|θ|phi|φ",
    re.IGNORECASE,
)
_STEP: Final = re.compile(r"(\d{1,12}(?:[.,]\d{1,12})?(?:[eE][+-]?\d{1,2})?)\s*(\D.{0,20})")
_BRACKETS: Final = re.compile(r"\(([^()\[\]{}]{1,40})\)|\[([^()\[\]{}]{1,40})\]|\{([^{}]{1,40})\}")
_BEHIND: Final = re.compile(r"(.{1,80}?)(?:\s*[/,:;_]\s*|\s+in\s+|\s+)([^\s,:;_]{1,16})", re.DOTALL)

#: Remarks in brackets that are no units.
_REMARKS: Final = {"air", "vac", "vac.", "vacuum", "in air", "in vacuum", "x", "y"}

#: Letters that stand for something else than a unit unless they are marked as one.
_BARE: Final = {"a", "m", "s", "ch", "bin", "index", "channel", "pixel", "px", "bins"}


def known_unit(text: str) -> Unit | None:
    """The unit of an axis that a text names, in any spelling; 'N unit' is a channel's width."""
    plain = (
        unicodedata.normalize("NFC", " ".join(text.split()))
        .replace("μ", "µ")
        .replace("\\mu", "µ")
        .strip("$\"' ")
    )
    if plain in UNITS or plain == "A":
        return UNITS["Å" if plain == "A" else plain]
    if plain in ("MeV", "mHz", "Ms", "Ps", "Mm", "Pm", "MRAD", "Mrad", "MS", "PS", "MM", "PM"):
        return None  # not the small unit that the same letters name
    lower = plain.lower()
    if lower in _SPELLINGS:
        return UNITS[_SPELLINGS[lower]]
    found = _STEP.fullmatch(plain)
    unit = known_unit(found[2].strip(" *×·/")) if found else None
    if found is None or unit is None or unit.step or unit.family not in ("time",):
        return None
    step = float(found[1].replace(",", "."))
    if step <= 0:
        return None
    return replace(unit, name=f"{found[1].replace(',', '.')} {unit.name}", step=step)


@dataclass(frozen=True)
class Label:
    """A column's heading. unit: the text in the place of a unit, '' where there is none."""

    text: str
    name: str
    unit: str

    @property
    def axis(self) -> bool:
        """Whether it names or measures an axis."""
        found = known_unit(self.unit) if self.unit else None
        return bool(_AXIS.match(self.name)) or (found is not None and found.family != "channel")


def read_label(cell: str) -> Label:
    """Name and unit out of 'Wavelength (nm)', 'lambda [nm]', 'Time/ns', 'Energy, eV' or 'nm'."""
    text = " ".join(cell[:200].strip(" \t\"'").split())
    if not text:
        return Label("", "", "")
    if known_unit(text) or known_unit(text.strip("()[]{}")):
        return Label(text, "", text.strip("[]{}") if text[0] in "[{" else text.strip("()"))
    groups = [next(filter(None, found.groups())) for found in _BRACKETS.finditer(text)]
    units = [group.strip() for group in groups if group.strip().lower() not in _REMARKS]
    name = _BRACKETS.sub("", text).strip(" ,:;/_")
    if units:
        known = [unit for unit in units if known_unit(unit)]
        return Label(text, name or text, (known or units)[-1])
    found = _BEHIND.fullmatch(text)
    if found:
        last = found[2].strip()
        marked = not text[found.end(1) : found.start(2)].isspace()
        if known_unit(last) and (marked or last.lower() not in _BARE):
            return Label(text, found[1].strip(), last)
    return Label(text, name or text, "")


def unit_inside(text: str) -> str:
    """The first unit of an axis in a line of words, in brackets, behind a slash or behind 'in'."""
    marked = [next(filter(None, found.groups())) for found in _BRACKETS.finditer(text)]
    marked += re.findall(r"(?:\bin\s+|/\s*)([^\s,;:/]{1,16})", text)
    known = [(one, known_unit(one)) for one in marked]
    return next((one for one, unit in known if unit and unit.family != "channel"), "")


def is_units_row(cells: list[str]) -> bool:
    """Whether the first cell is a unit of an axis, in brackets or not, and the others may be units."""
    plain = [cell.strip(" \t\"'") for cell in cells]
    known = [bool(known_unit(one) or known_unit(one.strip("()[]{}"))) for one in plain]
    others = [one for one, yes in zip(plain, known, strict=True) if not yes]
    return known[0] and all(len(one) <= 16 for one in others)


def axis_unit(text: str, kind: str) -> Unit:
    """The unit of the axis of a kind of file; DataError, without file and line, for a wrong one."""
    wanted = KINDS[kind]
    unit = known_unit(text)
    if unit is None or unit.family not in wanted.families or (unit.step and kind == "pattern"):
        raise DataError(
            f"{quoted(text)} is no unit of the axis of {wanted.words}; it may be {wanted.known}, "
            "and can be given as units"
        )
    return unit
