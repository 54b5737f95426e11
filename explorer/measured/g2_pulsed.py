"""Coincidences of a pulsed source: the areas of the peaks."""

from __future__ import annotations

import math
from collections.abc import Callable, Generator

import numpy as np

from .data import Coincidences, DataError
from .decay_model import full_counts
from .engine import Fit, Parameter, fit_steps
from .g2_model import Train
from .g2_start import comb_centre, decay_guess, found_period
from .noise import Array, Noise


def pulsed_steps(
    data: Coincidences,
    period: float | None,
    jitter: float,
    background: bool,
    bunching: bool,
    level: float,
) -> Generator[None, None, tuple[Fit, Noise]]:
    """The fit of a train of peaks. jitter: standard deviation [s]."""
    period = period or found_period(data, full_counts(data))
    span = float(data.times[-1] - data.times[0]) + data.width
    if span < 2 * period:
        raise DataError(
            "the delays span less than two periods: no side peak to compare with", data.name
        )
    if jitter > period / 16:
        raise DataError(
            "the jitter is too large for the period: the peaks cannot be told apart", data.name
        )
    yield None
    parameters = _parameters(data, period, jitter, background, bunching)
    names = [one.name for one in parameters]
    model = _model(data, names, jitter)
    noise = Noise.poisson(data.counts)
    if not data.counting:
        fit = yield from fit_steps(model, noise, parameters, level=level)
        noise = noise.scaled_to(fit.expected, len(parameters))
    wanted = [name for name in names if name not in ("area", "period", "centre")]
    fit = yield from fit_steps(model, noise, parameters, wanted=wanted, level=level)
    return fit, noise


def _model(data: Coincidences, names: list[str], jitter: float) -> Callable[[Array], Array]:
    low, high = data.times - data.width / 2, data.times + data.width / 2
    joined = bool(np.allclose(low[1:], high[:-1], rtol=0, atol=1e-6 * data.width))
    edges = np.append(low, high[-1]) if joined else np.column_stack([low, high]).ravel()

    def model(p: Array) -> Array:
        given = dict(zip(names, p.tolist(), strict=True))
        train = Train(
            given["period"],
            math.exp(given["decay"]),
            jitter,
            given["centre"],
            given["g2"],
            given.get("bunching", 0.0),
            math.exp(given["reach"]) if "reach" in given else 1.0,
        )
        total = train.integral(edges)
        share = np.diff(total) if joined else total[1::2] - total[::2]
        return np.asarray(math.exp(given["area"]) * share + given.get("background", 0.0))

    return model


def _parameters(
    data: Coincidences, period: float, jitter: float, background: bool, bunching: bool
) -> list[Parameter]:
    """Where the fit starts. The peak at zero delay is the one that lies nearest to it."""
    centre = comb_centre(data.times, data.counts, period)
    place = data.times - centre
    number = np.rint(place / period)
    place = place - number * period
    mean = decay_guess(place, data.counts, period)
    decay = max(math.sqrt(max(mean**2 - 0.6 * jitter**2, 0.04 * mean**2)), data.width / 10)
    level = _level(place, data.counts) if background else 0.0
    side = number != 0
    many = max(float(np.sum(side)) * data.width / period, 1e-9)
    area = max(float(np.sum(data.counts[side] - level)) / many, 1.0)
    bins = max(float(np.sum(~side)) * data.width / period, 1e-9)
    central = max(float(np.sum(data.counts[~side] - level)) / bins / area, 0.02)
    error = 1 / math.sqrt(area)
    span = float(data.times[-1] - data.times[0])
    reach = max(span / 8, period)
    parameters = [
        Parameter("g2", central, max(error * math.sqrt(max(central, 0.05)), 1e-4), 0.0),
        Parameter("area", math.log(area), 0.1, math.log(area) - 6, math.log(area) + 6),
        Parameter("decay", math.log(decay), 0.1, math.log(data.width / 100), math.log(20 * period)),
        Parameter("period", period, 0.1 * decay * period / span, 0.9 * period, 1.1 * period),
        Parameter("centre", centre, 0.1 * decay, centre - period / 4, centre + period / 4),
    ]
    if background:
        step = max(0.1 * level, 0.01 * area * data.width / period)
        parameters.append(Parameter("background", max(level, 0.2 * step), step, 0.0))
    if bunching:
        parameters.append(Parameter("bunching", 0.3, 0.1, 0.0, 100.0))
        low, high = math.log(period / 5), math.log(max(span / 2, 2 * period))
        parameters.append(Parameter("reach", math.log(reach), 0.3, low, high))
    return parameters


def _level(place: Array, counts: Array) -> float:
    """Counts per bin between the peaks: of the tenth of the bins that lie furthest from any."""
    far = np.abs(place) >= np.quantile(np.abs(place), 0.9)
    return 0.8 * float(np.mean(counts[far]))
