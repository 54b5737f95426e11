"""What measured data can be used for: inputs of the design, or values of a device."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

from ..built import Estimate
from ..design import Design, written
from ..domain import InputError
from ..inputs import INPUTS
from ..measured.data import AngularPattern, Coincidences, Decay, Spectrum
from ..measured.use import with_device, with_measured
from .measured_words import enhanced, enhancement_words, g2_of, lifetime_of, pattern_words, result
from .measuring import Measuring


@dataclass(frozen=True)
class Use:
    """A button: change(design, name of the device) -> design. names: the inputs that it settles."""

    label: str
    hint: str
    change: Callable[[Design, str], Design]
    names: tuple[str, ...] = ()
    device: bool = False


def uses(held: Measuring) -> Iterator[Use]:
    """What the data and their fit can be used for."""
    data, fit = held.data, held.fit
    if isinstance(data, Spectrum):
        yield from _of_spectrum(data, fit)
    elif isinstance(data, AngularPattern):
        yield _as_pattern(data)
    elif fit is not None and isinstance(data, Decay):
        yield from _of_decay(data, fit)
    elif fit is not None and isinstance(data, Coincidences):
        yield from _of_coincidences(data, fit)


def _of_spectrum(data: Spectrum, fit: Any) -> Iterator[Use]:
    centre, flat = (
        (data.peak, 0.0) if fit is None else (fit.centre.value, max(fit.background.value, 0.0))
    )

    def as_measured(design: Design, _: str) -> Design:
        values = {
            "emission_wavelength": centre,
            "spectrum": data.samples(centre, flat),
            "slow_linewidth": 0.0,  # a measured spectrum holds what wandered while it was taken
        }
        return with_measured(design, values, data.name, data.digest, "the spectrum as measured")

    names = ("emission_wavelength", "fast_linewidth", "slow_linewidth", "spectrum")
    yield Use(
        "Use the spectrum as measured",
        "Every sample counts, less the flat level of the fit; what wandered meanwhile counts as fast",
        as_measured,
        names,
    )
    if fit is None:
        return

    def as_fitted(design: Design, _: str) -> Design:
        bare = design.without_values("spectrum", "fast_linewidth")
        return with_measured(bare, fit.inputs(), data.name, data.digest, "the fitted lines")

    yield Use(
        "Use the fitted line" if len(fit.lines) < 2 else "Use the fitted lines",
        "Centre and widths, with their intervals as ranges that are not known",
        as_fitted,
        names,
    )

    if len(fit.lines) < 2 and fit.fast_linewidth.value > 0:
        yield _as_resonance(data, fit)


def _as_resonance(data: Spectrum, fit: Any) -> Use:
    """The line of an empty resonator: its wavelength, and Q as that over the Lorentzian width."""

    def change(design: Design, _: str) -> Design:
        centre, width = fit.centre, fit.fast_linewidth
        high = math.inf if width.low <= 0 else centre.high / width.low
        quality = Estimate(centre.value / width.value, centre.low / width.high, high)
        values = {"resonance_wavelength": centre, "quality_factor": quality}
        return with_measured(design, values, data.name, data.digest, "the line of the resonator")

    return Use(
        "Use as the resonator's line",
        "Its wavelength, and Q as that over the fast width",
        change,
        ("resonance_wavelength", "quality_factor"),
    )


def _as_pattern(data: AngularPattern) -> Use:
    def change(design: Design, _: str) -> Design:
        values: dict[str, Any] = {"pattern": data.pattern}
        if data.upward_share is not None:
            values["upward_share"] = data.upward_share
        return with_measured(design, values, data.name, data.digest, "the pattern as given")

    names = ("pattern",) if data.upward_share is None else ("pattern", "upward_share")
    return Use(
        "Use as the angular pattern",
        "In place of the Gaussian aperture; the collected share follows for every aperture",
        change,
        names,
    )


def _of_decay(data: Decay, fit: Any) -> Iterator[Use]:
    mean = lifetime_of(fit, "mean")

    def as_lifetime(design: Design, _: str) -> Design:
        said = f"decay, {len(fit.lifetimes)} exponential{'s' if len(fit.lifetimes) > 1 else ''}"
        return with_measured(design, {"lifetime": mean}, data.name, data.digest, said)

    def on_device(kind: str) -> Callable[[Design, str], Design]:
        def change(design: Design, name: str) -> Design:
            measured = {"initial_decay_rate": fit.initial_rate}
            if kind == "mean":
                total = enhanced(design, fit, kind).total
                measured = {"device_lifetime": mean, "rate_enhancement": total}
            return with_device(design, name, measured, data.name, data.digest)

        return change

    yield Use(
        "Use as the bare emitter's lifetime",
        "The mean time in the excited state, with its interval",
        as_lifetime,
        ("lifetime",),
    )
    words = "mean time" if len(fit.lifetimes) > 1 else "lifetime"
    yield Use(f"Add {words} to", "The decay was measured in a device", on_device("mean"), (), True)
    if len(fit.lifetimes) > 1:
        yield Use(
            "Add first slope to",
            "What the decay starts with: the fastest count most",
            on_device("first slope"),
            (),
            True,
        )


def _of_coincidences(data: Coincidences, fit: Any) -> Iterator[Use]:
    def on_device(design: Design, name: str) -> Design:
        return with_device(design, name, {"g2_zero": g2_of(fit)}, data.name, data.digest)

    def as_biexciton(design: Design, _: str) -> Design:
        share = float(design.evaluation.value("quantum_yield"))
        g2 = fit.emitter_g2_zero
        if g2.value * share > 1:
            raise InputError("g²(0) is too large to be a biexciton's: its yield would be over 1")
        ends = (min(max(end * share, 0.0), 1.0) for end in (g2.value, g2.low, g2.high))
        return with_measured(
            design,
            {"biexciton_yield": Estimate(*ends)},
            data.name,
            data.digest,
            "g²(0) of the bare emitter times its quantum yield, at weak pumping (Nair et al., 2011)",
        )

    yield Use("Add g²(0) to", "The coincidences were measured on a device", on_device, (), True)
    yield Use(
        "Use as the emitter's biexciton yield",
        "g²(0) of the bare emitter at weak pumping is the ratio of the two quantum yields "
        "(Nair et al., Nano Lett. 11, 1136 (2011))",
        as_biexciton,
        ("biexciton_yield",),
    )


def says(design: Design, held: Measuring) -> str:
    """What the data and their fit say, and what that means against the design, as HTML."""
    if isinstance(held.data, AngularPattern):
        return pattern_words(design, held.data)
    if held.fit is None:
        return ""
    words = result(held.data, held.fit)
    if isinstance(held.data, Decay):
        try:
            words += enhancement_words(design, enhanced(design, held.fit, "mean"))
        except InputError:  # nothing to compare with
            return words
    return words


def done(use: Use, design: Design) -> str:
    """What a press did, in a sentence."""
    if use.device:
        return (
            f"{design.built[-1].name} stands on the map."
            if len(design.built) == 1
            else "Added; see below."
        )
    numbers = [
        f"{INPUTS[name].label.lower()} {written(name, design.point[name], 4)}"
        for name in use.names
        if name in design.point and not INPUTS[name].whole
    ]
    return f"In the design: {', '.join(numbers) or use.names[0].replace('_', ' ')}."
