"""Fits against synthetic data of known truth: no bias, and intervals that hold what they say.

Every set has its own fixed seed. Total counts go round 1e3, 1e4, 1e5 and 1e6, where a kind says no
other. The data are drawn event by event (measured_truth.py), without the fits' own models.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest

from explorer.built import Estimate
from explorer.measured.decay import fit_decay
from explorer.measured.g2 import fit_g2
from explorer.measured.spectrum import fit_spectrum
from explorer.measured.spectrum_model import total_width

from . import measured_truth as truth

pytestmark = pytest.mark.slow

SETS = 500
LEVEL = 0.95
ALL = (1e3, 1e4, 1e5, 1e6)
RICH = (1e4, 1e5, 1e6)


@dataclass(frozen=True)
class Kind:
    """What is drawn at a total number of counts, how it is fitted, and what must come out."""

    draw: Callable[[np.random.Generator, float], Any]
    fit: Callable[[Any], Any]
    truths: dict[str, tuple[Callable[[Any], Estimate], float]]
    totals: tuple[float, ...] = ALL


def response() -> Any:
    """A response of so many counts that its own noise does not matter."""
    return truth.response(np.random.default_rng(99), 3e7, 0.3e-9)


def lifetime(fit: Any) -> Estimate:
    return Estimate(fit.lifetime, fit.low, fit.high)


def g2(fit: Any) -> Estimate:
    return Estimate(fit.g2_zero, fit.low, fit.high)


def named(name: str) -> Callable[[Any], Estimate]:
    def of(fit: Any) -> Estimate:
        estimate: Estimate = getattr(fit, name)
        return estimate

    return of


PAIR, WEIGHTS = (6e-9, 1e-9), (0.4, 0.6)
ONE_LINE = ((640e-9, 6e-9, 1.0),)
TWO_LINES = ((625e-9, 2e-9, 0.4), (645e-9, 15e-9, 0.6))
WIDTHS: dict[str, tuple[Callable[[Any], Estimate], float]] = {
    "centre": (named("centre"), 640e-9),
    "fast": (named("fast_linewidth"), 6e-9),
    "slow": (named("slow_linewidth"), 5e-9),
    "total": (named("total_fwhm"), total_width(6e-9, 5e-9, 640e-9)),
}


def kinds() -> dict[str, Kind]:
    measured = response()
    return {
        "decay, tail": Kind(truth.decay, fit_decay, {"lifetime": (lifetime, 3e-9)}),
        "decay, response": Kind(
            lambda rng, total: truth.decay(rng, total, response=0.3e-9),
            lambda data: fit_decay(data, measured),
            {"lifetime": (lifetime, 3e-9)},
        ),
        # Below 1e4 counts a background of a twentieth and the slow part pass for each other.
        "decay, two exponentials": Kind(
            lambda rng, total: truth.decay(rng, total, PAIR, WEIGHTS, response=0.3e-9),
            lambda data: fit_decay(data, measured, 2),
            {
                "mean": (lifetime, 0.4 * 6e-9 + 0.6 * 1e-9),
                "first slope": (named("initial_rate"), 0.4 / 6e-9 + 0.6 / 1e-9),
                "slow": (lambda fit: fit.lifetimes[0], 6e-9),
                "fast": (lambda fit: fit.lifetimes[1], 1e-9),
                "share": (lambda fit: fit.shares[0], 0.4),
            },
            RICH,
        ),
        "spectrum, lorentzian": Kind(
            lambda rng, total: truth.spectrum(rng, total, ONE_LINE, 0.0),
            lambda data: fit_spectrum(data, shape="lorentzian"),
            {"centre": WIDTHS["centre"], "fast": WIDTHS["fast"]},
            (1e3,),
        ),
        "spectrum, voigt": Kind(
            lambda rng, total: truth.spectrum(rng, total, ONE_LINE, 5e-9),
            fit_spectrum,
            WIDTHS,
            RICH,
        ),
        "spectrum, voigt, dark counts taken away": Kind(
            lambda rng, total: truth.spectrum(rng, total, ONE_LINE, 5e-9, dark=2.0),
            fit_spectrum,
            {"fast": WIDTHS["fast"], "slow": WIDTHS["slow"]},
            RICH,
        ),
        "spectrum, zero-phonon line and sideband": Kind(
            lambda rng, total: truth.spectrum(rng, total, TWO_LINES, 2.5e-9),
            lambda data: fit_spectrum(data, sidebands=1),
            {
                "centre": (named("centre"), 625e-9),
                "fast": (named("fast_linewidth"), 2e-9),
                "slow": (named("slow_linewidth"), 2.5e-9),
                "share": (lambda fit: fit.lines[0][0], 0.4),
                "offset": (lambda fit: fit.lines[1][1], 20e-9),
                "sideband": (lambda fit: fit.lines[1][2], 15e-9),
            },
            RICH,
        ),
        "g2, pulsed": Kind(
            lambda rng, total: truth.pulsed(rng, total, 0.2),
            lambda data: fit_g2(data, jitter=0.5e-9, background=False),
            {"g2": (g2, 0.2), "decay": (named("decay_time"), 3e-9)},
        ),
        "g2, pulsed, background": Kind(
            lambda rng, total: truth.pulsed(rng, total, 0.3, background=0.2),
            lambda data: fit_g2(data, jitter=0.5e-9, period=50e-9),
            {"g2": (g2, 0.3), "decay": (named("decay_time"), 3e-9)},
        ),
        "g2, continuous": Kind(
            lambda rng, total: truth.continuous(rng, total, 0.3),
            lambda data: fit_g2(data, pumping="continuous", jitter=1e-9),
            {"g2": (g2, 0.3), "decay": (named("decay_time"), 8e-9)},
        ),
        "g2, continuous, background": Kind(
            lambda rng, total: truth.continuous(rng, total, 0.2, signal_share=0.95),
            lambda data: fit_g2(data, pumping="continuous", jitter=1e-9, signal_share=0.95),
            {"g2": (named("emitter_g2_zero"), 0.2), "decay": (named("decay_time"), 8e-9)},
        ),
    }


NAMES = tuple(kinds())


@pytest.mark.parametrize("name", NAMES)
def test_no_bias_and_honest_intervals(name: str, record_property: Any) -> None:
    kind = kinds()[name]
    found: dict[str, list[tuple[float, float, bool]]] = {key: [] for key in kind.truths}
    for number in range(SETS):
        total = kind.totals[number % len(kind.totals)]
        fit = kind.fit(kind.draw(np.random.default_rng([7, number]), total))
        for key, (read, true) in kind.truths.items():
            one = read(fit)
            found[key].append((total, one.value - true, one.low <= true <= one.high))
    margin = 3 * (LEVEL * (1 - LEVEL) / SETS) ** 0.5
    for key, rows in found.items():
        bias = mean_error(rows)
        coverage = sum(inside for _, _, inside in rows) / SETS
        record_property(key, f"bias {bias:+.3f} standard errors, coverage {coverage:.3f}")
        assert abs(bias) < 0.2, f"{key}: bias of {bias:+.3f} standard errors"
        assert abs(coverage - LEVEL) < margin, (
            f"{key}: {coverage:.3f} of the intervals hold the truth"
        )


def mean_error(rows: list[tuple[float, float, bool]]) -> float:
    """Mean error over the spread of the estimates at the same number of counts."""
    totals = np.array([total for total, _, _ in rows])
    errors = np.array([error for _, error, _ in rows])
    for total in np.unique(totals):
        same = totals == total
        errors[same] /= np.std(errors[same], ddof=1)
    return float(np.mean(errors))
