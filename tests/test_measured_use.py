"""Measured values as inputs, measured devices beside their predictions, and the enhancement from two decays."""

from __future__ import annotations

import math
import pickle
from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import norm

from explorer import Design, InputError, evaluate
from explorer.built import LONGEST_NAME, MOST, Built, Estimate
from explorer.measured.enhancement import Enhancement, enhancement, ratio
from explorer.measured.use import predicted, with_device, with_measured, without_device
from explorer.record import design_from, design_text
from explorer.scenario import first_question

HASH = "ab" * 32


def design() -> Design:
    return first_question().design


def test_a_measured_value_is_an_input_whose_interval_is_what_is_not_known() -> None:
    made = with_measured(
        design(), {"lifetime": Estimate(4e-9, 3.8e-9, 4.3e-9)}, "a.csv", HASH, "one"
    )
    assert made.point["lifetime"] == 4e-9
    assert (made.unknowns["lifetime"].low, made.unknowns["lifetime"].high) == (3.8e-9, 4.3e-9)
    origin = made.origin("lifetime")
    assert (origin.kind, origin.source, origin.where) == ("measured", "a.csv", "a.csv: one")
    assert made.data == {"a.csv": HASH}


def test_a_value_without_an_interval_is_known() -> None:
    made = with_measured(design(), {"lifetime": 4e-9}, "a.csv", HASH)
    assert "lifetime" not in made.unknowns
    exact = with_measured(design(), {"lifetime": Estimate(4e-9, 4e-9, 4e-9)}, "a.csv", HASH)
    assert "lifetime" not in exact.unknowns


def test_an_interval_ends_where_the_input_does() -> None:
    wide = {"quantum_yield": Estimate(0.9, -0.3, 1.4), "lifetime": Estimate(4e-9, 0.0, math.inf)}
    made = with_measured(design(), wide, "a.csv", HASH)
    assert 0 < made.unknowns["quantum_yield"].low < 0.9
    assert made.unknowns["quantum_yield"].high == 1.0
    assert 0 < made.unknowns["lifetime"].low < 4e-9
    assert made.unknowns["lifetime"].high == 10e-3  # the domain's end


def test_a_measured_value_outside_the_domain_is_refused() -> None:
    with pytest.raises(InputError, match="quantum_yield"):
        with_measured(design(), {"quantum_yield": Estimate(1.2, 1.1, 1.3)}, "a.csv", HASH)


def test_files_that_nothing_comes_from_are_no_longer_named() -> None:
    first = with_measured(design(), {"lifetime": 4e-9}, "a.csv", HASH)
    second = with_measured(first, {"lifetime": 5e-9}, "b.csv", HASH)
    assert second.data == {"b.csv": HASH}
    held = with_device(second, "one", {"g2_zero": Estimate(0.1, 0.05, 0.2)}, "c.csv", HASH)
    assert set(held.data) == {"b.csv", "c.csv"}
    assert set(without_device(held, "one").data) == {"b.csv"}


def test_a_device_keeps_its_resonator_and_follows_the_rest() -> None:
    start = design()
    held = with_device(start, "one", {"device_lifetime": Estimate(3e-9, 2.9e-9, 3.1e-9)})
    moved = held.with_values(quality_factor=5000.0, mode_volume=0.01, numerical_aperture=0.3)
    device = moved.built[0]
    there = evaluate(
        {**moved.point, "quality_factor": 25.0, "mode_volume": 1.0}, ["device_lifetime"]
    )
    assert predicted(moved, device)["device_lifetime"] == pytest.approx(
        float(there["device_lifetime"]), rel=1e-12
    )
    other = moved.with_values(lifetime=10e-9)
    assert (
        predicted(other, device)["device_lifetime"]
        > 2 * predicted(moved, device)["device_lifetime"]
    )


def test_an_input_that_the_device_did_not_give_is_at_its_default_there() -> None:
    held = with_device(Design(), "one", {"rate_enhancement": Estimate(1.0, 0.9, 1.1)})
    moved = held.with_values(quenching=3.0)
    plain = evaluate({"quality_factor": 100.0, "mode_volume": 1.0}, ["rate_enhancement"])
    assert predicted(moved, moved.built[0])["rate_enhancement"] == pytest.approx(
        float(plain["rate_enhancement"]), rel=1e-12
    )


def test_a_known_name_takes_more_quantities() -> None:
    held = with_device(design(), "one", {"g2_zero": Estimate(0.1, 0.05, 0.2)}, "a.csv", HASH)
    moved = held.with_values(quality_factor=500.0)
    more = with_device(moved, "one", {"device_lifetime": Estimate(3e-9, 2e-9, 4e-9)}, "b.csv", HASH)
    assert len(more.built) == 1
    assert set(more.built[0].measured) == {"g2_zero", "device_lifetime"}
    assert more.built[0].point["quality_factor"] == 25.0
    assert more.built[0].files == ("a.csv", "b.csv")


def test_a_record_brings_measured_values_and_devices_back() -> None:
    made = with_measured(design(), {"lifetime": Estimate(4e-9, 3.8e-9, 4.3e-9)}, "a.csv", HASH)
    made = with_device(
        made,
        "one",
        {"half_angle": Estimate(0.31, 0.3, 0.33), "rate_enhancement": Estimate(1.1, 0.7, math.inf)},
        "b.csv",
        HASH,
    )
    text = design_text(made)
    assert design_from(text.encode()) == made
    assert hash(design_from(text.encode())) == hash(made)
    assert pickle.loads(pickle.dumps(made)) == made
    assert '"predicted"' in text


def test_a_record_with_a_device_that_cannot_be_is_refused() -> None:
    made = with_device(design(), "one", {"g2_zero": Estimate(0.1, 0.05, 0.2)})
    text = design_text(made)
    for old, new in (
        ('"value": 0.1,\n     "low": 0.05', '"value": 0.1,\n     "low": 0.15'),
        ('"g2_zero": {\n     "value": 0.1,', '"no_such": {\n     "value": 0.1,'),
    ):
        assert old in text
        with pytest.raises(ValueError, match="holds what cannot be"):
            design_from(text.replace(old, new).encode())


@pytest.mark.parametrize(
    ("make", "says"),
    [
        (lambda: Estimate(math.nan, 0, 1), "finite"),
        (lambda: Estimate(2.0, 0.0, 1.0), "within its interval"),
        (lambda: Built(""), "name"),
        (lambda: Built("x" * (LONGEST_NAME + 1)), "name"),
        (lambda: Built("a\nb"), "control"),
        (lambda: Built("a", {"lifetime": 1e-9}), "no number of a resonator"),
        (lambda: Built("a", {}, {"regime": Estimate(1, 1, 1)}), "no quantity"),
        (lambda: Built("a", {}, {"g2_zero": 0.1}), "no Estimate"),
        (lambda: replace(Design(), built=(Built("a"), Built("a"))), "same name"),
        (lambda: replace(Design(), built=("a",)), "no Built"),
        (
            lambda: replace(Design(), built=(Built("a", {"quality_factor": -1.0}),)),
            "quality_factor",
        ),
    ],
)
def test_what_cannot_be_is_refused_in_a_sentence(make, says) -> None:
    with pytest.raises(InputError, match=says):
        make()


def test_no_more_devices_than_a_record_holds() -> None:
    held = replace(Design(), built=tuple(Built(f"{i}") for i in range(MOST)))
    with pytest.raises(InputError, match="at most"):
        with_device(held, "one more", {"g2_zero": Estimate(0.1, 0.1, 0.1)})


def test_the_ratio_of_two_lognormal_numbers_has_the_interval_of_their_difference() -> None:
    z = float(norm.ppf(0.975))
    first, second = (
        Estimate(v, v * math.exp(-z * s), v * math.exp(z * s))
        for v, s in ((3.0, 0.05), (2.0, 0.12))
    )
    found = ratio(first, second)
    assert found.value == pytest.approx(1.5)
    assert found.high == pytest.approx(1.5 * math.exp(z * 0.13))  # 5, 12, 13
    assert found.low == pytest.approx(1.5 * math.exp(-z * 0.13))


@pytest.mark.parametrize("yield_", [0.2, 0.7, 1.0])
@pytest.mark.parametrize(
    ("others", "quenching", "bulk"), [(0.3, 0.0, 1.0), (1.0, 2.0, 1.4), (0.0, 0.5, 0.8)]
)
def test_the_bounds_give_back_the_effective_enhancement_that_the_model_put_in(
    yield_: float, others: float, quenching: float, bulk: float
) -> None:
    point = {
        "lifetime": 12e-9,
        "quantum_yield": yield_,
        "other_modes": others,
        "quenching": quenching,
        "bulk_rate_ratio": bulk,
        "quality_factor": 300.0,
        "mode_volume": 0.05,
    }
    out = evaluate(point, ["device_lifetime", "effective_purcell", "rate_enhancement"])
    sharp = (Estimate(value, value, value) for value in (12e-9, float(out["device_lifetime"])))
    known = enhancement(
        *sharp, yield_, bulk_rate_ratio=bulk, other_modes=others, quenching=quenching
    )
    true = float(out["effective_purcell"])
    assert known.total.value == pytest.approx(float(out["rate_enhancement"]), rel=1e-12)
    assert known.effective == pytest.approx((true, true), rel=1e-9, abs=1e-9)
    sharp = (Estimate(value, value, value) for value in (12e-9, float(out["device_lifetime"])))
    open_ = enhancement(
        *sharp,
        (0.9 * yield_, yield_),
        bulk_rate_ratio=bulk,
        other_modes=(0.0, 1.0),
        quenching=(0.0, 3.0),
    )
    assert open_.effective[0] <= true <= open_.effective[1]
    assert open_.effective[0] >= 0


def test_the_first_slope_says_that_it_is_one() -> None:
    sharp = Estimate(1.0, 1.0, 1.0)
    slope = enhancement(sharp, sharp, 0.5, kind="first slope")
    mean = enhancement(sharp, sharp, 0.5)
    assert isinstance(slope, Enhancement)
    assert "first slope" in slope.words
    assert "mean" in mean.words


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"quantum_yield": 0.0}, "quantum_yield"),
        ({"quantum_yield": 1.2}, "quantum_yield"),
        ({"other_modes": (-1.0, 1.0)}, "other_modes"),
        ({"quenching": (2.0, 1.0)}, "quenching"),
        ({"bulk_rate_ratio": (0.0, 1.0)}, "bulk_rate_ratio"),
        ({"kind": "median"}, "median"),
        ({"bare": Estimate(0.0, 0.0, 1.0)}, "above 0"),
        ({"other_modes": (1.0, 2.0, 3.0)}, "range of two"),
    ],
)
def test_bad_ranges_are_refused(change, says) -> None:
    sharp = Estimate(1.0, 1.0, 1.0)
    with pytest.raises(InputError, match=says):
        enhancement(**{"bare": sharp, "device": sharp, "quantum_yield": 0.5} | change)


def test_an_end_that_the_data_left_open_stays_open() -> None:
    found = ratio(Estimate(1.0, 0.5, math.inf), Estimate(1.0, 0.9, 1.1))
    assert found.high == math.inf
    assert 0.4 < found.low < 0.5
    assert np.isfinite(found.low)
