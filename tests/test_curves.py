"""Curves behind a design: spectra drawn at their true places, widths and heights."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from explorer import Lines, Samples, evaluate
from explorer.catalogue import emitters
from explorer.curves import Colours, colours
from explorer.evaluate import Evaluation

Array = NDArray[np.float64]

CIRCLE = 2 * math.pi * 299792458.0


def drawn(**point: Any) -> Colours:
    return colours(Evaluation(point))


def fwhm(x: Array, y: Array) -> float:
    """Full width at half maximum of the polyline through the points, as an eye sees it [m]."""
    above = np.flatnonzero(y >= 0.5)
    first, last = above[0], above[-1]
    left = np.interp(0.5, y[first - 1 : first + 1], x[first - 1 : first + 1])
    right = np.interp(-0.5, -y[last : last + 2], x[last : last + 2])
    return float(right - left)


def check(seen: Colours) -> None:
    assert np.all(np.diff(seen.wavelength) >= 0)
    for curve in (seen.emitter, seen.resonator, seen.leaving):
        assert np.all(np.isfinite(curve))
        assert curve.min() >= 0
        assert curve.max() == 1
    assert set(np.unique(seen.passed)) <= {0.0, 1.0}


def test_a_narrow_line_of_the_catalogue_is_drawn_narrow_at_its_place() -> None:
    values = emitters()["inas_gaas_dot"].inputs()
    seen = drawn(**{**values, "quality_factor": 25})
    check(seen)
    assert seen.wavelength[seen.emitter.argmax()] == values["emission_wavelength"]
    width = fwhm(seen.wavelength, seen.emitter)
    print(f"drawn {width * 1e12:.3f} pm wide")
    assert width < 2e-12


@pytest.mark.parametrize("quality", [25.0, 1e4, 1e7])
@pytest.mark.parametrize("width", [1e-13, 1e-11, 3e-9])
@pytest.mark.parametrize("offset", [0.0, 3e-9, -0.2e-9])
def test_places_and_widths_of_one_line(width: float, quality: float, offset: float) -> None:
    seen = drawn(
        fast_linewidth=width,
        lifetime=1e-6,
        quality_factor=quality,
        resonance_wavelength=650e-9 + offset,
        dipole_alignment=0.01,
    )
    check(seen)
    assert fwhm(seen.wavelength, seen.emitter) == pytest.approx(width, rel=0.07)
    peak = seen.wavelength[seen.emitter.argmax()]
    assert peak == pytest.approx(650e-9, abs=width / 20 + 1e-21)
    if quality > 100:
        narrow = (650e-9 + offset) / quality
        assert fwhm(seen.wavelength, seen.resonator) == pytest.approx(narrow, rel=0.07)
        peak = seen.wavelength[seen.resonator.argmax()]
        assert peak == pytest.approx(650e-9 + offset, abs=narrow / 20 + 1e-21)


def test_a_line_below_the_rounding_of_its_wavelength_is_there() -> None:
    """1/τ at 10 ms is 2e-22 m wide: every curve has its peak all the same."""
    seen = drawn(lifetime=10e-3, fast_linewidth=0.0, quality_factor=1e10)
    check(seen)
    assert seen.wavelength[seen.emitter.argmax()] == 650e-9


@pytest.mark.parametrize("count", [2, 7, 50])
def test_every_line_has_its_true_height(count: int) -> None:
    """Equal lines far apart: a peak of full height at each of them."""
    rows = [(0.9 / count, index * 1e-9, 1e-13) for index in range(count)]
    seen = drawn(spectrum=Lines(rows), lifetime=1e-6)
    check(seen)
    for index in range(count):
        near = np.abs(seen.wavelength - (650e-9 + index * 1e-9)) < 1e-13
        # The width is taken in wavelength, so a redder line is narrower, and higher, in frequency.
        assert seen.emitter[near].max() == pytest.approx(1, rel=1e-3)


def test_two_lines_that_merge_have_one_peak_between_them() -> None:
    seen = drawn(spectrum=Lines([(0.5, 0.0, 1e-12), (0.5, 0.4e-12, 1e-12)]), lifetime=1e-6)
    check(seen)
    assert seen.wavelength[seen.emitter.argmax()] == pytest.approx(650e-9 + 0.2e-12, abs=0.02e-12)


def test_a_strongly_coupled_line_leaves_as_its_doublet() -> None:
    point = {"fast_linewidth": 0.0, "lifetime": 1e-9, "quality_factor": 1e8, "mode_volume": 1e-2}
    seen = drawn(**point)
    check(seen)
    g = evaluate(point, ["coupling_rate"])["coupling_rate"]
    apart = (650e-9) ** 2 * 2 * g / CIRCLE
    high = seen.wavelength[seen.leaving > 0.9]
    assert high.max() - high.min() == pytest.approx(apart, rel=1e-4)
    assert seen.leaving[np.argmin(np.abs(seen.wavelength - 650e-9))] < 1e-6


@pytest.mark.parametrize("width", [1e-15, 1e-9])
def test_the_filter_has_sharp_edges_however_narrow(width: float) -> None:
    seen = drawn(filter_width=width, filter_centre=655e-9)
    check(seen)
    inside = seen.wavelength[seen.passed == 1]
    assert inside.max() - inside.min() == pytest.approx(width, rel=1e-6)
    for edge in (inside.min(), inside.max()):
        outside = seen.wavelength[seen.passed == 0]
        assert np.abs(outside - edge).min() < 1e-9 * width


def test_a_spike_of_a_measured_spectrum_is_not_missed() -> None:
    offsets = np.linspace(-50e-9, 50e-9, 5001)
    counts = np.exp(-((offsets / 20e-9) ** 2)) + 50 * np.exp(-(((offsets - 7.3e-9) / 0.03e-9) ** 2))
    seen = drawn(spectrum=Samples(offsets, counts))
    check(seen)
    assert seen.wavelength[seen.emitter.argmax()] == pytest.approx(657.3e-9, abs=0.03e-9)


def test_a_measured_spectrum_is_drawn_as_it_wanders() -> None:
    offsets = np.linspace(-40e-9, 40e-9, 801)
    gauss = Samples(offsets, np.exp(-4 * math.log(2) * (offsets / 6e-9) ** 2))
    seen = drawn(spectrum=gauss, slow_linewidth=8e-9)
    check(seen)
    assert fwhm(seen.wavelength, seen.emitter) == pytest.approx(10e-9, rel=0.02)


def test_a_step_of_a_hand_costs_few_nodes() -> None:
    for values in (emitter.inputs() for emitter in emitters().values()):
        assert drawn(**values).wavelength.size < 700
