r"""Share of the light that leaves the resonator inside a frequency window, for one homogeneous line.

.. math:: S(w) \propto \left|(\kappa/2+iw)(\Gamma/2+i(w-\delta))+g^2\right|^{-2}, \qquad w=\omega-\omega_c

The denominator has two zeros in the upper half plane. With a = Re p1 - Re p2, b = Im p, the integral over a window is

.. math:: \frac{b_2(a^2-\beta\sigma)\theta_1 + b_1(a^2+\beta\sigma)\theta_2 - 2ab_1b_2\Lambda}{\pi\sigma|p_1-p_2|^2},
          \qquad \beta=b_1-b_2,\ \sigma=b_1+b_2=(\kappa+\Gamma)/2

where theta is the angle under which a pole sees the window and Lambda the logarithm of the cross ratio of edges and poles.
Partial fractions, checked against direct integration in high precision. Where the poles look alike from everywhere in the window
(coincident poles, far tails) its terms cancel, and one smooth quadrature panel takes over.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]

_LOOK_ALIKE = (
    0.01  # squared pole spacing over squared distance, below which the smooth panel is used
)
_CLOSE = (
    1e-4  # squared distance from a pole over the squared shift by the coupling: two digits lost
)
_BEYOND = 1e8  # an infinite edge in units of every scale of the cell: the rest beyond is 1e-24 of the share
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(16)


class Line(NamedTuple):
    """The four numbers of S(w) [rad/s, g_squared in (rad/s)^2], as arrays that broadcast against each other."""

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


def outgoing_window(
    *,
    lower: ArrayLike,
    upper: ArrayLike,
    kappa: ArrayLike,
    coherence: ArrayLike,
    g_squared: ArrayLike,
    detuning: ArrayLike,
) -> Floats:
    """Share of the outgoing spectrum inside [lower, upper].

    lower, upper [rad/s] from the resonance, lower <= upper, may be infinite; kappa > 0, coherence >= 0 [rad/s];
    g_squared >= 0 [(rad/s)^2]; detuning [rad/s], emitter minus resonance. Any broadcastable shapes. coherence = 0 needs
    g_squared > 0. Right to 1e-9 relative, taking the arguments as exact, for rates of 1e3 to 1e16 rad/s and shares
    however small.
    """
    given = np.atleast_1d(
        *(np.asarray(x, float) for x in (lower, upper, kappa, coherence, g_squared, detuning))
    )
    line = Line(*given[2:])
    low, high = finite_edges(given[0], given[1], line)
    poles = _poles(line)
    share = np.atleast_1d(_elementary_share(low, high, line, poles))
    alike = np.broadcast_to(_poles_look_alike(low, high, line, poles), share.shape)
    if alike.any():
        low, high, *rest = (np.broadcast_to(x, share.shape)[alike] for x in (low, high, *line))
        share[alike] = _smooth_share(low, high, Line(*rest))
    return share.reshape(
        np.broadcast_shapes(
            *(np.shape(x) for x in (lower, upper, kappa, coherence, g_squared, detuning))
        )
    )


def outgoing_density(
    *,
    frequency: ArrayLike,
    kappa: ArrayLike,
    coherence: ArrayLike,
    g_squared: ArrayLike,
    detuning: ArrayLike,
) -> Floats:
    """Outgoing spectrum S per angular frequency [s/rad], its integral over all frequencies 1.

    frequency [rad/s] from the resonance; the rest, shapes and accuracy as for `outgoing_window`.
    """
    frequency, *rest = np.atleast_1d(
        *(np.asarray(x, float) for x in (frequency, kappa, coherence, g_squared, detuning))
    )
    line = Line(*rest)
    real, imaginary = _denominator(frequency, line)
    shape = np.broadcast_shapes(*(np.shape(x) for x in (frequency, *line)))
    return np.asarray(norm(line) / (real**2 + imaginary**2)).reshape(shape)


def norm(line: Line) -> Floats:
    """The factor that makes the integral of 1/|denominator|^2 over all frequencies 1 [(rad/s)^3]."""
    total = line.kappa + line.coherence
    product = line.kappa * line.coherence
    return (total * (product / 4 + line.g_squared) + product * line.detuning**2 / total) / (
        2 * np.pi
    )


def finite_edges(lower: Floats, upper: Floats, line: Line) -> tuple[Floats, Floats]:
    """Edges with the infinite ones moved to where only 1e-24 of the share lies beyond."""
    scale = line.kappa + line.coherence + np.sqrt(line.g_squared) + np.abs(line.detuning)
    inside = np.where(np.isinf(lower), 0, np.abs(lower)) + np.where(
        np.isinf(upper), 0, np.abs(upper)
    )
    far = _BEYOND * (scale + inside)
    return np.where(np.isinf(lower), np.copysign(far, lower), lower), np.where(
        np.isinf(upper), np.copysign(far, upper), upper
    )


def _half_gap_squared(line: Line) -> tuple[Floats, Floats]:
    """Real part, and imaginary part seen from the broader of emitter and mode, of ((p1 - p2)/2)^2."""
    distance = np.abs(line.detuning)
    contrast = np.abs(line.kappa - line.coherence) / 2
    real = (distance - contrast) * (distance + contrast) / 4 + line.g_squared
    return real, distance * contrast / 2


def _poles(line: Line) -> Poles:
    """Poles without any difference of like numbers: every sum below has terms of one sign."""
    mode_is_narrow = line.kappa <= line.coherence
    side = np.where(mode_is_narrow, np.copysign(1, line.detuning), -np.copysign(1, line.detuning))
    real, imaginary = _half_gap_squared(line)
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


def _denominator(frequency: Floats, line: Line) -> tuple[Floats, Floats]:
    """Real and imaginary part of (w - p1)(w - p2), right even where w(w - detuning) and g_squared nearly cancel."""
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
    """w(w - detuning) - g_squared with the rounding errors of difference and product added back (Dekker, 1971)."""
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


def _from_poles(edge: Floats, line: Line, poles: Poles) -> tuple[Floats, Floats]:
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
        x1[lost], x2[lost] = _refined(x1[lost], x2[lost], b1, b2, _denominator(edge[lost], picked))
    return np.asarray(x1), np.asarray(x2)


def _refined(
    x1: Floats, x2: Floats, b1: Floats, b2: Floats, denominator: tuple[Floats, Floats]
) -> tuple[Floats, Floats]:
    """The nearer distance again, from the denominator over the farther one.

    A direct difference loses the digits that a splitting or shift larger than the width takes.
    """
    nearer = x1**2 + b1**2 < x2**2 + b2**2
    x, b = np.where(nearer, x2, x1), np.where(nearer, b2, b1)
    refined = (denominator[0] * x - denominator[1] * b) / (x**2 + b**2)
    return np.where(nearer, refined, x1), np.where(nearer, x2, refined)


def _elementary_share(low: Floats, high: Floats, line: Line, poles: Poles) -> Floats:
    """The closed form of the module docstring; meaningless where the poles look alike."""
    width = high - low
    b1, b2 = poles.narrow, poles.broad
    l1, l2 = _from_poles(low, line, poles)
    h1, h2 = _from_poles(high, line, poles)
    angle1 = np.arctan2(b1 * width, b1**2 + h1 * l1)
    angle2 = np.arctan2(b2 * width, b2**2 + h2 * l2)
    real, imaginary = l1 * h2 - b1 * b2, -(l1 * b2 + h2 * b1)
    squared = real**2 + imaginary**2
    gap = poles.gap_real**2 + poles.gap_imaginary**2
    ratio = (
        4
        * width
        * (width * gap - poles.gap_real * real - poles.gap_imaginary * imaginary)
        / squared
    )
    logarithm = np.atleast_1d(np.log1p(np.maximum(ratio, -0.5)))
    steep = np.broadcast_to(ratio < -0.5, logarithm.shape)
    if steep.any():
        crossed = np.broadcast_to((h1**2 + b1**2) * (l2**2 + b2**2) / squared, steep.shape)
        logarithm[steep] = np.log(crossed[steep])
    a, beta, sigma = -2 * poles.gap_real, 2 * poles.gap_imaginary, b1 + b2
    terms = (
        b2 * (a**2 + beta * sigma) * angle1
        + b1 * (a**2 - beta * sigma) * angle2
        - a * b1 * b2 * logarithm
    )
    return np.asarray(terms / (4 * np.pi * sigma * np.where(gap > 0, gap, 1)))


def _poles_look_alike(low: Floats, high: Floats, line: Line, poles: Poles) -> NDArray[np.bool_]:
    middle = line.detuning / 2
    nearest = np.maximum(np.maximum(low - middle, middle - high), 0)
    squared = nearest**2 + ((line.kappa + line.coherence) / 4) ** 2
    return np.asarray(poles.gap_real**2 + poles.gap_imaginary**2 < _LOOK_ALIKE * squared)


def _smooth_share(low: Floats, high: Floats, line: Line) -> Floats:
    """One Gauss-Legendre panel in the angle psi, w = middle + B cot(psi), B the mean half width.

    With q half the pole gap the integrand is sin^2(psi)/|1 - (q/B)^2 sin^2(psi) exp(2i psi)|^2: smooth for coincident poles, and
    in the far tails psi -> 0. Windows to the left are mirrored, so that psi keeps its digits.
    """
    width = high - low  # before the shift, which rounds
    low, high = low - line.detuning / 2, high - line.detuning / 2
    mirrored = -low > high
    low, high = np.where(mirrored, -high, low), np.where(mirrored, -low, high)
    breadth = (line.kappa + line.coherence) / 4
    length = np.arctan2(breadth * width, breadth**2 + high * low)
    psi = np.arctan2(breadth, high)[..., None] + length[..., None] * (1 + _NODES) / 2
    real, imaginary = _half_gap_squared(line)
    turned = (line.kappa > line.coherence) ^ (line.detuning < 0) ^ mirrored
    gap = real + 1j * np.where(turned, -imaginary, imaginary)
    sine = np.sin(psi) ** 2
    values = sine / np.abs(1 - (gap / breadth**2)[..., None] * sine * np.exp(2j * psi)) ** 2
    return np.asarray(norm(line) / breadth**3 * length / 2 * (values @ _WEIGHTS))
