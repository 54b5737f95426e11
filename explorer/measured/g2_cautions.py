"""What to beware of in fitted coincidences, a sentence each."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from ..built import Estimate
from .data import Coincidences
from .engine import Fit
from .fitted import RARE, common_cautions
from .noise import Noise

#: Fewer coincidences than this at zero delay are said to be few.
FEW = 20.0

#: A dip that lowers the deviance of a flat level by less than this hardly stands out.
HARDLY = 25.0

WORDS = {
    "g2": "g²(0)",
    "area": "the height of the peaks",
    "level": "the far level",
    "decay": "the decay time",
    "period": "the period",
    "centre": "the centre",
    "background": "the background",
    "bunching": "the bunching",
    "reach": "the time of the bunching",
}


def g2_cautions(
    data: Coincidences,
    fields: Mapping[str, Any],
    fit: Fit,
    noise: Noise,
    pulsed: bool,
    jitter: float,
    emitter: Estimate,
    side: float | None,
) -> tuple[str, ...]:
    """Sentences; none where all is well. jitter: standard deviation [s]."""
    told = common_cautions(fields, fit, WORDS)
    decay = math.exp(fit["decay"])
    told += (
        _pulsed(data, fit, decay, side) if pulsed else _continuous(data, fit, decay, jitter, noise)
    )
    if "g2" in fit.at_limit:
        told.append("g²(0) came out at its limit of zero: take the upper end as a limit")
    if emitter.value < 0 <= fit["g2"]:
        told.append("the emitter's own g²(0) is below zero: the signal share is taken too small")
    if noise.scaled:
        told.append(
            "the numbers are not whole counts: the size of their noise is taken from the residuals"
        )
    return tuple(told)


def _pulsed(data: Coincidences, fit: Fit, decay: float, side: float | None) -> list[str]:
    told = []
    period = fit["period"]
    near = np.abs(data.times - fit["centre"]) <= period / 2
    central = float(np.sum(data.counts[near]))
    if central < FEW and data.counting:
        told.append(f"only {central:g} coincidences lie in the central period")
    if decay > period / 5:
        told.append(
            f"neighbouring peaks overlap (decay {decay / period:.2f} of the period): "
            "g²(0), background and decay time hang together"
        )
    if side is not None and side < RARE and "bunching" not in fit.names:
        told.append(
            f"the side peaks are not equal (p = {side:.1g}): the emitter blinks, or the rate drifted; "
            "try bunching"
        )
    if not near.any():
        told.append("zero delay is not in the data")
    told += _bunching(fit)
    return told


def _bunching(fit: Fit) -> list[str]:
    if {"bunching", "reach"} & (fit.at_limit | fit.unsure) or (
        "bunching" in fit.estimates and fit.estimates["bunching"].low <= 0
    ):
        return ["the bunching is not determined: fit without it, or take data to longer delays"]
    return []


def _continuous(
    data: Coincidences, fit: Fit, decay: float, jitter: float, noise: Noise
) -> list[str]:
    told = []
    flat = noise.deviance(np.full(data.counts.shape, float(np.mean(data.counts))))
    if flat - fit.deviance < HARDLY:
        told.append("the dip hardly stands out of the noise: take g²(0) as a limit")
    near = np.abs(data.times - fit["centre"]) <= decay / 2
    central = float(np.sum(data.counts[near]))
    if central < FEW and data.counting:
        told.append(f"only {central:g} coincidences lie in the dip")
    if 2 * decay < 3 * data.width:
        told.append("the dip is narrower than three bins: its depth hangs on the model")
    if jitter > 0.6 * decay:  # about where its FWHM is that of the dip
        told.append(
            "the jitter is wider than the dip: its depth hangs on how well the jitter is known"
        )
    if jitter == 0 and 2 * decay < 10 * data.width:
        told.append("no jitter is given and the dip is only a few bins wide: g²(0) may be too high")
    span = min(data.times[-1] - fit["centre"], fit["centre"] - data.times[0])
    if span < 4 * decay:
        told.append(
            f"the far level is not reached: the data end {span / decay:.1f} decay times from zero"
        )
    return told
