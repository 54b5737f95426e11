"""The page without a browser: what its state, its panels and their marks do."""

import asyncio
import time
from collections.abc import Iterator
from dataclasses import replace

import ipywidgets.widgets.widget as widgets
import numpy as np
import pytest
from ipywidgets import Widget

import explorer
import explorer.question as question_module
from explorer.catalogue import emitters, resonators
from explorer.design import Requirement
from explorer.inputs import EMITTER
from explorer.page.app import Explorer
from explorer.page.canvas import unpack
from explorer.page.panels.map import LAYERS
from explorer.page.state import State
from explorer.question import Answer, Question, default_axis
from explorer.scenario import first_question

SMALL = 24


def small_question() -> Question:
    """The first question on a coarse map: quick to answer."""
    question = first_question()
    return replace(question, x=replace(question.x, count=SMALL), y=replace(question.y, count=SMALL))


def living() -> set[str]:
    return set(widgets._instances)


@pytest.fixture(autouse=True)
def no_widget_left() -> Iterator[None]:
    """Fails a test that leaves a widget alive."""
    before = living()
    yield
    assert living() <= before, "widgets are left alive: close the page that made them"


@pytest.fixture
def state() -> State:
    return State(small_question())


@pytest.fixture
def page() -> Iterator[Explorer]:
    before = living()
    shown = Explorer(small_question())
    yield shown
    close(before)


def close(before: set[str]) -> None:
    """Close every widget made since."""
    for key in living() - before:
        if key in widgets._instances:
            widgets._instances[key].close()


def heard(state: State) -> list[Answer]:
    """Answers from now on."""
    answers: list[Answer] = []
    state.on_answer(answers.append)
    answers.clear()
    return answers


def panel(page: Explorer, name: str):
    """A panel by its class, wherever it sits."""
    found: list[Widget] = []

    def walk(widget: Widget) -> None:
        if f"panel-{name}" in getattr(widget, "_dom_classes", ()):
            found.append(widget)
        for child in getattr(widget, "children", ()):
            walk(child)

    walk(page)
    (only,) = found
    return only


def row_of(page: Explorer, name: str):
    (only,) = [
        row
        for row in panel(page, "values").children[1].children
        if f"input-{name}" in row._dom_classes
    ]
    return only


# -------------------------------------------------------------------- state


def test_a_listener_hears_the_present_answer_at_once(state) -> None:
    answers: list[Answer] = []
    state.on_answer(answers.append)
    assert answers == [state.answer]
    assert state.answer.whole


def test_giving_a_value_answers_once(state) -> None:
    answers = heard(state)
    state.give(quality_factor=50.0)
    assert [answer.whole for answer in answers] == [True]
    assert state.question.design.point["quality_factor"] == 50.0
    expected = explorer.evaluate(state.question.design.point, ["rate_in_fibre"])
    assert state.answer.outcome["rate_in_fibre"] == expected["rate_in_fibre"]


def test_equal_questions_notify_nobody(state) -> None:
    state.give(quality_factor=50.0)
    answers = heard(state)
    state.give(quality_factor=50.0)
    state.ask(shown=state.question.shown, x=state.question.x)
    state.ask(design=replace(state.question.design))
    state.reset("lateral_offset")
    assert answers == []


def test_reset_gives_the_default_back(state) -> None:
    state.give(numerical_aperture=0.3)
    state.reset("numerical_aperture")
    assert "numerical_aperture" not in state.question.design.point
    assert state.answer.values["numerical_aperture"] == 0.5


@pytest.mark.parametrize(
    ("values", "named"),
    [
        ({"quality_factor": -1.0}, "quality_factor"),
        ({"quality_factor": float("nan")}, "quality_factor"),
        ({"numerical_aperture": 1.4}, "medium_index"),
        ({"destination": "moon"}, "destination"),
        ({"lifetime": "long"}, "lifetime"),
        ({"colour": 3.0}, "colour"),
    ],
)
def test_what_cannot_be_is_one_sentence_and_the_answer_stays(state, values, named) -> None:
    before, answers, told = state.answer, heard(state), []
    state.on_problem(lambda: told.append(dict(state.problems)))
    state.give(**values)
    assert state.answer is before
    assert answers == []
    (sentence,) = state.problems.values()
    assert told == [state.problems]
    assert named in sentence
    assert "\n" not in sentence
    assert state.problems.keys() == values.keys()
    (name,) = values
    if name in state.answer.values:  # giving the present value settles it
        present = state.answer.values[name]
        state.give(**{name: present if isinstance(present, str) else float(present)})
        assert state.problems == {}


def test_a_question_that_cannot_be_is_refused(state) -> None:
    before = state.question
    state.ask(shown="beauty")
    state.ask(x=state.question.y)
    assert state.question is before
    assert state.problems


def test_an_axis_that_reaches_beyond_another_input_is_refused_and_nothing_else(state) -> None:
    """The aperture may not exceed the index of the medium: the map has no such cells."""
    before = state.question
    wide = replace(default_axis("numerical_aperture", SMALL), high=1.4, log=False)
    state.ask(y=wide)
    assert state.question == before
    assert state.answer.question == before
    (sentence,) = state.problems.values()
    assert "medium_index" in sentence
    state.give(quality_factor=60.0)
    assert state.answer.question.design.point["quality_factor"] == 60.0


@pytest.mark.parametrize("key", list(emitters()))
def test_taking_an_emitter_replaces_all_of_the_last_one(state, key) -> None:
    names = tuple(row.name for row in EMITTER)
    state.take_record("emitter", key, names)
    design = state.question.design
    values = emitters()[key].inputs()
    assert {name: design.point[name] for name in names if name in design.point} == {
        name: value for name, value in values.items() if name in names
    }
    assert design.emitter == key
    assert all(design.origin(name).kind != "typed" for name in values)
    assert state.answer.question is state.question
    state.give(lifetime=1.5e-9)
    assert state.question.design.origin("lifetime").kind == "typed"


def test_own_values_keep_the_numbers(state) -> None:
    point = dict(state.question.design.point)
    state.take_record("emitter", "", tuple(row.name for row in EMITTER))
    assert dict(state.question.design.point) == point
    assert state.question.design.emitter == ""


def test_taking_a_place_moves_the_point_alone(state) -> None:
    before = state.question.design
    drawn = state.answer.map
    state.take_place("micropillar", ("mode_volume", "quality_factor"))
    record = resonators()["micropillar"]
    after = state.question.design
    moved = {
        name
        for name in set(before.point) | set(after.point)
        if before.point.get(name) != after.point.get(name)
    }
    assert moved == {"mode_volume", "quality_factor"}
    assert after.point["quality_factor"] == record.values["quality_factor"].value_si
    assert after.origin("quality_factor").kind == record.values["quality_factor"].checked
    assert state.answer.map is drawn


@pytest.mark.parametrize(
    ("x", "y"),
    [
        ("mode_volume", "quality_factor"),
        ("fast_linewidth", "numerical_aperture"),
        ("lateral_offset", "slow_linewidth"),
    ],
)
def test_moving_the_point_along_the_axes_keeps_the_map(state, x, y) -> None:
    state.ask(x=default_axis(x, SMALL), y=default_axis(y, SMALL))
    drawn = state.answer.map
    for fraction in (0.2, 0.5, 0.9):
        values = {
            axis.name: float(axis.at(fraction)) for axis in (state.question.x, state.question.y)
        }
        state.give(**values)
        assert state.answer.map is drawn
        assert state.answer.whole
    other = "quantum_yield"
    state.give(**{other: 0.123})
    assert state.answer.map is not drawn


def test_a_point_at_zero_of_a_logarithmic_axis_is_answered(state) -> None:
    """Zero has no place on such an axis; the sentence still names the next step."""
    assert state.answer.values["slow_linewidth"] == 0
    state.ask(x=default_axis("slow_linewidth", SMALL))
    state.ask(y=default_axis("filter_width", SMALL))
    assert state.problems == {}
    assert state.question.y.name == "filter_width"
    assert state.answer.hint


# -------------------------------------------------------------------- long work


class Slow:
    """Stands for a map that takes long: every part of the answer takes a while."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, seconds: float) -> None:
        self.counts: list[int] = []
        self.rows: list[int] = []
        make = question_module.make_map

        def slow_map(point, x, y, *rest):
            self.counts.append(x.count)
            self.rows.append(y.count)
            time.sleep(seconds)
            return make(point, x, y, *rest)

        monkeypatch.setattr(question_module, "make_map", slow_map)


def test_a_long_map_arrives_in_parts(monkeypatch) -> None:
    state = State(first_question())
    state._answers._pace = 1e-4  # seconds a cell: seconds for a whole map
    work = Slow(monkeypatch, 0.06)

    async def ask() -> list[Answer]:
        answers = heard(state)
        state.give(fast_linewidth=5e-9)
        at_once = list(answers)
        assert at_once, "the readouts come first"
        assert at_once[-1].outcome["rate_in_fibre"] > 0
        assert not at_once[-1].whole
        while not state.answer.whole:
            await asyncio.sleep(0.01)
        return answers

    answers = asyncio.run(ask())
    assert [answer.whole for answer in answers] == [False] * (len(answers) - 1) + [True]
    assert len(answers) > 2
    assert work.counts == sorted(work.counts)
    assert work.counts[-1] == 256
    sizes = [answer.map.x.count for answer in answers[1:] if answer.map is not None]
    assert sizes == sorted(sizes)


def test_a_new_question_drops_the_rest_of_the_old(monkeypatch) -> None:
    state = State(first_question())
    state._answers._pace = 1e-4
    work = Slow(monkeypatch, 0.06)

    async def ask() -> list[Answer]:
        answers = heard(state)
        for width in (5e-9, 6e-9, 7e-9):
            state.give(fast_linewidth=width)
            state._answers._pace = 1e-4
            await asyncio.sleep(0.01)
        while not state.answer.whole:
            await asyncio.sleep(0.01)
        await asyncio.sleep(0.3)
        return answers

    answers = asyncio.run(ask())
    finished = [answer for answer in answers if answer.whole]
    assert len(finished) == 1
    assert finished[0].question.design.point["fast_linewidth"] == 7e-9
    whole = [rows for count, rows in zip(work.counts, work.rows, strict=True) if count == 256]
    assert sum(whole) == 256, "only the last question's map is worked out whole, each row once"


def test_wandering_measured_spectrum_is_answered_in_slices() -> None:
    """The dearest map there is: the loop is free again between its parts."""
    offsets = np.linspace(-60e-9, 60e-9, 241)
    spectrum = explorer.Samples(offsets, np.exp(-((offsets / 15e-9) ** 2)))
    state = State(small_question())
    state.give(spectrum=spectrum)

    async def ask() -> float:
        longest, last = 0.0, time.perf_counter()
        state.give(slow_linewidth=4e-9)
        while not state.answer.whole:
            await asyncio.sleep(0)
            now = time.perf_counter()
            longest, last = max(longest, now - last), now
        return longest

    asyncio.run(ask())
    assert state.answer.whole
    assert np.isfinite(state.answer.map.values["rate_in_fibre"]).all()


def test_without_an_event_loop_the_answer_is_whole_at_once(state) -> None:
    state._answers._pace = 1.0
    state.give(fast_linewidth=5e-9)
    assert state.answer.whole
    assert state.answer.map.x.count == SMALL


# -------------------------------------------------------------------- panels


def test_the_page_shows_what_the_state_answers(page) -> None:
    said = panel(page, "headline").text.value
    assert page.state.answer.sentence.headline in said
    assert "rate_in_fibre" in page.state.answer.outcome
    assert "160 M/s" in panel(page, "budget").table.value
    header, arrays = unpack(panel(page, "map").canvas.packed)
    assert header["shape"] == [SMALL, SMALL]
    np.testing.assert_allclose(
        arrays["values"].reshape(SMALL, SMALL),
        page.state.answer.map.values["rate_in_fibre"],
        rtol=1e-6,
    )


def test_a_value_given_in_code_moves_widgets_and_marks(page) -> None:
    colours, pattern = panel(page, "colours").plot, panel(page, "angles").pattern
    spectra, lobe = colours.packed, pattern.packed
    packed, point = panel(page, "map").canvas.packed, list(panel(page, "map").canvas.point)
    row = row_of(page, "fast_linewidth")
    place = row.slider.value
    page.state.give(fast_linewidth=5e-9)
    assert row.box.value == "5"
    assert row.slider.value < place
    assert colours.packed != spectra
    assert pattern.packed is lobe, "angles do not depend on the linewidth"
    assert panel(page, "map").canvas.packed != packed
    assert panel(page, "map").canvas.point == point
    page.state.give(mode_volume=30.0)
    assert pattern.packed != lobe
    assert panel(page, "map").canvas.point != point


def test_moving_the_point_sends_no_picture(page) -> None:
    canvas = panel(page, "map").canvas
    packed, drawn = canvas.packed, page.state.answer.map
    canvas.set_state({"point": [0.3, 0.6], "move_sent": 1})
    assert canvas.move_done == 1
    assert canvas.packed is packed
    assert page.state.answer.map is drawn
    axis = page.state.question.y
    expected = float(axis.at(0.6))
    assert page.state.answer.values["quality_factor"] == pytest.approx(expected, rel=1e-3)
    assert row_of(page, "quality_factor").box.value != "25"


def test_a_slider_gives_its_value_and_the_box_follows(page) -> None:
    row = row_of(page, "quality_factor")
    row.slider.value = row.slider.value + 0.05
    value = page.state.question.design.point["quality_factor"]
    assert value > 25
    assert float(row.box.value) == value
    row.box.value = "1e3"
    assert page.state.question.design.point["quality_factor"] == 1000.0


def test_nonsense_in_a_box_is_said_beside_it_and_only_there(page) -> None:
    row, before = row_of(page, "quality_factor"), page.state.answer
    row.box.value = "plenty"
    assert "plenty" in row.wrong.value
    assert row.box.value == "plenty", "what was typed stays to be mended"
    assert page.state.answer is before
    assert panel(page, "headline").wrong.value == ""
    assert row_of(page, "mode_volume").wrong.value == ""
    page.state.give(mode_volume=2.0)
    assert row.wrong.value, "another change does not hide it"
    row.box.value = "70"
    assert row.wrong.value == ""
    assert page.state.answer.values["quality_factor"] == 70.0


def test_a_given_spectrum_stands_in_for_the_linewidth(page) -> None:
    """A slider that does nothing must not look as if it did."""
    row = row_of(page, "fast_linewidth")
    assert not row.slider.disabled
    page.state.take_record("emitter", "inas_gaas_dot", tuple(row.name for row in EMITTER))
    assert page.state.answer.values["spectrum"] is not None
    assert row.slider.disabled
    assert row.box.disabled
    assert row.box.value == "spectrum"
    page.state.reset("spectrum")
    assert not row.slider.disabled
    assert row.box.value == "20"


def test_requirements_are_edited_in_place(page) -> None:
    wanted = panel(page, "wanted")
    line = wanted.rows.children[0]
    line.children[2].value = "5 M/s"
    assert page.state.question.design.requirements[0] == Requirement("rate_in_fibre", at_least=5e6)
    assert page.state.answer.sentence.met is True
    assert "x-missed" not in wanted.rows.children[0]._dom_classes
    wanted.rows.children[0].children[2].value = "lots"
    assert "lots" in wanted.wrong.value
    assert page.state.question.design.requirements[0].limit == 5e6


def test_switches_turn_layers_on_and_off(page) -> None:
    shown = panel(page, "map")
    for name, switch in shown.switches.items():
        on = name in page.state.question.layers
        switch.value = not on
        assert (name in page.state.question.layers) is not on
        header, _ = unpack(shown.canvas.packed)
        if name == "scales":
            assert header["right"]
    assert set(shown.switches) == set(LAYERS)


def test_files_come_and_go_as_messages(page) -> None:
    files = panel(page, "files")
    sent: list[tuple[dict, list[bytes]]] = []
    files.files.send = lambda content, buffers=None: sent.append((content, buffers))
    files._hear(files.files, {"kind": "save"}, [])
    (content, (text,)) = sent[0]
    assert content["name"] == "harbour-to-lighthouse.json"
    before = page.state.question.design
    page.state.give(quality_factor=900.0)
    files._hear(files.files, {"kind": "load", "name": "a.json"}, [memoryview(text)])
    assert page.state.question.design == before
    files._hear(files.files, {"kind": "load", "name": "a.json"}, [memoryview(text[:200])])
    assert "a.json" in page.state.problems[""]
    assert page.state.question.design == before
    assert "a.json" in panel(page, "headline").wrong.value


def test_a_text_from_a_file_is_no_markup(page) -> None:
    page.state.refuse("", "<img src=x onerror=alert(1)>")
    assert "<img" not in panel(page, "headline").wrong.value


def test_two_pages_have_two_states(page) -> None:
    before = living()
    other = Explorer(small_question())
    try:
        other.state.give(quality_factor=321.0)
        assert page.state.answer.values["quality_factor"] == 25.0
        assert row_of(page, "quality_factor").box.value == "25"
        assert row_of(other, "quality_factor").box.value == "321"
    finally:
        close(before)


def test_a_question_checks_itself() -> None:
    with pytest.raises(explorer.InputError):
        Question(shown="beauty")
