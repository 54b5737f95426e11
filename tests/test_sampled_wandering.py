"""The light past the mode of a measured spectrum that wanders, against three other ways to it."""

from __future__ import annotations

import itertools
import math
from typing import Any

import mpmath
import numpy as np
import pytest
from numpy.typing import NDArray

from explorer import Lines, Samples, evaluate
from explorer.physics.sampled import window_share
from explorer.physics.sampled_wandering import PIECES_AT_ONCE, wandering_share
from explorer.physics.window_line import line_window

Array = NDArray[np.float64]


def spectrum(rng: np.random.Generator, size: int) -> tuple[Array, Array]:
    """Unevenly spaced samples of noise with gaps, ends above zero."""
    omega = np.sort(rng.uniform(-1, 1, size)) * 10 ** rng.uniform(11, 14)
    density = rng.uniform(0, 1, size) ** 3 * (rng.random(size) > 0.3)
    density[0] += 0.1
    return omega, density / np.trapezoid(density, omega)


def precise(omega: Array, density: Array, edge: float, sigma: float) -> Any:
    """Light below an edge, from the iterated integrals of the normal distribution, 60 digits."""

    def once(z: Any) -> Any:
        return z * mpmath.ncdf(z) + mpmath.npdf(z)

    def twice(z: Any) -> Any:
        return ((z**2 + 1) * mpmath.ncdf(z) + z * mpmath.npdf(z)) / 2

    width, total = mpmath.mpf(sigma), mpmath.mpf(0)
    nodes = [
        (mpmath.mpf(float(a)), mpmath.mpf(float(s))) for a, s in zip(omega, density, strict=True)
    ]
    for (a, below), (b, above) in itertools.pairwise(nodes):
        start, stop = (edge - a) / width, (edge - b) / width
        total += width * (below * once(start) - above * once(stop))
        total += width**2 * (above - below) / (b - a) * (twice(start) - twice(stop))
    return total


def test_against_arbitrary_precision() -> None:
    """Wandering from 1e-7 to 1000 times the spectrum, windows from far narrower to far wider."""
    rng, worst, counted = np.random.default_rng(31), 0.0, 0
    with mpmath.workdps(60):
        for _ in range(150):
            omega, density = spectrum(rng, int(rng.integers(2, 30)))
            size = omega[-1] - omega[0]
            sigma = float(size * 10 ** rng.uniform(-7, 3))
            middle = rng.uniform(omega[0] - 3 * sigma, omega[-1] + 3 * sigma)
            half = max(size, sigma) * 10 ** rng.uniform(-4, 1) / 2
            lower, upper = float(middle - half), float(middle + half)
            truth = precise(omega, density, upper, sigma) - precise(omega, density, lower, sigma)
            found = wandering_share(
                omega=omega, density=density, lower=lower, upper=upper, sigma=sigma
            )
            if truth > 1e-15:
                worst, counted = max(worst, abs(float(found / truth - 1))), counted + 1
            else:
                assert found < 1e-14
    print(f"share of {counted} wandering spectra: worst {worst:.1e} relative")
    assert counted > 80
    assert worst < 1e-9


def shifted(omega: Array, density: Array, edges: tuple[float, float], sigma: float) -> float:
    """Brute force: the sharp window averaged over shifts, cut wherever an edge meets a sample."""
    points, weights = np.polynomial.legendre.leggauss(12)
    cuts = np.concatenate([edge - omega for edge in edges if math.isfinite(edge)])
    cuts = np.unique(np.clip([*cuts, *(sigma * np.arange(-9, 9.1, 0.25))], -9 * sigma, 9 * sigma))
    half, middle = np.diff(cuts)[:, None] / 2, (cuts[1:] + cuts[:-1])[:, None] / 2
    shift = middle + half * points
    gauss = np.exp(-((shift / sigma) ** 2) / 2) / (sigma * math.sqrt(2 * math.pi)) * half * weights
    share = window_share(
        omega=omega, density=density, lower=edges[0] - shift, upper=edges[1] - shift
    )
    return float((gauss * share).sum())


def test_against_an_average_over_shifts() -> None:
    rng, worst = np.random.default_rng(32), 0.0
    for index in range(60):
        omega, density = spectrum(rng, int(rng.integers(2, 40)))
        size = omega[-1] - omega[0]
        sigma = size * 10 ** rng.uniform(-3, 0.5)
        lower, upper = np.sort(rng.uniform(omega[0] - sigma, omega[-1] + sigma, 2))
        edges = (float(lower), (float(upper), math.inf)[index % 2])
        found = wandering_share(
            omega=omega, density=density, lower=edges[0], upper=edges[1], sigma=sigma
        )
        worst = max(worst, abs(float(found) / shifted(omega, density, edges, sigma) - 1))
    print(f"average over shifts: worst {worst:.1e} relative")
    assert worst < 1e-9


def test_arrays_limits_and_long_spectra() -> None:
    rng = np.random.default_rng(33)
    omega, density = spectrum(rng, PIECES_AT_ONCE + 700)
    samples: dict[str, Any] = {"omega": omega, "density": density}
    size = omega[-1] - omega[0]
    lower = omega[900] + np.array([0.0, size / 7])
    sigma = size * np.array([[0.0], [1e-12], [1e-3], [0.3]])
    table = wandering_share(**samples, lower=lower, upper=math.inf, sigma=sigma)
    assert table.shape == (4, 2)
    for row, column in np.ndindex(table.shape):
        one = wandering_share(
            **samples, lower=lower[column], upper=math.inf, sigma=float(sigma[row, 0])
        )
        assert table[row, column] == pytest.approx(float(one), rel=1e-13)
    still = window_share(**samples, lower=lower, upper=math.inf)
    assert np.array_equal(table[0], still)
    assert table[1] == pytest.approx(still, rel=1e-9)
    whole = wandering_share(**samples, lower=-math.inf, upper=math.inf, sigma=sigma)
    assert whole == pytest.approx(np.ones((4, 1)), rel=1e-13)


# --- the quantity ---------------------------------------------------------------------------------


def test_light_past_the_mode_wanders_with_a_measured_spectrum() -> None:
    """Against the same spectrum shifted by hand, and weighted with the Gaussian."""
    offsets = np.array([-30e-9, -8e-9, 0.0, 6e-9, 9e-9, 40e-9])
    counts = [0, 3, 10, 9, 4, 0]
    point = {
        "spectrum": Samples(offsets, counts),
        "slow_linewidth": 8e-9,
        "filter_width": 6e-9,
        "filter_centre": 645e-9,
    }
    found = evaluate(point, ["other_filter_share"])["other_filter_share"]
    circle = 2 * math.pi * 299792458.0
    omega = circle / (650e-9 + offsets[::-1]) - circle / 650e-9
    density = np.array(counts[::-1]) * (650e-9 + offsets[::-1]) ** 2
    density = density / np.trapezoid(density, omega)
    edges = tuple(circle / (645e-9 + half) - circle / 650e-9 for half in (3e-9, -3e-9))
    wide = circle * 8e-9 / ((650e-9) ** 2 - (8e-9) ** 2 / 4)
    sigma = wide / (2 * math.sqrt(2 * math.log(2)))
    assert found == pytest.approx(shifted(omega, density, edges, sigma), rel=1e-9)
    still = evaluate({**point, "slow_linewidth": 0.0}, ["other_filter_share"])
    assert abs(found / still["other_filter_share"] - 1) > 0.02, "the wandering matters"


def test_one_narrow_measured_line_wanders_like_a_line() -> None:
    """A spike far narrower than the wandering: the Gaussian itself, as for `Lines` of no width."""
    common = {"slow_linewidth": 5e-9, "filter_width": 4e-9, "filter_centre": 652e-9}
    spike = Samples([-1e-15, 0.0, 1e-15], [0, 1, 0])
    found = evaluate({**common, "spectrum": spike}, ["other_filter_share"])["other_filter_share"]
    line = {**common, "spectrum": Lines([(1.0, 0.0, 0.0)]), "lifetime": 10e-3}
    assert found == pytest.approx(
        evaluate(line, ["other_filter_share"])["other_filter_share"], rel=1e-6
    )


def test_a_gaussian_spectrum_stays_gaussian() -> None:
    """Finely sampled: widths add in squares."""
    omega = np.linspace(-8, 8, 4001)
    density = np.exp(-(omega**2) / 2) / math.sqrt(2 * math.pi)
    found = wandering_share(omega=omega, density=density, lower=0.3, upper=1.1, sigma=0.75)
    expected = line_window(lower=0.3, upper=1.1, centre=0.0, width=0.0, sigma=1.25)
    assert found == pytest.approx(float(expected), rel=1e-5)
