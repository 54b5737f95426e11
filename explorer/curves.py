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

#: Nodes of a spectrum that are spread evenly; of a measured one, at most so many of its own.
EVEN, LANDMARKS = 121, 200

#: Up to so many features, each has nodes half a step of its asinh apart; of more, a whole one.
FEW = 5

#: Shifts, in standard deviations, at which a drawn measured spectrum is averaged over its wandering.
SHIFTS = np.linspace(-4.0, 4.0, 65)


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


def colours(work: Evaluation) -> Colours:
    """The spectra of one design; nodes crowd where one may be narrow, and stand on its peak."""
    centre = float(work.value("resonance_wavelength"))
    kappa = float(work.value("resonator_linewidth"))

    def spectra(frequency: Array) -> Array:
        own = _own_density(work, frequency)
        resonance = 1 / (1 + (2 * frequency / kappa) ** 2)
        leaving = _leaving_density(work, frequency, own, resonance)
        values = np.stack([own, resonance, leaving]) * (1 + frequency * centre / CIRCLE) ** 2
        return np.where(np.isfinite(values), values, 0.0)

    with np.errstate(all="ignore"):
        lower, upper = (float(edge) for edge in work.value("filter_edges"))
        nodes = _nodes(work, (lower, upper))
        values = spectra(nodes)
        peaks = _around_peaks(nodes, values)
        values = np.concatenate([values, spectra(peaks)], axis=1)
    nodes = np.concatenate([nodes, peaks])
    order = np.argsort(-nodes, kind="stable")
    frequency = nodes[order]
    highest = values.max(axis=1, keepdims=True)
    emitter, resonator, leaving = (values / np.where(highest > 0, highest, 1.0))[:, order]
    passed = ((frequency >= lower) & (frequency <= upper)).astype(float)
    wavelength = centre / (1 + frequency * centre / CIRCLE)
    return Colours(wavelength, emitter, resonator, leaving, passed)


def _width(work: Evaluation) -> float:
    """Width of the emission [m], at least that of the lifetime."""
    wavelength = float(work.value("emission_wavelength"))
    least = wavelength**2 / CIRCLE / float(work.value("lifetime"))
    return max(float(work.value("emission_width")), least)


def _frame(work: Evaluation) -> tuple[float, float]:
    """Wavelengths that show the emission and the resonance whole, the shortest and the longest."""
    emission = float(work.value("emission_wavelength"))
    resonance = float(work.value("resonance_wavelength"))
    narrow = resonance / float(work.value("quality_factor"))
    pushed = max((abs(pole.real) for pole in _poles(work)), default=0.0)
    doublet = max(0.0, pushed - abs(float(work.value("detuning")))) * resonance**2 / CIRCLE
    coupled = min(max(3 * narrow, 1.5 * doublet), 0.35 * resonance)
    reach = max(2.2 * _width(work), coupled, 1e-14)
    low = max(min(emission, resonance) - reach, 0.3 * emission)
    return low, max(emission, resonance) + reach


def _poles(work: Evaluation) -> list[complex]:
    """Where the light of a single line that leaves peaks, and how wide: frequency − i half width."""
    if work.value("spectrum") is not None:
        return []
    kappa, coherence, detuning, coupling = (
        float(work.value(name))
        for name in ("resonator_linewidth", "coherence_decay", "detuning", "coupling_rate")
    )
    split = np.sqrt((complex(detuning, (kappa - coherence) / 2) / 2) ** 2 + coupling**2)
    middle = complex(detuning, -(kappa + coherence) / 2) / 2
    return [complex(middle + split), complex(middle - split)]


def _nodes(work: Evaluation, edges: tuple[float, float]) -> Array:
    """Frequencies from the resonance [rad/s], ascending.

    Evenly over the frame, in an odd number about every feature with one on its centre, and on and
    beside the edges of the filter.
    """
    centre = float(work.value("resonance_wavelength"))
    ends = np.array(_frame(work))
    first, last = CIRCLE * (centre - ends[::-1]) / (centre * ends[::-1])
    features = _features(work)
    step = 0.5 if len(features) <= FEW else 1.0
    found = [np.linspace(first, last, EVEN)]
    for middle, half in features:
        reach = float(np.arcsinh((last - first) / half))
        count = int(np.ceil(reach / step))
        found.append(middle + half * np.sinh(np.arange(-count, count + 1) * (reach / count)))
    if isinstance(work.value("spectrum"), Samples):
        found.append(float(work.value("detuning")) + _landmarks(work))
    found += [np.nextafter(edge, (-np.inf, edge, np.inf)) for edge in edges]
    nodes = np.concatenate(found)
    return np.unique(nodes[(nodes >= first) & (nodes <= last)])


def _features(work: Evaluation) -> list[tuple[float, float]]:
    """Centre and half width [rad/s] of whatever may be narrow in a spectrum."""
    kappa = float(work.value("resonator_linewidth"))
    detuning = float(work.value("detuning"))
    found = [(0.0, kappa / 2)]
    if isinstance(work.value("spectrum"), Samples):
        return found
    spread = 1.18 * float(work.value("slow_deviation"))
    found += [(detuning + shift, width / 2 + spread) for _, shift, width in _lines(work)]
    if spread == 0:
        found += [(pole.real, abs(pole.imag)) for pole in _poles(work) if pole.imag]
    return found


def _landmarks(work: Evaluation) -> Array:
    """Of a measured spectrum the highest sample in each of at most LANDMARKS stretches [rad/s]."""
    line = work.value("measured")(lambda item: item)
    length = -(-line.omega.size // LANDMARKS)
    padded = np.pad(line.density, (0, -line.omega.size % length), constant_values=-1.0)
    highest = padded.reshape(-1, length).argmax(axis=1)
    return np.asarray(line.omega[highest + length * np.arange(highest.size)])


def _around_peaks(nodes: Array, values: Array) -> Array:
    """Nodes between the neighbours of the highest node of each row."""
    at = values.argmax(axis=1)
    below, above = nodes[np.maximum(at - 1, 0)], nodes[np.minimum(at + 1, nodes.size - 1)]
    return np.asarray(np.linspace(below, above, 18)[1:-1].ravel())


def _lines(work: Evaluation) -> list[tuple[float, float, float]]:
    """Share, shift from the centre and width [rad/s] of each line of the emitter."""
    natural = 1 / float(work.value("lifetime"))
    if isinstance(work.value("spectrum"), Lines):
        rows = work.value("line_table")
    else:
        rows = ((1.0, 0.0, work.value("pure_dephasing")),)
    return [(float(share), float(shift), float(rate) + natural) for share, shift, rate in rows]


def _own_density(work: Evaluation, frequency: Array) -> Array:
    """The emitter's own light per frequency."""
    detuning = float(work.value("detuning"))
    sigma = float(work.value("slow_deviation"))
    total = np.zeros_like(frequency)
    if isinstance(work.value("spectrum"), Samples):
        line = work.value("measured")(lambda item: item)
        shifts = SHIFTS if sigma > 0 else np.zeros(1)
        weights = np.exp(-(shifts**2) / 2)
        at = (frequency - detuning) - (shifts * sigma)[:, np.newaxis]
        seen = np.interp(at, line.omega, line.density, left=0.0, right=0.0)
        total += (weights / weights.sum()) @ seen
        return total
    for share, shift, width in _lines(work):
        total += share * line_density(
            frequency=frequency, centre=detuning + shift, width=width, sigma=sigma
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
