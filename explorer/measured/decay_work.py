"""What the fit of a decay works on: the bins that are fitted, their model, and one exponential."""

from __future__ import annotations

import math
from collections.abc import Callable, Generator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .data import DataError, Decay
from .decay_model import (
    Convolved,
    bin_numbers,
    full_counts,
    half_width,
    on_grid,
    response_shares,
    tail_bins,
)
from .decay_start import TRIES, Start, best_start, rise_and_peak, tail_start
from .engine import Fit, Parameter, fit_steps
from .noise import Array, Noise

#: Fewest counts that a lifetime is taken from.
FEWEST = 30


@dataclass(frozen=True, eq=False)
class Work:
    """What a fit of a decay works on.

    where: indices of the fitted bins in the data, counts there. bins: (lifetime, shift in bins) ->
    shares of the events in the fitted bins. shift: by which the response was moved beforehand, bins.
    reach: furthest shift from there, bins. notes: cautions that are known beforehand.
    """

    where: NDArray[np.int64]
    counts: Array
    bins: Callable[[float, float], Array]
    width: float
    span: float
    counting: bool
    period: float | None
    convolved: bool
    shift: int = 0
    reach: float = 0.0
    response_width: float = 0.0
    notes: tuple[str, ...] = ()

    @property
    def noise(self) -> Noise:
        return Noise.poisson(self.counts)


def prepared(
    data: Decay, response: Decay | None, period: float | None, start: float | None
) -> Work:
    """The bins to fit and their model."""
    if np.sum(data.counts) < FEWEST:
        raise DataError(f"{np.sum(data.counts):g} counts are too few for a lifetime", data.name)
    where, notes = _fitted_bins(data, response is not None, period, start)
    bin_of = bin_numbers(data)[where]
    count = int(bin_of[-1] - bin_of[0]) + 1
    shared: dict[str, Any] = {
        "where": where,
        "counts": data.counts[where],
        "width": data.width,
        "span": count * data.width,
        "counting": data.counting,
        "period": period,
        "convolved": response is not None,
    }
    if response is not None:
        return _with_response(data, response, shared, bin_of, notes)

    def tail(lifetime: float, shift: float) -> Array:  # noqa: ARG001  # called like the other
        shares = tail_bins(count=count, width=data.width, lifetime=lifetime)[bin_of - bin_of[0]]
        # What earlier pulses left decays alike, so that they only raise the tail.
        earlier = 1.0 if period is None else -np.expm1(-period / lifetime)
        return np.asarray(shares / earlier)

    return Work(bins=tail, notes=notes, **shared)


def _fitted_bins(
    data: Decay, convolved: bool, period: float | None, start: float | None
) -> tuple[NDArray[np.int64], tuple[str, ...]]:
    """Indices of the bins that are fitted, and what to say of them."""
    numbers = bin_numbers(data)
    first = 0 if convolved else tail_start(full_counts(data))
    if start is not None:
        first = int(np.ceil((start - (data.times[0] - data.width / 2)) / data.width - 1e-6))
    use = numbers >= first
    notes: tuple[str, ...] = ()
    if period is not None:
        late = (numbers - max(first, 0)) * data.width >= period * (1 + 1e-9)
        if np.any(late):
            notes = ("bins more than a period after the first are left out",)
        use &= ~late
    where = np.flatnonzero(use)
    if where.size < 5:
        raise DataError("fewer than five bins follow the start of the fit", data.name)
    return where, notes


def _with_response(
    data: Decay,
    response: Decay,
    shared: dict[str, Any],
    bin_of: NDArray[np.int64],
    notes: tuple[str, ...],
) -> Work:
    """The model with a response, moved by whole bins so that the rises meet."""
    shares, at = response_shares(response, data.width)
    width = half_width(shares, data.width)
    rise, _ = rise_and_peak(full_counts(data))
    own, _ = rise_and_peak(shares * max(float(np.sum(response.counts)), 1e4))
    begin = data.times[0] - data.width / 2
    shift = round(rise - own - (at - begin) / data.width)
    if abs(shift) * data.width < 2 * width:  # what lies close is left as it was recorded
        shift = 0
    if np.sum(response.counts) < np.sum(data.counts):
        notes = (
            *notes,
            "the response holds fewer counts than the decay: its own noise is not in the intervals",
        )
    last = int(bin_of[-1]) + 1
    convolved = on_grid(data, response, shift, shared["period"])
    cut = Convolved(
        convolved.shares, convolved.before, convolved.part, last, data.width, convolved.period
    )

    def bins(lifetime: float, moved: float) -> Array:
        return cut.bins(lifetime, moved)[bin_of]

    reach = max(6.0, 3 * width / data.width)
    return Work(bins=bins, shift=shift, reach=reach, response_width=width, notes=notes, **shared)


def first_guess(work: Work, components: int) -> Start:
    """Lifetimes and shift to begin with."""
    low = max(work.width / 3, work.response_width / 20)
    lifetimes = np.geomspace(low, 2 * work.span, TRIES)
    shifts = np.linspace(-1, 1, 5) * work.reach / 3 if work.convolved else np.zeros(1)
    return best_start(work.bins, work.counts, lifetimes, shifts, components)


def flat_parameters(work: Work, guess: float, shift: float) -> list[Parameter]:
    """Parameters of the background and, with a response, of the shift."""
    step = max(0.1 * guess, math.sqrt(max(guess, 0.1) / work.counts.size))
    flat = [Parameter("background", guess + 0.1 * step, step, 0.0)]
    if work.convolved:
        flat.append(Parameter("shift", shift, 0.1, -work.reach, work.reach))
    return flat


def fit_single(
    work: Work, guess: Start, level: float, wanted: tuple[str, ...]
) -> Generator[None, None, tuple[Fit, Noise]]:
    """One exponential: ln τ, ln N, background, shift in bins."""
    events = math.log(max(guess.events[0], 1.0))
    low, high = math.log(work.width / 50), math.log(1000 * work.span)
    parameters = [
        Parameter("lifetime", math.log(guess.lifetimes[0]), 0.1, low, high),
        Parameter("events", events, 0.1, math.log(1e-3), events + 12),
        *flat_parameters(work, guess.background, guess.shift),
    ]

    def model(p: Array) -> Array:
        shift = p[3] if work.convolved else 0.0
        return np.asarray(math.exp(p[1]) * work.bins(math.exp(p[0]), shift) + p[2])

    names = [one.name for one in parameters]
    asked = tuple(name for name in wanted if name in names)
    noise = work.noise
    if not work.counting:
        fit = yield from fit_steps(model, noise, parameters, level=level)
        noise = noise.scaled_to(fit.expected, len(parameters))
    fit = yield from fit_steps(model, noise, parameters, wanted=asked, level=level)
    return fit, noise
