"""Lifetimes from a histogram of arrival times: one or two exponentials, after a response or its tail."""

from __future__ import annotations

import math
from collections.abc import Generator, Iterator
from dataclasses import dataclass

from ..built import Estimate
from ..domain import InputError, finite_number
from .data import DataError, Decay
from .decay_cautions import decay_cautions
from .decay_model import checked_period
from .decay_pair import Pair, fit_pair
from .decay_work import FEWEST, Work, first_guess, fit_single, prepared
from .engine import Fit, checked_level, finish
from .fitted import Fitted, common, mapped
from .noise import Noise


@dataclass(frozen=True, eq=False, kw_only=True)
class DecayFit(Fitted):
    r"""A fitted decay :math:`\sum_i a_i e^{-t/\tau_i}` on a flat background.

    lifetime, low, high: with one component its lifetime, with two the mean time in the excited state
    Σaτ/Σa [s], with its interval. lifetimes [s], longest first, and shares Σa = 1 of their
    amplitudes. initial_rate: Σ(a/τ)/Σa, the first slope of the decay [1/s]. background: counts per
    bin. shift: by which the response was moved to later times [s], None without one. start: first
    time of the fit [s]; without a response it is the time zero of the amplitudes. components: one
    or two. width: of a bin [s].
    """

    lifetime: float
    low: float
    high: float
    lifetimes: tuple[Estimate, ...]
    shares: tuple[Estimate, ...]
    initial_rate: Estimate
    background: Estimate
    shift: Estimate | None
    start: float
    components: int
    width: float


def fit_decay(
    data: Decay,
    response: Decay | None = None,
    components: int = 1,
    *,
    period: float | None = None,
    start: float | None = None,
    level: float = 0.95,
) -> DecayFit:
    """A decay fitted by Poisson maximum likelihood, with intervals of its profile.

    response: histogram of the instrument's response; the decay is convolved with it and moved in
    time. Without one the tail is fitted, from `start` [s], which is past the rise if not given (with
    a response: from the first bin). components: 1 or 2 exponentials. period: of the pulses [s], so
    that what is left of earlier ones counts. level: of confidence of the intervals. A histogram that
    does not hold whole counts is taken to have a variance in proportion to the expectation, of a size
    that follows from the residuals. Raises InputError and DataError.
    """
    steps = fit_decay_steps(data, response, components, period=period, start=start, level=level)
    return finish(steps)


def fit_decay_steps(
    data: Decay,
    response: Decay | None = None,
    components: int = 1,
    *,
    period: float | None = None,
    start: float | None = None,
    level: float = 0.95,
) -> Iterator[DecayFit | None]:
    """The same in slices of some 30 ms: yields None between them, and the fit last."""
    if not isinstance(data, Decay) or not (response is None or isinstance(response, Decay)):
        raise InputError("fit_decay wants a Decay, and as response another Decay or None")
    if components not in (1, 2) or isinstance(components, bool):
        raise InputError(f"components = {components!r} is not 1 or 2")
    level = checked_level(level)
    for what, value in (("period", period), ("start", start)):
        if value is not None:
            finite_number(value, what)
    checked_period(period, data)
    work = prepared(data, response, period, start)
    yield None
    yield (yield from _fitted(work, data, components, level))


def _fitted(
    work: Work, data: Decay, components: int, level: float
) -> Generator[None, None, DecayFit]:
    guess = first_guess(work, 1)
    yield None
    wanted = ("lifetime", "background", "shift") if components == 1 else ()
    single, noise = yield from fit_single(work, guess, level, wanted)
    if math.exp(single["events"]) < FEWEST / 3:
        raise DataError("the counts show no decay above a flat background", data.name)
    if components == 1:
        lifetime = mapped(single.estimates["lifetime"], math.exp)
        rate = mapped(lifetime, lambda value: 1 / value)
        pair = Pair((lifetime,), (Estimate(1.0, 1.0, 1.0),), lifetime, rate)
        return _result(work, data, single, noise, level, pair)
    guess = first_guess(work, 2)
    yield None
    fit, noise, pair = yield from fit_pair(work, guess, single, level)
    return _result(work, data, fit, noise, level, pair, single)


def _result(
    work: Work,
    data: Decay,
    fit: Fit,
    noise: Noise,
    level: float,
    pair: Pair,
    single: Fit | None = None,
) -> DecayFit:
    fields = common(data, level, fit, noise, work.where)
    shift = None
    if work.convolved:
        shift = mapped(fit.estimates["shift"], lambda bins: (bins + work.shift) * work.width)
    return DecayFit(
        **fields,
        cautions=decay_cautions(work, fields, fit, noise, pair, single),
        lifetime=pair.mean.value,
        low=pair.mean.low,
        high=pair.mean.high,
        lifetimes=pair.lifetimes,
        shares=pair.shares,
        initial_rate=pair.rate,
        background=fit.estimates["background"],
        shift=shift,
        start=float(data.times[work.where[0]] - data.width / 2),
        components=len(pair.lifetimes),
        width=data.width,
    )
