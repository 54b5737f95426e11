"""Share of light inside a frequency window, against other ways to the same integral.

References: partial fractions in 120 digits and direct quadrature by mpmath; dense panels and
adaptive quadrature by numpy and scipy; residues with the complementary error function in 40 digits.
"""

from itertools import pairwise

import mpmath as mp
import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import erfc, voigt_profile

import explorer
from explorer.physics.window import (
    line_density,
    line_window,
    outgoing_density,
    outgoing_window,
    wandering_density,
    wandering_window,
)

TOLERANCE = 1e-9


def exact_share(*, lower, upper, kappa, coherence, g_squared, detuning):
    """Partial fractions over all four poles, in 120 digits."""
    with mp.workdps(120):
        k, c, g2, d = (mp.mpf(float(x)) for x in (kappa, coherence, g_squared, detuning))
        middle = (d + 1j * (k + c) / 2) / 2
        gap = mp.sqrt(middle**2 - 1j * k / 2 * (d + 1j * c / 2) + g2) or mp.mpf(10) ** -30
        upper_poles = [middle + gap, middle - gap]
        poles = upper_poles + [mp.conj(p) for p in upper_poles]
        total = 0
        for pole in upper_poles:
            residue = 1 / mp.fprod(pole - other for other in poles if other is not pole)
            high = mp.log(mp.mpf(float(upper)) - pole) if np.isfinite(upper) else 0
            low = mp.log(mp.mpf(float(lower)) - pole) if np.isfinite(lower) else -1j * mp.pi
            total += 2 * mp.re(residue * (high - low))
        norm = 2 * mp.pi * (k + c) / ((k + c) ** 2 * (k * c / 4 + g2) + k * c * d**2)
        return total / norm


def random_line(random):
    """Rates over 13 decades, with the hard cases drawn often."""
    kappa, coherence, coupling, detuning = 10 ** random.uniform(3, 16, 4)
    detuning *= random.choice([-1, 1])
    kind = random.integers(7)
    if kind == 1:  # coincident poles
        near = 1 + random.choice([0, 1e-15, 1e-12, 1e-8, 1e-4, 1e-2])
        coupling, detuning = (
            abs(kappa - coherence) / 4 * near,
            random.choice([0, 1e-8, 1e-3]) * kappa,
        )
    elif kind == 2:
        coupling = 0.0
    elif kind == 3:
        detuning = 0.0
    elif kind == 4:
        coherence = 0.0
    elif kind == 5:
        coherence = kappa * (1 + random.choice([0, 1e-15, 1e-10, 1e-4]))
    elif kind == 6:
        coupling = max(kappa, coherence) * 10 ** random.uniform(0, 3)
    return {
        "kappa": kappa,
        "coherence": coherence,
        "g_squared": coupling**2,
        "detuning": detuning,
    }


def random_window(random, line):
    """Windows on a pole, between poles, far out; narrow, wide, half infinite."""
    middle = (line["detuning"] + 0.5j * (line["kappa"] + line["coherence"])) / 2
    distance = line["detuning"] + 0.5j * (line["coherence"] - line["kappa"])
    gap = np.sqrt((distance / 2) ** 2 + line["g_squared"])
    pole = random.choice([middle + gap, middle - gap])
    width = max(abs(pole.imag), 1e-3)
    on_pole = pole.real + width * random.normal() * 10 ** random.uniform(-2, 3)
    anywhere = random.choice([-1, 1]) * 10 ** random.uniform(3, 16)
    centre = random.choice([on_pole, on_pole, anywhere, 0, line["detuning"]])
    reach = random.choice([width * 10 ** random.uniform(-4, 4), 10 ** random.uniform(0, 16)])
    lower, upper = centre - reach * random.random(), centre + reach * random.random()
    lower = -np.inf if random.random() < 0.1 else lower
    upper = np.inf if random.random() < 0.1 else upper
    return {"lower": lower, "upper": upper if upper > lower else lower + max(1.0, abs(lower))}


def test_outgoing_window_against_partial_fractions():
    random = np.random.default_rng(11)
    cases = []
    for _ in range(1200):
        line = random_line(random)
        cases.append(random_window(random, line) | line)
    expected = np.array([float(exact_share(**case)) for case in cases])
    got = outgoing_window(**{name: np.array([case[name] for case in cases]) for name in cases[0]})
    assert expected.min() < 1e-30
    assert np.max(np.abs(got / expected - 1)) < TOLERANCE
    alone = np.array([outgoing_window(**case) for case in cases[:40]])
    np.testing.assert_array_max_ulp(alone, got[:40], 4)


@pytest.mark.parametrize("seed", range(12))
def test_outgoing_window_against_direct_integration(seed):
    random = np.random.default_rng(seed)
    kappa, coherence = 10 ** random.uniform(-1, 1, 2)
    g_squared, detuning = 10 ** random.uniform(-2, 2), random.normal()
    lower, upper = np.sort(3 * random.normal(size=2))

    def spectrum(w):
        mode, emitter = kappa / 2 + 1j * w, coherence / 2 + 1j * (w - detuning)
        return 1 / abs(mode * emitter + g_squared) ** 2

    cuts = [s * 2.0**k + c for s in (-1, 1) for k in range(-6, 8) for c in (0, detuning)]
    inside = [lower, *sorted(c for c in cuts if lower < c < upper), upper]
    expected = mp.quad(spectrum, inside) / mp.quad(spectrum, [-mp.inf, *sorted(cuts), mp.inf])
    unit = 1e9
    got = outgoing_window(
        lower=lower * unit,
        upper=upper * unit,
        kappa=kappa * unit,
        coherence=coherence * unit,
        g_squared=g_squared * unit**2,
        detuning=detuning * unit,
    )
    assert got == pytest.approx(float(expected), rel=TOLERANCE)


def test_outgoing_window_limits():
    random = np.random.default_rng(5)
    lines = [random_line(random) for _ in range(300)]
    line = {name: np.array([x[name] for x in lines]) for name in lines[0]}
    edges = np.sort(
        10 ** random.uniform(3, 16, (3, 300)) * random.choice([-1, 1], (3, 300)), axis=0
    )
    everything = outgoing_window(lower=-np.inf, upper=np.inf, **line)
    np.testing.assert_allclose(everything, 1, rtol=TOLERANCE)
    parts = [
        outgoing_window(lower=a, upper=b, **line)
        for a, b in zip([-np.inf, *edges], [*edges, np.inf], strict=True)
    ]
    np.testing.assert_allclose(np.sum(parts, axis=0), 1, rtol=TOLERANCE)
    joined = outgoing_window(lower=edges[0], upper=edges[2], **line)
    np.testing.assert_allclose(parts[1] + parts[2], joined, rtol=TOLERANCE)
    assert np.all(np.array(parts) >= 0)
    mirrored = outgoing_window(
        lower=-edges[2], upper=-edges[0], **(line | {"detuning": -line["detuning"]})
    )
    np.testing.assert_allclose(mirrored, joined, rtol=TOLERANCE)


def test_outgoing_window_grows_with_the_window():
    line = {"kappa": 3e10, "coherence": 2e9, "g_squared": 4e20, "detuning": 5e9}
    upper = np.concatenate([-np.logspace(16, 3, 400), [0], np.logspace(3, 16, 400)])
    assert np.all(np.diff(outgoing_window(lower=-1e17, upper=upper, **line)) >= -1e-15)


def test_outgoing_density_is_the_slope_of_the_window():
    random = np.random.default_rng(6)
    for _ in range(40):
        line = random_line(random)
        edge = random_window(random, line)["lower"]
        edge = 1e9 if np.isinf(edge) else edge
        middle = (line["detuning"] + 0.5j * (line["kappa"] + line["coherence"])) / 2
        gap = np.sqrt((middle - 0.5j * line["kappa"]) ** 2 + line["g_squared"])
        step = 1e-5 * min(abs(edge - middle - gap), abs(edge - middle + gap))
        if step < 1e-9 * abs(edge):
            continue
        lower, upper = edge - step, edge + step
        slope = outgoing_window(lower=lower, upper=upper, **line) / (upper - lower)
        assert outgoing_density(frequency=edge, **line) == pytest.approx(float(slope), rel=1e-7)


def half_width(*, kappa, gamma, coherence, g_squared):
    """Half width of beta(detuning), from beta = Reff/(gamma + Reff)."""
    exchange = 4 * g_squared / (kappa + coherence)
    return (kappa + coherence) / 2 * np.sqrt(1 + exchange * (1 / gamma + 1 / kappa))


def dense_average(*, lower, upper, gamma, detuning, sigma, **line):
    """Real axis, 30 nodes on panels that double away from everything that may be sharp."""
    half = half_width(gamma=gamma, **line)
    points = [(0, half), (0, 2 * np.sqrt(line["g_squared"]) + line["coherence"])]
    for edge in (lower, upper):
        if np.isfinite(edge):
            mode = line["kappa"] / 2 + 1j * edge
            meets = edge - 0.5j * line["coherence"] - 1j * line["g_squared"] / mode
            points.append((meets.real, abs(meets.imag)))
    cuts = list(np.arange(-16.0, 17))
    for place, scale in points:
        steps = np.concatenate([[0], scale / sigma / 2 * 2.0 ** np.arange(80)])
        cuts += [*((place - detuning) / sigma + steps), *((place - detuning) / sigma - steps)]
    cuts = np.unique([c for c in cuts if -16 <= c <= 16])
    nodes, weights = np.polynomial.legendre.leggauss(30)
    breadth = np.diff(cuts)[:, None] / 2
    shift = (cuts[:-1, None] + cuts[1:, None]) / 2 + breadth * nodes
    place = detuning + sigma * shift
    weight = breadth * weights * np.exp(-(shift**2) / 2) / (1 + (place / half) ** 2)
    share = outgoing_window(lower=lower, upper=upper, detuning=place, **line)
    return np.sum(weight * share) / np.sum(weight)


def random_wandering(random):
    kappa, coherence = 10 ** random.uniform(7, 14, 2)
    if random.random() < 0.3:
        kappa = coherence * 10 ** random.uniform(-1, 1)
    gamma = coherence * random.choice([1, 10 ** random.uniform(-6, 0)])
    coupling = max(kappa, coherence) * 10 ** random.uniform(-5, 1.5)
    sigma = random.choice([kappa, coherence, coupling]) * 10 ** random.uniform(-2, 3)
    detuning = random.choice([0, 1, 1, 9]) * random.normal() * random.choice([sigma, kappa])
    centre = random.choice([0, detuning, detuning + sigma * random.normal()])
    reach = random.choice([sigma, kappa, coherence]) * 10 ** random.uniform(-1, 2)
    lower, upper = centre - reach * random.random(), centre + reach * random.random()
    return {
        "lower": -np.inf if random.random() < 0.1 else lower,
        "upper": np.inf if random.random() < 0.1 else upper,
        "kappa": kappa,
        "gamma": gamma,
        "coherence": coherence,
        "g_squared": coupling**2,
        "detuning": detuning,
        "sigma": sigma,
    }


def test_wandering_window_against_dense_panels():
    random = np.random.default_rng(21)
    cases = [random_wandering(random) for _ in range(200)]
    # an edge this far from the narrow line costs the reference its digits
    limit = [max(abs(c["detuning"]), c["sigma"]) < 1e6 * c["coherence"] for c in cases]
    cases = [c for c, fine in zip(cases, limit, strict=True) if fine]
    assert len(cases) > 100
    expected = np.array([dense_average(**case) for case in cases])
    table = {name: np.array([case[name] for case in cases]) for name in cases[0]}
    got = wandering_window(**table)
    assert np.max(np.abs(got / expected - 1)) < TOLERANCE
    alone = np.array([wandering_window(**case) for case in cases[:20]])
    np.testing.assert_allclose(alone, got[:20], rtol=1e-12)


def exact_density(w, *, kappa, gamma, coherence, g_squared, detuning, sigma):
    """Residues in the detuning, each averaged by the complementary error function, in 40 digits."""
    k, y, c, g2, d, s = (
        mp.mpf(float(x)) for x in (kappa, gamma, coherence, g_squared, detuning, sigma)
    )
    half = (k + c) / 2 * mp.sqrt(1 + 4 * g2 / (k + c) * (1 / y + 1 / k))
    mode = k / 2 + 1j * w
    meets = mp.conj(w - 1j * c / 2 - 1j * g2 / mode)

    def mean(pole):
        z = (pole - d) / (s * mp.sqrt(2))
        return 1j * mp.sqrt(mp.pi / 2) / s * mp.exp(-(z**2)) * mp.erfc(-1j * z)

    def norm(x):
        return ((k + c) * (k * c / 4 + g2) + k * c * x**2 / (k + c)) / (2 * mp.pi * abs(mode) ** 2)

    top = 1j * half
    at_weight = norm(top) * half**2 / (2 * top * (top - meets) * (top - mp.conj(meets)))
    at_line = norm(meets) * half**2 / ((meets**2 + half**2) * (meets - mp.conj(meets)))
    weight = half**2 / (2 * top) * mean(top)
    return mp.re(at_weight * mean(top) + at_line * mean(meets)) / mp.re(weight)


def test_wandering_density_against_residues():
    random = np.random.default_rng(31)
    with mp.workdps(40):
        for _ in range(60):
            case = random_wandering(random)
            lower, upper = case.pop("lower"), case.pop("upper")
            w = upper if np.isinf(lower) else lower
            w = 0.0 if np.isinf(w) else w
            expected = exact_density(mp.mpf(float(w)), **case)
            got = wandering_density(frequency=w, **case)
            assert float(abs(got / expected - 1)) < TOLERANCE, case


def test_wandering_window_against_integrated_residues():
    random = np.random.default_rng(41)
    with mp.workdps(40):
        for _ in range(40):
            case = random_wandering(random)
            del case["lower"], case["upper"]
            # narrow on every scale, so that a few nodes do; wide windows are tested elsewhere
            centre = case["detuning"] + random.choice([0, 1, 6]) * case["sigma"] * random.normal()
            reach = 0.1 * min(case["sigma"], case["kappa"], case["coherence"])
            lower, upper = centre - reach, centre + reach
            if upper - lower < 1e-6 * abs(centre):
                lower, upper = -reach, reach
            nodes, weights = np.polynomial.legendre.leggauss(16)
            places = (
                mp.mpf(float(lower)) + (mp.mpf(float(upper)) - float(lower)) * (1 + n) / 2
                for n in map(float, nodes)
            )
            values = [exact_density(w, **case) for w in places]
            expected = sum(v * float(q) for v, q in zip(values, weights, strict=True))
            expected *= (upper - lower) / 2
            got = wandering_window(lower=lower, upper=upper, **case)
            assert float(abs(got / expected - 1)) < TOLERANCE, case


def test_wandering_window_limits():
    random = np.random.default_rng(51)
    cases = [random_wandering(random) for _ in range(100)]
    table = {name: np.array([case[name] for case in cases]) for name in cases[0]}
    del table["lower"], table["upper"]
    everything = wandering_window(lower=-np.inf, upper=np.inf, **table)
    np.testing.assert_allclose(everything, 1, rtol=TOLERANCE)
    edges = np.sort(table["detuning"] + table["sigma"] * random.normal(size=(2, 100)), axis=0)
    cuts = [-np.inf, *edges, np.inf]
    parts = [wandering_window(lower=a, upper=b, **table) for a, b in pairwise(cuts)]
    np.testing.assert_allclose(np.sum(parts, axis=0), 1, rtol=TOLERANCE)
    turned = table | {"detuning": -table["detuning"]}
    mirrored = wandering_window(lower=-edges[1], upper=-edges[0], **turned)
    np.testing.assert_allclose(mirrored, parts[1], rtol=TOLERANCE)
    still = {n: v for n, v in table.items() if n not in {"gamma", "sigma"}}
    np.testing.assert_array_equal(
        wandering_window(lower=edges[0], upper=edges[1], **(table | {"sigma": 0.0})),
        outgoing_window(lower=edges[0], upper=edges[1], **still),
    )


def test_wandering_window_without_other_decays_and_without_coupling():
    line = {"kappa": 1e12, "coherence": 1e11, "detuning": 3e11, "sigma": 1e12}
    window = {"lower": -4e11, "upper": 9e11}
    tiny = wandering_window(gamma=1e-6, g_squared=1e22, **line, **window)
    assert wandering_window(gamma=0.0, g_squared=1e22, **line, **window) == pytest.approx(
        float(tiny), rel=TOLERANCE
    )
    weak = wandering_window(gamma=1e9, g_squared=1e-3, **line, **window)
    assert wandering_window(gamma=1e9, g_squared=0.0, **line, **window) == pytest.approx(
        float(weak), rel=TOLERANCE
    )


def adaptive_line(*, lower, upper, centre, width, sigma):
    """The Voigt profile, adaptively on pieces that double away from the centre."""
    steps = np.concatenate([[0], max(sigma, width) / 8 * 2.0 ** np.arange(90)])
    cuts = [lower, upper, *(centre + steps), *(centre - steps)]
    cuts = np.unique([c for c in cuts if lower <= c <= upper]) - centre
    return sum(
        quad(lambda x: voigt_profile(x, sigma, width / 2), a, b, epsabs=0, epsrel=1e-12)[0]
        for a, b in pairwise(cuts)
    )


def test_line_window_against_adaptive_quadrature():
    random = np.random.default_rng(61)
    for _ in range(150):
        width = 10 ** random.uniform(3, 16)
        sigma = width * 10 ** random.uniform(-5, 8)
        centre = random.normal() * max(width, sigma)
        away = sigma * random.choice([0.1, 1, 5, 10, 30]) + width * random.choice([0, 1, 100])
        middle, reach = (
            centre + random.normal() * away,
            max(width, sigma) * 10 ** random.uniform(-3, 3),
        )
        case = {"centre": centre, "width": width, "sigma": sigma}
        case |= {
            "lower": middle - reach * random.random(),
            "upper": middle + reach * random.random(),
        }
        assert line_window(**case) == pytest.approx(adaptive_line(**case), rel=TOLERANCE), case


def test_line_window_tails():
    b = 5e8
    tail = line_window(lower=1e14, upper=1e14 + 1e9, centre=0, width=2 * b, sigma=0)
    with mp.workdps(40):
        expected = (mp.atan(mp.mpf(1e14 + 1e9) / b) - mp.atan(mp.mpf(1e14) / b)) / mp.pi
    assert tail == pytest.approx(float(expected), rel=TOLERANCE)
    scores = np.array([-30, -8, -1, 0, 0.5, 5, 12, 25, 30])
    got = line_window(lower=3e9 + 1e9 * scores, upper=np.inf, centre=3e9, width=0, sigma=1e9)
    np.testing.assert_allclose(got, erfc(scores / np.sqrt(2)) / 2, rtol=TOLERANCE)
    assert 0 < got[-1] < 1e-190
    with mp.workdps(300):
        for low, step in ((6.0, 1e-7), (6.0, 0.3), (20.0, 1e-3), (-0.3, 1e-9), (-40.0, 15.0)):
            high = low + step
            got = line_window(lower=low, upper=high, centre=0, width=0, sigma=1)
            both = (mp.erfc(mp.mpf(x) / mp.sqrt(2)) for x in (low, high))
            expected = (next(both) - next(both)) / 2
            assert float(abs(got / expected - 1)) < TOLERANCE


def test_line_window_limits():
    delta = {"centre": 2.0, "width": 0.0, "sigma": 0.0}
    lower = np.array([1.0, 2.0, 0.0, 3.0, -np.inf, -np.inf])
    upper = np.array([3.0, 3.0, 2.0, 4.0, np.inf, 1.0])
    np.testing.assert_array_equal(
        line_window(lower=lower, upper=upper, **delta), [1, 0.5, 0.5, 0, 1, 0]
    )
    random = np.random.default_rng(71)
    width = 10 ** random.uniform(3, 16, (1, 40)) * (np.arange(40) % 3 > 0)
    sigma = 10 ** random.uniform(3, 16, (30, 1)) * (np.arange(30)[:, None] % 4 > 0)
    centre = 1e12
    edges = np.sort(centre + 1e13 * random.normal(size=(2, 30, 1)), axis=0)
    line = {"centre": centre, "width": width, "sigma": sigma}
    cuts = [-np.inf, *edges, np.inf]
    parts = [line_window(lower=a, upper=b, **line) for a, b in pairwise(cuts)]
    assert parts[0].shape == (30, 40)
    np.testing.assert_allclose(np.sum(parts, axis=0), 1, rtol=TOLERANCE)
    np.testing.assert_allclose(line_window(lower=-np.inf, upper=np.inf, **line), 1, rtol=TOLERANCE)
    mirrored = line_window(lower=-edges[1], upper=-edges[0], **(line | {"centre": -centre}))
    np.testing.assert_allclose(mirrored, parts[1], rtol=TOLERANCE)
    grown = line_window(
        lower=-np.inf, upper=np.linspace(-1e14, 1e14, 500), centre=0, width=1e12, sigma=2e12
    )
    assert np.all(np.diff(grown) >= -1e-15)


def test_line_density():
    width, sigma = 3e9, 1e9
    step = 1e4
    slope = line_window(lower=2e9 - step, upper=2e9 + step, centre=1e9, width=width, sigma=sigma)
    density = line_density(frequency=2e9, centre=1e9, width=width, sigma=sigma)
    assert density == pytest.approx(float(slope) / (2 * step), rel=1e-7)


def test_a_line_without_width_that_nothing_couples_has_a_window() -> None:
    """No dephasing, no decay and no coupling: the pole lies on the axis; the limit is finite."""
    point = {
        "quantum_yield": 1.0,
        "fast_linewidth": 0.0,
        "slow_linewidth": 8e-12,
        "quality_factor": 1e10,
        "lateral_offset": -7e-4,
        "filter_width": 7e-15,
        "emission_wavelength": 2.3e-7,
    }
    still = explorer.evaluate({**point, "other_modes": 0.0}, ["filter_share"])["filter_share"]
    nearly = explorer.evaluate({**point, "other_modes": 1e-5}, ["filter_share"])["filter_share"]
    assert still == pytest.approx(nearly, rel=1e-6)
