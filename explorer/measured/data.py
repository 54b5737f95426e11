"""What is read from a measured file, in SI units: columns, what was understood, what was dropped."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..physics.measured_pattern import outermost_angle, power_inside
from ..whole import Pattern, Samples

Array = NDArray[np.float64]


class DataError(ValueError):
    """A file that cannot be read, or data that cannot be fitted, in one sentence.

    file: its name. line: number of the line at fault, counted from 1, or None where it is not one
    line's. reason: the sentence without file and line.
    """

    def __init__(self, reason: str, file: str = "", line: int | None = None) -> None:
        place = ", ".join(filter(None, (file, "" if line is None else f"line {line}")))
        super().__init__(f"{place}: {reason}" if place else reason)
        self.reason, self.file, self.line = reason, file, line

    def __reduce__(self) -> tuple[Any, ...]:
        return type(self), (self.reason, self.file, self.line)


@dataclass(frozen=True)
class Dropped:
    """A row that was left out. line: its number in the file, from 1."""

    line: int
    reason: str

    def __str__(self) -> str:
        return f"line {self.line}: {self.reason}"


@dataclass(frozen=True, eq=False)
class _Read:
    """What every kind of data knows of its file.

    name: of the file. digest: SHA-256 of its bytes, hexadecimal. units: of the two columns as the
    file has them, such as ("nm", "counts"). read_as: what was understood, a sentence each. dropped:
    rows that were left out, and why.
    """

    name: str
    digest: str
    units: tuple[str, str]
    read_as: tuple[str, ...]
    dropped: tuple[Dropped, ...]

    def __post_init__(self) -> None:
        for value in vars(self).values():
            if isinstance(value, np.ndarray):
                value.setflags(write=False)


@dataclass(frozen=True, eq=False)
class Spectrum(_Read):
    """An emission spectrum: photon counts per unit wavelength.

    wavelengths: vacuum [m], ascending, (n,). counts: per unit wavelength, any scale, background taken
    away and response divided out; noise may leave some below zero, (n,). gain, floor: the variance of
    `counts` is gain·expected + floor, both (n,), where the file holds counts; None where it does not,
    and the noise is taken from the scatter around a fit.
    """

    wavelengths: Array
    counts: Array
    gain: Array | None = None
    floor: Array | None = None

    @cached_property
    def centre(self) -> float:
        """Mean wavelength, weighted with the counts above zero [m]."""
        weight = np.maximum(self.counts, 0.0)
        return float(np.trapezoid(self.wavelengths * weight, self.wavelengths)) / float(
            np.trapezoid(weight, self.wavelengths)
        )

    @property
    def peak(self) -> float:
        """Wavelength of the strongest line [m]: the mean of the stretch above 0.7 of the largest count."""
        top = int(np.argmax(self.counts))
        low = self.counts < 0.7 * self.counts[top]
        first = top - int(np.argmax(low[top::-1])) + 1 if low[:top].any() else 0
        last = top + int(np.argmax(low[top:])) if low[top:].any() else len(self.counts)
        weight = self.counts[first:last]
        return float(np.average(self.wavelengths[first:last], weights=weight))

    def samples(self, emission_wavelength: float, background: float = 0.0) -> Samples:
        """The spectrum as a value of the input `spectrum`; counts below zero become zero.

        emission_wavelength: that of the design, from which offsets count [m]. background: a flat level
        that is taken away first, in the scale of `counts`.
        """
        left = np.maximum(self.counts - background, 0.0)
        return Samples(self.wavelengths - emission_wavelength, left)


@dataclass(frozen=True, eq=False)
class Histogram(_Read):
    """Counts in even bins of time.

    times: middles of the bins [s], ascending, (n,); bins may be missing. counts: (n,), not negative.
    width: of a bin [s]. counting: whether the counts are whole numbers, so that their noise is known.
    """

    times: Array
    counts: Array
    width: float
    counting: bool = True


@dataclass(frozen=True, eq=False)
class Decay(Histogram):
    """A histogram of arrival times after a pulse, or of an instrument's response to one."""


@dataclass(frozen=True, eq=False)
class Coincidences(Histogram):
    """A histogram of delays between detections on two detectors; `times` may be negative."""


@dataclass(frozen=True, eq=False)
class AngularPattern(_Read):
    """An angular pattern, averaged over both sides of the axis where the file has both.

    angles: from the axis [rad], ascending, 0 to π/2, (n,). powers: per solid angle, any scale, (n,).
    upward_share: share of the power that goes up, where the file reaches 180°, else None.
    """

    angles: Array
    powers: Array
    upward_share: float | None = None

    @cached_property
    def pattern(self) -> Pattern:
        """The value of the input `pattern`; powers below zero become zero."""
        return Pattern(self.angles, np.maximum(self.powers, 0.0))

    @property
    def half_angle(self) -> float:
        """Outermost angle at which half of the largest power is left [rad]."""
        return outermost_angle(self.pattern, 0.5)

    def collected(self, sine: float) -> float:
        """Share of the power going up that lies within an angle with this sine [1]."""
        return float(power_inside(self.pattern, sine) / power_inside(self.pattern, 1.0))
