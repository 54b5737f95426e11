"""The exact indistinguishability and its average over slow wandering.

Checked against two independent solutions of the same master equation: linear solves at 50 digits
(mpmath), and the spectral decomposition of the Liouvillian that QuTiP builds from the Hamiltonian
and the collapse operators, which fixes the conventions (pure dephasing: sqrt(gamma*) |e><e|).
Averages are checked against Gauss-Legendre on panels that share nothing with the rules tested.
"""

from __future__ import annotations

from itertools import pairwise

import mpmath as mp
import numpy as np
import pytest
import qutip
from numpy.typing import NDArray
from scipy.integrate import quad

from explorer.physics.coherence_kernel import off_resonance, on_resonance, wandering_average

Array = NDArray[np.float64]
NAMES = ("g_squared", "gamma", "dephasing", "kappa", "detuning", "sigma")


def random_points(count: int, seed: int) -> dict[str, Array]:
    """Rates from 1e3 to 1e16 each on its own; zeros among gamma, dephasing and detuning."""
    random = np.random.default_rng(seed)
    point = {name: 10 ** random.uniform(3, 16, count) for name in NAMES}
    point["g_squared"] **= 2
    point["gamma"][::10] = 0
    point["dephasing"][::7] = 0
    point["detuning"][::3] = 0
    point["detuning"][1::3] = (point["sigma"] * random.uniform(0, 60, count))[1::3]
    return point


def without(point: dict[str, Array], *names: str) -> dict[str, Array]:
    return {name: value for name, value in point.items() if name not in names}


def by_linear_solves(
    *, g_squared: float, gamma: float, dephasing: float, kappa: float, detuning: float
) -> mp.mpf:
    """Populations P, N and S = <a's> = x + iy; Lyapunov equations in t and in the delay."""
    g, gamma, dephasing, kappa, detuning = (
        mp.mpf(value) for value in (mp.sqrt(g_squared), gamma, dephasing, kappa, detuning)
    )
    h = (kappa + gamma + dephasing) / 2
    generator = mp.matrix(
        [
            [-gamma, 0, 0, -2 * g],
            [0, -kappa, 0, 2 * g],
            [0, 0, -h, detuning],
            [g, -g, -detuning, -h],
        ]
    )
    start = mp.matrix([1, 0, 0, 0])
    products = lyapunov(generator, generator.T, -start * start.T)
    amplitudes = mp.matrix(
        [[-(gamma + dephasing) / 2 - 1j * detuning, -1j * g], [-1j * g, -kappa / 2]]
    )
    form = lyapunov(amplitudes.H, amplitudes, mp.matrix([[0, 0], [0, -1]]))
    mixed = products[2, 1] + 1j * products[3, 1]
    coherent = (
        form[0, 0] * (products[2, 2] + products[3, 3])
        + 2 * mp.re(form[1, 0] * mixed)
        + form[1, 1] * products[1, 1]
    )
    photons = mp.lu_solve(generator, -start)[1]
    return 2 * mp.re(coherent) / photons**2


def lyapunov(left: mp.matrix, right: mp.matrix, source: mp.matrix) -> mp.matrix:
    """X in left X + X right = source, as one linear system."""
    size = left.rows
    system, vector = mp.zeros(size * size), mp.matrix(size * size, 1)
    for i in range(size):
        for j in range(size):
            vector[size * i + j] = source[i, j]
            for k in range(size):
                system[size * i + j, size * k + j] += left[i, k]
                system[size * i + j, size * i + k] += right[k, j]
    flat = mp.lu_solve(system, vector)
    return mp.matrix([[flat[size * i + j] for j in range(size)] for i in range(size)])


def by_qutip(*, g: float, gamma: float, dephasing: float, kappa: float, detuning: float) -> float:
    """Two levels times three photon numbers; time integrals of exponentials taken exactly."""
    lower = qutip.tensor(qutip.destroy(2), qutip.qeye(3))
    a = qutip.tensor(qutip.qeye(2), qutip.destroy(3))
    excited = lower.dag() * lower
    hamiltonian = detuning * excited + g * (a.dag() * lower + lower.dag() * a)
    collapse = [np.sqrt(gamma) * lower, np.sqrt(kappa) * a, np.sqrt(dephasing) * excited]
    rates, modes = np.linalg.eig(qutip.liouvillian(hamiltonian, collapse).full())
    start = qutip.tensor(qutip.basis(2, 1), qutip.basis(3, 0)).proj()
    begin = np.linalg.solve(modes, qutip.operator_to_vector(start).full()[:, 0])
    jump = np.linalg.solve(modes, qutip.spre(a).full() @ modes)
    end = qutip.operator_to_vector(a).full()[:, 0].conj() @ modes
    photons = (qutip.operator_to_vector(a.dag() * a).full()[:, 0].conj() @ modes) * begin
    parts = end[:, np.newaxis] * jump * begin  # <a'(t) a(t+T)> = sum parts e^(rate T) e^(rate' t)
    parts[abs(parts) < 1e-12] = 0  # the stationary state holds no photon
    decays = abs(rates.real) > 1e-12
    both = rates[:, np.newaxis] + rates.conj()
    times = np.where(abs(both) > 1e-12, -1 / np.where(both == 0, 1, both), 0)
    coherent = np.einsum("jk,mn,jm,kn->", parts, parts.conj(), times, times).real
    total = -(photons[decays] / rates[decays]).sum().real
    return float(2 * coherent / total**2)


def averaged_on_panels(**point: float) -> float:
    """<beta^2 I>/<beta^2> by 24 Gauss-Legendre nodes on each of some hundred panels."""
    sigma, centre = point.pop("sigma"), abs(point.pop("detuning"))
    kappa, gamma, g_squared = point["kappa"], point["gamma"], point["g_squared"]
    coherence = gamma + point["dephasing"]
    top, least = centre + 12 * sigma, 1e-4 * min(kappa + coherence, sigma)
    edges = [0, top, *(least * 1.5 ** np.arange(0, np.log(top / least) / np.log(1.5)))]
    edges = np.unique([*edges, *np.clip(centre + sigma * np.arange(-24, 25) / 2, 0, top)])
    nodes, weights = np.polynomial.legendre.leggauss(24)
    middle, half = (edges[1:] + edges[:-1]) / 2, np.diff(edges) / 2
    x = (middle[:, np.newaxis] + half[:, np.newaxis] * nodes).ravel()
    weight = (half[:, np.newaxis] * weights).ravel() * sum(
        np.exp(-(((x - side * centre) / sigma) ** 2) / 2) for side in (-1, 1)
    )
    rate = 4 * g_squared / (kappa + coherence) / (1 + (2 * x / (kappa + coherence)) ** 2)
    returned = rate * kappa / (rate + kappa)
    weight *= (returned / (gamma + returned)) ** 2
    return float((weight * off_resonance(**point, detuning=x)).sum() / weight.sum())


def test_linear_solves_agree_to_rounding() -> None:
    """100 points over thirteen decades of every rate; measured 9e-16."""
    point = without(random_points(100, seed=1), "sigma")
    with mp.workdps(50):
        expected = [
            float(by_linear_solves(**{name: float(value[k]) for name, value in point.items()}))
            for k in range(100)
        ]
    np.testing.assert_allclose(off_resonance(**point), expected, rtol=5e-15)
    resonant = point["detuning"] == 0
    here = {name: value[resonant] for name, value in without(point, "detuning").items()}
    np.testing.assert_allclose(on_resonance(**here), np.array(expected)[resonant], rtol=5e-15)


@pytest.mark.parametrize(
    ("g", "gamma", "dephasing", "kappa", "detuning"),
    [
        (1, 0.5, 0.8, 1, 0),
        (1, 0.5, 0.8, 1, 2),
        (2, 0.1, 0.5, 1, -1.5),
        (0.5, 1, 3, 0.4, 1),
        (1, 0.7, 0, 1, 3),
        (0.05, 0.01, 20, 1, 5),
    ],
)
def test_qutip_agrees(
    g: float, gamma: float, dephasing: float, kappa: float, detuning: float
) -> None:
    """Measured 2e-13 at worst, which is the decomposition's rounding."""
    rates = {"gamma": gamma, "dephasing": dephasing, "kappa": kappa, "detuning": detuning}
    expected = by_qutip(g=g, **rates)
    assert off_resonance(g_squared=g * g, **rates) == pytest.approx(expected, rel=2e-12)


def test_closed_form_is_the_value_at_zero_detuning() -> None:
    point = without(random_points(2000, seed=2), "sigma", "detuning")
    np.testing.assert_allclose(
        on_resonance(**point), off_resonance(**point, detuning=0.0), rtol=5e-15
    )


def test_one_without_dephasing() -> None:
    """Measured 8e-16 on and off resonance, 2e-15 averaged."""
    point = random_points(2000, seed=3) | {"dephasing": np.zeros(2000)}
    np.testing.assert_allclose(on_resonance(**without(point, "detuning", "sigma")), 1, rtol=5e-15)
    np.testing.assert_allclose(off_resonance(**without(point, "sigma")), 1, rtol=5e-15)
    np.testing.assert_allclose(wandering_average(**point), 1, rtol=2e-14)


def test_within_zero_and_one_and_even_in_the_detuning() -> None:
    point = random_points(5000, seed=4)
    mirrored = point | {"detuning": -point["detuning"]}
    for function, left_out in ((off_resonance, ("sigma",)), (wandering_average, ())):
        value = function(**without(point, *left_out))
        assert np.all((value > 0) & (value < 1 + 1e-14))
        np.testing.assert_array_equal(value, function(**without(mirrored, *left_out)))


def test_broad_resonator_leaves_an_emitter_with_a_faster_decay() -> None:
    """kappa above all: (gamma + R)/(gamma + R + gamma*), R = 4g^2/kappa (common practice)."""
    kappa, gamma, dephasing, rate = 1e16, 1e7, 3e8, np.geomspace(1e5, 1e9, 9)
    value = on_resonance(g_squared=rate * kappa / 4, gamma=gamma, dephasing=dephasing, kappa=kappa)
    np.testing.assert_allclose(value, (gamma + rate) / (gamma + rate + dephasing), rtol=1e-6)


def test_strong_dephasing_limit() -> None:
    """[gamma + kappa R/(kappa + R)]/(gamma + kappa + 2R), R = 4g^2/(kappa + gamma + gamma*).

    Grange et al., Phys. Rev. Lett. 114, 193601 (2015), the incoherent limit; from memory, and the
    limit of the closed form for gamma* above all. The error falls as 1/gamma*.
    """
    kappa, gamma, rate = 1e9, 1e7, np.geomspace(1e5, 1e12, 15)
    expected = (gamma + kappa * rate / (kappa + rate)) / (gamma + kappa + 2 * rate)
    errors = []
    for dephasing in (1e14, 1e15, 1e16):
        g_squared = rate * (kappa + gamma + dephasing) / 4
        value = on_resonance(g_squared=g_squared, gamma=gamma, dephasing=dephasing, kappa=kappa)
        errors.append(np.max(abs(value / expected - 1)))
    assert errors[2] < 1e-3
    np.testing.assert_allclose(errors[1:], np.array(errors[:-1]) / 10, rtol=0.15)


def test_strong_coupling_limit() -> None:
    """g above all: s (s + d/4)/[(s + d)(s + d/2)], s = gamma + kappa, d = gamma*.

    Own secular average over the two dressed states, which start with 1/2 each and a coherence of
    1/2: their populations decay at s/2, that coherence at s/2 + d/4, the coherences with the ground
    state at (s + d)/4; with all terms that rotate at 2g left out, |<a'(t) a(t+T)>|^2 averages to
    e^(-(s+d)T/2) [e^(-st) + e^(-(s+d/2)t)]/8 and <a'a>(t) to e^(-st/2)/2.
    """
    kappa, gamma, dephasing = 1e9, 1e8, np.geomspace(1e6, 1e12, 13)
    total = gamma + kappa
    expected = total * (total + dephasing / 4) / (total + dephasing) / (total + dephasing / 2)
    value = on_resonance(g_squared=1e32, gamma=gamma, dephasing=dephasing, kappa=kappa)
    np.testing.assert_allclose(value, expected, rtol=1e-6)


def test_average_agrees_with_panels() -> None:
    """Independent quadrature, widths over thirteen decades; measured 1.5e-10 at worst."""
    point = random_points(600, seed=2)
    comparable = random_points(600, seed=5) | {"sigma": point["kappa"] + point["dephasing"]}
    for case in (point, comparable):
        expected = [
            averaged_on_panels(**{name: float(value[k]) for name, value in case.items()})
            for k in range(600)
        ]
        np.testing.assert_allclose(wandering_average(**case), expected, rtol=1e-9)


def test_average_agrees_with_adaptive_quadrature() -> None:
    """One point, QUADPACK's adaptive rule on the linear solves: nothing in common."""
    point = {"g_squared": 2.0, "gamma": 0.3, "dephasing": 0.7, "kappa": 1.0}
    detuning, sigma = 1.5, 2.0

    def weight(x: float) -> float:
        rate = 4 * 2 / 2 / (1 + x * x)
        returned = rate / (rate + 1)
        gaussian = np.exp(-((x - detuning) ** 2) / (2 * sigma**2))
        return float((returned / (0.3 + returned)) ** 2 * gaussian)

    def weighted(x: float) -> float:
        return weight(x) * float(by_linear_solves(**point, detuning=x))

    upper, lower = (
        sum(quad(f, *ends, epsrel=1e-10, epsabs=0)[0] for ends in pairwise((-14, 0, 3, 17)))
        for f in (weighted, weight)
    )
    value = wandering_average(**point, detuning=detuning, sigma=sigma)
    assert value == pytest.approx(upper / lower, rel=2e-10)


def test_no_wandering_and_little_wandering() -> None:
    """Cells without wandering among others give the value at rest; little wandering tends to it."""
    point = random_points(300, seed=6)
    rest = off_resonance(**without(point, "sigma"))
    width = point["kappa"] + point["gamma"] + point["dephasing"]
    some = point | {"sigma": np.where(np.arange(300) % 2, point["sigma"], 0)}
    np.testing.assert_allclose(wandering_average(**some)[::2], rest[::2], rtol=1e-14)
    none = point | {"sigma": np.zeros(300)}
    np.testing.assert_array_equal(wandering_average(**none), rest)
    little = point | {"sigma": 1e-7 * np.minimum(width, point["kappa"])}
    np.testing.assert_allclose(wandering_average(**little), rest, rtol=1e-9)


def test_arrays_give_what_their_elements_give() -> None:
    """Maps, columns and scalars alike; measured 2e-15, so chunks of a sweep agree too."""
    point = random_points(100, seed=7)
    shaped = {
        name: value.reshape(2, 5, 10) if name in ("g_squared", "sigma") else value[:5, np.newaxis]
        for name, value in point.items()
    }
    whole = wandering_average(**shaped)
    assert whole.shape == (2, 5, 10)
    for place in np.ndindex(2, 5, 10):
        cell = {
            name: float(np.broadcast_to(value, whole.shape)[place])
            for name, value in shaped.items()
        }
        single = wandering_average(**cell)
        assert np.ndim(single) == 0
        assert single == pytest.approx(whole[place], rel=1e-13)
        at_rest = off_resonance(**without(cell, "sigma"))
        assert at_rest == pytest.approx(off_resonance(**without(shaped, "sigma"))[place], rel=1e-14)


def test_large_grids_are_taken_in_blocks() -> None:
    """300 x 300 cells: the same as row by row, and the blocks' seams do not show."""
    rates = {"gamma": 5e7, "dephasing": 9e12, "detuning": 2e12, "sigma": 1e12}
    kappa = np.geomspace(1e8, 1e14, 300)[:, np.newaxis]
    g_squared = kappa * np.geomspace(1e6, 1e13, 300)
    whole = wandering_average(g_squared=g_squared, kappa=kappa, **rates)
    rows = [wandering_average(g_squared=g_squared[k], kappa=kappa[k], **rates) for k in range(300)]
    np.testing.assert_allclose(whole, rows, rtol=1e-13)


def test_limits_of_the_domain() -> None:
    """No decay but the mode's, no dephasing, no coupling: finite wherever light can leave."""
    rates = {"kappa": 1e12, "detuning": 1e11, "sigma": 1e10}
    assert wandering_average(g_squared=1e20, gamma=0, dephasing=0, **rates) == pytest.approx(1)
    assert 0 < wandering_average(g_squared=1e20, gamma=0, dephasing=1e12, **rates) < 1
    assert 0 < wandering_average(g_squared=0, gamma=1e8, dephasing=1e12, **rates) < 1
    with np.errstate(all="ignore"):
        dark = wandering_average(g_squared=np.array([0, 1e20]), gamma=0, dephasing=0, **rates)
    np.testing.assert_array_equal(np.isnan(dark), [True, False])
