"""Averages over slow wandering against arbitrary precision (mpmath) and quadrature (scipy)."""

import mpmath
import numpy as np
import pytest
from scipy.integrate import quad

from explorer.physics.sampled import SampledLine
from explorer.physics.wandering import (
    average_over_samples,
    average_over_shifts,
    voigt_deficit,
    voigt_mean,
)


def precise_mean(detuning, sigma, width):
    """√π y Re w(x+iy) in arbitrary precision; far out by the asymptotic series of w."""
    detuning, sigma, width = (mpmath.mpf(float(v)) for v in (detuning, sigma, width))
    if sigma == 0:
        return 1 / (1 + (2 * detuning / width) ** 2)
    z = mpmath.mpc(detuning, width / 2) / (sigma * mpmath.sqrt(2))
    if abs(z) < 15:
        faddeeva = mpmath.exp(-(z**2)) * mpmath.erfc(-1j * z)
    else:  # the terms fall to e^-225 before they grow
        total, term = mpmath.mpc(0), 1 / z
        for order in range(60):
            total += term
            term *= (2 * order + 1) / (2 * z**2)
        faddeeva = 1j * total / mpmath.sqrt(mpmath.pi)
    return mpmath.sqrt(mpmath.pi) * z.imag * faddeeva.real


def error(value, reference):
    return abs(float(mpmath.mpf(float(value)) / reference - 1))


def random_voigt(rng, index):
    width = 10 ** rng.uniform(3, 17)
    sigma = width * 10 ** rng.uniform(*((-9, 6), (-2, -1), (-3, 1))[index % 3])
    detuning = (0.0, width * 10 ** rng.uniform(-6, 4), sigma * rng.uniform(0, 6))[index // 3 % 3]
    return {"detuning": detuning, "sigma": sigma, "width": width}


def test_voigt_values_against_arbitrary_precision():
    rng = np.random.default_rng(21)
    with mpmath.workdps(50):
        for index in range(400):
            point = random_voigt(rng, index)
            mean = precise_mean(**point)
            assert error(voigt_mean(**point), mean) < 1e-12
            assert error(voigt_deficit(**point), 1 - mean) < 1e-12


def test_voigt_values_against_adaptive_quadrature():
    rng = np.random.default_rng(22)
    for _ in range(100):
        sigma, width, detuning = rng.uniform(0.3, 3, 3)

        def weighted(u, sigma=sigma, width=width, detuning=detuning):
            gauss = np.exp(-(u**2) / 2) / np.sqrt(2 * np.pi)
            return gauss / (1 + (2 * (detuning + sigma * u) / width) ** 2)

        total, _ = quad(weighted, -10, 10, points=[-detuning / sigma], epsrel=1e-12, limit=200)
        point = {"detuning": detuning, "sigma": sigma, "width": width}
        assert voigt_mean(**point) == pytest.approx(total, rel=1e-9)
        assert voigt_deficit(**point) == pytest.approx(1 - total, rel=1e-8)


@pytest.mark.parametrize("detuning", [0.0, np.array([0.0, 3e11, 1e15])])
def test_voigt_arrays_and_limits(detuning):
    sigma = np.array([0.0, 1e-300, 1e9, 1e12, 1e17])[:, np.newaxis]
    for function in (voigt_mean, voigt_deficit):
        for width in (1e3, 1e12, 1e17):
            table = function(detuning=detuning, sigma=sigma, width=width)
            assert table.shape == np.broadcast_shapes(np.shape(detuning), sigma.shape)
            spread, offset = np.broadcast_arrays(sigma, detuning)
            for index in np.ndindex(table.shape):
                one = function(detuning=offset[index], sigma=spread[index], width=width)
                assert table[index] == pytest.approx(float(one), rel=1e-12)
            u = 2 * offset[0] / width
            still = 1 / (1 + u**2) if function is voigt_mean else u**2 / (1 + u**2)
            np.testing.assert_allclose(table[:2], np.broadcast_to(still, table[:2].shape))
        assert np.shape(function(detuning=0.0, sigma=0.0, width=1e3)) == ()


def panels(edges, order):
    """Gauss-Legendre nodes and weights on panels."""
    points, weights = np.polynomial.legendre.leggauss(order)
    half, middle = np.diff(edges)[:, np.newaxis] / 2, (edges[1:] + edges[:-1])[:, np.newaxis] / 2
    return (middle + half * points).ravel(), (half * weights).ravel()


def reference_average(outcome, sigma, centres, widths):
    """On panels that double away from every centre."""
    edges = [np.linspace(-12, 12, 49) * sigma]
    for centre, width in zip(centres, widths, strict=True):
        away = width * 2.0 ** np.arange(-2, 90)
        edges += [centre + away, centre - away, [centre]]
    limits = np.clip(np.concatenate(edges), -12 * sigma, 12 * sigma)
    shift, weight = panels(np.unique(limits), 20)
    weight = weight * np.exp(-((shift / sigma) ** 2) / 2)
    return [np.sum(weight * value) / np.sum(weight) for value in outcome(shift)]


def random_lines(rng, index):
    """One to four lines: apart, in a cluster, coincident, or many sigmas away."""
    count, sigma = rng.integers(1, 5), 10 ** rng.uniform(9, 14)
    spread = rng.uniform(-1, 1, count) * sigma
    centres = (
        3 * spread,
        2 * sigma * rng.uniform(-1, 1) + 10 ** rng.uniform(-7, 0) * spread,
        np.full(count, 3 * spread[0]),
        10 ** rng.uniform(0, 2) * spread,
    )[index % 4]
    widths = sigma * 10 ** rng.uniform(-6, (6, 0)[index // 4 % 2], count)
    return sigma, list(centres), list(widths)


def back_action(rates, decay, centres, widths):
    """Rate into the mode, share of it and what is left: power broadening included."""

    def outcome(shift):
        rate = sum(
            r / (1 + ((shift - c) / w) ** 2) for r, c, w in zip(rates, centres, widths, strict=True)
        )
        return rate, rate / (decay + rate), decay / (decay + rate)

    return outcome


def test_average_over_shifts_against_graded_panels():
    rng = np.random.default_rng(23)
    for index in range(240):
        sigma, centres, widths = random_lines(rng, index)
        rates = 1e8 * 10 ** rng.uniform(-3, 6, len(centres))
        outcome = back_action(rates, 1e8 * 10 ** rng.uniform(-1, 1), centres, widths)
        values = average_over_shifts(outcome=outcome, sigma=sigma, centres=centres, widths=widths)
        expected = reference_average(outcome, sigma, centres, widths)
        np.testing.assert_allclose(values, expected, rtol=1e-9)


def test_average_of_one_line_is_a_voigt_value():
    sigma = np.array([0.0, 1e9, 1e12, 1e14])[:, np.newaxis]
    width, detuning = np.array([1e8, 1e11, 1e15]), 5e11
    value = average_over_shifts(
        outcome=lambda shift: 1 / (1 + (2 * (detuning + shift) / width) ** 2),
        sigma=sigma, centres=[-detuning], widths=[width / 2],
    )  # fmt: skip
    expected = voigt_mean(detuning=detuning, sigma=sigma, width=width)
    np.testing.assert_allclose(value, expected, rtol=1e-9)


def test_average_against_adaptive_quadrature():
    rng = np.random.default_rng(24)
    for _ in range(100):
        centres, widths = rng.uniform(-2, 2, 2), rng.uniform(0.05, 2, 2)
        outcome = back_action([3.0, 1.0], 0.5, centres, widths)
        total, _ = quad(
            lambda u, f=outcome: f(u)[1] * np.exp(-(u**2) / 2) / np.sqrt(2 * np.pi),
            -10, 10, points=centres, epsrel=1e-11, limit=400,
        )  # fmt: skip
        value = average_over_shifts(outcome=outcome, sigma=1.0, centres=centres, widths=widths)
        assert value[1] == pytest.approx(total, rel=1e-9)


def test_average_shapes_constant_outcomes_and_memory():
    sizes = []

    def outcome(shift):
        result = np.cos(0 * shift) * np.arange(1.0, 4)  # more cells, more axes than sigma
        sizes.append(result.size)
        return result

    value = average_over_shifts(outcome=outcome, sigma=2.0, centres=[0.5], widths=[1e-3])
    assert isinstance(value, np.ndarray)
    np.testing.assert_allclose(value, [1, 2, 3], rtol=1e-14)
    sizes.clear()
    sigma = np.full((200, 100, 1), 1e10)
    average_over_shifts(outcome=outcome, sigma=sigma, centres=[0.0], widths=[1e9])
    assert len(sizes) > 20
    assert max(sizes) <= 2**17


def test_average_of_elements():
    sigma, centre = np.array([[0.0], [1e10], [1e13]]), np.array([0.0, 1e11])
    width = np.array([1e9, 1e12])

    def outcome(shift, centre=centre, width=width):
        rate = 50 / (1 + ((shift - centre) / width) ** 2)
        return rate / (1 + rate)

    table = average_over_shifts(outcome=outcome, sigma=sigma, centres=[centre], widths=[width])
    for row, column in np.ndindex(3, 2):
        one = average_over_shifts(
            outcome=lambda s, c=centre[column], w=width[column]: outcome(s, c, w),
            sigma=sigma[row, 0], centres=[centre[column]], widths=[width[column]],
        )  # fmt: skip
        assert table[row, column] == pytest.approx(float(one), rel=1e-9)
    np.testing.assert_array_equal(table[0], outcome(np.zeros(2)))


# The tolerances are the errors seen, rounded up: the nodes do not follow the samples.
@pytest.mark.parametrize(
    ("noise", "ratio", "height", "tolerance"),
    [
        (0, 0.3, 1e-9, 1e-6),
        (0, 10, 1e-9, 1e-5),
        (0, 100, 0.1, 1e-5),
        (0, 10, 2, 1e-9),
        (0.01, 10, 1e-9, 1e-4),
        (0.01, 10, 2, 1e-9),
        (0.01, 100, 1e-9, 2e-3),
        (0.1, 10, 1e-9, 1e-3),
    ],
)
def test_average_over_samples(noise, ratio, height, tolerance):
    rng = np.random.default_rng(25)
    omega = np.cumsum(rng.uniform(0.7, 1.3, 1000)) * 1e11
    omega -= omega[500]
    density = np.exp(-((omega / 6e12) ** 2)) * (1 + noise * rng.normal(size=1000))
    line = SampledLine(omega=omega, density=np.abs(density) / np.trapezoid(density, omega))
    half, sigma, resonance = height * 1e11, ratio * 1e11, 4e12
    peak, calls = 30 / line.overlap(0.0, 2 * half), []

    def outcome(shift):
        calls.append(np.size(shift))
        rate = peak * line.overlap(resonance - shift, 2 * half)
        return rate, rate / (1 + rate), 1 / (1 + rate)

    values = average_over_samples(outcome=outcome, sigma=sigma, step=max(1e11, half))
    assert sum(calls) < 800
    kinks = np.concatenate([resonance - omega, np.linspace(-10, 10, 81) * sigma])
    shift, weight = panels(np.unique(np.clip(kinks, -10 * sigma, 10 * sigma)), 6)
    weight = weight * np.exp(-((shift / sigma) ** 2) / 2)
    expected = [np.sum(weight * value) / np.sum(weight) for value in outcome(shift)]
    np.testing.assert_allclose(values, expected, rtol=tolerance)


def test_average_over_samples_crowds_about_a_narrow_peak():
    centre, half, sigma = 3e11, 1e9, np.array([0.0, 1e12])

    def outcome(shift):
        return 1 / (1 + ((shift - centre) / half) ** 2)

    value = average_over_samples(
        outcome=outcome, sigma=sigma, step=half, centre=centre, feature=half
    )
    expected = voigt_mean(detuning=-centre, sigma=sigma, width=2 * half)
    np.testing.assert_allclose(value, expected, rtol=1e-9)
