"""What a result does not know: masks with a sentence, and where there is no number at all."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..broadening import Broadening
from ..registry import caution, part, variant
from ..whole import Lines, Pattern, Samples
from .coupling import CIRCLE, angular_width

#: Above 1 by more than rounding: an uncoupled emitter at the defaults lasts just a fifth of a period.
HARDLY = 1 + 1e-6


@caution(
    "The coupling exceeds the resonance frequency: the model has no number here.",
    label="coupling beyond the model",
    about=("coupling_rate",),
    voids=(
        "exchange_rate",
        "resonant_rate",
        "strong_ratio",
        "splitting_ratio",
        "mode_light_window",
    ),
)
def coupling_beyond_model(*, coupling_rate: Any, resonance_wavelength: Any) -> Any:
    """g above ωc."""
    return coupling_rate > CIRCLE / resonance_wavelength


@caution(
    "The coupling is above a tenth of the resonance frequency: the rotating-wave form fails.",
    label="coupling too strong",
    about=("coupling_rate",),
)
def coupling_too_strong(*, coupling_rate: Any, resonance_wavelength: Any) -> Any:
    """g above 0.1 ωc."""
    return coupling_rate > 0.1 * CIRCLE / resonance_wavelength


@caution(
    "Nothing decays: no other decay and no coupling to the mode, so shares and lifetime have no "
    "number.",
    label="no decay",
    about=("cavity_share",),
    voids=("device_lifetime", "cavity_share", "indistinguishability"),
)
def no_decay(*, decay_elsewhere: Any, exchange_rate: Any) -> Any:
    """γ = R = 0."""
    return (decay_elsewhere == 0) & (exchange_rate == 0)


@caution(
    "The biexciton never decays: no other decay and no coupling to the mode, so photon rates have no "
    "number.",
    label="no biexciton decay",
    about=("rate_in_fibre", "g2_zero"),
    voids=("biexciton_rate",),
)
def no_biexciton_decay(*, biexciton_decay_elsewhere: Any, biexciton_exchange_rate: Any) -> Any:
    """γ = R = 0 of the biexciton, which has no non-radiative decay at a yield of 1."""
    return (biexciton_decay_elsewhere == 0) & (biexciton_exchange_rate == 0)


@caution(
    "No light and no background reach the detector, so g²(0) has no number.",
    label="no light",
    about=("g2_zero",),
    voids=("g2_zero",),
)
def no_light(*, rate_detected: Any, active_background: Any) -> Any:
    """No detected photon from source or background."""
    return (rate_detected == 0) & (active_background == 0)


@caution(
    "The numerical aperture is above 1.52: a bare emitter on a coverslip cannot be watched like that, "
    "so the gain over it has no number.",
    label="aperture beyond a coverslip",
    about=("brightness_gain", "reference_collected_share"),
    voids=("reference_collected_share",),
)
def beyond_coverslip(*, coverslip_sine: Any) -> Any:
    """Aperture above the index of the coverslip; refused where `reference_side` is given."""
    return coverslip_sine > 1


@caution(
    "Q is below 5: a resonance this broad is not well described by one Lorentzian.",
    label="Q below 5",
    about=("quality_factor",),
)
def low_quality(*, quality_factor: Any) -> Any:
    """Q below 5."""
    return quality_factor < 5


@caution(
    "The radiating radius is below λ/(2πn): the Gaussian aperture is only a guide.",
    label="small radiator",
    about=("half_angle", "collected_share"),
)
def small_radiator(*, aperture_radius: Any, medium_wavelength: Any) -> Any:
    """Radiating radius below λ/(2πn)."""
    return aperture_radius < medium_wavelength / (2 * np.pi)


@variant("small_radiator", pattern=Pattern)
def given_radiator() -> Any:
    """A given pattern needs no aperture."""
    return False


@caution(
    "An absorbing mode this small: a real-valued mode volume is doubtful (Sauvan et al. 2013).",
    label="volume of an absorbing mode",
    about=("peak_purcell",),
)
def absorbing_small_mode(*, radiative_share: Any, mode_volume: Any) -> Any:
    """Absorption with a mode volume below 1e-3 (λ/n)³."""
    return (radiative_share < 1) & (mode_volume < 1e-3)


@caution(
    "Indistinguishability is that of one line; the spectrum given has several.",
    label="several lines",
    about=("indistinguishability",),
)
def several_lines() -> Any:
    """A spectrum of several lines or a measured one."""
    return False


@variant("several_lines", spectrum=Lines)
def lines_given(*, spectrum: Any) -> Any:
    """More than one line, or light at an unknown wavelength."""
    return len(spectrum.lines) > 1 or spectrum.known_share < 1 - 1e-9


@variant("several_lines", spectrum=Samples)
def samples_given() -> Any:
    """A measured spectrum."""
    return True


@caution(
    "Part of the light has no known wavelength: it overlaps nothing, and any filter stops it.",
    label="light at unknown wavelength",
    about=("spectral_overlap", "filter_share"),
)
def unknown_light() -> Any:
    """Line shares that sum below 1."""
    return False


@variant("unknown_light", spectrum=Lines)
def unknown_light_of_lines(*, spectrum: Any) -> Any:
    """Line shares that sum below 1."""
    return spectrum.known_share < 1 - 1e-9


@caution(
    "The line is broader than the spacing of the resonator's modes along its axis: several "
    "resonances under one line are not modelled.",
    label="several resonances",
    about=("spectral_overlap",),
)
def several_resonances(*, emission_width: Any, mode_length: Any, resonance_wavelength: Any) -> Any:
    """Linewidth above the mode spacing λ/(2L), L in λ/n, of a standing wave."""
    return emission_width > resonance_wavelength / (2 * mode_length)


@variant("several_resonances", mode_profile="compact")
def compact_resonances() -> Any:
    """A compact mode has no axial neighbours."""
    return False


@caution(
    "The temperature is outside the range over which the emitter's broadening law was measured.",
    label="outside the broadening law",
    about=("spectral_overlap", "exchange_rate", "indistinguishability"),
)
def outside_law() -> Any:
    """A law is given, and the temperature is beyond its range."""
    return False


@variant("outside_law", broadening=Broadening, spectrum=Samples)
def outside_no_law() -> Any:
    """A measured spectrum stands in place of the law."""
    return False


@variant("outside_law", broadening=Broadening)
def outside_its_range(*, broadening: Any, temperature: Any) -> Any:
    """Below the lowest or above the highest temperature of the law."""
    return (temperature < broadening.low) | (temperature > broadening.high)


@part
def emission_width(*, fast_linewidth: Any, slow_linewidth: Any) -> Any:
    """Width of the emission [m]."""
    return fast_linewidth + slow_linewidth


@variant("emission_width", spectrum=Lines)
def width_of_lines(*, spectrum: Any, line_widths: Any, slow_linewidth: Any) -> Any:
    """From the bluest to the reddest line [m]."""
    offsets = [line[1] for line in spectrum.lines]
    return max(offsets) - min(offsets) + line_widths[spectrum.strongest] + slow_linewidth


@variant("emission_width", spectrum=Samples)
def width_of_samples(*, measured: Any, emission_wavelength: Any, slow_linewidth: Any) -> Any:
    """FWHM of a measured spectrum [m]."""
    return measured(lambda line: line.fwhm) * emission_wavelength**2 / CIRCLE + slow_linewidth


@caution(
    "The emitter seems measured inside a solid of high index: a bare emitter on a coverslip is not "
    "its reference.",
    label="reference not on a coverslip",
    about=("brightness_gain", "reference_collected_share"),
)
def solid_reference(*, refractive_index: Any, bulk_rate_ratio: Any) -> Any:
    """An index of 2 or more, and the reference surroundings radiate like its bulk."""
    return (refractive_index >= 2) & (bulk_rate_ratio > 0.8) & (bulk_rate_ratio < 1.25)


@caution(
    "A fast line is narrower than the lifetime allows; it is taken as limited by the lifetime.",
    label="line below the lifetime limit",
    about=("pure_dephasing",),
)
def line_below_limit(*, fast_linewidth: Any, emission_wavelength: Any, lifetime: Any) -> Any:
    """A non-zero width below 1/τ."""
    return _below_limit(angular_width(fast_linewidth, emission_wavelength), lifetime)


@variant("line_below_limit", spectrum=Lines)
def lines_below_limit(
    *, spectrum: Any, line_widths: Any, emission_wavelength: Any, lifetime: Any
) -> Any:
    """One of several lines is that narrow."""
    found: Any = False
    for (_, offset, _), width in zip(spectrum.lines, line_widths, strict=True):
        own = angular_width(width, emission_wavelength + offset)
        found = found | _below_limit(own, lifetime)
    return found


@variant("line_below_limit", spectrum=Samples)
def samples_below_limit(*, measured: Any, lifetime: Any) -> Any:
    """A measured spectrum is that narrow as a whole."""
    return _below_limit(measured(lambda line: line.fwhm), lifetime)


def _below_limit(width: Any, lifetime: Any) -> Any:
    """Whether a width [rad/s] that is not zero lies below 1/τ."""
    return (width > 0) & (width < (1 - 1e-9) / lifetime)


@caution(
    "The measured spectrum is cut off: its ends are above 2 % of its maximum.",
    label="cut spectrum",
    about=("spectral_overlap",),
)
def cut_spectrum() -> Any:
    """Not a measured spectrum."""
    return False


@variant("cut_spectrum", spectrum=Samples)
def cut_samples(*, spectrum: Any, emission_wavelength: Any) -> Any:
    """An end of the samples above 2 % of the maximum."""
    del emission_wavelength
    return max(spectrum.counts[0], spectrum.counts[-1]) > 0.02 * spectrum.counts.max()


@caution(
    "The mode length is not a multiple of ½: the axial placement factor is not exact.",
    label="mode length",
    about=("placement",),
)
def odd_mode_length(*, mode_length: Any) -> Any:
    """A standing wave whose length is not a multiple of half a wavelength."""
    return np.abs(2 * mode_length - np.round(2 * mode_length)) > 1e-9


@variant("odd_mode_length", mode_profile="compact")
def compact_length() -> Any:
    """A compact mode has no such length."""
    return False


@caution(
    "The pattern never falls to 1/e²: the divergence is given as 90°.",
    label="no beam",
    about=("divergence",),
)
def no_beam(*, sharpness: Any) -> Any:
    """a below 2 − ln 2."""
    return sharpness < 2 - np.log(2)


@variant("no_beam", pattern=Pattern)
def given_beam(*, pattern: Any) -> Any:
    """A given pattern that stays above 1/e² to its last angle, near grazing."""
    high = pattern.powers[-1] >= pattern.powers.max() * np.exp(-2)
    return bool(high and pattern.angles[-1] > 0.99 * np.pi / 2)


@caution(
    "The light of several lines or a measured spectrum inside the filter is the product of line and "
    "resonance, right only where the exchange rate is far below the other decays.",
    label="filtered product",
    about=("filter_share",),
)
def filtered_product() -> Any:
    """One line: exact."""
    return False


@variant("filtered_product", spectrum=Lines)
@variant("filtered_product", spectrum=Samples)
def product_used(*, filter_width: Any, exchange_rate: Any, decay_elsewhere: Any) -> Any:
    """A finite filter with R above a tenth of γ."""
    return np.isfinite(filter_width) & (exchange_rate > 0.1 * decay_elsewhere)


@caution(
    "The resonator holds the photon for a good part of the time between events; photon rates take "
    "it as gone at once.",
    label="stored photon",
    about=("rate_in_fibre", "g2_zero"),
)
def stored_photon(*, exchange_rate: Any, resonator_linewidth: Any, repetition_rate: Any) -> Any:
    """κT below 5, or R above a tenth of κ."""
    return (resonator_linewidth < 5 * repetition_rate) | (exchange_rate > 0.1 * resonator_linewidth)


@variant("stored_photon", pumping="continuous")
def stored_under_continuous(*, exchange_rate: Any, resonator_linewidth: Any) -> Any:
    """R above a tenth of κ."""
    return exchange_rate > 0.1 * resonator_linewidth


@caution(
    "Strong continuous pumping of a well coupled emitter: the single-excitation equations leave out "
    "what a second excitation does.",
    label="pumped beyond one excitation",
    about=("rate_in_fibre", "cavity_share"),
)
def beyond_single_excitation() -> Any:
    """Pulsed: not applicable."""
    return False


@variant("beyond_single_excitation", pumping="continuous")
def continuous_beyond(*, mode_rate: Any, resonator_linewidth: Any, saturation: Any) -> Any:
    """Continuous with the mean rate above a tenth of κ and a saturation above 0.1."""
    return (mode_rate > 0.1 * resonator_linewidth) & (saturation > 0.1)


@caution(
    "The wandering line meets pumping that depends on its decay rate: mean rates are used.",
    label="mean rates of a wandering line",
    about=("rate_in_fibre", "g2_zero"),
)
def mean_rates_used(*, slow_linewidth: Any, repetition_rate: Any, device_lifetime: Any) -> Any:
    """Slow wandering with a period under five lifetimes."""
    return (slow_linewidth > 0) & (5 * repetition_rate * device_lifetime > HARDLY)


@variant("mean_rates_used", pumping="continuous")
def mean_rates_used_continuous(*, slow_linewidth: Any) -> Any:
    """Slow wandering with continuous pumping."""
    return slow_linewidth > 0


@caution(
    "The period is under five lifetimes: neighbouring pulses overlap, and g²(0) is over far pulses.",
    label="overlapping pulses",
    about=("g2_zero",),
)
def overlapping_pulses(*, repetition_rate: Any, device_lifetime: Any) -> Any:
    """Period under five lifetimes in the device."""
    return 5 * repetition_rate * device_lifetime > HARDLY


@variant("overlapping_pulses", pumping="continuous")
def no_pulses() -> Any:
    """Continuous: no pulses."""
    return False


@caution(
    "The lifetime in the device is under 50 ps: re-excitation within a real pulse is not modelled.",
    label="re-excitation",
    about=("g2_zero",),
)
def re_excitation(*, device_lifetime: Any) -> Any:
    """Lifetime in the device under 50 ps."""
    return device_lifetime < 50e-12


@variant("re_excitation", pumping="continuous")
def no_re_excitation() -> Any:
    """Continuous: not applicable."""
    return False
