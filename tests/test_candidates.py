"""Candidates: one batch gives what each design gives by itself; records are taken whole."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from explorer import Design, Requirement, Unknown, candidates
from explorer.advice import record_cautions
from explorer.candidates import NEEDED, SHOWN, side_name
from explorer.catalogue import emitters, optics, resonators
from explorer.combine import PARTS, combined, with_place, with_record
from explorer.scenario import first_question

DESIGN = first_question().design
TABLE = candidates(DESIGN)


def rows(count: int, table=TABLE) -> list:
    places = np.random.default_rng(7).choice(len(table), count, replace=False)
    return [table.iloc[int(place)] for place in places]


def test_every_emitter_meets_every_resonator_with_q_and_v_and_every_optic() -> None:
    placed = [key for key, record in resonators().items() if record.placed]
    assert len(placed) >= 20
    assert len(emitters()) >= 20
    assert len(optics()) >= 6
    # the design's own resonator comes with them, since it is no record's
    assert len(TABLE) == len(emitters()) * (len(placed) + 1) * len(optics())
    assert not TABLE.duplicated(["emitter", "resonator", "optic"]).any()


@pytest.mark.parametrize("scaled", [False, True])
def test_a_row_is_what_the_design_with_these_records_gives(scaled: bool) -> None:
    table = candidates(DESIGN, scaled=scaled)
    for row in rows(60, table):
        design = combined(DESIGN, row.emitter, row.resonator, row.optic, scaled=scaled)
        single = design.outcome(SHOWN)
        for name in SHOWN:
            assert row[name] == pytest.approx(single[name], rel=1e-9, nan_ok=True), name
        notes = {name for name, _ in record_cautions(design)}
        assert set(row.cautions) == set(design.cautions()) | notes


def test_margins_and_what_holds_back() -> None:
    for row in rows(80):
        found = []
        for entry in DESIGN.requirements:
            value = row[entry.quantity]
            up = entry.at_least is not None
            ratio = value / entry.limit if up else entry.limit / value
            margin = math.log(ratio) if ratio > 0 else math.nan
            found.append((margin, entry.quantity))
            assert row[f"meets_{side_name(entry)}"] == bool(entry.met(value))
        worst = min(found, key=lambda pair: pair[0])
        assert row.margin == pytest.approx(worst[0], rel=1e-9)
        assert row.held_back_by == worst[1]
        assert row.meets_all == (worst[0] >= 0)


def test_the_best_come_first_and_no_number_last() -> None:
    assert TABLE.meets_all.is_monotonic_decreasing
    margins = TABLE.margin.to_numpy()
    known = margins[~np.isnan(margins)]
    assert np.all(np.isnan(margins[known.size :]))
    assert np.all(np.diff(known) <= 0)


def test_a_resonator_stays_at_its_wavelength_unless_asked_to_be_scaled() -> None:
    own = combined(DESIGN, "terrylene_crystal", "micropillar", "")
    assert own.evaluation.value("resonance_wavelength") == pytest.approx(930e-9)
    moved = combined(DESIGN, "terrylene_crystal", "micropillar", "", scaled=True)
    assert moved.evaluation.value("resonance_wavelength") == pytest.approx(580e-9)
    for name in ("quality_factor", "mode_volume"):
        assert moved.point[name] == own.point[name]
    choice = {"emitters": ["terrylene_crystal"], "resonators": ["micropillar"], "optics": [""]}
    still, scaled = (candidates(DESIGN, **choice, scaled=one).iloc[0] for one in (False, True))
    assert still.spectral_overlap < scaled.spectral_overlap
    assert (bool(still.scaled), bool(scaled.scaled)) == (False, True)


def test_counts_of_memory_and_defaults() -> None:
    for row in rows(40):
        design = combined(DESIGN, row.emitter, row.resonator, row.optic)
        parts = [name for kind in ("emitter", "resonator", "optic") for name in PARTS[kind]]
        memory = [name for name in parts if design.origin(name).kind == "from memory"]
        assert row.from_memory == len(memory)
        known = {
            *design.point,
            *(["fast_linewidth"] if {"spectrum", "broadening"} & design.point.keys() else []),
        }
        needed = [name for names in NEEDED.values() for name in names]
        assert row.assumed == sum(name not in known for name in needed)


def test_the_own_part_is_a_candidate_where_it_is_no_records() -> None:
    assert "" in set(TABLE.resonator)
    assert "" not in set(TABLE.emitter)
    own = candidates(replace(DESIGN, emitter=""), optics=["single_mode_fibre"])
    assert "own emitter" in set(own.emitter_name)


def test_without_requirements_everything_passes_and_nothing_holds_back() -> None:
    free = candidates(replace(DESIGN, requirements=()), optics=["free_space_na_05"])
    assert free.meets_all.all()
    assert set(free.held_back_by) == {""}


def test_a_requirement_on_any_quantity_is_a_column() -> None:
    wanted = Requirement("device_lifetime", at_most=1e-9)
    table = candidates(replace(DESIGN, requirements=(wanted,)), optics=[""])
    assert (table.meets_device_lifetime_at_most == (table.device_lifetime <= 1e-9)).all()


def test_a_gain_is_over_the_side_that_each_optic_watches() -> None:
    """Oil and air optics in one batch: each gain as in the design by itself."""
    wish = replace(DESIGN, requirements=(Requirement("brightness_gain", at_least=3.0),))
    table = candidates(
        wish, emitters=["terrylene_crystal", "siv_bulk"], resonators=["micropillar", ""]
    )
    oil = table[table.optic == "free_space_oil_na_13"]
    assert 0 < len(oil) < len(table)
    for row in table.itertuples():
        single = combined(wish, row.emitter, row.resonator, row.optic).outcome(["brightness_gain"])
        assert row.brightness_gain == pytest.approx(
            single["brightness_gain"], rel=1e-9, nan_ok=True
        )


def test_an_unknown_key_is_refused() -> None:
    with pytest.raises(KeyError):
        candidates(DESIGN, emitters=["unobtainium"])


def test_a_record_replaces_its_whole_part_and_nothing_else() -> None:
    start = replace(
        DESIGN.with_values(biexciton_yield=0.3, filter_width=5e-9),
        unknowns={"lifetime": Unknown(1e-9, 2e-9)},
    )
    taken = with_record(start, "emitter", "nv_nanodiamond")
    assert "biexciton_yield" not in taken.point
    assert taken.point["filter_width"] == 5e-9
    assert taken.requirements == start.requirements
    assert taken.emitter == "nv_nanodiamond"
    record = emitters()["nv_nanodiamond"]
    assert {name: (one.low, one.high) for name, one in taken.unknowns.items()} == {
        name: ends for name, ends in record.ranges().items() if name in taken.point
    }
    assert taken.origin("lifetime").kind == record.values["lifetime"].checked
    own = with_record(taken, "emitter", "")
    assert own.point == taken.point
    assert own.emitter == ""


def test_a_place_takes_its_inputs_with_origin_and_range() -> None:
    placed = with_place(DESIGN, "nanobeam_snv_kuruma2021", ("mode_volume", "quality_factor"))
    assert placed.point["quality_factor"] == 3000
    record = resonators()["nanobeam_snv_kuruma2021"]
    assert placed.origin("quality_factor").kind == record.values["quality_factor"].checked
    assert placed.origin("quality_factor").source == "kuruma2021"
    assert placed.point["radiative_share"] == DESIGN.point["radiative_share"]


@pytest.mark.parametrize("kind", ["emitter", "resonator", "optic"])
def test_every_record_makes_a_design_with_its_ranges(kind: str) -> None:
    records = {"emitter": emitters, "resonator": resonators, "optic": optics}[kind]()
    for key in records:
        design = with_record(Design(), kind, key)
        assert set(design.unknowns) <= set(design.point)
        assert getattr(design, kind) == key
