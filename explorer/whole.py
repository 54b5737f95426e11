"""Whole values: a spectrum of several lines, a measured spectrum, an angular pattern.

Immutable and hashable, one per point, never an axis. SI units throughout (m, rad).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

#: Longest measured spectrum or pattern that a point may carry.
MOST_SAMPLES = 200_000


#: Smallest share of a line, and smallest extent of a pattern [rad]: below, numbers run out of digits.
LEAST = 1e-20


class WholeError(ValueError):
    """A spectrum or pattern that cannot be one; the message says what is wrong and where."""


def _columns(
    first: Iterable[float], second: Iterable[float], names: tuple[str, str]
) -> list[Array]:
    columns = []
    for name, values in zip(names, (first, second), strict=True):
        try:
            column = np.array(list(values) if not isinstance(values, np.ndarray) else values)
        except (TypeError, ValueError) as error:
            raise WholeError(f"{name} must be a one-dimensional list of numbers") from error
        if column.ndim != 1 or column.dtype.kind not in "iuf":
            raise WholeError(f"{name} must be a one-dimensional list of numbers")
        column = column.astype(np.float64)
        bad = np.flatnonzero(~np.isfinite(column))
        if bad.size:
            raise WholeError(f"{name}[{bad[0]}] = {column[bad[0]]} is not a finite number")
        columns.append(column)
    if columns[0].size != columns[1].size:
        raise WholeError(
            f"{names[0]} and {names[1]} differ in length: {columns[0].size} and {columns[1].size}"
        )
    if columns[0].size > MOST_SAMPLES:
        raise WholeError(f"{columns[0].size} samples are more than the {MOST_SAMPLES} allowed")
    return columns


@dataclass(frozen=True)
class Lines:
    """An emission spectrum of a few Lorentzian lines.

    lines: a sequence of (share, offset, fast width): the share of the photons [1], > 0; the
    wavelength of the line minus `emission_wavelength` [m]; its FWHM [m], taken at its own
    wavelength, 0 = lifetime limited, None = the point's `fast_linewidth` (and so its temperature).
    Shares sum to at most 1; what is missing is light at an unknown wavelength: it overlaps nothing,
    and any finite filter stops it. Raises WholeError.
    """

    lines: tuple[tuple[float, float, float | None], ...]

    def __init__(self, lines: Sequence[Sequence[float | None]]) -> None:
        try:
            rows = tuple(_row(line) for line in lines)
        except (TypeError, ValueError) as error:
            raise WholeError("each line is three numbers: share, offset, fast width") from error
        if not rows:
            raise WholeError("each line is three numbers: share, offset, fast width")
        if len(rows) > 50:
            raise WholeError(f"{len(rows)} lines are more than the 50 allowed; use Samples")
        for index, row in enumerate(rows):
            if not all(np.isfinite(value) for value in row if value is not None):
                raise WholeError(f"line {index} holds a number that is not finite: {row}")
            if row[0] < LEAST or (row[2] is not None and row[2] < 0):
                raise WholeError(
                    f"line {index}: the share must be at least {LEAST:g}, the width not below 0; got {row}"
                )
        if sum(row[0] for row in rows) > 1 + 1e-9:
            raise WholeError(f"the shares sum to {sum(row[0] for row in rows):.6g}, above 1")
        object.__setattr__(self, "lines", rows)

    @property
    def known_share(self) -> float:
        """Share of the light whose wavelength is known [1]."""
        return min(1.0, sum(line[0] for line in self.lines))

    @property
    def strongest(self) -> int:
        """Index of the line with the largest share."""
        return max(range(len(self.lines)), key=lambda index: self.lines[index][0])

    @property
    def follows(self) -> bool:
        """Whether a line takes the point's `fast_linewidth`."""
        return any(line[2] is None for line in self.lines)


def _row(line: Sequence[float | None]) -> tuple[float, float, float | None]:
    share, offset, width = line
    if share is None or offset is None:
        raise TypeError("share and offset are numbers")
    return float(share), float(offset), None if width is None else float(width)


class _Sampled:
    """Two read-only columns, compared and hashed by content."""

    __slots__ = ("_first", "_hash", "_second")
    _first: Array
    _second: Array
    _hash: int

    def _set(self, first: Array, second: Array) -> None:
        for column in (first, second):
            column.setflags(write=False)
        object.__setattr__(self, "_first", first)
        object.__setattr__(self, "_second", second)
        object.__setattr__(self, "_hash", hash((type(self), first.tobytes(), second.tobytes())))

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError(f"{type(self).__name__} is immutable")

    def __eq__(self, other: object) -> bool:
        return self is other or (
            type(self) is type(other)
            and isinstance(other, _Sampled)
            and np.array_equal(self._first, other._first)
            and np.array_equal(self._second, other._second)
        )

    def __hash__(self) -> int:
        return self._hash

    def __reduce__(self) -> tuple[Any, ...]:
        return type(self), (self._first, self._second)

    def __len__(self) -> int:
        return int(self._first.size)

    def __repr__(self) -> str:
        return f"{type(self).__name__}({len(self)} samples, {self._first[0]:.6g} … {self._first[-1]:.6g})"


class Samples(_Sampled):
    """A measured emission spectrum: photon counts per nm against the wavelength offset.

    offsets: wavelength minus `emission_wavelength` [m], any order, no duplicates, two or more.
    counts: photon counts per unit wavelength, any scale, not negative, not all zero.
    Between samples the spectrum is linear in frequency; outside it is zero. Raises WholeError.
    """

    __slots__ = ()

    def __init__(self, offsets: Iterable[float], counts: Iterable[float]) -> None:
        first, second = _columns(offsets, counts, ("offsets", "counts"))
        order = np.argsort(first, kind="stable")
        first, second = first[order], second[order]
        if first.size < 2:
            raise WholeError("a spectrum needs at least two samples")
        same = np.flatnonzero(np.diff(first) <= 0)
        if same.size:
            raise WholeError(f"offset {first[same[0]]:.6g} m is given twice")
        if np.any(second < 0):
            index = int(np.argmax(second < 0))
            raise WholeError(
                f"counts must not be negative; got {second[index]:.6g} at {first[index]:.6g} m"
            )
        if not np.any(second > 0):
            raise WholeError("all counts are zero")
        self._set(first, second)

    @property
    def offsets(self) -> Array:
        """Wavelength minus `emission_wavelength` [m], ascending, read-only."""
        return self._first

    @property
    def counts(self) -> Array:
        """Photon counts per unit wavelength, as given, read-only."""
        return self._second


class Pattern(_Sampled):
    """An angular pattern, averaged over azimuth, with a flat phase.

    angles: from the axis [rad], ascending or not, within 0..π/2, no duplicates, two or more.
    powers: power per solid angle, any scale, not negative, not all zero. Linear between the
    angles, constant below the first, zero above the last. Raises WholeError.
    """

    __slots__ = ()

    def __init__(self, angles: Iterable[float], powers: Iterable[float]) -> None:
        first, second = _columns(angles, powers, ("angles", "powers"))
        order = np.argsort(first, kind="stable")
        first, second = first[order], second[order]
        if first.size < 2:
            raise WholeError("a pattern needs at least two angles")
        if first[0] < 0 or first[-1] > np.pi / 2 + 1e-12:
            raise WholeError(
                f"angles must lie within 0 and π/2 rad; got {first[0]:.6g} to {first[-1]:.6g}"
            )
        if first[-1] < LEAST:
            raise WholeError(
                f"angles must reach {LEAST:g} rad or more; got {first[-1]:.6g} at most"
            )
        same = np.flatnonzero(np.diff(first) <= 0)
        if same.size:
            raise WholeError(f"angle {first[same[0]]:.6g} rad is given twice")
        if np.any(second < 0):
            index = int(np.argmax(second < 0))
            raise WholeError(
                f"powers must not be negative; got {second[index]:.6g} at {first[index]:.6g} rad"
            )
        if not np.any(second > 0):
            raise WholeError("all powers are zero")
        self._set(first, second)

    @property
    def angles(self) -> Array:
        """Angle from the axis [rad], ascending, read-only."""
        return self._first

    @property
    def powers(self) -> Array:
        """Power per solid angle, as given, read-only."""
        return self._second
