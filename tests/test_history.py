"""Steps back and forward through what was asked of the page."""

from __future__ import annotations

import pytest

from explorer.page import state as module
from explorer.page.history import MOST, TOGETHER, History
from explorer.page.panels.steps import StepsPanel
from explorer.page.state import State
from explorer.question import Question
from explorer.scenario import first_question


def question(quality: float) -> Question:
    return Question(design=first_question().design.with_values(quality_factor=quality))


def test_each_change_is_a_step_and_going_back_ends_at_the_first() -> None:
    one, two, three = (question(q) for q in (10.0, 20.0, 30.0))
    history = History()
    history.note(one, "", 0.0)
    history.note(two, "", 0.1)
    assert history.back(three) == two
    assert history.back(two) == one
    assert history.back(one) is None
    assert history.forward(one) == two
    assert history.forward(two) == three
    assert history.forward(three) is None


def test_a_drag_is_one_step_and_two_drags_are_two() -> None:
    history, steps = History(), [question(10.0 + k) for k in range(6)]
    for k in range(3):
        history.note(steps[k], "quality_factor", k * 0.1)
    for k in range(3, 5):
        history.note(steps[k], "quality_factor", 0.2 + TOGETHER + k * 0.1)
    assert history.back(steps[5]) == steps[3]
    assert history.back(steps[3]) == steps[0]


def test_changes_of_two_inputs_are_two_steps_however_quick() -> None:
    history = History()
    history.note(question(1.0), "quality_factor", 0.0)
    history.note(question(2.0), "mode_volume", 0.01)
    assert len(history.past) == 2


def test_a_change_after_going_back_forgets_what_was_ahead() -> None:
    history = History()
    history.note(question(1.0), "a", 0.0)
    history.back(question(2.0))
    history.note(question(1.0), "a", 0.1)  # the same cause, but a step of its own
    assert history.future == []
    assert len(history.past) == 1


def test_no_more_steps_are_kept_than_said() -> None:
    history, present = History(), question(1.0)
    for k in range(MOST + 50):
        history.note(present, "", float(k))
    assert len(history.past) == MOST


@pytest.fixture
def state(monkeypatch: pytest.MonkeyPatch) -> State:
    """A page's state with a clock on which every change is long after the one before."""
    ticks = iter(range(0, 100_000, 10))
    monkeypatch.setattr(module.time, "monotonic", lambda: float(next(ticks)))
    return State(first_question())


def test_every_kind_of_change_is_undone_and_redone(state: State) -> None:
    seen = [state.question]

    def step() -> None:
        assert state.question != seen[-1]
        seen.append(state.question)

    state.give(quality_factor=100.0)
    step()
    state.give_range("lifetime", 3e-9, 4e-9)
    step()
    state.give_spread("quality_factor", None)
    step()
    state.take_record("emitter", "nv_nanodiamond")
    step()
    state.ask(shown="g2_zero")
    step()
    state.reset("quality_factor")
    step()
    for expected in reversed(seen[:-1]):
        state.undo()
        assert state.question == expected
        assert state.answer.question == expected
    state.undo()
    assert state.question == seen[0]
    for expected in seen[1:]:
        state.redo()
        assert state.question == expected


def test_what_is_refused_is_no_step(state: State) -> None:
    state.give(quality_factor=-1.0)
    assert state.history.past == []
    state.give(
        quality_factor=state.question.design.point["quality_factor"]
    )  # nothing new but origin
    before = len(state.history.past)
    state.ask(shown=state.question.shown)
    assert len(state.history.past) == before


def test_what_a_map_refuses_is_no_step(state: State) -> None:
    state.give(numerical_aperture=0.9)
    axis = state.question.x
    state.ask(x=type(axis)("numerical_aperture", 0.1, 0.95))
    steps = len(state.history.past)
    state.give(reference_side="glass", medium_index=1.5)
    state.ask(x=type(axis)("numerical_aperture", 0.1, 1.4))
    state.undo()
    state.give(medium_index=1.0)  # the axis may reach beyond it now, and is refused
    state.undo()
    assert state.answer.whole
    assert len(state.history.past) >= steps


def test_a_ranking_is_a_view_and_no_step(state: State) -> None:
    state.give(quality_factor=100.0)
    state.ask(ranked="rate_in_fibre")
    state.undo()
    assert state.question.ranked == "rate_in_fibre"
    assert state.question.design == first_question().design


def test_the_buttons_follow(state: State) -> None:
    panel = StepsPanel(state)
    assert panel.undo.disabled
    assert panel.redo.disabled
    state.give(quality_factor=100.0)
    assert not panel.undo.disabled
    panel.undo.click()
    assert panel.undo.disabled
    assert not panel.redo.disabled
    panel._hear(None, {"kind": "redo"}, [])
    assert state.question.design.point["quality_factor"] == 100.0
    panel._hear(None, {"kind": "undo"}, [])
    assert state.question == first_question()
