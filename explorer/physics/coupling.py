"""Rates and couplings: what the emitter and the resonator bring, before they meet."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.constants import speed_of_light

from ..registry import part, quantity, variant, view

#: 2πc [m rad/s]: angular frequency times wavelength.
CIRCLE = 2 * np.pi * speed_of_light


def angular_width(width: Any, wavelength: Any) -> Any:
    """FWHM [rad/s] of a line of FWHM `width` [m] at `wavelength` [m]: 2πcΔ/(λ² − Δ²/4)."""
    return CIRCLE * width / (wavelength**2 - width**2 / 4)


@quantity("1/s", label="Radiative rate in the bulk", symbol="γr", group="rates", log=True)
def radiative_rate(*, bulk_rate_ratio: Any, quantum_yield: Any, lifetime: Any) -> Any:
    r"""Radiative rate of the emitter in a bulk of the resonator's index.

    .. math:: \gamma_r = r_n \eta / \tau

    bulk_rate_ratio [1], quantum_yield [1], lifetime [s]. Any broadcastable shapes.
    """
    return bulk_rate_ratio * quantum_yield / lifetime


@part
def intrinsic_loss_rate(*, quantum_yield: Any, lifetime: Any) -> Any:
    """Non-radiative decay of the emitter itself [1/s]: (1 − η)/τ."""
    return (1 - quantum_yield) / lifetime


@part
def biexciton_line_radiative_rate(*, biexciton_rate_ratio: Any, radiative_rate: Any) -> Any:
    """Radiative rate of the biexciton in the bulk [1/s]."""
    return biexciton_rate_ratio * radiative_rate


#: Stands for an Auger rate without bound [1/s]: a biexciton that never emits is gone at once.
INSTANT = 1e30


@part
def auger_rate(
    *, biexciton_rate_ratio: Any, quantum_yield: Any, lifetime: Any, biexciton_yield: Any
) -> Any:
    """Auger decay of the biexciton [1/s]; not changed by the resonator."""
    finite = biexciton_yield > 0
    odds = 1 / np.where(finite, biexciton_yield, 1.0) - 1
    rate = biexciton_rate_ratio * quantum_yield / lifetime * odds
    return np.where(finite, np.minimum(rate, INSTANT), INSTANT)


@quantity("1/s", label="Decay past the mode", symbol="γ", group="rates", log=True)
def decay_elsewhere(
    *, other_modes: Any, radiative_rate: Any, intrinsic_loss_rate: Any, quenching: Any
) -> Any:
    r"""Every decay of the emitter but the one through the mode.

    .. math:: \gamma = \alpha\gamma_r + \gamma_{nr} + \zeta\gamma_r

    other_modes [1], quenching [1], rates [1/s]. Any broadcastable shapes.
    """
    return other_modes * radiative_rate + intrinsic_loss_rate + quenching * radiative_rate


@quantity("rad/s", label="Pure dephasing", symbol="γ*", group="rates", log=True)
def pure_dephasing(*, fast_linewidth: Any, emission_wavelength: Any, lifetime: Any) -> Any:
    r"""Dephasing of the emitter beyond what its lifetime costs.

    .. math:: \gamma^* = \max(\Delta\omega_f - 1/\tau, 0)

    fast_linewidth, emission_wavelength [m], lifetime [s]. Any broadcastable shapes. Of several
    lines the strongest counts, of a measured spectrum its FWHM.
    """
    return np.maximum(angular_width(fast_linewidth, emission_wavelength) - 1 / lifetime, 0)


@quantity("rad/s", label="Coherence decay", symbol="Γ", group="rates", log=True)
def coherence_decay(*, decay_elsewhere: Any, pure_dephasing: Any) -> Any:
    r"""Homogeneous width of the emitter's line in the device.

    .. math:: \Gamma = \gamma + \gamma^*

    Rates [1/s], [rad/s]. Of several lines the strongest counts, of a measured spectrum its FWHM.
    """
    return decay_elsewhere + pure_dephasing


@quantity("rad/s", label="Resonator linewidth", symbol="κ", group="resonator", log=True)
def resonator_linewidth(*, resonance_wavelength: Any, quality_factor: Any) -> Any:
    r"""Full linewidth of the resonance: the rate at which a stored photon leaves.

    .. math:: \kappa = \omega_c / Q

    resonance_wavelength [m], quality_factor [1]. Any broadcastable shapes.
    """
    return CIRCLE / resonance_wavelength / quality_factor


@quantity("1", label="Peak Purcell factor", symbol="F", source="purcell1946", log=True)
def peak_purcell(*, quality_factor: Any, mode_volume: Any) -> Any:
    r"""Rate into the mode over the bulk rate, for an ideal, aligned, monochromatic dipole.

    .. math:: F = \frac{3}{4\pi^2} \frac{Q}{V}

    quality_factor [1], loaded; mode_volume [(λ/n)³], normalised to the field maximum. Any
    broadcastable shapes. Holds for one well separated, weakly absorbing mode.
    """
    return 3 / (4 * np.pi**2) * quality_factor / mode_volume


@part
def medium_wavelength(*, resonance_wavelength: Any, refractive_index: Any) -> Any:
    """Wavelength of the resonance in the medium of the emitter [m]: λ/n."""
    return resonance_wavelength / refractive_index


@quantity("m", label="Mode radius", symbol="w", group="resonator", log=True)
def mode_radius(*, mode_volume: Any, mode_length: Any, medium_wavelength: Any) -> Any:
    r"""1/e² radius of the mode's intensity: of a standing wave with Gaussian waist.

    .. math:: w = \sqrt{4V / \pi L}

    mode_volume [(λ/n)³], mode_length [λ/n], medium_wavelength [m]. Any broadcastable shapes.
    """
    return medium_wavelength * np.sqrt(4 * mode_volume / (np.pi * mode_length))


@variant("mode_radius", mode_profile="compact")
def compact_mode_radius(*, mode_volume: Any, medium_wavelength: Any) -> Any:
    r"""1/e² radius of a mode of equal extent on all axes, so that its profile integrates to V.

    .. math:: w = \sqrt{2/\pi}\, V^{1/3}
    """
    return medium_wavelength * np.sqrt(2 / np.pi) * np.cbrt(mode_volume)


@quantity("1", label="Placement factor", symbol="ψ", group="resonator")
def placement(
    *, lateral_offset: Any, axial_offset: Any, mode_radius: Any, medium_wavelength: Any
) -> Any:
    r"""Intensity of the mode at the emitter over its maximum: a standing wave.

    .. math:: \psi = e^{-2 r^2 / w^2} \cos^2(2\pi n z / \lambda)

    Offsets, mode_radius and medium_wavelength [m]. Any broadcastable shapes.
    """
    across = np.exp(-2 * (lateral_offset / mode_radius) ** 2)
    return across * np.cos(2 * np.pi * axial_offset / medium_wavelength) ** 2


@variant("placement", mode_profile="compact")
def compact_placement(*, lateral_offset: Any, axial_offset: Any, mode_radius: Any) -> Any:
    r"""The same for equal extent on all three axes: :math:`\psi = e^{-2 (r^2+z^2) / w^2}`."""
    return np.exp(-2 * ((lateral_offset / mode_radius) ** 2 + (axial_offset / mode_radius) ** 2))


@part
def ideal_rate(
    *, radiative_rate: Any, peak_purcell: Any, placement: Any, dipole_alignment: Any
) -> Any:
    """Rate into the mode [1/s] for a line much narrower than the resonance, on resonance."""
    return radiative_rate * dipole_alignment * placement * peak_purcell


@quantity("rad/s", label="Coupling rate", symbol="g", source="auffeves2009", log=True)
def coupling_rate(
    *,
    radiative_rate: Any,
    mode_volume: Any,
    resonance_wavelength: Any,
    placement: Any,
    dipole_alignment: Any,
) -> Any:
    r"""Coupling between emitter and mode: half the rate of their exchange without losses.

    .. math:: g^2 = \gamma_r \kappa F \psi \xi / 4, \quad \kappa F = \frac{3\omega_c}{4\pi^2 V}

    radiative_rate [1/s], mode_volume [(λ/n)³], resonance_wavelength [m], placement [1],
    dipole_alignment [1]. The quality factor cancels and is left out.
    """
    frequency = CIRCLE / resonance_wavelength
    strength = radiative_rate * dipole_alignment * placement
    return np.sqrt(strength * frequency * 3 / (16 * np.pi**2) / mode_volume)


# The biexciton follows the exciton's formulas with its own rates and its own detuning.
view(
    "biexciton",
    radiative_rate="biexciton_line_radiative_rate",
    intrinsic_loss_rate="auger_rate",
    detuning="biexciton_line_detuning",
)
