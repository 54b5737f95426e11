"""One row an input: name, unit, label, default, domain, slider, scale, meaning.

To add an input, add a row; the slider, the axis menu, the JSON key and the domain check follow.
Domains, defaults and slider ends are in SI. A default or a domain end that depends on other inputs
is a function whose keyword-only parameters name them.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from .broadening import Broadening
from .registry import REGISTRY, Input, add_input
from .whole import Lines, Pattern, Samples

INFINITE = float("inf")

#: Groups of inputs, in the order in which the page shows them.
GROUPS = ("emitter", "resonator", "collection", "excitation")

#: The broadest line that still has a width on one side of zero frequency, over the wavelength.
BROADEST = 0.6


def _broadest(*, emission_wavelength: Any) -> Any:
    return BROADEST * emission_wavelength


def _law_width(*, law_width: Any) -> Any:
    return law_width


def _half_below(*, emission_wavelength: Any) -> Any:
    return -0.5 * emission_wavelength


def _half_above(*, emission_wavelength: Any) -> Any:
    return 0.5 * emission_wavelength


def _medium(*, medium_index: Any) -> Any:
    return medium_index


def _emission(*, emission_wavelength: Any) -> Any:
    return emission_wavelength


def _resonance(*, resonance_wavelength: Any) -> Any:
    return resonance_wavelength


def _mode_radius(*, mode_radius: Any) -> Any:
    return mode_radius


def _matched(*, matching_magnification: Any) -> Any:
    return matching_magnification


def _side(*, numerical_aperture: Any) -> str:
    """The word for one design; of many, each element has its own side (`reference_collected_share`)."""
    return "glass" if np.all(np.asarray(numerical_aperture) > 1) else "air"


# fmt: off
EMITTER = (
    Input(
        "emission_wavelength", "Emission wavelength", "λ", "emitter",
        "Centre of the emission in vacuum.",
        unit="m", shown="nm", default=650e-9, low=200e-9, high=10e-6,
        slider=(300e-9, 2000e-9), typical="450–1550 nm",
    ),
    Input(
        "lifetime", "Lifetime, bare", "τ", "emitter",
        "Lifetime of the excited state in the reference surroundings.",
        unit="s", shown="ns", default=20e-9, low=1e-12, high=10e-3,
        slider=(10e-12, 100e-6), scale="log", typical="0.3–100 ns",
    ),
    Input(
        "quantum_yield", "Quantum yield", "η", "emitter",
        "Radiative share of the decay in the reference surroundings.",
        default=0.9, low=0.0, low_open=True, high=1.0,
        slider=(0.001, 1.0), typical="0.01–0.95",
    ),
    Input(
        "fast_linewidth", "Linewidth, fast", "Δf", "emitter",
        "FWHM of the homogeneous Lorentzian line: dephasing fast against the decay; "
        "0 means limited by the lifetime. Follows the temperature where a law is known.",
        unit="m", shown="nm", default=_law_width, low=0.0, high=_broadest, high_open=True,
        slider=(1e-14, 150e-9), scale="log or zero", typical="cold 0.1 pm – room temperature 100 nm",
    ),
    Input(
        "slow_linewidth", "Linewidth, slow", "Δs", "emitter",
        "FWHM of the static Gaussian line: wandering that is slow against the decay.",
        unit="m", shown="nm", default=0.0, low=0.0, high=_broadest, high_open=True,
        slider=(1e-14, 150e-9), scale="log or zero", typical="0 – 30 nm",
    ),
    Input(
        "spectrum", "Emission spectrum", "s", "emitter",
        "Several lines (`Lines`) or a measured spectrum (`Samples`) in place of the single line.",
        types=(Lines, Samples), scale="choice",
    ),
    Input(
        "temperature", "Temperature", "T", "emitter",
        "Temperature of the emitter. It sets the fast linewidth where a published law is given, and "
        "nothing else: lifetime, yield and wavelength stay.",
        unit="K", shown="K", default=295.0, low=0.01, high=1000.0,
        slider=(1.0, 400.0), scale="log", typical="4–300 K",
    ),
    Input(
        "broadening", "Broadening law", "Γ(T)", "emitter",
        "A published law (`Broadening`) from which the fast linewidth follows unless it is given.",
        types=(Broadening,), scale="choice",
    ),
    Input(
        "dipole_alignment", "Dipole alignment", "ξ", "emitter",
        "Mean cos² between dipole and mode field, averaged fast: 1 aligned, 1/3 random with one "
        "polarisation, 2/3 random with two degenerate polarisations.",
        default=1 / 3, low=0.0, high=1.0, slider=(0.0, 1.0), typical="1/3, 2/3, 1",
    ),
    Input(
        "biexciton_yield", "Biexciton yield", "ηBX", "emitter",
        "Quantum yield of the biexciton in the reference surroundings; 0: it emits no photon.",
        default=0.0, low=0.0, high=1.0, slider=(0.0, 1.0), typical="0.02–0.2 in nanocrystals",
    ),
    Input(
        "biexciton_rate_ratio", "Biexciton rate ratio", "rBX", "emitter",
        "Radiative rate of the biexciton over that of the exciton.",
        default=4.0, low=0.0, low_open=True, slider=(0.1, 20.0), scale="log", typical="2–4",
    ),
    Input(
        "biexciton_shift", "Biexciton shift", "ΔλBX", "emitter",
        "Wavelength of the biexciton line minus that of the exciton.",
        unit="m", shown="nm", default=0.0, low=_half_below, high=_half_above,
        slider=(-40e-9, 40e-9), typical="−30 – 10 nm",
    ),
    Input(
        "bright_share", "Bright share", "q", "emitter",
        "Share of the time the emitter is on.",
        default=1.0, low=0.0, low_open=True, high=1.0, slider=(0.01, 1.0), typical="0.5–1",
    ),
    Input(
        "bulk_rate_ratio", "Bulk rate ratio", "rn", "emitter",
        "Radiative rate in a bulk of the resonator's index over that in the reference surroundings; "
        "for an emitter on glass in air, without local-field effects, about n/1.72.",
        default=1.0, low=0.0, low_open=True, slider=(0.1, 10.0), scale="log", typical="0.5–2",
    ),
)

RESONATOR = (
    Input(
        "resonance_wavelength", "Resonance", "λc", "resonator",
        "Vacuum wavelength of the resonance; follows the emission unless given.",
        unit="m", shown="nm", default=_emission, low=200e-9, high=10e-6,
        slider=(300e-9, 2000e-9), typical="at the emission",
    ),
    Input(
        "quality_factor", "Quality factor", "Q", "resonator",
        "Loaded quality factor: resonance frequency over its full linewidth.",
        default=100.0, low=1.0, high=1e10, slider=(1.0, 1e9), scale="log", typical="10–1e6",
    ),
    Input(
        "mode_volume", "Mode volume", "V", "resonator",
        "Mode volume normalised to the field maximum.",
        unit="(λ/n)³", shown="(λ/n)³", default=1.0, low=1e-8, high=1e8,
        slider=(1e-8, 1e4), scale="log", typical="1e-5–100 (λ/n)³",
    ),
    Input(
        "refractive_index", "Refractive index", "n", "resonator",
        "Refractive index at the emitter.",
        default=1.5, low=1.0, high=6.0, slider=(1.0, 4.0), typical="1–3.5",
    ),
    Input(
        "mode_profile", "Mode profile", "", "resonator",
        "Shape of the mode: a standing wave along the axis, or compact with equal extent on all "
        "three axes.",
        default="standing_wave", choices=("standing_wave", "compact"), scale="choice",
    ),
    Input(
        "mode_length", "Mode length", "L", "resonator",
        "Axial length of a standing-wave mode; the placement factor is exact for multiples of ½.",
        unit="λ/n", shown="λ/n", default=0.5, low=0.0, low_open=True,
        slider=(0.5, 100.0), scale="log", typical="0.5–20 λ/n",
    ),
    Input(
        "radiative_share", "Radiative share", "ηr", "resonator",
        "Share of the resonator's loss that leaves as light; the rest is absorbed.",
        default=1.0, low=0.0, low_open=True, high=1.0, slider=(0.01, 1.0),
        typical="0.3–0.7 in metal, near 1 in dielectrics",
    ),
    Input(
        "other_modes", "Other modes", "α", "resonator",
        "Emission into everything but the mode, relative to the bulk radiative rate.",
        default=1.0, low=0.0, slider=(0.001, 10.0), scale="log or zero", typical="0.1–1",
    ),
    Input(
        "quenching", "Quenching", "ζ", "resonator",
        "Extra non-radiative rate caused by the resonator, relative to the bulk radiative rate.",
        default=0.0, low=0.0, slider=(0.001, 1e4), scale="log or zero",
        typical="0; large within 10 nm of metal",
    ),
    Input(
        "upward_share", "Upward share", "ηup", "resonator",
        "Share of the outgoing light that heads for the optic; light trapped in the substrate "
        "counts against it.",
        default=0.5, low=0.0, low_open=True, high=1.0, slider=(0.01, 1.0), typical="0.5–0.95",
    ),
    Input(
        "aperture_radius", "Radiating radius", "wa", "resonator",
        "1/e² radius of the radiating field; larger than the mode where a separate structure shapes "
        "the beam.",
        unit="m", shown="µm", default=_mode_radius, low=0.0, low_open=True,
        slider=(0.01e-6, 20e-6), scale="log", typical="0.1–5 µm",
    ),
    Input(
        "pattern", "Angular pattern", "P", "resonator",
        "A given angular pattern (`Pattern`) in place of the Gaussian aperture.",
        types=(Pattern,), scale="choice",
    ),
    Input(
        "lateral_offset", "Lateral offset", "r", "resonator",
        "Distance of the emitter from the field maximum, across the axis.",
        unit="m", shown="nm", default=0.0, slider=(0.0, 500e-9), low=-1e-3, high=1e-3,
        typical="0–50 nm",
    ),
    Input(
        "axial_offset", "Axial offset", "z", "resonator",
        "Distance of the emitter from the field maximum, along the axis.",
        unit="m", shown="nm", default=0.0, slider=(0.0, 500e-9), low=-1e-3, high=1e-3,
        typical="0–50 nm",
    ),
)

COLLECTION = (
    Input(
        "numerical_aperture", "Numerical aperture", "NA", "collection",
        "Numerical aperture of the collecting optic; below the index of the medium.",
        default=0.5, low=0.0, low_open=True, high=_medium, high_open=True,
        slider=(0.05, 1.49), typical="0.4–0.9; above 1 in oil",
    ),
    Input(
        "medium_index", "Medium index", "nm", "collection",
        "Refractive index of the medium between the source and the optic.",
        default=1.0, low=1.0, high=2.0, slider=(1.0, 2.0), typical="1; oil 1.52",
    ),
    Input(
        "optics_transmission", "Optics transmission", "T", "collection",
        "Transmission of the optics behind the lens.",
        default=1.0, low=0.0, low_open=True, high=1.0, slider=(0.01, 1.0), typical="0.3–0.9",
    ),
    Input(
        "filter_width", "Filter width", "Δλf", "collection",
        "Width of an ideal band-pass filter; ∞ is no filter.",
        unit="m", shown="nm", default=INFINITE, low=0.0, low_open=True, infinite=True,
        slider=(0.01e-9, 300e-9), scale="log or none", typical="1–50 nm",
    ),
    Input(
        "filter_centre", "Filter centre", "λf", "collection",
        "Centre of the filter; follows the resonance unless given.",
        unit="m", shown="nm", default=_resonance, low=200e-9, high=10e-6,
        slider=(300e-9, 2000e-9), typical="at the resonance",
    ),
    Input(
        "destination", "Destination", "", "collection",
        "Where the photons are wanted: in free space or in a single-mode fibre.",
        default="free_space", choices=("free_space", "fibre"), scale="choice",
    ),
    Input(
        "fibre_mode_radius", "Fibre mode radius", "wf", "collection",
        "1/e² radius of the fibre's mode.",
        unit="m", shown="µm", default=2.5e-6, low=0.0, low_open=True,
        slider=(0.5e-6, 10e-6), typical="1.5–5.2 µm",
    ),
    Input(
        "magnification", "Magnification", "M", "collection",
        "Magnification from the source to the fibre; matches the fibre unless given.",
        default=_matched, low=0.0, low_open=True, slider=(0.5, 200.0), scale="log",
        typical="the matching value",
    ),
    Input(
        "fibre_offset", "Fibre offset", "d", "collection",
        "Lateral offset of the fibre from the image of the source.",
        unit="m", shown="µm", default=0.0, slider=(0.0, 10e-6), low=-1e-3, high=1e-3,
        typical="0–1 µm",
    ),
    Input(
        "detector_efficiency", "Detector efficiency", "ηd", "collection",
        "Efficiency of the detector.",
        default=1.0, low=0.0, low_open=True, high=1.0, slider=(0.01, 1.0), typical="0.5–0.9",
    ),
    Input(
        "reference_side", "Reference side", "", "collection",
        "Side from which the bare emitter on a coverslip is watched for comparison; glass where the "
        "numerical aperture is above 1.",
        default=_side, choices=("air", "glass"), scale="choice",
    ),
)

EXCITATION = (
    Input(
        "pumping", "Pumping", "", "excitation",
        "Pulsed or continuous excitation.",
        default="pulsed", choices=("pulsed", "continuous"), scale="choice",
    ),
    Input(
        "repetition_rate", "Repetition rate", "f", "excitation",
        "Excitation pulses per second.",
        unit="1/s", shown="MHz", default=10e6, low=0.0, low_open=True,
        slider=(1e3, 10e9), scale="log", typical="1–200 MHz",
    ),
    Input(
        "excitations_per_pulse", "Excitations per pulse", "m", "excitation",
        "Poisson mean of the excitations offered by one pulse.",
        default=1.0, low=0.0, low_open=True, slider=(0.01, 20.0), scale="log", typical="0.1–3",
    ),
    Input(
        "saturation", "Saturation", "s", "excitation",
        "Continuous pump rate over the total decay rate of the device.",
        default=1.0, low=0.0, low_open=True, slider=(0.001, 100.0), scale="log", typical="0.1–3",
    ),
    Input(
        "background_per_pulse", "Background per pulse", "b", "excitation",
        "Mean number of uncorrelated detected photons in a pulse.",
        default=0.0, low=0.0, slider=(1e-6, 1.0), scale="log or zero", typical="1e-5–1e-2",
    ),
    Input(
        "background_rate", "Background rate", "B", "excitation",
        "Uncorrelated detected photons per second under continuous pumping.",
        unit="1/s", shown="k/s", default=0.0, low=0.0, slider=(1.0, 1e8), scale="log or zero",
        typical="0.1–10 k/s",
    ),
)
# fmt: on

for _entry in (*EMITTER, *RESONATOR, *COLLECTION, *EXCITATION):
    add_input(_entry)

#: Every input by name.
INPUTS = REGISTRY.inputs


def slider_holds(name: str, value: float) -> bool:
    """Whether the slider of an input reaches an SI value (zero and ∞ have stops of their own)."""
    entry = INPUTS[name]
    low, high = entry.slider
    if value == 0 and entry.scale == "log or zero":
        return True
    if math.isinf(value):
        return entry.scale == "log or none"
    return low <= value <= high
