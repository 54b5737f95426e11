"""Slider positions 0..1 and the values they stand for."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ..registry import Input


@dataclass(frozen=True)
class Scale:
    """Position and value of one input's slider.

    A logarithmic scale may have a stop of its own for zero at the low end, or for ∞ at the high end.
    """

    entry: Input

    @property
    def step(self) -> float:
        """One keyboard step."""
        return 0.001 if self.entry.scale == "linear" else 0.002

    def value(self, position: float) -> float:
        """The SI value at a position, to four significant digits in the shown unit."""
        low, high = self.entry.slider
        kind = self.entry.scale
        if kind == "log or zero" and position <= 0:
            return 0.0
        if kind == "log or none" and position >= 1:
            return math.inf
        if kind.startswith("log"):
            raw = low * (high / low) ** position
        else:
            raw = low + (high - low) * position
        return _rounded(raw, high - low if kind == "linear" else raw)

    def stop(self, value: float) -> float:
        """The slider's own stop next to an SI value."""
        return min(round(self.position(value) / self.step) * self.step, 1.0)

    def position(self, value: float) -> float:
        """The position of an SI value; beyond the ends, the ends."""
        low, high = self.entry.slider
        if math.isinf(value):
            return 1.0
        if self.entry.scale.startswith("log"):
            if value <= 0:
                return 0.0
            fraction = math.log(value / low) / math.log(high / low)
        else:
            fraction = (value - low) / (high - low)
        return min(max(fraction, 0.0), 1.0)


def rounded(value: float) -> float:
    """A value to four significant digits."""
    return float(f"{value:.4g}")


def _rounded(value: float, size: float) -> float:
    """A value to four digits of a size, and without the dust of binary fractions."""
    if value == 0 or size == 0:
        return value
    places = 3 - math.floor(math.log10(abs(size)))
    return float(f"{value:.{places}f}") if places >= 0 else float(f"{value:.4g}")
