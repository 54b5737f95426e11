"""Where a value stands on the scale of its input, so that inputs of different kinds compare.

A position is the fraction of the slider's range, in the logarithm where the slider is logarithmic.
Zero and infinity have no logarithm: below the lowest of a scale with a zero stop (and above the highest
of one with a stop for ∞) the scale goes on straight, without a kink, and ends one e-fold further.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..inputs import INPUTS

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Scale:
    """Positions and SI values of one input, arrays of any shape; nothing is clipped to the slider."""

    name: str

    @property
    def span(self) -> float:
        """e-folds from the slider's lowest to its highest value; 0 where its scale is linear."""
        entry = INPUTS[self.name]
        logarithmic = entry.scale.startswith("log")
        return float(np.log(entry.slider[1] / entry.slider[0])) if logarithmic else 0.0

    def position(self, value: Any) -> Array:
        """The position of SI values: 0 and 1 at the ends of the slider."""
        value = np.asarray(value, dtype=float)
        (low, high), kind, span = INPUTS[self.name].slider, INPUTS[self.name].scale, self.span
        if not span:
            return np.asarray((value - low) / (high - low))
        with np.errstate(divide="ignore", invalid="ignore"):
            place = np.log(value / low) / span
            if kind == "log or zero":
                place = np.where(value < low, (value / low - 1) / span, place)
            if kind == "log or none":
                place = np.where(value > high, 1 + (1 - high / value) / span, place)
        return np.asarray(place)

    def value(self, position: Any) -> Array:
        """The SI values at positions."""
        place = np.asarray(position, dtype=float)
        (low, high), kind, span = INPUTS[self.name].slider, INPUTS[self.name].scale, self.span
        if not span:
            return np.asarray(low + (high - low) * place)
        with np.errstate(divide="ignore", over="ignore"):
            value = low * np.exp(place * span)
            if kind == "log or zero":
                value = np.where(place < 0, low * np.maximum(1 + place * span, 0.0), value)
            if kind == "log or none":
                left = np.maximum(1 - (place - 1) * span, 0.0)
                value = np.where(place > 1, high / left, value)
        return np.asarray(value)
