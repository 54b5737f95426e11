"""Published devices against the model: what is predicted, what is missed, and that nothing is fitted."""

from __future__ import annotations

import math

import pytest

from explorer import Lines, evaluate
from explorer.catalogue import resonators
from explorer.prediction import (
    device_design,
    predicted,
    prediction_table,
    predictions,
    unpredicted,
)

ROWS = predictions()


def test_at_least_six_measured_devices_are_predicted() -> None:
    measured = [row for row in ROWS if row.meaning.startswith("measured")]
    assert len(measured) >= 6
    hit = [row for row in measured if row.inside]
    print(f"{len(hit)} of {len(measured)} measured enhancements inside the predicted range")
    assert hit, "a model that never meets a device says nothing"
    assert len(hit) < len(measured), "every device met: look for a fit"


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row.key)
def test_a_miss_says_why_and_a_hit_claims_no_reason(row) -> None:
    assert bool(row.reason) == (not row.inside)
    assert row.low <= row.high
    assert math.isfinite(row.predicted)


def test_every_published_enhancement_is_predicted_or_listed_with_what_is_missing() -> None:
    keys = {key for key, record in resonators().items() if record.enhancement}
    listed = unpredicted()
    assert {row.key for row in ROWS} | {row.key for row in listed} == keys
    assert not {row.key for row in ROWS} & {row.key for row in listed}
    assert all(row.missing for row in listed)
    table = prediction_table()
    assert len(table) == len(keys)


def test_the_ideal_is_the_printed_formula_by_hand() -> None:
    record = resonators()["open_fabry_perot"]
    volume = record.values["mode_volume"].value_si
    by_hand = 3 * record.values["quality_factor"].value_si / (4 * math.pi**2 * volume)
    assert predicted(record).predicted == pytest.approx(by_hand, rel=1e-12)


def test_a_share_of_the_alignment_is_a_line_that_holds_that_share() -> None:
    """The two ways to say that the resonator serves one line only agree."""
    point = dict(device_design(resonators()["nanobeam_snv_kuruma2021"]).point)
    point["spectrum"] = Lines([(0.4, 0.0, None)])
    one = evaluate(point, ["effective_purcell", "device_lifetime"])
    del point["spectrum"]
    point["dipole_alignment"] *= 0.4
    other = evaluate(point, ["effective_purcell", "device_lifetime"])
    assert one == pytest.approx(other, rel=1e-12)


def test_the_line_alone_is_as_its_source_defines_it() -> None:
    """(bulk/on − bulk/off)/share of Kuruma et al. (2021): the mode's rate over the line's own."""
    record = resonators()["nanobeam_snv_kuruma2021"]
    row = predicted(record)
    share = record.device["zero_phonon_share"].value_si
    point = dict(device_design(record).point)
    lifetime = point["lifetime"]
    point["dipole_alignment"] *= share
    on = evaluate(point, ["device_lifetime"])["device_lifetime"]
    off = evaluate({**point, "dipole_alignment": 0.0}, ["device_lifetime"])["device_lifetime"]
    radiative = point["quantum_yield"] * point["bulk_rate_ratio"]
    by_hand = (lifetime / on - lifetime / off) / share / radiative
    assert row.predicted == pytest.approx(by_hand, rel=1e-9)


def test_more_draws_move_a_range_little() -> None:
    record = resonators()["photonic_crystal_h1_liu2018"]
    few, many = predicted(record), predicted(record, 4096)
    assert few.low == pytest.approx(many.low, rel=0.06)
    assert few.high == pytest.approx(many.high, rel=0.06)
