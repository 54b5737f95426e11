"""Shares, lifetime, outgoing light and indistinguishability against quantum dynamics.

The reference is the master equation of the single-excitation space (ground, emitter excited, one
photon): QuTiP makes the superoperator of every term of unit strength, whose entries are 0, ±1, ±i
and ±1/2, exact in double precision; the terms are weighted with the rates and integrated over all
time at 60 digits (linear solves, Lyapunov equations, a matrix logarithm over a frequency window).
So neither stiffness nor the accuracy of an integrator limits the comparison: the tolerances below
are those of the double-precision formulas, far below 1e-6. A second test follows the library's own
time evolution and is limited by it.

The rates come from the inputs by the few lines of `rates_of`, written from the definitions.
"""

from __future__ import annotations

from functools import cache
from typing import Any, NamedTuple

import mpmath as mp
import numpy as np
import pytest
import qutip
from numpy.typing import NDArray
from scipy.integrate import simpson

import explorer
from explorer.physics.window import outgoing_density, outgoing_window

Array = NDArray[np.float64]
LIGHT = mp.mpf(299792458)
DIGITS = 60
REGIMES = ("purcell", "funnelling", "strong", "detuned")
EACH = 50

#: Worst relative difference allowed; the largest seen over the 200 points stands beside it.
SHARES = 1e-13  # 2.6e-15
SPECTRUM = 1e-11  # 1.9e-12
FILTER = 1e-9  # 3.1e-11, three points apart
COHERENCE = 1e-13  # 2.3e-15


class Rates(NamedTuple):
    """Angular rates and frequencies of one point, at full precision."""

    coupling: mp.mpf
    elsewhere: mp.mpf
    dephasing: mp.mpf
    leak: mp.mpf
    detuning: mp.mpf
    other: mp.mpf
    window: tuple[mp.mpf, mp.mpf]


def angular(wavelength: mp.mpf) -> mp.mpf:
    return 2 * mp.pi * LIGHT / wavelength


def rates_of(point: dict[str, float]) -> Rates:
    """From the definitions: rates over the bulk radiative rate, Purcell's coupling, placement."""
    x = {name: mp.mpf(float(value)) for name, value in point.items()}
    radiative = x["bulk_rate_ratio"] * x["quantum_yield"] / x["lifetime"]
    elsewhere = (
        radiative * (x["other_modes"] + x["quenching"]) + (1 - x["quantum_yield"]) / x["lifetime"]
    )
    middle, half = x["emission_wavelength"], x["fast_linewidth"] / 2
    width = angular(middle - half) - angular(middle + half) if half else mp.mpf(0)
    dephasing = max(width - 1 / x["lifetime"], mp.mpf(0))
    resonance = angular(x["resonance_wavelength"])
    leak = resonance / x["quality_factor"]
    inside = x["resonance_wavelength"] / x["refractive_index"]
    waist = inside * mp.sqrt(4 * x["mode_volume"] / (mp.pi * x["mode_length"]))
    placement = mp.exp(-2 * (x["lateral_offset"] / waist) ** 2)
    placement *= mp.cos(2 * mp.pi * x["axial_offset"] / inside) ** 2
    purcell = 3 / (4 * mp.pi**2) * x["quality_factor"] / x["mode_volume"]
    coupling = mp.sqrt(radiative * leak * purcell * placement * x["dipole_alignment"] / 4)
    edges = tuple(
        angular(x["filter_centre"] + sign * x["filter_width"] / 2) - resonance for sign in (1, -1)
    )
    return Rates(
        coupling,
        elsewhere,
        dephasing,
        leak,
        angular(middle) - resonance,
        x["other_modes"] * radiative,
        edges,
    )


def draw(random: np.random.Generator) -> dict[str, float]:
    """Inputs over most of their domains, zeros included; the resonance some widths off the line."""
    wavelength = 10 ** random.uniform(-6.5, -5.5)
    lifetime = 10 ** random.uniform(-11, -4)
    quality = 10 ** random.uniform(0, 9)
    limit = wavelength**2 / (2 * np.pi * 299792458 * lifetime)
    width = 10 ** random.uniform(-16, np.log10(0.3 * wavelength))
    if width < 1.5 * limit:  # the difference of two nearly equal widths tests nothing
        width = 0.0
    volume = 10 ** random.uniform(-6, 3)
    index = random.uniform(1, 4)
    scale = wavelength * np.sqrt(4 * volume / (0.5 * np.pi)) / index
    spread = max(width, limit, wavelength / quality) * 10 ** random.uniform(-2, 2)
    return {
        "emission_wavelength": wavelength,
        "lifetime": lifetime,
        "quantum_yield": random.choice([1.0, 10 ** random.uniform(-3, 0)]),
        "fast_linewidth": random.choice([0.0, width, width, width]),
        "dipole_alignment": random.choice([1.0, 1 / 3, random.uniform(0.01, 1)]),
        "bulk_rate_ratio": 10 ** random.uniform(-1, 1),
        "resonance_wavelength": wavelength
        + random.choice([0, -1, 1, 1]) * min(spread, 0.3 * wavelength),
        "quality_factor": quality,
        "mode_volume": volume,
        "refractive_index": index,
        "mode_length": 0.5 * random.integers(1, 5),
        "other_modes": random.choice([0.0, 10 ** random.uniform(-3, 1)]),
        "quenching": random.choice([0.0, 0.0, 10 ** random.uniform(-2, 4)]),
        "lateral_offset": random.choice([0.0, random.uniform(0, min(scale, 1e-4))]),
        "axial_offset": random.uniform(0, 0.2) * wavelength / index,
    }


def with_filter(point: dict[str, float], rates: Rates, random: np.random.Generator) -> None:
    """A window somewhere near the light, from far narrower to far wider than its lines."""
    per_metre = 2 * np.pi * 299792458 / point["resonance_wavelength"] ** 2
    scales = [rates.leak, rates.elsewhere + rates.dephasing + rates.leak / 100, 2 * rates.coupling]
    scale = float(random.choice(np.array([float(value) for value in scales])))
    width = scale / per_metre * 10 ** random.uniform(-2, 2)
    shift = float(random.choice(np.array([0.0, float(rates.detuning), scale]))) / per_metre
    shift = float(
        np.clip(shift, -0.4 * point["resonance_wavelength"], 0.4 * point["resonance_wavelength"])
    )
    point["filter_width"] = float(np.clip(width, 1e-20, 0.8 * point["resonance_wavelength"]))
    point["filter_centre"] = point["resonance_wavelength"] - shift


def regime_of(rates: Rates) -> str | None:
    """None where the coupling is beyond the model, or where nothing at all decays."""
    coherence = rates.elsewhere + rates.dephasing
    if rates.coupling > rates.leak * 1e8 or abs(rates.detuning) > 1e6 * (rates.leak + coherence):
        return None
    if rates.elsewhere > 0 and rates.coupling**2 < 1e-12 * rates.elsewhere * (
        rates.leak + coherence
    ):
        return None  # no light through the mode to speak of
    if abs(rates.detuning) > rates.leak + coherence + 2 * rates.coupling:
        return "detuned"
    if 2 * rates.coupling > rates.leak + coherence:
        return "strong"
    return "funnelling" if coherence > rates.leak else "purcell"


@cache
def points() -> tuple[tuple[dict[str, float], Rates, str], ...]:
    """200 points, 50 in each regime, with rates whose ratios span many decades."""
    random = np.random.default_rng(20240611)
    found: dict[str, list[Any]] = {name: [] for name in REGIMES}
    with mp.workdps(DIGITS):
        while any(len(rows) < EACH for rows in found.values()):
            point = draw(random)
            bare = rates_of(point | {"filter_width": 1e-9, "filter_centre": 1e-6})
            regime = regime_of(bare)
            frequency = angular(mp.mpf(point["resonance_wavelength"]))
            if regime is None or bare.coupling > frequency / 10 or len(found[regime]) == EACH:
                continue
            with_filter(point, bare, random)
            found[regime].append((point, rates_of(point), regime))
    return tuple(row for name in REGIMES for row in found[name])


@cache
def ours() -> dict[str, Array]:
    """All wanted quantities of all points in one call."""
    names = points()[0][0].keys()
    point = {name: np.array([row[0][name] for row in points()]) for name in names}
    wanted = [
        "cavity_share", "other_share", "lost_share", "device_lifetime", "filter_share",
        "indistinguishability", "coupling_rate", "resonator_linewidth", "decay_elsewhere", "regime",
    ]  # fmt: skip
    return explorer.evaluate(point, wanted)


# --- the reference -------------------------------------------------------------------------------

GROUND, EXCITED, PHOTON = (qutip.basis(3, level) for level in range(3))
LOWER, ANNIHILATE, UP = GROUND * EXCITED.dag(), GROUND * PHOTON.dag(), EXCITED * EXCITED.dag()
EXCHANGE = EXCITED * PHOTON.dag() + PHOTON * EXCITED.dag()


@cache
def terms() -> tuple[Array, ...]:
    """Superoperators of unit coupling, decay, dephasing, leak and detuning, column-stacked."""
    empty = 0 * UP
    made = (
        qutip.liouvillian(EXCHANGE),
        qutip.liouvillian(empty, [LOWER]),
        qutip.liouvillian(empty, [UP]),
        qutip.liouvillian(empty, [ANNIHILATE]),
        qutip.liouvillian(UP),
    )
    return tuple(term.full() for term in made)


def place(ket: int, bra: int) -> int:
    """Where |ket><bra| stands in QuTiP's column-stacked vector."""
    unit = qutip.basis(3, ket) * qutip.basis(3, bra).dag()
    return int(np.argmax(np.abs(qutip.operator_to_vector(unit).full())))


POPULATED = [place(1, 1), place(2, 1), place(1, 2), place(2, 2)]
ONE_LEVEL_DOWN = [place(0, 1), place(0, 2)]  # |0><e| and |0><1 photon|: what `a rho` evolves in


def generator(rates: Rates, where: list[int]) -> mp.matrix:
    """The part of the Liouvillian on some operators, which evolve among themselves."""
    size = len(where)
    total = mp.matrix(size, size)
    for term, strength in zip(terms(), rates[:5], strict=True):
        for i, row in enumerate(where):
            for j, column in enumerate(where):
                entry = term[row, column]
                if entry:
                    total[i, j] += strength * mp.mpc(entry.real, entry.imag)
    return total


def lyapunov(one: mp.matrix, source: mp.matrix) -> mp.matrix:
    """Integral over all time of exp(one t) source exp(one t)^dagger."""
    size = one.rows
    system, right = mp.matrix(size**2, size**2), mp.matrix(size**2, 1)
    for i in range(size):
        for j in range(size):
            right[i * size + j] = -source[i, j]
            for k in range(size):
                system[i * size + j, k * size + j] += one[i, k]
                system[i * size + j, i * size + k] += mp.conj(one[j, k])
    flat = mp.lu_solve(system, right)
    return mp.matrix([[flat[i * size + j] for j in range(size)] for i in range(size)])


class Reference(NamedTuple):
    """What the master equation says."""

    excited_time: mp.mpf
    photon_time: mp.mpf
    seen: mp.matrix  # a times the time-integrated state, on ONE_LEVEL_DOWN
    down: mp.matrix
    indistinguishability: mp.mpf

    def light(self, low: mp.mpf, high: mp.mpf) -> mp.mpf:
        """Share of the outgoing light in a window: the resolvent integrated to a logarithm."""
        change = logarithm(mp.mpc(0, 1) * high * mp.eye(2) - self.down) - logarithm(
            mp.mpc(0, 1) * low * mp.eye(2) - self.down
        )
        return mp.re((mp.mpc(0, -1) * (change * self.seen))[1]) / (mp.pi * self.photon_time)

    def density(self, frequency: mp.mpf) -> mp.mpf:
        """The same per angular frequency."""
        resolvent = mp.lu_solve(mp.mpc(0, 1) * frequency * mp.eye(2) - self.down, self.seen)
        return mp.re(resolvent[1]) / (mp.pi * self.photon_time)


def logarithm(matrix: mp.matrix) -> mp.matrix:
    """Principal logarithm of a 2x2 matrix by its eigenvalues (no two of the draws coincide)."""
    half, determinant = (matrix[0, 0] + matrix[1, 1]) / 2, mp.det(matrix)
    root = mp.sqrt(half**2 - determinant)
    first, second = half + root, half - root
    slope = (mp.log(first) - mp.log(second)) / (first - second)
    return mp.log(first) * mp.eye(2) + slope * (matrix - first * mp.eye(2))


def solve(rates: Rates) -> Reference:
    """Start excited; integrate the state and the two-time correlations over all times."""
    populated, down = generator(rates, POPULATED), generator(rates, ONE_LEVEL_DOWN)
    start = mp.matrix([1, 0, 0, 0])
    integrated = mp.lu_solve(populated, -start)
    below = mp.matrix(2, 4)  # a |1 photon><x| = |0><x|
    below[0, 1] = below[1, 3] = 1
    products = lyapunov(populated, start * start.T)
    correlations = lyapunov(down, below * products * below.T)
    photon_time = mp.re(integrated[3])
    return Reference(
        mp.re(integrated[0]),
        photon_time,
        below * integrated,
        down,
        mp.re(correlations[1, 1]) / (photon_time**2 / 2),
    )


@cache
def references() -> tuple[Reference, ...]:
    with mp.workdps(DIGITS):
        return tuple(solve(rates) for _, rates, _ in points())


def difference(value: float, truth: mp.mpf) -> float:
    return float(abs(mp.mpf(float(value)) - truth) / abs(truth)) if truth else abs(float(value))


# --- the tests -----------------------------------------------------------------------------------


def test_points_cover_every_regime_over_many_decades() -> None:
    rates = [row[1] for row in points()]
    assert len(rates) == 200
    for first, second in (("coupling", "leak"), ("dephasing", "leak"), ("elsewhere", "leak")):
        ratios = np.array(
            [float(getattr(r, first) / getattr(r, second)) for r in rates if getattr(r, first) > 0]
        )
        assert np.log10(ratios.max() / ratios.min()) > 8, (first, second)
    names = ours()["regime"]
    for (_, _, regime), name in zip(points(), names, strict=True):
        assert regime in {"detuned", str(name).lower()} or regime in str(name).lower()


def test_rates_follow_from_their_definitions() -> None:
    for name, field in (
        ("coupling_rate", "coupling"), ("resonator_linewidth", "leak"), ("decay_elsewhere", "elsewhere"),
    ):  # fmt: skip
        worst = max(
            difference(value, getattr(row[1], field))
            for value, row in zip(ours()[name], points(), strict=True)
        )
        assert worst < 1e-13, name


@pytest.mark.parametrize("name", ["cavity_share", "other_share", "lost_share", "device_lifetime"])
def test_shares_and_lifetime(name: str) -> None:
    worst = 0.0
    with mp.workdps(DIGITS):
        for value, (_, rates, _), truth in zip(ours()[name], points(), references(), strict=True):
            expected = {
                "cavity_share": rates.leak * truth.photon_time,
                "other_share": rates.other * truth.excited_time,
                "lost_share": (rates.elsewhere - rates.other) * truth.excited_time,
                "device_lifetime": truth.excited_time,
            }[name]
            worst = max(worst, difference(value, expected))
    print(f"{name}: worst {worst:.2e}")
    assert worst < SHARES


def test_outgoing_light_inside_a_filter() -> None:
    """1e-9, where the two edges as doubles do not take more.

    A filter is two frequencies counted from the resonance; one that is far narrower than its
    distance from there loses their rounding over its width.
    """
    worst = 0.0
    rounded = 0
    with mp.workdps(DIGITS):
        for value, (_, rates, _), truth in zip(
            ours()["filter_share"], points(), references(), strict=True
        ):
            low, high = rates.window
            rounding = np.finfo(float).eps * float(max(abs(low), abs(high)) / (high - low))
            found = difference(value, truth.light(low, high))
            assert found < FILTER + rounding
            rounded += rounding > FILTER
            worst = max(worst, found if rounding < FILTER else 0.0)
    print(
        f"filter_share: worst {worst:.2e}; limited by the rounding of its edges at {rounded} points"
    )
    assert rounded < 10
    assert worst < FILTER


def test_outgoing_spectrum_and_windows_without_wavelengths() -> None:
    """Density and window at frequencies near the lines; no wavelength is turned into a frequency."""
    random = np.random.default_rng(7)
    worst_density = worst_window = 0.0
    with mp.workdps(DIGITS):
        for (_, rates, _), truth in zip(points(), references(), strict=True):
            scale = rates.leak + rates.elsewhere + rates.dephasing + rates.coupling
            near = [mp.mpf(0), rates.detuning, rates.coupling][random.integers(3)]
            low = float(
                near + scale * mp.mpf(random.normal()) * mp.mpf(10) ** random.uniform(-3, 1)
            )
            high = low + float(scale) * 10 ** random.uniform(-3, 1)
            numbers = {
                "kappa": float(rates.leak),
                "coherence": float(rates.elsewhere + rates.dephasing),
                "g_squared": float(rates.coupling**2),
                "detuning": float(rates.detuning),
            }
            density = outgoing_density(frequency=low, **numbers)
            share = outgoing_window(lower=low, upper=high, **numbers)
            worst_density = max(
                worst_density, difference(float(density), truth.density(mp.mpf(low)))
            )
            expected = truth.light(mp.mpf(low), mp.mpf(high))
            worst_window = max(worst_window, difference(float(share), expected))
    print(f"density: worst {worst_density:.2e}; window: worst {worst_window:.2e}")
    assert worst_density < SPECTRUM
    assert worst_window < SPECTRUM


def test_indistinguishability_on_and_off_resonance() -> None:
    worst = 0.0
    off = 0
    with mp.workdps(DIGITS):
        for value, (_, rates, _), truth in zip(
            ours()["indistinguishability"], points(), references(), strict=True
        ):
            worst = max(worst, difference(value, truth.indistinguishability))
            off += rates.detuning != 0
    print(f"indistinguishability: worst {worst:.2e}")
    assert off > 100
    assert worst < COHERENCE


GENTLE = (  # coupling, elsewhere, dephasing, leak, detuning [rad/ns]
    (0.3, 0.2, 0.0, 2.0, 0.0),
    (0.5, 0.1, 4.0, 1.0, 0.7),
    (3.0, 0.3, 0.5, 1.0, -1.5),
    (1.0, 1.0, 1.0, 1.0, 5.0),
)


@pytest.mark.parametrize("numbers", GENTLE)
def test_linear_solves_agree_with_the_librarys_time_evolution(numbers: tuple[float, ...]) -> None:
    """QuTiP's own integrator (1e-7, its tolerances and the sampling in time) confirms the solves."""
    coupling, elsewhere, dephasing, leak, detuning = numbers
    truth = solve(Rates(*(mp.mpf(number) for number in numbers), mp.mpf(0), (mp.mpf(0), mp.mpf(0))))
    times = np.linspace(0, 90, 12001)
    collapse = [np.sqrt(elsewhere) * LOWER, np.sqrt(dephasing) * UP, np.sqrt(leak) * ANNIHILATE]
    hamiltonian = coupling * EXCHANGE + detuning * UP
    options = {"atol": 1e-13, "rtol": 1e-11, "nsteps": 10**6}
    evolved = qutip.mesolve(
        hamiltonian, EXCITED * EXCITED.dag(), times, collapse,
        e_ops=[UP, PHOTON * PHOTON.dag()], options=options,
    )  # fmt: skip
    for trace, expected in zip(
        evolved.expect, (truth.excited_time, truth.photon_time), strict=True
    ):
        assert simpson(trace, x=times) == pytest.approx(float(expected), rel=1e-7)


@pytest.mark.parametrize("numbers", GENTLE)
def test_linear_solves_agree_with_the_librarys_correlations(numbers: tuple[float, ...]) -> None:
    """The double integral over QuTiP's own two-time correlations (1e-6, its integrator's accuracy)."""
    coupling, elsewhere, dephasing, leak, detuning = numbers
    truth = solve(Rates(*(mp.mpf(number) for number in numbers), mp.mpf(0), (mp.mpf(0), mp.mpf(0))))
    nodes, weights = np.polynomial.legendre.leggauss(12)
    starts = np.append(0, np.geomspace(0.5, 32, 11))
    widths = np.diff(np.append(starts, 60))
    times = (starts[:, None] + widths[:, None] * (1 + nodes) / 2).ravel()
    measure = (widths[:, None] * weights / 2).ravel()
    collapse = [np.sqrt(elsewhere) * LOWER, np.sqrt(dephasing) * UP, np.sqrt(leak) * ANNIHILATE]
    seen = qutip.correlation_2op_2t(
        coupling * EXCHANGE + detuning * UP, EXCITED * EXCITED.dag(), np.append(0, times), np.append(0, times),
        collapse, ANNIHILATE.dag(), ANNIHILATE, options={"atol": 1e-12, "rtol": 1e-10, "nsteps": 10**6},
    )  # fmt: skip
    photons = float(truth.photon_time)
    coherence = measure @ np.abs(seen[1:, 1:]) ** 2 @ measure / (photons**2 / 2)
    assert coherence == pytest.approx(float(truth.indistinguishability), rel=1e-6)
