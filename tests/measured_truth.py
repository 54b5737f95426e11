"""Synthetic measurements of known truth, made without the fits' own model functions.

Events are drawn one by one from their physics: a pulse, a wait, a jitter; a random wavelength. So a
mistake in the model's integrals over bins cannot hide in the data.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from explorer.measured.data import Coincidences, Decay, Spectrum

Array = NDArray[np.float64]
LIGHT = 299792458.0
FILE: dict[str, Any] = {
    "name": "truth.csv",
    "digest": "0" * 64,
    "units": ("", "counts"),
    "read_as": (),
    "dropped": (),
}


def edges_of(first: float, width: float, count: int) -> Array:
    """Edges of even bins."""
    return first + width * np.arange(count + 1)


def binned(kind: type[Any], events: Array, edges: Array, flat: Array | float = 0.0) -> Any:
    """A histogram of events, with flat counts added. flat: (n,)."""
    counts = np.histogram(events, edges)[0] + flat
    width = float(edges[1] - edges[0])
    return kind(
        **FILE, times=edges[:-1] + width / 2, counts=np.asarray(counts, dtype=float), width=width
    )


def decay(
    rng: np.random.Generator,
    total: float,
    lifetimes: tuple[float, ...] = (3e-9,),
    amplitudes: tuple[float, ...] = (1.0,),
    *,
    background: float = 0.05,
    pulse: float = 5e-9,
    response: float = 0.0,
    period: float | None = None,
    edges: Array | None = None,
) -> Decay:
    """Arrivals after a pulse. total: mean number of counts; background: share of them that is flat.

    response: standard deviation of the pulse and the detector [s]; the tail of the response is a
    tenth of it delayed with twice the width, so that it is not even.
    """
    edges = edges_of(0.0, 50e-12, 1000) if edges is None else edges
    areas = np.array(amplitudes) * np.array(lifetimes)
    number = rng.poisson(total * (1 - background))
    which = rng.choice(len(lifetimes), number, p=areas / np.sum(areas))
    wait = rng.exponential(np.array(lifetimes)[which])
    arrival = pulse + wait + response_times(rng, number, response)
    if period is not None:
        arrival = edges[0] + (arrival - edges[0]) % period
    flat = rng.poisson(total * background / (edges.size - 1), edges.size - 1)
    return binned(Decay, arrival, edges, flat)


def response_times(rng: np.random.Generator, number: int, deviation: float) -> Array:
    """Delays of an uneven response."""
    late = rng.random(number) < 0.1
    return np.asarray(
        rng.normal(0.0, 1.0, number) * np.where(late, 2, 1) * deviation + late * 3 * deviation
    )


def response(
    rng: np.random.Generator, total: float, deviation: float, pulse: float = 5e-9
) -> Decay:
    """A histogram of the response alone, with a few flat counts."""
    edges = edges_of(0.0, 50e-12, 1000)
    times = pulse + response_times(rng, int(total), deviation)
    return binned(Decay, times, edges, rng.poisson(1e-5 * total, 1000))


def angular(width: float, centre: float) -> float:
    """FWHM in angular frequency of one in wavelength: 2πcΔ/(λ² − Δ²/4)."""
    return 2 * np.pi * LIGHT * width / (centre**2 - width**2 / 4)


def line_waves(
    rng: np.random.Generator, number: int, line: tuple[float, float, float], wander: float
) -> Array:
    """Wavelengths of photons of one line: a random frequency about the centre, which wanders.

    wander: angular FWHM, the same for all lines of an emitter, which it shifts as a whole.
    """
    centre, fast, _ = line
    omega = 2 * np.pi * LIGHT / centre + angular(fast, centre) / 2 * rng.standard_cauchy(number)
    omega = omega + wander / 2.3548200450309493 * rng.normal(size=number)
    return np.asarray(2 * np.pi * LIGHT / omega[omega > 0])


def spectrum(
    rng: np.random.Generator,
    total: float,
    lines: tuple[tuple[float, float, float], ...],
    slow: float,
    *,
    background: float = 0.1,
    dark: float = 0.0,
) -> Spectrum:
    """Photons sorted into 400 narrow pixels.

    lines: (centre, fast width, share). slow: FWHM at the first of them [m]. background: share of the counts that is flat. dark: mean counts per pixel that were taken away
    again, so that the variance is larger than the counts.
    """
    edges = np.linspace(600e-9, 680e-9, 401)
    number = rng.poisson(total * (1 - background))
    wander = angular(slow, lines[0][0])
    split = rng.multinomial(number, [line[2] for line in lines])
    waves = np.concatenate(
        [line_waves(rng, int(n), line, wander) for n, line in zip(split, lines, strict=True)]
    )
    counts = np.histogram(waves, edges)[0].astype(float)
    counts += rng.poisson(total * background / 400 + dark, 400) - dark
    middle = (edges[:-1] + edges[1:]) / 2
    return Spectrum(
        **FILE, wavelengths=middle, counts=counts, gain=np.ones(400), floor=np.full(400, dark)
    )


def pulsed(
    rng: np.random.Generator,
    total: float,
    g2: float,
    *,
    background: float = 0.0,
    decay_time: float = 3e-9,
    jitter: float = 0.5e-9,
    period: float = 50e-9,
) -> Coincidences:
    """Delays of a pulsed source: 8 far peaks and the central one. background: share that is flat."""
    edges = edges_of(-250.1e-9, 0.5e-9, 1000)
    peaks = np.arange(-7, 8)
    weights = np.where(peaks == 0, g2, 1.0)
    # About nine far periods are seen, with the central one; peaks beyond give the tails at the ends.
    number = rng.poisson(total * (1 - background) * np.sum(weights) / (9 + g2))
    which = rng.choice(peaks, number, p=weights / np.sum(weights))
    times = which * period + rng.laplace(0.0, decay_time, number)
    times = times + rng.normal(0.0, jitter / 2.3548200450309493, number) + 0.2e-9
    flat = rng.poisson(total * background / 1000, 1000)
    return binned(Coincidences, times, edges, flat)


def continuous(
    rng: np.random.Generator,
    total: float,
    g2: float,
    *,
    signal_share: float = 1.0,
    decay_time: float = 8e-9,
    jitter: float = 1e-9,
) -> Coincidences:
    """Delays of a continuous source: g² of the emitter, and flat accidental counts.

    Pairs are thinned out of evenly spread ones by their chance g²(t) and then jittered.
    """
    edges = edges_of(-40e-9, 0.4e-9, 200)
    reach = 45e-9
    number = rng.poisson(total * 2 * reach / 80e-9)
    delay = rng.uniform(-reach, reach, number)
    chance = 1 - signal_share**2 * (1 - g2) * np.exp(-np.abs(delay) / decay_time)
    kept = delay[rng.random(number) < chance]
    kept = kept + rng.normal(0.0, jitter / 2.3548200450309493, kept.size) + 0.3e-9
    return binned(Coincidences, kept, edges)
