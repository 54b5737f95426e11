"""Spectral overlap and averages over slow wandering against quadrature of the integrals themselves.

Every reference is the defining integral, evaluated by adaptive quadrature (SciPy's `quad` with break
points, mpmath's at 30 digits) from rates that are worked out here from the inputs. Measured spectra
are summed piece by piece, with resonances from far broader to far narrower than the sampling.
Agreement is 1e-9 relative unless a looser figure stands beside the test.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable
from typing import Any, NamedTuple

import mpmath as mp
import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import speed_of_light
from scipy.integrate import quad
from scipy.special import erfc

import explorer
from explorer.physics.wandering import voigt_deficit, voigt_mean

Array = NDArray[np.float64]
CIRCLE = 2 * np.pi * speed_of_light
WAVELENGTH = 650e-9
AVERAGES = ["cavity_share", "effective_purcell", "device_lifetime"]
EXACT = 1e-9


class Numbers(NamedTuple):
    """Angular rates of a point [rad/s], by definition."""

    radiative: float
    elsewhere: float
    dephasing: float
    kappa: float
    ideal: float  # rate into the mode of a line far narrower than the resonance, on it
    detuning: float
    sigma: float


def angular(width: float, wavelength: float) -> float:
    """FWHM between the two wavelengths that lie half a width to either side."""
    return CIRCLE * width / ((wavelength - width / 2) * (wavelength + width / 2))


def numbers_of(point: dict[str, Any]) -> Numbers:
    get = {
        "lifetime": 20e-9, "quantum_yield": 0.9, "fast_linewidth": 20e-9, "slow_linewidth": 0.0,
        "quality_factor": 100.0, "mode_volume": 1.0, "other_modes": 1.0, "quenching": 0.0,
        "dipole_alignment": 1 / 3, "resonance_wavelength": WAVELENGTH, **point,
    }  # fmt: skip
    radiative = get["quantum_yield"] / get["lifetime"]
    elsewhere = (
        radiative * (get["other_modes"] + get["quenching"])
        + (1 - get["quantum_yield"]) / get["lifetime"]
    )
    purcell = 3 / (4 * np.pi**2) * get["quality_factor"] / get["mode_volume"]
    return Numbers(
        radiative,
        elsewhere,
        max(angular(get["fast_linewidth"], WAVELENGTH) - 1 / get["lifetime"], 0.0),
        CIRCLE / get["resonance_wavelength"] / get["quality_factor"],
        radiative * purcell * get["dipole_alignment"],
        CIRCLE
        * (get["resonance_wavelength"] - WAVELENGTH)
        / (get["resonance_wavelength"] * WAVELENGTH),
        angular(get["slow_linewidth"], WAVELENGTH) / (2 * np.sqrt(2 * np.log(2))),
    )


def overlap_of_line(width: float, kappa: float, offset: float) -> float:
    """∫ line × resonance: a normalised Lorentzian of this FWHM and one of height 1, by `quad`.

    Counted from the nearer of the two centres, so that no digits are lost between them.
    """
    a, b = width / 2, kappa / 2

    def from_line(u: float) -> float:
        return a / np.pi / (u**2 + a**2) * b**2 / ((offset + u) ** 2 + b**2)

    def from_resonance(u: float) -> float:
        return a / np.pi / ((u - offset) ** 2 + a**2) * b**2 / (u**2 + b**2)

    far = 1e7 * (a + b + abs(offset))  # the tails fall as the fourth power: 1e-20 lies beyond
    if offset == 0:
        return 2 * pieces(from_resonance, steps(min(a, b), far))
    total = 0.0
    for function, scale, towards in ((from_line, a, -offset), (from_resonance, b, offset)):
        way = np.sign(towards)
        total += pieces(lambda u, f=function, w=way: f(w * u), steps(scale, abs(offset) / 2))
        total += pieces(lambda u, f=function, w=way: f(-w * u), steps(scale, far))
    return total


def steps(scale: float, end: float) -> list[float]:
    """Break points from 0 that grow by factors of four from a quarter of the scale."""
    growing = scale / 4 * 4.0 ** np.arange(60)
    return [0.0, *(float(cut) for cut in growing if cut < end), end]


def pieces(integrand: Callable[[float], float], cuts: list[float]) -> float:
    values = [
        quad(integrand, low, high, epsabs=0, epsrel=1e-12, limit=200)[0]
        for low, high in itertools.pairwise(cuts)
    ]
    return float(np.sum(values))


# --- one line and several ------------------------------------------------------------------------


@pytest.mark.parametrize("quality", [1.0, 30.0, 1e3, 1e6, 1e9])
@pytest.mark.parametrize("width", [0.0, 1e-14, 1e-11, 2e-9, 60e-9])
@pytest.mark.parametrize("shift", [0.0, 1e-12, 3e-9])
def test_overlap_of_a_single_line(quality: float, width: float, shift: float) -> None:
    point = {
        "quality_factor": quality,
        "fast_linewidth": width,
        "resonance_wavelength": WAVELENGTH + shift,
    }
    found = explorer.evaluate(point, ["spectral_overlap"])["spectral_overlap"]
    n = numbers_of(point)
    expected = overlap_of_line(n.elsewhere + n.dephasing, n.kappa, n.detuning)
    assert found == pytest.approx(expected, rel=EXACT)


LINES = explorer.Lines([(0.5, 0.0, 1e-11), (0.25, 6e-9, 3e-9), (0.2, -15e-9, 25e-9)])


def lines_at(point: dict[str, Any]) -> list[tuple[float, float, float]]:
    """(share, frequency from the resonance, FWHM in the device) of every line."""
    n = numbers_of(point)
    lifetime = point.get("lifetime", 20e-9)
    rows = []
    for share, offset, width in LINES.lines:
        own = WAVELENGTH + offset
        resonance = point.get("resonance_wavelength", WAVELENGTH)
        dephasing = max(angular(width, own) - 1 / lifetime, 0.0)
        rows.append(
            (share, CIRCLE * (resonance - own) / (resonance * own), n.elsewhere + dephasing)
        )
    return rows


@pytest.mark.parametrize("quality", [5.0, 200.0, 1e5, 1e8])
@pytest.mark.parametrize("shift", [0.0, 6e-9, -14e-9])
def test_overlap_of_lines(quality: float, shift: float) -> None:
    point = {
        "quality_factor": quality,
        "resonance_wavelength": WAVELENGTH + shift,
        "spectrum": LINES,
    }
    found = explorer.evaluate(point, ["spectral_overlap"])["spectral_overlap"]
    kappa = numbers_of(point).kappa
    expected = sum(
        share * overlap_of_line(width, kappa, offset) for share, offset, width in lines_at(point)
    )
    assert found == pytest.approx(expected, rel=EXACT)


# --- measured spectra ----------------------------------------------------------------------------


def measured(seed: int, count: int) -> explorer.Samples:
    """Invented counts on an uneven grid: a peak, a shoulder, noise, and a gap without light."""
    random = np.random.default_rng(seed)
    offsets = np.sort(random.uniform(-60e-9, 60e-9, count))
    counts = 900 * np.exp(-((offsets / 14e-9) ** 2)) + 150 / (1 + ((offsets - 25e-9) / 5e-9) ** 2)
    counts *= random.uniform(0.7, 1.3, count)
    counts[count // 5 : count // 5 + 3] = 0
    return explorer.Samples(offsets, counts)


def density_of(spectrum: explorer.Samples) -> tuple[list[mp.mpf], list[mp.mpf]]:
    """Frequencies and photons per frequency, normalised: counts per nm times λ²/2πc, linear between."""
    rows = sorted(
        (2 * mp.pi * mp.mpf(speed_of_light) / wavelength, mp.mpf(float(counts)) * wavelength**2)
        for wavelength, counts in (
            (mp.mpf(WAVELENGTH) + mp.mpf(float(offset)), counts)
            for offset, counts in zip(spectrum.offsets, spectrum.counts, strict=True)
        )
    )
    omega, density = [row[0] for row in rows], [row[1] for row in rows]
    total = sum(
        (omega[i + 1] - omega[i]) * (density[i + 1] + density[i]) / 2 for i in range(len(rows) - 1)
    )
    return omega, [value / total for value in density]


def overlap_of_samples(
    spectrum: explorer.Samples, centre: mp.mpf, kappa: mp.mpf, low: Any = None, high: Any = None
) -> mp.mpf:
    """∫ s(ω) (κ/2)²/((ω−ωc)² + (κ/2)²) dω by quadrature of every piece, in tan x = 2(ω−ωc)/κ."""
    omega, density = density_of(spectrum)
    total = mp.mpf(0)
    for i in range(len(omega) - 1):
        left, right = omega[i], omega[i + 1]
        slope = (density[i + 1] - density[i]) / (right - left)

        def integrand(x: mp.mpf, i: int = i, slope: mp.mpf = slope) -> mp.mpf:
            return density[i] + slope * (centre + mp.tan(x) * kappa / 2 - omega[i])

        start = left if low is None else min(max(left, low), right)
        stop = right if high is None else min(max(left, high), right)
        ends = [mp.atan(2 * (end - centre) / kappa) for end in (start, stop)]
        if ends[1] > ends[0]:
            turns = [cut for cut in TURNS if ends[0] < cut < ends[1]]
            total += mp.quad(integrand, [ends[0], *turns, ends[1]]) * kappa / 2
    return total


#: Break points that close in on ±π/2, where a piece far from a narrow resonance lies.
TURNS = sorted(
    sign * (np.pi / 2 - 4.0**-power)
    for sign in (-1, 1)
    for power in range(-1, 24)
    if 4.0**-power < 1.5
)


SPECTRA = {
    "two samples": explorer.Samples([-30e-9, 50e-9], [1.0, 5.0]),
    "40 samples": measured(40, 40),
    "150 samples": measured(5, 150),
}


@pytest.mark.parametrize("quality", [1.0, 20.0, 500.0, 1e5, 1e8, 1e10])
@pytest.mark.parametrize("shift", [0.0, 11.3e-9, -80e-9])
@pytest.mark.parametrize("name", SPECTRA)
def test_overlap_of_a_measured_spectrum(quality: float, shift: float, name: str) -> None:
    """Widths down to 1e-8 of the sampling; the last shift lies outside the measured range."""
    spectrum = SPECTRA[name]
    point = {
        "quality_factor": quality,
        "resonance_wavelength": WAVELENGTH + shift,
        "spectrum": spectrum,
    }
    found = explorer.evaluate(point, ["spectral_overlap"])["spectral_overlap"]
    with mp.workdps(30):
        centre = 2 * mp.pi * mp.mpf(speed_of_light) / mp.mpf(WAVELENGTH + shift)
        expected = overlap_of_samples(spectrum, centre, centre / mp.mpf(quality))
        difference = float(abs(found / expected - 1))
    print(f"Q {quality:g}, {len(spectrum)} samples: {difference:.1e}")
    assert difference < EXACT


@pytest.mark.parametrize("quality", [20.0, 1e4, 1e9])
@pytest.mark.parametrize(("width", "centre"), [(8e-9, 0.0), (40e-9, 20e-9), (0.05e-9, -3e-9)])
def test_filter_on_a_measured_spectrum(quality: float, width: float, centre: float) -> None:
    """The product of spectrum and resonance inside the filter over all of it."""
    spectrum = measured(5, 60)
    point = {
        "quality_factor": quality, "spectrum": spectrum, "filter_width": width,
        "filter_centre": WAVELENGTH + centre, "resonance_wavelength": WAVELENGTH + 1.7e-9,
    }  # fmt: skip
    found = explorer.evaluate(point, ["filter_share"])["filter_share"]
    with mp.workdps(30):
        whole = 2 * mp.pi * mp.mpf(speed_of_light)
        resonance = whole / mp.mpf(point["resonance_wavelength"])
        edges = [
            whole / (mp.mpf(point["filter_centre"]) + sign * mp.mpf(width) / 2) for sign in (1, -1)
        ]
        kappa = resonance / mp.mpf(quality)
        inside = overlap_of_samples(spectrum, resonance, kappa, *edges)
        expected = inside / overlap_of_samples(spectrum, resonance, kappa)
        assert float(abs(found / expected - 1)) < EXACT


# --- slow wandering ------------------------------------------------------------------------------


def wandering_mean(
    outcome: Callable[[float], Any],
    sigma: float,
    features: list[tuple[float, float]],
    nodes_each: int = 20,
) -> Array:
    """Gaussian mean of outcomes over shifts, by Gauss–Legendre on panels that close in on features.

    features: (shift, width) of all structure. The panels shrink to a quarter of a width and grow by
    factors of two from there; 20 nodes each: far below 1e-12 for functions with poles that far away.
    """
    # The weight beyond 12 sigma is 1e-32; a narrow resonance farther out is seen from there.
    cuts = {-12.0, 12.0, *np.linspace(-12, 12, 13)}
    for centre, width in features:
        distance = width / 4
        cuts.add(float(np.clip(centre / sigma, -12, 12)))
        while distance < 4 * sigma:
            cuts |= {
                float(np.clip((centre + sign * distance) / sigma, -12, 12)) for sign in (-1, 1)
            }
            distance *= 2
    edges = np.array(sorted(cuts))
    nodes, weights = np.polynomial.legendre.leggauss(nodes_each)
    total: Any = 0.0
    for low, high in itertools.pairwise(edges):
        for node, weight in zip(nodes, weights, strict=True):
            x = (low + high) / 2 + (high - low) / 2 * node
            chance = np.exp(-(x**2) / 2) / np.sqrt(2 * np.pi) * weight * (high - low) / 2
            total = total + chance * np.asarray(outcome(x * sigma))
    return np.asarray(total / (1 - erfc(12 / np.sqrt(2))))


def outcomes(n: Numbers, overlap: float) -> tuple[float, float, float]:
    """Share of the mode, its rate over the bulk rate, lifetime: R κ/(R + κ) against all else."""
    exchange = n.ideal * overlap
    rate = exchange * n.kappa / (exchange + n.kappa)
    return rate / (rate + n.elsewhere), rate / n.radiative, 1 / (rate + n.elsewhere)


WANDERING = [
    (quality, volume, fast, slow, shift)
    for quality in (10.0, 3e3, 1e7)
    for volume, fast in ((1.0, 1e-14), (1e-3, 1e-9), (1e-4, 2e-12), (10.0, 40e-9))
    for slow, shift in ((5e-15, 0.0), (0.3e-9, 0.1e-9), (25e-9, 0.0), (25e-9, 30e-9))
]


def wandering_point(case: tuple[float, ...]) -> dict[str, Any]:
    quality, volume, fast, slow, shift = case
    return {
        "quality_factor": quality, "mode_volume": volume, "fast_linewidth": fast, "slow_linewidth": slow,
        "resonance_wavelength": WAVELENGTH + shift, "dipole_alignment": 1.0, "other_modes": 0.4,
    }  # fmt: skip


def single_line_average(n: Numbers) -> Array:
    total = n.kappa + n.elsewhere + n.dephasing

    def outcome(shift: float) -> tuple[float, float, float]:
        return outcomes(n, n.kappa / total / (1 + (2 * (n.detuning + shift) / total) ** 2))

    return wandering_mean(outcome, n.sigma, [(-n.detuning, total / 2)])


def test_wandering_averages_of_a_single_line() -> None:
    worst = dict.fromkeys(AVERAGES, 0.0)
    for case in WANDERING:
        point = wandering_point(case)
        found = explorer.evaluate(point, AVERAGES)
        expected = single_line_average(numbers_of(point))
        for name, value in zip(AVERAGES, expected, strict=True):
            worst[name] = max(worst[name], abs(found[name] / value - 1))
    print(f"single line, wandering: worst {worst}")
    assert max(worst.values()) < EXACT


@pytest.mark.parametrize("case", WANDERING[::7])
def test_wandering_averages_by_adaptive_quadrature(case: tuple[float, ...]) -> None:
    """The panels above against mpmath's adaptive rule, and the values once more."""
    point = wandering_point(case)
    n = numbers_of(point)
    found = explorer.evaluate(point, AVERAGES)
    total = n.kappa + n.elsewhere + n.dephasing
    with mp.workdps(25):
        cuts = {mp.mpf(-12), mp.mpf(12)}
        for centre, scale in ((0.0, 1.0), (-n.detuning / n.sigma, total / n.sigma)):
            for power in range(-2, 14):
                for sign in (-1, 1):
                    cuts.add(mp.mpf(min(max(centre + sign * scale * 4.0**power, -12.0), 12.0)))
        panels = sorted(cuts)
        for index, name in enumerate(AVERAGES):

            def integrand(x: mp.mpf, index: int = index) -> mp.mpf:
                overlap = n.kappa / total / (1 + (2 * (n.detuning + x * n.sigma) / total) ** 2)
                return outcomes(n, overlap)[index] * mp.exp(-(x**2) / 2) / mp.sqrt(2 * mp.pi)

            expected = mp.quad(integrand, panels, maxdegree=5)
            assert abs(found[name] / float(expected) - 1) < EXACT


def test_wandering_averages_of_lines() -> None:
    worst = dict.fromkeys(AVERAGES, 0.0)
    for quality in (20.0, 3e3, 1e7):
        for volume in (1.0, 1e-3):
            for slow, shift in ((0.2e-9, 0.0), (10e-9, 5e-9), (60e-9, 0.0)):
                point = wandering_point((quality, volume, 1e-9, slow, shift)) | {"spectrum": LINES}
                n = numbers_of(point)
                rows = lines_at(point)

                def outcome(
                    moved: float, n: Numbers = n, rows: Any = rows
                ) -> tuple[float, float, float]:
                    overlap = 0.0
                    for share, offset, width in rows:
                        total = n.kappa + width
                        overlap += (
                            share * n.kappa / total / (1 + (2 * (offset + moved) / total) ** 2)
                        )
                    return outcomes(n, overlap)

                features = [(-offset, (n.kappa + width) / 2) for _, offset, width in rows]
                expected = wandering_mean(outcome, n.sigma, features)
                found = explorer.evaluate(point, AVERAGES)
                for name, value in zip(AVERAGES, expected, strict=True):
                    worst[name] = max(worst[name], abs(found[name] / value - 1))
    print(f"lines, wandering: worst {worst}")
    assert max(worst.values()) < EXACT


# --- wandering light inside a filter -------------------------------------------------------------


def window(
    low: float, high: float, kappa: float, coherence: float, g_squared: float, detuning: float
) -> float:
    """∫ 1/|(κ/2+iw)(Γ/2+i(w−δ))+g²|² dw inside a window over all of it, by residues at 30 digits."""
    k, c, g2, d, lo, hi = (
        mp.mpf(value) for value in (kappa, coherence, g_squared, detuning, low, high)
    )
    one, two = mp.mpc(0, k / 2), mp.mpc(d, c / 2)
    root = mp.sqrt(((one - two) / 2) ** 2 + g2)
    p1, p2 = (one + two) / 2 + root, (one + two) / 2 - root
    inside = outside = mp.mpf(0)
    for pole, other in ((p1, p2), (p2, p1)):
        residue = 1 / ((pole - other) * (pole - mp.conj(pole)) * (pole - mp.conj(other)))
        inside += 2 * mp.re(residue * (mp.log(hi - pole) - mp.log(lo - pole)))
        outside += mp.re(mp.mpc(0, 2 * mp.pi) * residue)
    return float(inside / outside)


def filter_edges(point: dict[str, Any]) -> tuple[float, float]:
    """Lower and upper edge from the resonance [rad/s], from distances in wavelength."""
    resonance = point["resonance_wavelength"]
    ends = [
        CIRCLE * (resonance - point["filter_centre"] - sign * point["filter_width"] / 2)
        / (resonance * (point["filter_centre"] + sign * point["filter_width"] / 2))
        for sign in (1, -1)
    ]  # fmt: skip
    return ends[0], ends[1]


FILTERED = [
    (quality, volume, fast, slow, shift, width, centre)
    for quality, volume, fast in ((30.0, 1.0, 2e-9), (3e3, 1e-3, 2e-12), (1e4, 1e-2, 1e-10), (1e6, 1e-1, 1e-9))
    for slow, shift, width, centre in (
        (2e-9, 0.0, 1e-9, 0.0), (0.1e-9, 0.05e-9, 0.2e-9, 0.05e-9), (20e-9, 4e-9, 10e-9, -3e-9),
    )
]  # fmt: skip


def filtered_point(case: tuple[float, ...]) -> dict[str, Any]:
    point = wandering_point(case[:5])
    return point | {
        "filter_width": case[5],
        "filter_centre": point["resonance_wavelength"] + case[6],
    }


@pytest.mark.parametrize("case", FILTERED)
def test_wandering_light_inside_a_filter(case: tuple[float, ...]) -> None:
    """⟨β S⟩/⟨β⟩, S the share of the exact outgoing spectrum inside the window."""
    point = filtered_point(case)
    n = numbers_of(point)
    low, high = filter_edges(point)
    coherence = n.elsewhere + n.dephasing
    total = n.kappa + coherence
    g_squared = n.ideal * n.kappa / 4
    features = [(-n.detuning, total / 2)]
    for edge in (low, high):  # where a pole of the spectrum meets an edge
        meets = edge - 1j * (coherence / 2 + g_squared / (n.kappa / 2 + 1j * edge))
        features.append((meets.real - n.detuning, abs(meets.imag)))

    def outcome(shift: float) -> tuple[float, float]:
        detuning = n.detuning + shift
        share = outcomes(n, n.kappa / total / (1 + (2 * detuning / total) ** 2))[0]
        return share * window(low, high, n.kappa, coherence, g_squared, detuning), share

    with mp.workdps(30):
        passed, share = wandering_mean(outcome, n.sigma, features, nodes_each=10)
    found = explorer.evaluate(point, ["filter_share"])["filter_share"]
    print(f"filter, wandering: {found * share / passed - 1:.1e} of {passed / share:.3g}")
    assert found == pytest.approx(passed / share, rel=EXACT)


@pytest.mark.parametrize("case", FILTERED[::4] + FILTERED[2:3])
def test_wandering_lines_inside_a_filter(case: tuple[float, ...]) -> None:
    """⟨β Σ passed/Σ overlap⟩/⟨β⟩ with the product of each line and the resonance."""
    point = filtered_point(case) | {"spectrum": LINES}
    n = numbers_of(point)
    rows = lines_at(point)
    low, high = filter_edges(point)
    features = []
    for _, offset, width in rows:
        features.append((-offset, (n.kappa + width) / 2))
        features += [(edge - offset, width / 2) for edge in (low, high)]

    def outcome(shift: float) -> tuple[float, float]:
        overlap = passed = 0.0
        for share, offset, width in rows:
            total = n.kappa + width
            own = share * n.kappa / total / (1 + (2 * (offset + shift) / total) ** 2)
            overlap += own
            passed += own * window(low, high, n.kappa, width, 0.0, offset + shift)
        share = outcomes(n, overlap)[0]
        return share * passed / overlap, share

    with mp.workdps(30):
        passed, share = wandering_mean(outcome, n.sigma, features, nodes_each=7)
    found = explorer.evaluate(point, ["filter_share"])["filter_share"]
    print(f"filter, wandering lines: {found * share / passed - 1:.1e} of {passed / share:.3g}")
    assert found == pytest.approx(passed / share, rel=EXACT)


# --- wandering of a measured spectrum ------------------------------------------------------------


class Sampled:
    """A measured spectrum in double precision: frequencies from the centre of emission, density."""

    def __init__(self, spectrum: explorer.Samples) -> None:
        with mp.workdps(30):
            omega, density = density_of(spectrum)
            middle = 2 * mp.pi * mp.mpf(speed_of_light) / mp.mpf(WAVELENGTH)
            self.omega = np.array([float(value - middle) for value in omega])
            self.density = np.array([float(value) for value in density])

    def overlap(
        self, centre: float, kappa: float, low: float = -np.inf, high: float = np.inf
    ) -> float:
        """Gauss–Legendre on panels that end at every sample and close in on the resonance."""
        distance = kappa / 4 * 2.5 ** np.arange(60)
        cuts = np.concatenate(
            [self.omega, centre + distance, centre - distance, [centre, low, high]]
        )
        cuts = np.unique(np.clip(cuts, max(self.omega[0], low), min(self.omega[-1], high)))
        if cuts.size < 2:
            return 0.0
        x = cuts[:-1, None] + np.diff(cuts)[:, None] * (1 + NODES) / 2
        values = np.interp(x, self.omega, self.density) / (1 + ((x - centre) * 2 / kappa) ** 2)
        return float((values @ WEIGHTS) @ np.diff(cuts) / 2)


NODES, WEIGHTS = np.polynomial.legendre.leggauss(12)
SMOOTH_SPECTRUM = explorer.Samples(
    np.linspace(-40e-9, 40e-9, 33), np.exp(-((np.linspace(-40, 40, 33) / 14) ** 2)) + 1e-4
)


@pytest.mark.parametrize(
    ("quality", "slow", "average", "lifetime", "filtered"),
    [
        (20.0, 1e-9, 1e-9, 1e-9, 1e-8),
        (20.0, 30e-9, 1e-9, 1e-9, 1e-5),
        (100.0, 1e-9, 1e-9, 1e-9, 1e-8),
        (100.0, 30e-9, 1e-9, 1e-9, 1e-5),
        (3e3, 1e-9, 1e-7, 1e-7, 1e-8),
        (3e3, 30e-9, 2e-5, 2e-3, 1e-5),
        (1e6, 10e-9, 5e-5, 5e-5, 1e-7),
    ],
)
def test_wandering_measured_spectrum(
    quality: float, slow: float, average: float, lifetime: float, filtered: float
) -> None:
    """1e-9 where the resonance is wider than two samples; looser figures beside the others.

    The nodes of this average do not follow the kinks that the outcome has wherever a sample meets a
    narrow resonance (1e-5 on a smooth spectrum) or an edge of the filter (1e-5). The mean lifetime
    is worst, 1e-3: this spectrum is cut, and a narrow resonance beyond its end meets no light, so
    that the lifetime jumps there from short to long.
    """
    allowed = dict(
        zip([*AVERAGES, "filter_share"], (average, average, lifetime, filtered), strict=True)
    )
    point = wandering_point((quality, 1e-2, 20e-9, slow, 2e-9)) | {
        "spectrum": SMOOTH_SPECTRUM, "filter_width": 9e-9, "filter_centre": WAVELENGTH + 3e-9,
    }  # fmt: skip
    n = numbers_of(point)
    line = Sampled(SMOOTH_SPECTRUM)
    low, high = filter_edges(point)

    def outcome(shift: float) -> tuple[float, ...]:
        centre = -(n.detuning + shift)
        overlap = line.overlap(centre, n.kappa)
        passed = line.overlap(centre, n.kappa, centre + low, centre + high)
        three = outcomes(n, overlap)
        return (*three, three[0] * passed / overlap if overlap else 0.0)

    kinks = [(-n.detuning - node, n.kappa / 2) for node in line.omega]
    kinks += [(edge - n.detuning - node, np.inf) for node in line.omega for edge in (low, high)]
    expected = wandering_mean(outcome, n.sigma, kinks, nodes_each=10)
    found = explorer.evaluate(point, [*AVERAGES, "filter_share"])
    expected[3] /= expected[0]
    worst = {
        name: float(abs(found[name] / value - 1))
        for name, value in zip([*AVERAGES, "filter_share"], expected, strict=True)
    }
    print(f"samples, wandering, Q {quality:g}, slow {slow:g}: {worst}")
    for name, value in worst.items():
        assert value < allowed[name], name


# --- Voigt values --------------------------------------------------------------------------------


@pytest.mark.parametrize("detuning", [0.0, 0.3, 3.0, 100.0])
def test_voigt_values_over_extreme_widths(detuning: float) -> None:
    """Share, rate and lifetime of a line that wanders, 40 digits: √π y w(x + iy) by its erfc form.

    sigma over the width from 1e-8 to 1e8, the detuning in units of the larger of the two.
    """
    worst = 0.0
    with mp.workdps(40):
        for power in range(-8, 9):
            sigma = 10.0**power
            x = detuning * max(sigma, 1.0)
            scale = mp.mpf(sigma) * mp.sqrt(2)
            z = mp.mpc(x, 0.5) / scale
            exact = deficit = None
            if abs(z) < 200:
                exact = (
                    mp.sqrt(mp.pi) * z.imag * mp.re(mp.exp(-(z**2)) * mp.erfc(mp.mpc(0, -1) * z))
                )
                deficit = 1 - exact
            else:  # far out the Gaussian is narrow: moments of the Lorentzian's Taylor series
                exact = gaussian_mean(lambda u: 1 / (1 + 4 * u**2), x, sigma)
                deficit = gaussian_mean(lambda u: 4 * u**2 / (1 + 4 * u**2), x, sigma)
            found = voigt_mean(detuning=x, sigma=sigma, width=1.0)
            missing = voigt_deficit(detuning=x, sigma=sigma, width=1.0)
            worst = max(worst, float(abs(found / exact - 1)), float(abs(missing / deficit - 1)))
    print(f"Voigt values, detuning {detuning}: worst {worst:.1e}")
    assert worst < 1e-11


def gaussian_mean(function: Callable[[mp.mpf], mp.mpf], centre: float, sigma: float) -> mp.mpf:
    def integrand(t: mp.mpf) -> mp.mpf:
        return function(centre + sigma * t) * mp.exp(-(t**2) / 2) / mp.sqrt(2 * mp.pi)

    return mp.quad(integrand, [-14, -7, -3, 0, 3, 7, 14])
