"""Curves behind a design: in what colours and into what angles it radiates, and cuts."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .domain import InputError
from .evaluate import Evaluation
from .inputs import INPUTS
from .physics.coupling import CIRCLE
from .physics.farfield import pattern_integral
from .physics.measured_pattern import power_inside
from .physics.window import line_density, outgoing_density, wandering_density
from .registry import REGISTRY
from .whole import Lines, Pattern, Samples

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Colours:
    """Spectra of one design over wavelength [m], each over its own maximum.

    emitter: its own light. resonator: the resonance. leaving: what leaves through the mode. passed:
    1 inside the filter, 0 outside. Counts per unit wavelength.
    """

    wavelength: Array
    emitter: Array
    resonator: Array
    leaving: Array
    passed: Array


def colours(work: Evaluation, count: int = 240) -> Colours:
    """The spectra of one design; nodes crowd at the resonance, which may be very narrow."""
    wavelength = _wavelengths(work, count)
    centre = float(work.value("resonance_wavelength"))
    frequency = CIRCLE * (centre - wavelength) / (centre * wavelength)  # from the resonance
    kappa = float(work.value("resonator_linewidth"))
    resonance = 1 / (1 + (2 * frequency / kappa) ** 2)
    with np.errstate(all="ignore"):
        own = _own_density(work, frequency)
        leaving = _leaving_density(work, frequency, own, resonance)
        lower, upper = (float(edge) for edge in work.value("filter_edges"))
    passed = ((frequency >= lower) & (frequency <= upper)).astype(float)
    per_wavelength = (centre / wavelength) ** 2
    return Colours(
        wavelength,
        _over_maximum(own * per_wavelength),
        _over_maximum(resonance * per_wavelength),
        _over_maximum(leaving * per_wavelength),
        passed,
    )


def _over_maximum(values: Array) -> Array:
    values = np.where(np.isfinite(values), values, 0.0)
    highest = values.max()
    return values / highest if highest > 0 else values


def _width(work: Evaluation) -> float:
    """Width of the emission [m], at least that of the lifetime."""
    wavelength = float(work.value("emission_wavelength"))
    least = wavelength**2 / CIRCLE / float(work.value("lifetime"))
    return max(float(work.value("emission_width")), least)


def _wavelengths(work: Evaluation, count: int) -> Array:
    """Wavelengths that show the emission and the resonance whole, ascending, always `count`."""
    emission = float(work.value("emission_wavelength"))
    resonance = float(work.value("resonance_wavelength"))
    narrow = resonance / float(work.value("quality_factor"))
    reach = max(2.2 * _width(work), min(3 * narrow, 0.35 * resonance), 1e-14)
    low = max(min(emission, resonance) - reach, 0.3 * emission)
    high = max(emission, resonance) + reach
    crowded = count // 3
    spread = np.linspace(low, high, count - crowded)
    steps = np.sinh(np.linspace(-1, 1, crowded) * np.arcsinh((high - low) / narrow))
    near = np.clip(resonance + steps * narrow, low, high)
    return np.sort(np.concatenate([spread, near]))


def _own_density(work: Evaluation, frequency: Array) -> Array:
    """The emitter's own light per frequency."""
    spectrum = work.value("spectrum")
    detuning = float(work.value("detuning"))
    sigma = float(work.value("slow_deviation"))
    natural = 1 / float(work.value("lifetime"))
    if isinstance(spectrum, Samples):
        line = work.value("measured")(lambda item: item)
        return np.asarray(
            np.interp(frequency - detuning, line.omega, line.density, left=0.0, right=0.0)
        )
    if isinstance(spectrum, Lines):
        rows = work.value("line_table")
    else:
        rows = ((1.0, 0.0, work.value("pure_dephasing")),)
    total = np.zeros_like(frequency)
    for share, shift, dephasing in rows:
        total += float(share) * line_density(
            frequency=frequency,
            centre=detuning + float(shift),
            width=float(dephasing) + natural,
            sigma=sigma,
        )
    return total


def _leaving_density(work: Evaluation, frequency: Array, own: Array, resonance: Array) -> Array:
    """What leaves through the mode per frequency: exact for one line, else the product."""
    if work.value("spectrum") is not None:
        return own * resonance
    rates = {
        "kappa": float(work.value("resonator_linewidth")),
        "coherence": float(work.value("coherence_decay")),
        "g_squared": float(work.value("coupling_rate")) ** 2,
        "detuning": float(work.value("detuning")),
    }
    sigma = float(work.value("slow_deviation"))
    if sigma == 0:
        return np.asarray(outgoing_density(frequency=frequency, **rates))
    gamma = float(work.value("decay_elsewhere"))
    return np.asarray(wandering_density(frequency=frequency, gamma=gamma, sigma=sigma, **rates))


@dataclass(frozen=True)
class Angles:
    """The pattern of one design, and what an aperture collects of it.

    theta [rad] with power per solid angle over its maximum; edge [rad] of the collected cone;
    aperture (numerical aperture) with the collected share.
    """

    theta: Array
    power: Array
    edge: float
    aperture: Array
    collected: Array


def angles(work: Evaluation, count: int = 91) -> Angles:
    """The pattern of one design over half a turn, and collected share against the aperture."""
    theta = np.linspace(0.0, np.pi / 2, count)
    pattern = work.value("pattern")
    if isinstance(pattern, Pattern):
        highest = pattern.powers.max()
        power = np.interp(theta, pattern.angles, pattern.powers / highest, right=0.0)
    else:
        a = float(work.value("sharpness"))
        power = np.exp(-a * np.sin(theta) ** 2) * (1 + np.cos(theta) ** 2) / 2
    index = float(work.value("medium_index"))
    aperture = np.linspace(0.0, 1.0, 61)[1:] * index * (1 - 1e-9)
    sines = aperture / index
    inside = (
        power_inside(pattern, sines)
        if isinstance(pattern, Pattern)
        else pattern_integral(float(work.value("sharpness")), sines)
    )
    collected = np.asarray(inside) / float(work.value("whole_pattern"))
    edge = float(np.arcsin(work.value("aperture_sine")))
    return Angles(theta, power, edge, aperture, collected)


@dataclass(frozen=True)
class Cut:
    """One quantity of a design against one input, SI."""

    values: Array
    quantity: Array


def cut(work: Evaluation, quantity: str, name: str, values: Array) -> Cut:
    """A quantity against any input through the design. Raises InputError, KeyError."""
    if INPUTS[name].whole:
        raise InputError(f"{name} is no number, so nothing is cut along it", name)
    if REGISTRY.quantities[quantity].kind != "number":
        raise InputError(f"{quantity} is no number that can be cut")
    given: dict[str, Any] = {key: work.value(key) for key in work.given}
    line = Evaluation({**given, name: values})
    return Cut(values, np.broadcast_to(line.result(quantity), values.shape))
