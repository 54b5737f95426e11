r"""Expected counts of a spectrum: Voigt lines on the frequency axis, counted per unit wavelength.

A line is a Lorentzian in angular frequency, convolved with the Gaussian of the slow wandering and
that of the spectrometer, which are common to all lines; counts per unit wavelength follow with
:math:`|d\omega/d\lambda| = 2\pi c/\lambda^2`, on a background that is flat in wavelength.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..physics.coupling import CIRCLE, angular_width
from ..physics.spectra import DEVIATION
from .noise import Array

#: The width of a Voigt line to 2e-4: a·Lorentzian + √(b·Lorentzian² + Gaussian²).
#: Olivero & Longbothum, J. Quant. Spectrosc. Radiat. Transf. 17, 233 (1977).
VOIGT = (0.5346, 0.2166)


@dataclass(frozen=True)
class Line:
    """area: counts over all wavelengths, in units of counts per metre times metre. Widths: FWHM [m]."""

    area: float
    centre: float
    fast: float


def wavelength_width(angular: float, wavelength: float) -> float:
    """FWHM [m] at a wavelength from the angular width [rad/s]: the inverse of `angular_width`."""
    if angular <= 0:
        return 0.0
    path = CIRCLE / angular
    return float(2 * wavelength**2 / (path + math.hypot(path, wavelength)))


def line_counts(
    wavelengths: Array, lines: tuple[Line, ...], slow: float, resolution: float, background: float
) -> Array:
    """Expected counts per unit wavelength, (n,). slow, resolution: FWHM at the first line [m]."""
    from scipy.special import voigt_profile

    total = np.full(wavelengths.shape, background)
    jacobian = CIRCLE / wavelengths**2
    sigma = DEVIATION * math.hypot(
        angular_width(slow, lines[0].centre), angular_width(resolution, lines[0].centre)
    )
    for line in lines:
        omega = CIRCLE * (line.centre - wavelengths) / (wavelengths * line.centre)
        half = max(angular_width(line.fast, line.centre) / 2, 1e-9 * CIRCLE / line.centre)
        total += line.area * voigt_profile(omega, sigma, half) * jacobian
    return total


def total_width(fast: float, slow: float, wavelength: float) -> float:
    """FWHM of a Voigt line [m] to 1e-10 of itself; all widths in wavelength at `wavelength`."""
    from scipy.optimize import brentq
    from scipy.special import voigt_profile

    sharp, spread = angular_width(fast, wavelength), angular_width(slow, wavelength)
    if sharp <= 0 or spread <= 0:
        return max(fast, slow)
    sigma, half = spread * DEVIATION, sharp / 2
    top = voigt_profile(0.0, sigma, half)
    guess = VOIGT[0] * sharp + math.sqrt(VOIGT[1] * sharp**2 + spread**2)
    found = brentq(
        lambda x: voigt_profile(x * guess / 2, sigma, half) / top - 0.5, 0.9, 1.1, xtol=1e-12
    )
    return wavelength_width(float(found) * guess, wavelength)


def split_width(total: float, sharpness: float, wavelength: float) -> tuple[float, float]:
    """Fast and slow FWHM [m] of a line of a total one, which holds to 2e-4.

    sharpness: Lorentzian part of the width, 0 to 1, on the frequency axis.
    """
    angular = angular_width(total, wavelength)
    rest = (1 - VOIGT[0] * sharpness) ** 2 - VOIGT[1] * sharpness**2
    fast = wavelength_width(sharpness * angular, wavelength)
    return fast, wavelength_width(math.sqrt(max(rest, 0.0)) * angular, wavelength)


def strongest_box(
    wavelengths: Array, values: Array, variances: Array, smallest: float, widest: float = 1.0
) -> tuple[float, float, float, float]:
    """The stretch of a spectrum that stands out most: centre, FWHM, area and signal over noise.

    values: counts less what is known, variances of them, (n,). smallest: narrowest stretch [m]; widest:
    over the span.
    """
    steps = np.gradient(wavelengths)
    area = np.concatenate([[0.0], np.cumsum(values * steps)])
    noise = np.concatenate([[0.0], np.cumsum(variances * steps**2)])
    span = float(wavelengths[-1] - wavelengths[0])
    best = (float(wavelengths[int(np.argmax(values))]), smallest, 0.0, -np.inf)
    for width in np.geomspace(smallest, max(widest * span, 2 * smallest), 24):
        first = np.searchsorted(wavelengths, wavelengths - width / 2)
        last = np.searchsorted(wavelengths, wavelengths + width / 2, side="right")
        inside = area[last] - area[first]
        score = inside / np.sqrt(np.maximum(noise[last] - noise[first], 1e-300))
        at = int(np.argmax(score))
        if score[at] > best[3]:
            found = float(wavelengths[at]), float(width), float(inside[at]), float(score[at])
            best = found
    centre, width, inside_area, score_best = best
    return centre, width / 1.4, 1.3 * inside_area, score_best
