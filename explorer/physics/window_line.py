r"""Share of a line inside a frequency window: Lorentzian, Gaussian, or their convolution.

The Lorentzian's share is the real part of G = -i ln((u-p)/(l-p))/pi, p = delta + i width/2,
analytic for Im delta > 0.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import erfc, voigt_profile

from .window_profile import (
    Cells,
    Complexes,
    Floats,
    Gaussian,
    flattened,
    log_ratio,
)
from .window_quadrature import wandering_mean

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(12)


def line_window(
    *, lower: ArrayLike, upper: ArrayLike, centre: ArrayLike, width: ArrayLike, sigma: ArrayLike
) -> Floats:
    """Share of a Lorentzian convolved with a Gaussian inside [lower, upper].

    width: full width at half maximum of the Lorentzian; sigma: standard deviation of the Gaussian.

    All [rad/s], broadcastable; edges may be infinite, width and sigma 0. Both 0: 1 inside, 1/2 on
    an edge, 0 outside. Right to 1e-9 relative, taking edge minus centre as exact.
    """
    (low, high, middle, width, sigma), shape = flattened(lower, upper, centre, width, sigma)
    low, high = _clipped(low, high, np.abs(middle) + width + sigma)
    span = high - low  # before the shift, which rounds
    low, high = low - middle, high - middle
    share = (np.sign(high) - np.sign(low)) / 2
    still = (sigma == 0) & (width > 0)
    share[still] = _lorentzian_share(low[still], high[still], span[still], width[still] / 2)
    sharp = (sigma > 0) & (width == 0)
    share[sharp] = gaussian_share(*(x[sharp] / sigma[sharp] for x in (low, high, span)))
    both = (sigma > 0) & (width > 0)
    if both.any():
        zero = np.zeros(np.count_nonzero(both))
        profile = _LineWindow(low[both], high[both], span[both], width[both] / 2)
        share[both] = wandering_mean(profile, Gaussian(zero, sigma[both], zero))
    return share.reshape(shape)


def line_density(
    *, frequency: ArrayLike, centre: ArrayLike, width: ArrayLike, sigma: ArrayLike
) -> Floats:
    """The line of `line_window` per angular frequency [s/rad]; a delta line is infinite there."""
    offset = np.asarray(frequency, float) - np.asarray(centre, float)
    return np.asarray(voigt_profile(offset, np.asarray(sigma, float), np.asarray(width, float) / 2))


@dataclass(frozen=True)
class _LineWindow:
    low: Floats
    high: Floats
    span: Floats
    half_width: Floats

    def real(self, cells: Cells, detuning: Floats) -> Floats:
        low, high, span, half_width = self._at(cells)
        return _lorentzian_share(low - detuning, high - detuning, span, half_width)

    def upper(self, cells: Cells, detuning: Complexes) -> tuple[Complexes, Floats]:
        low, high, span, half_width = self._at(cells)
        pole: Complexes = np.asarray(detuning + 1j * half_width, complex)
        logarithm = log_ratio(span, low - pole, high - pole)
        return np.asarray(-1j / np.pi * logarithm), np.asarray(np.abs(logarithm) / np.pi)

    def singularities(self) -> Complexes:
        return np.stack([self.low - 1j * self.half_width, self.high - 1j * self.half_width])

    def _at(self, cells: Cells) -> tuple[Floats, Floats, Floats, Floats]:
        column = cells[:, None]
        return self.low[column], self.high[column], self.span[column], self.half_width[column]


def _clipped(low: Floats, high: Floats, scale: Floats) -> tuple[Floats, Floats]:
    """Infinite edges moved to where the Lorentzian has 1e-18 of the rest left."""
    inside = np.where(np.isinf(low), 0, np.abs(low)) + np.where(np.isinf(high), 0, np.abs(high))
    far = 1e18 * np.where(scale + inside > 0, scale + inside, 1)
    return (
        np.where(np.isinf(low), np.copysign(far, low), low),
        np.where(np.isinf(high), np.copysign(far, high), high),
    )


def _lorentzian_share(low: Floats, high: Floats, span: Floats, half_width: Floats) -> Floats:
    return np.asarray(np.arctan2(half_width * span, half_width**2 + high * low) / np.pi)


def gaussian_share(low: Floats, high: Floats, width: Floats) -> Floats:
    """Normal share between two standard scores, whose difference is `width`; all of one shape.

    A difference of erfc on one side, or one panel where that would cancel.
    """
    mirrored = -low > high
    low, high = np.where(mirrored, -high, low), np.where(mirrored, -low, high)
    share = (erfc(low / np.sqrt(2)) - erfc(high / np.sqrt(2))) / 2
    narrow = width * (1 + np.maximum(low, 0)) < 1
    if narrow.any():
        score = low[narrow, None] + width[narrow, None] * (1 + _NODES) / 2
        share[narrow] = (
            width[narrow] / 2 * (np.exp(-(score**2) / 2) @ _WEIGHTS) / np.sqrt(2 * np.pi)
        )
    return np.asarray(share)
