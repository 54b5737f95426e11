"""What is tabulated of a measured spectrum, against the sums and formulas that it stands for."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from explorer import Samples, evaluate
from explorer.evaluate import Evaluation
from explorer.maps import Axis, make_map
from explorer.physics.lattice import POINTS, interpolated
from explorer.physics.sampled import SampledLine
from explorer.physics.sampled_average import wandering_overlap, wandering_window
from explorer.physics.sampled_shifts import (
    LINEWIDTHS,
    SHARED,
    Places,
    deviation_level,
    largest_deviation,
)
from explorer.physics.sampled_still import still_overlap, still_window
from explorer.physics.wandering import average_over_samples

Array = NDArray[np.float64]


def spectrum(rng: np.random.Generator, kind: str, size: int, spacing: float) -> SampledLine:
    """Unevenly spaced samples about zero: a smooth line, one with noise, mere noise, a spike."""
    omega = spacing * np.cumsum(rng.uniform(0.6, 1.4, size))
    smooth = np.exp(-(np.linspace(-4, 4, size) ** 2)) + 1e-3
    density = {
        "smooth": smooth,
        "noisy": smooth * rng.uniform(0.97, 1.03, size),
        "noise": rng.uniform(0, 1, size),
        "spike": np.eye(size)[size // 2],
    }[kind]
    omega -= omega[size // 2]
    return SampledLine(omega=omega, density=density / np.trapezoid(density, omega))


KINDS = ("smooth", "noisy", "noise", "spike")


# --- the lattice ----------------------------------------------------------------------------------


def test_between_the_points_of_a_lattice() -> None:
    """Exact for polynomials of the ninth degree; the stated error for a pole at distance r."""
    columns = np.arange(40.0)
    table = np.stack([((columns - 19) / 10) ** 9 - columns, 1 / (1 + ((columns - 20) / 4) ** 2)])
    place = np.linspace(5, 34, 3001)
    row = np.array([[0], [1]])
    found = interpolated(table, row, place)
    assert found.shape == (2, 3001)
    assert np.abs(found[0] - ((place - 19) / 10) ** 9 + place).max() < 1e-11
    error = np.abs(found[1] - 1 / (1 + ((place - 20) / 4) ** 2)).max()
    assert 1e-8 < error < 900 * (1 / 4) ** POINTS


# --- resonances at one place, without wandering -----------------------------------------------------


def test_overlaps_at_one_centre_follow_the_tree() -> None:
    """Linewidths over 13 decades, inside and far beside the spectrum, whole and inside a window."""
    rng, worst = np.random.default_rng(51), 0.0
    for index in range(60):
        line = spectrum(rng, KINDS[index % 4], int(rng.integers(2, 300)), 10 ** rng.uniform(10, 13))
        size = line.omega[-1] - line.omega[0]
        centre = rng.uniform(-1, 1) * size * 10 ** rng.uniform(-3, 3)
        kappa = 10 ** rng.uniform(3, 16, (2, 100))
        edges = np.sort(rng.uniform(-1, 1, 2)) * size
        for found, exact in (
            (still_overlap(line, centre, kappa), line.overlap(centre, kappa)),
            (still_window(line, centre, kappa, *edges), line.window(centre, kappa, *edges)),
        ):
            if np.all(exact > 0):
                worst = max(worst, float(np.abs(found / exact - 1).max()))
            else:
                assert np.array_equal(found, exact)
    print(f"overlaps at one centre: worst {worst:.1e} relative")
    assert worst < 1e-11


# --- wandering: the lattices of strengths, overlaps and linewidths --------------------------------


def summed(
    line: SampledLine, detuning: float, sigma: float, kappa: float, strength: float, edges: Any
) -> tuple[float, float]:
    """The sum over the places themselves, with no lattice: overlap, and share passed."""
    lost, overlap, _ = weighed(line, detuning, sigma, kappa, strength, edges, False)
    first = float(np.sum(lost * overlap)) / float(np.sum(lost))
    lost, overlap, passed = weighed(line, detuning, sigma, kappa, strength, edges, True)
    return first, float(np.sum(lost * passed)) / float(np.sum(lost * overlap))


def weighed(
    line: SampledLine,
    detuning: float,
    sigma: float,
    kappa: float,
    strength: float,
    edges: Any,
    filtered: bool,
) -> tuple[Array, Array, Array]:
    """Weight over 1 + cO, overlap, and overlap inside the filter, at each place."""
    deviations = deviation_level(sigma)
    level = int(np.floor(np.log(kappa) / LINEWIDTHS)) // SHARED
    places = Places.of(line, level, deviations, filtered)
    ends = [places.number(s * 9 * largest_deviation(deviations) - detuning) for s in (-1, 1)]
    place, apart = places.at(np.arange(np.floor(ends[0]), np.ceil(ends[1]) + 1))
    weight = np.exp(-(((place + detuning) / sigma) ** 2) / 2) * apart
    overlap = line.overlap(place, kappa)
    passed = line.window(place, kappa, place + edges[0], place + edges[1])
    return weight / (1 + strength * overlap), overlap, passed


def drawn(rng: np.random.Generator, line: SampledLine, narrowest: float, widest: float) -> Any:
    """Wandering, detuning, linewidth and strength of one case."""
    sigma = line.step * 10 ** rng.uniform(-1, 2)
    kappa = line.step * 10 ** rng.uniform(narrowest, widest)
    edges = -line.step * 10 ** rng.uniform(0, 2), line.step * 10 ** rng.uniform(0, 2)
    return sigma * rng.normal(), sigma, kappa, 10 ** rng.uniform(-4, 12), edges


@pytest.mark.parametrize("kind", KINDS)
def test_tables_stand_for_their_sum(kind: str) -> None:
    """Linewidths below a sample's spacing share their places, so that the sums are the same."""
    rng, worst = np.random.default_rng(52), [0.0, 0.0]
    for _ in range(12):
        line = spectrum(rng, kind, int(rng.integers(20, 300)), 1e12)
        detuning, sigma, kappa, strength, edges = drawn(rng, line, -5, -0.5)
        exact = summed(line, detuning, sigma, kappa, strength, edges)
        case = {"detuning": detuning, "sigma": sigma, "kappa": kappa, "strength": strength}
        found = (
            wandering_overlap(line, **case),
            wandering_window(line, **case, lower=edges[0], upper=edges[1]),
        )
        for index in (0, 1):
            worst[index] = max(worst[index], abs(float(found[index]) / exact[index] - 1))
    print(f"{kind}: overlap {worst[0]:.1e}, filter {worst[1]:.1e} relative")
    assert max(worst) < 1e-8


#: The error seen, rounded up.
WIDE = 2e-9


@pytest.mark.parametrize("kind", KINDS)
def test_wide_resonances_against_the_average_over_shifts(kind: str) -> None:
    """Wider than two samples: the nodes of `average_over_samples` are others, the mean the same."""
    rng, worst = np.random.default_rng(53), 0.0
    for _ in range(12):
        line = spectrum(rng, kind, int(rng.integers(30, 300)), 1e12)
        detuning, sigma, kappa, strength, _ = drawn(rng, line, 0.5, 3)

        def outcome(shift: Array, case: Any = (line, detuning, kappa, strength)) -> Array:
            line, detuning, kappa, strength = case
            return np.asarray(1 / (1 + strength * line.overlap(-detuning - shift, kappa)))

        lost = average_over_samples(
            outcome=outcome, sigma=sigma, step=max(line.step, kappa / 2), centre=-detuning,
            feature=(line.fwhm + kappa) / 2,
        )  # fmt: skip
        if not 1e-3 < float(lost) < 1 - 1e-3:
            continue
        found = wandering_overlap(
            line, detuning=detuning, sigma=sigma, kappa=kappa, strength=strength
        )
        worst = max(worst, abs((1 + strength * float(found)) * float(lost) - 1))
    print(f"{kind}: {worst:.1e} relative")
    assert 0 < worst < WIDE


def test_a_narrow_resonance_against_panels_between_the_samples() -> None:
    """Far narrower than a sample, 40 wandering widths: what the places themselves cost."""
    rng, worst = np.random.default_rng(54), {}
    points, weights = np.polynomial.legendre.leggauss(6)
    for kind, ratio in (("smooth", 3), ("smooth", 40), ("noisy", 3), ("noisy", 40)):
        line = spectrum(rng, kind, 800, 1e12)
        sigma, kappa = ratio * line.step, 1e-4 * line.step
        cuts = np.concatenate([line.omega, sigma * np.linspace(-9, 9, 181)])
        cuts = np.unique(np.clip(cuts, -9 * sigma, 9 * sigma))
        half, middle = np.diff(cuts)[:, None] / 2, (cuts[1:] + cuts[:-1])[:, None] / 2
        place = (middle + half * points).ravel()
        gauss = (half * weights).ravel() * np.exp(-((place / sigma) ** 2) / 2)
        overlap = line.overlap(place, kappa)
        strength = 10 ** np.array([2.0, 5.0, 7.0, 9.0])
        lost = gauss / (1 + strength[:, None] * overlap)
        exact = (lost * overlap).sum(axis=1) / lost.sum(axis=1)
        found = wandering_overlap(line, detuning=0.0, sigma=sigma, kappa=kappa, strength=strength)
        worst[kind, ratio] = float(np.abs(found / exact - 1).max())
    print(worst)
    limits = {("smooth", 3): 1e-6, ("smooth", 40): 2e-5, ("noisy", 3): 2e-5, ("noisy", 40): 3e-4}
    assert all(error < limits[case] for case, error in worst.items())


def test_arrays_limits_and_places_without_wandering() -> None:
    rng = np.random.default_rng(55)
    line = spectrum(rng, "noise", 60, 1e12)
    kappa = 10 ** np.array([9.0, 12.0, 15.0])[:, None]
    strength = np.array([0.0, 1e-30, 3.0, 1e40, np.inf])
    for detuning, sigma in ((0.0, 5e12), (1e12, np.array([[0.0], [3e12], [5e13]]))):
        case: dict[str, Any] = {"detuning": detuning, "kappa": kappa}
        table = wandering_overlap(line, **case, sigma=sigma, strength=strength)
        assert table.shape == (3, 5)
        assert np.all(np.isfinite(table))
        assert np.all(table > 0)
        assert np.all(np.diff(table, axis=1) <= 1e-9 * table[:, :-1])  # mean to harmonic mean
        for row, column in np.ndindex(table.shape):
            one = wandering_overlap(
                line, detuning=detuning, kappa=kappa[row, 0], strength=strength[column],
                sigma=np.broadcast_to(sigma, (3, 1))[row, 0],
            )  # fmt: skip
            assert table[row, column] == pytest.approx(float(one), rel=1e-12)
    still = wandering_overlap(line, detuning=1e12, sigma=0.0, kappa=kappa, strength=strength)
    assert still == pytest.approx(np.tile(line.overlap(-1e12, kappa), 5), rel=1e-10)
    open_filter = wandering_window(
        line, detuning=1e12, sigma=3e12, kappa=kappa, strength=strength,
        lower=-np.inf, upper=np.inf,
    )  # fmt: skip
    assert open_filter == pytest.approx(np.ones((3, 5)), rel=1e-7)


# --- the quantities ---------------------------------------------------------------------------------

OFFSETS = np.linspace(-40e-9, 40e-9, 400)
COUNTS = np.exp(-((OFFSETS / 12e-9) ** 2)) + 0.2 * np.exp(-(((OFFSETS - 15e-9) / 6e-9) ** 2))


def averaged(work: Evaluation, prefix: str) -> dict[str, Array]:
    """Rate, share, lifetime and light in the filter as averages of the printed outcome."""

    def value(name: str) -> Any:
        return work.value(prefix + name)

    line: SampledLine = work.value("measured")(lambda item: item)
    kappa, gamma, ideal = (
        value(name) for name in ("resonator_linewidth", "decay_elsewhere", "ideal_rate")
    )
    lower, upper = work.value("filter_edges")

    def outcome(shift: Array) -> tuple[Array, ...]:
        place = -(value("detuning") + shift)
        overlap = line.overlap(place, kappa)
        passed = line.window(place, kappa, place + lower, place + upper)
        rate = ideal * overlap * kappa / (ideal * overlap + kappa)
        share = rate / (gamma + rate)
        return rate, share, 1 / (gamma + rate), share * passed / overlap

    rate, share, lifetime, light = average_over_samples(
        outcome=outcome, sigma=value("slow_deviation"), centre=-value("detuning"),
        step=np.maximum(line.step, kappa / 2), feature=(line.fwhm + kappa) / 2,
    )  # fmt: skip
    found = {"mode_rate": rate, "cavity_share": share, "device_lifetime": lifetime}
    return found | {"mode_light_window": light / share}


@pytest.mark.parametrize("detuned", [0.0, 7e-9])
@pytest.mark.parametrize("biexciton", [0.0, -4e-9])
def test_quantities_over_every_quality_factor_and_volume(detuned: float, biexciton: float) -> None:
    """Q from 1 to 1e10, V from 1e-8 to 1e8, both transitions, with a filter of 9 nm."""
    point = {
        "spectrum": Samples(OFFSETS, COUNTS),
        "slow_linewidth": 6e-9,
        "resonance_wavelength": 650e-9 + detuned,
        "biexciton_shift": biexciton,
        "biexciton_yield": 0.1,
        "filter_width": 9e-9,
        "quality_factor": 10 ** np.array([0.0, 1, 2, 3, 4, 6, 8, 10])[:, None],
        "mode_volume": 10 ** np.array([-8.0, -5, -3, 0, 3, 8])[None, :],
    }
    work = Evaluation(point)
    worst: dict[str, Any] = {}
    with np.errstate(all="ignore"):
        for prefix in ("", "biexciton_"):
            for name, exact in averaged(work, prefix).items():
                found = np.broadcast_to(work.value(prefix + name), exact.shape)
                error = np.abs(found / exact - 1).max(axis=1)
                worst[prefix + name] = error[:4].max(), error.max()
    print({name: f"{wide:.0e} {every:.0e}" for name, (wide, every) in worst.items()})
    for name, (wide, every) in worst.items():  # up to Q = 1e3 a resonance is wider than two samples
        assert wide < (1e-7 if name.endswith("window") else 2e-9), name
        assert every < 1e-5, name


def test_limits_of_the_quantities() -> None:
    """No decay past the mode, and no coupling; the same with the filter as without one."""
    point: dict[str, Any] = {
        "spectrum": Samples(OFFSETS, COUNTS),
        "slow_linewidth": 6e-9,
        "quality_factor": 300.0,
    }
    alone = {**point, "other_modes": np.array([0.0, 1e-12]), "quantum_yield": 1.0}
    found = evaluate(alone, ["cavity_share", "device_lifetime"])
    assert found["cavity_share"] == pytest.approx(np.ones(2), rel=1e-9)
    assert found["device_lifetime"][0] == pytest.approx(found["device_lifetime"][1], rel=1e-7)
    apart = evaluate(
        {**point, "dipole_alignment": np.array([0.0, 1e-18]), "filter_width": 9e-9},
        ["cavity_share", "device_lifetime", "filter_share"],
    )
    assert apart["cavity_share"][0] == 0
    assert apart["filter_share"][0] == pytest.approx(apart["filter_share"][1], rel=1e-9)


def test_a_step_of_another_input_works_out_no_overlap(monkeypatch: pytest.MonkeyPatch) -> None:
    """A slider that moves neither resonance, spectrum nor wandering: the tables are kept."""
    calls: list[int] = []
    rows = SampledLine.rows

    def counted(line: SampledLine, wanted: Array) -> Array:
        calls.append(len(wanted))
        return rows(line, wanted)

    monkeypatch.setattr(SampledLine, "rows", counted)
    axes = Axis("mode_volume", 1e-3, 1e2, count=24), Axis("quality_factor", 10, 1e5, count=24)
    for slow in (0.0, 5e-9):
        point = {"spectrum": Samples(OFFSETS, COUNTS + 0.01 + slow), "slow_linewidth": slow}
        calls.clear()
        make_map(point, *axes, ["rate_in_fibre"])
        assert calls, "the first map needs overlaps"
        calls.clear()
        for changed in ({"numerical_aperture": 0.61}, {"lifetime": 7e-9}):
            make_map({**point, **changed}, *axes, ["rate_in_fibre"])
        other = Axis("quality_factor", 12, 9e4, count=19)
        make_map({**point, "quantum_yield": 0.7}, axes[0], other, ["rate_in_fibre"])
        assert not calls
