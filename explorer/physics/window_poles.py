r"""Poles of the outgoing spectrum 1/|(kappa/2 + iw)(Gamma/2 + i(w - delta)) + g^2|^2, kept exact.

With d the bare broader pole minus the bare narrower one (half widths as imaginary parts), half the
distance of the poles is q = sqrt(d^2/4 + g^2) and the coupling moves the narrower one by
-g^2/(d/2 + q). With the root in the quadrant of d, no sum below subtracts like numbers; the
imaginary part is that of Gamma/2 + g^2 (kappa/2 - Im p)/|p - i kappa/2|^2 or its mirror image.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

#: Squared distance from a pole over the squared shift by the coupling: two digits lost.
_CLOSE = 1e-4


class Line(NamedTuple):
    """The four numbers of S(w) [rad/s, g_squared in (rad/s)^2], arrays that broadcast."""

    kappa: Floats
    coherence: Floats
    g_squared: Floats
    detuning: Floats


class Poles(NamedTuple):
    """Poles of S in the upper half plane; the narrow one has half width `narrow` [all rad/s]."""

    mode_is_narrow: NDArray[np.bool_]
    push: Floats  # the coupling moves the narrow pole by -push, the broad one by +push
    narrow: Floats
    broad: Floats
    gap_real: Floats  # half of broad pole minus narrow pole
    gap_imaginary: Floats


def half_gap_squared(line: Line) -> tuple[Floats, Floats]:
    """Real part, and size of the imaginary part, of ((p1 - p2)/2)^2."""
    distance = np.abs(line.detuning)
    contrast = np.abs(line.kappa - line.coherence) / 2
    real = (distance - contrast) * (distance + contrast) / 4 + line.g_squared
    return real, distance * contrast / 2


def spectrum_poles(line: Line) -> Poles:
    """Poles without any difference of like numbers: every sum below has terms of one sign."""
    mode_is_narrow = line.kappa <= line.coherence
    side = np.where(mode_is_narrow, np.copysign(1, line.detuning), -np.copysign(1, line.detuning))
    real, imaginary = half_gap_squared(line)
    major = np.sqrt(
        (np.sqrt(real**2 + imaginary**2) + np.abs(real)) / 2
    )  # hypot is 20 times slower
    minor = imaginary / (2 * np.where(major > 0, major, 1))
    gap_real, gap_imaginary = np.where(real >= 0, major, minor), np.where(real >= 0, minor, major)
    sum_real = np.abs(line.detuning) / 2 + gap_real
    sum_imaginary = np.abs(line.kappa - line.coherence) / 4 + gap_imaginary
    squared = sum_real**2 + sum_imaginary**2
    ratio = line.g_squared / np.where(squared > 0, squared, 1)
    narrow = np.minimum(line.kappa, line.coherence) / 2 + ratio * sum_imaginary
    broad = (line.kappa + line.coherence) / 2 - narrow  # narrow is at most half of the sum
    return Poles(
        mode_is_narrow, side * ratio * sum_real, narrow, broad, side * gap_real, gap_imaginary
    )


def denominator(frequency: Floats, line: Line) -> tuple[Floats, Floats]:
    """Real and imaginary part of (w - p1)(w - p2), right where w(w - detuning) meets g_squared."""
    from_emitter = frequency - line.detuning
    real = np.atleast_1d(frequency * from_emitter - line.g_squared)
    cancels = np.abs(real) < 0.01 * line.g_squared
    if cancels.any():
        picked = (
            np.broadcast_to(x, real.shape)[cancels]
            for x in (frequency, line.detuning, line.g_squared)
        )
        real[cancels] = _exact_difference(*picked)
    imaginary = -(frequency * line.coherence + from_emitter * line.kappa) / 2
    return real - line.kappa * line.coherence / 4, imaginary


def _exact_difference(frequency: Floats, detuning: Floats, g_squared: Floats) -> Floats:
    """w(w - detuning) - g_squared, rounding errors of difference and product added back.

    Error-free sum and product: Dekker, Numer. Math. 18, 224 (1971), from memory.
    """
    difference = frequency - detuning
    virtual = frequency - difference
    difference_error = (frequency - (difference + virtual)) + (virtual - detuning)
    product = frequency * difference
    (a, b), (c, d) = (_halves(x) for x in (frequency, difference))
    product_error = ((a * c - product) + a * d + b * c) + b * d
    return (product - g_squared) + (product_error + frequency * difference_error)


def _halves(value: Floats) -> tuple[Floats, Floats]:
    """Two parts of 26 bits each, so that products of parts are exact."""
    scaled = 134217729.0 * value
    high = scaled - (scaled - value)
    return high, value - high


def distances_from_poles(edge: Floats, line: Line, poles: Poles) -> tuple[Floats, Floats]:
    """Distance of an edge from the narrow and the broad pole along the real axis."""
    from_emitter = edge - line.detuning
    x1 = np.where(poles.mode_is_narrow, edge, from_emitter) + poles.push
    x2 = np.where(poles.mode_is_narrow, from_emitter, edge) - poles.push
    nearest = np.minimum(x1**2 + poles.narrow**2, x2**2 + poles.broad**2)
    lost = np.asarray(nearest < _CLOSE * poles.push**2)
    if lost.any():
        x1, x2, edge = (np.broadcast_to(x, lost.shape).copy() for x in (x1, x2, edge))
        b1, b2 = (np.broadcast_to(x, lost.shape)[lost] for x in (poles.narrow, poles.broad))
        picked = Line(*(np.broadcast_to(x, lost.shape)[lost] for x in line))
        x1[lost], x2[lost] = _refined(x1[lost], x2[lost], b1, b2, denominator(edge[lost], picked))
    return np.asarray(x1), np.asarray(x2)


def _refined(
    x1: Floats, x2: Floats, b1: Floats, b2: Floats, value: tuple[Floats, Floats]
) -> tuple[Floats, Floats]:
    """The nearer distance again, from the denominator over the farther one.

    A direct difference loses the digits that a splitting or shift larger than the width takes.
    """
    nearer = x1**2 + b1**2 < x2**2 + b2**2
    x, b = np.where(nearer, x2, x1), np.where(nearer, b2, b1)
    refined = (value[0] * x - value[1] * b) / (x**2 + b**2)
    return np.where(nearer, refined, x1), np.where(nearer, x2, refined)


def norm(line: Line) -> Floats:
    """The factor that makes the integral of 1/|denominator|^2 equal to 1 [(rad/s)^3]."""
    total = line.kappa + line.coherence
    product = line.kappa * line.coherence
    return (total * (product / 4 + line.g_squared) + product * line.detuning**2 / total) / (
        2 * np.pi
    )
