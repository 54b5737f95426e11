"""Coincidences of a source that is pumped continuously: the dip at zero delay."""

from __future__ import annotations

import math
from collections.abc import Callable, Generator

import numpy as np

from .data import Coincidences, DataError
from .decay_start import coarse
from .engine import Fit, Parameter, fit_steps
from .g2_model import dip_share
from .noise import Array, Noise

#: Dip widths that are tried first.
TRIES = 14


def continuous_steps(
    data: Coincidences, jitter: float, bunching: bool, level: float
) -> Generator[None, None, tuple[Fit, Noise]]:
    """The fit of a dip. jitter: standard deviation [s]."""
    if data.times.size < 10:
        raise DataError("fewer than ten bins cannot be fitted", data.name)
    noise = Noise.poisson(data.counts)
    parameters = _parameters(data, jitter, bunching)
    yield None
    names = [one.name for one in parameters]
    model = _model(data, names, jitter)
    if not data.counting:
        fit = yield from fit_steps(model, noise, parameters, level=level)
        noise = noise.scaled_to(fit.expected, len(parameters))
    fit = yield from fit_steps(model, noise, parameters, wanted=names, level=level)
    return fit, noise


def _model(data: Coincidences, names: list[str], jitter: float) -> Callable[[Array], Array]:
    edges = np.stack([data.times - data.width / 2, data.times + data.width / 2])

    def model(p: Array) -> Array:
        given = dict(zip(names, p.tolist(), strict=True))
        more = given.get("bunching", 0.0)
        centre = given["centre"]
        decay = math.exp(given["decay"])
        dip = dip_share(edges=edges, decay=decay, jitter=jitter, centre=centre)
        shape = 1 - (1 - given["g2"] + more) * dip
        if more:
            reach = math.exp(given["decay"] + given["reach"])
            shape = shape + more * dip_share(edges=edges, decay=reach, jitter=jitter, centre=centre)
        return np.asarray(math.exp(given["level"]) * shape)

    return model


def _parameters(data: Coincidences, jitter: float, bunching: bool) -> list[Parameter]:
    """Where the fit starts: the best of a table of widths and centres."""
    level, centre, decay, depth = _deepest(data, jitter)
    span = float(data.times[-1] - data.times[0])
    low, high = math.log(data.width / 100), math.log(5 * span)
    central = min(max(1 - depth, 0.05), 0.95)
    parameters = [
        Parameter("g2", central, 0.05, 0.0),
        Parameter("level", math.log(level), 0.05),
        Parameter("decay", math.log(decay), 0.1, low, high),
        Parameter("centre", centre, 0.1 * decay, centre - span / 4, centre + span / 4),
    ]
    if bunching:
        parameters.append(Parameter("bunching", 0.2, 0.05, 0.0))
        far = max(math.log(span / 6 / decay), 1.0)
        parameters.append(Parameter("reach", far, 0.1, 0.2, far + 6))
    return parameters


def _deepest(data: Coincidences, jitter: float) -> tuple[float, float, float, float]:
    """Far level, centre, decay and depth of the dip that takes most of the deviance."""
    many, _ = coarse(data.counts)
    groups = np.arange(0, data.counts.size, max(min(many, data.counts.size // 60), 1))
    counts = np.add.reduceat(data.counts, groups)
    size = np.diff(np.append(groups, data.counts.size))
    times = np.add.reduceat(data.times, groups) / size
    rate = counts / size
    span = float(times[-1] - times[0])
    weight = size / max(float(np.mean(rate)), 1e-12)
    best = (-np.inf, float(np.mean(rate)), 0.0, span / 20, 0.5)
    for decay in np.geomspace(data.width, span / 4, TRIES):
        wide = math.hypot(decay, jitter)
        for centre in np.arange(times[0] + span / 8, times[-1] - span / 8, max(wide / 2, span / 300)):
            edges = np.stack([times - data.width / 2, times + data.width / 2])
            dip = dip_share(edges=edges, decay=decay, jitter=jitter, centre=float(centre))
            middle = np.sum(weight * dip) / np.sum(weight)
            slope = np.sum(weight * (dip - middle) * rate) / np.sum(weight * (dip - middle) ** 2)
            gain = slope**2 * np.sum(weight * (dip - middle) ** 2) if slope < 0 else 0.0
            far = float(np.sum(weight * rate) / np.sum(weight) - slope * middle)
            if gain > best[0] and far > 0:
                best = gain, far, float(centre), float(decay), min(max(-slope / far, 0.05), 1.0)
    if best[0] < 12:
        raise DataError("no dip stands out of the noise", data.name)
    return best[1:]
