"""The four kinds of measured data: how each is read, what may be chosen, how it is fitted."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from ..measured.reading import read_coincidences, read_decay, read_pattern, read_spectrum
from .measuring import Extra, File, Kind, Option

Files = dict[str, File]


def _spectrum(
    files: Files, units: Any, columns: Any, values: dict[str, Any]
) -> tuple[Any, dict[str, Any]]:
    """The spectrum with its background taken away and its response divided out."""
    more = {role: file for role, file in files.items() if role}
    data = read_spectrum(files[""], units=units, columns=columns, of=values["of"], **more)
    return data, {}


def _decay(files: Files, units: Any, columns: Any, _: Any) -> tuple[Any, dict[str, Any]]:
    data = read_decay(files[""], units=units, columns=columns)
    response = {"response": read_decay(files["response"])} if "response" in files else {}
    return data, response


def _coincidences(files: Files, units: Any, columns: Any, _: Any) -> tuple[Any, dict[str, Any]]:
    return read_coincidences(files[""], units=units, columns=columns), {}


def _pattern(files: Files, units: Any, columns: Any, _: Any) -> tuple[Any, dict[str, Any]]:
    return read_pattern(files[""], units=units, columns=columns), {}


def _spectrum_steps(data: Any, _: Any, values: dict[str, Any]) -> Iterator[Any]:
    from ..measured.spectrum import fit_spectrum_steps

    shape, sidebands = values["line"]
    return fit_spectrum_steps(
        data, sidebands=sidebands, shape=shape, resolution=values["resolution"] or 0.0
    )


def _decay_steps(data: Any, extras: dict[str, Any], values: dict[str, Any]) -> Iterator[Any]:
    from ..measured.decay import fit_decay_steps

    return fit_decay_steps(
        data,
        extras.get("response"),
        values["components"],
        period=values["period"],
        start=values["start"],
    )


def _g2_steps(data: Any, _: Any, values: dict[str, Any]) -> Iterator[Any]:
    from ..measured.g2 import fit_g2_steps

    return fit_g2_steps(
        data,
        pumping=values["pumping"],
        period=values["period"] if values["pumping"] == "pulsed" else None,
        jitter=values["jitter"] or 0.0,
        background=values["background"],
        bunching=values["bunching"],
        signal_share=1.0 if values["signal_share"] is None else values["signal_share"],
    )


SPECTRUM = Kind(
    "spectrum",
    "Spectrum",
    "Wavelength (or energy) and photon counts",
    _spectrum,
    (
        Extra("background", "background", "The same without the emitter: taken away"),
        Extra("response", "response", "Sensitivity against wavelength: divided out"),
    ),
    (
        Option(
            "of",
            "Values",
            "What the second column counts; power is turned into photons",
            "counts",
            choices=(("photon counts", "counts"), ("power", "power")),
            reads=True,
        ),
        Option(
            "line",
            "Line",
            "Shape that is fitted; a Voigt line has a fast and a slow width",
            ("voigt", 0),
            choices=(
                ("one Voigt line", ("voigt", 0)),
                ("one Lorentzian line", ("lorentzian", 0)),
                ("one Gaussian line", ("gaussian", 0)),
                ("a line and 1 sideband", ("voigt", 1)),
                ("a line and 2 sidebands", ("voigt", 2)),
                ("a line and 3 sidebands", ("voigt", 3)),
            ),
        ),
        Option(
            "resolution",
            "Spectrometer",
            "Full width that the spectrometer adds to a sharp line; taken out of the slow width",
            None,
            "nm",
        ),
    ),
    _spectrum_steps,
)

DECAY = Kind(
    "decay",
    "Decay",
    "Time and counts after a pulse",
    _decay,
    (Extra("response", "response", "The same with scattered laser light: the fit folds it in"),),
    (
        Option(
            "components",
            "Decay",
            "Exponentials that are fitted",
            1,
            choices=(("one exponential", 1), ("two exponentials", 2)),
        ),
        Option(
            "period",
            "Period",
            "Time between pulses: the tails of earlier pulses are folded in",
            None,
            "ns",
        ),
        Option(
            "start",
            "From",
            "Without a response: where the fit begins; empty: after the peak",
            None,
            "ns",
        ),
    ),
    _decay_steps,
)

COINCIDENCES = Kind(
    "coincidences",
    "Coincidences",
    "Delay between two detectors and counts",
    _coincidences,
    (),
    (
        Option(
            "pumping",
            "Pumping",
            "How the emitter was excited",
            "pulsed",
            choices=(("pulsed", "pulsed"), ("continuous", "continuous")),
        ),
        Option("period", "Period", "Time between pulses; empty: found from the data", None, "ns"),
        Option("jitter", "Jitter", "Full width of the two detectors' timing together", None, "ns"),
        Option(
            "signal_share", "Signal share", "Share of the counts that is the emitter's", None, "1"
        ),
        Option("background", "flat level", "Fit a flat level of chance coincidences", True),
        Option("bunching", "blinking", "Let peaks near zero be higher than those far away", False),
    ),
    _g2_steps,
)

PATTERN = Kind("pattern", "Angular pattern", "Angle and power per solid angle", _pattern)

KINDS = {kind.name: kind for kind in (SPECTRUM, DECAY, COINCIDENCES, PATTERN)}
