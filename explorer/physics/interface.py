"""The bare emitter on a coverslip, for comparison: a dipole at a plane interface.

Reciprocity: the power per solid angle towards a direction is the index on that side times the
squared field that a unit plane wave from there makes at the dipole, here in air at the surface.
"""

from __future__ import annotations

from functools import cache
from typing import Any

import numpy as np

from ..registry import part, quantity, variant
from .quadrature import integral, legendre

#: Refractive index of the coverslip: borosilicate crown glass; common practice, no source.
COVERSLIP = 1.52

_RULE = legendre(64)


def air_side(theta: Any, index: float) -> tuple[Any, Any]:
    """Power per solid angle into the air, azimuth-averaged: (dipole in the plane, upright one)."""
    cosine, sine2 = np.cos(theta), np.sin(theta) ** 2
    inner = np.sqrt(index**2 - sine2)  # index times the cosine in the glass
    reflected_s = (cosine - inner) / (cosine + inner)
    reflected_p = (index**2 * cosine - inner) / (index**2 * cosine + inner)
    flat = ((1 + reflected_s) ** 2 + (cosine * (1 - reflected_p)) ** 2) / 2
    return flat, sine2 * (1 + reflected_p) ** 2


def glass_side(theta: Any, index: float) -> tuple[Any, Any]:
    """The same into the glass, evanescent coupling beyond the critical angle included."""
    cosine, sine2 = np.cos(theta), (index * np.sin(theta)) ** 2
    outer = np.sqrt((1 - sine2).astype(complex))  # cosine in the air, imaginary beyond critical
    passed_s = np.abs(2 * index * cosine / (index * cosine + outer)) ** 2
    passed_p = np.abs(2 * index * cosine / (cosine + index * outer)) ** 2
    flat = index * (passed_s + np.abs(outer) ** 2 * passed_p) / 2
    return flat, index * sine2 * passed_p


def _mean(powers: tuple[Any, Any]) -> Any:
    """Mean over random orientation: two thirds in the plane, one third upright."""
    return (2 * powers[0] + powers[1]) / 3


def power_into_air(theta: Any, index: float = COVERSLIP) -> Any:
    """Power within `theta` [rad] of the normal on the air side; free space would give 8π/3 in all."""

    def integrand(angle: Any) -> Any:
        return 2 * np.pi * np.sin(angle) * _mean(air_side(angle, index))

    theta = np.asarray(theta, dtype=float)
    return integral(integrand, np.zeros_like(theta), theta, _RULE, theta.size)


def power_into_glass(theta: Any, index: float = COVERSLIP) -> Any:
    """The same on the glass side; the kink at the critical angle is met by a square substitution."""
    theta = np.asarray(theta, dtype=float)
    critical = np.arcsin(1 / index)
    below = np.minimum(theta, critical)
    beyond = np.maximum(theta - critical, 0.0)

    def density(angle: Any) -> Any:
        return 2 * np.pi * np.sin(angle) * _mean(glass_side(angle, index))

    def lower(x: Any) -> Any:
        return density(below * x * (2 - x)) * 2 * (1 - x)

    def upper(x: Any) -> Any:
        return density(critical + beyond * x**2) * 2 * x

    zero, one = np.zeros_like(theta), np.ones_like(theta)
    first = integral(lower, zero, one, _RULE, theta.size) * below
    return first + integral(upper, zero, one, _RULE, theta.size) * beyond


@cache
def power_in_all(index: float = COVERSLIP) -> float:
    """Power into both sides, the mean over random orientation."""
    right = np.pi / 2
    return float(power_into_air(right, index) + power_into_glass(right, index))


@quantity(
    "1",
    label="Reference collected share",
    symbol="η0",
    source="lukosz1977",
    group="angles",
    note="the same emitter bare on a coverslip, watched from the air or the glass side",
)
def reference_collected_share(*, numerical_aperture: Any, coverslip_sine: Any) -> Any:
    """Share of the light of the bare emitter on a coverslip that the same aperture collects.

    A dipole in air at zero distance from glass of index 1.52, mean powers over random orientation,
    watched from the air side or (`reference_side`) through the glass; unless a side is given, from
    the air up to an aperture of 1 and through the glass beyond. numerical_aperture [1].
    """
    aperture = np.asarray(numerical_aperture, dtype=float)
    share = power_into_air(np.arcsin(np.minimum(aperture, 1.0))) / power_in_all()
    beyond = aperture > 1  # nowhere, where the side is given
    if beyond.any():
        share = np.where(beyond, reference_through_glass(coverslip_sine=coverslip_sine), share)
    return share


@variant("reference_collected_share", reference_side="glass")
def reference_through_glass(*, coverslip_sine: Any) -> Any:
    """The same, watched through the glass; beyond its index a caution says that there is none."""
    return power_into_glass(np.arcsin(np.minimum(coverslip_sine, 1.0))) / power_in_all()


@part
def coverslip_sine(*, numerical_aperture: Any) -> Any:
    """Sine of the largest angle in the coverslip that an optic takes; above 1 there is none [1]."""
    return numerical_aperture / COVERSLIP


@part
def optic_share(*, radiative_share: Any, upward_share: Any, collected_share: Any) -> Any:
    """Share of the mode's decays that reach the inside of the numerical aperture [1]."""
    return radiative_share * upward_share * collected_share


@quantity(
    "1",
    label="Brightness gain",
    symbol="G",
    group="angles",
    log=True,
    note="both driven to saturation, which costs pump power in proportion to the decay rate; "
    "without a useful resonator it is not 1, because light past the mode counts as that of a dipole "
    "in a homogeneous medium, half of it upward",
)
def brightness_gain(
    *,
    mode_rate: Any,
    optic_share: Any,
    other_modes: Any,
    radiative_rate: Any,
    dipole_collected: Any,
    quantum_yield: Any,
    reference_collected_share: Any,
    lifetime: Any,
) -> Any:
    r"""Photons collected in saturation over those of the bare emitter on a coverslip.

    .. math:: G = \frac{\langle R_{\rm eff}\rangle\eta_r\eta_{up}\eta_c
       + \alpha\gamma_r\,\tfrac12\,\eta_d}{\eta\,\eta_0/\tau}

    Rates [1/s], shares [1], lifetime [s]. Any broadcastable shapes.
    """
    other = other_modes * radiative_rate * dipole_collected / 2
    return (mode_rate * optic_share + other) / (
        quantum_yield * reference_collected_share / lifetime
    )
