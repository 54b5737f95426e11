"""Photons per second and g²(0) against a photon-by-photon simulation; the budget and the chain.

Every emitter of the simulation is followed from pulse to pulse (or from jump to jump) through three
states: nothing, exciton, biexciton. A pulse offers a Poisson number of excitations: it fills nothing
by its number and leaves at most a biexciton. Each decay picks its way out, and each photon then
passes every step by a throw of its own. Agreement is within 4 standard errors, which come from the
scatter among independent emitters; the draws are seeded.

The shares that the throws need come from `evaluate` (they are tested elsewhere); those of the
biexciton from a second point in which it is an emitter in its own right.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, NamedTuple

import mpmath as mp
import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.constants import speed_of_light
from scipy.optimize import brentq

import explorer
from explorer.physics.photons import chain_decay, occupations, period_decay

Array = NDArray[np.float64]
Point = Mapping[str, Any]
STREAMS = ("exciton, mode", "exciton, other", "biexciton, mode", "biexciton, other")
STEPS = (
    "photon emitted", "escaped the resonator", "towards the optic", "inside the aperture",
    "through the filter", "through the optics", "in the fibre", "detected",
)  # fmt: skip
SIGMAS = 4.0

BASE: dict[str, Any] = {
    "lifetime": 10e-9,
    "quantum_yield": 0.9,
    "fast_linewidth": 5e-9,
    "quality_factor": 130.0,
    "mode_volume": 1.0,
    "dipole_alignment": 1.0,
    "upward_share": 0.9,
    "numerical_aperture": 0.9,
}
PULSED: tuple[dict[str, Any], ...] = (
    {"biexciton_yield": 0.0},
    {"biexciton_yield": 0.3, "excitations_per_pulse": 0.3},
    {"biexciton_yield": 1.0, "excitations_per_pulse": 3.0},
    {"biexciton_yield": 0.6, "biexciton_rate_ratio": 1.0, "excitations_per_pulse": 1.5},
    {"biexciton_yield": 0.2, "bright_share": 0.6, "background_per_pulse": 0.05},
    {"biexciton_yield": 0.05, "background_per_pulse": 0.2},
    {"biexciton_yield": 0.7, "repetition_rate": 3e8, "excitations_per_pulse": 0.8},
    {
        "biexciton_yield": 0.4,
        "repetition_rate": 1e9,
        "excitations_per_pulse": 0.5,
        "bright_share": 0.8,
    },
    {
        "biexciton_yield": 0.0,
        "repetition_rate": 5e8,
        "excitations_per_pulse": 2.0,
        "background_per_pulse": 0.1,
    },
    {
        "biexciton_yield": 1.0,
        "biexciton_rate_ratio": 0.3,
        "repetition_rate": 2e8,
        "quality_factor": 20.0,
    },
    {"biexciton_yield": 0.5, "biexciton_shift": 6e-9, "filter_width": 8e-9},
    {
        "biexciton_yield": 0.8,
        "destination": "fibre",
        "optics_transmission": 0.9,
        "fibre_mode_radius": 2e-6,
    },
    {"biexciton_yield": 0.3, "radiative_share": 0.7, "quenching": 0.8, "detector_efficiency": 0.85},
    {"biexciton_yield": 0.5, "other_modes": 0.0, "quantum_yield": 0.5, "bulk_rate_ratio": 1.4},
)
CONTINUOUS: tuple[dict[str, Any], ...] = (
    {"biexciton_yield": 0.0, "saturation": 1.0, "background_rate": 2e6},
    {"biexciton_yield": 0.3, "saturation": 0.2},
    {"biexciton_yield": 1.0, "saturation": 3.0},
    {
        "biexciton_yield": 0.5,
        "saturation": 1.0,
        "biexciton_rate_ratio": 0.5,
        "background_rate": 1e7,
    },
    {"biexciton_yield": 0.2, "saturation": 0.5, "bright_share": 0.7, "background_rate": 5e6},
    {"biexciton_yield": 0.7, "saturation": 10.0, "bulk_rate_ratio": 0.7, "quenching": 0.4},
    {"biexciton_yield": 0.9, "saturation": 0.3, "biexciton_shift": 6e-9, "filter_width": 8e-9},
    {"biexciton_yield": 0.4, "saturation": 2.0, "radiative_share": 0.6, "bright_share": 0.5},
)

# --- what the throws need ------------------------------------------------------------------------

SHARES = (
    "cavity_share", "other_share", "device_lifetime", "collected_share", "dipole_collected",
    "filter_share", "other_filter_share", "fibre_share", "other_fibre_share", "pure_dephasing",
)  # fmt: skip


class Odds(NamedTuple):
    """Decay rate [1/s], chances of the two ways out, and of every later step on each."""

    rate: float
    ways: tuple[float, float]
    steps: tuple[tuple[float, ...], tuple[float, ...]]


def odds_of(point: Point) -> Odds:
    """Of one transition, as the inputs and the shares say."""
    found = explorer.evaluate(point, SHARES)
    optics, detector = point.get("optics_transmission", 1.0), point.get("detector_efficiency", 1.0)
    mode = (
        point.get("radiative_share", 1.0), point["upward_share"], found["collected_share"],
        found["filter_share"], optics, found["fibre_share"], detector,
    )  # fmt: skip
    other = (
        1.0, 0.5, found["dipole_collected"],
        found["other_filter_share"], optics, found["other_fibre_share"], detector,
    )  # fmt: skip
    ways = (found["cavity_share"], found["other_share"])
    return Odds(1 / found["device_lifetime"], ways, (mode, other))


def as_emitter(point: Point) -> dict[str, Any]:
    """The biexciton as an emitter: faster, with its own yield and centre, and the same dephasing."""
    ratio, share = point.get("biexciton_rate_ratio", 4.0), point["biexciton_yield"]
    lifetime = point["lifetime"] * share / (ratio * point["quantum_yield"])
    centre = 650e-9 + point.get("biexciton_shift", 0.0)
    dephasing = explorer.evaluate(point, ["pure_dephasing"])["pure_dephasing"]

    # Width in wavelength that gives the exciton's dephasing beside the biexciton's own decay.
    def excess(width: float) -> float:
        angular = 2 * np.pi * speed_of_light * width / (centre**2 - width**2 / 4)
        return angular - 1 / lifetime - dephasing

    own = {"lifetime": lifetime, "quantum_yield": share, "biexciton_yield": 0.0}
    width = brentq(excess, 0, 0.5 * centre, xtol=1e-25, rtol=1e-15)
    return {
        **point,
        **own,
        "emission_wavelength": centre,
        "resonance_wavelength": 650e-9,
        "fast_linewidth": width,
    }


def both_odds(point: Point) -> tuple[Odds, Odds]:
    """Of exciton and biexciton; a biexciton that never emits is gone at once."""
    exciton = odds_of(point)
    if point["biexciton_yield"] == 0:
        return exciton, Odds(np.inf, (0.0, 0.0), exciton.steps)
    return exciton, odds_of(as_emitter(point))


# --- the simulation ------------------------------------------------------------------------------


class Counts(NamedTuple):
    """Per emitter: decays of both kinds, photons of each stream after each step, and detected ones."""

    decays: Array  # (2, emitters)
    photons: Array  # (4, 8, emitters)


def thrown(random: np.random.Generator, decays: Array, odds: Odds) -> tuple[Array, Array]:
    """Photons after each step on both ways: every decay and every step is a throw. (2, 8, emitters)"""
    mode = random.binomial(decays, min(odds.ways[0], 1.0))
    left = max(1 - odds.ways[0], 1e-300)
    other = random.binomial(decays - mode, min(odds.ways[1] / left, 1.0))
    rows = []
    for photons, steps in ((mode, odds.steps[0]), (other, odds.steps[1])):
        column = [photons]
        for chance in steps:
            column.append(random.binomial(column[-1], min(chance, 1.0)))
        rows.append(column)
    photons = np.array(rows)
    return photons, photons[:, -1].sum(axis=0)


def pulse(random: np.random.Generator, state: Array, mean: float) -> Array:
    """A Poisson number of excitations; nothing holds more than a biexciton."""
    return np.minimum(state + random.poisson(mean, state.size), 2)


def simulate_pulses(
    random: np.random.Generator, point: Point, *, emitters: int, pulses: int
) -> tuple[Counts, Array]:
    """Counts per emitter, and detected photons of every pulse (pulses, emitters), background included."""
    exciton, biexciton = both_odds(point)
    period = 1 / point.get("repetition_rate", 10e6)
    bright = random.random(emitters) < point.get("bright_share", 1.0)
    settle = int(np.ceil(12 / min(1.0, exciton.rate * period)))
    state = np.zeros(emitters, int)
    decays, photons = np.zeros((2, emitters)), np.zeros((4, 8, emitters))
    seen = np.zeros((pulses, emitters))
    for index in range(-settle, pulses):
        state = np.where(bright, pulse(random, state, point.get("excitations_per_pulse", 1.0)), 0)
        first = random.exponential(1, emitters) / biexciton.rate
        gone_b = (state == 2) & (first < period)
        clock = np.where(gone_b, first, 0.0) + random.exponential(1, emitters) / exciton.rate
        gone_x = ((state == 1) | gone_b) & (clock < period)
        state = state - gone_b - gone_x
        if index < 0:
            continue
        by_x, detected_x = thrown(random, gone_x.astype(int), exciton)
        by_b, detected_b = thrown(random, gone_b.astype(int), biexciton)
        decays += gone_x, gone_b
        photons += np.concatenate([by_x, by_b])
        background = random.poisson(point.get("background_per_pulse", 0.0), emitters)
        seen[index] = detected_x + detected_b + background
    return Counts(decays, photons), seen


def simulate_pump(
    random: np.random.Generator, point: Point, *, emitters: int, lifetimes: float
) -> tuple[Counts, Array, float]:
    """Counts per emitter, the sums for g²(0) and the clicks (2, emitters), and the time window [s].

    The delay-zero rate is found without a bin width: after each detected photon the next one's rate
    is known from the state it leaves, and those rates are summed.
    """
    exciton, biexciton = both_odds(point)
    pump = point["saturation"] * exciton.rate
    noise = point.get("background_rate", 0.0)
    click = [total_chance(exciton), total_chance(biexciton)]
    start = 15 / min(exciton.rate, biexciton.rate)
    window = lifetimes / exciton.rate
    state, time = np.zeros(emitters, int), np.zeros(emitters)
    bright = random.random(emitters) < point.get("bright_share", 1.0)
    decays, photons = np.zeros((2, emitters)), np.zeros((4, 8, emitters))
    after, clicks = np.zeros(emitters), np.zeros(emitters)
    resident = np.zeros((3, emitters))  # time in each state inside the window
    decay = np.array([0.0, exciton.rate, biexciton.rate])
    rise = np.array([pump, pump, 0.0])
    instant = np.isinf(decay[2])
    while np.any(running := bright & (time < start + window)):
        fall = np.where(
            state == 2, 0.0 if instant else decay[2], np.where(state == 1, decay[1], 0.0)
        )
        total = fall + rise[state]
        gone = random.exponential(1, emitters) / total
        until = np.where(running, np.minimum(time + gone, start + window), time)
        spent = np.maximum(until - np.maximum(time, start), 0.0)
        for level in range(3):
            resident[level] += np.where(state == level, spent, 0.0)
        inside = running & (time + gone > start) & (time + gone < start + window)
        falls = random.random(emitters) * total < fall
        by_x = inside & falls & (state == 1)
        by_b = inside & falls & (state == 2)
        lifted = np.where(falls, state - 1, state + 1)
        if instant:  # a biexciton without a yield is an exciton again; its decay still counts
            by_b = inside & (lifted == 2)
            lifted = np.minimum(lifted, 1)
        for way, happened, odds in ((0, by_x, exciton), (1, by_b, biexciton)):
            streams, detected = thrown(random, happened.astype(int), odds)
            decays[way] += happened
            photons[2 * way : 2 * way + 2] += streams
            clicks += detected
            left_behind = 0.0 if way == 0 else decay[1] * click[0]
            after += detected * (left_behind + noise)
        state = np.where(running, lifted, state)
        time = np.where(running, time + gone, time)
    glow = decay[1] * click[0] * resident[1]
    if not instant:
        glow = glow + decay[2] * click[1] * resident[2]
    resident[0, ~bright] = window
    # The background is a detector of its own: its clicks find the emitter in its average state.
    after += noise * glow + noise**2 * resident.sum(axis=0)
    clicks += noise * resident.sum(axis=0)
    return Counts(decays, photons), np.array([after, clicks]), window


def total_chance(odds: Odds) -> float:
    """Detected photons per decay."""
    return sum(
        way * float(np.prod(steps)) for way, steps in zip(odds.ways, odds.steps, strict=True)
    )


# --- comparison ----------------------------------------------------------------------------------


def away(samples: Array, expected: float) -> float:
    """Distance of the mean of independent samples from the expected value, in standard errors."""
    if expected == 0:
        return 0.0 if not samples.any() else np.inf
    if samples.std() == 0:
        return 0.0 if samples.mean() == pytest.approx(expected, rel=1e-9) else np.inf
    return float((samples.mean() - expected) / (samples.std(ddof=1) / np.sqrt(samples.size)))


def ratio_away(above: Array, below: Array, expected: float) -> float:
    """The same for a ratio of means: above − expected·below has mean zero."""
    return away_from_zero(above - expected * below)


def away_from_zero(samples: Array) -> float:
    if samples.std() == 0:
        return 0.0 if samples.mean() == 0 else np.inf
    return float(samples.mean() / (samples.std(ddof=1) / np.sqrt(samples.size)))


def compare_budget(point: Point, counts: Counts, seconds: float) -> dict[str, float]:
    """Every entry of the budget's table, in standard errors."""
    table = explorer.budget(point)
    found = {
        "decays": away(
            counts.decays.sum(axis=0) / seconds, table.loc["excited and decayed", "total"]
        )
    }
    for step, name in enumerate(STEPS):
        for stream, column in enumerate(STREAMS):
            photons = counts.photons[stream, step] / seconds
            found[f"{name}, {column}"] = away(photons, table.loc[name, column])
        found[name] = away(counts.photons[:, step].sum(axis=0) / seconds, table.loc[name, "total"])
    return found


def check(found: Mapping[str, float]) -> None:
    worst = max(found, key=lambda name: abs(found[name]))
    print(f"{len(found)} values, worst {found[worst]:+.2f} standard errors: {worst}")
    assert {name: value for name, value in found.items() if not abs(value) < SIGMAS} == {}


@pytest.mark.parametrize("index", range(len(PULSED)))
def test_pulses(index: int) -> None:
    """Photons of all streams after all steps, and g²(0) over neighbouring or far pulses."""
    point = BASE | PULSED[index]
    random = np.random.default_rng([1, index])
    pulses = 60
    counts, seen = simulate_pulses(random, point, emitters=12000, pulses=pulses)
    rate = point.get("repetition_rate", 10e6)
    found = compare_budget(point, counts, pulses / rate)
    wanted = explorer.evaluate(
        point, ["g2_zero", "rate_detected", "overlapping_pulses", "device_lifetime"]
    )
    far = int(np.ceil(12 * wanted["device_lifetime"] * rate)) if wanted["overlapping_pulses"] else 1
    assert far < pulses / 2
    same = (seen * (seen - 1))[:-far].mean(axis=0)
    apart = (seen[far:] * seen[:-far]).mean(axis=0)
    found["g2"] = ratio_away(same, apart, wanted["g2_zero"])
    error = (same - wanted["g2_zero"] * apart).std() / np.sqrt(same.size) / apart.mean()
    print(f"g2 = {wanted['g2_zero']:.4f}, simulated within {error:.4f}")
    assert error < 0.02 + 0.02 * wanted["g2_zero"]
    check(found)


@pytest.mark.parametrize("index", range(len(CONTINUOUS)))
def test_continuous_pump(index: int) -> None:
    """Photons of all streams after all steps, and g²(0) at zero delay."""
    point = BASE | CONTINUOUS[index] | {"pumping": "continuous"}
    random = np.random.default_rng([2, index])
    counts, (after, clicks), window = simulate_pump(random, point, emitters=4000, lifetimes=60)
    found = compare_budget(point, counts, window)
    wanted = explorer.evaluate(point, ["g2_zero", "rate_detected"])
    on = point.get("bright_share", 1.0)
    bright = wanted["rate_detected"] / on + point.get("background_rate", 0.0)
    dark = point.get("background_rate", 0.0)
    # Delays short against the blinking: coincidences expected by chance are those of each state.
    chance = (on * bright**2 + (1 - on) * dark**2) * window
    found["clicks"] = away(clicks, (on * bright + (1 - on) * dark) * window)
    found["g2"] = away(after, wanted["g2_zero"] * chance)
    error = after.std() / np.sqrt(after.size) / chance
    print(f"g2 = {wanted['g2_zero']:.4f}, simulated within {error:.4f}")
    assert error < 0.005 + 0.02 * wanted["g2_zero"]
    check(found)


# --- exact relations -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    "extra", [*PULSED, *({"pumping": "continuous", **row} for row in CONTINUOUS)]
)
def test_budget_adds_up(extra: Point) -> None:
    """Streams sum to totals, factors multiply to the end rate, named rates are rows of the table."""
    point = BASE | dict(extra)
    table = explorer.budget(point)
    rates = explorer.evaluate(point, ["rate_at_lens", "rate_in_fibre", "rate_detected"])
    streams = table[list(STREAMS)].iloc[2:].to_numpy()
    totals = table["total"].to_numpy()
    assert streams.sum(axis=1) == pytest.approx(totals[2:], rel=1e-12)
    assert totals[0] * np.prod(table["factor"].to_numpy()[1:]) == pytest.approx(
        totals[-1], rel=1e-12
    )
    assert totals[-1] == pytest.approx(rates["rate_detected"], rel=1e-12)
    assert table.loc["inside the aperture", "total"] == pytest.approx(
        rates["rate_at_lens"], rel=1e-12
    )
    assert table.loc["in the fibre", "total"] == pytest.approx(rates["rate_in_fibre"], rel=1e-12)


def test_decays_per_pulse_without_biexciton() -> None:
    """p D / (D + p (1 − D)), p = 1 − e^−m, D = 1 − e^(−T/τ), over short and long periods."""
    mean, rate = np.meshgrid(10.0 ** np.arange(-6, 2), 10.0 ** np.arange(3, 13))
    point = BASE | {"excitations_per_pulse": mean, "repetition_rate": rate}
    found = explorer.evaluate(point, ["rate_detected", "device_lifetime"])
    chance = total_chance(odds_of(BASE))
    some, gone = -np.expm1(-mean), -np.expm1(-1 / rate / found["device_lifetime"])
    stays = np.exp(-1 / rate / found["device_lifetime"])
    expected = some * gone / (gone + some * stays) * rate * chance
    assert found["rate_detected"] == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("extra", PULSED[1:4] + PULSED[9:])
def test_g2_goes_to_the_ratio_of_yields_at_weak_pumping(extra: Point) -> None:
    """φB/φX: pulsed with a long period, and continuous."""
    point = BASE | dict(extra) | {"background_per_pulse": 0.0, "repetition_rate": 1e5}
    exciton, biexciton = both_odds(point)
    limit = total_chance(biexciton) / total_chance(exciton)
    weak = point | {"excitations_per_pulse": 1e-7}
    assert explorer.evaluate(weak, ["g2_zero"])["g2_zero"] == pytest.approx(limit, rel=1e-6)
    weak = point | {"pumping": "continuous", "saturation": 1e-7}
    assert explorer.evaluate(weak, ["g2_zero"])["g2_zero"] == pytest.approx(limit, rel=1e-6)


def test_g2_of_a_perfect_emitter_in_background() -> None:
    """1 − ρ², ρ = S/(S + B): continuous and pulsed, without biexciton."""
    noise = 10.0 ** np.arange(2, 9)
    point = BASE | {"pumping": "continuous", "background_rate": noise}
    found = explorer.evaluate(point, ["g2_zero", "rate_detected"])
    signal = found["rate_detected"] / (found["rate_detected"] + noise)
    assert found["g2_zero"] == pytest.approx((1 - signal) * (1 + signal), rel=1e-9)
    noise = 10.0 ** np.arange(-8, 1)
    found = explorer.evaluate(BASE | {"background_per_pulse": noise}, ["g2_zero", "rate_detected"])
    signal = found["rate_detected"] / 10e6
    expected = noise * (2 * signal + noise) / (signal + noise) ** 2
    assert found["g2_zero"] == pytest.approx(expected, rel=1e-12)


# --- the stationary chain ------------------------------------------------------------------------


def exact_decays(x: float, y: float) -> tuple[mp.mpf, ...]:
    """1−e^−x, 1−e^−y, BX and B0 over a period, at the working precision."""
    x, y = mp.mpf(x), mp.mpf(y)
    one = y * mp.exp(-y) if x == y else y * (mp.exp(-x) - mp.exp(-y)) / (y - x)
    gone_b = -mp.expm1(-y)
    return -mp.expm1(-x), gone_b, one, gone_b - one


def stationary(mean: float, x: float, y: float) -> tuple[mp.mpf, mp.mpf]:
    """Occupations of exciton and biexciton after a pulse, by a linear solve at the working precision."""
    mean = mp.mpf(mean)
    gone, gone_b, one, both = exact_decays(x, y)
    none = mp.exp(-mean)
    single = mean * none
    pulse_ = mp.matrix([[none, single, 1 - none - single], [0, none, 1 - none], [0, 0, 1]])
    decay = mp.matrix([[1, 0, 0], [gone, 1 - gone, 0], [both, one, 1 - gone_b]])
    system = (decay * pulse_).T - mp.eye(3)
    for column in range(3):
        system[0, column] = 1
    found = mp.lu_solve(system, mp.matrix([1, 0, 0]))
    return found[1], found[2]


RATES = [10.0**power for power in range(-8, 9, 2)]


def chain_points() -> list[tuple[float, float, float]]:
    """Mean, kX T and kB T: from 1e-8 to 1e8, equal, and nearly equal."""
    pairs = [(x, y) for x in RATES for y in RATES]
    pairs += [
        (x, x * (1 + near)) for x in (*RATES, 0.3, 2.9, 3.1) for near in (1e-12, -1e-9, 1e-5, 1e-2)
    ]
    return [(mean, x, y) for mean in (1e-6, 1e-2, 1.0, 20.0) for x, y in pairs]


def test_two_decays_within_a_period() -> None:
    worst = 0.0
    with mp.workdps(80):
        for _, x, y in chain_points():
            truth = exact_decays(x, y)[3]
            worst = max(worst, float(abs(chain_decay(x, y)[4] - truth) / truth))
    print(f"both decays: worst {worst:.2e}")
    assert worst < 1e-9


def test_stationary_chain_over_extreme_rates() -> None:
    """Occupations and decays per pulse against a linear solve at 80 digits, 1e-10 relative."""
    worst = dict.fromkeys(("occupations", "decays"), 0.0)
    with mp.workdps(80):
        for mean, x, y in chain_points():
            decay = period_decay(exciton_rate=x, biexciton_rate=y, repetition_rate=1.0)
            ours = occupations(excitations_per_pulse=mean, period_decay=decay)
            truth = stationary(mean, x, y)
            gone, gone_b, _, both = exact_decays(x, y)
            exact = (truth[0] * gone + truth[1] * both, truth[1] * gone_b)
            mine = (ours[0] * decay[1] + ours[1] * decay[4], ours[1] * decay[2])
            for name, found, expected in (("occupations", ours, truth), ("decays", mine, exact)):
                for one, other in zip(found, expected, strict=True):
                    worst[name] = max(worst[name], float(abs(one - other) / other))
    print(f"chain: worst {worst}")
    assert max(worst.values()) < 1e-10


def test_stationary_chain_against_an_eigenvector() -> None:
    """The same by the general-purpose eigenvalue solver where double precision is enough for it."""
    for mean in (0.1, 1.0, 5.0):
        for x in (0.2, 1.0, 7.0):
            for y in (0.5, 1.0, 9.0):
                gone, gone_b, one, both = (float(value) for value in exact_decays(x, y))
                none = np.exp(-mean)
                single = mean * none
                pulse_ = np.array(
                    [[none, single, 1 - none - single], [0, none, 1 - none], [0, 0, 1]]
                )
                decay = np.array([[1, 0, 0], [gone, 1 - gone, 0], [both, one, 1 - gone_b]])
                values, vectors = np.linalg.eig((decay @ pulse_).T)
                vector = vectors[:, np.argmax(values.real)].real
                vector /= vector.sum()
                ours = occupations(
                    excitations_per_pulse=mean,
                    period_decay=period_decay(
                        exciton_rate=x, biexciton_rate=y, repetition_rate=1.0
                    ),
                )
                assert (float(ours[0]), float(ours[1])) == pytest.approx(
                    tuple(vector[1:]), rel=1e-10
                )
