"""Angular patterns: both sides of the axis made one, and the share of the power that goes up."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from .axes import shifted
from .correction import refuse_negative
from .data import Array, Dropped
from .pairs import Pairs
from .series import averaged, linear, order_note

#: Angle that a file must reach for the share that goes up [rad].
_REACHES: Final = math.radians(175.0)
#: Printed numbers of radians are taken for quarter turns within this [rad].
_NEAR_QUARTER: Final = 1e-4


@dataclass(frozen=True)
class Folded:
    """angles: from the axis [rad], 0 to π/2, ascending, (n,). powers: (n,). upward_share: or None."""

    angles: Array
    powers: Array
    upward_share: float | None
    notes: list[str]
    dropped: list[Dropped]


def folded(pairs: Pairs) -> Folded:
    """The pattern over the angle from the axis. Raises DataError."""
    notes = order_note(pairs.first)
    powers = linear(pairs, notes)
    refuse_negative(pairs, powers, pairs.lines, notes, "values")
    quarter = 90.0 if pairs.unit.name == "°" else math.pi / 2
    series = averaged(pairs, _turned(pairs, quarter), powers)
    notes += [note for note in series.notes if "averaged" in note]
    angles, values = _one_side(series.axis, series.values, 2 * quarter, notes)
    angles = np.asarray(np.radians(angles)) if quarter == 90.0 else angles
    share = upward_share(angles, values) if angles[-1] >= _REACHES else None
    angles, values = _upper(pairs, angles, values, share, notes)
    return Folded(angles, values, share, notes, [*pairs.dropped, *series.dropped])


def _turned(pairs: Pairs, quarter: float) -> Array:
    """Angles within half a turn on both sides of the axis, in degrees or radians as `quarter` is."""
    angles = pairs.first.copy()
    if quarter != 90.0:
        angles = shifted(angles, pairs.unit.exponent)
        turns = np.rint(angles / quarter)
        near = (np.abs(angles - turns * quarter) < _NEAR_QUARTER) & (turns != 0)
        angles = np.where(near, turns * quarter, angles)
    far = np.abs(angles) > 4 * quarter
    if far.any():
        row = int(np.argmax(far))
        raise pairs.error(
            f"an angle of {pairs.first[row]:.6g} {pairs.unit} is more than a turn; if this is no "
            f"number in {pairs.unit}, give the unit by units",
            row,
        )
    # A whole turn is taken off with nine digits behind the point, so that both sides meet.
    beyond = np.abs(angles) > 2 * quarter
    return np.where(beyond, np.round(angles - np.sign(angles) * 4 * quarter, 9), angles)


def _one_side(angles: Array, powers: Array, half: float, notes: list[str]) -> tuple[Array, Array]:
    """Mean of both sides of the axis, where there are two. angles: -half to half, ascending."""
    ends = np.abs(angles) == half
    if not ((angles < 0) & ~ends).any():
        order = np.argsort(np.abs(angles), kind="stable")
        return _merged(np.abs(angles)[order], powers[order])
    if not ((angles > 0) & ~ends).any():
        notes.append("angles on one side of the axis, below zero: taken as above")
        order = np.argsort(np.abs(angles), kind="stable")
        return _merged(np.abs(angles)[order], powers[order])
    sides = []
    for side in ((angles >= 0) | ends, (angles <= 0) | ends):
        place = np.abs(angles[side])
        order = np.argsort(place, kind="stable")
        sides.append(_merged(place[order], powers[side][order]))
    (first, _), (second, _) = sides
    places = np.union1d(first, second)
    total, weight = np.zeros(places.size), np.zeros(places.size)
    for place, value in sides:
        inside = (places >= place[0]) & (places <= place[-1])
        total += np.where(inside, np.interp(places, place, value), 0.0)
        weight += inside
    alike = np.array_equal(first, second)
    have = weight > 0
    notes.append(
        "both sides of the axis were averaged" + ("" if alike else ", interpolated to all angles")
    )
    return places[have], total[have] / weight[have]


def _merged(places: Array, values: Array) -> tuple[Array, Array]:
    """Neighbours at the same place, such as -180° and 180°, averaged."""
    starts = np.flatnonzero(np.concatenate(([True], np.diff(places) > 0)))
    if starts.size == places.size:
        return places, values
    count = np.diff(np.append(starts, places.size))
    return places[starts], np.add.reduceat(values, starts) / count


def upward_share(angles: Array, powers: Array) -> float | None:
    """∫₀^90° P sin θ dθ over ∫₀^180° P sin θ dθ, P linear between the angles [rad], constant outside.

    None where it is no share above 0.
    """
    every = np.union1d(np.union1d(angles, [0.0, np.pi / 2]), [max(np.pi, float(angles[-1]))])
    power = np.interp(every, angles, powers)
    step = np.diff(every)
    slope = np.diff(power) / step
    # The mean of cos over a piece as a product, so that narrow pieces lose no digits.
    middle = every[:-1] + 0.5 * step
    mean = np.cos(middle) * np.sinc(0.5 * step / np.pi)
    pieces = power[:-1] * np.cos(every[:-1]) - power[1:] * np.cos(every[1:]) + slope * mean * step
    up = every[1:] <= np.pi / 2
    total = float(pieces.sum())
    share = float(pieces[up].sum()) / total if total > 0 else 0.0
    return share if 0 < share <= 1 else None


def _upper(
    pairs: Pairs, angles: Array, powers: Array, share: float | None, notes: list[str]
) -> tuple[Array, Array]:
    """What lies within 90° from the axis, with a value at 90° where the file goes on beyond."""
    side = math.pi / 2
    up = angles <= side
    if up.sum() < angles.size:
        words = f", {share:.3g} of the power goes up" if share is not None else ""
        notes.append(f"angles beyond 90° go down and are left out of the pattern{words}")
        if up.any() and angles[up][-1] < side:
            level = np.interp(side, angles, powers)
            angles, powers = np.append(angles[up], side), np.append(powers[up], level)
            notes.append("the value at 90° is interpolated")
        else:
            angles, powers = angles[up], powers[up]
    if angles.size < 2:
        raise pairs.error("fewer than two angles lie within 90° from the axis", 0)
    if not (powers > 0).any():
        raise pairs.error("no value within 90° from the axis is above zero", 0)
    return angles, powers
