"""What to beware of in a fitted decay, a sentence each."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from .decay_pair import Pair
from .decay_work import Work
from .engine import Fit
from .fitted import common_cautions
from .noise import Noise

#: Two exponentials must lower the deviance by this much: 1 in 100 of χ² with two degrees.
TELLING = 9.21

#: A fit reaches the background after this many lifetimes.
DOWN = 4.0

WORDS = {
    "first": "a lifetime",
    "second": "a lifetime",
    "share": "the shares",
    "mean": "the mean time",
    "rate": "the first slope",
}


def decay_cautions(
    work: Work,
    fields: Mapping[str, Any],
    fit: Fit,
    noise: Noise,
    pair: Pair,
    single: Fit | None,
) -> tuple[str, ...]:
    """Sentences; none where all is well. single: the fit of one exponential, where there are two."""
    told = common_cautions(fields, fit, WORDS) + list(work.notes)
    shortest, longest = pair.lifetimes[-1].value, pair.lifetimes[0].value
    if work.convolved and shortest < work.response_width:
        told.append(
            f"the lifetime of {_time(shortest)} is shorter than the response is wide "
            f"({_time(work.response_width)}): it hangs on how well the response was measured"
        )
    if shortest < 3 * work.width:
        told.append(f"the lifetime of {_time(shortest)} is shorter than three bins")
    if work.span < DOWN * longest:
        told.append(
            f"the background is not reached: the data end after {work.span / longest:.1f} lifetimes"
        )
    if single is not None:
        told += _pair_cautions(fit, noise, pair, single, work)
    if work.convolved and "shift" in fit.at_limit:
        told.append("the response does not fit the rise: its shift ran into its limit")
    if not work.counting:
        told.append(
            "the numbers are not whole counts: the size of their noise is taken from the residuals"
        )
    return tuple(told)


def _pair_cautions(fit: Fit, noise: Noise, pair: Pair, single: Fit, work: Work) -> list[str]:
    told = []
    slow, fast = pair.lifetimes
    better = noise.deviance(single.expected) - fit.deviance
    lost = min(share.low for share in pair.shares) <= 1e-6
    if better < TELLING or lost or slow.low < fast.high:
        told.append(
            "the two lifetimes cannot be told apart: one exponential describes the data about as well"
            if better < TELLING
            else "the two lifetimes cannot be told apart: their intervals meet"
        )
    if not work.convolved:
        told.append(
            "the amplitudes, the mean time and the first slope count from the start of the fit, "
            "not from the pulse"
        )
    return told


def _time(seconds: float) -> str:
    """A time as a person writes it."""
    for unit, scale in (("ps", 1e12), ("ns", 1e9), ("µs", 1e6), ("ms", 1e3)):
        if abs(seconds) * scale < 1000:
            return f"{float(np.format_float_positional(seconds * scale, 3, fractional=False)):g} {unit}"
    return f"{seconds:.3g} s"
