"""A spectrum's background and the response of the instrument that took it, and the noise they leave."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from ..domain import quoted, real_number
from ..inputs import INPUTS
from .axes import axis_values, vacuum_wavelengths
from .columns import KINDS
from .data import Array, DataError, Dropped
from .pairs import Pairs, Rows
from .series import averaged, linear

#: Values below zero of at most this share of the largest are taken for noise around a background.
NOISE_BELOW_ZERO: Final = 0.1

#: Whole numbers count photons where the largest is at least this.
_LEAST_COUNT: Final = 10

#: Units of rates: whole numbers in them are not the number of photons that came.
_RATES: Final = ("/s", "/ s", "cps", "hz", "s-1", "s^-1", "per s", "/min")


@dataclass
class Curve:
    """Values over wavelength, ascending. gain, floor: of their variance, None where it is not known.

    wavelengths: [m], (n,). lines: in the file, (n,).
    """

    pairs: Pairs
    wavelengths: Array
    values: Array
    lines: Rows
    gain: Array | None
    floor: Array | None
    notes: list[str]
    dropped: list[Dropped]

    def error(self, reason: str, index: int | None = None) -> DataError:
        """The error to raise for the file, and for a sample where one is at fault."""
        line = None if index is None else int(self.lines[index])
        return self.pairs.document.error(reason, line)


def curve_of(pairs: Pairs, *, counting: bool, least: int = 2) -> Curve:
    """Sorted by wavelength, repeated wavelengths averaged. counting: whether values may be counts.

    Raises DataError for a wavelength that no emitter of this tool has, and for fewer than `least`
    different ones.
    """
    wavelengths = _in_range(pairs)
    notes: list[str] = []
    values = linear(pairs, notes)
    counting = counting and values is pairs.second
    known = counting and counts_photons(values, pairs.value_unit)
    series = averaged(pairs, wavelengths, values, rising=pairs.unit.family == "length")
    if series.axis.size < least:
        raise pairs.error(
            f"the rows hold {series.axis.size} different wavelengths, {least} are needed", 0
        )
    gain = 1.0 / series.repeats if known else None
    floor = np.zeros_like(series.values) if known else None
    return Curve(
        pairs,
        series.axis,
        series.values,
        series.lines,
        gain,
        floor,
        [*pairs.notes, *series.notes, *notes],
        [*pairs.dropped, *series.dropped],
    )


def counts_photons(values: Array, unit: str) -> bool:
    """Whether values are whole numbers that count photons, so that their noise is known."""
    rate = any(word in unit.lower() for word in _RATES)
    whole = bool(np.all(values >= 0) and np.all(values == np.rint(values)))
    return whole and not rate and float(values.max()) >= _LEAST_COUNT


def _in_range(pairs: Pairs) -> Array:
    """Vacuum wavelengths [m]; DataError for the first row outside the range of the input."""
    entry = INPUTS["emission_wavelength"]
    low, high = float(entry.low), float(entry.high)
    above = pairs.first > 0
    if above.all():
        wavelengths = vacuum_wavelengths(pairs.first, pairs.unit)
    else:
        wavelengths = np.zeros(pairs.first.shape)
        wavelengths[above] = vacuum_wavelengths(pairs.first[above], pairs.unit)
    inside = (wavelengths >= low * (1 - 1e-12)) & (wavelengths <= high * (1 + 1e-12))
    if inside.all():
        return wavelengths
    row = int(np.argmin(inside))
    ends = sorted(axis_values(end, pairs.unit) for end in (low, high))
    raise pairs.error(
        f"{pairs.first[row]:.6g} {pairs.unit} lies outside the range of a spectrum, {ends[0]:.4g} to "
        f"{ends[1]:.4g} {pairs.unit}; if this is no number in {pairs.unit}, give the unit by units, "
        f"one of {KINDS['spectrum'].known}",
        row,
    )


def _interpolated(curve: Curve, other: Curve, what: str) -> tuple[Rows, Array, Array]:
    """Indices of the left neighbours in `other`, and the weights of both; it must cover the range."""
    at, have = curve.wavelengths, other.wavelengths
    slack = 1e-9 * at[-1]
    if at[0] < have[0] - slack or at[-1] > have[-1] + slack:
        raise other.error(
            f"the {what} covers {have[0] * 1e9:.6g} to {have[-1] * 1e9:.6g} nm, the spectrum "
            f"{at[0] * 1e9:.6g} to {at[-1] * 1e9:.6g} nm: it must cover the whole of it"
        )
    left = np.clip(np.searchsorted(have, at, side="right") - 1, 0, have.size - 2)
    right = np.clip((at - have[left]) / (have[left + 1] - have[left]), 0.0, 1.0)
    return left, 1.0 - right, right


def take_background(curve: Curve, background: Curve | float) -> None:
    """Subtract a background in the counts of the file; its mean and its own variance go into `floor`."""
    if not isinstance(background, Curve):
        number = real_number(background)
        if number is None or not np.isfinite(number) or abs(number) > 1e100:
            raise curve.error(
                f"a background is a file or a finite number, not {quoted(background)}"
            )
        curve.values = curve.values - number
        if curve.gain is not None and curve.floor is not None:
            curve.floor = curve.floor + curve.gain * max(number, 0.0)
        curve.notes.append(f"a background of {number:g} was taken away")
        return
    if background.pairs.unit.family != curve.pairs.unit.family:
        raise background.error(
            f"the background is over {background.pairs.unit}, the spectrum over "
            f"{curve.pairs.unit}: give both over the same axis"
        )
    left, lower, upper = _interpolated(curve, background, "background")
    level = _mixed(background.values, left, lower, upper)
    curve.values = curve.values - level
    if curve.gain is not None and curve.floor is not None:
        curve.floor = curve.floor + curve.gain * np.maximum(level, 0.0)
        if background.gain is not None:
            variance = background.gain * np.maximum(background.values, 0.0)
            curve.floor = curve.floor + _mixed(variance, left, lower**2, upper**2)
    same = np.array_equal(background.wavelengths, curve.wavelengths)
    noise = "" if background.gain is not None else ", its own noise is not known"
    curve.notes.append(
        f"the background in {quoted(background.pairs.document.name)} was taken away"
        f"{'' if same else ', interpolated'}{noise}{_remarks(background)}"
    )


def _remarks(other: Curve) -> str:
    """What a person must know of how a second file was read."""
    assumed = [note for note in other.notes if note.startswith("no unit")]
    left_out = f"{len(other.dropped)} of its rows left out or averaged" if other.dropped else ""
    words = [*assumed, *filter(None, [left_out])]
    return f" ({'; '.join(words)})" if words else ""


def _mixed(values: Array, left: Rows, lower: Array, upper: Array) -> Array:
    return np.asarray(lower * values[left] + upper * values[left + 1])


def refuse_negative(pairs: Pairs, values: Array, lines: Rows, notes: list[str], what: str) -> None:
    """DataError for values below zero that are no noise around a background, or where none is above."""
    largest, row = float(values.max()), int(np.argmin(values))
    if largest <= 0:
        words = "all values are zero" if not values.any() else "no value is above zero"
        raise pairs.document.error(words, int(lines[0]))
    least = float(values[row])
    if least < -NOISE_BELOW_ZERO * largest:
        raise pairs.document.error(
            f"{least:.6g} lies below zero by more than a tenth of the largest value, {largest:.6g}",
            int(lines[row]),
        )
    if least < 0:
        count = int((values < 0).sum())
        notes.append(
            f"{count} of {values.size} {what} are below zero; they count as zero in the map"
        )


def divide_response(curve: Curve, response: Curve) -> None:
    """Divide by a relative sensitivity over wavelength; the variance follows."""
    if (response.values <= 0).any():
        row = int(np.argmax(response.values <= 0))
        raise response.error(f"a response must be above zero, not {response.values[row]:.6g}", row)
    left, lower, upper = _interpolated(curve, response, "response")
    # Relative to its largest value in the range, so that counts keep their size.
    level = _mixed(response.values, left, lower, upper)
    scale(curve, level.max() / level)
    curve.notes.append(
        f"divided by the response in {quoted(response.pairs.document.name)}, relative to its largest "
        f"value here{_remarks(response)}"
    )


def scale(curve: Curve, factor: Array) -> None:
    """Multiply values, and their variance accordingly."""
    curve.values = curve.values * factor
    if curve.gain is not None and curve.floor is not None:
        curve.gain = curve.gain * factor
        curve.floor = curve.floor * factor**2
