"""The page's choosing: candidates as rows, the shortlist, long work in slices, the key-link form."""

from __future__ import annotations

import asyncio
import math
import re
import time
from collections.abc import Iterator
from dataclasses import replace

import pytest

from explorer import Axis, Requirement, Unknown
from explorer.answers import Answers
from explorer.candidates import batch
from explorer.catalogue import emitters
from explorer.combine import combined, with_record
from explorer.page import candidate_rows
from explorer.page.panels.candidates import CandidatesPanel
from explorer.page.panels.keylink import KeyLinkPanel
from explorer.page.panels.limits import LimitsPanel
from explorer.page.shortlist import LETTERS, Shortlist, short_name
from explorer.page.state import State
from explorer.page.table import pack
from explorer.page.work import SLICE, Work
from explorer.reading import ReadingError, read_range
from explorer.scenario import LINK, first_question
from explorer.unknowns import influences, ranges

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
        (-math.log(1.03), "3 % short"),
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


# -------------------------------------------------------------------- what is not known


def small() -> State:
    """A page's state with a small map."""
    question = first_question()
    return State(
        replace(question, x=replace(question.x, count=12), y=replace(question.y, count=12))
    )


@pytest.mark.parametrize(
    ("typed", "unit", "ends"),
    [
        ("3.4–3.9", "ns", (3.4e-9, 3.9e-9)),
        ("3.4-3.9 ns", "ns", (3.4e-9, 3.9e-9)),
        ("3.4 to 3.9 µs", "ns", (3.4e-6, 3.9e-6)),
        ("1e-3…2e-3", "1", (1e-3, 2e-3)),
        ("1e-3-2e-3", "1", (1e-3, 2e-3)),
        ("−5–10", "nm", (-5e-9, 10e-9)),
        ("0.2..0.9", "1", (0.2, 0.9)),
        ("25", "1", None),
        ("1e-5", "1", None),
        ("−3 nm", "nm", None),
        ("abc", "1", None),
    ],
)
def test_ranges_as_people_type_them(typed, unit, ends) -> None:
    assert read_range(typed, unit) == ends


@pytest.mark.parametrize("typed", ["9–3", "3–4 parsec", "1.2.3–4"])
def test_what_is_no_range_is_refused_in_words(typed: str) -> None:
    with pytest.raises(ReadingError):
        read_range(typed, "ns")


def test_a_range_keeps_a_value_inside_and_moves_one_outside() -> None:
    state = small()
    state.give_range("quality_factor", 10.0, 100.0)
    design = state.question.design
    assert design.point["quality_factor"] == 25
    assert design.unknowns["quality_factor"] == Unknown(10.0, 100.0)
    assert design.origin("quality_factor") == DESIGN.origin("quality_factor")
    state.give_range("quality_factor", 100.0, 10000.0)
    assert state.question.design.point["quality_factor"] == pytest.approx(1000)
    state.give(quality_factor=30.0)
    assert "quality_factor" not in state.question.design.unknowns


def test_a_range_beyond_the_domain_is_refused_beside_its_input() -> None:
    state = small()
    state.give_range("quantum_yield", 0.5, 1.5)
    assert "quantum_yield" in state.problems
    assert state.question.design == DESIGN


def test_an_answer_carries_the_ranges_and_the_sentence_says_them() -> None:
    answer = small().answer
    expected = ranges(DESIGN, answer.outcome)
    assert answer.ranges == expected
    assert "(" in answer.sentence.headline
    assert "what 4 unknowns leave open" in answer.sentence.known
    counts = dict.fromkeys(("seen", "from memory", "typed", "at defaults"), 0)
    for word in counts:
        found = re.search(rf"(\d+) {word}", answer.sentence.known)
        assert found is not None
        counts[word] = int(found[1])
    from explorer.inputs import INPUTS

    assert sum(counts.values()) == len(INPUTS)


def test_without_unknowns_nothing_stands_in_brackets() -> None:
    question = first_question()
    bare = replace(question, design=replace(question.design, unknowns={}))
    answer = Answers().answer(bare)
    assert answer.ranges is None
    assert "(7" not in answer.sentence.headline
    assert "brackets" not in answer.sentence.known


def test_ranges_wait_for_rest_and_come_by_themselves() -> None:
    async def main() -> None:
        state = small()
        heard = []
        state.on_answer(heard.append)
        state.give(quality_factor=30.0)
        assert heard[-1].ranges is None, "the readouts do not wait for the ranges"
        await asyncio.sleep(0.2)
        assert heard[-1].ranges is None
        for _ in range(100):
            await asyncio.sleep(0.05)
            if heard[-1].ranges is not None:
                break
        assert heard[-1].ranges == ranges(state.question.design, heard[-1].outcome)

    asyncio.run(main())


def test_the_ranking_is_made_only_while_it_is_open() -> None:
    state = small()
    panel = LimitsPanel(state)
    assert state.answer.ranking is None
    panel.opened(True)
    assert state.answer.ranking == influences(state.question.design, "rate_in_fibre")
    assert "Optics transmission" in panel.list.value
    panel.quantity.value = "g2_zero"
    assert state.answer.ranking == influences(state.question.design, "g2_zero")
    panel.opened(False)
    assert state.question.ranked == ""


# -------------------------------------------------------------------- the key link


def test_the_scenario_asks_for_what_its_link_needs() -> None:
    """20 million photons/s at g2(0) of 0.1: what the invented link needs for its key."""
    state = small()
    panel = KeyLinkPanel(state)
    panel.head.click()
    assert panel.said.value.startswith("needs 19.9 M/s in the fibre")
    assert float(panel.boxes["key"].value) == LINK["key"]
    panel.use.click()
    first, second, *others = state.question.design.requirements
    assert (first.quantity, second.quantity) == ("rate_in_fibre", "g2_zero")
    assert first.at_least == pytest.approx(20e6, rel=0.01)
    assert second.at_most == pytest.approx(0.1)
    assert others == [DESIGN.requirements[2]]


def test_a_link_that_cannot_be_says_so_and_requires_nothing() -> None:
    state = small()
    panel = KeyLinkPanel(state)
    panel.head.click()
    for box, typed, words in (
        ("key", "1e9", "at most"),
        ("error", "60", "error"),
        ("length", "far", "Length"),
        ("receiver", "0", "receiver"),
    ):
        before = panel.boxes[box].value
        panel.boxes[box].value = typed
        assert words in panel.said.value
        assert panel.use.disabled
        panel.boxes[box].value = before
    assert not panel.use.disabled
    state.give(pumping="continuous")
    assert "pulsed" in panel.said.value


def test_a_link_through_fibre_asks_for_its_loss() -> None:
    panel = KeyLinkPanel(small())
    panel.head.click()
    through_air = panel.said.value
    panel.medium.value = "fibre"
    assert panel.lines["visibility"].layout.display == "none"
    assert panel.said.value != through_air


def test_the_next_step_writes_numbers_as_people_do() -> None:
    """How cold it must be, and with which Q: no exponents of ten where a number will do."""
    question = first_question()
    design = with_record(question.design, "emitter", "siv_bulk")
    cold = replace(
        question,
        design=design,
        x=Axis("temperature", 1.0, 400.0, count=40),
        y=replace(question.y, count=40),
    )
    hint = Answers().answer(cold).hint
    assert re.search(r"T \d+ K, Q \d+$", hint), hint


# -------------------------------------------------------------------- the table's panel


def test_a_sheet_that_was_closed_too_soon_is_worked_out_when_it_opens_again() -> None:
    async def main() -> None:
        panel = CandidatesPanel(small())
        panel.opened(True)
        await asyncio.sleep(0.02)
        panel.opened(False)
        panel.opened(True)
        for _ in range(200):
            await asyncio.sleep(0.05)
            if "meet everything" in panel.said.value:
                return
        raise AssertionError(panel.said.value)

    asyncio.run(main())


def test_a_row_becomes_the_design_and_can_be_kept() -> None:
    state = small()
    panel = CandidatesPanel(state)
    panel.opened(True)
    row = candidate_rows.key_of("nv_nanodiamond", "micropillar", "")
    panel._keep(row)
    panel._pick(row)
    expected = combined(DESIGN, "nv_nanodiamond", "micropillar", "")
    assert state.question.design == expected
    assert state.shortlist.kept == {"A": expected}
