"""The page's choosing: candidates as rows, the shortlist, long work in slices, the key-link form."""

from __future__ import annotations

import asyncio
import math
import time
from collections.abc import Iterator

import pytest

from explorer import Requirement
from explorer.candidates import batch
from explorer.catalogue import emitters
from explorer.combine import combined, with_record
from explorer.page import candidate_rows
from explorer.page.shortlist import LETTERS, Shortlist, short_name
from explorer.page.table import pack
from explorer.page.work import SLICE, Work
from explorer.scenario import first_question

DESIGN = first_question().design
MADE = batch(DESIGN, optics=["single_mode_fibre", "free_space_na_05"])
ROWS, COUNT = candidate_rows.rows(MADE, DESIGN, with_optic=True)


def test_rows_are_the_best_first_with_a_cell_for_every_heading() -> None:
    columns = candidate_rows.columns(DESIGN, with_optic=True)
    assert MADE.marks.size == COUNT
    assert len(ROWS) == min(COUNT, candidate_rows.MOST)
    margins = [row.cells[1].value for row in ROWS]
    known = [margin for margin in margins if not math.isnan(margin)]
    assert known == sorted(known, reverse=True)
    assert all(len(row.cells) == len(columns) for row in ROWS)
    assert pack(columns, ROWS, "candidates")


def test_a_row_says_what_its_design_gives() -> None:
    names = candidate_rows.quantities(DESIGN)
    first = 5 + 1  # mark, margin, emitter, temperature, resonator, optic
    for row in ROWS[:: max(len(ROWS) // 25, 1)]:
        design = combined(DESIGN, *candidate_rows.keys_of(row.key))
        found = design.outcome(names)
        for offset, name in enumerate(names):
            assert row.cells[first + offset].value == pytest.approx(
                found[name], rel=1e-9, nan_ok=True
            )
        met = all(entry.met(found[entry.quantity]) for entry in design.requirements)
        assert (row.tone == "met") == met
        assert row.cells[0].value == met


@pytest.mark.parametrize(
    ("margin", "words"),
    [
        (math.log(2.0), "2.0× spare"),
        (-math.log(1.8), "1.8× short"),
        (0.001, "just met"),
        (-0.001, "just missed"),
        (math.nan, "no number"),
        (-math.log(3e5), "3e+05× short"),
    ],
)
def test_distances_in_words(margin: float, words: str) -> None:
    assert candidate_rows.distance(margin, Requirement("rate_in_fibre", at_least=1e6)) == words


def test_a_limit_of_zero_has_no_ratio() -> None:
    wanted = Requirement("g2_zero", at_most=0.0)
    assert candidate_rows.distance(-0.1, wanted) == "missed"
    assert candidate_rows.distance(0.0, None) == ""


def test_four_are_kept_and_no_more() -> None:
    kept, told = Shortlist(), []
    kept.on_change(lambda: told.append(tuple(kept.kept)))
    designs = [with_record(DESIGN, "emitter", key) for key in list(emitters())[:5]]
    assert [kept.keep(design) for design in designs] == [*LETTERS, None]
    assert kept.keep(designs[1]) == "B"
    assert kept.full
    kept.drop("B")
    assert kept.keep(designs[4]) == "B"
    assert list(kept.kept) == list(LETTERS)
    kept.drop("E")
    assert len(told) == 4 + 1 + 1


def test_a_kept_design_is_called_by_its_records() -> None:
    both = combined(DESIGN, "nv_nanodiamond", "micropillar", "")
    name = short_name(both)
    assert " · " in name
    assert "micropillar" in name
    bare = with_record(DESIGN, "emitter", "")
    assert short_name(bare) == DESIGN.name


def test_without_a_loop_work_is_done_at_once() -> None:
    heard: list[int] = []
    Work().start(iter(range(5)), heard.append)
    assert heard == [4]


def slow(steps: int, each: float, seen: list[int]) -> Iterator[int]:
    for number in range(steps):
        time.sleep(each)
        seen.append(number)
        yield number


def test_in_a_loop_others_are_heard_between_slices() -> None:
    heard: list[int] = []
    ticks: list[float] = []

    async def main() -> None:
        work, seen = Work(), []
        work.start(slow(20, SLICE / 2, seen), heard.append)
        while not heard:
            ticks.append(time.perf_counter())
            await asyncio.sleep(0.001)
        assert not work.busy

    asyncio.run(main())
    assert heard == [19]
    assert len(ticks) > 5, "the loop ran between the slices"


def test_new_work_drops_the_old_and_stop_drops_all() -> None:
    heard: list[object] = []
    old: list[int] = []

    async def main() -> None:
        work = Work()
        work.start(slow(50, SLICE, old), heard.append)
        await asyncio.sleep(3 * SLICE)
        work.start(iter(["new"]), heard.append)
        await asyncio.sleep(3 * SLICE)
        work.start(iter(["never"]), heard.append, delay=0.05)
        work.stop()
        await asyncio.sleep(0.1)

    asyncio.run(main())
    assert heard == ["new"]
    assert len(old) < 20


def test_what_fails_is_told_and_the_rest_dropped() -> None:
    def fails() -> Iterator[int]:
        yield 1
        raise ValueError("no such thing")

    told: list[str] = []
    Work().start(fails(), told.append, lambda error: told.append(str(error)))
    assert told == ["no such thing"]
    with pytest.raises(ValueError, match="no such thing"):
        Work().start(fails(), told.append)
