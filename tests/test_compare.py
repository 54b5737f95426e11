"""Kept designs compared with the present one: changes, order, names, and what was deleted."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import replace

import pytest

from explorer.page.comparing import change_words, compared, names_of
from explorer.page.panels.compare import NOTHING, ComparePanel
from explorer.page.shortlist import Shortlist
from explorer.page.state import State
from explorer.scenario import first_question

FIRST = first_question().design


def other(quality: float) -> object:
    return FIRST.with_values(quality_factor=quality)


# ---------------------------------------------------------------- the shortlist


def test_what_is_deleted_comes_back_under_its_letter() -> None:
    kept = Shortlist()
    for quality in (10.0, 20.0, 30.0):
        kept.keep(other(quality))
    before = dict(kept.kept)
    kept.drop("B")
    kept.drop("A")
    assert list(kept.kept) == ["C"]
    kept.bring_back()
    kept.bring_back()
    assert kept.kept == before
    kept.bring_back()  # nothing more
    assert kept.kept == before


def test_what_comes_back_takes_a_free_letter_where_its_own_is_taken() -> None:
    kept = Shortlist()
    kept.keep(other(10.0))
    kept.drop("A")
    kept.keep(other(20.0))
    kept.bring_back()
    assert kept.kept == {"A": other(20.0), "B": other(10.0)}


def test_a_full_list_brings_nothing_back_and_forgets_nothing() -> None:
    kept = Shortlist()
    for quality in (10.0, 20.0, 30.0, 40.0):
        kept.keep(other(quality))
    kept.drop("D")
    kept.keep(other(50.0))
    kept.bring_back()
    assert kept.kept["D"] == other(50.0)
    kept.drop("D")
    kept.deleted.pop()
    kept.bring_back()
    assert kept.kept["D"] == other(40.0)


def test_designs_change_places() -> None:
    kept = Shortlist()
    for quality in (10.0, 20.0, 30.0):
        kept.keep(other(quality))
    assert kept.move("A", +1) == "B"
    assert [design.point["quality_factor"] for design in kept.kept.values()] == [20.0, 10.0, 30.0]
    assert kept.move("A", -1) == "A"
    assert kept.move("C", +1) == "C"
    assert kept.move("Z", +1) == "Z"


# ---------------------------------------------------------------- changes in words


@pytest.mark.parametrize(
    ("name", "here", "there", "words"),
    [
        ("rate_in_fibre", 2e6, 1e6, "×2.00"),
        ("rate_in_fibre", 1e6, 1e6, "·"),
        ("rate_in_fibre", 1.0001e6, 1e6, "·"),
        ("half_angle", math.radians(12), math.radians(10), "+2.0°"),
        ("half_angle", math.radians(9), math.radians(10), "−1.0°"),
        ("rate_in_fibre", 1e6, 0.0, "+1.0 M/s"),
        ("rate_in_fibre", math.nan, 1e6, "no number"),
        ("rate_in_fibre", math.nan, math.nan, "·"),
    ],
)
def test_a_change_is_a_ratio_or_a_difference(
    name: str, here: float, there: float, words: str
) -> None:
    assert change_words(name, here, there) == words


# ---------------------------------------------------------------- the panel


@pytest.fixture
def panel() -> Iterator[ComparePanel]:
    made = ComparePanel(State(first_question()))
    made.opened(True)
    yield made
    made.close()


def cells(panel: ComparePanel, label: str) -> list[str]:
    row = re.search(rf"<tr><th scope=row>{re.escape(label)}</th>(.*?)</tr>", panel.table.value)
    assert row, label
    return re.findall(r"<td[^>]*>(.*?)</td>", row[1])


def test_without_a_kept_design_it_says_what_to_do(panel: ComparePanel) -> None:
    assert panel.table.value == NOTHING


def test_every_readout_shows_its_change_live(panel: ComparePanel) -> None:
    state = panel._state
    state.shortlist.keep(state.question.design)
    assert "Every input is the same" in panel.table.value
    assert cells(panel, "Photons/s in the fibre")[2] == "·"
    kept = state.answer.outcome["rate_in_fibre"]
    state.give(repetition_rate=80e6)
    now = state.answer.outcome["rate_in_fibre"]
    assert cells(panel, "Photons/s in the fibre")[2] == f"×{now / kept:.3f}"
    assert cells(panel, "Repetition rate") == ["80 MHz", "160 MHz"]
    assert "x-apart" in panel.table.value  # fewer photons, where more are wanted
    for name in names_of(state.answer):
        assert name in state.answer.outcome


def test_a_kept_design_is_named_moved_deleted_and_brought_back(panel: ComparePanel) -> None:
    shortlist = panel._state.shortlist
    shortlist.keep(other(10.0))
    shortlist.keep(other(20.0))
    panel.menu.value = "B"
    panel.name.value = "the flat one"
    assert shortlist.kept["B"].name == "the flat one"
    panel.earlier.click()
    assert panel.menu.value == "A"
    assert shortlist.kept["A"].name == "the flat one"
    assert panel.earlier.disabled
    panel.drop.click()
    assert list(shortlist.kept) == ["B"]
    assert panel.menu.value == "B"
    panel.back.click()
    assert shortlist.kept["A"].name == "the flat one"
    assert panel.back.layout.display == "none"


def test_a_name_that_cannot_be_is_said(panel: ComparePanel) -> None:
    panel._state.shortlist.keep(other(10.0))
    panel.name.value = "x" * 5000
    assert panel._state.problems[""]
    assert panel._state.shortlist.kept["A"].name == FIRST.name


def test_a_closed_view_compares_nothing(panel: ComparePanel) -> None:
    panel._state.shortlist.keep(other(10.0))
    panel.opened(False)
    before = panel.table.value
    panel._state.give(quality_factor=300.0)
    assert panel.table.value == before
    panel.opened(True)
    assert panel.table.value != before


def test_names_are_text_and_no_markup(panel: ComparePanel) -> None:
    answer = panel._state.answer
    script = "<img src=x onerror=alert(1)>"
    design = replace(FIRST, name=script, note=script)
    words = compared(answer, "A", design, design.outcome(list(names_of(answer))))
    assert "<img" not in words
