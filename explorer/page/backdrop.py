"""What lies on a Q–V map besides the quantity: emitters' bands, published devices, second scales."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from ..catalogue import emitters, resonators
from ..maps import Axis
from ..published import Record
from ..question import Answer
from ..units import text
from .canvas import Band, Mark, SecondScale
from .records import edited

#: Half-angles written on the second scale [degrees].
HALF_ANGLES = (60, 40, 30, 20, 15, 10, 7, 5, 3, 2, 1)

#: Half the height of a band whose width has no published range, as a factor of Q.
THIN = 1.08


@dataclass(frozen=True)
class Drawn:
    """Bands, marks and second scales in fractions of the axes."""

    bands: tuple[Band, ...] = ()
    marks: tuple[Mark, ...] = ()  # those nearest to the design's wavelength first
    top: SecondScale | None = None
    right: SecondScale | None = None


_NOTHING = Drawn()


class Backdrop:
    """Makes the backdrop of an answer, and remembers the last one."""

    def __init__(self) -> None:
        self._key: Any = None
        self._last = Drawn()

    def of(self, answer: Answer) -> Drawn:
        """The backdrop; empty unless Q is up and V across."""
        question = answer.question
        if (question.y.name, question.x.name) != ("quality_factor", "mode_volume"):
            return _NOTHING
        values = answer.values
        watched = (
            "emission_wavelength",
            "fast_linewidth",
            "slow_linewidth",
            "spectrum",
            "resonance_wavelength",
            "refractive_index",
            "medium_index",
            "mode_profile",
            "mode_length",
            "pattern",
        )
        key = (
            question.x,
            question.y,
            question.design.emitter,
            edited(question.design),
            "aperture_radius" in question.design.point,
            tuple(values[name] for name in watched),
        )
        if key != self._key:
            self._key = key
            wavelength = float(values["resonance_wavelength"])
            own = _own_band(answer, question.y)
            others = _published_bands(question.y, question.design.emitter)
            self._last = Drawn(
                bands=(own, *others) if own else others,
                marks=_marks(question.x, question.y, wavelength),
                top=_angles(answer, question.x),
                right=_widths(wavelength, question.y),
            )
        return self._last


def _own_band(answer: Answer, axis: Axis) -> Band | None:
    values = answer.values
    width = float(values["fast_linewidth"]) + float(values["slow_linewidth"])
    spectrum = values["spectrum"]
    if spectrum is not None:
        width = answer.width
    if width <= 0:
        return None
    record = emitters().get(answer.question.design.emitter)
    name = record.name if record else "this emitter"
    if edited(answer.question.design):
        name += ", edited"
    return _band(float(values["emission_wavelength"]) / width, name, axis, own=True)


def _band(quality: float, name: str, axis: Axis, own: bool, spread: float = THIN) -> Band | None:
    low, high = (float(axis.fraction(quality * factor)) for factor in (1 / spread, spread))
    if high <= 0 or low >= 1:
        return None
    return Band(max(low, 0.0), min(high, 1.0), name, own)


@lru_cache(maxsize=64)
def _published_bands(axis: Axis, own: str) -> tuple[Band, ...]:
    """Bands of the published emitters but one."""
    found = (_published_band(record, axis) for key, record in emitters().items() if key != own)
    return tuple(band for band in found if band is not None)


def _published_band(record: Record, axis: Axis) -> Band | None:
    width = record.deciding().get("fast_linewidth")
    centre = record.values.get("emission_wavelength")
    if width is None or centre is None or width.value_si <= 0:
        return None
    quality = centre.value_si / width.value_si
    if width.low_si and width.high_si and width.low_si > 0:
        middle = centre.value_si / np.sqrt(width.low_si * width.high_si)
        spread = max(float(np.sqrt(width.high_si / width.low_si)), THIN)
        return _band(float(middle), record.name, axis, False, spread)
    return _band(quality, record.name, axis, False)


@lru_cache(maxsize=64)
def _marks(across: Axis, up: Axis, wavelength: float) -> tuple[Mark, ...]:
    """Every published resonator on the map, those nearest to a wavelength first."""
    found = []
    for key, record in resonators().items():
        quality, volume = (record.values.get(name) for name in ("quality_factor", "mode_volume"))
        if quality is None or volume is None:
            continue
        x = float(across.fraction(volume.value_si))
        y = float(up.fraction(quality.value_si))
        if 0 <= x <= 1 and 0 <= y <= 1:
            note = f"{record.name}: Q {quality.shown} ({quality.checked}), V {volume.shown} ({volume.checked})"
            source = quality.reference.text if quality.reference else quality.source
            own = record.values.get("resonance_wavelength")
            far = abs(np.log(own.value_si / wavelength)) if own else np.inf
            found.append((far, Mark(x, y, record.class_, f"{note}; {source}", key)))
    return tuple(mark for _, mark in sorted(found, key=lambda pair: pair[0]))


def _angles(answer: Answer, axis: Axis) -> SecondScale | None:
    """Beam half-angle of the mode's own size along the top."""
    design = answer.question.design
    if answer.values["pattern"] is not None or "aperture_radius" in design.point:
        return None
    curve = answer.half_angles
    if curve is None:
        return None
    degrees = np.degrees(curve)
    ticks = []
    fractions = axis.fraction(axis.values)
    for angle in HALF_ANGLES:
        if degrees.min() < angle < degrees.max():
            place = float(np.interp(-angle, -degrees, fractions))
            ticks.append((place, f"{angle}°"))
    return SecondScale("beam half-angle of this mode size", tuple(ticks))


def _widths(wavelength: float, axis: Axis) -> SecondScale:
    """Resonator linewidth along the right."""
    ticks = []
    for power in range(-16, -6):
        fraction = float(axis.fraction(wavelength / 10.0**power))
        if 0.01 <= fraction <= 0.99:
            ticks.append((fraction, text(10.0**power, "m", 1)))
    return SecondScale("resonator linewidth", tuple(ticks))
