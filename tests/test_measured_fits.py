"""Fits of measured data: closed forms, numerical quadrature, invariance, cautions, refusals."""

from __future__ import annotations

import itertools
import math
import pickle
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy import integrate, special, stats

from explorer.built import Estimate
from explorer.domain import InputError
from explorer.measured import minos
from explorer.measured.data import Coincidences, DataError, Decay, Spectrum
from explorer.measured.decay import DecayFit, fit_decay, fit_decay_steps
from explorer.measured.decay_model import Convolved, response_shares, tail_bins
from explorer.measured.g2 import fit_g2, fit_g2_steps
from explorer.measured.g2_model import Train, dip_share, peak_integral
from explorer.measured.noise import Noise, goodness
from explorer.measured.spectrum import fit_spectrum, fit_spectrum_steps
from explorer.measured.spectrum_model import Line, line_counts, split_width, total_width
from explorer.whole import Lines

from . import measured_truth as truth

NS, NM = 1e-9, 1e-9


def histogram(counts: Any, width: float = 1e-9, first: float = 0.0, **more: Any) -> Decay:
    counts = np.asarray(counts, dtype=float)
    times = first + width * (np.arange(counts.size) + 0.5)
    return Decay(**truth.FILE, times=times, counts=counts, width=width, **more)


def delays(counts: Any, width: float, **more: Any) -> Coincidences:
    counts = np.asarray(counts, dtype=float)
    times = width * (np.arange(counts.size) - counts.size // 2)
    return Coincidences(**truth.FILE, times=times, counts=counts, width=width, **more)


def seeded(seed: int = 1) -> np.random.Generator:
    return np.random.default_rng(seed)


# Closed forms and quadrature


def test_a_pure_exponential_in_wide_bins_has_its_closed_estimate() -> None:
    # Counts that halve from bin to bin, then none: the background is best at 0, and the likelihood of
    # a geometric number is largest at q = Σ i n / (Σ n + Σ i n), τ = −Δ/ln q.
    counts = np.concatenate([[0, 0], 2.0 ** np.arange(20, -1, -1), np.zeros(200)])
    place = np.arange(counts.size - 2)
    moment = float(np.sum(place * counts[2:]))
    ratio = moment / (np.sum(counts) + moment)
    fit = fit_decay(histogram(counts), start=2e-9)
    assert fit.lifetime == pytest.approx(-1e-9 / math.log(ratio), rel=1e-7)
    assert fit.background.value == pytest.approx(0.0, abs=1e-6)
    # The geometric number's Fisher information of ln τ per event is q (ln q)²/(1 − q)².
    information = np.sum(counts) * ratio * math.log(ratio) ** 2 / (1 - ratio) ** 2
    half = 1.959963984540054 / math.sqrt(information)
    assert math.log(fit.high / fit.low) == pytest.approx(2 * half, rel=3e-3)


def test_exact_expectations_give_back_the_truth() -> None:
    share = tail_bins(count=300, width=0.1e-9, lifetime=3e-9)
    fit = fit_decay(histogram(1e5 * share + 4.0, 0.1e-9), start=0.0)
    assert fit.lifetime == pytest.approx(3e-9, rel=1e-6)
    assert fit.background.value == pytest.approx(4.0, rel=1e-5)
    assert fit.initial_rate.value == pytest.approx(1 / 3e-9, rel=1e-6)
    assert fit.initial_rate.low == pytest.approx(1 / fit.high, rel=1e-12)


@pytest.mark.parametrize("shift", [0.0, 0.37, 1.0, -1.63, 3.5])
@pytest.mark.parametrize("lifetime", [0.2, 3.0, 40.0])
def test_the_convolution_is_that_of_a_response_flat_in_its_bins(
    lifetime: float, shift: float
) -> None:
    shares = np.array([0.0, 0.0, 0.0, 0.2, 0.5, 0.2, 0.1, 0.0])
    grid = np.concatenate([shares, np.zeros(22)])
    found = Convolved(grid, 0, 0.0, 30, 1.0).bins(lifetime, shift)

    def survived(time: float) -> float:
        """Share of the events detected before a time, by quadrature over the response."""
        total = 0.0
        for at, share in enumerate(shares):
            low, high = at + shift, min(at + 1 + shift, time)
            if share and high > low:
                total += (
                    share
                    * integrate.quad(
                        lambda s: -math.expm1(-(time - s) / lifetime), low, high, epsabs=1e-14
                    )[0]
                )
        return total

    wanted = np.diff([survived(float(edge)) for edge in range(31)])
    assert found == pytest.approx(wanted, abs=2e-13)


def test_tails_of_earlier_pulses_wrap() -> None:
    shares = np.zeros(50)
    shares[5:8] = [0.25, 0.5, 0.25]
    long = np.concatenate([shares, np.zeros(2000)])
    alone = Convolved(long, 0, 0.0, 2050, 1.0).bins(30.0, 0.4)
    wanted = alone[:2040].reshape(-1, 60)[:, :50].sum(axis=0)  # a pulse every 60 bins
    found = Convolved(shares, 0, 0.0, 50, 1.0, period=60.0).bins(30.0, 0.4)
    assert found == pytest.approx(wanted, rel=1e-9)


def test_a_period_takes_what_earlier_pulses_left_out_of_the_background() -> None:
    data = truth.decay(seeded(), 1e5, (15e-9,), period=50e-9, pulse=1e-9, response=0.2e-9)
    response = truth.response(seeded(2), 1e6, 0.2e-9, pulse=1e-9)
    fit = fit_decay(data, response, period=50e-9)
    assert fit.low < 15e-9 < fit.high
    assert fit.low < fit.lifetime < fit.high
    plain = fit_decay(data, response)
    assert plain.background.low > fit.background.high  # the tails pass for background


def test_a_response_in_other_bins_says_the_same() -> None:
    data = truth.decay(seeded(3), 1e5, response=0.3e-9)
    response = truth.response(seeded(4), 1e6, 0.3e-9)
    halves = response.counts.reshape(-1, 2).sum(axis=1)
    coarse = histogram(halves, 100e-12)
    one, other = fit_decay(data, response), fit_decay(data, coarse)
    assert other.lifetime == pytest.approx(one.lifetime, rel=2e-3)
    shares, start = response_shares(coarse, 50e-12)
    assert np.sum(shares) == pytest.approx(1.0)
    assert 2.5e-9 < start < 5e-9


def test_a_response_recorded_elsewhere_is_moved() -> None:
    data = truth.decay(seeded(5), 1e5, pulse=9.03e-9, response=0.3e-9)
    fit = fit_decay(data, truth.response(seeded(6), 1e6, 0.3e-9, pulse=5e-9))
    assert fit.shift is not None
    assert fit.shift.low < 4.03e-9 < fit.shift.high
    assert fit.low < 3e-9 < fit.high


@pytest.mark.parametrize("jitter", [0.0, 0.3, 1.0, 7.0, 45.0])
@pytest.mark.parametrize("delay", [-30.0, -2.0, -0.1, 0.0, 0.4, 5.0, 60.0])
def test_a_peak_is_an_exponential_after_a_gaussian(jitter: float, delay: float) -> None:
    found = float(peak_integral(delay=np.array([delay]), decay=1.0, jitter=jitter)[0])
    if jitter == 0:
        wanted = 0.5 * math.exp(delay) if delay < 0 else 1 - 0.5 * math.exp(-delay)
    else:  # E over the Laplace variable of the Gaussian's integral
        pieces = sorted({-40.0, 0.0, 40.0, float(np.clip(delay, -40, 40))})
        wanted = sum(
            integrate.quad(
                lambda t: 0.5 * math.exp(-abs(t)) * special.ndtr((delay - t) / jitter),
                low,
                high,
                epsabs=1e-13,
                limit=400,
                points=[p for p in (delay - 5 * jitter, delay + 5 * jitter) if low < p < high]
                or None,
            )[0]
            for low, high in itertools.pairwise(pieces)
        )
    assert found == pytest.approx(wanted, abs=1e-9)


@pytest.mark.parametrize("decay", [0.3, 4.0, 30.0])
def test_a_train_is_the_sum_of_its_peaks(decay: float) -> None:
    train = Train(10.0, decay, 0.2, 0.7, 0.15, 0.4, 25.0)
    edges = np.linspace(-31.3, 42.1, 500)
    wanted = np.zeros(499)
    for number in range(-60, 61):
        weight = 0.15 if number == 0 else 1 + 0.4 * math.exp(-abs(number) * 10 / 25)
        place = edges - 0.7 - 10 * number
        wanted += weight * np.diff(peak_integral(delay=place, decay=decay, jitter=0.2))
    assert np.diff(train.integral(edges)) == pytest.approx(wanted, abs=3e-8)


def test_the_dip_is_the_mean_over_each_bin() -> None:
    edges = np.array([-3.0, -1.0, 0.5, 2.0])
    found = dip_share(edges=edges, decay=1.5, jitter=0.0, centre=0.0)
    for at, (low, high) in enumerate(itertools.pairwise(edges)):
        mean = integrate.quad(lambda t: math.exp(-abs(t) / 1.5), low, high, points=[0.0])[0]
        assert found[at] == pytest.approx(mean / (high - low), rel=1e-9)


def test_a_line_holds_its_area_and_its_width() -> None:
    waves = np.linspace(500e-9, 800e-9, 60_001)
    counts = line_counts(waves, (Line(7.0, 640e-9, 0.0),), 4e-9, 3e-9, 0.0)
    assert np.trapezoid(counts, waves) == pytest.approx(7.0, rel=1e-6)
    # Per frequency, a Gaussian of 4 and 3 nm is one of 5 nm; angular widths are 2πcΔ/(λ² − Δ²/4).
    density = counts * waves**2
    above = waves[density >= 0.5 * np.max(density)]
    omega = 2 * np.pi * truth.LIGHT / above[[0, -1]]
    width = 2 * np.pi * truth.LIGHT * 5e-9 / (640e-9**2 - 2.5e-9**2)
    assert omega[0] - omega[1] == pytest.approx(width, rel=2e-3)


@pytest.mark.parametrize(("fast", "slow"), [(6e-9, 5e-9), (1e-9, 9e-9), (9e-9, 1e-9), (4e-9, 0.0)])
def test_the_width_of_a_voigt_line(fast: float, slow: float) -> None:
    found = total_width(fast, slow, 640e-9)
    approximate = 0.5346 * fast + math.sqrt(0.2166 * fast**2 + slow**2)
    assert found == pytest.approx(approximate, rel=4e-4)  # Olivero & Longbothum 1977: to 2e-4
    parts = split_width(found, fast / found, 640e-9)
    assert parts[0] == pytest.approx(fast, rel=1e-3)
    assert parts[1] == pytest.approx(slow, rel=5e-3, abs=0.15e-9)


# The engine


def test_minos_and_profiles_by_scoring_agree(monkeypatch: pytest.MonkeyPatch) -> None:
    data = truth.spectrum(seeded(7), 2e4, ((640e-9, 6e-9, 1.0),), 5e-9)
    found = []
    for points in (0, 10**9):
        monkeypatch.setattr(minos, "MINOS_WORK", points)
        found.append(fit_spectrum(data))
    for name in ("centre", "fast_linewidth", "slow_linewidth", "background", "total_fwhm"):
        one, other = (getattr(fit, name) for fit in found)
        width = other.high - other.low
        assert one.low == pytest.approx(other.low, abs=2e-3 * width), name
        assert one.high == pytest.approx(other.high, abs=2e-3 * width), name


def test_counts_less_a_background_have_the_likelihood_of_the_counts() -> None:
    # Counts N, of which 3 each are taken away and 1/0.2 is the response: y = (N − 3)/0.2, variance
    # (y·0.2 + 3)/0.2². The deviance is that of N.
    number, mean = np.array([0.0, 1.0, 4.0, 9.0]), np.array([3.5, 4.0, 3.2, 8.0])
    ones = np.ones(4)
    noise = Noise((number - 3) / 0.2, ones / 0.2, 3 * ones / 0.2**2)
    plain = Noise.poisson(number)
    assert noise.deviance((mean - 3) / 0.2) == pytest.approx(plain.deviance(mean), rel=1e-12)
    wanted = 2 * np.sum(
        stats.poisson.logpmf(number, np.maximum(number, 1e-300))
        - stats.poisson.logpmf(number, mean)
    )
    assert plain.deviance(mean) == pytest.approx(float(wanted), rel=1e-9)


def test_a_floor_alone_is_least_squares() -> None:
    value, mean = np.array([1.0, -2.0, 3.0]), np.array([0.5, -1.0, 3.5])
    noise = Noise(value, np.zeros(3), np.full(3, 4.0))
    assert noise.deviance(mean) == pytest.approx(np.sum((value - mean) ** 2) / 4, rel=1e-4)


@pytest.mark.parametrize("mean", [0.01, 0.1, 0.7, 4.0, 100.0])
def test_the_goodness_of_pure_noise_is_even(mean: float) -> None:
    rng, expected = seeded(8), np.full(2000, mean)
    chances = [
        goodness(Noise.poisson(rng.poisson(expected).astype(float)), expected, 0)
        for _ in range(400)
    ]
    for name in ("p_value", "run_p_value"):
        found = [getattr(one, name) for one in chances]
        # 400 even numbers have a mean of 1/2 ± 0.0144, and 0.05 ± 0.011 of them lie below 0.05.
        assert abs(np.mean(found) - 0.5) < 4 * 0.0144, name
        assert abs(np.mean(np.array(found) < 0.05) - 0.05) < 4 * 0.011, name


def test_more_confidence_is_a_wider_interval() -> None:
    data = truth.decay(seeded(9), 1e4)
    narrow, wide = (fit_decay(data, level=level) for level in (0.683, 0.997))
    ratio = (wide.high - wide.low) / (narrow.high - narrow.low)
    assert ratio == pytest.approx(stats.norm.ppf(0.9985) / stats.norm.ppf(0.8415), rel=0.02)


def all_steps() -> Iterator[tuple[Any, str]]:
    response = truth.response(seeded(2), 1e6, 0.3e-9)
    data = truth.decay(seeded(10), 1e5, (6e-9, 1e-9), (0.4, 0.6), response=0.3e-9)
    yield fit_decay_steps(data, response, 2), "decay"
    lines = ((625e-9, 2e-9, 0.4), (645e-9, 15e-9, 0.6))
    yield (
        fit_spectrum_steps(truth.spectrum(seeded(11), 1e5, lines, 1.5e-9), sidebands=1),
        "spectrum",
    )
    yield fit_g2_steps(truth.pulsed(seeded(12), 1e4, 0.2, background=0.1), jitter=0.5e-9), "g2"


def test_fits_come_in_slices() -> None:
    for steps, name in all_steps():
        *between, last = list(steps)
        assert len(between) > 10, name
        assert set(between) == {None}, name
        assert last is not None, name
        assert not last.cautions, (name, last.cautions)


def test_fits_can_be_pickled() -> None:
    fit = fit_g2(truth.continuous(seeded(13), 1e5, 0.2), pumping="continuous", jitter=1e-9)
    again = pickle.loads(pickle.dumps(fit))
    assert again.g2_zero == fit.g2_zero
    assert np.array_equal(again.model, fit.model)
    assert not fit.model.flags.writeable


# Invariance


def test_the_unit_of_time_does_not_matter() -> None:
    data = truth.decay(seeded(14), 1e4)
    slow = replace(data, times=data.times * 1e6 + 3.0, width=data.width * 1e6)
    one, other = fit_decay(data), fit_decay(slow)
    assert other.lifetime == pytest.approx(1e6 * one.lifetime, rel=1e-6)
    assert other.high == pytest.approx(1e6 * one.high, rel=1e-5)
    assert other.background.value == pytest.approx(one.background.value, rel=1e-4)


def test_the_scale_of_a_spectrum_does_not_matter() -> None:
    data = truth.spectrum(seeded(15), 1e5, ((640e-9, 6e-9, 1.0),), 5e-9)
    assert data.gain is not None
    scaled = replace(data, counts=data.counts * 3e7, gain=data.gain * 3e7)
    one, other = fit_spectrum(data), fit_spectrum(scaled)
    assert other.fast_linewidth.value == pytest.approx(one.fast_linewidth.value, rel=1e-5)
    assert other.slow_linewidth.low == pytest.approx(one.slow_linewidth.low, rel=1e-4)
    assert other.background.value == pytest.approx(3e7 * one.background.value, rel=1e-4)
    assert other.p_value == pytest.approx(one.p_value, abs=1e-6)


def test_delays_may_be_mirrored() -> None:
    data = truth.pulsed(seeded(16), 1e4, 0.3, background=0.1)
    mirrored = replace(data, times=-data.times[::-1], counts=data.counts[::-1].copy())
    one, other = (fit_g2(which, jitter=0.5e-9) for which in (data, mirrored))
    assert other.g2_zero == pytest.approx(one.g2_zero, rel=1e-4)
    assert other.high == pytest.approx(one.high, rel=1e-3)
    assert other.centre.value == pytest.approx(-one.centre.value, rel=1e-3)


def test_missing_bins_are_left_out() -> None:
    data = truth.decay(seeded(17), 1e5)
    keep = np.ones(data.times.size, dtype=bool)
    keep[150:260] = False
    holes = replace(data, times=data.times[keep], counts=data.counts[keep])
    one, other = fit_decay(data), fit_decay(holes)
    assert other.lifetime == pytest.approx(one.lifetime, rel=0.05)
    assert other.model.shape == holes.times.shape
    assert other.low < 3e-9 < other.high


# What a fit tells


def test_the_resolution_is_taken_out() -> None:
    wide = math.hypot(5e-9, 3e-9)
    data = truth.spectrum(seeded(18), 1e6, ((640e-9, 6e-9, 1.0),), wide)
    fit = fit_spectrum(data, resolution=3e-9)
    assert fit.slow_linewidth.low < 5e-9 < fit.slow_linewidth.high
    assert fit.total_fwhm.low < total_width(6e-9, 5e-9, 640e-9) < fit.total_fwhm.high


def test_a_spectrum_becomes_inputs() -> None:
    data = truth.spectrum(seeded(19), 1e5, ((640e-9, 6e-9, 1.0),), 5e-9)
    fit = fit_spectrum(data)
    assert fit.inputs() == {
        "emission_wavelength": fit.centre,
        "fast_linewidth": fit.fast_linewidth,
        "slow_linewidth": fit.slow_linewidth,
    }
    lines = ((625e-9, 2e-9, 0.4), (645e-9, 15e-9, 0.6))
    several = fit_spectrum(truth.spectrum(seeded(20), 1e5, lines, 1.5e-9), sidebands=1).inputs()
    spectrum = several["spectrum"]
    assert isinstance(spectrum, Lines)
    (share, offset, width), (_, far, _) = spectrum.lines
    assert (share, offset) == (pytest.approx(0.4, abs=0.02), 0.0)
    assert width == pytest.approx(2e-9, rel=0.1)
    assert far == pytest.approx(20e-9, rel=0.02)


def test_a_gaussian_line_has_no_fast_width() -> None:
    data = truth.spectrum(seeded(21), 1e4, ((640e-9, 0.0, 1.0),), 8e-9)
    fit = fit_spectrum(data, shape="gaussian")
    assert fit.fast_linewidth == Estimate(0.0, 0.0, 0.0)
    assert fit.slow_linewidth.low < 8e-9 < fit.slow_linewidth.high
    assert fit.total_fwhm == fit.slow_linewidth


def test_a_spectrum_without_counts_takes_its_noise_from_the_scatter() -> None:
    waves = np.linspace(600e-9, 680e-9, 400)
    shape = line_counts(waves, (Line(1.0, 640e-9, 6e-9),), 5e-9, 0.0, 0.0)
    noise = 0.01 * np.max(shape) * seeded(22).normal(size=400)
    data = Spectrum(**truth.FILE, wavelengths=waves, counts=shape + noise)
    fit = fit_spectrum(data)
    assert fit.fast_linewidth.low < 6e-9 < fit.fast_linewidth.high
    assert np.std(fit.residuals) == pytest.approx(1.0, rel=0.05)
    assert any("noise of the spectrum is not known" in caution for caution in fit.cautions)


def test_the_accidental_coincidences_are_taken_out() -> None:
    data = truth.continuous(seeded(23), 1e6, 0.1, signal_share=0.8)
    fit = fit_g2(data, pumping="continuous", jitter=1e-9, signal_share=0.8)
    # Brouri et al. 2000: 1 + (g² − 1)/ρ²; as detected 1 − 0.9·0.64.
    assert fit.low < 1 - 0.9 * 0.64 < fit.high
    assert fit.emitter_g2_zero.low < 0.1 < fit.emitter_g2_zero.high
    assert fit.emitter_g2_zero.value == pytest.approx(1 + (fit.g2_zero - 1) / 0.64)


def test_windows_need_no_model() -> None:
    counts = np.zeros(99)
    counts[5::11] = 100  # nine peaks in the middles of periods of eleven bins
    counts[49] = 25
    data = delays(counts + 1, 1e-9)
    fit = fit_g2(data, period=11e-9)
    assert fit.window_g2 == pytest.approx(36 / 111)
    assert fit.side_p_value == pytest.approx(1.0, abs=1e-3)
    assert [area for _, area, _ in fit.areas].count(111.0) >= 6


def test_blinking_lifts_the_near_side_peaks() -> None:
    rng = seeded(24)
    edges = truth.edges_of(-250.25e-9, 0.5e-9, 1001)
    mean = 400 * np.diff(Train(25e-9, 3e-9, 0.0, 0.0, 0.1, 0.8, 60e-9).integral(edges))
    data = delays(rng.poisson(mean), 0.5e-9)
    plain = fit_g2(data, background=False)
    assert any("side peaks are not equal" in caution for caution in plain.cautions)
    fit = fit_g2(data, background=False, bunching=True)
    assert fit.bunching is not None
    assert fit.bunching_time is not None
    assert fit.low < 0.1 < fit.high
    assert fit.bunching.low < 0.8 < fit.bunching.high
    assert fit.bunching_time.low < 60e-9 < fit.bunching_time.high
    assert fit.period is not None
    assert fit.period.value == pytest.approx(25e-9, rel=2e-3)


# Cautions


def cautions_of(fit: Any) -> str:
    return " / ".join(fit.cautions)


def test_clean_data_carry_no_caution() -> None:
    response = truth.response(seeded(2), 1e7, 0.3e-9)
    assert cautions_of(fit_decay(truth.decay(seeded(25), 1e5))) == ""
    assert cautions_of(fit_decay(truth.decay(seeded(26), 1e5, response=0.3e-9), response)) == ""
    assert (
        cautions_of(fit_spectrum(truth.spectrum(seeded(27), 1e5, ((640e-9, 6e-9, 1.0),), 5e-9)))
        == ""
    )
    assert cautions_of(fit_g2(truth.pulsed(seeded(28), 1e4, 0.2), jitter=0.5e-9)) == ""
    continuous = truth.continuous(seeded(29), 1e5, 0.2)
    assert cautions_of(fit_g2(continuous, pumping="continuous", jitter=1e-9)) == ""


def test_cautions_of_a_decay() -> None:
    short = truth.decay(seeded(30), 1e5, (0.4e-9,), response=0.4e-9)
    response = truth.response(seeded(2), 1e7, 0.4e-9)
    assert "shorter than the response is wide" in cautions_of(fit_decay(short, response))
    few = truth.response(seeded(2), 1e4, 0.4e-9)
    assert "holds fewer counts" in cautions_of(fit_decay(short, few))
    long = truth.decay(seeded(31), 1e5, (25e-9,))
    assert "background is not reached" in cautions_of(fit_decay(long))
    wide = histogram(seeded(32).poisson(1e4 * 0.3 ** np.arange(30.0) + 2))
    assert "shorter than three bins" in cautions_of(fit_decay(wide))
    two = truth.decay(seeded(33), 1e6, (6e-9, 1e-9), (0.5, 0.5))
    assert "more than noise" in cautions_of(fit_decay(two))
    one = fit_decay(truth.decay(seeded(34), 3e3), None, 2)
    assert "cannot be told apart" in cautions_of(one)
    data = truth.decay(seeded(35), 1e5)
    scaled = replace(data, counts=data.counts * 0.317, counting=False)
    fit = fit_decay(scaled)
    assert "not whole counts" in cautions_of(fit)
    assert fit.high - fit.low == pytest.approx(fit_decay(data).high - fit_decay(data).low, rel=0.1)


def test_cautions_of_a_spectrum() -> None:
    narrow = truth.spectrum(seeded(36), 1e4, ((640e-9, 0.25e-9, 1.0),), 0.0)
    assert "narrower than three samples" in cautions_of(fit_spectrum(narrow, shape="lorentzian"))
    cut = truth.spectrum(seeded(37), 1e4, ((603e-9, 12e-9, 1.0),), 0.0)
    assert "cut by the end" in cautions_of(fit_spectrum(cut, shape="lorentzian"))
    wide = truth.spectrum(seeded(38), 1e4, ((640e-9, 30e-9, 1.0),), 0.0)
    assert "background is not reached" in cautions_of(fit_spectrum(wide, shape="lorentzian"))
    pure = truth.spectrum(seeded(39), 1e4, ((640e-9, 8e-9, 1.0),), 0.0)
    assert "slow width of zero" in cautions_of(fit_spectrum(pure))
    assert "more than noise" in cautions_of(
        fit_spectrum(truth.spectrum(seeded(40), 1e5, ((640e-9, 8e-9, 1.0),), 0.0), shape="gaussian")
    )
    assert "narrower than the resolution" in cautions_of(fit_spectrum(pure, resolution=9e-9))


def test_cautions_of_coincidences() -> None:
    few = truth.pulsed(seeded(41), 1e3, 0.05)
    assert "only" in cautions_of(fit_g2(few, background=False))
    near = truth.pulsed(seeded(42), 1e5, 0.2, decay_time=14e-9)
    assert "peaks overlap" in cautions_of(fit_g2(near, jitter=0.5e-9, period=50e-9))
    narrow = truth.continuous(seeded(43), 1e6, 0.2, decay_time=0.5e-9, jitter=0.3e-9)
    told = cautions_of(fit_g2(narrow, pumping="continuous"))
    assert "narrower than three bins" in told
    assert "no jitter is given" in told
    wide = truth.continuous(seeded(44), 1e6, 0.2, decay_time=15e-9)
    assert "far level is not reached" in cautions_of(
        fit_g2(wide, pumping="continuous", jitter=1e-9)
    )
    clean = truth.continuous(seeded(45), 1e6, 0.05)
    assert "below zero" in cautions_of(
        fit_g2(clean, pumping="continuous", jitter=1e-9, signal_share=0.8)
    )
    deep = fit_g2(clean, pumping="continuous", jitter=15e-9)
    assert deep.g2_zero == pytest.approx(0.0, abs=1e-6)
    assert "limit of zero" in cautions_of(deep)
    assert "jitter is wider" in cautions_of(deep)
    assert deep.low == 0.0


# Refusals


@pytest.mark.parametrize(
    "asked",
    [
        {"components": 3},
        {"components": True},
        {"level": 1.0},
        {"level": "high"},
        {"period": 1e-12},
        {"period": float("nan")},
        {"response": "file"},
    ],
)
def test_a_decay_that_cannot_be_asked_for(asked: dict[str, Any]) -> None:
    with pytest.raises(InputError):
        fit_decay(truth.decay(seeded(46), 1e3), **asked)


@pytest.mark.parametrize(
    "asked",
    [{"sidebands": 7}, {"sidebands": 1.5}, {"shape": "box"}, {"resolution": -1e-9}, {"level": 0}],
)
def test_a_spectrum_that_cannot_be_asked_for(asked: dict[str, Any]) -> None:
    data = truth.spectrum(seeded(47), 1e4, ((640e-9, 6e-9, 1.0),), 5e-9)
    with pytest.raises(InputError):
        fit_spectrum(data, **asked)


@pytest.mark.parametrize(
    "asked",
    [
        {"pumping": "both"},
        {"jitter": -1e-9},
        {"signal_share": 0.0},
        {"signal_share": 1.1},
        {"period": 1e-10},
    ],
)
def test_coincidences_that_cannot_be_asked_for(asked: dict[str, Any]) -> None:
    with pytest.raises(InputError):
        fit_g2(truth.pulsed(seeded(48), 1e4, 0.2), **asked)


def test_other_data_are_refused() -> None:
    data = truth.decay(seeded(49), 1e3)
    for fit in (fit_spectrum, fit_g2):
        with pytest.raises(InputError):
            fit(data)


def test_data_that_hold_nothing_are_refused() -> None:
    flat = seeded(50).poisson(5.0, 400).astype(float)
    with pytest.raises(DataError, match="too few"):
        fit_decay(histogram(np.zeros(100)))
    with pytest.raises(DataError, match="no decay"):
        fit_decay(histogram(np.full(200, 50.0)))
    with pytest.raises(DataError, match="no pulse"):
        fit_decay(truth.decay(seeded(51), 1e4), histogram(np.zeros(1000), 50e-12))
    with pytest.raises(DataError, match="no line"):
        fit_spectrum(
            Spectrum(
                **truth.FILE,
                wavelengths=np.linspace(600e-9, 680e-9, 400),
                counts=flat,
                gain=np.ones(400),
                floor=np.zeros(400),
            )
        )
    with pytest.raises(DataError, match="no dip"):
        fit_g2(delays(flat, 1e-9), pumping="continuous")
    with pytest.raises(DataError, match="period"):
        fit_g2(delays(flat, 1e-9))
    with pytest.raises(DataError, match="too few"):
        fit_g2(delays(np.zeros(100), 1e-9))
    with pytest.raises(DataError, match="two periods"):
        fit_g2(delays(flat, 1e-9), period=300e-9)
    with pytest.raises(DataError, match="jitter is too large"):
        fit_g2(delays(flat, 1e-9), period=20e-9, jitter=10e-9)


def test_the_first_slope_and_the_mean_of_two_exponentials() -> None:
    response = truth.response(seeded(2), 3e7, 0.3e-9)
    data = truth.decay(seeded(52), 1e6, (6e-9, 1e-9), (0.4, 0.6), response=0.3e-9)
    fit = fit_decay(data, response, 2)
    assert isinstance(fit, DecayFit)
    slow, fast = fit.lifetimes
    assert slow.low < 6e-9 < slow.high
    assert fast.low < 1e-9 < fast.high
    assert fit.low < 0.4 * 6e-9 + 0.6 * 1e-9 < fit.high
    assert fit.initial_rate.low < 0.4 / 6e-9 + 0.6 / 1e-9 < fit.initial_rate.high
    shares = [one.value for one in fit.shares]
    assert sum(shares) == pytest.approx(1.0)
    mean = sum(a * t.value for a, t in zip(shares, fit.lifetimes, strict=True))
    rate = sum(a / t.value for a, t in zip(shares, fit.lifetimes, strict=True))
    assert fit.lifetime == pytest.approx(mean, rel=1e-5)
    assert fit.initial_rate.value == pytest.approx(rate, rel=1e-5)
