"""Coincidences of a source that is pumped continuously: the dip at zero delay."""

from __future__ import annotations

import math
from collections.abc import Callable, Generator

import numpy as np

from .data import Coincidences, DataError
from .engine import Fit, Parameter, fit_steps
from .g2_model import dip_share
from .noise import Array, Noise
from .spectrum_model import strongest_box

#: A dip stands out where it is this many standard deviations below the rest.
CLEAR = 3.0

#: The dip must lower the deviance of a flat level by this much: three standard deviations.
TELLING = 9.0


def continuous_steps(
    data: Coincidences, jitter: float, bunching: bool, level: float
) -> Generator[None, None, tuple[Fit, Noise]]:
    """The fit of a dip. jitter: standard deviation [s]."""
    if data.times.size < 10:
        raise DataError("fewer than ten bins cannot be fitted", data.name)
    noise = Noise.poisson(data.counts)
    parameters = _parameters(data, bunching)
    yield None
    names = [one.name for one in parameters]
    model = _model(data, names, jitter)
    if not data.counting:
        fit = yield from fit_steps(model, noise, parameters, level=level)
        noise = noise.scaled_to(fit.expected, len(parameters))
    wanted = [name for name in names if name not in ("level", "centre")]
    fit = yield from fit_steps(model, noise, parameters, wanted=wanted, level=level)
    flat = noise.deviance(np.full(data.counts.shape, float(np.mean(data.counts))))
    if flat - fit.deviance < TELLING:
        raise DataError("no dip stands out of the noise", data.name)
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


def _parameters(data: Coincidences, bunching: bool) -> list[Parameter]:
    """Where the fit starts: the stretch with fewest counts."""
    level, centre, decay, depth = _deepest(data)
    span = float(data.times[-1] - data.times[0])
    low, high = math.log(data.width / 100), math.log(5 * span)
    central = min(max(1 - depth, 0.05), 0.95)
    parameters = [
        Parameter("g2", central, 0.05, 0.0),
        Parameter("level", math.log(level), 0.05, math.log(level) - 6, math.log(level) + 6),
        Parameter("decay", math.log(decay), 0.1, low, high),
        Parameter("centre", centre, 0.1 * decay, centre - span / 4, centre + span / 4),
    ]
    if bunching:
        parameters.append(Parameter("bunching", 0.2, 0.05, 0.0, 100.0))
        longest = max(math.log(span / 2 / decay), 1.0)
        parameters.append(Parameter("reach", max(longest - 1, 0.7), 0.1, 0.2, longest))
    return parameters


def _deepest(data: Coincidences) -> tuple[float, float, float, float]:
    """Far level, centre, decay and depth of the stretch whose lack of counts stands out most."""
    blocks = np.array_split(data.counts, min(20, data.counts.size // 4))
    level = max(float(np.quantile([np.mean(block) for block in blocks], 0.75)), 1e-9)
    lack, noise = level - data.counts, np.full(data.counts.shape, level)
    centre, width, area, score = strongest_box(data.times, lack, noise, data.width)
    if score < CLEAR:
        raise DataError("no dip stands out of the noise", data.name)
    decay = width / (2 * math.log(2))
    depth = area / (2 * decay * level)
    return level, centre, decay, min(max(depth, 0.05), 0.95)
