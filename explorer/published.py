"""What a published record is made of: numbers with their sources, lines, and the record itself.

Widths and mode volumes are published in many units; they are converted here, at the border.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Final

from scipy import constants

from . import units
from .broadening import Broadening
from .inputs import INPUTS
from .whole import Lines

#: In place of a key of references.toml: a fact of the trade that nobody cites.
COMMON: Final = "common practice"
#: Values of a record that are no input of a point, with their SI unit.
OTHER_VALUES: Final = {"host_index": "1", "zero_phonon_share": "1"}
#: Volume unit -> power of ten of its length unit against the metre.
VOLUMES: Final = {"nm³": -9, "µm³": -6, "cm³": -2, "m³": 0}
#: Values that decide where a record lies on the map.
DECIDING: Final = {
    "emitters": ("lifetime", "quantum_yield", "fast_linewidth"),
    "resonators": ("quality_factor", "mode_volume"),
}


def spectral_width(width: float, unit: str, *, wavelength: float) -> float:
    """FWHM in wavelength [m] of a width published in nm, meV, µeV, MHz, GHz ….

    wavelength [m], vacuum, where the line lies. A FWHM Δ at λ is the angular width
    2πcΔ/(λ² − Δ²/4) exactly; this is its inverse, written without a difference of near numbers.
    """
    value, family = units.to_si(width, unit), units.si_unit(unit)
    if family == "m":
        return value
    if family == "eV":
        angular = value * constants.e / constants.hbar
    elif family == "1/s":
        angular = 2 * math.pi * value
    else:
        raise ValueError(f"{unit!r} is no unit of a linewidth")
    if angular == 0:
        return 0.0
    path = 2 * math.pi * constants.c / angular
    return 2 * wavelength**2 / (path + math.hypot(path, wavelength))


def cubic_wavelengths(
    volume: float, unit: str, *, wavelength: float, refractive_index: float
) -> float:
    """Mode volume in (λ/n)³ of one published in (λ/n)³, λ³ (vacuum), nm³, µm³ or cm³.

    wavelength [m], vacuum; refractive_index at the field maximum.
    """
    if unit == "λ³":
        return volume * refractive_index**3
    if unit in VOLUMES:
        return volume * 10.0 ** (3 * VOLUMES[unit]) * (refractive_index / wavelength) ** 3
    if units.si_unit(unit) != "(λ/n)³":
        raise ValueError(f"{unit!r} is no unit of a mode volume")
    return units.to_si(volume, unit)


@dataclass(frozen=True)
class Reference:
    """One source. seen: what was read of it; read_at: the address of the copy that was read."""

    key: str
    authors: str
    journal: str
    seen: str
    year: int | None = None
    title: str = ""
    volume: str = ""
    page: str = ""
    doi: str = ""
    url: str = ""
    read_at: str = ""

    @property
    def text(self) -> str:
        """The source as people cite it: 'Loo et al., Appl. Phys. Lett. 97, 241110 (2010)'."""
        place = " ".join(part for part in (self.journal, self.volume) if part)
        page = f", {self.page}" if self.page else ""
        year = f" ({self.year})" if self.year else ""
        return f"{self.authors}, {place}{page}{year}"


@dataclass(frozen=True)
class Value:
    """One published number. value_si, low_si, high_si: SI; shown: as printed, with its unit.

    source: a key of references.toml or 'common practice' (then reference is None).
    """

    value_si: float
    low_si: float | None
    high_si: float | None
    shown: str
    unit: str
    source: str
    where: str
    conditions: str
    checked: str
    remark: str
    reference: Reference | None

    @property
    def ends(self) -> tuple[float, float] | None:
        """(low, high), SI, an open end at the value itself; None where no range is published."""
        low = self.value_si if self.low_si is None else self.low_si
        high = self.value_si if self.high_si is None else self.high_si
        return (low, high) if low < high else None

    @property
    def origin(self) -> str:
        """Where the number comes from, in one sentence."""
        source = self.reference.text if self.reference else f"{COMMON}, no source"
        details = ", ".join(part for part in (self.where, self.conditions) if part)
        return f"{self.shown}: {source}{f' ({details})' if details else ''}; {self.checked}"


@dataclass(frozen=True)
class Line:
    """One line of a composite spectrum; without a centre its light is at no known wavelength."""

    role: str
    share: Value
    centre: Value | None
    width: Value | None
    #: Its width is the record's `fast_linewidth`, and so that of its broadening law.
    follows: bool = False


@dataclass(frozen=True)
class Law:
    """A published broadening law: the whole value, and the source as a sentence."""

    broadening: Broadening
    checked: str
    source: str
    origin: str
    reference: Reference | None


@dataclass(frozen=True)
class Enhancement:
    """A published enhancement; `meaning` says of what, since the three kinds do not compare."""

    value: Value
    meaning: str
    #: The likely reason where the model misses it.
    miss: str = ""
    #: Printed as a lower bound.
    at_least: bool = False


@dataclass(frozen=True, eq=False)
class Record:
    """One emitter, resonator or optic. `doubts` says what is doubtful, `caution` what can hurt."""

    key: str
    kind: str
    name: str
    class_: str
    summary: str
    doubts: str
    temperature: str
    caution: str
    gaussian_beam: bool | None
    measured_with: str
    values: Mapping[str, Value]
    lines: tuple[Line, ...]
    choices: Mapping[str, str]
    enhancement: Enhancement | None
    law: Law | None = None
    #: What a prediction of the device needs to know besides: its emitter, its surroundings.
    device: Mapping[str, Value] = field(default_factory=dict)

    def inputs(self, *, own_wavelength: bool = True) -> dict[str, Any]:
        """The record as entries of a point, in SI; a composite spectrum as `Lines`.

        With a broadening law the fast linewidth is left out, since it follows from it.
        own_wavelength False leaves `resonance_wavelength` out, so that the resonance follows the
        emission: the same resonator, scaled to another wavelength.
        """
        point: dict[str, Any] = {
            name: value.value_si for name, value in self.values.items() if name in INPUTS
        }
        if not own_wavelength:
            point.pop("resonance_wavelength", None)
        placed = self._placed_lines()
        if placed:
            centre = self.values["emission_wavelength"].value_si
            point["spectrum"] = Lines(
                [
                    (share.value_si, at.value_si - centre, width.value_si if width else None)
                    for share, at, width in placed
                ]
            )
        if self.law is not None:
            point["broadening"] = self.law.broadening
            point.pop("fast_linewidth", None)  # it follows from the law and the temperature
        return point | dict(self.choices)

    @property
    def placed(self) -> bool:
        """Whether the record says all that decides: a resonator its Q and V."""
        return set(DECIDING.get(self.kind, ())) <= self.deciding().keys()

    def ranges(self) -> dict[str, tuple[float, float]]:
        """Input name -> published (low, high), SI, where the value is a range."""
        return {
            name: ends
            for name, value in self.values.items()
            if name in INPUTS and (ends := value.ends) is not None
        }

    def origins(self) -> dict[str, tuple[str, str]]:
        """Where each entry of `inputs()` comes from: ('seen' or 'from memory', a sentence)."""
        found = {
            name: (value.checked, value.origin)
            for name, value in self.values.items()
            if name in INPUTS
        }
        if self.law is not None:
            found["broadening"] = (self.law.checked, self.law.origin)
            found.pop("fast_linewidth", None)
        used = [value for line in self._placed_lines() for value in line if value is not None]
        if used:
            seen = all(value.checked == "seen" for value in used)
            texts = dict.fromkeys(value.origin for value in used)
            found["spectrum"] = ("seen" if seen else "from memory", "; ".join(texts))
        return found | dict.fromkeys(self.choices, ("from memory", "choice of this record"))

    def references(self) -> tuple[Reference, ...]:
        """The sources of every number of the record, each once."""
        found = {value.source: value.reference for value in self.every_value()}
        if self.law is not None:
            found[self.law.source] = self.law.reference
        return tuple(reference for reference in found.values() if reference is not None)

    def every_value(self) -> tuple[Value, ...]:
        """All numbers of the record, those of lines and of the enhancement too."""
        lines = [part for line in self.lines for part in (line.share, line.centre, line.width)]
        more = [self.enhancement.value] if self.enhancement else []
        every = (*self.values.values(), *lines, *more, *self.device.values())
        return tuple(value for value in every if value is not None)

    def deciding(self) -> dict[str, Value]:
        """The values that decide where the record lies on the map; a composite's strongest width."""
        found = {
            name: self.values[name] for name in DECIDING.get(self.kind, ()) if name in self.values
        }
        widths = [
            (line.share.value_si, line.width) for line in self.lines if line.width is not None
        ]
        if "fast_linewidth" not in found and widths:
            found["fast_linewidth"] = max(widths, key=lambda pair: pair[0])[1]
        return found

    def _placed_lines(self) -> list[tuple[Value, Value, Value | None]]:
        return [
            (line.share, line.centre, None if line.follows else line.width)
            for line in self.lines
            if line.centre is not None and (line.follows or line.width is not None)
        ]
