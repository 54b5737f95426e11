r"""Share of the light that leaves the resonator inside a frequency window, one homogeneous line.

.. math:: S(w) \propto \left|(\kappa/2+iw)(\Gamma/2+i(w-\delta))+g^2\right|^{-2},
          \qquad w=\omega-\omega_c

The denominator has two zeros in the upper half plane. With a = Re p1 - Re p2, b = Im p, the
integral over a window is

.. math:: \frac{b_2(a^2-\beta\sigma)\theta_1 + b_1(a^2+\beta\sigma)\theta_2 - 2ab_1b_2\Lambda}
          {\pi\sigma|p_1-p_2|^2},
          \qquad \beta=b_1-b_2,\ \sigma=b_1+b_2=(\kappa+\Gamma)/2

where theta is the angle under which a pole sees the window and Lambda the logarithm of the cross
ratio of edges and poles. Partial fractions, checked against direct integration in high precision.
Where the poles look alike from everywhere in the window (coincident poles, far tails) its terms
cancel, and one smooth quadrature panel takes over.
"""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .window_poles import (
    Floats,
    Line,
    Poles,
    denominator,
    distances_from_poles,
    half_gap_squared,
    norm,
    spectrum_poles,
)

#: Squared pole spacing over squared distance, below which the smooth panel is used.
_LOOK_ALIKE = 0.01
#: An infinite edge, in units of every scale of the cell: 1e-24 of the share lies beyond.
_BEYOND = 1e8
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(16)


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

    lower, upper [rad/s] from the resonance, lower <= upper, may be infinite; kappa > 0, coherence
    >= 0 [rad/s]; g_squared >= 0 [(rad/s)^2]; detuning [rad/s], emitter minus resonance. Any
    broadcastable shapes. coherence = 0 needs g_squared > 0. Right to 1e-9 relative, taking the
    arguments as exact, for rates of 1e3 to 1e16 rad/s and shares however small.
    """
    arguments = (lower, upper, kappa, coherence, g_squared, detuning)
    given = np.atleast_1d(*(np.asarray(x, float) for x in arguments))
    line = Line(*given[2:])
    low, high = finite_edges(given[0], given[1], line)
    poles = spectrum_poles(line)
    share = np.atleast_1d(_elementary_share(low, high, line, poles))
    alike = np.broadcast_to(_poles_look_alike(low, high, line, poles), share.shape)
    if alike.any():
        low, high, *rest = (np.broadcast_to(x, share.shape)[alike] for x in (low, high, *line))
        share[alike] = _smooth_share(low, high, Line(*rest))
    return share.reshape(np.broadcast_shapes(*(np.shape(x) for x in arguments)))


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
    arguments = (frequency, kappa, coherence, g_squared, detuning)
    given = np.atleast_1d(*(np.asarray(x, float) for x in arguments))
    line = Line(*given[1:])
    real, imaginary = denominator(given[0], line)
    density = np.asarray(norm(line) / (real**2 + imaginary**2))
    return density.reshape(np.broadcast_shapes(*(np.shape(x) for x in arguments)))


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


def _elementary_share(low: Floats, high: Floats, line: Line, poles: Poles) -> Floats:
    """The closed form of the module docstring; meaningless where the poles look alike."""
    width = high - low
    b1, b2 = poles.narrow, poles.broad
    l1, l2 = distances_from_poles(low, line, poles)
    h1, h2 = distances_from_poles(high, line, poles)
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

    With q half the pole gap the integrand is sin^2(psi)/|1 - (q/B)^2 sin^2(psi) exp(2i psi)|^2:
    smooth for coincident poles, and in the far tails psi -> 0. Windows to the left are mirrored,
    so that psi keeps its digits.
    """
    width = high - low  # before the shift, which rounds
    low, high = low - line.detuning / 2, high - line.detuning / 2
    mirrored = -low > high
    low, high = np.where(mirrored, -high, low), np.where(mirrored, -low, high)
    breadth = (line.kappa + line.coherence) / 4
    length = np.arctan2(breadth * width, breadth**2 + high * low)
    psi = np.arctan2(breadth, high)[..., None] + length[..., None] * (1 + _NODES) / 2
    real, imaginary = half_gap_squared(line)
    turned = (line.kappa > line.coherence) ^ (line.detuning < 0) ^ mirrored
    gap = real + 1j * np.where(turned, -imaginary, imaginary)
    sine = np.sin(psi) ** 2
    values = sine / np.abs(1 - (gap / breadth**2)[..., None] * sine * np.exp(2j * psi)) ** 2
    return np.asarray(norm(line) / breadth**3 * length / 2 * (values @ _WEIGHTS))
