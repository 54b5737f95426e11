"""Draws of what scatters from device to device: distributions, correlation, what follows what."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from explorer import (
    INPUTS,
    Axis,
    Broadening,
    Design,
    InputError,
    Lines,
    Samples,
    Spread,
    evaluate,
    mesh,
    scattered,
)
from explorer.evaluate import Evaluation, limits_of
from explorer.sampling import BATCHES, BUILT_ONCE, KEPT, LIMITING, MOST, draws, whole_count
from explorer.scatter import SPREADS, kinds_for, normal_at

from .strategies import NUMBERS, points, scatters, tried

COUNT = 4096

#: Kolmogorov distance of so many plain random numbers, in the mean: √(π/2) ln 2 / √n.
PLAIN = math.sqrt(math.pi / 2) * math.log(2) / math.sqrt(COUNT)

SEEDS = range(5)


def distance(values: Any, distribution: Any) -> float:
    """Kolmogorov distance between draws and a distribution of scipy."""
    return float(stats.ks_1samp(np.ravel(values), distribution.cdf).statistic)


def truncated(distribution: Any, low: float, high: float) -> Any:
    """A distribution cut to low..high, by its own cumulative shares."""

    class Cut:
        @staticmethod
        def cdf(x: Any) -> Any:
            first, last = distribution.cdf(low), distribution.cdf(high)
            return np.clip((distribution.cdf(x) - first) / (last - first), 0, 1)

    return Cut


# --- distributions --------------------------------------------------------------------------------

#: Input, centre, spread, and the analytic distribution that scipy has for it.
SHAPES: dict[str, tuple[str, float, Spread, Any]] = {
    "normal": ("lifetime", 20e-9, Spread("normal", 1e-9), stats.norm(20e-9, 1e-9)),
    "normal below 0": ("biexciton_shift", -9e-9, Spread("normal", 9e-9), stats.norm(-9e-9, 9e-9)),
    "normal cut above": (
        "quantum_yield",
        0.9,
        Spread("normal", 0.2),
        stats.truncnorm(-0.9 / 0.2, 0.1 / 0.2, 0.9, 0.2),
    ),
    "normal cut below": (
        "slow_linewidth",
        2e-9,
        Spread("normal", 3e-9),
        stats.truncnorm(-2 / 3, 390 / 3, 2e-9, 3e-9),
    ),
    "normal from the end of its range": (
        "optics_transmission",
        1.0,
        Spread("normal", 0.1),
        stats.truncnorm(-10, 0, 1.0, 0.1),
    ),
    "normal far wider than its range": (
        "bright_share",
        0.2,
        Spread("normal", 1e40),
        stats.uniform(0, 1),
    ),
    "lognormal": ("mode_volume", 0.3, Spread("lognormal", 0.5), stats.lognorm(0.5, scale=0.3)),
    "lognormal cut": (
        "quantum_yield",
        0.9,
        Spread("lognormal", 0.3),
        truncated(stats.lognorm(0.3, scale=0.9), 0.0, 1.0),
    ),
    "lognormal far wider than its range": (
        "quality_factor",
        100.0,
        Spread("lognormal", 1e40),
        stats.loguniform(1.0, 1e10),
    ),
    "uniform": ("refractive_index", 1.5, Spread("uniform", 0.2), stats.uniform(1.3, 0.4)),
    "uniform cut": ("quantum_yield", 0.9, Spread("uniform", 0.3), stats.uniform(0.6, 0.4)),
    "radial": ("lateral_offset", 0.0, Spread("radial", 40e-9), stats.rayleigh(scale=40e-9)),
    "radial beside the middle": (
        "lateral_offset",
        60e-9,
        Spread("radial", 40e-9),
        stats.rice(60 / 40, scale=40e-9),
    ),
    "radial on the other side": (
        "fibre_offset",
        -3e-6,
        Spread("radial", 1e-6),
        stats.rice(3.0, scale=1e-6),
    ),
    # the cosine of a random direction is even, so its square has the shares √x
    "direction": ("dipole_alignment", 1 / 3, Spread("direction"), stats.beta(0.5, 1.0)),
}


@pytest.mark.parametrize("shape", SHAPES)
def test_draws_follow_the_distribution(shape: str) -> None:
    name, centre, spread, expected = SHAPES[shape]
    farthest = 0.6 if spread.kind == "radial" and centre else 0.2  # two numbers fill less evenly
    for seed in SEEDS:
        found = scattered({name: centre}, {name: spread}, COUNT, seed)[name]
        assert found.shape == (COUNT,)
        assert distance(found, expected) < farthest * PLAIN


def test_every_kind_is_tried() -> None:
    assert {spread.kind for _, _, spread, _ in SHAPES.values()} == SPREADS.keys()


@pytest.mark.parametrize("name", ["lateral_offset", "fibre_offset"])
def test_a_radial_scatter_wider_than_its_range_stays_within_it(name: str) -> None:
    reach = INPUTS[name].high
    for centre, width in ((0.9e-3, 40e-9), (-1e-3, 1e-6), (0.0, 1e-2), (5e-4, 1e300)):
        found = scattered({name: centre}, {name: Spread("radial", width)}, 64)[name]
        assert np.all((found >= 0) & (found <= reach))
    near = scattered({name: 0.9e-3}, {name: Spread("radial", 40e-9)}, COUNT)[name]
    assert distance(near, stats.norm(0.9e-3, 40e-9)) < 0.6 * PLAIN  # so far off, r ≈ x
    even = scattered({}, {name: Spread("radial", 1e300)}, COUNT)[name]
    assert distance(even, stats.powerlaw(2, scale=reach)) < 0.2 * PLAIN  # even on the disc: (r/R)²


@pytest.mark.parametrize(
    ("low", "high"),
    [(-1, 2), (-40, 0.1), (0, 1), (0.5, 0.6), (3, 4), (8, 9), (30, 31), (-6, -5), (-300, -200)],
)
def test_a_normal_distribution_cut_anywhere(low: float, high: float) -> None:
    """Quantiles of a normal distribution between two scores, by root finding with 50 digits."""
    fractions = np.array([1e-6, 0.1, 0.5, 0.9, 1 - 1e-6])
    found = normal_at(fractions, 5.0, 2.0, 5.0 + 2.0 * low, 5.0 + 2.0 * high)
    assert found == pytest.approx([5 + 2 * _cut(f, low, high) for f in fractions], rel=1e-9)


def _cut(fraction: float, low: float, high: float) -> float:
    with mpmath.workdps(50):
        sign = 1 if low + high < 0 else -1  # the side on which shares are small
        first, last = sorted((sign * mpmath.mpf(low), sign * mpmath.mpf(high)))
        share = mpmath.mpf(fraction if sign > 0 else 1 - fraction)
        aim = (1 - share) * mpmath.ncdf(first) + share * mpmath.ncdf(last)

        def miss(score: Any) -> Any:
            return mpmath.log(mpmath.ncdf(score) / aim)

        return sign * float(mpmath.findroot(miss, (first, last), solver="anderson", tol=1e-30))


def test_where_nothing_of_a_distribution_is_allowed_the_nearer_end_stands() -> None:
    point = {"numerical_aperture": 1.4, "medium_index": 1.5}
    scatter = {
        "numerical_aperture": Spread("uniform", 0.01),
        "medium_index": Spread("uniform", 0.4),
    }
    work = Evaluation(scattered(point, scatter, 256))
    aperture, index = work.value("numerical_aperture"), work.value("medium_index")
    low = index < 1.39
    assert low.any()
    assert aperture[low] == pytest.approx(index[low], rel=1e-15)
    assert np.all(aperture < index)


# --- how the draws are made -----------------------------------------------------------------------


def test_counts_are_rounded_up_to_sixteen_times_a_power_of_two() -> None:
    for count, made in {1: 16, 16: 16, 17: 32, 33: 64, 1000: 1024, 4096: 4096, 4097: 8192}.items():
        assert whole_count(count) == made
        found = scattered({}, {"lifetime": Spread("normal", 1e-9)}, count)["lifetime"]
        assert found.shape == (made,)
    assert whole_count(MOST) == MOST


def test_every_batch_is_even_by_itself_and_unlike_the_others() -> None:
    """A scrambled Sobol sequence has one point in each of as many equal parts, in each coordinate."""
    scatter = {
        name: Spread("uniform", 1e-9) for name in ("lifetime", "lateral_offset", "mode_volume")
    }
    fractions = draws(scatter, COUNT).fractions.reshape(BATCHES, -1, 3)
    each = COUNT // BATCHES
    places = np.sort(np.floor(fractions * each).astype(int), axis=1)
    assert np.array_equal(places, np.broadcast_to(np.arange(each)[None, :, None], places.shape))
    assert len(np.unique(fractions[:, 0, 0])) == BATCHES


def test_the_same_seed_gives_the_same_draws_and_another_others() -> None:
    scatter = {"lifetime": Spread("normal", 1e-9), "mode_volume": Spread("lognormal", 0.2)}
    one, same, other = (scattered({}, scatter, 64, seed) for seed in (3, 3, 4))
    for name in scatter:
        assert np.array_equal(one[name], same[name])
        assert not np.any(one[name] == other[name])
    assert np.array_equal(
        scattered({}, scatter, 64)["lifetime"], scattered({}, scatter, 64, 0)["lifetime"]
    )


def test_draws_too_many_to_keep_are_the_same_each_time() -> None:
    count = 2 * KEPT
    one, other = (draws({"lifetime": Spread("normal", 1e-9)}, count).fractions for _ in range(2))
    assert one is not other
    assert np.array_equal(one, other)
    few = draws({"lifetime": Spread("normal", 1e-9)}, 64)
    assert few.fractions is draws({"lifetime": Spread("uniform", 1e-9)}, 64).fractions
    with pytest.raises(ValueError, match="read-only"):
        few.fractions[0, 0] = 0.5


def test_the_order_of_the_scatter_does_not_matter_and_a_still_input_keeps_its_place() -> None:
    scatter = {
        "lateral_offset": Spread("radial", 40e-9),
        "lifetime": Spread("normal", 1e-9),
        "medium_index": Spread("normal", 0.1),
        "numerical_aperture": Spread("normal", 0.1),
        "quality_factor": Spread("lognormal", 0.2),
    }
    point = {"medium_index": 1.5}
    one = scattered(point, scatter, 64)
    backwards = scattered(point, dict(reversed(scatter.items())), 64)
    still = scattered(point, {**scatter, "lateral_offset": Spread("radial", 0.0)}, 64)
    for name in scatter:
        assert np.array_equal(one[name], backwards[name])
        assert name == "lateral_offset" or np.array_equal(one[name], still[name])
    assert "lateral_offset" not in still


def test_without_scatter_the_point_stays_as_it_was() -> None:
    point = {"quality_factor": 50.0, "pumping": "continuous"}
    assert scattered(point, {}) == point
    widths = {"quality_factor": Spread("normal"), "filter_width": Spread("uniform", 0.0)}
    assert scattered(point, widths) == point, "what is ∞ may be told not to scatter"


def test_draws_come_in_front_of_the_axes_of_the_point() -> None:
    axes = Axis("mode_volume", 1e-2, 1e2, count=3), Axis("quality_factor", 10, 1e3, count=4)
    scatter = {"mode_volume": Spread("lognormal", 0.2), "lifetime": Spread("normal", 1e-9)}
    point = mesh(*axes)
    found = scattered(point, scatter, 32)
    assert found["mode_volume"].shape == (32, 1, 3)
    assert found["lifetime"].shape == (32, 1, 1)
    assert found["quality_factor"] is point["quality_factor"]
    assert evaluate(found, ["rate_detected"])["rate_detected"].shape == (32, 4, 3)
    for column in range(3):
        alone = scattered({"mode_volume": point["mode_volume"][0, column]}, scatter, 32)
        assert np.array_equal(found["mode_volume"][:, 0, column], alone["mode_volume"])


# --- correlation ----------------------------------------------------------------------------------

PAIR = {"quality_factor": Spread("lognormal", 0.3), "quantum_yield": Spread("normal", 0.2)}
PAIR_SHAPES = {
    "quality_factor": stats.lognorm(0.3, scale=100.0),
    "quantum_yield": stats.truncnorm(-4.5, 0.5, 0.9, 0.2),
}


def scores(found: dict[str, Any]) -> Any:
    """Normal scores of the pair, by the distributions of scipy."""
    return np.array([stats.norm.ppf(PAIR_SHAPES[name].cdf(found[name])) for name in PAIR])


@pytest.mark.parametrize("coefficient", [-1.0, -0.9, -0.3, 0.0, 0.5, 0.99, 1.0])
def test_the_correlation_is_that_of_the_normal_scores(coefficient: float) -> None:
    for seed in SEEDS:
        correlation = {"quality_factor|quantum_yield": coefficient}
        found = scattered({}, PAIR, COUNT, seed, correlation)
        assert np.corrcoef(scores(found))[0, 1] == pytest.approx(coefficient, abs=6e-3)
        for name, shape in PAIR_SHAPES.items():
            assert distance(found[name], shape) < 0.8 * PLAIN, "each keeps its own distribution"


@pytest.mark.parametrize("sign", [-1, 1])
def test_full_correlation_leaves_one_of_two_free(sign: int) -> None:
    found = scattered({}, PAIR, COUNT, 0, {("quantum_yield", "quality_factor"): sign})
    one, other = scores(found)
    assert other == pytest.approx(sign * one, abs=1e-5)  # what is left of scores within 1e-16 of 1


def test_three_inputs_on_the_edge_of_what_can_hold_together() -> None:
    """C = (A + B)/√2 has the correlation 1/√2 with each of two that are not correlated."""
    names = ("lifetime", "refractive_index", "mode_length")
    widths = (1e-9, 0.01, 0.02)
    scatter = {name: Spread("normal", width) for name, width in zip(names, widths, strict=True)}
    half = math.sqrt(0.5)
    correlation = {"lifetime|mode_length": half, "mode_length|refractive_index": half}
    found = scattered({}, scatter, COUNT, 0, correlation)
    a, b, c = (
        (found[name] - Evaluation({}).value(name)) / width
        for name, width in zip(names, widths, strict=True)
    )
    assert c == pytest.approx((a + b) * half, abs=1e-6)
    assert np.corrcoef(a, b)[0, 1] == pytest.approx(0, abs=6e-3)


def test_what_is_not_correlated_is_drawn_as_without_correlation() -> None:
    scatter = {**PAIR, "lifetime": Spread("normal", 1e-9), "lateral_offset": Spread("radial", 1e-8)}
    one = scattered({}, scatter, 64)
    other = scattered({}, scatter, 64, 0, {"quality_factor|quantum_yield": 0.7})
    for name in scatter:
        assert np.array_equal(one[name], other[name]) == (
            name != "quality_factor" and name not in PAIR
        )


# --- what is built once, and what follows each device ----------------------------------------------


def test_what_is_built_once_follows_the_design() -> None:
    assert BUILT_ONCE == ("resonance_wavelength", "filter_centre", "magnification")
    scatter = {
        "emission_wavelength": Spread("normal", 3e-9),
        "mode_volume": Spread("lognormal", 0.2),
    }
    point = {"destination": "fibre", "emission_wavelength": 700e-9}
    found = scattered(point, scatter, 32)
    design = evaluate(point, BUILT_ONCE)
    assert evaluate(found, BUILT_ONCE).keys() == design.keys()
    for name in BUILT_ONCE:
        assert np.all(evaluate(found, BUILT_ONCE)[name] == design[name])
    assert np.ptp(evaluate(found, ["mode_radius"])["mode_radius"]) > 0
    given = {"resonance_wavelength": 690e-9, "filter_centre": 650e-9, "magnification": 3.0}
    assert evaluate(scattered(point | given, scatter, 32), BUILT_ONCE)["magnification"][0] == 3.0


def test_what_is_built_once_can_scatter_itself_about_the_design() -> None:
    scatter = {
        "emission_wavelength": Spread("normal", 30e-9),
        "resonance_wavelength": Spread("normal", 1e-9),
    }
    found = scattered({"emission_wavelength": 700e-9}, scatter, COUNT)
    assert distance(found["resonance_wavelength"], stats.norm(700e-9, 1e-9)) < 0.2 * PLAIN
    assert found["filter_centre"] == 700e-9


def test_along_the_emission_the_resonance_follows_the_axis_and_not_the_draw() -> None:
    axis = np.array([600e-9, 650e-9, 700e-9])
    found = scattered(
        {"emission_wavelength": axis}, {"emission_wavelength": Spread("normal", 3e-9)}, 32
    )
    work = Evaluation(found)
    assert np.array_equal(work.value("resonance_wavelength"), axis)
    assert work.value("emission_wavelength").shape == (32, 3)
    assert np.ptp(work.value("emission_wavelength"), axis=0).min() > 5e-9


LAW = Broadening([("power", 1e7, 2.0)], 4.0, 300.0)


def test_what_follows_by_physics_follows_the_device() -> None:
    """w = (λ/n) √(4V/πL) of each mode volume; a width ∝ T² of each temperature."""
    found = scattered({}, {"mode_volume": Spread("lognormal", 0.3)}, 64)
    radius = Evaluation(found).value("aperture_radius")
    expected = 650e-9 / 1.5 * np.sqrt(4 * found["mode_volume"] / (math.pi * 0.5))
    assert radius == pytest.approx(expected, rel=1e-12)
    found = scattered({"broadening": LAW}, {"temperature": Spread("normal", 20.0)}, 64)
    width = Evaluation(found).value("fast_linewidth")
    low, high = np.argmin(found["temperature"]), np.argmax(found["temperature"])
    ratio = (found["temperature"][high] / found["temperature"][low]) ** 2
    assert width[high] / width[low] == pytest.approx(ratio, rel=1e-5)  # the line is narrow


@pytest.mark.parametrize(
    ("name", "cause", "point"),
    [
        ("aperture_radius", {"mode_volume": Spread("lognormal", 0.3)}, {}),
        ("fast_linewidth", {"temperature": Spread("normal", 20.0)}, {"broadening": LAW}),
    ],
)
def test_a_follower_that_scatters_a_little_still_follows(
    name: str, cause: dict[str, Spread], point: dict[str, Any]
) -> None:
    """As its own width goes to zero it must become what it is without."""
    without = Evaluation(scattered(point, {**cause, name: Spread("normal")}, 64)).value(name)
    size = float(Evaluation(point).value(name))
    with_little = scattered(point, {**cause, name: Spread("normal", 1e-9 * size)}, 64)[name]
    assert np.ptp(without) > 0.1 * size
    assert with_little / without == pytest.approx(1, rel=1e-8)


# --- domains --------------------------------------------------------------------------------------

#: Scatter that would leave a range that other inputs set, those that scatter or those that hold still.
JOINT: dict[str, tuple[dict[str, Any], dict[str, Spread], Callable[[Evaluation], Any]]] = {
    "aperture below an index that scatters": (
        {"numerical_aperture": 1.4, "medium_index": 1.5},
        {"numerical_aperture": Spread("normal", 0.1), "medium_index": Spread("normal", 0.1)},
        lambda work: work.value("medium_index") - work.value("numerical_aperture"),
    ),
    "aperture far below an index that scatters": (
        {"numerical_aperture": 1.4, "medium_index": 1.5},
        {"numerical_aperture": Spread("normal", 1e-6), "medium_index": Spread("normal", 0.3)},
        lambda work: work.value("medium_index") - work.value("numerical_aperture"),
    ),
    "aperture that holds still below an index that scatters": (
        {"numerical_aperture": 1.4, "medium_index": 1.5},
        {"medium_index": Spread("normal", 0.3)},
        lambda work: work.value("medium_index") - 1.4,
    ),
    "aperture watched from the air": (
        {"numerical_aperture": 0.95, "medium_index": 1.5, "reference_side": "air"},
        {"numerical_aperture": Spread("normal", 0.1), "medium_index": Spread("uniform", 1.0)},
        lambda work: np.minimum(1.0, work.value("medium_index")) - work.value("numerical_aperture"),
    ),
    "slow line below a wavelength that scatters": (
        {"slow_linewidth": 300e-9, "emission_wavelength": 600e-9},
        {"slow_linewidth": Spread("lognormal", 0.5), "emission_wavelength": Spread("normal", 1e-7)},
        lambda work: 0.6 * work.value("emission_wavelength") - work.value("slow_linewidth"),
    ),
    "slow line that holds still below a wavelength that scatters": (
        {"slow_linewidth": 300e-9, "emission_wavelength": 600e-9},
        {"emission_wavelength": Spread("normal", 1e-7)},
        lambda work: 0.6 * work.value("emission_wavelength") - 300e-9,
    ),
    "shift beside a wavelength that scatters": (
        {"biexciton_shift": -290e-9, "emission_wavelength": 600e-9},
        {"biexciton_shift": Spread("normal", 1e-7), "emission_wavelength": Spread("normal", 1e-7)},
        lambda work: 0.5 * work.value("emission_wavelength") - abs(work.value("biexciton_shift")),
    ),
    "shift that holds still beside a wavelength that scatters": (
        {"biexciton_shift": -290e-9, "emission_wavelength": 600e-9},
        {"emission_wavelength": Spread("normal", 1e-7)},
        lambda work: 0.5 * work.value("emission_wavelength") - 290e-9,
    ),
    "line far off beside a wavelength that scatters": (
        {"spectrum": Lines([(1.0, -400e-9, 100e-9)])},
        {"emission_wavelength": Spread("uniform", 1e-6)},
        lambda work: 0.6 * (work.value("emission_wavelength") - 400e-9) - 100e-9,
    ),
    "line at the red end beside a wavelength that scatters": (
        {"spectrum": Lines([(1.0, 4000e-9, 0.0)])},
        {"emission_wavelength": Spread("uniform", 1e-6)},
        lambda work: 9 * work.value("emission_wavelength") - 4000e-9,
    ),
    "samples at the blue end beside a wavelength that scatters": (
        {"spectrum": Samples([-400e-9, 0.0], [1.0, 1.0])},
        {"emission_wavelength": Spread("uniform", 1e-6)},
        lambda work: 0.9 * work.value("emission_wavelength") - 400e-9,
    ),
    "samples close together beside a wavelength that scatters": (
        {"spectrum": Samples([0.0, 3e-20, 1e-9], [1.0, 1.0, 1.0])},
        {"emission_wavelength": Spread("uniform", 1e-5)},
        lambda work: 3e-20 - 1e-14 * work.value("emission_wavelength"),
    ),
    "law of the width at a wavelength that alone scatters": (
        {"broadening": Broadening([("power", 1e9, 2.0)], 4.0, 300.0), "temperature": 400.0},
        {"emission_wavelength": Spread("uniform", 1e-6)},
        lambda work: 0.6 * work.value("emission_wavelength") - work.value("fast_linewidth"),
    ),
    "line with the width of the point": (
        {"spectrum": Lines([(1.0, -400e-9, None)]), "fast_linewidth": 100e-9},
        {"fast_linewidth": Spread("lognormal", 1.0), "emission_wavelength": Spread("normal", 5e-9)},
        lambda work: (
            0.6 * (work.value("emission_wavelength").min() - 400e-9) - work.value("fast_linewidth")
        ),
    ),
    "law of the width at a temperature that scatters": (
        {"broadening": Broadening([("power", 1e9, 2.0)], 4.0, 300.0), "temperature": 350.0},
        {"temperature": Spread("uniform", 1000.0)},
        lambda work: 0.6 * 650e-9 - work.value("fast_linewidth"),
    ),
    "law of the width at a wavelength that scatters": (
        {"broadening": Broadening([("power", 1e9, 2.0)], 4.0, 300.0), "temperature": 350.0},
        {"emission_wavelength": Spread("uniform", 1e-6), "temperature": Spread("normal", 20.0)},
        lambda work: 0.6 * work.value("emission_wavelength") - work.value("fast_linewidth"),
    ),
}


@pytest.mark.parametrize("kind", JOINT)
def test_values_stay_where_the_others_allow(kind: str) -> None:
    point, scatter, room = JOINT[kind]
    found = scattered(point, scatter, COUNT)
    work = Evaluation(found)  # raises InputError where a device is none
    left = room(work)
    assert np.all(left >= 0)
    assert np.min(left) < 0.3 * np.max(left), "the limit is reached"
    assert all(np.ptp(found[name]) > 0 for name in scatter)


@pytest.mark.parametrize("sign", [-1, 1])
def test_full_correlation_of_a_pair_of_which_one_limits_the_other(sign: int) -> None:
    for kind in (
        "aperture below an index that scatters",
        "slow line below a wavelength that scatters",
    ):
        point, scatter, room = JOINT[kind]
        found = scattered(point, scatter, COUNT, 0, {"|".join(scatter): sign})
        assert np.all(room(Evaluation(found)) >= 0)


def test_the_limits_are_those_of_every_element() -> None:
    """The index stays above the aperture of its own cell."""
    apertures = np.array([0.5, 1.2, 1.45])
    point = {"numerical_aperture": apertures, "medium_index": 1.5}
    index = scattered(point, {"medium_index": Spread("normal", 0.2)}, COUNT)["medium_index"]
    for column, aperture in enumerate(apertures):
        low = max(1.0, aperture)
        cut = stats.truncnorm((low - 1.5) / 0.2, 2.5, 1.5, 0.2)
        assert distance(index[:, column], cut) < 0.2 * PLAIN


def test_the_ranges_that_follow_others_are_proportional_to_one_of_them() -> None:
    """On this the room for what holds still rests; it must be looked at where it fails."""
    assert {"emission_wavelength", "medium_index"} == LIMITING
    for name, entry in INPUTS.items():
        for end in (entry.low, entry.high):
            if callable(end):
                (key,) = limits_of(name)
                assert end(**{key: 3.0}) == pytest.approx(3 * end(**{key: 1.0}), rel=1e-15)


@tried(120)
@given(st.data())
def test_whatever_scatters_every_device_can_be_evaluated(data: Any) -> None:
    check_devices(data, arrays=False)


@tried(60)
@given(st.data())
def test_whatever_scatters_every_device_of_a_map_can_be_evaluated(data: Any) -> None:
    check_devices(data, arrays=True)


@pytest.mark.slow
@tried(1500)
@given(st.data(), st.booleans())
def test_whatever_scatters_every_device_can_be_evaluated_at_length(data: Any, arrays: bool) -> None:
    check_devices(data, arrays)


def check_devices(data: Any, arrays: bool) -> None:
    """Any scatter of any point, correlated or not, gives devices within their ranges."""
    point = data.draw(points(arrays=arrays))
    scatter = data.draw(scatters(point))
    alone = [name for name in scatter if scatter[name].kind not in ("radial", "direction")]
    correlation = {}
    if len(alone) > 1:
        correlation[alone[0], alone[1]] = data.draw(st.sampled_from((-1.0, -0.9, 0.0, 0.5, 1.0)))
    found = scattered(point, scatter, 32, correlation=correlation)
    Evaluation(found)  # raises InputError for a value out of its range, in whatever company
    for name in scatter:
        if not scatter[name].still:
            assert found[name].shape[0] == 32
            assert np.all(np.isfinite(found[name]))


# --- bad input ------------------------------------------------------------------------------------

Q = Spread("lognormal", 0.2)
BOTH = {"quality_factor": Q, "mode_volume": Q, "lifetime": Spread("normal", 1e-9)}

REFUSED: dict[str, tuple[Callable[[], Any], tuple[str, ...]]] = {
    "an unknown kind": (lambda: Spread("cauchy", 1.0), ("'cauchy'", "normal, lognormal")),
    "a kind that is no text": (lambda: Spread(3, 1.0), ("3 is no kind",)),
    "a negative width": (lambda: Spread("normal", -1e-9), ("must not be negative", "-1e-09")),
    "a width that is text": (lambda: Spread("normal", "1"), ("'1' is not a number",)),
    "a width that is a truth value": (lambda: Spread("normal", True), ("True is not a number",)),
    "an infinite width": (lambda: Spread("normal", math.inf), ("not a finite number",)),
    "a width not-a-number": (lambda: Spread("normal", math.nan), ("not a finite number",)),
    "a width that is an array": (lambda: Spread("normal", np.ones(2)), ("not a number",)),
    "no mapping": (lambda: scattered({}, [("lifetime", Q)]), ("scatter", "no mapping")),
    "no scatter at all": (lambda: scattered({}, None), ("scatter = None",)),
    "an unknown input": (lambda: scattered({}, {"speed": Q}), ("'speed'", "no input")),
    "a quantity": (lambda: scattered({}, {"rate_detected": Q}), ("'rate_detected'", "no input")),
    "a key that is no text": (lambda: scattered({}, {5: Q}), ("5", "no input")),
    "a bare width": (lambda: scattered({}, {"lifetime": 1e-9}), ("lifetime is no Spread",)),
    "a whole value": (lambda: scattered({}, {"pumping": Q}), ("pumping is no number",)),
    "a spectrum": (lambda: scattered({}, {"spectrum": Q}), ("spectrum is no number",)),
    "radial where there is no plane": (
        lambda: scattered({}, {"axial_offset": Spread("radial", 1e-9)}),
        ("'radial' does not suit axial_offset", "normal, lognormal, uniform"),
    ),
    "a direction of what has none": (
        lambda: scattered({}, {"lifetime": Spread("direction")}),
        ("'direction' does not suit lifetime",),
    ),
    "about infinity": (
        lambda: scattered({}, {"filter_width": Spread("normal", 1e-9)}),
        ("filter_width is ∞",),
    ),
    "about infinity somewhere": (
        lambda: scattered({"filter_width": [1e-9, math.inf]}, {"filter_width": Q}),
        ("filter_width is ∞",),
    ),
    "lognormal about zero": (
        lambda: scattered({}, {"slow_linewidth": Q}),
        ("slow_linewidth = 0 nm has no logarithm",),
    ),
    "lognormal about less than zero": (
        lambda: scattered({"axial_offset": -5e-9}, {"axial_offset": Q}),
        ("axial_offset = -5 nm has no logarithm",),
    ),
    "lognormal about zero somewhere": (
        lambda: scattered({"other_modes": [1.0, 0.0]}, {"other_modes": Q}),
        ("other_modes = 0 has no logarithm",),
    ),
    "a bad point": (lambda: scattered({"lifetime": -1.0}, {"mode_volume": Q}), ("lifetime",)),
    "a point that is none": (lambda: scattered([], {"mode_volume": Q}), ("maps input names",)),
    "a design for a point": (lambda: scattered(Design(), {"mode_volume": Q}), ("Design",)),
    "shapes that do not fit": (
        lambda: scattered({"lifetime": [1e-9] * 2, "mode_volume": [1.0] * 3}, {"lifetime": Q}),
        ("(3,)", "mode_volume", "(2,)", "lifetime"),
    ),
}  # fmt: skip

for _count in (0, -1, 2.5, MOST + 1, 10**400, math.inf, math.nan, "64", None, True, [64]):
    REFUSED[f"count {_count!r:.12}"] = (
        lambda count=_count: scattered({}, BOTH, count),
        ("count is a whole number from 1 to 4194304",),
    )
for _seed in (-1, 2.5, 3.0, np.float32(2.5), math.nan, "0", None, True):
    REFUSED[f"seed {_seed!r:.20}"] = (
        lambda seed=_seed: scattered({}, BOTH, 64, seed),
        ("seed is a whole number from 0 on",),
    )

CORRELATIONS: dict[str, tuple[Any, tuple[str, ...]]] = {
    "that is no mapping": ([0.5], ("no mapping",)),
    "that is zero": (0, ("correlation = 0 is no mapping",)),
    "of one input": ({"lifetime": 0.5}, ("two inputs", "'lifetime'")),
    "of three inputs": ({"lifetime|mode_volume|quality_factor": 0.5}, ("two inputs",)),
    "of an input with itself": ({"lifetime|lifetime": 1.0}, ("two inputs",)),
    "of an unknown input": ({"lifetime|speed": 0.5}, ("two inputs", "'lifetime|speed'")),
    "of a whole value": ({"lifetime|pumping": 0.5}, ("two inputs",)),
    "with a key that is none": ({7: 0.5}, ("two inputs", "7")),
    "of what does not scatter": ({"lifetime|bright_share": 0.5}, ("bright_share", "does not scatter")),
    "with a displacement in the plane": (
        {"lifetime|lateral_offset": 0.5},
        ("lateral_offset", "does not scatter in a line"),
    ),
    "with a direction": (
        {"lifetime|dipole_alignment": 0.5},
        ("dipole_alignment", "does not scatter in a line"),
    ),
    "above 1": ({"lifetime|mode_volume": 1.0000001}, ("1.0000001 is outside -1 to 1",)),
    "below -1": ({"lifetime|mode_volume": -7}, ("-7", "outside -1 to 1")),
    "not-a-number": ({"lifetime|mode_volume": math.nan}, ("not a finite number",)),
    "that is text": ({"lifetime|mode_volume": "0.5"}, ("'0.5' is not a number",)),
    "given twice": (
        {"lifetime|mode_volume": 0.5, "mode_volume|lifetime": 0.4},
        ("lifetime", "mode_volume", "given twice"),
    ),
    "that cannot hold together": (
        {"lifetime|mode_volume": 0.9, "mode_volume|quality_factor": 0.9, "lifetime|quality_factor": -0.9},
        ("cannot hold together", "lifetime", "quality_factor"),
    ),
}  # fmt: skip

for _kind, (_given, _parts) in CORRELATIONS.items():
    _wide = {
        **BOTH,
        "lateral_offset": Spread("radial", 1e-8),
        "dipole_alignment": Spread("direction"),
    }
    REFUSED[f"a correlation {_kind}"] = (
        lambda given=_given, wide=_wide: scattered({}, wide, 64, 0, given),
        _parts,
    )


@pytest.mark.parametrize("kind", REFUSED)
def test_what_is_refused_says_why_in_one_sentence(kind: str) -> None:
    call, parts = REFUSED[kind]
    with pytest.raises(InputError) as caught:
        call()
    text = str(caught.value)
    assert 10 < len(text) < 300
    assert text.isprintable()
    for part in parts:
        assert part in text
    for jargon in ("dtype", "<class", "object at", "Error"):
        assert jargon not in text


def test_a_correlation_given_twice_alike_is_no_contradiction() -> None:
    both = {"lifetime|mode_volume": 0.5, ("mode_volume", "lifetime"): 0.5}
    one = scattered({}, BOTH, 64, 0, both)
    other = scattered({}, BOTH, 64, 0, {"lifetime|mode_volume": 0.5})
    assert np.array_equal(one["mode_volume"], other["mode_volume"])


def test_the_kinds_that_suit_an_input() -> None:
    straight = ("normal", "lognormal", "uniform")
    extra = {"lateral_offset": "radial", "fibre_offset": "radial", "dipole_alignment": "direction"}
    for name in NUMBERS:
        assert kinds_for(name) == (*straight, *([extra[name]] if name in extra else []))
