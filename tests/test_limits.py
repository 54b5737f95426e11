"""What holds a design back: steps of the budget, levers, and what scatter costs."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.constants import speed_of_light

from explorer import Design, InputError, Pattern, Requirement, evaluate
from explorer.budget import budget_rows
from explorer.evaluate import FOLLOWING, Evaluation
from explorer.inputs import INPUTS
from explorer.limits import (
    cost_of_spread,
    cost_steps,
    elasticities,
    elasticity_steps,
    headroom,
    ranked,
    what_first,
)
from explorer.limits.steps import ARRIVALS, WORDS
from explorer.physics.photons import STEPS
from explorer.registry import REGISTRY
from explorer.scatter import Spread
from explorer.scenario import first_question
from explorer.units import si_unit
from explorer.yields import yield_of

from .strategies import points, tried

START = first_question().design

#: Two streams of the biexciton, a filter, a fibre, a blinking emitter: every step takes something.
FULL: dict[str, Any] = {
    "lifetime": 10e-9,
    "quantum_yield": 0.9,
    "fast_linewidth": 5e-9,
    "biexciton_yield": 0.3,
    "biexciton_shift": 3e-9,
    "bright_share": 0.6,
    "quality_factor": 130.0,
    "dipole_alignment": 1.0,
    "radiative_share": 0.7,
    "upward_share": 0.8,
    "quenching": 0.4,
    "filter_width": 6e-9,
    "optics_transmission": 0.5,
    "destination": "fibre",
    "detector_efficiency": 0.65,
    "fibre_offset": 0.5e-6,
    "numerical_aperture": 0.7,
}
CONTINUOUS = {**FULL, "pumping": "continuous", "saturation": 0.7}
DARK = {**FULL, "biexciton_yield": 0.0}


def row(rows: Any, step: str) -> Any:
    return next(one for one in rows if one.step == step)


def lever(point: Any, quantity: str, name: str) -> Any:
    (found,) = elasticities(point, quantity, [name])
    return found


# --- steps ---------------------------------------------------------------------------------------


@tried(50)
@given(points(), st.sampled_from(tuple(ARRIVALS)))
def test_headrooms_multiply_up_to_the_ideal_rate(point: dict[str, Any], rate: str) -> None:
    """Ideal: the pulses per second, or saturation over the device's lifetime."""
    rows = headroom(point, rate)
    work = Evaluation(point)
    now = evaluate(point, [rate])[rate]
    assert [one.now for one in rows] == pytest.approx([now] * len(rows), rel=0, abs=0, nan_ok=True)
    if not now > 1e-250:
        return
    offered = work.value("repetition_rate")
    if work.value("pumping") == "continuous":
        offered = work.value("saturation") / work.value("device_lifetime")
    product = now * math.prod(one.headroom for one in rows)
    assert product == pytest.approx(float(offered), rel=1e-12)
    for one in rows:
        assert one.factor * one.headroom == pytest.approx(1, rel=1e-15)
        assert math.isnan(one.alone) or one.alone >= 1 - 1e-15
        if one.alone < math.inf:
            assert one.ideal == pytest.approx(one.alone * now, rel=1e-12, nan_ok=True)


@pytest.mark.parametrize("rate", ARRIVALS)
def test_the_rows_end_where_the_rate_arrives(rate: str) -> None:
    names = [step for step, _ in STEPS]
    last = {"rate_at_lens": "inside the aperture", "rate_in_fibre": "in the fibre"}
    count = names.index(last.get(rate, "detected")) + 1
    assert [one.step for one in headroom(FULL, rate)] == names[:count]
    assert WORDS.keys() == set(names)


@pytest.mark.parametrize("point", [FULL, CONTINUOUS, DARK, dict(START.point)])
@pytest.mark.parametrize(
    ("step", "ideal"),
    [
        ("emitter on", {"bright_share": 1.0}),
        ("escaped the resonator", {"radiative_share": 1.0}),
        ("through the filter", {"filter_width": math.inf}),
        ("through the optics", {"optics_transmission": 1.0}),
        ("detected", {"detector_efficiency": 1.0}),
    ],
)
def test_alone_is_what_the_ideal_input_gives(
    point: dict[str, Any], step: str, ideal: dict[str, Any]
) -> None:
    """Against an evaluation in which an input makes just this step ideal."""
    now, then = (
        evaluate(one, ["rate_detected"])["rate_detected"] for one in (point, point | ideal)
    )
    found = row(headroom(point, "rate_detected"), step)
    assert found.ideal == pytest.approx(then, rel=1e-13)
    assert found.alone == pytest.approx(then / now, rel=1e-13)


@pytest.mark.parametrize("point", [FULL, CONTINUOUS, DARK])
def test_all_light_upward_is_more_than_the_upward_share(point: dict[str, Any]) -> None:
    """No input turns the light past the mode: half of it goes down, and ideal it would double."""
    then = evaluate({**point, "upward_share": 1.0}, ["rate_in_fibre"])["rate_in_fibre"]
    streams = budget_rows(Evaluation(point))[8].streams
    past = streams["exciton, other"] + streams["biexciton, other"]
    assert past > 0
    found = row(headroom(point), "towards the optic")
    assert found.ideal == pytest.approx(then + past, rel=1e-13)


def test_an_aperture_that_takes_in_everything() -> None:
    """The half space, nearly: at an aperture of 1 − 1e-13 a share of 3e-7 in cos θ is missing."""
    wide = evaluate({**FULL, "numerical_aperture": 1 - 1e-13}, ["rate_at_lens"])["rate_at_lens"]
    found = row(headroom(FULL, "rate_at_lens"), "inside the aperture")
    assert found.ideal == pytest.approx(wide, rel=2e-6)


def test_an_exciton_after_every_pulse_is_the_limit_of_strong_pumping() -> None:
    """The biexciton dark, the period 10 lifetimes and more: every pulse leaves one exciton."""
    point = {**DARK, "repetition_rate": 1e6}
    strong = evaluate({**point, "excitations_per_pulse": 1e3}, ["rate_in_fibre"])["rate_in_fibre"]
    found = row(headroom(point), "excited and decayed")
    assert found.ideal == pytest.approx(strong, rel=1e-12)
    assert found.headroom < found.alone  # decays of the dark biexciton count in the step


def test_one_pulse_can_start_two_decays() -> None:
    """Decays per pulse of a long period: P(n ≥ 1) + P(n ≥ 2) of a Poisson number of mean 3."""
    point = {**FULL, "repetition_rate": 1e5, "excitations_per_pulse": 3.0}
    found = row(headroom(point), "excited and decayed")
    assert found.headroom == pytest.approx(1 / (2 - math.exp(-3) * (2 + 3)), rel=1e-9)
    assert found.headroom < 1 <= found.alone


@pytest.mark.parametrize("point", [FULL, CONTINUOUS])
def test_a_photon_from_every_exciton_is_shared_as_now(point: dict[str, Any]) -> None:
    """The exciton's streams over the share of its decays that give light; the biexciton's stay."""
    shares = evaluate(point, ["cavity_share", "other_share"])
    streams = budget_rows(Evaluation(point))[8].streams
    exciton = sum(value for name, value in streams.items() if name.startswith("exciton"))
    pair = sum(value for name, value in streams.items() if name.startswith("biexciton"))
    found = row(headroom(point), "photon emitted")
    assert found.ideal == pytest.approx(exciton / sum(shares.values()) + pair, rel=1e-13)


def test_with_one_stream_a_step_alone_gives_its_headroom() -> None:
    point = {**DARK, "other_modes": 0.0}
    for one in headroom(point, "rate_detected")[3:]:
        assert one.alone == pytest.approx(one.headroom, rel=1e-13)


def test_with_several_streams_it_does_not() -> None:
    """Light past the mode hardly enters the fibre: to spare it the optic gives less than it seems."""
    found = row(headroom(FULL), "inside the aperture")
    assert abs(found.alone / found.headroom - 1) > 0.05


def test_a_step_that_nothing_passes() -> None:
    """All the mode's light outside the aperture, and no other: only an ideal optic helps."""
    ring = Pattern([0.0, 1.0, 1.2, 1.5], [0.0, 0.0, 1.0, 1.0])
    point = {**DARK, "pattern": ring, "other_modes": 0.0, "destination": "free_space"}
    rows = headroom(point, "rate_at_lens")
    found = row(rows, "inside the aperture")
    assert (found.now, found.headroom, found.alone) == (0.0, math.inf, math.inf)
    assert found.ideal == pytest.approx(row(rows, "towards the optic").factor * row_before(point))
    assert row(rows, "escaped the resonator").alone == 1.0
    first = what_first(rows)
    assert first.row is found
    assert "where nothing does" in first.sentence
    behind = row(headroom(point), "through the optics")
    assert math.isnan(behind.headroom)
    assert behind.alone == 1.0


def row_before(point: dict[str, Any]) -> float:
    """Photons per second that have left the resonator."""
    return budget_rows(Evaluation(point))[3].total


def test_an_exciton_without_a_way_out_cannot_be_told() -> None:
    point = {**DARK, "other_modes": 0.0, "dipole_alignment": 0.0}
    rows = headroom(point)
    assert row(rows, "photon emitted").headroom == math.inf
    assert math.isnan(row(rows, "photon emitted").alone)
    assert what_first(rows).row is None
    assert ranked(rows)[-1].step == "photon emitted"


def test_where_the_model_has_no_number_no_row_has_one() -> None:
    rows = headroom({"mode_volume": 1e-8, "quality_factor": 1e4, "lifetime": 1e-12})
    assert len(rows) == 9
    assert all(math.isnan(one.headroom) and math.isnan(one.alone) for one in rows)
    assert what_first(rows).sentence == "The photon rates have no number here."


def test_what_first_is_the_step_that_gives_most() -> None:
    rows = headroom({**DARK, "optics_transmission": 0.1, "destination": "free_space"})
    first = what_first(rows)
    assert first.row is row(rows, "through the optics")
    assert first.row is ranked(rows)[0]
    assert first.sentence.startswith("Optics without loss alone would give 10 times the photons: ")
    alone = [one.alone for one in ranked(rows)]
    assert alone == sorted(alone, reverse=True)


def test_nothing_to_give() -> None:
    rows = [replace(one, alone=1.001) for one in headroom(FULL)]
    assert what_first(rows).row is None


def test_under_continuous_pumping_the_words_differ() -> None:
    pulsed, steady = (row(headroom(one), "excited and decayed") for one in (FULL, CONTINUOUS))
    assert "pulses" in pulsed.words.held_by
    assert "pulses" not in steady.words.held_by
    weak = headroom({**CONTINUOUS, "biexciton_yield": 0.0, "saturation": 30.0})
    assert "every excitation offered" in what_first(weak).sentence


def test_a_design_and_its_point_have_the_same_rows() -> None:
    assert headroom(START) == headroom(dict(START.point))


@pytest.mark.parametrize(
    ("call", "said"),
    [
        (lambda: headroom(FULL, "g2_zero"), "not one of"),
        (lambda: headroom(FULL, 3), "not one of"),
        (lambda: headroom({"quality_factor": np.array([1.0, 2.0])}), "one design"),
        (lambda: headroom({"quality": 1.0}), "is no input"),
        (lambda: elasticities(FULL, "regime"), "is no quantity that is a number"),
        (lambda: elasticities(FULL, "low_quality"), "is no quantity that is a number"),
        (lambda: elasticities(FULL, ["g2_zero"]), "is no quantity that is a number"),
        (lambda: elasticities({"lifetime": np.full(2, 1e-9)}, "g2_zero"), "one design"),
        (lambda: elasticities(FULL, "g2_zero", "lifetime"), "is a sequence"),
        (lambda: elasticities(FULL, "g2_zero", ["pumping"]), "no input that is a number"),
        (lambda: elasticities(FULL, "g2_zero", ["speed"]), "no input that is a number"),
        (lambda: elasticities(FULL, "g2_zero", ["lateral_offset"]), "no logarithm"),
        (lambda: elasticities({}, "g2_zero", ["filter_width"]), "no logarithm"),
        (lambda: cost_of_spread(Design()), "requires nothing"),
        (lambda: cost_of_spread(START, "regime"), "is no quantity that is a number"),
        (lambda: cost_of_spread({}, "g2_zero"), "is of a Design"),
        (lambda: cost_of_spread(START, "g2_zero", count=0), "whole number"),
        (lambda: cost_of_spread(START, "g2_zero", seed=-1), "whole number"),
    ],
)
def test_bad_input_is_refused_in_one_sentence(call: Any, said: str) -> None:
    with pytest.raises(InputError, match=said) as caught:
        call()
    assert "\n" not in str(caught.value)
    assert ". " not in str(caught.value)


# --- levers --------------------------------------------------------------------------------------

CLOSED: tuple[tuple[dict[str, Any], str, str, float], ...] = (
    # F = 3Q/4π²V, κ = ω/Q, γr = rn η/τ, w² = 4V/πL
    ({}, "peak_purcell", "quality_factor", 1.0),
    ({}, "peak_purcell", "mode_volume", -1.0),
    ({}, "resonator_linewidth", "quality_factor", -1.0),
    ({}, "resonator_linewidth", "emission_wavelength", -1.0),
    ({}, "radiative_rate", "lifetime", -1.0),
    ({}, "mode_radius", "mode_volume", 0.5),
    ({"mode_profile": "compact"}, "mode_radius", "mode_volume", 1 / 3),
    ({}, "coupling_rate", "mode_volume", -0.5),
    ({}, "rate_in_fibre", "optics_transmission", 1.0),
    ({}, "rate_at_lens", "optics_transmission", 0.0),
    ({}, "rate_detected", "bright_share", 1.0),
    # ψ = exp(−2r²/w²) cos²(2πnz/λ): −4r²/w², and −2φ tan φ
    (
        {"lateral_offset": 80e-9},
        "placement",
        "lateral_offset",
        -4 * (80e-9 / (650e-9 / 1.5 * math.sqrt(8 / math.pi))) ** 2,
    ),
    (
        {"axial_offset": 60e-9},
        "placement",
        "axial_offset",
        -2 * (2 * math.pi * 1.5 * 60 / 650) * math.tan(2 * math.pi * 1.5 * 60 / 650),
    ),
)


@pytest.mark.parametrize(("point", "quantity", "name", "value"), CLOSED)
def test_elasticities_have_their_closed_forms(
    point: dict[str, Any], quantity: str, name: str, value: float
) -> None:
    found = lever(point, quantity, name)
    assert found.value == pytest.approx(value, rel=1e-10, abs=1e-12)
    assert found.error < 1e-9


def test_the_share_of_the_mode() -> None:
    """β = Re/(γ + Re), Re = Rκ/(R + κ), R ∝ 1/V: d ln β/d ln V = −(1 − β) κ/(R + κ)."""
    point = {**DARK, "fast_linewidth": 1e-12, "quality_factor": 1e4, "mode_volume": 0.3}
    one = evaluate(point, ["cavity_share", "exchange_rate", "resonator_linewidth"])
    beta, rate, width = one.values()
    assert 0.1 < width / rate < 10  # the photon returns
    wanted = -(1 - beta) * width / (rate + width)
    assert lever(point, "cavity_share", "mode_volume").value == pytest.approx(wanted, rel=1e-9)


@pytest.mark.parametrize("quality", [1e3, 1e6, 1e9])
def test_a_derivative_across_a_sharp_resonance(quality: float) -> None:
    """Half a linewidth off: O = [κ/(κ+Γ)]/(1 + u²), u = 2δ/(κ+Γ), differentiated by hand in ln λc."""
    emission = 650e-9
    point = {
        "lifetime": 1e-6,
        "fast_linewidth": 0.0,
        "quality_factor": quality,
        "emission_wavelength": emission,
        "resonance_wavelength": emission * (1 + 0.5 / quality),
    }
    one = evaluate(point, ["resonator_linewidth", "coherence_decay"])
    width, total = one["resonator_linewidth"], sum(one.values())
    centre = 2 * math.pi * speed_of_light / point["resonance_wavelength"]
    offset = centre * (point["resonance_wavelength"] / emission - 1)
    u = 2 * offset / total
    turned = 2 * centre / total + u * width / total
    wanted = -1 + width / total - 2 * u * turned / (1 + u**2)
    found = lever(point, "spectral_overlap", "resonance_wavelength")
    assert found.value == pytest.approx(wanted, rel=1e-6)
    assert not found.lever


def test_what_follows_by_default_keeps_following() -> None:
    """With the resonance on the emission κ ∝ 1/λ; with the resonance given it stays."""
    free = lever({}, "resonator_linewidth", "emission_wavelength")
    fixed = lever({"resonance_wavelength": 650e-9}, "resonator_linewidth", "emission_wavelength")
    assert free.value == pytest.approx(-1, rel=1e-10)
    assert fixed.value == 0


#: How many lengths (or times) an SI unit holds, where the speed of light is 1.
DIMENSIONS = {"m": 1, "s": 1, "1/s": -1, "rad/s": -1}


@st.composite
def moderate(draw: st.DrawFn) -> dict[str, Any]:
    """Designs within the slider ranges, none of their numbers 0 or below."""
    point: dict[str, Any] = {
        "pumping": draw(st.sampled_from(("pulsed", "continuous"))),
        "destination": draw(st.sampled_from(("free_space", "fibre"))),
        "mode_profile": draw(st.sampled_from(("standing_wave", "compact"))),
    }
    reach = {
        "emission_wavelength": (500e-9, 1000e-9),
        "lifetime": (1e-10, 1e-7),
        "quantum_yield": (0.1, 0.98),
        "fast_linewidth": (1e-13, 3e-8),
        "slow_linewidth": (1e-12, 1e-8),
        "dipole_alignment": (0.1, 0.95),
        "biexciton_yield": (0.01, 0.9),
        "biexciton_shift": (1e-9, 1e-8),
        "bright_share": (0.1, 0.9),
        "quality_factor": (10.0, 1e4),
        "mode_volume": (0.01, 30.0),
        "lateral_offset": (1e-9, 5e-8),
        "axial_offset": (1e-9, 5e-8),
        "radiative_share": (0.1, 0.9),
        "filter_width": (1e-9, 5e-8),
        "numerical_aperture": (0.2, 0.9),
        "aperture_radius": (1e-7, 2e-6),
        "fibre_offset": (1e-8, 1e-6),
        "repetition_rate": (1e6, 1e8),
        "background_per_pulse": (1e-4, 1e-1),
        "background_rate": (1e3, 1e6),
    }
    for name, (low, high) in reach.items():
        if draw(st.booleans()):
            point[name] = low * (high / low) ** draw(st.floats(0.01, 0.99))
    return point


@tried(25)
@given(
    moderate(),
    st.sampled_from(
        ("rate_detected", "g2_zero", "device_lifetime", "cavity_share", "half_angle", "mode_radius")
    ),
)
def test_elasticities_add_up_to_the_dimension(point: dict[str, Any], quantity: str) -> None:
    """Euler's sum: all lengths and times stretched alike, and no formula knows the difference.

    Over the inputs that stand by themselves; those that follow others are stretched by these.
    """
    rows = {one.name: one for one in elasticities(point, quantity)}
    alone = rows.keys() - (FOLLOWING - point.keys() - {"fast_linewidth"})
    parts = [rows[name].value * DIMENSIONS.get(si_unit(INPUTS[name].unit), 0) for name in alone]
    size = max(1.0, *(abs(part) for part in parts), 0.0)
    wanted = DIMENSIONS.get(REGISTRY.quantities[quantity].unit, 0)
    assert math.fsum(parts) == pytest.approx(wanted, abs=2e-6 * size)


@pytest.mark.parametrize("quantity", ["rate_in_fibre", "g2_zero", "indistinguishability"])
@pytest.mark.parametrize(
    "more", [{}, {"slow_linewidth": 2e-9}, {"resonance_wavelength": 652e-9, "quality_factor": 2e3}]
)
def test_no_input_that_acts_is_left_out(more: dict[str, Any], quantity: str) -> None:
    """Every input against plain differences over ±1 and ±2 parts in 10⁴."""
    point = {**FULL, "lateral_offset": 40e-9, **more}
    rows = {one.name: one for one in elasticities(point, quantity)}
    work = Evaluation(point)
    for name, entry in INPUTS.items():
        value = None if entry.whole else float(work.value(name))
        if value is None or not 0 < value < math.inf:
            continue
        low, high = work.domain(name)
        if not low < 0.999 * value < 1.001 * value < high:
            continue
        near = value * np.exp(1e-4 * np.arange(-2, 3))
        found = np.broadcast_to(evaluate({**point, name: near}, [quantity])[quantity], (5,))
        logs = np.log(found / found[2])
        slope = (8 * (logs[3] - logs[1]) - (logs[4] - logs[0])) / 12e-4
        if name in rows:
            assert rows[name].value == pytest.approx(slope, rel=1e-6, abs=1e-6)
        else:
            assert abs(slope) < 1e-9


@tried(30)
@given(points(), st.sampled_from([k for k, q in REGISTRY.quantities.items() if q.kind == "number"]))
def test_every_quantity_of_any_design_can_be_asked(point: dict[str, Any], quantity: str) -> None:
    rows = elasticities(point, quantity)
    sizes = [abs(one.value) for one in rows]
    assert sizes == sorted(sizes, reverse=True)
    for one in rows:
        assert math.isfinite(one.value)
        assert one.error <= 1e-4 * max(1, abs(one.value))
        assert one.side in ("both", "below", "above")
        assert one.words


@pytest.mark.parametrize(
    ("point", "quantity", "name", "side", "value"),
    [
        ({}, "rate_in_fibre", "optics_transmission", "below", 1.0),
        ({"quantum_yield": 1.0}, "radiative_rate", "quantum_yield", "below", 1.0),
        ({"quality_factor": 1.0}, "peak_purcell", "quality_factor", "above", 1.0),
        ({"quality_factor": 1e10}, "peak_purcell", "quality_factor", "below", 1.0),
        ({"mode_volume": 1e8 * (1 - 1e-3)}, "peak_purcell", "mode_volume", "both", -1.0),
        # the widest line that is allowed follows the wavelength, which cannot go down
        (
            {"fast_linewidth": 0.6 * 650e-9 * (1 - 1e-13)},
            "resonator_linewidth",
            "emission_wavelength",
            "above",
            -1.0,
        ),
    ],
)
def test_at_an_end_of_its_range_an_input_moves_to_one_side(
    point: dict[str, Any], quantity: str, name: str, side: str, value: float
) -> None:
    found = lever(point, quantity, name)
    assert found.side == side
    assert found.value == pytest.approx(value, rel=1e-9)


def test_one_side_is_as_exact_where_the_quantity_curves() -> None:
    """Light past the mode goes as the intrinsic loss (1 − η)/τ ends: γ = αγr + γnr, α = 0.3, η = 1."""
    found = lever({"quantum_yield": 1.0, "other_modes": 0.3}, "decay_elsewhere", "quantum_yield")
    assert found.side == "below"
    assert found.value == pytest.approx((0.3 - 1) / 0.3, rel=1e-8)


def test_there_is_no_derivative_at_a_corner_or_a_jump() -> None:
    """At the lifetime limit dephasing begins; above an aperture of 1 the reference changes sides."""
    lifetime, wavelength = 1e-9, 650e-9
    # 2πcΔ/(λ² − Δ²/4) = 1/τ, solved for Δ
    reach = 2 * math.pi * speed_of_light * lifetime
    width = 2 * wavelength**2 / (reach + math.hypot(reach, wavelength))
    point = {"lifetime": lifetime, "fast_linewidth": width, "quality_factor": 1e8}
    quantity = "coherence_decay"
    assert elasticities(point, quantity, ["fast_linewidth"]) == ()
    beside = lever({**point, "fast_linewidth": 1.01 * width}, quantity, "fast_linewidth")
    assert beside.value > 0.1
    oil = {"medium_index": 1.52, "numerical_aperture": 1.0}
    assert elasticities(oil, "brightness_gain", ["numerical_aperture"]) == ()


def test_levers_come_one_by_one_and_those_that_are_none_last() -> None:
    *others, last = steps = list(elasticity_steps(START, "rate_in_fibre"))
    assert last == elasticities(START, "rate_in_fibre")
    sizes = [len(one) for one in steps]
    assert sizes == sorted(sizes)
    assert sizes[-1] > 20
    first = next(i for i, one in enumerate(others) if not all(row.lever for row in one))
    found = {row.name for row in others[first - 1]}
    assert found == {row.name for row in last if row.lever}


def test_a_quantity_that_is_nothing_has_no_levers() -> None:
    assert elasticities({"dipole_alignment": 0.0}, "cavity_share") == ()
    assert elasticities({"mode_volume": 1e-8, "lifetime": 1e-12}, "rate_in_fibre") == ()


def test_levers_are_told_in_plain_words() -> None:
    point = {"quality_factor": 100.0, "dipole_alignment": 1.0}
    assert lever(point, "peak_purcell", "mode_volume").words == (
        "1 % more mode volume makes peak Purcell factor 1.0 % lower"
    )
    assert lever({"optics_transmission": 0.5}, "rate_in_fibre", "optics_transmission").words == (
        "1 % more optics transmission gives 1.0 % more photons"
    )
    assert lever(point, "rate_in_fibre", "optics_transmission").words == (
        "1 % less optics transmission gives 1.0 % fewer photons"
    )
    assert lever({"detector_efficiency": 0.5}, "rate_in_fibre", "detector_efficiency").words == (
        "1 % more detector efficiency leaves the photons as many"
    )
    assert lever(point, "radiative_rate", "lifetime").words.startswith("1 % more bare lifetime")


# --- spreads -------------------------------------------------------------------------------------

RADIUS = 650e-9 / 1.5 * math.sqrt(8 / math.pi)  # w = (λ/n) √(4V/πL) at the defaults


def test_the_mean_of_the_placement_under_radial_scatter() -> None:
    """⟨exp(−2r²/w²)⟩ over a Gaussian in the plane is 1/(1 + 4σ²/w²); without scatter it is 1."""
    sigma = 100e-9
    design = Design(scatter={"lateral_offset": Spread("radial", sigma)})
    found = cost_of_spread(design, "placement", count=2**14)
    mean = 1 / (1 + 4 * (sigma / RADIUS) ** 2)
    (only,) = found.rows
    assert found.now.value == pytest.approx(mean, rel=1e-4)
    assert (found.still.value, found.still.reached) == (1.0, 1.0)
    assert only.cost == pytest.approx(1 - mean, rel=2e-3)
    assert only.without.value == 1.0
    assert only.only == found.now
    # r² is exponential: nine of ten devices have r² < 2σ² ln 10
    assert found.now.reached == pytest.approx(10 ** (-4 * (sigma / RADIUS) ** 2), rel=2e-3)


def test_the_yield_where_only_the_placement_scatters() -> None:
    """ψ ≥ f within r² ≤ w² ln(1/f)/2: 1 − f^(w²/4σ²) of the devices."""
    sigma, least = 100e-9, 0.9
    design = Design(
        requirements=(Requirement("placement", at_least=least),),
        scatter={
            "lateral_offset": Spread("radial", sigma),
            "quality_factor": Spread("lognormal", 0.3),
        },
    )
    found = cost_of_spread(design, count=2**14)
    share = 1 - least ** (RADIUS**2 / (4 * sigma**2))
    assert 0.1 < share < 0.9
    assert found.now.value == pytest.approx(share, abs=2e-3)
    assert [one.name for one in found.rows] == ["lateral_offset", "quality_factor"]
    assert found.rows[0].cost == pytest.approx(1 - share, abs=2e-3)
    assert found.rows[0].only.value == found.now.value
    assert found.rows[1].cost == 0
    assert (found.rows[1].only.value, found.still.value) == (1.0, 1.0)


def test_factors_that_scatter_by_themselves_cost_their_own_mean() -> None:
    """F = 3Q/4π²V: means of lognormal factors are exp(σ²/2), and they multiply."""
    wide, narrow = 0.4, 0.2
    design = Design(
        scatter={
            "mode_volume": Spread("lognormal", narrow),
            "quality_factor": Spread("lognormal", wide),
        }
    )
    found = cost_of_spread(design, "peak_purcell", count=2**14)
    still = 3 * 100 / (4 * math.pi**2)
    means = {"quality_factor": math.exp(wide**2 / 2), "mode_volume": math.exp(narrow**2 / 2)}
    both = math.prod(means.values())
    assert found.still.value == pytest.approx(still, rel=1e-15)
    assert found.now.value == pytest.approx(still * both, rel=1e-4)
    # both make the mean larger: the narrow one least, so its cost, below 0, comes first
    assert [one.name for one in found.rows] == ["mode_volume", "quality_factor"]
    for one in found.rows:
        own = still * means[one.name]
        assert one.only.value == pytest.approx(own, rel=1e-4)
        assert one.without.value == pytest.approx(still * both / means[one.name], rel=1e-4)
        assert one.cost == pytest.approx(one.without.value - found.now.value, rel=1e-12)
    # nine of ten devices: 1.2816 standard deviations of the logarithm below
    spread = math.hypot(wide, narrow)
    assert found.now.reached == pytest.approx(still * math.exp(-1.2815516 * spread), rel=3e-3)


def test_a_correlation_goes_with_the_input_that_stops() -> None:
    """ln F = ln Q − ln V: its variance with a correlation ρ is σ²(2 − 2ρ), without V it is σ²."""
    sigma, rho = 0.3, 0.8
    both = {name: Spread("lognormal", sigma) for name in ("quality_factor", "mode_volume")}
    design = Design(scatter=both, correlation={"quality_factor|mode_volume": rho})
    found = cost_of_spread(design, "peak_purcell", count=2**14)
    still = found.still.value
    assert found.now.value / still == pytest.approx(math.exp(sigma**2 * (1 - rho)), rel=1e-4)
    for one in found.rows:
        assert one.without.value / still == pytest.approx(math.exp(sigma**2 / 2), rel=1e-4)
        assert one.cost > 0  # the two make up for each other, and the mean rises where one is left


SCATTERED = replace(
    START,
    correlation={},
    scatter={
        "lateral_offset": Spread("radial", 30e-9),
        "quality_factor": Spread("lognormal", 0.3),
        "dipole_alignment": Spread("direction"),
        "emission_wavelength": Spread("normal", 3e-9),
        "quantum_yield": Spread("uniform", 0.1),
        "detector_efficiency": Spread("normal", 0.05),
    },
)


def test_what_does_not_matter_costs_exactly_nothing() -> None:
    """The detector counts behind the fibre; a fibre that is displaced does not reach free space."""
    found = cost_of_spread(SCATTERED, "rate_in_fibre")
    (detector,) = [one for one in found.rows if one.name == "detector_efficiency"]
    assert detector.cost == 0.0
    assert detector.without == found.now
    assert detector.only == replace(found.still)
    free = replace(
        SCATTERED,
        point={**START.point, "destination": "free_space"},
        scatter={**SCATTERED.scatter, "fibre_offset": Spread("radial", 1e-6)},
    )
    rows = cost_of_spread(free, "rate_detected").rows
    assert [one.cost for one in rows if one.name == "fibre_offset"] == [0.0]


@pytest.mark.parametrize("quantity", ["", "rate_in_fibre", "g2_zero", "device_lifetime"])
def test_the_most_costly_comes_first_and_steps_grow_to_the_whole(quantity: str) -> None:
    *_, last = steps = list(cost_steps(SCATTERED, quantity))
    assert [len(one.rows) for one in steps] == list(range(len(SCATTERED.scatter) + 1))
    assert last == cost_of_spread(SCATTERED, quantity)
    costs = [one.cost for one in last.rows]
    assert costs == sorted(costs, reverse=True)
    assert {one.name for one in last.rows} == SCATTERED.scatter.keys()


def test_the_devices_are_those_of_the_yield() -> None:
    """The same draws, counted by the function that counts a yield."""
    found = cost_of_spread(SCATTERED, count=2048, seed=7)
    share = yield_of(START, SCATTERED.scatter, START.requirements, count=2048, seed=7).share
    assert found.now.value == share > 0


def test_where_less_is_wanted_less_is_gained() -> None:
    """g²(0) is required at most: nine of ten devices stay below, and a cost is what it would fall."""
    found = cost_of_spread(SCATTERED, "g2_zero")
    values = evaluate(
        {**START.point, "dipole_alignment": 1 / 3},
        ["g2_zero"],
    )
    assert found.still.value == pytest.approx(values["g2_zero"], rel=1e-12)
    assert found.now.reached > found.now.value > found.still.value
    assert found.rows[0].name == "dipole_alignment"
    assert found.rows[0].cost == found.now.value - found.rows[0].without.value > 0


def test_devices_without_a_number_are_counted_apart() -> None:
    """Beyond the model below a certain mode volume: those neither pass nor enter the mean."""
    design = Design(
        {"mode_volume": 1e-7, "quality_factor": 1e4, "lifetime": 1e-12},
        requirements=(Requirement("rate_enhancement", at_least=1.0),),
        scatter={"mode_volume": Spread("lognormal", 2.0)},
    )
    mean = cost_of_spread(design, "rate_enhancement").now
    share = cost_of_spread(design).now
    assert 0 < mean.missing < 1
    assert math.isfinite(mean.value)
    assert share.value == pytest.approx(1 - share.missing)
    assert share.missing == mean.missing


def test_a_design_without_scatter_has_no_rows() -> None:
    found = cost_of_spread(Design(START.point), "rate_in_fibre")
    assert found.rows == ()
    assert found.now == found.still
