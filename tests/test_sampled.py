"""Measured spectra against arbitrary precision (mpmath) and adaptive quadrature (scipy)."""

import mpmath
import numpy as np
import pytest
from scipy.constants import c as speed_of_light
from scipy.integrate import quad

from explorer.physics.sampled import (
    SampledLine,
    frequency_density,
    sampled_overlap,
    sampled_window,
    window_share,
)

CENTRE = 2 * np.pi * speed_of_light / 650e-9


def spectrum(rng, size, kind, spacing):
    """Unevenly spaced samples: noise, a smooth line, or a single spike (a kink and zeros)."""
    omega = CENTRE + spacing * np.cumsum(rng.uniform(0.3, 1.7, size))
    counts = {
        "noise": rng.uniform(0, 1, size),
        "smooth": np.exp(-(np.linspace(-4, 4, size) ** 2)),
        "spike": np.eye(size)[size // 2],
    }[kind]
    order = rng.permutation(size)
    wavelengths = 2 * np.pi * speed_of_light / omega
    return frequency_density(wavelengths=wavelengths[order], counts=1e7 * counts[order])


def kind_of(index):
    return ("noise", "smooth", "spike")[index % 3]


def pieces(omega, density, lower, upper):
    """In arbitrary precision: ends inside the window, slope and a point of each piece."""
    for a, b, below, above in zip(omega[:-1], omega[1:], density[:-1], density[1:], strict=True):
        start, stop = max(a, lower), min(b, upper)
        if stop > start:
            first, last, value = (
                mpmath.mpf(float(a)),
                mpmath.mpf(float(b)),
                mpmath.mpf(float(below)),
            )
            slope = (mpmath.mpf(float(above)) - value) / (last - first)
            yield mpmath.mpf(float(start)), mpmath.mpf(float(stop)), first, value, slope


def precise_overlap(omega, density, centre, kappa, lower=-np.inf, upper=np.inf):
    half, centre = mpmath.mpf(float(kappa)) / 2, mpmath.mpf(float(centre))
    total = mpmath.mpf(0)
    for start, stop, a, below, slope in pieces(omega, density, lower, upper):
        low, high = (start - centre) / half, (stop - centre) / half
        angle = mpmath.atan(high) - mpmath.atan(low)
        logarithm = mpmath.log(1 + high**2) - mpmath.log(1 + low**2)
        total += half * ((below + slope * (centre - a)) * angle + slope * half * logarithm / 2)
    return total


def precise_share(omega, density, lower, upper):
    total = mpmath.mpf(0)
    for start, stop, a, below, slope in pieces(omega, density, lower, upper):
        total += (stop - start) * (below + slope * ((start + stop) / 2 - a))
    return total


def random_centre(rng, omega, index):
    """Inside, on a node, on an end, and outside by up to 1e16 rad/s."""
    away = 10 ** rng.uniform(3, 16)
    return (
        rng.uniform(omega[0], omega[-1]),
        rng.choice(omega),
        omega[0],
        omega[-1] + away,
        omega[0] - away,
    )[index % 5]


def error(value, reference):
    return abs(float(mpmath.mpf(float(value)) / reference - 1))


def test_density_is_counts_per_frequency():
    wavelengths = np.array([600e-9, 610e-9, 640e-9, 655e-9])
    counts = np.array([1.0, 4.0, 3.0, 0.5])
    omega, density = frequency_density(wavelengths=wavelengths, counts=counts)
    again = frequency_density(wavelengths=wavelengths[::-1], counts=1e30 * counts[::-1])
    assert np.all(np.diff(omega) > 0)
    assert np.trapezoid(density, omega) == pytest.approx(1, rel=1e-14)
    np.testing.assert_allclose(omega * wavelengths[::-1], 2 * np.pi * speed_of_light, rtol=1e-15)
    jacobian = wavelengths**2 / (2 * np.pi * speed_of_light)
    ratio = density[::-1] / (counts * jacobian)
    np.testing.assert_allclose(ratio, ratio[0], rtol=1e-14)
    np.testing.assert_allclose(again, (omega, density), rtol=1e-14)


@pytest.mark.parametrize(
    ("wavelengths", "counts", "reason"),
    [
        ([6e-7, 6e-7], [1, 1], "twice"),
        ([6e-7, 7e-7], [0, 0], "zero"),
        ([6e-7, 7e-7], [1, np.nan], "finite"),
        ([0, 7e-7], [1, 1], "positive"),
        ([6e-7], [1], "two or more"),
    ],
)
def test_bad_spectra_are_refused(wavelengths, counts, reason):
    with pytest.raises(ValueError, match=reason):
        frequency_density(wavelengths=wavelengths, counts=counts)


def test_overlap_and_window_against_arbitrary_precision():
    rng = np.random.default_rng(11)
    with mpmath.workdps(60):
        for index in range(120):
            spacing = 10 ** rng.uniform(11, 13)
            omega, density = spectrum(rng, rng.integers(2, 40), kind_of(index), spacing)
            line = SampledLine(omega=omega, density=density)
            samples = {"omega": omega, "density": density}
            place = {"centre": random_centre(rng, omega, index), "kappa": 10 ** rng.uniform(3, 16)}
            if index % 4 == 0:
                place["kappa"] = 1e-9 * spacing
            reference = precise_overlap(omega, density, **place)
            assert error(sampled_overlap(**samples, **place), reference) < 1e-11
            assert error(line.overlap(**place), reference) < 1e-10
            edges = rng.uniform(omega[0] - 3 * spacing, omega[-1] + 3 * spacing, 2)
            edges[index % 2] = (edges[index % 2], -np.inf, np.inf, rng.choice(omega))[index % 4]
            lower, upper = np.sort(edges)
            window = {"lower": lower, "upper": upper}
            reference = precise_overlap(omega, density, **place, **window)
            values = sampled_window(**samples, **place, **window), line.window(**place, **window)
            share = window_share(**samples, **window)
            if reference == 0:
                assert (*values, share) == (0, 0, 0)
            else:
                assert error(values[0], reference) < 1e-11
                assert error(values[1], reference) < 1e-10
                assert error(share, precise_share(omega, density, **window)) < 1e-13


def test_overlap_against_adaptive_quadrature():
    rng = np.random.default_rng(12)
    for index in range(100):
        omega, density = spectrum(rng, 12, kind_of(index), 1.0e12)
        centre, kappa = rng.uniform(omega[0], omega[-1]), 10 ** rng.uniform(11, 15)
        shifted = omega - centre  # so that the abscissae keep their digits
        near = [p for p in (-kappa, 0.0, kappa) if shifted[0] < p < shifted[-1]]
        total, _ = quad(
            lambda w, s=shifted, d=density, k=kappa: np.interp(w, s, d) / (1 + (2 * w / k) ** 2),
            shifted[0], shifted[-1], points=[*shifted[1:-1], *near], epsrel=1e-11, epsabs=0, limit=500,
        )  # fmt: skip
        value = sampled_overlap(omega=omega, density=density, centre=centre, kappa=kappa)
        assert value == pytest.approx(total, rel=1e-9)


def test_limits():
    rng = np.random.default_rng(13)
    omega, density = spectrum(rng, 300, "smooth", 1e12)
    line = SampledLine(omega=omega, density=density)
    middle = (omega[150] + omega[151]) / 2
    narrow = np.pi / 2 * 1e3 * np.interp(middle, omega, density)
    assert line.overlap(middle, 1e3) == pytest.approx(narrow, rel=1e-5)
    assert line.overlap(middle, 1e22) == pytest.approx(1, rel=1e-9)
    samples = {"omega": omega, "density": density}
    assert window_share(**samples, lower=-np.inf, upper=np.inf) == pytest.approx(1, rel=1e-14)
    assert line.window(middle, 1e22, middle, np.inf) == pytest.approx(
        window_share(**samples, lower=middle, upper=np.inf), rel=1e-9
    )
    assert window_share(**samples, lower=middle, upper=omega[10]) == 0
    assert line.window(middle, 1e12, -np.inf, -np.inf) == 0


@pytest.mark.parametrize("kind", ["noise", "smooth", "spike"])
def test_the_tree_agrees_with_the_direct_sum_on_a_long_spectrum(kind):
    rng = np.random.default_rng(14)
    omega, density = spectrum(rng, 4000, kind, 3e11)
    line = SampledLine(omega=omega, density=density)
    size = omega[-1] - omega[0]
    centre = rng.uniform(omega[0] - size, omega[-1] + size, 300)
    centre[:50] = rng.choice(omega, 50)
    kappa = 10 ** rng.uniform(3, 16, 300)
    lower = centre + rng.uniform(-1, 1, 300) * size / 3
    upper = lower + rng.uniform(0, 1, 300) ** 4 * size
    place = {"centre": centre, "kappa": kappa, "lower": lower, "upper": upper}
    samples = {"omega": omega, "density": density}
    direct = sampled_overlap(**samples, centre=centre, kappa=kappa)
    np.testing.assert_allclose(line.overlap(centre, kappa), direct, rtol=1e-10)
    np.testing.assert_allclose(line.window(**place), sampled_window(**samples, **place), rtol=1e-10)


def test_arrays_give_what_their_elements_give():
    rng = np.random.default_rng(15)
    omega, density = spectrum(rng, 50, "noise", 1e12)
    line = SampledLine(omega=omega, density=density)
    kappa = np.array([1e9, 1e12, 1e15])[:, np.newaxis]
    centre = rng.choice(omega, 4)
    for function in (
        line.overlap,
        lambda w, k: sampled_overlap(omega=omega, density=density, centre=w, kappa=k),
        lambda w, k: line.window(w, k, w - 2e12, np.inf),
        lambda w, k: window_share(omega=omega, density=density, lower=w - k, upper=w + k),
    ):
        table = function(centre, kappa)
        assert table.shape == (3, 4)
        for row, column in np.ndindex(3, 4):
            one = function(centre[column], kappa[row, 0])
            assert one.shape == ()
            assert table[row, column] == pytest.approx(float(one), rel=1e-14)


def test_frequencies_may_count_from_the_centre():
    rng = np.random.default_rng(16)
    omega, density = spectrum(rng, 50, "noise", 1e12)
    line = SampledLine(omega=omega, density=density)
    moved = SampledLine(omega=omega - omega[20], density=density)
    assert moved.overlap(0.0, 1e12) == pytest.approx(
        float(line.overlap(omega[20], 1e12)), rel=1e-12
    )


def test_a_line_is_a_value():
    omega, density = frequency_density(wavelengths=[6e-7, 6.1e-7, 6.3e-7], counts=[0.5, 2, 1])
    line, same = (SampledLine(omega=omega, density=density) for _ in range(2))
    assert line == same
    assert hash(line) == hash(same)
    assert line != SampledLine(omega=omega, density=2 * density)
    assert len({line, same}) == 1
    with pytest.raises(ValueError, match="read-only"):
        line.omega[0] = 0
    omega[0] = 0
    assert line.omega[0] > 0


def test_width_and_step():
    omega = np.array([0.0, 1, 2, 3, 4, 5, 6, 7, 8])
    density = np.array([0, 1, 4, 1, 3, 2, 1, 0, 0.2])
    line = SampledLine(omega=omega, density=density)
    assert line.fwhm == pytest.approx(5 - 4 / 3)  # from 4/3 to 5, across the dip
    assert line.step == 1
    half = SampledLine(omega=omega[2:], density=density[2:])
    assert half.fwhm == pytest.approx(3)  # from the cut end
