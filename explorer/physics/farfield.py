"""Angles: the pattern of a radiating aperture, what a lens takes of it, what a fibre takes."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import part, quantity, variant
from ..whole import Pattern
from . import measured_pattern as given
from .quadrature import integral, legendre, panels

#: Beyond this exponent the rest of a Gaussian pattern is below 1e-17 of it.
NEGLIGIBLE = 40.0

#: The best match of a uniformly lit pupil to a Gaussian fibre: b2 s² at the maximum.
UNIFORM_MATCH = 1.2564

_RULE = legendre(48)


@part
def wave_number(*, medium_index: Any, resonance_wavelength: Any) -> Any:
    """Wave number in the collection medium [rad/m]."""
    return 2 * np.pi * medium_index / resonance_wavelength


@part
def aperture_sine(*, numerical_aperture: Any, medium_index: Any) -> Any:
    """Sine of the largest collected angle in the medium [1]."""
    return numerical_aperture / medium_index


@part
def sharpness(*, wave_number: Any, aperture_radius: Any) -> Any:
    """a = (k w)²/2 of the Gaussian aperture [1]."""
    return (wave_number * aperture_radius) ** 2 / 2


def pattern_integral(a: Any, sine: Any) -> Any:
    """Φ(s): ∫ exp(−a·u(2−u)) (1+(1−u)²)/2 du from 0 to 1 − cos θ, u = 1 − cos θ.

    a [1] >= 0, sine [1] in 0..1. Broadcasting arrays. Right to 1e-13.
    """
    highest = sine**2 / (1 + np.sqrt(1 - sine**2))
    highest = np.minimum(highest, NEGLIGIBLE / np.maximum(a, NEGLIGIBLE / 2))

    def integrand(u: Any) -> Any:
        return np.exp(-a * u * (2 - u)) * (1 + (1 - u) ** 2) / 2

    size = int(np.prod(np.broadcast_shapes(np.shape(a), np.shape(sine))))
    return integral(integrand, np.zeros_like(highest), highest, _RULE, size)


@part
def whole_pattern(*, sharpness: Any) -> Any:
    """Φ(1): the pattern summed over the whole upper side [1]."""
    return pattern_integral(sharpness, 1.0)


@variant("whole_pattern", pattern=Pattern)
def whole_given_pattern(*, pattern: Any) -> Any:
    """The same of a given pattern over its largest power."""
    return given.power_inside(pattern, 1.0)


@quantity("1", label="Collected share", symbol="ηc", group="angles")
def collected_share(*, sharpness: Any, aperture_sine: Any, whole_pattern: Any) -> Any:
    r"""Share of the mode's upward light inside the numerical aperture.

    .. math:: \Phi(s)/\Phi(1), \quad
       \frac{dP}{d\Omega} \propto e^{-a \sin^2\theta}\, \frac{1+\cos^2\theta}{2}, \quad a = (kw)^2/2

    A linearly polarised Gaussian aperture, averaged over azimuth, no paraxial step. Wide: a Gaussian
    beam; narrow: a dipole in the plane. sharpness, aperture_sine [1]. Any broadcastable shapes.
    """
    return pattern_integral(sharpness, aperture_sine) / whole_pattern


@variant("collected_share", pattern=Pattern)
def collected_of_given(*, pattern: Any, aperture_sine: Any, whole_pattern: Any) -> Any:
    """The same of a given pattern."""
    return given.power_inside(pattern, aperture_sine) / whole_pattern


@quantity("1", label="Directivity", symbol="D", group="angles", log=True)
def directivity(*, upward_share: Any, whole_pattern: Any) -> Any:
    r"""Largest power per solid angle over that of light spread evenly: :math:`2\eta_{up}/\Phi(1)`."""
    return 2 * upward_share / whole_pattern


def _angle(a: Any, drop: float) -> Any:
    """Angle at which the Gaussian pattern has fallen to exp(−drop) of its peak [rad].

    y = sin²θ solves a y = ln(1 − y/2) + drop, by Newton from below; π/2 where it never falls so far.
    """
    y = np.minimum(drop / (a + 0.5), 1.0)
    for _ in range(6):
        error = a * y - np.log1p(-y / 2) - drop
        y = np.minimum(y - error / (a + 0.5 / (1 - y / 2)), 1.0)
    return np.arcsin(np.sqrt(y))


@quantity(
    "rad",
    label="Beam half-angle",
    symbol="θ½",
    group="angles",
    note="half power; of the pattern, before the lens cuts it",
)
def half_angle(*, sharpness: Any) -> Any:
    r"""Angle at which the power per solid angle is half of that on the axis.

    .. math:: a y = \ln(1-y/2) + \ln 2, \quad y = \sin^2\theta

    sharpness [1]. Any shape. Of the pattern, before the aperture of the optic cuts it.
    """
    return _angle(sharpness, np.log(2.0))


@variant("half_angle", pattern=Pattern)
def half_angle_of_given(*, pattern: Any) -> Any:
    """The same of a given pattern: the outermost angle with half of the largest power."""
    return given.outermost_angle(pattern, 0.5)


@quantity(
    "rad",
    label="Beam divergence",
    symbol="θ",
    group="angles",
    note="1/e² half-angle; of the pattern, before the lens cuts it",
)
def divergence(*, sharpness: Any) -> Any:
    r"""Angle at which the power per solid angle is 1/e² of that on the axis.

    .. math:: a y = \ln(1-y/2) + 2, \quad y = \sin^2\theta

    sharpness [1]. Any shape. 90° where the pattern never falls so far (a caution says so).
    """
    return _angle(sharpness, 2.0)


@variant("divergence", pattern=Pattern)
def divergence_of_given(*, pattern: Any) -> Any:
    """The same of a given pattern: the outermost angle with 1/e² of the largest power."""
    return given.outermost_angle(pattern, np.exp(-2.0))


@quantity("1", label="Dipole light collected", symbol="ηd", group="angles")
def dipole_collected(*, aperture_sine: Any) -> Any:
    r"""Share of the upward light of a dipole in the plane inside the numerical aperture.

    .. math:: (4 - 3c - c^3)/4, \quad c = \cos\theta

    aperture_sine [1]. Any shape. Used for the light past the mode.
    """
    u = aperture_sine**2 / (1 + np.sqrt(1 - aperture_sine**2))
    return u * (6 - 3 * u + u**2) / 4


@part
def matching_magnification(
    *, wave_number: Any, sharpness: Any, aperture_sine: Any, fibre_mode_radius: Any
) -> Any:
    """Magnification that matches the Gaussian aperture to the fibre, within 0.3 % of the best."""
    best = np.sqrt((sharpness / 2) ** 2 + (UNIFORM_MATCH / aperture_sine**2) ** 2)
    return wave_number * fibre_mode_radius / (2 * np.sqrt(best))


@variant("matching_magnification", pattern=Pattern)
def matching_given(
    *, pattern: Any, wave_number: Any, aperture_sine: Any, fibre_mode_radius: Any
) -> Any:
    """The best magnification for a given pattern without an offset, found by search."""
    return wave_number * fibre_mode_radius / (2 * np.sqrt(given.best_match(pattern, aperture_sine)))


@part
def fibre_sharpness(*, wave_number: Any, fibre_mode_radius: Any, magnification: Any) -> Any:
    """b2 = (k wf/M)²/4 of the fibre's mode seen from the source [1]."""
    return (wave_number * fibre_mode_radius / magnification) ** 2 / 4


@part
def fibre_tilt(*, wave_number: Any, fibre_offset: Any, magnification: Any) -> Any:
    """Phase slope that the offset of the fibre makes across the pupil [1]: k d/M."""
    return wave_number * fibre_offset / magnification


def pupil_overlap(b1: Any, b2: Any, sine: Any, tilt: Any) -> Any:
    """4 b2 [∫₀^s e^{−(b1+b2)t²} √((2−t²)/2) (1−t²)^{−1/4} J0(tilt·t) t dt]²: not yet over Φ(1).

    b1, b2, sine, tilt [1], broadcasting. With c⁴ = 1 − t² the integrand is smooth up to grazing
    angles: t dt (1−t²)^{−1/4} = −2c² dc.
    """
    from scipy.special import j0

    farthest = np.minimum(sine**2, 49 / (b1 + b2))
    lowest = (1 - farthest) ** 0.25
    depth = farthest / (1 + np.sqrt(1 - farthest)) / (1 + lowest)  # 1 − c without cancellation

    def integrand(x: Any) -> Any:
        c = 1 - depth * x
        t2 = x * depth * (1 + c) * (1 + c**2)
        bessel = j0(tilt * np.sqrt(t2)) if np.any(tilt) else 1.0
        return np.exp(-(b1 + b2) * t2) * np.sqrt((2 - t2) / 2) * bessel * 2 * c**2

    # A tilted pupil oscillates with t, the root of x: more panels the more periods, even in t.
    count = 4 + min(int(np.max(np.abs(tilt) * np.sqrt(farthest), initial=0.0) / 25), 400)
    rule = panels(tuple((np.linspace(0.0, 1.0, count + 1) ** 2).tolist()), 24)
    shape = np.broadcast_shapes(*(np.shape(value) for value in (b1, b2, sine, tilt)))
    zero = np.zeros(shape)
    amplitude = integral(integrand, zero, zero + 1, rule, int(np.prod(shape))) * depth
    return 4 * b2 * amplitude**2


@quantity("1", label="Fibre share", symbol="ηF", group="collection")
def fibre_share(*, fibre_overlap: Any, collected_share: Any) -> Any:
    r"""Share of the collected light that enters the fibre: overlap of the fields in the pupil.

    .. math:: \eta_c\eta_F = 4 b_2 \Big[\int_0^s e^{-(b_1+b_2)t^2} \sqrt{\tfrac{2-t^2}{2}}
       (1-t^2)^{-1/4} J_0(k t d/M)\, t\, dt\Big]^2 \Big/ \Phi(1)

    b1 = (kw)²/4, b2 = (k wf/M)²/4. A scalar overlap: 0.4 % above the co-polarised one at a
    numerical aperture of 0.65, 3 % at 0.95. The light that is wanted in free space: 1.
    """
    # A pattern without light inside the aperture has none to share.
    return np.where(collected_share > 0, fibre_overlap / collected_share, 0.0)


@variant("fibre_share", destination="free_space")
def no_fibre() -> Any:
    """Without a fibre nothing is lost here."""
    return 1.0


@part
def fibre_overlap(
    *, sharpness: Any, fibre_sharpness: Any, aperture_sine: Any, fibre_tilt: Any, whole_pattern: Any
) -> Any:
    """Share of the upward light that is collected and enters the fibre [1]."""
    return pupil_overlap(sharpness / 2, fibre_sharpness, aperture_sine, fibre_tilt) / whole_pattern


@variant("fibre_overlap", pattern=Pattern)
def fibre_overlap_of_given(
    *, pattern: Any, fibre_sharpness: Any, aperture_sine: Any, fibre_tilt: Any, whole_pattern: Any
) -> Any:
    """The same of a given pattern with a flat phase."""
    overlap = given.pupil_overlap(pattern, fibre_sharpness, aperture_sine, fibre_tilt)
    return overlap / whole_pattern


@quantity("1", label="Fibre share of other light", symbol="ηFo", group="collection")
def other_fibre_share(
    *, fibre_sharpness: Any, aperture_sine: Any, fibre_tilt: Any, dipole_collected: Any
) -> Any:
    """Share of the collected light past the mode that enters the fibre: a dipole at the centre [1]."""
    overlap = pupil_overlap(0.0, fibre_sharpness, aperture_sine, fibre_tilt)
    return overlap / (2 / 3) / dipole_collected


@variant("other_fibre_share", destination="free_space")
def no_other_fibre() -> Any:
    """Without a fibre nothing is lost here."""
    return 1.0
