"""What it would take: the nearest design, the best one, and fronts, beside closed forms and chance."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from scipy.constants import speed_of_light
from scipy.optimize import brentq

from explorer import INPUTS, QUANTITIES, InputError, Lines, Requirement, Unknown, evaluate
from explorer.evaluate import Evaluation
from explorer.scenario import first_question
from explorer.search import (
    Found,
    Goal,
    Scale,
    best,
    best_steps,
    front_steps,
    nearest,
    nearest_steps,
    pareto_front,
)

START = first_question().design

#: A tenth of a percent, of a value that a closed form gives.
CLOSE = 1e-3


def at_least(quantity: str, value: float) -> Requirement:
    return Requirement(quantity, at_least=value)


def at_most(quantity: str, value: float) -> Requirement:
    return Requirement(quantity, at_most=value)


def value(point: Any, name: str) -> float:
    return float(evaluate(point, [name])[name])


def frequency(wavelength: float) -> float:
    return 2 * math.pi * speed_of_light / wavelength


# Closed forms.


def test_the_nearest_quality_and_volume_for_a_purcell_factor() -> None:
    """F = 3Q/(4π²V) is a plane in the logarithms; the foot of the perpendicular from the point.

    Positions are ln Q/ln 1e9 and ln V/ln 1e12 (sliders of 1 to 1e9 and 1e-8 to 1e4), so of the gap in
    ln F each takes a part in proportion to the square of its span.
    """
    point = {"quality_factor": 50.0, "mode_volume": 2.0}
    wanted = 40.0
    found = nearest(
        point,
        [at_least("peak_purcell", wanted)],
        {"quality_factor": (1, 1e6), "mode_volume": (1e-4, 100)},
    )
    gap = math.log(wanted / (3 / (4 * math.pi**2) * 50 / 2))
    spans = math.log(1e9), math.log(1e12)
    length = math.hypot(*spans)
    quality = 50 * math.exp(gap * spans[0] ** 2 / length**2)
    volume = 2 * math.exp(-gap * spans[1] ** 2 / length**2)
    assert found.met
    assert found.point["quality_factor"] == pytest.approx(quality, rel=CLOSE)
    assert found.point["mode_volume"] == pytest.approx(volume, rel=CLOSE)
    assert found.distance == pytest.approx(gap / length, rel=CLOSE)


def test_the_nearest_excitation_for_a_share_of_excited_pulses() -> None:
    """Long period: photons a pulse are in proportion to 1 − exp(−m), the Poisson share above zero."""
    point = {"repetition_rate": 1e4, "excitations_per_pulse": 0.2, "lifetime": 20e-9}
    share = 0.9
    each = value({**point, "excitations_per_pulse": 1.0}, "rate_at_lens") / -math.expm1(-1.0)
    found = nearest(
        point, [at_least("rate_at_lens", share * each)], {"excitations_per_pulse": (0.01, 10)}
    )
    assert found.met
    assert found.point["excitations_per_pulse"] == pytest.approx(-math.log1p(-share), rel=CLOSE)


def test_the_nearest_offset_for_a_placement_factor() -> None:
    """exp(−2r²/w²) = f, with w = (λ/n) √(4V/πL) by hand; from a far offset the larger r is nearest."""
    point = {"mode_volume": 2.0, "mode_length": 1.5, "lateral_offset": 480e-9}
    share = 0.6
    found = nearest(point, [at_least("placement", share)], {"lateral_offset": (0, 500e-9)})
    radius = 650e-9 / 1.5 * math.sqrt(4 * 2.0 / (math.pi * 1.5))
    assert found.point["lateral_offset"] == pytest.approx(
        radius * math.sqrt(math.log(1 / share) / 2), rel=CLOSE
    )


@pytest.mark.parametrize("fast", [0.0, 1e-12, 0.1e-9])
def test_the_best_quality_for_the_share_of_the_mode(fast: float) -> None:
    """On resonance Reff = 4g²κ/(κ² + κΓ + 4g²), largest over κ at κ = 2g, whatever the dephasing."""
    point = {"mode_volume": 0.5, "fast_linewidth": fast, "dipole_alignment": 1.0}
    found = best(point, "cavity_share", (), {"quality_factor": (10, 1e9)})
    rate = 0.9 / 20e-9
    coupling = math.sqrt(rate * frequency(650e-9) * 3 / (16 * math.pi**2) / 0.5)
    assert found.met
    assert found.point["quality_factor"] == pytest.approx(
        frequency(650e-9) / (2 * coupling), rel=CLOSE
    )
    assert found.value == value(found.point, "cavity_share")


def volume_for(angle: float, index: float, length: float) -> float:
    """V from a y = ln(1 − y/2) + ln 2, y = sin²θ, a = (kw)²/2, w² = (λ/n)² 4V/(πL), in air."""
    y = math.sin(angle) ** 2
    a = (math.log(1 - y / 2) + math.log(2)) / y
    return a * index**2 * length / (8 * math.pi)


def test_the_nearest_volume_for_a_half_angle() -> None:
    found = nearest(
        {"mode_volume": 0.01},
        [at_most("half_angle", math.radians(12))],
        {"mode_volume": (1e-3, 1e3)},
    )
    assert found.point["mode_volume"] == pytest.approx(
        volume_for(math.radians(12), 1.5, 0.5), rel=CLOSE
    )


def test_two_requirements_meet_in_a_corner() -> None:
    """The volume from the angle, the quality from F = 3Q/(4π²V) there: both requirements bind."""
    angle, purcell = math.radians(20), 30.0
    found = nearest(
        {"quality_factor": 20.0, "mode_volume": 0.01},
        [at_most("half_angle", angle), at_least("peak_purcell", purcell)],
        {"quality_factor": (1, 1e6), "mode_volume": (1e-3, 1e3)},
    )
    volume = volume_for(angle, 1.5, 0.5)
    assert found.point["mode_volume"] == pytest.approx(volume, rel=CLOSE)
    assert found.point["quality_factor"] == pytest.approx(
        4 * math.pi**2 / 3 * purcell * volume, rel=CLOSE
    )


def test_the_nearest_quality_for_a_linewidth_of_the_resonator() -> None:
    """κ = ωc/Q."""
    width = 2 * math.pi * 1e9
    found = nearest(
        {"quality_factor": 100.0},
        [at_most("resonator_linewidth", width)],
        {"quality_factor": (1, 1e9)},
    )
    assert found.point["quality_factor"] == pytest.approx(frequency(650e-9) / width, rel=CLOSE)


def test_the_nearest_background_for_a_purity() -> None:
    """g² = 1 − ρ², ρ = μ/(μ + b) of a pure emitter (Brouri et al.); μ detected photons a pulse."""
    point = {"background_per_pulse": 0.5}
    found = nearest(point, [at_most("g2_zero", 0.1)], {"background_per_pulse": (0, 1)})
    signal = value(point, "rate_detected") / 10e6
    assert found.point["background_per_pulse"] == pytest.approx(
        signal * (1 / math.sqrt(0.9) - 1), rel=CLOSE
    )


def test_the_nearest_quality_for_strong_coupling() -> None:
    """2g = κ + Γ on the border, so Q = ωc/(2g − Γ), with g free of Q and Γ of a line without width."""
    point = {"mode_volume": 0.1, "fast_linewidth": 0.0, "quality_factor": 100.0, "lifetime": 1e-9}
    found = nearest(point, [at_least("strong_ratio", 1.0)], {"quality_factor": (1, 1e9)})
    radiative = 0.9 / 1e-9
    other = radiative + 0.1 / 1e-9  # other modes as strong as the bulk, and what is not radiative
    coupling = math.sqrt(radiative / 3 * frequency(650e-9) * 3 / (16 * math.pi**2) / 0.1)
    assert found.point["quality_factor"] == pytest.approx(
        frequency(650e-9) / (2 * coupling - other), rel=CLOSE
    )


@pytest.mark.parametrize("quality", [1e4, 1e6, 1e8])
def test_a_window_far_finer_than_the_sample(quality: float) -> None:
    """Overlap = κ/(κ+Γ) / (1 + (2δ/(κ+Γ))²); at Q 1e8 a millionth of the bounds' spacing of samples.

    From the red the nearest resonance is on that side of the emission, at the δ that solves it. A
    hundredth of it is at most 1e-9 of the distance, and not worth another step.
    """
    point = {
        "quality_factor": quality,
        "fast_linewidth": 0.0,
        "lifetime": 1e-6,
        "resonance_wavelength": 680e-9,
    }
    found = nearest(
        point, [at_least("spectral_overlap", 0.5)], {"resonance_wavelength": (500e-9, 800e-9)}
    )
    other = 0.9 / 1e-6 + 0.1 / 1e-6

    def beyond(delta: float) -> float:
        width = (frequency(650e-9) - delta) / quality
        return width / (width + other) / (1 + (2 * delta / (width + other)) ** 2) - 0.5

    delta = brentq(beyond, 0, 1e15, xtol=1e-3, rtol=1e-12)
    assert found.met
    detuning = frequency(650e-9) - frequency(found.point["resonance_wavelength"])
    assert detuning == pytest.approx(delta, rel=0.01)
    edge = 2 * math.pi * speed_of_light / (frequency(650e-9) - delta)
    assert found.distance == pytest.approx((680e-9 - edge) / 1700e-9, rel=1e-8)


def test_the_border_of_what_has_a_number() -> None:
    """g² = 3γr ξ ωc/(16π²V) reaches ωc² at V = 3γr ξ/(16π²ωc); below it the model has no number."""
    point = {"mode_volume": 1e-8, "quality_factor": 1e4, "lifetime": 1e-12}
    assert math.isnan(value(point, "rate_enhancement"))
    found = nearest(point, [at_least("rate_enhancement", 1.0)], {"mode_volume": (1e-8, 1e-2)})
    border = 3 * 0.9e12 / 3 / (16 * math.pi**2 * frequency(650e-9))
    assert found.met
    assert found.point["mode_volume"] == pytest.approx(border, rel=CLOSE)


def test_the_best_purcell_factor_of_a_wide_mode() -> None:
    """w >= w0 holds V at πL(w0 n/λ)²/4; then F = 3Q/(4π²V) wants the highest Q that is allowed."""
    found = best(
        {"mode_volume": 30.0},
        "peak_purcell",
        [at_least("mode_radius", 1e-6)],
        {"quality_factor": (10, 5e4), "mode_volume": (1e-3, 1e3)},
    )
    volume = math.pi * 0.5 * (1e-6 * 1.5 / 650e-9) ** 2 / 4
    assert found.point["mode_volume"] == pytest.approx(volume, rel=CLOSE)
    assert found.value == pytest.approx(3 * 5e4 / (4 * math.pi**2 * volume), rel=CLOSE)


def test_quenching_at_its_zero_stop() -> None:
    """Without a mode and at yield 1 the lost share is ζ/(α + ζ): ζ = αs/(1 − s), and 0 for a share of 0."""
    point = {"dipole_alignment": 0.0, "quantum_yield": 1.0, "other_modes": 0.8, "quenching": 5.0}
    some = nearest(point, [at_most("lost_share", 0.2)], {"quenching": (0, 10)})
    assert some.point["quenching"] == pytest.approx(0.8 * 0.2 / 0.8, rel=CLOSE)
    none = nearest(point, [at_most("lost_share", 0.0)], {"quenching": (0, 10)})
    assert none.met
    assert none.point["quenching"] == 0.0


def test_no_filter_is_the_far_end_of_its_width() -> None:
    """Only without a filter does all light pass; and from no filter a width is found."""
    every = nearest(
        {"filter_width": 5e-9}, [at_least("filter_share", 1.0)], {"filter_width": (1e-10, math.inf)}
    )
    assert every.met
    assert every.point["filter_width"] == math.inf
    some = nearest({}, [at_most("filter_share", 0.5)], {"filter_width": (1e-10, math.inf)})
    assert value(some.point, "filter_share") == pytest.approx(0.5, rel=CLOSE)
    assert some.distance == pytest.approx(
        float(Scale("filter_width").position(math.inf))
        - float(Scale("filter_width").position(some.point["filter_width"]))
    )


def test_the_front_of_purcell_factor_and_mode_radius() -> None:
    """F = 3Q/(4π²V) and w² = (λ/n)² 4V/(πL): at the highest Q the product F w² is one number."""
    front = pareto_front(
        {},
        ("peak_purcell", "mode_radius"),
        (),
        {"quality_factor": (10, 1e4), "mode_volume": (0.01, 100)},
        count=12,
    )
    product = 3 * 1e4 / (4 * math.pi**2) * (650e-9 / 1.5) ** 2 * 4 / (math.pi * 0.5)
    assert len(front.points) == 12
    assert front.values[:, 0] * front.values[:, 1] ** 2 == pytest.approx(product, rel=CLOSE)
    volumes = [point["mode_volume"] for point in front.points]
    assert (volumes[0], volumes[-1]) == pytest.approx((100, 0.01))
    # About even in the logarithms along the front.
    assert np.diff(np.log(front.values[:, 0])) == pytest.approx(math.log(1e4) / 11, rel=0.25)


def test_the_front_of_brightness_and_purity() -> None:
    """Long period, one free input: the front is the curve itself, g² = 2P2 φB/φX / (P1 + P2(1 + φB/φX))².

    With a biexciton as bright as the exciton through a dipole of the same pattern φB = φX·y, y its
    share of emitted photons; here the rest of the stream is the same, so y is read from weak pumping,
    where g² is φB/φX (Nair et al.).
    """
    point = {"repetition_rate": 1e4, "biexciton_yield": 0.3, "quality_factor": 10.0}
    ratio = value({**point, "excitations_per_pulse": 1e-6}, "g2_zero")
    front = pareto_front(
        point,
        ("rate_detected", Goal("g2_zero", most=False)),
        (),
        {"excitations_per_pulse": (0.05, 3)},
        count=9,
    )
    assert len(front.points) == 9
    for at, row in zip(front.points, front.values, strict=True):
        m = at["excitations_per_pulse"]
        above, pairs = -math.expm1(-m), 1 - math.exp(-m) * (1 + m)
        assert row[1] == pytest.approx(2 * ratio * pairs / (above + ratio * pairs) ** 2, rel=CLOSE)
        assert row[0] == value(at, "rate_detected")


# What comes back.


def test_a_design_that_meets_everything_comes_back_as_it_is() -> None:
    point = {"quality_factor": 500, "pumping": "continuous", "spectrum": Lines([(1.0, 0.0, 1e-9)])}
    found = nearest(point, [at_least("peak_purcell", 1)], {"quality_factor": (1, 1e4)})
    assert (found.met, found.distance, dict(found.changes)) == (True, 0.0, {})
    assert dict(found.point) == point
    assert found.reason == "The design meets every requirement as it is."


def test_a_point_outside_its_bounds_moves_to_them() -> None:
    """It meets the requirement, yet must go to the near end; the distance is from the true point."""
    found = nearest(
        {"quality_factor": 1e5}, [at_least("peak_purcell", 1)], {"quality_factor": (10, 1e4)}
    )
    assert found.met
    assert found.point["quality_factor"] == 1e4
    assert found.distance == pytest.approx(math.log(10) / math.log(1e9))


def test_only_what_helps_is_changed() -> None:
    found = nearest(
        START.point,
        [at_most("half_angle", 0.1)],
        {
            "mode_volume": (0.1, 100),
            "quality_factor": (10, 1000),
            "detector_efficiency": (0.1, 1),
            "optics_transmission": (0.3, 0.3),
        },
    )
    assert set(found.changes) == {"mode_volume", "optics_transmission"}
    assert found.point["quality_factor"] == START.point["quality_factor"]
    assert found.point["optics_transmission"] == 0.3  # held where the bounds hold it
    before, after = found.changes["mode_volume"]
    assert (before, after) == (START.point["mode_volume"], found.point["mode_volume"])


def test_what_follows_others_keeps_following() -> None:
    """A resonance that is not given moves with the emission, and is not written into the design."""
    wanted = [at_most("resonator_linewidth", frequency(900e-9) / 100)]
    found = nearest({"emission_wavelength": 650e-9}, wanted, {"emission_wavelength": (4e-7, 2e-6)})
    assert found.point == {"emission_wavelength": pytest.approx(900e-9, rel=CLOSE)}


def test_what_would_follow_elsewhere_is_written_down() -> None:
    """The filter follows the resonance; where only that is to move, the filter must be held back."""
    point = {"filter_width": 2e-9, "quality_factor": 1e3}
    bounds = {"resonance_wavelength": (640e-9, 700e-9), "filter_centre": (640e-9, 660e-9)}
    wanted = [
        at_most("resonator_linewidth", frequency(690e-9) / 1e3),
        at_least("rate_at_lens", 1.0),
    ]
    found = nearest(point, wanted, bounds)
    assert found.met
    assert set(found.changes) == {"resonance_wavelength"}
    assert found.point["filter_centre"] == 650e-9


def test_two_wavelengths_that_must_agree_closely() -> None:
    """At Q 1e7 both are free and 30 nm apart; linear scales of equal range: they meet half-way.

    The window is 1e-7 of the wavelength, so where exactly in it hardly counts.
    """
    found = nearest(
        {
            "quality_factor": 1e7,
            "emission_wavelength": 650e-9,
            "resonance_wavelength": 680e-9,
            "fast_linewidth": 0.0,
        },
        [at_least("spectral_overlap", 0.5)],
        {"resonance_wavelength": (400e-9, 1000e-9), "emission_wavelength": (400e-9, 1000e-9)},
    )
    assert found.met
    assert found.distance == pytest.approx(15e-9 / 1700e-9 * math.sqrt(2), rel=CLOSE)


def test_bounds_may_be_unknowns_lists_or_arrays() -> None:
    point, wanted = {"quality_factor": 20.0}, [at_least("peak_purcell", 5)]
    kinds: list[Any] = [(10, 1e4), [10, 1e4], np.array([10, 1e4]), Unknown(10, 1e4)]
    first, *others = [nearest(point, wanted, {"quality_factor": kind}) for kind in kinds]
    assert all(other == first for other in others)


def test_the_sentence_names_what_changed_or_what_is_missed() -> None:
    met = nearest(
        {"quality_factor": 20.0}, [at_least("peak_purcell", 3)], {"quality_factor": (1, 1e4)}
    )
    assert met.reason == "Every requirement is met with Quality factor 20 → 39.48."
    missed = nearest(
        {"quality_factor": 20.0},
        [at_least("peak_purcell", 3), at_most("half_angle", math.radians(5))],
        {"quality_factor": (1, 30)},
    )
    assert missed.failing is not None
    assert missed.reason == (
        "Not reachable within these bounds: Beam half-angle is furthest: at best 10.0° of 5.00° "
        "allowed; none of these inputs changes it."
    )
    few = nearest(
        {"quality_factor": 20.0}, [at_least("peak_purcell", 3)], {"quality_factor": (1, 30)}
    )
    assert few.failing == at_least("peak_purcell", 3)
    assert few.point["quality_factor"] == 30  # the compromise with the largest worst margin
    assert few.reason == (
        "Not reachable within these bounds: Peak Purcell factor is furthest: at best 2.28 of 3.00 wanted."
    )
    open_air = nearest({}, [at_least("rate_in_fibre", 1e9)], {"quality_factor": (10, 100)})
    assert "Photons/s behind the optics is furthest" in open_air.reason


def test_the_compromise_has_the_largest_worst_margin() -> None:
    """F >= 100 and w >= 1 µm at Q <= 1000: ln F falls and ln w² rises with ln V, so the worst margin is
    largest where ln(F/100) = ln(w/1 µm), by hand."""
    found = nearest(
        {},
        [at_least("peak_purcell", 100), at_least("mode_radius", 1e-6)],
        {"quality_factor": (10, 1000), "mode_volume": (1e-4, 100)},
    )
    scale = 650e-9 / 1.5 * math.sqrt(4 / (math.pi * 0.5)) / 1e-6  # w/1 µm at V = 1
    purcell = 3 * 1000 / (4 * math.pi**2) / 100  # F/100 there
    assert not found.met
    assert found.point["mode_volume"] == pytest.approx((purcell / scale) ** (2 / 3), rel=CLOSE)


def test_the_best_of_a_design_that_cannot_be_better() -> None:
    found = best({"quality_factor": 1e4}, "peak_purcell", (), {"quality_factor": (10, 1e4)})
    assert (found.met, found.distance, dict(found.changes)) == (True, 0.0, {})
    least = best({}, Goal("peak_purcell", most=False), (), {"quality_factor": (10, 1e4)})
    assert least.point["quality_factor"] == 10
    assert "the smallest found" in least.reason
    none = best(
        {}, "brightness_gain", (), {"numerical_aperture": (1.55, 1.6), "medium_index": (1.8, 2)}
    )
    assert not none.met
    assert none.reason == "Brightness gain has no number within these bounds."


def test_the_least_of_what_can_be_zero() -> None:
    """g² of a pure emitter without background is 0, and the nearest such design has just no background."""
    point = {"background_per_pulse": 0.01, "quality_factor": 50.0}
    found = best(
        point,
        Goal("g2_zero", most=False),
        (),
        {"background_per_pulse": (0, 1), "quality_factor": (10, 1000)},
    )
    assert found.value == 0.0
    assert found.point == {"background_per_pulse": 0.0, "quality_factor": 50.0}


def test_an_empty_front_says_why() -> None:
    front = pareto_front(
        {},
        ("peak_purcell", "mode_radius"),
        [at_least("cavity_share", 1.5)],
        {"quality_factor": (10, 100)},
    )
    assert (front.points, front.values.shape) == ((), (0, 2))
    assert "Share of the mode is furthest" in front.reason


def test_a_front_of_goals_that_agree_is_one_design() -> None:
    front = pareto_front({}, ("peak_purcell", "cavity_share"), (), {"mode_volume": (0.5, 100)})
    assert [dict(point) for point in front.points] == [{"mode_volume": 0.5}]
    assert front.reason.startswith("One design is the best in both")


# Slices.


def test_the_steps_end_with_the_answer_and_never_get_worse() -> None:
    bounds = {"quality_factor": (5, 1e4), "mode_volume": (0.05, 100)}
    steps = list(nearest_steps(START.point, START.requirements, bounds))
    assert steps[-1] == nearest(START.point, START.requirements, bounds)
    assert len(steps) > 10
    distances = [step.distance for step in steps if step.met]
    assert distances == sorted(distances, reverse=True)
    assert steps[-1].done == steps[-1].starts > 0
    for step in steps:
        assert 0 <= step.done <= step.starts
        assert step.met == (step.failing is None)
        holds_what_it_says(step, START.requirements, bounds)


def test_an_unfinished_search_does_not_call_anything_out_of_reach() -> None:
    steps = list(nearest_steps({}, [at_least("peak_purcell", 1e3)], {"quality_factor": (10, 100)}))
    assert steps[0].reason.startswith("Not reached yet: ")
    assert steps[-1].reason.startswith("Not reachable within these bounds: ")


def test_the_best_grows_and_a_front_fills() -> None:
    bounds = {"quality_factor": (5, 1e4), "mode_volume": (0.05, 100)}
    values = [
        step.value for step in best_steps(START.point, "rate_in_fibre", (), bounds) if step.met
    ]
    assert values == sorted(values)
    goals = ("rate_in_fibre", Goal("half_angle", most=False))
    fronts = list(front_steps(START.point, goals, START.requirements, bounds, count=6))
    assert len(fronts[-1].points) == 6
    assert fronts[0].points == ()
    for point, row in zip(fronts[-1].points, fronts[-1].values, strict=True):
        outcome = evaluate(point, ["rate_in_fibre", "half_angle"])
        assert tuple(row) == (outcome["rate_in_fibre"], outcome["half_angle"])
        found = Found(point, met=True, reason="", distance=0.0)
        holds_what_it_says(found, START.requirements, bounds)
    assert np.all(np.diff(fronts[-1].values, axis=0) > 0)  # brighter is wider: none beats another


def test_the_same_call_gives_the_same_answer() -> None:
    bounds = {"quality_factor": (5, 1e4), "mode_volume": (0.05, 100), "lifetime": (1e-9, 1e-8)}
    first = nearest(START.point, START.requirements, bounds)
    best(START.point, "g2_zero", (), bounds)
    assert nearest(START.point, START.requirements, bounds) == first


# Refusals.

GOOD: dict[str, Any] = {
    "point": {},
    "requirements": [Requirement("peak_purcell", at_least=10)],
    "bounds": {"quality_factor": (10, 1e4)},
}


@pytest.mark.parametrize(
    ("wrong", "said"),
    [
        ({"bounds": {"colour": (0, 1)}}, "'colour', which is no input"),
        ({"bounds": {"pumping": (0, 1)}}, "pumping is no number"),
        ({"bounds": {"quality_factor": (100, 10)}}, "run backwards: 100 to 10"),
        ({"bounds": {"quality_factor": (10, math.inf)}}, "must be finite"),
        ({"bounds": {"quality_factor": (math.nan, 10)}}, "must be finite"),
        ({"bounds": {"quality_factor": (10, "many")}}, "must be finite"),
        ({"bounds": {"quality_factor": 10}}, "a low and a high number"),
        ({"bounds": {"quality_factor": (1, 2, 3)}}, "a low and a high number"),
        ({"bounds": {"quality_factor": (0.5, 10)}}, "quality_factor = 0.5 is outside its range"),
        ({"bounds": {"numerical_aperture": (0.5, 1.2)}}, "numerical_aperture = 1.2 is outside"),
        (
            {"bounds": {"numerical_aperture": (0.5, 1.2), "medium_index": (1, 1.5)}},
            "the limit comes from medium_index",
        ),
        (
            {"point": {"fast_linewidth": 1e-7}, "bounds": {"emission_wavelength": (2e-7, 1e-6)}},
            None,
        ),
        (
            {"point": {"fast_linewidth": 2e-7}, "bounds": {"emission_wavelength": (2e-7, 1e-6)}},
            "fast_linewidth = 200 nm is outside",
        ),
        ({"bounds": {}}, "no input to change"),
        ({"bounds": [("quality_factor", 1, 2)]}, "no mapping"),
        ({"requirements": []}, "nothing is required"),
        ({"requirements": Requirement("g2_zero", at_most=0.1)}, "not a single one"),
        ({"requirements": ["g2_zero"]}, "'g2_zero' is no Requirement"),
        (
            {"requirements": [at_least("peak_purcell", 5), at_most("peak_purcell", 3)]},
            "at least 5 and at most 3: the two requirements contradict each other",
        ),
        ({"point": {"quality_factor": [1, 2]}}, "no arrays"),
        ({"point": {"colour": 1}}, "'colour' is no input"),
        ({"point": {"lifetime": -1}}, "lifetime = "),
    ],
)
def test_what_cannot_be_searched_is_refused_in_one_sentence(
    wrong: dict[str, Any], said: str | None
) -> None:
    asked = {**GOOD, **wrong}
    if said is None:
        nearest(**asked)
        return
    with pytest.raises(InputError) as error:
        nearest(**asked)
    assert said in str(error.value)
    assert "\n" not in str(error.value)


@pytest.mark.parametrize("goal", ["regime", "splitting", "colour", 3])
def test_a_goal_is_a_quantity_that_is_a_number(goal: Any) -> None:
    with pytest.raises(InputError, match="no quantity that can be a goal"):
        best({}, goal, (), {"quality_factor": (10, 100)})


@pytest.mark.parametrize(
    ("goals", "count", "said"),
    [
        (("g2_zero",), 24, "two goals"),
        ("g2_zero", 24, "two goals"),
        (("g2_zero", Goal("g2_zero", most=False)), 24, "both goals are g2_zero"),
        (("g2_zero", "cavity_share"), 1, "2 to 200 designs"),
        (("g2_zero", "regime"), 24, "no quantity that can be a goal"),
    ],
)
def test_a_front_is_of_two_quantities(goals: Any, count: int, said: str) -> None:
    with pytest.raises(InputError, match=said):
        pareto_front({}, goals, (), {"quality_factor": (10, 100)}, count)


# Scales.


@pytest.mark.parametrize("name", [name for name, entry in INPUTS.items() if not entry.whole])
def test_a_position_is_the_fraction_of_the_slider_and_comes_back(name: str) -> None:
    scale, (low, high) = Scale(name), INPUTS[name].slider
    assert scale.position([low, high]) == pytest.approx([0, 1])
    values = [low, 0.3 * low + 0.7 * high, high, 2 * high]
    if INPUTS[name].scale == "log or zero":
        values += [0.0, 0.1 * low]
    if INPUTS[name].scale == "log or none":
        values += [math.inf, 10 * high]
    there = scale.position(values)
    assert scale.value(there) == pytest.approx(values)
    assert np.all(np.diff(there[np.argsort(values)]) > 0)


def test_zero_and_no_filter_are_one_e_fold_beyond_the_slider() -> None:
    span = math.log(1.0 / 1e-6)
    assert float(Scale("background_per_pulse").position(0.0)) == pytest.approx(-1 / span)
    span = math.log(300 / 0.01)
    assert float(Scale("filter_width").position(math.inf)) == pytest.approx(1 + 1 / span)


# Chance.

NUMBERS = [name for name, entry in INPUTS.items() if not entry.whole]
WANTED = [name for name, entry in QUANTITIES.items() if entry.kind == "number"]


@dataclass(frozen=True)
class Problem:
    """A search by chance; `place`: values within the bounds, from whose outcome the limits are."""

    point: dict[str, Any]
    bounds: dict[str, tuple[float, float]]
    requirements: list[Requirement]
    place: dict[str, float]


def somewhere(name: str, fraction: float) -> float:
    low, high = INPUTS[name].slider
    if INPUTS[name].scale.startswith("log"):
        return float(low * (high / low) ** fraction)
    return float(low + (high - low) * fraction)


def drawn(seed: int) -> Problem:
    """Half of the inputs given, one to five bounded, one to three quantities required."""
    rng = np.random.default_rng(seed)
    while True:
        point: dict[str, Any] = {
            name: somewhere(name, rng.random()) for name in NUMBERS if rng.random() < 0.5
        }
        for name in ("mode_profile", "pumping", "destination"):
            point[name] = str(rng.choice(INPUTS[name].choices))
        chosen = [str(name) for name in rng.choice(NUMBERS, rng.integers(1, 6), replace=False)]
        parts = {name: np.sort(rng.random(2)) for name in chosen}
        bounds = {name: (somewhere(name, a), somewhere(name, b)) for name, (a, b) in parts.items()}
        place = {
            name: somewhere(name, a + (b - a) * rng.random()) for name, (a, b) in parts.items()
        }
        try:
            for at in ({}, *({name: end} for name in bounds for end in bounds[name]), place):
                Evaluation({**point, **at})
            nearest({**point, **place}, [at_least("peak_purcell", 0)], bounds)  # bounds that fit
        except InputError:
            continue
        here, there = Evaluation(point), Evaluation({**point, **place})
        requirements = []
        for name in rng.choice(WANTED, rng.integers(1, 4), replace=False):
            before, after = (float(work.result(str(name))) for work in (here, there))
            limit = after * rng.choice([0.3, 0.7, 0.9, 1, 1, 1.1, 1.1, 1.5, 3])
            if math.isfinite(limit):
                upwards = after > before if rng.random() < 0.8 else rng.random() < 0.5
                side = at_least if upwards else at_most
                requirements.append(side(str(name), float(limit)))
        if requirements:
            return Problem(point, bounds, requirements, place)


def holds_what_it_says(found: Found, requirements: Any, bounds: Any) -> None:
    """A design that is said to meet everything does, and lies within its bounds."""
    work = Evaluation(found.point)
    for name, (low, high) in bounds.items():
        assert low <= float(work.value(name)) <= high, name
    if found.met:
        for entry in requirements:
            assert entry.met(float(work.result(entry.quantity))), entry


def by_chance(problem: Problem, count: int, seed: int, *wanted: str) -> tuple[Any, Any]:
    """How far random designs within the bounds lie that meet everything, and quantities of them."""
    rng = np.random.default_rng(seed)
    origin, entries, far = Evaluation(problem.point), {}, np.zeros(count)
    for name, (low, high) in problem.bounds.items():
        scale = Scale(name)
        first, last = (float(scale.position(end)) for end in (low, high))
        places = first + (last - first) * rng.random(count)
        entries[name] = np.clip(scale.value(places), low, high)
        far += (scale.position(entries[name]) - float(scale.position(origin.value(name)))) ** 2
    work, met = Evaluation({**problem.point, **entries}), np.ones(count, dtype=bool)
    for entry in problem.requirements:
        met &= entry.met(work.result(entry.quantity))
    values = [np.broadcast_to(work.result(name), count)[met] for name in wanted]
    return np.sqrt(far[met]), np.array(values)


def search_by_chance(seeds: range, count: int) -> int:
    """Search random problems; how many are out of reach. No random design may do better."""
    out = 0
    for seed in seeds:
        problem = drawn(seed)
        found = nearest(problem.point, problem.requirements, problem.bounds)
        holds_what_it_says(found, problem.requirements, problem.bounds)
        distances, _ = by_chance(problem, count, seed)
        if found.met:
            # A part in a thousand: the nearest may lie on a wrinkle of the numbers.
            assert found.distance <= distances.min(initial=math.inf) * (1 + CLOSE), seed
        else:
            assert distances.size == 0, (seed, found.reason)
            out += 1
    return out


def test_random_problems() -> None:
    """None of 4,000 random designs meets what is said to be out of reach, or is nearer."""
    assert 2 < search_by_chance(range(10), 4000) < 8


@pytest.mark.slow
def test_many_random_problems() -> None:
    """The same of 200 problems and 20,000 random designs each: none was missed."""
    assert 50 < search_by_chance(range(200), 20000) < 150


def best_by_chance(seeds: range, *, most: bool) -> None:
    """Search the best of random problems; no random design may be better."""
    for seed in seeds:
        problem = drawn(seed)
        goal = Goal(WANTED[seed % len(WANTED)], most=most)
        found = best(problem.point, goal, problem.requirements, problem.bounds)
        holds_what_it_says(found, problem.requirements, problem.bounds)
        _, (values,) = by_chance(problem, 4000, seed, goal.quantity)
        values = values[~np.isnan(values)]
        assert found.met or not values.size, seed
        if values.size:
            top = values.max() if most else values.min()
            assert found.value is not None
            assert (found.value - top) * (1 if most else -1) >= -CLOSE * abs(top), seed


@pytest.mark.parametrize("most", [True, False])
def test_no_random_design_is_better_than_the_best(most: bool) -> None:
    best_by_chance(range(3002, 3006), most=most)


@pytest.mark.slow
@pytest.mark.parametrize("most", [True, False])
def test_no_random_design_is_better_than_many_best(most: bool) -> None:
    best_by_chance(range(3000, 3060), most=most)


def test_no_random_design_beats_a_front() -> None:
    """None of 20,000 is better in both goals than a design of the front by a thousandth."""
    problem = Problem(
        {**START.point, "biexciton_yield": 0.1},
        {"quality_factor": (5, 1e4), "mode_volume": (0.05, 100), "excitations_per_pulse": (0.1, 5)},
        [at_most("half_angle", math.radians(30))],
        {},
    )
    goals = ("rate_in_fibre", Goal("g2_zero", most=False))
    front = pareto_front(problem.point, goals, problem.requirements, problem.bounds, count=10)
    assert len(front.points) == 10
    for point in front.points:
        made = Found(point, met=True, reason="", distance=0.0)
        holds_what_it_says(made, problem.requirements, problem.bounds)
    _, (rates, purities) = by_chance(problem, 20000, 1, "rate_in_fibre", "g2_zero")
    for rate, purity in front.values:
        assert not np.any((rates > rate * (1 + CLOSE)) & (purities < purity * (1 - CLOSE)))


def hidden(seed: int, width: float) -> tuple[Problem, list[Requirement]]:
    """Windows round what a place within the bounds gives: a design that meets them all exists."""
    problem = drawn(seed)
    work, wanted = Evaluation({**problem.point, **problem.place}), []
    for name in dict.fromkeys(entry.quantity for entry in problem.requirements):
        size = float(work.result(name))
        if size > 0:
            wanted += [at_least(name, size * (1 - width)), at_most(name, size * (1 + width))]
    return problem, wanted


def not_found(seeds: range, width: float) -> list[int]:
    missed = []
    for seed in seeds:
        problem, wanted = hidden(seed, width)
        if wanted:
            found = nearest(problem.point, wanted, problem.bounds)
            holds_what_it_says(found, wanted, problem.bounds)
            if not found.met:
                missed.append(seed)
    return missed


def test_hidden_designs_are_found() -> None:
    """Windows of ± a thousandth for up to three quantities at once, met by a place that is known."""
    assert not_found(range(1000, 1007), 1e-3) == []


@pytest.mark.slow
@pytest.mark.parametrize("width", [1e-1, 1e-3, 1e-6])
def test_many_hidden_designs_are_found(width: float) -> None:
    assert not_found(range(2000, 2150), width) == []


@pytest.mark.parametrize(
    ("wanted", "bounds"),
    [
        # Shares and overlaps are at most 1.
        (
            [at_least("cavity_share", 1.001)],
            {"quality_factor": (1, 1e9), "mode_volume": (1e-4, 10)},
        ),
        ([at_least("placement", 1.001)], {"lateral_offset": (0, 5e-7), "axial_offset": (0, 5e-7)}),
        # F = 3Q/(4π²V) at its best corner, missed by a thousandth.
        (
            [at_least("peak_purcell", 1.001 * 3 * 1e4 / (4 * math.pi**2 * 0.1))],
            {"quality_factor": (10, 1e4), "mode_volume": (0.1, 10)},
        ),
        # F w² = 3Q(λ/n)²/(π³L) does not depend on V: both at once are out of reach by a thousandth.
        (
            [
                at_least("peak_purcell", 50.0),
                at_least(
                    "mode_radius",
                    1.001 * math.sqrt(3 * 1e4 * (650e-9 / 1.5) ** 2 / (math.pi**3 * 0.5 * 50)),
                ),
            ],
            {"quality_factor": (10, 1e4), "mode_volume": (0.01, 1000)},
        ),
        # g² >= 0.
        ([at_most("g2_zero", -1e-9)], {"background_per_pulse": (0, 1)}),
        # A quantity that no bounded input changes.
        ([at_most("half_angle", 0.01)], {"quality_factor": (1, 1e9)}),
    ],
)
def test_what_no_design_meets_is_said_to_be_out_of_reach(
    wanted: list[Requirement], bounds: dict[str, tuple[float, float]]
) -> None:
    found = nearest({}, wanted, bounds)
    assert not found.met
    assert found.failing in wanted
    holds_what_it_says(found, wanted, bounds)
