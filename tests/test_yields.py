"""The share of devices that pass: closed forms, intervals, maps, and what it must not depend on."""

from __future__ import annotations

import math
import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from scipy import stats

from explorer import (
    Axis,
    Design,
    InputError,
    Requirement,
    Spread,
    devices,
    evaluate,
    make_map,
    make_yield_map,
    mesh,
    quantiles,
    scattered,
    yield_of,
)
from explorer.devices import Run
from explorer.sampling import BATCHES, MOST
from explorer.scenario import first_question
from explorer.yield_maps import COARSER, yield_map_steps
from explorer.yields import CONFIDENCE, FEW, PASSING, Yield, interval, yield_steps

COUNT = 4096
STUDENT = stats.t.ppf((1 + CONFIDENCE) / 2, BATCHES - 1)

# --- shares that are known ------------------------------------------------------------------------

MEDIAN = stats.norm.ppf


@dataclass(frozen=True)
class Case:
    """What is asked of `yield_of`, and the share that a closed form gives."""

    point: dict[str, Any]
    scatter: dict[str, Spread]
    requirements: list[Requirement]
    share: float

    def found(self, seed: int, count: int = COUNT) -> Yield:
        return yield_of(self.point, self.scatter, self.requirements, count, seed)


def value(quantity: str, **point: float) -> float:
    """A quantity of one design."""
    return float(evaluate(point, [quantity])[quantity])


def quality(share: float) -> Case:
    """One input: F ∝ Q, and ln Q is normal."""
    limit = 100 * math.exp(0.3 * MEDIAN(1 - share))
    wanted = Requirement("peak_purcell", at_least=value("peak_purcell", quality_factor=limit))
    return Case({}, {"quality_factor": Spread("lognormal", 0.3)}, [wanted], share)


def purcell(share: float) -> Case:
    """Two inputs: ln F = ln Q − ln V is normal, its variance the sum of theirs."""
    limit = 100 * math.exp(math.hypot(0.3, 0.2) * MEDIAN(1 - share))
    wanted = Requirement("peak_purcell", at_least=value("peak_purcell", quality_factor=limit))
    widths = {"quality_factor": 0.3, "mode_volume": 0.2}
    scatter = {name: Spread("lognormal", width) for name, width in widths.items()}
    return Case({}, scatter, [wanted], share)


def displaced(share: float) -> Case:
    """Two numbers a draw: the distance from the middle of what is displaced about 60 nm beside it."""
    reach = float(stats.rice(60 / 40, scale=40e-9).ppf(share))
    wanted = Requirement("placement", at_least=value("placement", lateral_offset=reach))
    scatter = {"lateral_offset": Spread("radial", 40e-9)}
    return Case({"lateral_offset": 60e-9}, scatter, [wanted], share)


def product(share: float) -> Case:
    """Five inputs: without other modes the rate is their product, and its logarithm is normal."""
    widths = {
        "optics_transmission": 0.3,
        "detector_efficiency": 0.25,
        "bright_share": 0.2,
        "radiative_share": 0.15,
        "upward_share": 0.1,
    }
    point = {**dict.fromkeys(widths, 0.1), "other_modes": 0.0}  # 1 is eight widths away or more
    spread = math.hypot(*widths.values())
    limit = value("rate_detected", **point) * math.exp(spread * MEDIAN(1 - share))
    wanted = Requirement("rate_detected", at_least=limit)
    scatter = {name: Spread("lognormal", width) for name, width in widths.items()}
    return Case(point, scatter, [wanted], share)


def box(share: float) -> Case:
    """Five inputs and a requirement on each: the shares multiply."""
    each = share**0.2
    score = MEDIAN(each)
    limits: dict[str, dict[str, float]] = {
        "radiative_rate": {"lifetime": 20e-9 * math.exp(0.2 * score)},
        "resonator_linewidth": {"quality_factor": 100 * math.exp(0.2 * score)},
        "mode_radius": {"mode_volume": math.exp(-0.2 * score)},
        "placement": {"axial_offset": 30e-9 * MEDIAN((1 + each) / 2)},
        "dipole_collected": {"numerical_aperture": 0.5 - 0.02 * score},
    }
    scatter = {
        "lifetime": Spread("lognormal", 0.2),
        "quality_factor": Spread("lognormal", 0.2),
        "mode_volume": Spread("lognormal", 0.2),
        "axial_offset": Spread("normal", 30e-9),
        "numerical_aperture": Spread("normal", 0.02),
    }
    wanted = [Requirement(name, at_least=value(name, **end)) for name, end in limits.items()]
    return Case({}, scatter, wanted, share)


RADIUS = 650e-9 / 1.5 * math.sqrt(8 / math.pi)  # w = (λ/n) √(4V/πL) at the defaults


@pytest.mark.parametrize("seed", range(30))
def test_placement_against_its_closed_form(seed: int) -> None:
    """ψ = exp(−2r²/w²) ≥ f within r² ≤ w² ln(1/f)/2: 1 − f^(w²/4σ²) of the devices."""
    random = np.random.default_rng(seed)
    share = random.uniform(0.1, 0.9)
    sigma = random.uniform(50e-9, 250e-9)
    least = (1 - share) ** (4 * sigma**2 / RADIUS**2)
    wanted = Requirement("placement", at_least=least)
    found = yield_of({}, {"lateral_offset": Spread("radial", sigma)}, [wanted], COUNT, seed)
    closed = 1 - least ** (RADIUS**2 / (4 * sigma**2))
    assert closed == pytest.approx(share, rel=1e-9)
    error = (found.high - found.low) / (2 * STUDENT)
    assert 0 < error < 1e-3
    assert abs(found.share - closed) <= 4 * error


@pytest.mark.parametrize("seed", range(30))
def test_placement_beside_the_middle_is_a_rice_distribution(seed: int) -> None:
    random = np.random.default_rng(seed)
    share, off, sigma = random.uniform(0.1, 0.9), random.uniform(-2e-7, 2e-7), 60e-9
    shape = stats.rice(abs(off) / sigma, scale=sigma)
    least = math.exp(-2 * (shape.ppf(share) / RADIUS) ** 2)
    wanted = Requirement("placement", at_least=least)
    scatter = {"lateral_offset": Spread("radial", sigma)}
    found = yield_of({"lateral_offset": off}, scatter, [wanted], COUNT, seed)
    error = (found.high - found.low) / (2 * STUDENT)
    assert 0 < error < 5e-3
    assert abs(found.share - share) <= 4 * error


@pytest.mark.parametrize("coefficient", [-1.0, -0.8, 0.0, 0.5, 0.95, 1.0])
def test_two_requirements_at_the_median_of_what_is_correlated(coefficient: float) -> None:
    """P(both above their medians) = 1/4 + arcsin(r)/2π (Sheppard 1899, from memory)."""
    scatter = {"quality_factor": Spread("lognormal", 0.3), "mode_volume": Spread("lognormal", 0.2)}
    wanted = [
        Requirement("resonator_linewidth", at_most=value("resonator_linewidth")),
        Requirement("mode_radius", at_least=value("mode_radius")),
    ]
    found = yield_of(
        {}, scatter, wanted, COUNT, correlation={"mode_volume|quality_factor": coefficient}
    )
    share = 0.25 + math.asin(coefficient) / (2 * math.pi)
    assert found.share == pytest.approx(share, abs=2e-3)
    assert found.low <= share + 1e-3
    assert share - 1e-3 <= found.high
    assert [part.share for part in found.by_requirement.values()] == pytest.approx(
        [0.5, 0.5], abs=3e-3
    )


def test_a_correlation_narrows_what_makes_up_for_each_other() -> None:
    """ln F = ln Q − ln V with the variance σ²(2 − 2ρ)."""
    scatter = {name: Spread("lognormal", 0.3) for name in ("quality_factor", "mode_volume")}
    least = 0.8 * value("peak_purcell")
    for coefficient in (-0.5, 0.0, 0.8):
        spread = 0.3 * math.sqrt(2 - 2 * coefficient)
        share = stats.norm.sf(math.log(0.8) / spread)
        found = yield_of(
            {},
            scatter,
            [Requirement("peak_purcell", at_least=least)],
            COUNT,
            correlation={"quality_factor|mode_volume": coefficient},
        )
        assert abs(found.share - share) <= 4 * (found.high - found.low) / (2 * STUDENT)
        assert found.high - found.low < 0.012


@pytest.mark.parametrize("case", [quality, purcell, displaced, product, box])
@pytest.mark.parametrize("share", [0.2, 0.5, 0.9])
def test_shares_in_closed_form(case: Callable[[float], Case], share: float) -> None:
    asked = case(share)
    for seed in range(3):
        found = asked.found(seed)
        assert found.low < found.share < found.high or share == 0.5
        assert abs(found.share - share) <= 4 * (found.high - found.low) / (2 * STUDENT)
        assert found.high - found.low < 0.02


# --- without scatter ------------------------------------------------------------------------------

SURE = [Requirement("peak_purcell", at_least=1.0), Requirement("g2_zero", at_most=0.1)]

STILL: dict[str, dict[str, Spread]] = {
    "nothing scatters": {},
    "no width": {"quality_factor": Spread("lognormal"), "lifetime": Spread("normal", 0.0)},
    "what no requirement depends on": {
        "optics_transmission": Spread("normal", 0.1),
        "lateral_offset": Spread("radial", 40e-9),
    },
}


@pytest.mark.parametrize("kind", STILL)
def test_without_scatter_the_share_is_exactly_nothing_or_all(kind: str) -> None:
    for requirement, share in (
        (Requirement("peak_purcell", at_least=1.0), 1.0),
        (Requirement("peak_purcell", at_least=1e9), 0.0),
    ):
        found = yield_of({}, STILL[kind], [requirement])
        assert (found.share, found.low, found.high) == (share, share, share)
        alone = found.by_requirement["peak_purcell"]
        assert (alone.share, alone.low, alone.high) == (share, share, share)
        for number in (found.share, found.low, found.high, alone.share, alone.low, alone.high):
            assert type(number) is float
        assert found.count == found.of == COUNT


@pytest.mark.parametrize("kind", STILL)
def test_without_scatter_a_map_is_exactly_that_of_the_margin(kind: str) -> None:
    axes = Axis("mode_volume", 1e-2, 1e3, count=30), Axis("quality_factor", 3, 1e4, count=20)
    drawn = make_yield_map({}, *axes, STILL[kind], SURE[:1])
    if kind == "no width":
        assert drawn.margin is not None
    share = drawn.values[PASSING]
    assert share.shape == (20, 30)
    assert np.array_equal(share, (drawn.margin >= 0).astype(float))
    assert 0 < share.mean() < 1
    assert np.array_equal(share, drawn.values["passing_low"])
    assert np.array_equal(share, drawn.values["passing_high"])


def test_what_is_built_once_does_not_scatter_with_what_it_follows() -> None:
    """The resonance is where the design puts it, so the width of the resonator is that of the design."""
    wanted = [Requirement("resonator_linewidth", at_most=1.1 * value("resonator_linewidth"))]
    found = yield_of({}, {"emission_wavelength": Spread("normal", 50e-9)}, wanted)
    assert (found.share, found.low, found.high) == (1.0, 1.0, 1.0)
    own = {"resonance_wavelength": Spread("normal", 50e-9)}
    assert 0.5 < yield_of({}, own, wanted).share < 1


def test_what_fails_for_certain_fails_with_what_scatters() -> None:
    """A requirement that nothing that scatters reaches, and that is missed, leaves no doubt."""
    scatter = {"optics_transmission": Spread("normal", 0.1)}
    missed = [Requirement("peak_purcell", at_least=1e9), Requirement("rate_detected", at_least=1.0)]
    found = yield_of({"optics_transmission": 0.5}, scatter, missed)
    assert (found.share, found.low, found.high) == (0.0, 0.0, 0.0)
    assert found.by_requirement["rate_detected"].share == 1.0
    assert found.by_requirement["rate_detected"].low < 1.0, "this one was drawn"


def test_scatter_that_reaches_one_requirement_leaves_the_other_certain() -> None:
    scatter = {"optics_transmission": Spread("normal", 0.1)}
    rate = value("rate_detected", optics_transmission=0.5)
    wanted = [
        Requirement("peak_purcell", at_least=1.0),
        Requirement("rate_detected", at_least=rate),
    ]
    found = yield_of({"optics_transmission": 0.5}, scatter, wanted)
    sure, drawn = found.by_requirement.values()
    assert (sure.share, sure.low, sure.high) == (1.0, 1.0, 1.0)
    assert found.share == drawn.share == pytest.approx(0.5, abs=1e-3)


# --- intervals ------------------------------------------------------------------------------------


def test_an_interval_by_hand() -> None:
    """Student's t of 16 batches of 100, the variance of a rounding added to theirs."""
    passes = np.array([50, 52, 48, 51, 49, 53, 47, 50, 50, 52, 48, 51, 49, 53, 47, 50])
    found = interval(passes, 100)
    variance = 2 * (3 * 4 + 2 * 1 + 2 * 9) / 15 - 2 * 4 / 15  # 2²×4, 1²×4, 3²×4, over 15
    assert passes.var(ddof=1) == pytest.approx(variance)
    reach = 2.131449546 * math.sqrt(variance + 1 / 12) / 4 / 100  # t of 15 for 95 %, from tables
    assert (float(found.share), float(found.low), float(found.high)) == pytest.approx(
        (0.5, 0.5 - reach, 0.5 + reach), rel=1e-8
    )


def test_few_passes_have_a_binomial_interval() -> None:
    """Jeffreys: quantiles of Beta(k + ½, n − k + ½), from 0 where none and to 1 where all pass."""
    for total in (0, 1, FEW - 1, 1600 - FEW + 1, 1599, 1600):
        passes = np.full(16, total // 16)
        passes[: total % 16] += 1
        found = interval(passes, 100)
        shape = stats.beta(total + 0.5, 1600 - total + 0.5)
        assert float(found.share) == total / 1600
        assert float(found.low) == pytest.approx(shape.ppf(0.025) if total else 0.0)
        assert float(found.high) == pytest.approx(shape.ppf(0.975) if total < 1600 else 1.0)
    assert float(interval(np.array([30]), 100).low) == pytest.approx(
        stats.beta(30.5, 70.5).ppf(0.025)
    ), "one batch says nothing of its error"


def test_an_interval_holds_the_share_between_two_whole_numbers() -> None:
    """Evenly drawn batches of one input count k or k + 1 of 256, the larger with the chance f.

    So their sum is binomial and the chance that the interval holds (k + f)/256 is a plain sum; without
    the variance of rounding it fell to 15 % where f = 0.01, since then most often all count the same.
    """
    above = np.arange(BATCHES + 1)
    passes = 100 + (np.arange(BATCHES)[:, None] < above)
    found = interval(passes, 256)
    held = []
    for part in np.linspace(0, 1, 501):
        share = (100 + part) / 256
        inside = (found.low <= share) & (share <= found.high)
        held.append(stats.binom.pmf(above, BATCHES, part)[inside].sum())
    assert min(held) > 0.929
    assert 0.95 < np.mean(held) < 0.981


def test_intervals_hold_their_share_and_stay_between_nothing_and_all() -> None:
    passes = np.random.default_rng(0).binomial(64, np.linspace(0, 1, 200), (BATCHES, 200))
    found = interval(passes, 64)
    assert np.all((found.low <= found.share) & (found.share <= found.high))
    assert np.all((found.low >= 0) & (found.high <= 1))
    alone = [interval(passes[:, index], 64) for index in range(200)]
    assert np.array_equal(found.high, [float(one.high) for one in alone])


#: Two and five inputs.
COVERED: list[tuple[Callable[[float], Case], float]] = [
    (purcell, 0.5),
    (purcell, 0.8),
    (purcell, 0.97),
    (displaced, 0.5),
    (displaced, 0.8),
    (displaced, 0.97),
    (product, 0.5),
    (product, 0.8),
    (product, 0.97),
    (box, 0.5),
    (box, 0.8),
    (box, 0.97),
]

#: One input, drawn so evenly that a batch counts one of two neighbouring whole numbers: how often an
#: interval holds the share then depends on where between them it lies, up to always where on one.
EVEN: list[tuple[Callable[[float], Case], float]] = [
    (quality, 0.36),
    (quality, 0.5),
    (quality, 0.50005),
    (quality, 0.8),
    (quality, 0.97),
]


@pytest.mark.slow
@pytest.mark.parametrize(("case", "share"), [*COVERED, *EVEN])
def test_intervals_hold_the_true_share_as_often_as_they_say(
    case: Callable[[float], Case], share: float
) -> None:
    """95 % of 1000 repeats, ± three standard deviations of such a count: 93 to 97 and a little."""
    asked = case(share)
    held = 0
    for seed in range(1000):
        found = asked.found(seed)
        held += found.low - 1e-12 <= share <= found.high + 1e-12
    print(f"{case.__name__} {share}: held {held / 10:.1f} %")
    assert held >= 930
    assert held <= 980 or (case, share) in EVEN


@pytest.mark.slow
@pytest.mark.parametrize(
    ("case", "share", "most"),
    [
        *((quality, share, 0.5) for share in (0.2, 0.5, 0.8, 0.97)),
        *((purcell, share, 0.5) for share in (0.2, 0.5, 0.8, 0.97)),
        *((displaced, share, 0.5) for share in (0.2, 0.5, 0.8, 0.97)),
        *((product, share, 0.9) for share in (0.2, 0.5, 0.8, 0.97)),
        *((box, share, 0.9) for share in (0.2, 0.5, 0.8, 0.97)),
    ],
)
def test_the_error_against_that_of_plain_random_draws(
    case: Callable[[float], Case], share: float, most: float
) -> None:
    """Root mean square over 100 seeds, over √(p(1 − p)/n) of as many independent draws."""
    asked = case(share)
    errors = [asked.found(seed).share - share for seed in range(100)]
    plain = math.sqrt(share * (1 - share) / COUNT)
    ratio = math.sqrt(np.mean(np.square(errors))) / plain
    print(f"{case.__name__} {share}: {ratio:.3f} of plain random")
    assert ratio <= most


# --- quantiles ------------------------------------------------------------------------------------

LEVELS = (0.01, 0.05, 0.1, 0.5, 0.9, 0.95, 0.99)


def test_quantiles_of_a_monotonic_quantity_are_those_of_its_input() -> None:
    """F ∝ Q, and Q lognormal: F at a level is F exp(0.3 z)."""
    for seed in range(5):
        found = quantiles(
            {}, {"quality_factor": Spread("lognormal", 0.3)}, "peak_purcell", LEVELS, COUNT, seed
        )
        expected = value("peak_purcell") * np.exp(0.3 * stats.norm.ppf(LEVELS))
        assert found.levels == LEVELS
        assert np.all((found.low <= found.values) & (found.values <= found.high))
        assert np.all(
            np.abs(found.values - expected) <= 4 * (found.high - found.low) / (2 * STUDENT)
        )
        assert found.values[2:5] == pytest.approx(expected[2:5], rel=4e-3)
        assert np.all(found.high - found.low < 0.05 * expected)
        assert found.missing == 0.0


@pytest.mark.slow
@pytest.mark.parametrize("inputs", [1, 2])
def test_intervals_of_quantiles_hold_the_true_ones(inputs: int) -> None:
    """Seldom enough they do not: 5 % where two inputs scatter, less where one does, evenly drawn."""
    widths = dict(list({"quality_factor": 0.3, "mode_volume": 0.2}.items())[:inputs])
    scatter = {name: Spread("lognormal", width) for name, width in widths.items()}
    spread = math.hypot(*widths.values())
    expected = value("peak_purcell") * np.exp(spread * stats.norm.ppf(LEVELS))
    held = np.zeros(len(LEVELS))
    for seed in range(1000):
        found = quantiles({}, scatter, "peak_purcell", LEVELS, COUNT, seed)
        held += (found.low <= expected) & (expected <= found.high)
    print(f"{inputs} inputs, levels {LEVELS}: held {held / 10} %")
    assert np.all(held >= 930)
    assert np.all(held <= 980) or inputs == 1


def test_quantiles_are_numpys_and_leave_out_what_has_no_number() -> None:
    """g rises above ωc in the smallest modes: no number there."""
    point = {"quality_factor": 1e4, "lifetime": 1e-12, "mode_volume": 2e-6}
    scatter = {"mode_volume": Spread("lognormal", 1.0)}
    many = evaluate(scattered(point, scatter, 1024), ["rate_enhancement"])["rate_enhancement"]
    found = quantiles(point, scatter, "rate_enhancement", LEVELS, 1024)
    assert 0.1 < np.isnan(many).mean() < 0.9
    assert found.missing == np.isnan(many).mean()
    assert found.values == pytest.approx(np.nanquantile(many, LEVELS), rel=1e-12)


def test_the_interval_of_a_quantile_is_that_of_the_share_below_it() -> None:
    """Woodruff's, by hand, where some devices have no number: levels are of those that have one."""
    point = {"quality_factor": 1e4, "lifetime": 1e-12, "mode_volume": 2e-6}
    scatter = {"mode_volume": Spread("lognormal", 1.0)}
    many = evaluate(scattered(point, scatter, 1024), ["rate_enhancement"])["rate_enhancement"]
    found = quantiles(point, scatter, "rate_enhancement", 0.3, 1024)
    below = many <= found.values[0]
    share = interval(below.reshape(BATCHES, 64).sum(axis=1), 64)
    known = 1 - np.isnan(many).mean()
    for end, level in ((found.low[0], share.low), (found.high[0], share.high)):
        expected = np.nanquantile(many, 0.3 + (level - below.mean()) / known)
        assert end == pytest.approx(expected, rel=1e-12)
    assert found.low[0] < found.values[0] < found.high[0]


def test_quantiles_where_nothing_has_a_number() -> None:
    point = {"quality_factor": 1e4, "lifetime": 1e-12, "mode_volume": 1e-8}
    found = quantiles(point, {"mode_volume": Spread("lognormal", 0.1)}, "rate_enhancement")
    assert found.missing == 1.0
    assert np.all(np.isnan(found.values))


def test_quantiles_of_what_does_not_scatter_are_it() -> None:
    for scatter in STILL.values():
        found = quantiles({"quality_factor": 70.0}, scatter, "peak_purcell", LEVELS, 256)
        for row in (found.values, found.low, found.high):
            assert np.array_equal(
                row, np.full(len(LEVELS), value("peak_purcell", quality_factor=70.0))
            )


def test_a_yield_has_the_quantiles_of_its_own_devices() -> None:
    scatter = {"quality_factor": Spread("lognormal", 0.3), "lifetime": Spread("normal", 1e-9)}
    found = yield_of({}, scatter, SURE, 256, 5)
    one = found.quantile("rate_detected", 0.25)
    other = quantiles({}, scatter, "rate_detected", 0.25, 256, 5)
    assert one.levels == (0.25,)
    assert np.array_equal(one.values, other.values)
    assert np.array_equal(one.high, other.high)


def test_quantiles_of_a_curve_are_those_of_its_elements(monkeypatch: Any) -> None:
    quality_factors = np.array([10.0, 100.0, 1000.0])
    scatter = {"quality_factor": Spread("lognormal", 0.3), "lateral_offset": Spread("radial", 4e-8)}
    whole = quantiles({"quality_factor": quality_factors}, scatter, "rate_detected", LEVELS, 256)
    assert whole.values.shape == (len(LEVELS), 3)
    monkeypatch.setattr(devices, "BLOCK", 100)
    for column, one in enumerate(quality_factors):
        alone = quantiles({"quality_factor": one}, scatter, "rate_detected", LEVELS, 256)
        assert np.array_equal(whole.values[:, column], alone.values)
        assert whole.low[:, column] == pytest.approx(alone.low, rel=1e-12)


# --- what has no number ---------------------------------------------------------------------------


def test_a_device_without_a_number_does_not_pass() -> None:
    """Above ωc there is no number: neither at least nor at most anything."""
    point = {"quality_factor": 1e4, "lifetime": 1e-12, "mode_volume": 2e-6}
    scatter = {"mode_volume": Spread("lognormal", 1.0)}
    many = evaluate(scattered(point, scatter, 1024), ["rate_enhancement"])["rate_enhancement"]
    known = 1 - np.isnan(many).mean()
    assert 0.1 < known < 0.9
    for requirement in (
        Requirement("rate_enhancement", at_least=-1e300),
        Requirement("rate_enhancement", at_most=1e300),
    ):
        assert yield_of(point, scatter, [requirement], 1024).share == known
    nothing = yield_of({**point, "mode_volume": 1e-8}, {}, [requirement])
    assert (nothing.share, nothing.high) == (0.0, 0.0)


# --- arrays, blocks, threads, order ---------------------------------------------------------------

QUESTION = first_question().design
SCATTER = {
    "lateral_offset": Spread("radial", 40e-9),
    "mode_volume": Spread("lognormal", 0.2),
    "resonance_wavelength": Spread("normal", 5e-9),
    "quality_factor": Spread("lognormal", 0.2),
    "upward_share": Spread("normal", 0.05),
}
WANTED = (*QUESTION.requirements[:3], Requirement("collected_share", at_least=0.5))
CORRELATION = {"mode_volume|quality_factor": 0.6}

POINTS: dict[str, dict[str, Any]] = {
    "still": {},
    "wandering": {"slow_linewidth": 5e-9},
    "wandering along an axis": {"slow_linewidth": np.array([[0.0], [1e-9], [0.0], [20e-9]])},
    "a filter along an axis": {"filter_width": np.array([[math.inf], [5e-9], [50e-9], [1e-9]])},
}


def grid(kind: str) -> dict[str, Any]:
    point: dict[str, Any] = {**QUESTION.point, **POINTS[kind]}
    point["mode_volume"] = np.array([1e-2, 0.3, 1.0, 3.0, 30.0])
    if not any(np.ndim(entry) == 2 for entry in POINTS[kind].values()):
        point["quality_factor"] = np.array([[5.0], [20.0], [50.0], [500.0]])
    return point


def same(one: Yield, other: Yield) -> bool:
    """Whether all shares and intervals are equal, bit for bit."""
    rows = [(one, other)]
    rows += list(zip(one.by_requirement.values(), other.by_requirement.values(), strict=True))
    return all(
        np.array_equal(getattr(a, part), getattr(b, part))
        for a, b in rows
        for part in ("share", "low", "high")
    )


@pytest.mark.parametrize("kind", POINTS)
def test_arrays_give_what_their_elements_give(kind: str) -> None:
    """The same draws for every cell, so the same counts."""
    point = grid(kind)
    whole = yield_of(point, SCATTER, WANTED, 256, 3, CORRELATION)
    assert whole.share.shape == (4, 5)
    assert 0 < whole.share.mean() < 1
    full = {name: entry for name, entry in point.items() if isinstance(entry, np.ndarray)}
    for index in np.ndindex(4, 5):
        cell = {
            **point,
            **{name: float(np.broadcast_to(entry, (4, 5))[index]) for name, entry in full.items()},
        }
        alone = yield_of(Design(cell), SCATTER, WANTED, 256, 3, CORRELATION)
        assert alone.share == whole.share[index]
        assert (alone.low, alone.high) == (whole.low[index], whole.high[index])
        for name, part in alone.by_requirement.items():
            assert part.share == whole.by_requirement[name].share[index]


@pytest.mark.parametrize("kind", POINTS)
def test_the_share_is_that_of_the_devices_evaluated_at_once(kind: str) -> None:
    """Against the plain way: one evaluation of the whole run, one count."""
    point = grid(kind)
    whole = yield_of(point, SCATTER, WANTED, 256, 3, CORRELATION)
    many = evaluate(
        scattered(point, SCATTER, 256, 3, CORRELATION), [entry.quantity for entry in WANTED]
    )
    met = [entry.met(many[entry.quantity]) for entry in WANTED]
    assert np.array_equal(whole.share, np.all(met, axis=0).mean(axis=0))
    for one, part in zip(met, whole.by_requirement.values(), strict=True):
        assert np.array_equal(part.share, one.mean(axis=0))


@pytest.mark.parametrize("block", [1, 7, 100, 1000, 10_000, 10**9])
def test_the_result_does_not_depend_on_the_blocks(block: int, monkeypatch: Any) -> None:
    if block < 100:
        point = {**grid("wandering"), "mode_volume": np.array([0.3, 1.0])}
        count = 32
    else:
        point, count = grid("wandering"), 256
    expected = yield_of(point, SCATTER, WANTED, count, 3)
    monkeypatch.setattr(devices, "BLOCK", block)
    assert same(yield_of(point, SCATTER, WANTED, count, 3), expected)
    assert same(yield_of(point, SCATTER, WANTED, count, 3, threads=3), expected)


@pytest.mark.parametrize("threads", [1, 2, 3, 16])
def test_the_result_does_not_depend_on_the_threads(threads: int) -> None:
    expected = yield_of(grid("still"), SCATTER, WANTED, 512, 3)
    assert same(yield_of(grid("still"), SCATTER, WANTED, 512, 3, threads=threads), expected)


def test_the_result_does_not_depend_on_the_order_of_the_scatter() -> None:
    backwards = dict(reversed(SCATTER.items()))
    for seed in range(3):
        one = yield_of(QUESTION, SCATTER, WANTED, 256, seed, CORRELATION)
        other = yield_of(
            QUESTION, backwards, WANTED, 256, seed, {"quality_factor|mode_volume": 0.6}
        )
        assert same(one, other)


def test_the_same_seed_gives_the_same_and_another_does_not() -> None:
    median = quantiles(QUESTION, SCATTER, "rate_in_fibre", 0.5, 256).values[0]
    rate = Requirement("rate_in_fibre", at_least=median)
    shares = [yield_of(QUESTION, SCATTER, [rate], 1024, seed).share for seed in (0, 0, 1, 2)]
    assert shares[0] == shares[1]
    assert len(set(shares)) == 3
    assert shares == pytest.approx([0.5] * 4, abs=0.05)


def test_a_design_counts_by_its_point_alone() -> None:
    one = yield_of(QUESTION, SCATTER, WANTED, 256)
    assert same(one, yield_of(QUESTION.point, SCATTER, WANTED, 256))
    assert QUESTION.scatter != SCATTER


def test_counts_are_rounded_up_and_told() -> None:
    for count, made in {1: 16, 100: 128, 2048: 2048, 2049: 4096}.items():
        found = yield_of({}, {"quality_factor": Spread("lognormal", 0.2)}, SURE, count)
        assert (found.count, found.of) == (made, made)


def test_requirements_have_a_name_each() -> None:
    wanted = [
        Requirement("peak_purcell", at_least=2.0),
        Requirement("peak_purcell", at_most=9.0),
        Requirement("g2_zero", at_most=0.1),
    ]
    found = yield_of({}, {"quality_factor": Spread("lognormal", 0.3)}, iter(wanted), 256)
    assert list(found.by_requirement) == ["peak_purcell ≥ 2", "peak_purcell ≤ 9", "g2_zero"]
    parts = [part.share for part in found.by_requirement.values()]
    assert found.share <= min(parts)
    assert found.share == pytest.approx(parts[0] + parts[1] - 1)  # no device misses both


def test_points_without_elements_have_shares_without_elements() -> None:
    empty = {"quality_factor": np.empty((0, 3))}
    for scatter in ({}, SCATTER):
        found = yield_of(empty, scatter, WANTED, 64)
        assert found.share.shape == found.high.shape == (0, 3)
    assert quantiles(empty, SCATTER, "peak_purcell", count=64).values.shape == (3, 0, 3)


# --- as it grows ----------------------------------------------------------------------------------


def test_steps_grow_to_the_same(monkeypatch: Any) -> None:
    monkeypatch.setattr(devices, "BLOCK", 256)
    point = grid("still")
    steps = list(yield_steps(point, SCATTER, WANTED, 256, 3))
    grown = [step for step in steps if step is not None]
    assert [step.count for step in grown] == [16 * (index + 1) for index in range(16)]
    assert {step.of for step in grown} == {256}
    assert same(grown[-1], yield_of(point, SCATTER, WANTED, 256, 3))
    assert steps.count(None) == Run(point, SCATTER, WANTED, 256, 3, None).blocks
    for step in grown:
        assert np.all((step.low <= step.share) & (step.share <= step.high))
    first, last = grown[0], grown[-1]
    assert np.mean(first.high - first.low) > 2 * np.mean(last.high - last.low)


def test_a_step_is_the_yield_of_the_batches_that_are_done(monkeypatch: Any) -> None:
    monkeypatch.setattr(devices, "BLOCK", 256)
    point = grid("still")
    grown = [step for step in yield_steps(point, SCATTER, WANTED, 256, 3) if step]
    many = evaluate(scattered(point, SCATTER, 256, 3), [entry.quantity for entry in WANTED])
    met = np.all([entry.met(many[entry.quantity]) for entry in WANTED], axis=0)
    for step in grown:
        assert np.array_equal(step.share, met[: step.count].mean(axis=0))


AXES = Axis("mode_volume", 1e-2, 1e2, count=60), Axis("quality_factor", 3, 1e3, count=50)


def test_maps_come_coarse_first_and_end_as_the_whole_map() -> None:
    steps = list(yield_map_steps(QUESTION.point, *AXES, SCATTER, WANTED, 64, 3, threads=2))
    done = [share for share, _ in steps]
    maps = [drawn for _, drawn in steps if drawn is not None]
    assert done == sorted(done)
    assert (done[0], done[-1]) == (0.0, 1.0)
    sizes = [drawn.values[PASSING].shape for drawn in maps]
    assert sizes[: len(COARSER)] == [(24, 24), (48, 48)]
    assert set(sizes[len(COARSER) :]) == {(50, 60)}
    last = make_yield_map(QUESTION.point, *AXES, SCATTER, WANTED, 64, 3)
    for name in (PASSING, "passing_low", "passing_high"):
        assert np.array_equal(maps[-1].values[name], last.values[name])
    for drawn in maps:
        assert np.all(drawn.values["passing_low"] <= drawn.values[PASSING])
        assert np.all(drawn.values[PASSING] <= drawn.values["passing_high"])
    assert steps[-1][1] is maps[-1]


def test_a_map_is_the_yield_of_its_mesh_and_keeps_the_margin_of_the_designs() -> None:
    x, y = (Axis(axis.name, axis.low, axis.high, count=9) for axis in AXES)
    drawn = make_yield_map(QUESTION, x, y, SCATTER, WANTED, 64, 3, CORRELATION)
    found = yield_of({**QUESTION.point, **mesh(x, y)}, SCATTER, WANTED, 64, 3, CORRELATION)
    assert np.array_equal(drawn.values[PASSING], found.share)
    assert np.array_equal(drawn.values["passing_high"], found.high)
    plain = make_map(QUESTION.point, x, y, (), WANTED)
    assert np.array_equal(drawn.margin, plain.margin)


def test_along_the_emission_each_cell_has_its_own_resonance() -> None:
    """At every wavelength of the axis the device is built for it: the share does not change with it."""
    axes = (
        Axis("emission_wavelength", 600e-9, 700e-9, log=False, count=5),
        Axis("quality_factor", 10, 1e3, count=4),
    )
    scatter = {"emission_wavelength": Spread("normal", 3e-9)}
    point = {"fast_linewidth": 1e-9}
    wanted = [Requirement("spectral_overlap", at_least=0.5)]
    drawn = make_yield_map(point, *axes, scatter, wanted, 1024)
    share = drawn.values[PASSING]
    assert share[0] == pytest.approx(1.0)
    assert np.all(np.ptp(share, axis=1) < 0.1)
    assert np.all((share[2] > 0.05) & (share[2] < 0.95))
    fixed = make_yield_map({**point, "resonance_wavelength": 650e-9}, *axes, scatter, wanted, 1024)
    assert fixed.values[PASSING][2, 2] == share[2, 2]
    assert fixed.values[PASSING][2, 0] == 0.0


def test_work_that_is_given_up_is_not_finished_first(monkeypatch: Any) -> None:
    """Of the many blocks that wait for two threads, a few are begun; the rest is dropped."""
    begun = []
    work = Run.passes

    def slowly(run: Run, job: Any) -> Any:
        begun.append(job)
        time.sleep(0.01)
        return work(run, job)

    monkeypatch.setattr(devices, "BLOCK", 64)
    monkeypatch.setattr(Run, "passes", slowly)
    steps = yield_steps(grid("still"), SCATTER, WANTED, 1024, threads=2)
    assert next(steps) is None
    steps.close()
    assert len(begun) < 10 < Run(grid("still"), SCATTER, WANTED, 1024, 0, None).blocks / BATCHES
    with pytest.raises(StopIteration):
        next(steps)


# --- bad input ------------------------------------------------------------------------------------

ONE = {"quality_factor": Spread("lognormal", 0.2)}
BAD_LEVELS = (-0.1, 1.1, math.nan, "0.5", None, True, [], [0.5, 2], ["a"], [[0.5]], 1j, b"1")

REFUSED: dict[str, tuple[Callable[[], Any], tuple[str, ...]]] = {
    "no requirement": (lambda: yield_of({}, ONE, []), ("a yield needs a requirement",)),
    "a single requirement": (
        lambda: yield_of({}, ONE, SURE[0]),
        ("requirements is a sequence",),
    ),
    "a text for requirements": (lambda: yield_of({}, ONE, "g2"), ("requirements is a sequence",)),
    "nothing for requirements": (lambda: yield_of({}, ONE, None), ("requirements is a sequence",)),
    "a text among the requirements": (
        lambda: yield_of({}, ONE, [*SURE, "g2"]),
        ("'g2' is no Requirement",),
    ),
    "a point that is nothing": (lambda: yield_of(None, ONE, SURE), ("maps input names",)),
    "a point that is a list": (lambda: yield_of([], ONE, SURE), ("maps input names",)),
    "a point that is a text": (lambda: yield_of("Q", ONE, SURE), ("maps input names",)),
    "a bad value": (lambda: yield_of({"lifetime": -1.0}, ONE, SURE), ("lifetime = -1000000000 ns",)),
    "an unknown input": (lambda: yield_of({"speed": 1.0}, ONE, SURE), ("'speed' is no input",)),
    "arrays that do not fit": (
        lambda: yield_of({"lifetime": [1e-9] * 2, "mode_volume": [1.0] * 3}, ONE, SURE),
        ("(3,)", "mode_volume", "(2,)", "lifetime"),
    ),
    "scatter that is none": (lambda: yield_of({}, [ONE], SURE), ("no mapping",)),
    "scatter about infinity": (
        lambda: yield_of({}, {"filter_width": Spread("normal", 1e-9)}, [Requirement("rate_detected", at_least=1.0)]),
        ("filter_width is ∞",),
    ),
    "a correlation of what does not scatter": (
        lambda: yield_of({}, ONE, SURE, correlation={"quality_factor|lifetime": 0.5}),
        ("lifetime", "does not scatter"),
    ),
    "quantiles of what is unknown": (lambda: quantiles({}, ONE, "speed"), ("'speed' is no quantity",)),
    "quantiles of a word": (lambda: quantiles({}, ONE, "regime"), ("'regime' is no quantity that is a number",)),
    "quantiles of a caution": (lambda: quantiles({}, ONE, "low_quality"), ("'low_quality' is no quantity",)),
    "quantiles of an input": (lambda: quantiles({}, ONE, "lifetime"), ("'lifetime' is no quantity",)),
    "quantiles of nothing": (lambda: quantiles({}, ONE, None), ("None is no quantity",)),
    "a quantile of a yield of what is unknown": (
        lambda: yield_of({}, ONE, SURE, 16).quantile("speed"),
        ("'speed' is no quantity",),
    ),
    "quantiles of a bad point": (lambda: quantiles(5, ONE, "peak_purcell"), ("maps input names",)),
    "a map of a bad point": (lambda: make_yield_map(5, *AXES, ONE, SURE), ("maps input names",)),
    "a map of one input": (lambda: make_yield_map({}, AXES[0], AXES[0], ONE, SURE), ("two different inputs",)),
    "a map without requirements": (lambda: make_yield_map({}, *AXES, ONE, []), ("needs a requirement",)),
    "a map of no count": (lambda: make_yield_map({}, *AXES, ONE, SURE, 0), ("count is a whole number",)),
}  # fmt: skip

for _count in (0, -5, 2.5, MOST + 1, 10**400, math.inf, math.nan, "16", None, True):
    REFUSED[f"count {_count!r:.12}"] = (
        lambda count=_count: yield_of({}, ONE, SURE, count),
        ("count is a whole number from 1 to 4194304",),
    )
for _seed in (-1, 1.0, 2.5, math.nan, "0", None, False):
    REFUSED[f"seed {_seed!r}"] = (
        lambda seed=_seed: yield_of({}, ONE, SURE, 16, seed),
        ("seed is a whole number from 0 on",),
    )
for _threads in (0, -1, 1.5, 10**6, "2", None, True):
    REFUSED[f"threads {_threads!r}"] = (
        lambda threads=_threads: yield_of({}, ONE, SURE, 16, threads=threads),
        ("threads is a whole number from 1 to",),
    )
for _levels in BAD_LEVELS:
    REFUSED[f"levels {_levels!r}"] = (
        lambda levels=_levels: quantiles({}, ONE, "peak_purcell", levels, 16),
        ("a level of a quantile is a number from 0 to 1; got",),
    )
    REFUSED[f"levels {_levels!r} of a yield"] = (
        lambda levels=_levels: yield_of({}, ONE, SURE, 16).quantile("peak_purcell", levels),
        ("a level of a quantile is a number from 0 to 1; got",),
    )


@pytest.mark.parametrize("kind", REFUSED)
def test_what_is_refused_says_why_in_one_sentence(kind: str) -> None:
    call, parts = REFUSED[kind]
    with pytest.raises(InputError) as caught:
        call()
    text = str(caught.value)
    assert 10 < len(text) < 900 if "is no input" in text else 10 < len(text) < 300
    assert text.isprintable()
    for part in parts:
        assert part in text
    for jargon in ("dtype", "<class", "object at", "Error"):
        assert jargon not in text
