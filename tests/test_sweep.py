"""Sweeps: rows from their index, the same from any executor, and files that survive interruptions."""

from __future__ import annotations

import errno
import itertools
import json
import math
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterable
from concurrent.futures import ThreadPoolExecutor
from decimal import Decimal
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from scipy.stats import qmc

from explorer import (
    CAUTIONS,
    Design,
    InputError,
    Lines,
    Samples,
    Spread,
    Unknown,
    combined,
    evaluate,
    save_design,
)
from explorer.__main__ import main
from explorer.atomic import write_whole
from explorer.exact import value_of
from explorer.inputs import INPUTS
from explorer.scenario import first_question
from explorer.sweep import (
    PlanError,
    Progress,
    SweepError,
    factorial,
    journal,
    process_pool,
    sampled,
    store,
    sweep,
    sweep_to,
)
from explorer.sweep.blocks import layout
from explorer.sweep.texts import number_text
from explorer.sweep_file import EXAMPLE, read_sweep_file
from explorer.units import to_si

REPOSITORY = Path(__file__).resolve().parent.parent
DESIGN = first_question().design
WANTED = ("rate_in_fibre", "g2_zero", "half_angle", "regime", "overlapping_pulses")
LINES = Lines([(0.7, 0.0, 2e-9), (0.3, 15e-9, None)])

GRID = factorial(
    DESIGN,
    pumping=["pulsed", "continuous"],
    spectrum={"one line": None, "two lines": LINES},
    quality_factor=np.geomspace(10, 1e4, 7),
    fast_linewidth=[1e-9, 20e-9],
    mode_volume=[0.1, 1.0, 10.0],
)


def same(one: Any, other: Any) -> bool:
    """Two tables with the same bits in every cell."""
    return list(one) == list(other) and all(
        one[name].dtype == other[name].dtype
        and (
            one[name].to_numpy().tobytes() == other[name].to_numpy().tobytes()
            if one[name].dtype.kind == "f"
            else one[name].equals(other[name])
        )
        for name in one
    )


def point_of(row: Any, base: dict[str, Any], inputs: Iterable[str]) -> dict[str, Any]:
    return base | {name: row[name] for name in inputs}


# Rows from their index


def test_rows_are_every_combination_the_last_fastest() -> None:
    table = sweep(GRID, WANTED)
    wanted = list(
        itertools.product(
            ["pulsed", "continuous"],
            ["one line", "two lines"],
            np.geomspace(10, 1e4, 7),
            [1e-9, 20e-9],
            [0.1, 1.0, 10.0],
        )
    )
    columns = ["pumping", "spectrum", "quality_factor", "fast_linewidth", "mode_volume"]
    assert list(table) == [*columns, *WANTED, "refused"]
    assert list(table[columns].itertuples(index=False, name=None)) == wanted
    assert len(table) == GRID.rows == 2 * 2 * 7 * 2 * 3


def test_a_row_is_what_its_point_gives() -> None:
    table = sweep(GRID, WANTED, chunk=11)
    for _, row in table.sample(40, random_state=1).iterrows():
        point = dict(DESIGN.point) | {"pumping": row.pumping}
        for name in ("quality_factor", "fast_linewidth", "mode_volume"):
            point[name] = row[name]
        if row.spectrum == "two lines":
            point["spectrum"] = LINES
        single = evaluate(point, WANTED)
        for name in WANTED[:3]:
            assert row[name] == pytest.approx(single[name], rel=1e-9)
        assert row.regime == single["regime"]
        assert row.overlapping_pulses == single["overlapping_pulses"]


def test_records_are_taken_as_candidates_take_them() -> None:
    emitters, resonators = ["", "siv_bulk", "dbt_crystal_3k"], ["", "micropillar"]
    for scaled in (False, True):
        plan = factorial(
            DESIGN,
            emitter=emitters,
            resonator=resonators,
            optic=["free_space_na_08"],
            scaled=scaled,
            repetition_rate=[1e6, 1e8],
        )
        for _, row in sweep(plan, WANTED[:2]).iterrows():
            design = combined(DESIGN, row.emitter, row.resonator, row.optic, scaled=scaled)
            single = design.with_values(repetition_rate=row.repetition_rate).outcome(WANTED[:2])
            for name in WANTED[:2]:
                assert row[name] == pytest.approx(single[name], rel=1e-9, nan_ok=True)


def test_all_stands_for_every_record_that_says_what_decides_and_every_word() -> None:
    plan = factorial({}, resonator="all", pumping="all")
    table = sweep(plan, "peak_purcell")
    assert set(table.pumping) == {"pulsed", "continuous"}
    assert "micropillar" in set(table.resonator)
    assert table.peak_purcell.notna().all()
    assert plan.rows == len(table) > 40


def test_an_axis_wins_over_a_record_and_a_record_over_the_base() -> None:
    plan = factorial(
        {"quality_factor": 7.0, "numerical_aperture": 0.3},
        resonator=["micropillar"],
        mode_volume=[2.0, 3.0],
    )
    table = sweep(plan, ["quality_factor", "numerical_aperture", "radiative_share"])
    single = combined(Design(), "", "micropillar", "")
    assert list(table.mode_volume) == [2.0, 3.0]
    assert set(table.quality_factor) == {single.point["quality_factor"]} != {7.0}
    assert set(table.numerical_aperture) == {0.3}


@given(
    st.lists(st.integers(1, 9), min_size=1, max_size=5),
    st.integers(1, 400),
)
def test_chunks_follow_each_other_and_cover_every_row_once(sizes: list[int], chunk: int) -> None:
    cut = layout(sizes, chunk)
    starts = [cut.start(index) for index in range(cut.count)] + [math.prod(sizes)]
    lengths = np.diff(starts)
    assert starts[0] == 0
    assert (lengths > 0).all()
    assert lengths.max() <= chunk
    inner = math.prod(sizes[cut.at + 1 :])
    for index in range(cut.count):
        outer, run = cut.place(index)
        assert len(outer) == cut.at
        assert (run.stop - run.start) * inner == lengths[index]


@pytest.mark.parametrize("chunk", [1, 5, 6, 40, 84, 90, 1000])
def test_the_rows_do_not_depend_on_the_chunk_and_no_block_mixes_groups(chunk: int) -> None:
    whole, parts = sweep(GRID, WANTED), sweep(GRID, WANTED, chunk=chunk)
    inputs = list(GRID.columns)
    assert same(whole[inputs], parts[inputs])
    for name in WANTED[:3]:
        np.testing.assert_allclose(parts[name], whole[name], rtol=1e-12)
    cut = GRID.layout(chunk)
    for index in range(cut.count):
        blocks = GRID.chunk(cut, index)
        assert sum(block.rows for block in blocks) <= chunk
        for block in blocks:
            assert block.fixed["pumping"] == dict(block.labels)["pumping"]
            assert ("spectrum" in block.fixed) == (dict(block.labels)["spectrum"] == "two lines")


def test_a_plan_of_many_more_rows_than_memory_is_made_and_cut_at_once() -> None:
    axes = {
        name: np.linspace(0.1, 0.9, 1000)
        for name in ("quantum_yield", "upward_share", "optics_transmission", "bright_share")
    }
    plan = factorial({}, **axes)
    cut = plan.layout(65536)
    assert plan.rows == 10**12
    (block,) = plan.chunk(cut, cut.count - 1)
    assert cut.start(cut.count - 1) + block.rows == plan.rows
    assert block.fixed["upward_share"] == 0.9


# Random rows


def test_draws_are_those_of_the_sequence_even_on_the_scale_of_the_input() -> None:
    """Against scipy's sequence and the quantile functions of even distributions, worked out here."""
    ranges = {"quality_factor": (10.0, 1e4), "quantum_yield": (0.2, 0.9)}
    plan = sampled(DESIGN, 512, 11, ranges, pumping=["pulsed", "continuous"])
    table = sweep(plan, "rate_in_fibre", chunk=100)
    points = qmc.Sobol(2, scramble=True, rng=11).random(512)
    for _, part in table.groupby("pumping"):
        np.testing.assert_allclose(
            part.quality_factor, stats.loguniform(10, 1e4).ppf(points[:, 0]), rtol=1e-12
        )
        np.testing.assert_allclose(
            part.quantum_yield, stats.uniform(0.2, 0.7).ppf(points[:, 1]), rtol=1e-12
        )
    assert list(table.pumping) == ["pulsed"] * 512 + ["continuous"] * 512


@pytest.mark.parametrize("chunk", [1, 7, 64, 99])
def test_draws_do_not_depend_on_the_chunk(chunk: int) -> None:
    plan = sampled(
        DESIGN,
        100,
        3,
        {"quality_factor": Unknown(10, 1e4)},
        {"mode_volume": Spread("lognormal", 0.2), "lateral_offset": Spread("radial", 20e-9)},
    )
    whole, parts = sweep(plan, "rate_in_fibre"), sweep(plan, "rate_in_fibre", chunk=chunk)
    inputs = ["quality_factor", "mode_volume", "lateral_offset"]
    np.testing.assert_array_equal(whole[inputs], parts[inputs])
    np.testing.assert_allclose(parts.rate_in_fibre, whole.rate_in_fibre, rtol=1e-12)


def test_another_seed_gives_other_rows() -> None:
    one, other = (
        sweep(sampled({}, 64, seed, {"quality_factor": (10, 100)}), "peak_purcell")
        for seed in (1, 2)
    )
    assert not np.isin(one.quality_factor, other.quality_factor).any()


def test_scatter_has_its_width_about_the_base_and_its_correlation() -> None:
    """Standard deviations and a correlation of normal scores, as they are defined."""
    plan = sampled(
        {"quality_factor": 1000.0, "mode_volume": 2.0, "quantum_yield": 0.5},
        2**14,
        5,
        scatter={
            "quality_factor": Spread("lognormal", 0.1),
            "mode_volume": Spread("normal", 0.05),
            "lateral_offset": Spread("radial", 30e-9),
            "quantum_yield": Spread("normal", 0.0),
        },
        correlation={"quality_factor|mode_volume": 0.6},
    )
    table = sweep(plan, "peak_purcell")
    scores = np.log(table.quality_factor / 1000) / 0.1, (table.mode_volume - 2) / 0.05
    for score in scores:
        assert score.mean() == pytest.approx(0, abs=0.01)
        assert score.std() == pytest.approx(1, rel=0.01)
    assert np.corrcoef(*scores)[0, 1] == pytest.approx(0.6, abs=0.01)
    # The distance of a plane's two normal offsets is Rayleigh distributed.
    assert table.lateral_offset.mean() == pytest.approx(30e-9 * math.sqrt(math.pi / 2), rel=0.01)
    assert set(table.quantum_yield) == {0.5}


# Tables that somebody has


def test_a_table_keeps_its_order_and_its_index() -> None:
    plan = factorial(
        {},
        emitter=["siv_bulk", "nv_bulk"],
        pumping=["pulsed", "continuous"],
        quality_factor=[10.0, 100.0, 1000.0],
        mode_volume=[0.1, 1.0],
    )
    whole = sweep(plan, WANTED)
    inputs = whole[list(plan.columns)].sample(frac=1, random_state=4)
    found = sweep(inputs, WANTED, chunk=4)
    assert list(found.index) == list(inputs.index)
    assert found[list(plan.columns)].equals(inputs)
    back = found.sort_index()
    for name in WANTED[:3]:
        np.testing.assert_allclose(back[name], whole[name], rtol=1e-12)
    assert back.regime.equals(whole.regime)


def test_columns_of_whole_values_group_the_rows_and_missing_ones_are_not_given() -> None:
    samples = Samples([-10e-9, 0.0, 10e-9], [0.0, 1.0, 0.0])
    columns = {
        "spectrum": [LINES, None, samples, LINES, None],
        "emitter": [None, "", None, None, "siv_bulk"],
        "quality_factor": [10.0, 100.0, 10.0, 1000.0, 5.0],
    }
    table = sweep(columns, ["spectral_overlap"], base=DESIGN)
    # A column of whole values wins over the records beside it, a missing one too.
    silicon = {
        k: v for k, v in combined(DESIGN, "siv_bulk", "", "").point.items() if k != "spectrum"
    }
    for index, spectrum in enumerate(columns["spectrum"]):
        base = silicon if index == 4 else dict(DESIGN.point)
        point = base | {"quality_factor": columns["quality_factor"][index]}
        point |= {} if spectrum is None else {"spectrum": spectrum}
        single = evaluate(point, ["spectral_overlap"])["spectral_overlap"]
        assert table.spectral_overlap[index] == pytest.approx(single, rel=1e-12)


def test_a_table_of_records_alone() -> None:
    table = sweep({"emitter": ["siv_bulk", "nv_bulk", "siv_bulk"]}, ["device_lifetime"])
    assert table.device_lifetime[0] == table.device_lifetime[2] != table.device_lifetime[1]


def test_missing_numbers_of_a_table_refuse_their_rows_alone() -> None:
    column = pd.array([10.0, None, 30.0], dtype="Float64")
    table = sweep(pd.DataFrame({"quality_factor": column}), ["peak_purcell", "low_quality"])
    assert list(table.refused) == ["", "quality_factor", ""]
    assert table.peak_purcell.isna().tolist() == [False, True, False]
    assert table.attrs["refused"] == 1
    assert "not-a-number" in table.attrs["reason"]


# Rows that cannot be


def test_rows_whose_inputs_cannot_go_together_stay_without_number() -> None:
    plan = factorial(
        {}, medium_index=[1.0, 1.5], numerical_aperture=[0.5, 1.2, 0.9], quality_factor=[10.0, 20.0]
    )
    table = sweep(plan, [*WANTED, "resonance_wavelength"])
    bad = (table.medium_index == 1.0) & (table.numerical_aperture == 1.2)
    assert list(table.refused) == ["numerical_aperture" if row else "" for row in bad]
    assert table.attrs["refused"] == bad.sum() == 2
    with pytest.raises(InputError) as caught:
        evaluate({"numerical_aperture": 1.2}, ["g2_zero"])
    assert table.attrs["reason"] == str(caught.value)
    assert table.loc[bad, [*WANTED[:3], "resonance_wavelength"]].isna().all(axis=None)
    assert (table.loc[bad, "regime"] == "").all()
    assert table.loc[bad, "overlapping_pulses"].isna().all()
    for _, row in table[~bad].iterrows():
        point = {name: row[name] for name in plan.columns}
        assert row.rate_in_fibre == pytest.approx(
            evaluate(point, ["rate_in_fibre"])["rate_in_fibre"], rel=1e-12
        )


#: Columns whose ranges depend on each other, far enough apart to be refused now and then.
JOINT: dict[str, Callable[[np.random.Generator, int], Any]] = {
    "numerical_aperture": lambda random, n: random.uniform(0.3, 1.9, n),
    "medium_index": lambda random, n: random.choice([1.0, 1.3, 1.52], n),
    "emission_wavelength": lambda random, n: random.uniform(150e-9, 900e-9, n),
    "fast_linewidth": lambda random, n: random.uniform(0, 450e-9, n),
    "biexciton_shift": lambda random, n: random.uniform(-400e-9, 400e-9, n),
    "temperature": lambda random, n: random.uniform(1, 1100, n),
}


@pytest.mark.parametrize(
    ("fixed", "joint"),
    [
        ({}, ["numerical_aperture", "medium_index"]),
        ({}, ["emission_wavelength", "fast_linewidth", "biexciton_shift"]),
        ({"reference_side": "air", "medium_index": 1.6}, ["numerical_aperture"]),
        ({"spectrum": LINES}, ["emission_wavelength", "fast_linewidth", "numerical_aperture"]),
        ({"spectrum": Lines([(1.0, 60e-9, 300e-9)])}, ["emission_wavelength", "temperature"]),
        ({"emitter": "siv_bulk"}, ["temperature", "numerical_aperture"]),
    ],
    ids=["aperture", "widths", "side", "lines", "broad line", "law"],
)
def test_a_row_is_refused_exactly_where_evaluate_refuses_it(
    fixed: dict[str, Any], joint: list[str]
) -> None:
    random = np.random.default_rng(8)
    table: Any = pd.DataFrame({name: JOINT[name](random, 120) for name in joint})
    whole = {name: value for name, value in fixed.items() if name != "emitter"}
    base = combined(Design(), fixed.get("emitter", ""), "", "").point | whole
    found = sweep(table, ["device_lifetime", "collected_share"], base=base, chunk=50)
    refused = 0
    for _, row in found.iterrows():
        point = {**base, **{name: row[name] for name in joint}}
        if row.refused:
            refused += 1
            with pytest.raises(InputError) as caught:
                evaluate(point, [])
            assert row.refused == caught.value.name or len(joint) > 1
            assert np.isnan(row.device_lifetime)
        else:
            single = evaluate(point, ["device_lifetime", "collected_share"])
            assert row.device_lifetime == pytest.approx(single["device_lifetime"], rel=1e-9)
            assert row.collected_share == pytest.approx(single["collected_share"], rel=1e-9)
    assert 0 < refused < 120
    assert found.attrs["refused"] == refused
    assert found.attrs["reason"]


def test_a_group_that_cannot_be_is_refused_as_a_whole() -> None:
    plan = factorial({"numerical_aperture": 1.3}, medium_index=[1.0, 1.5], pumping="all")
    table = sweep(plan, "collected_share")
    assert list(table.refused) == ["numerical_aperture", ""] * 2
    drawn = sampled(
        {"numerical_aperture": 1.3}, 4, 0, scatter={"quality_factor": Spread("normal", 3.0)}
    )
    table = sweep(drawn, "collected_share")
    assert list(table.refused) == ["numerical_aperture"] * 4
    assert table[["quality_factor", "collected_share"]].isna().all(axis=None)


def test_not_a_number_stands_where_the_model_has_none() -> None:
    """As `evaluate` marks it: a coupling beyond the resonator's own frequency has no number."""
    columns = {"mode_volume": [1e-8, 1.0], "lifetime": [1e-12, 1e-9], "quality_factor": [1e4, 10.0]}
    table = sweep(columns, ["rate_enhancement", "regime"])
    single = evaluate({name: np.array(values) for name, values in columns.items()}, ["regime"])
    assert np.isnan(table.rate_enhancement[0])
    assert not np.isnan(table.rate_enhancement[1])
    assert list(table.regime) == list(single["regime"])
    assert list(table.refused) == ["", ""]


# Executors


class Odd:
    """A `map` that answers at once, as some pools do."""

    def map(self, function: Callable[[Any], Any], tasks: Iterable[Any]) -> list[Any]:
        return [function(task) for task in tasks]


@pytest.mark.parametrize("window", [2, 5, 64])
def test_any_executor_gives_the_same_bits(window: int, tmp_path: Path) -> None:
    plain = sweep(GRID, WANTED, chunk=13)
    sweep_to(tmp_path / "plain.csv", GRID, WANTED, chunk=13)
    with ThreadPoolExecutor(3) as threads:
        for executor in (threads, Odd()):
            assert same(sweep(GRID, WANTED, executor, chunk=13, window=window), plain)
            path = tmp_path / "other.csv"
            sweep_to(path, GRID, WANTED, executor, chunk=13, window=window, restart=True)
            assert path.read_bytes() == (tmp_path / "plain.csv").read_bytes()


def test_a_pool_of_processes_gives_the_same_bits() -> None:
    with process_pool(2) as pool:
        assert same(sweep(GRID, WANTED, pool, chunk=13), sweep(GRID, WANTED, chunk=13))


def test_no_more_than_a_window_is_with_the_executor(tmp_path: Path) -> None:
    handed, stored = 0, 0

    class Counting(Odd):
        def map(self, function: Callable[[Any], Any], tasks: Iterable[Any]) -> list[Any]:
            nonlocal handed
            found = super().map(function, tasks)
            handed += len(found)
            assert handed - stored <= 6
            return found

    def count(_: Progress) -> None:
        nonlocal stored
        stored += 1

    sweep_to(tmp_path / "a.csv", GRID, WANTED, Counting(), chunk=4, window=6, progress=count)
    assert handed == stored == GRID.layout(4).count


def failing(after: int, error: BaseException) -> Any:
    """An executor that fails at a chunk."""
    done = 0

    def work(function: Callable[[Any], Any], tasks: Iterable[Any]) -> Any:
        nonlocal done
        for task in tasks:
            done += 1
            if done > after:
                raise error
            yield function(task)

    return SimpleNamespace(map=work)


@pytest.mark.parametrize(
    ("error", "words"),
    [
        (RuntimeError("lost"), "RuntimeError: lost"),
        (MemoryError(), "MemoryError: no reason given"),
        (OSError(errno.ENOSPC, "No space left on device"), "no space left on device"),
        (type("CancelledError", (Exception,), {})(), "its cluster are gone"),
    ],
)
def test_an_executor_that_fails_stops_in_one_sentence_and_is_gone_on_with(
    error: Exception, words: str, tmp_path: Path
) -> None:
    path = tmp_path / "a.csv"
    sweep_to(tmp_path / "b.csv", GRID, WANTED, chunk=13)
    with pytest.raises(SweepError) as caught:
        sweep_to(path, GRID, WANTED, failing(5, error), chunk=13)
    text = str(caught.value)
    assert words in text
    assert "'a.csv'" in text
    assert "\n" not in text
    kept = path.read_bytes()
    assert kept.count(b"\n") == caught.value.rows + 1
    written = sweep_to(path, GRID, WANTED, chunk=13)
    assert written.new == GRID.rows - caught.value.rows
    assert path.read_bytes() == (tmp_path / "b.csv").read_bytes()
    with pytest.raises(SweepError, match="stopped after"):
        sweep(GRID, WANTED, failing(3, error), chunk=13)


# Files


@given(st.floats(allow_nan=False, allow_infinity=False), st.integers(-15, 15))
def test_a_number_is_written_as_the_shifted_decimal(value: float, power: int) -> None:
    text = number_text(value, power)
    assert Decimal(text) == Decimal(repr(value)).scaleb(power)
    assert float(Decimal(text).scaleb(-power)) == value


def test_numbers_that_are_none() -> None:
    assert [number_text(value, 9) for value in (math.nan, math.inf, -math.inf)] == [
        "",
        "inf",
        "-inf",
    ]
    assert [number_text(value, 9) for value in (6.5e-7, 3e-9, 1.25e-8, -4e-8)] == [
        "650",
        "3",
        "12.5",
        "-40",
    ]
    assert [number_text(value) for value in (0.0, 100.0, 1e22, 0.00012, 1e-7)] == [
        "0",
        "100",
        "1e22",
        "0.00012",
        "1e-7",
    ]


FILES = [
    GRID,
    sampled(DESIGN, 90, 2, {"fast_linewidth": (1e-9, 50e-9), "lifetime": (1e-9, 30e-9)}),
    factorial(
        DESIGN,
        optic=["", "free_space_oil_na_13"],
        filter_width=[5e-9, math.inf],
        numerical_aperture=[0.5, 1.2],
        repetition_rate=[1e6, 80e6],
        emission_wavelength=[6.5e-7, 6.3281e-7],
    ),
]


@pytest.mark.parametrize("plan", FILES, ids=["grid", "draws", "records"])
@pytest.mark.parametrize("kind", ["csv", "parquet"])
def test_a_file_holds_the_table(plan: Any, kind: str, tmp_path: Path) -> None:
    """Text to the last bit; Parquet numbers in the unit of the page to the nearest number there."""
    path = tmp_path / f"table.{kind}"
    wanted = [*WANTED, "resonance_wavelength", "reference_side"]
    written = sweep_to(path, plan, wanted, chunk=29)
    table = sweep(plan, wanted, chunk=29)
    parquet = kind == "parquet"
    read = pd.read_parquet(path) if parquet else pd.read_csv(path, dtype=str, na_filter=False)
    assert len(read) == plan.rows == written.rows == written.new
    assert (written.refused, written.reason) == (table.attrs["refused"], table.attrs["reason"])
    for name, title in zip(table, read, strict=True):
        unit = INPUTS[name].shown if name in INPUTS else title.partition(" (")[2][:-1] or "1"
        assert title == (name if unit == "1" else f"{name} ({unit})")
        if table[name].dtype.kind == "f":
            shown = INPUTS[name].shown if name in INPUTS else "1"
            if parquet:
                back = [to_si(value, shown) for value in read[title].tolist()]
                tolerance = 0.0 if shown == "1" else 3e-16
            else:
                back = [value_of(Decimal(text or "nan"), shown) for text in read[title]]
                tolerance = 0.0
            np.testing.assert_allclose(back, table[name], rtol=tolerance, atol=0)
        elif name in CAUTIONS:
            words = {True: "true", False: "false"}
            cells = [words.get(cell, "") if parquet else cell for cell in read[title]]
            assert cells == [words.get(cell, "") for cell in table[name]]
        else:
            assert list(read[title]) == list(table[name])


def test_labels_that_hold_separators_are_quoted(tmp_path: Path) -> None:
    labels = ["a, b", 'say "line"', "two\nlines", "plain"]
    plan = factorial({}, spectrum=dict.fromkeys(labels, LINES), quality_factor=[10.0, 20.0])
    sweep_to(tmp_path / "a.csv", plan, ["peak_purcell"])
    read = pd.read_csv(tmp_path / "a.csv")
    assert list(read.spectrum) == [label for label in labels for _ in range(2)]


def interrupted(path: Path, plan: Any, after: int, **more: Any) -> None:
    """A sweep that is stopped behind a chunk, as Ctrl-C would."""
    count = 0

    def stop(_: Progress) -> None:
        nonlocal count
        count += 1
        if count == after:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        sweep_to(path, plan, WANTED, progress=stop, **more)


def content(path: Path) -> dict[str, bytes]:
    """Everything of a table, its journal too."""
    files = path.rglob("*") if path.is_dir() else [path, path.with_name(f"{path.name}.sweep.json")]
    return {file.name.replace(path.name, "table"): file.read_bytes() for file in files}


@pytest.mark.parametrize("kind", ["csv", "parquet"])
def test_an_interrupted_sweep_goes_on_to_the_same_bytes(kind: str, tmp_path: Path) -> None:
    whole, path = tmp_path / f"whole.{kind}", tmp_path / f"part.{kind}"
    sweep_to(whole, GRID, WANTED, chunk=10)
    interrupted(path, GRID, 3, chunk=10)
    interrupted(path, GRID, 2)
    seen: list[Progress] = []
    written = sweep_to(path, GRID, WANTED, progress=seen.append)  # keeps the chunk it began with
    assert content(path) == content(whole)
    assert written.new == GRID.rows - GRID.layout(10).start(5)
    assert seen[-1].rows == seen[-1].total == GRID.rows
    assert seen[-1].remaining == 0
    assert seen[0].new < seen[0].rows
    again = sweep_to(path, GRID, WANTED)
    assert (again.new, again.rows) == (0, GRID.rows)


@pytest.mark.parametrize("kind", ["csv", "parquet"])
def test_what_a_killed_run_leaves_half_written_is_cut_off(kind: str, tmp_path: Path) -> None:
    whole, path = tmp_path / f"whole.{kind}", tmp_path / f"part.{kind}"
    sweep_to(whole, GRID, WANTED, chunk=10)
    interrupted(path, GRID, 3, chunk=10)
    if kind == "csv":
        with path.open("ab") as stream:
            stream.write(b"pulsed,one line,10,1,0.1,12345")
        left = tmp_path / ".part.csv.sweep.json.0badc0de"
        left.write_text("{")
    else:
        (path / "part-000000003.parquet").write_bytes(b"PAR1 of a chunk that nobody counted")
        (path / "part-000000900.parquet").write_bytes(b"PAR1 of a table that was replaced")
        (path / ".part-000000004.parquet.0badc0de").write_bytes(b"PAR1")
        left = path / "._sweep.json.0badc0de"
        left.write_text("{")
    sweep_to(path, GRID, WANTED)
    assert not left.exists()
    assert content(path) == content(whole)


def test_another_plan_is_refused_unless_a_restart_is_asked_for(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    other = factorial(DESIGN, quality_factor=[10.0, 20.0])
    interrupted(path, GRID, 2, chunk=10)
    before = content(path)
    for plan, wanted in ((other, WANTED), (GRID, WANTED[:2])):
        with pytest.raises(PlanError, match="another plan"):
            sweep_to(path, plan, wanted)
        assert content(path) == before
    sweep_to(path, other, WANTED, restart=True)
    sweep_to(tmp_path / "b.csv", other, WANTED)
    assert content(path) == content(tmp_path / "b.csv")


def test_the_fingerprint_sees_every_part_of_a_plan() -> None:
    samples = [Samples([0.0, 1e-9], [1.0, count]) for count in (1.0, 2.0)]
    plans = [
        factorial({}, quality_factor=[1.0, 2.0]),
        factorial({}, quality_factor=[1.0, 2.5]),
        factorial({}, mode_volume=[1.0, 2.0]),
        factorial({"lifetime": 1e-9}, quality_factor=[1.0, 2.0]),
        factorial({}, emitter=["siv_bulk"]),
        factorial({}, emitter=["nv_bulk"]),
        *(factorial({}, spectrum=[one]) for one in samples),
        *(sampled({}, 8, seed, {"quality_factor": (1, 2)}) for seed in (0, 1)),
        sampled({}, 8, 0, {"quality_factor": (1, 3)}),
        sampled({}, 8, 0, scatter={"quality_factor": Spread("normal", 1)}),
        sampled({}, 8, 0, scatter={"quality_factor": Spread("normal", 2)}),
        factorial({}, resonator=["micropillar"]),
        factorial({}, resonator=["micropillar"], scaled=True),
    ]
    prints = [plan.fingerprint(WANTED) for plan in plans]
    assert len(set(prints)) == len(plans)
    assert plans[0].fingerprint(WANTED[:1]) != prints[0]
    again = factorial({}, quality_factor=np.array([1.0, 2.0]))
    assert again.fingerprint(WANTED) == prints[0]


def test_a_fingerprint_is_the_same_in_another_process() -> None:
    code = (
        "from explorer import Samples\nfrom explorer.sweep import factorial\n"
        "plan = factorial({'lifetime': 1e-9}, emitter=['siv_bulk'], "
        "spectrum=[Samples([0.0, 1e-9], [1.0, 2.0])], quality_factor=[1.0, 2.0])\n"
        "print(plan.fingerprint(['g2_zero']))"
    )
    found = {
        subprocess.run(
            [sys.executable, "-c", code],
            capture_output=True,
            text=True,
            check=True,
            cwd=REPOSITORY,
            env=os.environ | {"PYTHONHASHSEED": seed},
        ).stdout
        for seed in ("1", "2")
    }
    assert len(found) == 1


def refused(path: Path, *parts: str, plan: Any = GRID, **more: Any) -> str:
    """The sentence with which a sweep to a path is refused."""
    with pytest.raises(PlanError) as caught:
        sweep_to(path, plan, WANTED, **more)
    text = str(caught.value)
    for part in parts:
        assert part in text, text
    assert "\n" not in text
    return text


def test_files_that_are_no_begun_sweep_are_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("mine")
    refused(path, "'a.csv'", "is there already", "restart")
    assert path.read_text() == "mine"
    folder = tmp_path / "a.parquet"
    folder.mkdir()
    (folder / "diary.txt").write_text("mine")
    for restart in (False, True):
        refused(folder, "'diary.txt'", restart=restart)
    assert (folder / "diary.txt").read_text() == "mine"
    path.write_text("")  # an empty file is nobody's
    assert sweep_to(path, GRID, WANTED).new == GRID.rows


def test_a_begun_table_that_was_changed_is_refused(tmp_path: Path) -> None:
    path, journal = tmp_path / "a.csv", tmp_path / "a.csv.sweep.json"
    interrupted(path, GRID, 3, chunk=10)
    kept, state = path.read_bytes(), journal.read_text()
    path.write_bytes(kept.replace(b"\n", b"\r\n"))
    refused(path, "has been changed")
    assert path.read_bytes() == kept.replace(b"\n", b"\r\n")
    path.write_bytes(kept[:-5])
    refused(path, "has been changed")
    path.write_bytes(kept)
    for text, part in (
        ("{", "cannot be read"),
        ("{}", "no journal"),
        (state.replace('"done": 3', '"done": -3'), "has been changed"),
        (state.replace('"tool": "', '"tool": "9.'), "finish the table with that one"),
    ):
        journal.write_text(text)
        refused(path, part, "restart")
    journal.write_text(state)
    assert sweep_to(path, GRID, WANTED).rows == GRID.rows
    folder = tmp_path / "a.parquet"
    interrupted(folder, GRID, 3, chunk=10)
    (folder / "part-000000001.parquet").unlink()
    refused(folder, "'part-000000001.parquet'", "is gone")


def test_two_sweeps_do_not_write_one_table(tmp_path: Path) -> None:
    for kind in ("csv", "parquet"):
        path = tmp_path / f"a.{kind}"

        def second(_: Progress, path: Path = path) -> None:
            refused(path, "another sweep is writing")

        sweep_to(path, GRID, WANTED, progress=second, chunk=100)


def test_a_full_disk_stops_in_one_sentence_and_keeps_whole_chunks(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The system takes part of a chunk, then nothing more."""
    sweep_to(tmp_path / "b.csv", GRID, WANTED, chunk=10)
    left = 2500
    write = os.write

    def filling(handle: int, data: Any) -> int:
        nonlocal left
        if len(data) > left:
            if not left:
                raise OSError(errno.ENOSPC, "No space left on device")
            data = data[:left]
        left -= len(data)
        return write(handle, data)

    path = tmp_path / "a.csv"
    with monkeypatch.context() as patch:
        patch.setattr(os, "write", filling)
        with pytest.raises(
            SweepError, match="no space left on device; these rows are kept"
        ) as caught:
            sweep_to(path, GRID, WANTED, chunk=10)
    assert caught.value.rows > 0
    assert path.read_bytes().count(b"\n") == caught.value.rows + 1
    assert path.read_bytes()[-1:] == b"\n"
    sweep_to(path, GRID, WANTED)
    assert content(path) == content(tmp_path / "b.csv")


@pytest.mark.parametrize("kind", ["csv", "parquet"])
@pytest.mark.parametrize("often", [0.0, 1e9], ids=["each chunk", "at the end"])
def test_a_journal_that_cannot_be_written_keeps_what_the_last_one_says(
    kind: str, often: float, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path, whole = tmp_path / f"a.{kind}", tmp_path / f"b.{kind}"
    sweep_to(whole, GRID, WANTED, chunk=10)
    written = 0

    def full(text: str, target: Path) -> None:
        nonlocal written
        written += 1
        if written > 4:
            raise OSError(errno.ENOSPC, "No space left on device")
        write_whole(text, target)

    with monkeypatch.context() as patch:
        patch.setattr(journal, "write_whole", full)
        patch.setattr(store, "SURE", often)
        if often:
            interrupted(path, GRID, 4, chunk=10)
            written = 4
        with pytest.raises(SweepError, match="no space left on device; these rows") as caught:
            sweep_to(path, GRID, WANTED, chunk=10)
    assert caught.value.rows == GRID.layout(10).start(4 if often else 3)
    sweep_to(path, GRID, WANTED)
    assert content(path) == content(whole)


# Bad input


def bad(text: str, call: Callable[[], Any]) -> Any:
    return pytest.param(text, call, id=text[:40])


GOOD: dict[str, Any] = {"quality_factor": [10.0, 20.0]}


@pytest.mark.parametrize(
    ("text", "call"),
    [
        bad("'quality' is no input", lambda: factorial({}, quality=[1.0])),
        bad("'quality' is no input; the inputs", lambda: factorial({"quality": 1.0}, **GOOD)),
        bad("'cavity' is no input; a column", lambda: sweep({"cavity": [1.0]}, "g2_zero")),
        bad("'rate' is no quantity", lambda: sweep(factorial({}, **GOOD), ["rate"])),
        bad("nothing is wanted", lambda: sweep(factorial({}, **GOOD), [])),
        bad("wanted = None is no list", lambda: sweep(factorial({}, **GOOD), None)),
        bad("spectrum is neither", lambda: sweep(factorial({}, **GOOD), "spectrum")),
        bad("'gold' is no emitter of", lambda: factorial({}, emitter=["gold"])),
        bad("'gold' is no resonator of", lambda: sweep({"resonator": ["gold"]}, "g2_zero")),
        bad("the axis quality_factor is empty", lambda: factorial({}, quality_factor=[])),
        bad("the axis quality_factor is empty", lambda: factorial({}, quality_factor=np.array([]))),
        bad("the axis pumping is empty", lambda: factorial({}, pumping=[])),
        bad("the axis spectrum is empty", lambda: factorial({}, spectrum={})),
        bad("the axis emitter is empty", lambda: factorial({}, emitter=[])),
        bad("takes a list of values, not 5", lambda: factorial({}, quality_factor=5)),
        bad("takes a list of values, not 'pulsed'", lambda: factorial({}, pumping="pulsed")),
        bad("one-dimensional", lambda: factorial({}, quality_factor=np.ones((2, 2)))),
        bad("'high'] is not a number", lambda: factorial({}, quality_factor=[1.0, "high"])),
        bad("quality_factor is not a regular", lambda: factorial({}, quality_factor=[[1.0], [2.0, 3.0]])),
        bad("[1] = 0.5 is outside its range", lambda: factorial({}, quality_factor=[1.0, 0.5])),
        bad("[0] = not-a-number is outside", lambda: factorial({}, quality_factor=[math.nan])),
        bad("[0] = 2.5 is outside its range: above 0", lambda: factorial({}, numerical_aperture=[2.5])),
        bad("[0] = 7000 nm is outside", lambda: factorial({}, fast_linewidth=[7e-6])),
        bad("pumping = 'never' is not one of", lambda: factorial({}, pumping=["never"])),
        bad("spectrum = 'red' is no Lines or", lambda: factorial({}, spectrum=["red"])),
        bad("a plan needs an axis", lambda: factorial({})),
        bad("the base is a point or a Design", lambda: factorial(3, **GOOD)),
        bad("one number; give several", lambda: factorial({"lifetime": [1e-9, 2e-9]}, **GOOD)),
        bad("lifetime = 1e+24 ns", lambda: factorial({"lifetime": 1e15}, **GOOD)),
        bad("count is a whole number", lambda: sampled({}, 0, 0, {"lifetime": (1e-9, 2e-9)})),
        bad("count is a whole number", lambda: sampled({}, 1.5, 0, {"lifetime": (1e-9, 2e-9)})),
        bad("seed is a whole number", lambda: sampled({}, 4, -1, {"lifetime": (1e-9, 2e-9)})),
        bad("runs backwards: 2 ns to 1 ns", lambda: sampled({}, 4, 0, {"lifetime": (2e-9, 1e-9)})),
        bad("a low and a high number", lambda: sampled({}, 4, 0, {"lifetime": 1e-9})),
        bad("a low and a high number", lambda: sampled({}, 4, 0, {"lifetime": "12"})),
        bad("is not a finite number", lambda: sampled({}, 4, 0, {"lifetime": (1e-9, math.inf)})),
        bad("outside its range", lambda: sampled({}, 4, 0, {"quantum_yield": (0.5, 1.5)})),
        bad("ranges names 'age'", lambda: sampled({}, 4, 0, {"age": (1, 2)})),
        bad("pumping is no number", lambda: sampled({}, 4, 0, {"pumping": (1, 2)})),
        bad("ranges = 4 is no mapping", lambda: sampled({}, 4, 0, 4)),
        bad("nothing is drawn", lambda: sampled({}, 4)),
        bad("scatter of lifetime is no Spread", lambda: sampled({}, 4, 0, scatter={"lifetime": 1e-9})),
        bad("a range and a scatter", lambda: sampled({}, 4, 0, {"lifetime": (1e-9, 2e-9)}, {"lifetime": Spread("normal", 1e-9)})),
        bad("mode_volume is a number: in a sampled", lambda: sampled({}, 4, 0, {"lifetime": (1e-9, 2e-9)}, mode_volume=[1.0])),
        bad("a correlation names mode_volume", lambda: sampled({}, 4, 0, scatter={"lifetime": Spread("normal", 1e-9)}, correlation={"lifetime|mode_volume": 0.5})),
        bad("chunk is a whole number", lambda: sweep(factorial({}, **GOOD), "g2_zero", chunk=-1)),
        bad("chunk is a whole number", lambda: sweep(factorial({}, **GOOD), "g2_zero", chunk=2.0)),
        bad("window is a whole number", lambda: sweep(factorial({}, **GOOD), "g2_zero", window=0)),
        bad("has no map", lambda: sweep(factorial({}, **GOOD), "g2_zero", 4)),
        bad("in place of results", lambda: sweep(factorial({}, **GOOD), "g2_zero", SimpleNamespace(map=lambda _, tasks: [None for _ in tasks]))),
        bad("leave base out", lambda: sweep(factorial({}, **GOOD), "g2_zero", base={})),
        bad("a table is a plan", lambda: sweep(7, "g2_zero")),
        bad("the table has no rows", lambda: sweep({"lifetime": []}, "g2_zero")),
        bad("the table has no rows", lambda: sweep({}, "g2_zero")),
        bad("do not fit", lambda: sweep({"lifetime": [1e-9], "mode_volume": [1.0, 2.0]}, "g2_zero")),
        bad("the column lifetime twice", lambda: sweep(pd.DataFrame([[1e-9, 2e-9]], columns=["lifetime"] * 2), "g2_zero")),
        bad("is not a number", lambda: sweep({"lifetime": ["long"]}, "g2_zero")),
        bad("is not a number", lambda: sweep({"lifetime": [True]}, "g2_zero")),
        bad("is complex", lambda: sweep({"lifetime": [1e-9 + 1j]}, "g2_zero")),
        bad("workers is a whole number", lambda: process_pool(0).__enter__()),
    ],
)  # fmt: skip
def test_bad_input_is_refused_in_one_sentence(text: str, call: Callable[[], Any]) -> None:
    with pytest.raises(PlanError) as caught:
        call()
    message = str(caught.value)
    assert text in message
    assert "\n" not in message
    assert (
        len(message) < 400
        or "the quantities are" in message
        or ": emission" in message
        or ("keys are" in message or "one of:" in message or "inputs are" in message)
    )


def test_bad_paths_are_refused(tmp_path: Path) -> None:
    refused(tmp_path / "a.txt", "neither a .csv nor a .parquet")
    refused(tmp_path / "none" / "a.csv", "there is no folder")
    refused(Path(f"{tmp_path}/a\0.csv"), "is no path")
    refused(3, "is no path")
    (tmp_path / "d.csv").mkdir()
    refused(tmp_path / "d.csv", "is a folder")
    (tmp_path / "f.parquet").write_text("")
    refused(tmp_path / "f.parquet", "is a file")
    refused(Path("/proc/a.csv"), "cannot be written")
    with pytest.raises(PlanError, match="sweep_to takes a plan"):
        sweep_to(tmp_path / "a.csv", pd.DataFrame({"lifetime": [1e-9]}), WANTED)
    assert sorted(file.name for file in tmp_path.iterdir()) == ["d.csv", "f.parquet"]


def test_parquet_without_its_library_is_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    monkeypatch.delitem(sys.modules, "explorer.sweep.parquet", raising=False)
    refused(tmp_path / "a.parquet", "needs pyarrow", "[parquet]", ".csv")
    assert not list(tmp_path.iterdir())


# Plans in files, and the command


def plan_file(folder: Path, text: str) -> Path:
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_the_example_is_the_plan_that_it_says(tmp_path: Path) -> None:
    asked = read_sweep_file(plan_file(tmp_path, EXAMPLE))
    plan = factorial(
        {
            "emission_wavelength": 580e-9,
            "lifetime": 3.6e-9,
            "quantum_yield": 0.95,
            "radiative_share": 0.75,
            "upward_share": 0.9,
            "other_modes": 0.5,
            "repetition_rate": 160e6,
            "background_per_pulse": 0.002,
        },
        optic=["single_mode_fibre", "single_mode_fibre_nir"],
        pumping=["pulsed", "continuous"],
        fast_linewidth=[5e-9, 20e-9, 35e-9],
        quality_factor=asked.plan.axes["quality_factor"],
        mode_volume=asked.plan.axes["mode_volume"],
    )
    np.testing.assert_allclose(plan.axes["quality_factor"], np.geomspace(10, 1e4, 100), rtol=1e-11)
    np.testing.assert_allclose(plan.axes["mode_volume"], np.geomspace(0.01, 100, 100), rtol=1e-11)
    assert asked.plan.fingerprint(WANTED) == plan.fingerprint(WANTED)
    assert asked.wanted == WANTED[:4]
    assert asked.output == tmp_path / "harbour.csv"
    assert asked.chunk == 65536


def test_even_steps_are_round_in_the_unit_of_the_page(tmp_path: Path) -> None:
    text = (
        'wanted = ["peak_purcell"]\n[axes]\n'
        'emission_wavelength = {from = 600, to = "0.7 µm", count = 101}\n'
        "quantum_yield = {from = 0.1, to = 0.9, count = 9}\n"
        'lifetime = {from = "1 ns", to = 3, count = 3, spacing = "even"}\n'
        'spectrum = {one = "single line", two = [[0.7, 0, 2], [0.3, "15 nm", "2 nm"]]}\n'
    )
    axes = read_sweep_file(plan_file(tmp_path, text)).plan
    assert axes.axes["emission_wavelength"].tolist() == [float(f"{n}e-9") for n in range(600, 701)]
    assert axes.axes["quantum_yield"].tolist() == [float(f"0.{n}") for n in range(1, 10)]
    assert axes.axes["lifetime"].tolist() == [1e-9, 2e-9, 3e-9]
    assert axes.slow[0].entries[1] == {"spectrum": Lines([(0.7, 0.0, 2e-9), (0.3, 15e-9, 2e-9)])}


def test_a_saved_design_is_a_base_and_gives_its_ranges(tmp_path: Path) -> None:
    design = Design(
        {"lifetime": 2e-9, "quality_factor": 50.0},
        unknowns={"quantum_yield": Unknown(0.4, 0.8)},
        scatter={"quality_factor": Spread("lognormal", 0.2), "mode_volume": Spread("normal", 0.1)},
        correlation={"quality_factor|mode_volume": 0.5},
    )
    save_design(design, tmp_path / "design.json")
    head = 'wanted = ["rate_at_lens"]\nbase = "design.json"\n[sampled]\ncount = 16\nseed = 4\n'
    asked = read_sweep_file(plan_file(tmp_path, f'{head}ranges = "base"\nscatter = "base"\n'))
    plan = sampled(design, 16, 4, design.unknowns, design.scatter, correlation=design.correlation)
    assert asked.plan.fingerprint(WANTED) == plan.fingerprint(WANTED)
    text = (
        f'{head}[sampled.ranges]\nquantum_yield = "0.4-0.8"\nfast_linewidth = {{from=1, to="20 nm"}}\n'
        'lifetime = ["1 ns", 3]\n'
        '[sampled.scatter]\nlateral_offset = {kind = "radial", width = "20 nm"}\n'
        'mode_volume = {kind = "lognormal", width = 0.1}\n'
    )
    asked = read_sweep_file(plan_file(tmp_path, text))
    plan = sampled(
        design,
        16,
        4,
        {"quantum_yield": (0.4, 0.8), "fast_linewidth": (1e-9, 20e-9), "lifetime": (1e-9, 3e-9)},
        {"lateral_offset": Spread("radial", 20e-9), "mode_volume": Spread("lognormal", 0.1)},
    )
    assert asked.plan.fingerprint(WANTED) == plan.fingerprint(WANTED)


AXIS = 'wanted = ["g2_zero"]\n[axes]\n'
DRAWN = 'wanted = ["g2_zero"]\n[sampled]\ncount = 4\n[sampled.ranges]\n'


@pytest.mark.parametrize(
    ("text", "part"),
    [
        ("this is no plan", "is no plan: expected"),
        ("\x00", "is no plan"),
        ("", "wanted is missing"),
        ("wanted = 3", "wanted is missing"),
        (f"{AXIS}lifetime = [1]\nlifetime = [2]", "is no plan: cannot overwrite a value"),
        ('wanted = ["rate"]\n[axes]\nlifetime = [1]', "'rate' is no quantity"),
        ('wanted = ["g2_zero"]', "a plan needs an axis"),
        (f"{AXIS}quality = [1]", "'quality' is no input"),
        (f"{AXIS}emitter = ['']", "under [records]"),
        (f"{AXIS}lifetime = []", "the axis lifetime is empty"),
        (f"{AXIS}lifetime = 4", "takes a list of values"),
        (f"{AXIS}lifetime = ['4 nm']", "is no unit that fits ns"),
        (f"{AXIS}lifetime = [true]", "lifetime = True is not a number"),
        (f"{AXIS}lifetime = ['0.1 ps']", "[0] = 0.0001 ns is outside its range"),
        (f"{AXIS}lifetime = {{from = 2, to = 1, count = 3}}", "must rise from a low"),
        (f"{AXIS}lifetime = {{from = 1, to = 2, count = 0}}", "count of the axis lifetime"),
        (f"{AXIS}lifetime = {{from = 1, to = 2}}", "count of the axis lifetime"),
        (f"{AXIS}lifetime = {{from = 1, count = 2}}", "has no 'to'"),
        (f"{AXIS}lifetime = {{from = 1, to = 2, count = 3, step = 1}}", "'step' is nothing that"),
        (f"{AXIS}lifetime = {{from = 1, to = 2, count = 3, spacing = 'odd'}}", "is 'even' or 'log'"),
        (f"{AXIS}slow_linewidth = {{from=0, to=2, count=3, spacing='log'}}", "must start above 0"),
        (f"{AXIS}spectrum = {{a = [[1]]}}", "each line is three numbers"),
        (f"{AXIS}spectrum = {{a = 'red'}}", 'a spectrum is "single line" or lines'),
        (f"{AXIS}broadening = ['law']", "cannot be written in a plan"),
        (f"colour = 1\n{AXIS}lifetime = [1]", "'colour' is nothing that a plan has"),
        (f"chunk = -1\n{AXIS}lifetime = [1]", "chunk is a whole number"),
        (f"output = 3\n{AXIS}lifetime = [1]", "output = 3 is no path"),
        ("axes = 3\nwanted = ['g2_zero']", "axes is a table"),
        (f"base = 3\n{AXIS}lifetime = [1]", "base is a table of inputs or the path"),
        (f"base = 'none.json'\n{AXIS}lifetime = [1]", "'none.json' cannot be read"),
        (f"records = {{emitter = ['gold']}}\n{AXIS}lifetime = [1]", "is no emitter of"),
        (f"records = {{emitter = 'all', scaled = 1}}\n{AXIS}lifetime = [1]", "true or false"),
        (f"{DRAWN}lifetime = '2-1 ns'", "the range of lifetime: a range runs from"),
        (f"{DRAWN}lifetime = {{from = 2, to = 1}}", "the range of lifetime must rise"),
        (f"{DRAWN}lifetime = 'some'", "a low and a high number, not 'some'"),
        (f"{DRAWN}pumping = ['pulsed', 'continuous']", "pumping is no number"),
        (f"{DRAWN}age = [1, 2]", "ranges names 'age'"),
        (f"{DRAWN}lifetime = [1, 2]\n[axes]\nlifetime = [1]", "in a sampled plan"),
        ("wanted = ['g2_zero']\n[sampled]\ncount = 0\nranges.lifetime = [1, 2]", "count is a whole"),
        ("wanted = ['g2_zero']\n[sampled]\nranges.lifetime = [1, 2]", "sampled has no count"),
        ("wanted = ['g2_zero']\n[sampled]\ncount = 4\nranges = 'base'", "needs a saved design"),
        ("wanted = ['g2_zero']\n[sampled]\ncount = 4\nscatter = {lifetime = 3}", "is a table, not 3"),
        ("wanted = ['g2_zero']\n[sampled]\ncount = 4\nscatter.lifetime.kind = 'odd'", "no kind of"),
    ],
)  # fmt: skip
def test_a_bad_plan_is_one_sentence_and_exit_code_2(
    text: str, part: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = plan_file(tmp_path, text)
    assert main(["sweep", str(path)]) == 2
    said = capsys.readouterr()
    assert part in said.err
    assert "plan.toml" in said.err or "is no quantity" in said.err
    assert len(said.err.splitlines()) == 1
    assert said.out == ""
    assert [file.name for file in tmp_path.iterdir()] == ["plan.toml"]


SMALL = f"{AXIS}quality_factor = {{from = 10, to = 1e4, count = 50}}\nmode_volume = [0.1, 1, 10]\n"


def test_the_command_writes_goes_on_and_says_so(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path, table = plan_file(tmp_path, f"chunk = 20\n{SMALL}"), tmp_path / "plan.csv"
    assert main(["sweep", str(path)]) == 0
    assert "plan.csv is complete: 150 rows, 150 of them now" in capsys.readouterr().err
    first = content(table)
    assert main(["sweep", str(path)]) == 0
    assert "complete already: 150 rows" in capsys.readouterr().err
    assert main(["sweep", str(path), "--restart", "--quiet"]) == 0
    assert content(table) == first
    path.write_text(path.read_text() + "numerical_aperture = [0.5, 1.2]\n")
    assert main(["sweep", str(path)]) == 2
    assert "another plan" in capsys.readouterr().err
    assert content(table) == first
    other = tmp_path / "other.csv"
    assert main(["sweep", str(path), "--out", str(other)]) == 0
    said = capsys.readouterr().err
    assert "150 rows are without numbers" in said
    assert "numerical_aperture = 1.2 is outside its range" in said
    assert other.read_bytes().count(b"\n") == 301


def test_the_command_refuses_wrong_options(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = str(plan_file(tmp_path, SMALL))
    assert main(["sweep", path, "--workers", "0"]) == 2
    assert "workers is a whole number" in capsys.readouterr().err
    assert main(["sweep", path, "--out", str(tmp_path / "a.txt")]) == 2
    assert main(["sweep", str(tmp_path / "none.toml")]) == 2
    for words in (["sweep"], ["sweep", path, "--workers", "two"]):
        with pytest.raises(SystemExit) as ended:
            main(words)
        assert ended.value.code == 2


# Interruptions and crashes of whole processes

BIG = (
    'chunk = 2000\nwanted = ["rate_in_fibre", "g2_zero", "half_angle", "regime"]\n[axes]\n'
    'pumping = ["pulsed", "continuous"]\n'
    "quality_factor = {from = 10, to = 1e4, count = 100}\n"
    "mode_volume = {from = 0.01, to = 100, count = 1000}\n"
)
BIG_WANTED = WANTED[:4]


@pytest.fixture(scope="module")
def big(tmp_path_factory: pytest.TempPathFactory) -> tuple[Any, bytes]:
    """A plan of 200 000 rows, and its table as one process writes it."""
    folder = tmp_path_factory.mktemp("big")
    asked = read_sweep_file(plan_file(folder, BIG))
    sweep_to(folder / "whole.csv", asked.plan, BIG_WANTED, chunk=asked.chunk)
    return asked.plan, (folder / "whole.csv").read_bytes()


def started(*words: str, limit: int = 0) -> subprocess.Popen[str]:
    """The command in a process group of its own, its files at most `limit` bytes long."""

    def prepare() -> None:
        if limit:
            import resource

            resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))

    return subprocess.Popen(
        [sys.executable, "-m", "explorer", "sweep", *words],
        cwd=REPOSITORY,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
        preexec_fn=prepare,  # noqa: PLW1509  # no thread of this process holds a lock it needs
    )


def grown(process: subprocess.Popen[str], path: Path, size: int) -> None:
    """Wait until a table has some bytes."""
    deadline = time.monotonic() + 60
    while not path.exists() or path.stat().st_size < size:
        assert process.poll() is None, process.communicate()
        assert time.monotonic() < deadline
        time.sleep(0.005)


@pytest.mark.slow
@pytest.mark.parametrize("workers", ["1", "2"])
def test_a_killed_run_is_gone_on_with_to_the_same_bytes(
    workers: str, big: tuple[Any, bytes], tmp_path: Path
) -> None:
    path, table = plan_file(tmp_path, BIG), tmp_path / "plan.csv"
    for share in (0.2, 0.6):
        process = started(str(path), "--workers", workers)
        grown(process, table, int(share * len(big[1])))
        process.kill()
        process.communicate(
            timeout=60
        )  # its workers end with it, or would hold their end of the pipe
        assert process.returncode == -signal.SIGKILL
    assert len(table.read_bytes()) < len(big[1])
    process = started(str(path), "--workers", workers)
    said = process.communicate()[1]
    assert process.returncode == 0
    assert "of them now" in said
    assert table.read_bytes() == big[1]


@pytest.mark.slow
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
@pytest.mark.parametrize("workers", ["1", "2"])
def test_ctrl_c_stops_cleanly_and_says_how_to_go_on(
    workers: str, number: int, big: tuple[Any, bytes], tmp_path: Path
) -> None:
    path, table = plan_file(tmp_path, BIG), tmp_path / "plan.csv"
    process = started(str(path), "--workers", workers)
    grown(process, table, len(big[1]) // 5)
    # Ctrl-C on a terminal goes to the whole group.
    (os.killpg if number == signal.SIGINT else os.kill)(process.pid, number)
    said = process.communicate(timeout=60)[1].splitlines()
    assert process.returncode == 1
    assert len(said) == 1
    assert said[0].startswith("Stopped; ")
    assert said[0].endswith("of 200,000 rows are kept. The same command goes on from there.")
    kept = table.read_bytes()
    assert big[1].startswith(kept)
    assert kept.endswith(b"\n")
    assert main(["sweep", str(path), "--quiet"]) == 0
    assert table.read_bytes() == big[1]


@pytest.mark.slow
def test_a_file_that_may_not_grow_stops_with_exit_code_1(
    big: tuple[Any, bytes], tmp_path: Path
) -> None:
    """The system refuses bytes beyond a limit, as a full disk does."""
    path, table = plan_file(tmp_path, BIG), tmp_path / "plan.csv"
    process = started(str(path), limit=5_000_000)
    said = process.communicate(timeout=60)[1].splitlines()
    assert process.returncode == 1
    assert len(said) == 1
    assert "file too large; these rows are kept in 'plan.csv'" in said[0]
    kept = table.read_bytes()
    assert 4_000_000 < len(kept) <= 5_000_000
    assert big[1].startswith(kept)
    assert kept.endswith(b"\n")
    assert main(["sweep", str(path), "--quiet"]) == 0
    assert table.read_bytes() == big[1]


@pytest.mark.slow
def test_a_pool_whose_worker_is_killed_stops_in_one_sentence(
    big: tuple[Any, bytes], tmp_path: Path
) -> None:
    path = tmp_path / "a.csv"
    with process_pool(2) as pool:

        def kill(now: Progress) -> None:
            if now.rows == 40_000:
                os.kill(next(iter(pool._processes)), signal.SIGKILL)

        with pytest.raises(SweepError, match="a worker process ended; these rows are kept"):
            sweep_to(path, big[0], BIG_WANTED, pool, chunk=2000, progress=kill)
    assert big[1].startswith(path.read_bytes())
    sweep_to(path, big[0], BIG_WANTED)
    assert path.read_bytes() == big[1]


@pytest.fixture
def cluster(tmp_path: Path) -> Any:
    """Two worker processes of a cluster on this machine, and its client."""
    distributed = pytest.importorskip("distributed")
    import dask

    settings = {"temporary-directory": str(tmp_path / "dask"), "logging.distributed": "error"}
    with (
        dask.config.set(settings),
        distributed.LocalCluster(
            n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None
        ) as running,
        distributed.Client(running) as client,
    ):
        yield running, client


@pytest.mark.slow
def test_a_cluster_that_loses_a_worker_gives_the_same_table(
    cluster: Any, big: tuple[Any, bytes], tmp_path: Path
) -> None:
    _, client = cluster
    workers = list(client.run(os.getpid).values())
    assert len(workers) == 2

    def kill(now: Progress) -> None:
        if now.rows == 40_000:
            os.kill(workers[0], signal.SIGKILL)

    path = tmp_path / "a.csv"
    sweep_to(path, big[0], BIG_WANTED, client.get_executor(), chunk=2000, progress=kill)
    assert path.read_bytes() == big[1]
    assert set(client.run(os.getpid).values()) != set(workers)
    assert same(sweep(GRID, WANTED, client.get_executor(), chunk=13), sweep(GRID, WANTED, chunk=13))
    with pytest.raises(PlanError, match="get_executor"):
        sweep_to(tmp_path / "b.csv", GRID, WANTED, client)


@pytest.mark.slow
def test_a_cluster_that_is_gone_stops_in_one_sentence(
    cluster: Any, big: tuple[Any, bytes], tmp_path: Path
) -> None:
    running, client = cluster
    path = tmp_path / "a.csv"

    def close(now: Progress) -> None:
        if now.rows == 40_000:
            running.close()

    with pytest.raises(
        SweepError, match="its workers or its cluster are gone; these rows"
    ) as caught:
        sweep_to(path, big[0], BIG_WANTED, client.get_executor(), chunk=2000, progress=close)
    assert caught.value.rows >= 40_000
    assert "\n" not in str(caught.value)
    assert big[1].startswith(path.read_bytes())
    written = sweep_to(path, big[0], BIG_WANTED)
    assert written.new == big[0].rows - caught.value.rows
    assert path.read_bytes() == big[1]


@pytest.mark.slow
def test_memory_does_not_grow_with_the_rows(tmp_path: Path) -> None:
    """Peak of processes that write 0.13 and 2 million rows in the same chunks."""
    code = (
        "import resource, sys, numpy as np\nfrom explorer.sweep import factorial, sweep_to\n"
        "plan = factorial({}, quality_factor=np.geomspace(10, 1e4, int(sys.argv[1])),"
        " mode_volume=np.geomspace(0.01, 100, 2000))\n"
        "sweep_to(sys.argv[2], plan, ['rate_in_fibre', 'g2_zero'])\n"
        "print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)"
    )
    peaks = [
        int(
            subprocess.run(
                [sys.executable, "-c", code, count, str(tmp_path / f"{count}.csv")],
                capture_output=True,
                text=True,
                check=True,
                cwd=REPOSITORY,
            ).stdout
        )
        for count in ("64", "1000")
    ]
    assert (tmp_path / "1000.csv").stat().st_size > 10 * (tmp_path / "64.csv").stat().st_size
    # A table of two million rows kept in memory as text alone would take 100 MB.
    assert peaks[1] - peaks[0] < 30_000


def test_a_journal_says_what_the_table_is(tmp_path: Path) -> None:
    sweep_to(tmp_path / "a.csv", GRID, WANTED)
    journal = json.loads((tmp_path / "a.csv.sweep.json").read_text(encoding="utf-8"))
    assert journal["rows"] == GRID.rows
    assert journal["wanted"] == list(WANTED)
    assert journal["columns"]["fast_linewidth"] == "2 values, 1 nm to 20 nm"
    assert journal["base"]["emission_wavelength"] == "580 nm"
