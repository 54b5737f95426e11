"""g²(0) from a histogram of coincidences, pulsed or continuous, with the interval of its profile."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ..built import Estimate
from ..domain import InputError, finite_number, quoted
from .data import Coincidences, DataError
from .decay_model import bin_numbers
from .engine import Fit, checked_level, finish
from .fitted import Fitted, common, mapped
from .g2_cautions import g2_cautions
from .g2_continuous import continuous_steps
from .g2_pulsed import pulsed_steps
from .g2_start import window_areas
from .noise import Noise

#: Standard deviation of a Gaussian over its FWHM.
DEVIATION = 1 / (2 * math.sqrt(2 * math.log(2)))

#: Fewest coincidences that a fit is made of.
FEWEST = 30


@dataclass(frozen=True, eq=False, kw_only=True)
class G2Fit(Fitted):
    r"""Fitted coincidences.

    g2_zero, low, high: as detected. Pulsed: the central peak over the far side peaks, the flat
    background taken away (it comes from counts that know nothing of the pulses); where bunching is
    fitted, the side peaks near the centre are higher than the far ones. Continuous: the value at zero
    delay over that at far delays, freed of the jitter, flat counts included. emitter_g2_zero:
    1 + (g2_zero − 1)/ρ², ρ = signal_share: Brouri et al., Opt. Lett. 25, 1294 (2000). decay_time: of
    the peaks or the dip [s]. centre: delay of zero [s]. level: counts of a far peak, or per bin at far
    delays. background: counts per bin, None where none is fitted. period [s], None where continuous.
    bunching, bunching_time [s]: its height over the far level and its decay, or None. areas, pulsed:
    (delay, counts, error) in windows of one period, and window_g2 the central one over the mean of
    the others: no model, background included; None without such windows. side_p_value: chance that
    side peaks as unequal come of noise, None with fewer than two. g², decay_time, background and
    bunching have intervals of their profiles, centre, far_level and period of their standard errors.
    """

    g2_zero: float
    low: float
    high: float
    emitter_g2_zero: Estimate
    decay_time: Estimate
    centre: Estimate
    far_level: Estimate
    background: Estimate | None
    period: Estimate | None
    bunching: Estimate | None
    bunching_time: Estimate | None
    areas: tuple[tuple[float, float, float], ...]
    window_g2: float | None
    side_p_value: float | None
    pumping: str
    signal_share: float


def fit_g2(
    data: Coincidences,
    *,
    pumping: str = "pulsed",
    period: float | None = None,
    jitter: float = 0.0,
    background: bool = True,
    bunching: bool = False,
    signal_share: float = 1.0,
    level: float = 0.95,
) -> G2Fit:
    """g²(0) by Poisson maximum likelihood, with the interval of its profile.

    pumping: "pulsed" or "continuous". period: of the pulses [s], found in the data if not given.
    jitter: FWHM of the timing response of both detectors together [s], taken as Gaussian. background:
    whether flat counts are fitted under the peaks (pulsed). bunching: whether side peaks, or the
    shoulders of the dip, may fall off to a far level. signal_share: share of the detected counts that
    is the emitter's, (0, 1]; pulsed, of those that come with the pulses. Raises InputError, DataError.
    """
    return finish(
        fit_g2_steps(
            data,
            pumping=pumping,
            period=period,
            jitter=jitter,
            background=background,
            bunching=bunching,
            signal_share=signal_share,
            level=level,
        )
    )


def fit_g2_steps(
    data: Coincidences,
    *,
    pumping: str = "pulsed",
    period: float | None = None,
    jitter: float = 0.0,
    background: bool = True,
    bunching: bool = False,
    signal_share: float = 1.0,
    level: float = 0.95,
) -> Iterator[G2Fit | None]:
    """The same in slices of some 30 ms: yields None between them, and the fit last."""
    if not isinstance(data, Coincidences):
        raise InputError("fit_g2 wants Coincidences")
    if pumping not in ("pulsed", "continuous"):
        raise InputError(f"pumping = {quoted(pumping)} is not 'pulsed' or 'continuous'")
    level, share = checked_level(level), finite_number(signal_share, "signal_share")
    if not 0 < share <= 1:
        raise InputError(f"signal_share = {share:g} is outside its range: above 0 to 1")
    spread = finite_number(jitter, "jitter") * DEVIATION
    if spread < 0:
        raise InputError(f"jitter = {jitter:g} s is below 0")
    if period is not None and finite_number(period, "period") < 4 * data.width:
        raise InputError(f"period = {period:g} s is shorter than four bins of the histogram")
    bin_numbers(data)
    if np.sum(data.counts) < FEWEST:
        raise DataError(f"{np.sum(data.counts):g} coincidences are too few to fit", data.name)
    yield None
    if pumping == "pulsed":
        fit, noise = yield from pulsed_steps(data, period, spread, background, bunching, level)
    else:
        fit, noise = yield from continuous_steps(data, spread, bunching, level)
    yield _result(data, fit, noise, pumping, spread, share, level)


def _result(
    data: Coincidences,
    fit: Fit,
    noise: Noise,
    pumping: str,
    jitter: float,
    share: float,
    level: float,
) -> G2Fit:
    of = {name: fit.estimates.get(name, fit.normal(name, level)) for name in fit.names}
    g2 = of["g2"]
    pulsed = pumping == "pulsed"
    fields = common(data, level, fit, noise)
    reach = None
    if "reach" in of:
        factor = 1.0 if pulsed else math.exp(fit["decay"])
        reach = mapped(of["reach"], lambda value: math.exp(value) * factor)
    windows = window_areas(data, fit["centre"], fit["period"]) if pulsed else ()
    ratio, side = _windows(windows)
    emitter = mapped(g2, lambda value: 1 + (value - 1) / share**2)
    areas = (
        tuple((fit["centre"] + one * fit["period"], area, error) for one, area, error in windows)
        if pulsed
        else ()
    )
    return G2Fit(
        **fields,
        cautions=g2_cautions(data, fields, fit, noise, pulsed, jitter, emitter, side),
        g2_zero=g2.value,
        low=g2.low,
        high=g2.high,
        emitter_g2_zero=emitter,
        decay_time=mapped(of["decay"], math.exp),
        centre=of["centre"],
        far_level=mapped(of["area" if pulsed else "level"], math.exp),
        background=of.get("background"),
        period=of.get("period"),
        bunching=of.get("bunching"),
        bunching_time=reach,
        areas=areas,
        window_g2=ratio,
        side_p_value=side,
        pumping=pumping,
        signal_share=share,
    )


def _windows(
    windows: tuple[tuple[int, float, float], ...],
) -> tuple[float | None, float | None]:
    """Central window over the mean of the others, and the chance that those are so unequal."""
    from scipy.special import chdtrc

    centre = [area for number, area, _ in windows if number == 0]
    sides = np.array([area for number, area, _ in windows if number != 0])
    ratio = centre[0] / float(np.mean(sides)) if centre and sides.size and np.mean(sides) else None
    if sides.size < 2 or np.mean(sides) <= 0:
        return ratio, None
    unequal = float(np.sum((sides - np.mean(sides)) ** 2) / np.mean(sides))
    return ratio, float(chdtrc(sides.size - 1, unequal))
