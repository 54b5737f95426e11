"""Two exponentials: fitted in three sets of parameters, so that each wanted number has its profile."""

from __future__ import annotations

import math
from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np

from ..built import Estimate
from .decay_start import Start
from .decay_work import Work, flat_parameters
from .engine import Fit, Parameter, fit_steps
from .fitted import mapped
from .noise import Array, Noise

#: Furthest that a lifetime may lie from the mean one, in its logarithm.
FAR = 12.0


@dataclass(frozen=True)
class Pair:
    """Lifetimes, longest first [s], shares of their amplitudes, mean time [s], first slope [1/s]."""

    lifetimes: tuple[Estimate, ...]
    shares: tuple[Estimate, ...]
    mean: Estimate
    rate: Estimate


def _of_lifetimes(p: Array) -> tuple[float, float, float]:
    """ln τ1, ln τ2, share of the first amplitude -> τ1, τ2, share."""
    return math.exp(p[0]), math.exp(p[1]), float(p[2])


def _of_mean(p: Array) -> tuple[float, float, float]:
    """ln of the mean time, ln(τ1/mean) >= 0, ln(mean/τ2) >= 0 -> the same."""
    up, down = math.expm1(p[1]), -math.expm1(-p[2])
    share = down / (up + down) if up + down > 0 else 0.5
    return math.exp(p[0] + p[1]), math.exp(p[0] - p[2]), share


def _of_slope(p: Array) -> tuple[float, float, float]:
    """ln of the inverse first slope, ln(τ1·slope) >= 0, ln(1/(τ2·slope)) >= 0 -> the same."""
    up, down = -math.expm1(-p[1]), math.expm1(p[2])
    share = down / (up + down) if up + down > 0 else 0.5
    return math.exp(p[0] + p[1]), math.exp(p[0] - p[2]), share


def fit_pair(
    work: Work, guess: Start, single: Fit, level: float
) -> Generator[None, None, tuple[Fit, Noise, Pair]]:
    """Two exponentials. single: the fit of one. Returns the fit, its noise and what it found."""
    first, second, share = _begin(guess, single, work)
    events = math.log(max(sum(guess.events), 1.0))
    flat = flat_parameters(work, guess.background, guess.shift)
    low, high = math.log(work.width / 50), math.log(1000 * work.span)
    shapes = [
        Parameter("first", math.log(first), 0.1, low, high),
        Parameter("second", math.log(second), 0.1, low, high),
        Parameter("share", share, 0.05, 0.0, 1.0),
    ]
    rest = [Parameter("events", events, 0.1, math.log(1e-3), events + 12), *flat]
    noise = work.noise
    if not work.counting:
        fit = yield from fit_steps(
            _model(work, _of_lifetimes), noise, [*shapes, *rest], level=level
        )
        noise = noise.scaled_to(fit.expected, len(shapes) + len(rest))
    wanted = ("first", "second", "share", *(one.name for one in flat))
    fit = yield from fit_steps(
        _model(work, _of_lifetimes), noise, [*shapes, *rest], wanted=wanted, level=level
    )
    begun = _sorted(fit)
    mean, sure = yield from _profile(work, noise, fit, begun, _of_mean, level)
    rate, sure_too = yield from _profile(work, noise, fit, begun, _of_slope, level)
    unsure = (
        set(fit.unsure) | ({"mean"} if not sure else set()) | ({"rate"} if not sure_too else set())
    )
    object.__setattr__(fit, "unsure", frozenset(unsure))
    return fit, noise, _pair(fit, mean, mapped(rate, lambda value: 1 / value))


def _model(
    work: Work, shape: Callable[[Array], tuple[float, float, float]]
) -> Callable[[Array], Array]:
    def model(p: Array) -> Array:
        first, second, share = shape(p)
        one = share * first / (share * first + (1 - share) * second)
        shift = p[5] if work.convolved else 0.0
        both = one * work.bins(first, shift) + (1 - one) * work.bins(second, shift)
        return np.asarray(math.exp(p[3]) * both + p[4])

    return model


def _begin(guess: Start, single: Fit, work: Work) -> tuple[float, float, float]:
    """Two lifetimes and the share of the first amplitude to begin with."""
    if len(guess.lifetimes) == 2 and min(guess.events) > 0:
        first, second = guess.lifetimes
        heights = guess.events[0] / first, guess.events[1] / second
        return first, second, float(np.clip(heights[0] / sum(heights), 0.02, 0.98))
    one = math.exp(single["lifetime"])
    return min(1.3 * one, 500 * work.span), max(one / 3, work.width / 25), 0.7


def _sorted(fit: Fit) -> tuple[float, float, float]:
    first, second, share = math.exp(fit["first"]), math.exp(fit["second"]), fit["share"]
    return (first, second, share) if first >= second else (second, first, 1 - share)


def _profile(
    work: Work,
    noise: Noise,
    fit: Fit,
    begun: tuple[float, float, float],
    shape: Callable[[Array], tuple[float, float, float]],
    level: float,
) -> Generator[None, None, tuple[Estimate, bool]]:
    """The mean time, or the inverse of the first slope, with the interval of its profile."""
    first, second, share = begun
    middle = share * first + (1 - share) * second
    if shape is _of_slope:
        middle = 1 / (share / first + (1 - share) / second)
    start = [
        math.log(middle),
        max(math.log(first / middle), 1e-4),
        max(math.log(middle / second), 1e-4),
    ]
    parameters = [
        Parameter("middle", start[0], 0.1),
        Parameter("up", start[1], 0.1, 0.0, FAR),
        Parameter("down", start[2], 0.1, 0.0, FAR),
        *_again(fit),
    ]
    found = yield from fit_steps(
        _model(work, shape), noise, parameters, wanted=("middle",), level=level
    )
    return mapped(found.estimates["middle"], math.exp), "middle" not in found.unsure


def _again(fit: Fit) -> list[Parameter]:
    """The parameters past the first three, from where the fit has them."""
    again = []
    for name in fit.names[3:]:
        step = max(fit.error(name), 1e-6 * abs(fit[name]), 1e-9)
        low = 0.0 if name == "background" else -math.inf
        again.append(Parameter(name, max(fit[name], low), step, low))
    return again


def _pair(fit: Fit, mean: Estimate, rate: Estimate) -> Pair:
    lifetimes = [mapped(fit.estimates[name], math.exp) for name in ("first", "second")]
    shares = [fit.estimates["share"], mapped(fit.estimates["share"], lambda share: 1 - share)]
    if lifetimes[0].value < lifetimes[1].value:
        lifetimes.reverse()
        shares.reverse()
    return Pair(tuple(lifetimes), tuple(shares), mean, rate)
