"""The page without a browser: what its state, its panels and their marks do."""

import asyncio
import time
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

import comm
import ipywidgets.widgets.widget as widgets
import numpy as np
import pytest
from comm.base_comm import BaseComm
from ipywidgets import Widget

import explorer
import explorer.answers as answers_module
from explorer.advice import record_cautions
from explorer.answers import Answers
from explorer.catalogue import emitters, resonators
from explorer.design import Requirement
from explorer.inputs import EMITTER
from explorer.maps import Axis
from explorer.page.app import Explorer
from explorer.page.bind import InputRow
from explorer.page.canvas import unpack
from explorer.page.panels.cut import fitted
from explorer.page.panels.map import LAYERS
from explorer.page.panels.wanted import limit_of
from explorer.page.state import State
from explorer.question import Answer, Question, default_axis
from explorer.registry import REGISTRY
from explorer.scenario import first_question
from explorer.sentence import hindrance, next_step
from explorer.units import text

SMALL = 24


def small_question() -> Question:
    """The first question on a coarse map and without scatter: quick to answer."""
    question = first_question()
    question = replace(question, design=replace(question.design, scatter={}))
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
    state.give(medium_index=1.52)
    state.reset("medium_index")
    assert "medium_index" not in state.question.design.point
    assert state.answer.values["medium_index"] == 1.0


def test_reset_gives_a_published_value_back_with_its_origin_and_range(state) -> None:
    before = state.question.design
    assert before.unknowns.keys() >= {"lifetime", "optics_transmission"}
    state.give(numerical_aperture=0.3, lifetime=1e-6, optics_transmission=0.9)
    assert state.question.design.unknowns.keys().isdisjoint({"lifetime", "optics_transmission"})
    state.reset("numerical_aperture", "lifetime", "optics_transmission")
    assert state.question.design == before
    state.take_record("emitter", "")
    state.reset("lifetime")
    assert state.answer.values["lifetime"] == 20e-9, "own values go back to the default"


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
    assert state.problems == {
        "": "The vertical axis reaches 1.4 (Numerical aperture), but must stay below 1 where "
        "Medium index is 1"
    }
    state.give(quality_factor=60.0)
    assert state.answer.question.design.point["quality_factor"] == 60.0


@pytest.mark.parametrize("key", list(emitters()))
def test_taking_an_emitter_replaces_all_of_the_last_one(state, key) -> None:
    names = tuple(row.name for row in EMITTER)
    state.take_record("emitter", key)
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
    state.take_record("emitter", "")
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


def test_a_design_names_a_resonator_while_q_and_v_are_its_own(state) -> None:
    names = ("mode_volume", "quality_factor")
    state.take_place("micropillar", names)
    assert state.question.design.resonator == "micropillar"
    state.give(refractive_index=3.0, lateral_offset=5e-9)
    assert state.question.design.resonator == "micropillar"
    state.give(mode_volume=7.0)
    assert state.question.design.resonator == ""
    state.take_place("micropillar", names)
    state.give(quality_factor=77.0)
    assert state.question.design.resonator == ""
    assert "resonator_beam" not in dict(record_cautions(state.question.design))
    state.take_place("dielectric_bowtie", names)
    assert "resonator_beam" in dict(record_cautions(state.question.design))


REFUSED = {
    "The horizontal axis reaches 150 nm (Linewidth, slow), but must stay below 132 nm where Emission "
    "wavelength is 220 nm": (
        {"emission_wavelength": 220e-9},
        {"x": default_axis("slow_linewidth")},
    ),
    "The horizontal axis reaches 1 (Medium index), but there Numerical aperture must stay below 1, "
    "and it is 1.2": (
        {"medium_index": 1.52, "numerical_aperture": 1.2},
        {"x": default_axis("medium_index", SMALL)},
    ),
    "The horizontal axis reaches 1 (Medium index) and the vertical axis reaches 1.49 (Numerical "
    "aperture), but must stay below 1": (
        {},
        {"x": default_axis("medium_index", SMALL), "y": default_axis("numerical_aperture", SMALL)},
    ),
    "The vertical axis reaches 300 nm (Emission wavelength), which emission spectrum does not allow": (
        {
            "spectrum": explorer.Lines([(0.5, 0.0, 1e-9), (0.5, 3e-6, 1e-9)]),
            "emission_wavelength": 6e-7,
        },
        {"y": default_axis("emission_wavelength")},
    ),
}


@pytest.mark.parametrize("sentence", list(REFUSED))
def test_a_map_says_what_it_refuses_in_terms_of_its_axes(state, sentence) -> None:
    given, changes = REFUSED[sentence]
    state.give(**given)
    before = state.question
    assert state.problems == {}
    state.ask(**changes)
    assert state.question == before
    assert state.problems == {"": sentence}


def test_a_menu_takes_an_axis_as_far_as_the_design_allows(page) -> None:
    shown = panel(page, "map")
    page.state.give(emission_wavelength=220e-9)
    for name, high in (("numerical_aperture", 1.0), ("slow_linewidth", 0.6 * 220e-9)):
        shown.across.value = name
        assert page.state.problems == {}
        assert page.state.question.x.name == name
        assert page.state.question.x.high == pytest.approx(high)
        page.state.ask(cut=("rate_in_fibre", name))
        assert page.state.answer.cut_fault == ""


def test_a_value_that_the_map_refuses_is_said_beside_its_input(state) -> None:
    state.ask(x=default_axis("slow_linewidth"))
    state.give(emission_wavelength=220e-9)
    assert state.problems.keys() == {"emission_wavelength"}
    assert state.answer.values["emission_wavelength"] == 580e-9


def test_a_hint_is_that_of_its_own_map() -> None:
    """Maps come and go, and a later one may stand where an earlier one stood in memory."""
    answers = Answers()
    axes = {
        "x": Axis("mode_volume", 1e-4, 1e3, count=16),
        "y": Axis("quality_factor", 3.0, 1e6, count=16),
    }
    design = replace(first_question().design, scatter={})
    for step in range(300):  # every other one is met, and asks the map for no hint
        limit = 1e6 if step % 2 else 9e6 * 1.02 ** (step % 97)
        wanted = (Requirement("rate_in_fibre", at_least=limit),)
        answer = answers.answer(Question(replace(design, requirements=wanted), **axes))
        place = tuple(float(answer.values[axis.name]) for axis in axes.values())
        expected = "" if answer.sentence.met else next_step(answer.map, place, wanted)
        assert answer.hint == expected
        if expected:
            assert answers._kept._parts["hint"][0][0] is answer.map, "its key holds the map"


# -------------------------------------------------------------------- cut


def test_a_cut_that_cannot_be_made_stands_in_nobodys_way(state) -> None:
    state.ask(cut=("rate_in_fibre", "medium_index"))
    assert state.answer.cut is not None
    assert state.answer.cut_fault == ""
    state.give(medium_index=1.52)
    state.give(numerical_aperture=1.2)
    assert state.problems == {}
    assert state.answer.values["numerical_aperture"] == 1.2
    assert state.answer.cut is None
    assert state.answer.cut_fault == (
        "The cut reaches 1 (Medium index), but there Numerical aperture must stay below 1, and "
        "it is 1.2"
    )
    state.give(numerical_aperture=0.9)
    assert state.answer.cut is not None


def test_the_cut_panel_follows_the_question(page) -> None:
    shown = panel(page, "cut")
    page.state.give(medium_index=1.52, numerical_aperture=1.2)
    shown.head.click()
    assert page.state.question.cut == ("rate_in_fibre", "quality_factor")
    shown.along.value = "medium_index"
    assert page.state.question.cut == ("rate_in_fibre", "medium_index")
    assert "Medium index" in shown.wrong.value
    assert shown.plot.children == ()
    page.state.ask(cut=("g2_zero", "lifetime"))
    assert (shown.quantity.value, shown.along.value) == ("g2_zero", "lifetime")
    assert shown.wrong.value == ""
    assert len(shown.plot.children) == 1
    page.state.ask(cut=None)
    assert shown.body.layout.display == "none"


def test_a_cut_says_what_it_shows_and_in_which_unit(page) -> None:
    shown = panel(page, "cut")
    page.state.ask(cut=("device_lifetime", "quality_factor"))
    label = shown.axes[1].label
    quantity = REGISTRY.quantities["device_lifetime"]
    unit = label.removeprefix(f"{quantity.label}, ")
    assert unit in ("ps", "ns")
    factor = {"ps": 1e12, "ns": 1e9}[unit]
    np.testing.assert_allclose(shown.curve.y, page.state.answer.cut.quantity * factor, rtol=1e-12)


@pytest.mark.parametrize(
    ("values", "unit", "shown", "label"),
    [
        ([2e-9, 4e-9], "s", [2, 4], "ns"),
        ([0.0, np.nan], "s", [0, np.nan], "s"),
        ([650e-9, 2e-6], "m", [0.65, 2], "µm"),
        ([3e6, 2e7], "1/s", [3, 20], "M/s"),
        ([np.pi], "rad", [180], "°"),
        ([2 * np.pi * 5e9], "rad/s", [5], "2π × GHz"),
        ([0.2, 0.4], "1", [0.2, 0.4], ""),
    ],
)
def test_a_unit_fits_what_is_shown(values, unit, shown, label) -> None:
    found, name = fitted(values, unit)
    np.testing.assert_allclose(found, shown)
    assert name == label


# -------------------------------------------------------------------- words


def test_a_step_that_stops_everything_is_the_worst(state) -> None:
    rows = list(state.answer.rows)
    at = next(index for index, row in enumerate(rows) if row.step == "through the filter")
    rows[at] = replace(rows[at], factor=0.0, total=0.0)
    for index in range(at + 1, len(rows)):
        rows[index] = replace(rows[index], factor=float("nan"), total=0.0)
    assert hindrance(rows) == "no light passes the filter"


def test_a_filter_that_nothing_passes_is_named(state) -> None:
    offsets = np.linspace(-20e-9, 20e-9, 81)
    spectrum = explorer.Samples(offsets, np.maximum(1 - (offsets / 15e-9) ** 2, 0))
    state.give(spectrum=spectrum, filter_width=1e-9, filter_centre=1.2e-6)
    assert state.answer.outcome["rate_in_fibre"] == 0
    assert "no light passes the filter" in state.answer.sentence.detail


def test_the_pump_is_named_as_it_works(state) -> None:
    state.give(excitations_per_pulse=0.01)
    assert "most is lost to pulses that excite nothing" in state.answer.sentence.detail
    state.give(pumping="continuous", saturation=0.01)
    assert "pulse" not in state.answer.sentence.detail
    rows = [replace(row, factor=None if row.factor is None else 1.0) for row in state.answer.rows]
    rows[1] = replace(rows[1], factor=0.5)
    assert hindrance(rows, True) == "most is lost to the time until the next excitation (×2.0)"


def test_in_free_space_no_fibre_is_spoken_of(page) -> None:
    state = page.state
    assert "Photons/s in the fibre" in dict(panel(page, "map").shown.options)
    two = (
        Requirement("g2_zero", at_most=0.5),
        Requirement("rate_in_fibre", at_least=1e6),
    )
    state.ask(design=replace(state.question.design, requirements=two))
    assert "photons/s in the fibre" in state.answer.sentence.detail
    state.give(destination="free_space")
    assert "photons/s behind the optics" in state.answer.sentence.detail
    assert "fibre" not in state.answer.sentence.detail
    shown = panel(page, "map")
    assert "Photons/s behind the optics" in dict(shown.shown.options)
    assert shown.shown.value == "rate_in_fibre"
    header, _ = unpack(shown.canvas.packed)
    assert header["colour"]["title"] == "Photons/s behind the optics"
    assert all("fibre" not in note["text"] for note in header["labels"])
    assert "behind the optics" in panel(page, "wanted").rows.children[1].children[0].value


# -------------------------------------------------------------------- long work


class Slow:
    """Stands for a map that takes long: every part of the answer takes a while."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, seconds: float) -> None:
        self.counts: list[int] = []
        self.rows: list[int] = []
        make = answers_module.make_map

        def slow_map(point, x, y, *rest):
            self.counts.append(x.count)
            self.rows.append(y.count)
            time.sleep(seconds)
            return make(point, x, y, *rest)

        monkeypatch.setattr(answers_module, "make_map", slow_map)


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
    assert finished
    assert {answer.question.design.point["fast_linewidth"] for answer in finished} == {7e-9}
    whole = [rows for count, rows in zip(work.counts, work.rows, strict=True) if count == 256]
    assert sum(whole) == 256, "only the last question's map is worked out whole, each row once"


def test_a_refusal_keeps_what_was_accepted_before_it() -> None:
    """The map refuses an axis while that of the last change is not whole yet."""
    state = State(small_question())

    async def ask() -> None:
        state.give(emission_wavelength=240e-9)
        while not state.answer.whole:
            await asyncio.sleep(0.01)
        state._answers._pace = 1e-4
        state.give(numerical_aperture=0.8)
        assert not state.answer.whole
        state.ask(x=default_axis("fast_linewidth"))
        assert "horizontal axis" in state.problems[""]
        assert state.question.design.point["numerical_aperture"] == 0.8
        while not state.answer.whole:
            await asyncio.sleep(0.01)

    asyncio.run(ask())
    assert state.answer.question == state.question
    assert state.answer.values["numerical_aperture"] == 0.8
    assert state.answer.map.x.name == "mode_volume"
    assert "horizontal axis" in state.problems[""]


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


def moved(page: Explorer, across: float, up: float) -> None:
    """The browser says where its ring is."""
    canvas = panel(page, "map").canvas
    canvas.set_state({"point": [across, up], "move_sent": canvas.move_sent + 1})


def test_moving_along_one_axis_leaves_the_other_input_alone(page) -> None:
    canvas = panel(page, "map").canvas
    page.state.give(quality_factor=12345.678)
    moved(page, 0.3, canvas.point[1])
    assert page.state.question.design.point["quality_factor"] == 12345.678
    assert page.state.question.design.point["mode_volume"] != 1.0
    page.state.give(medium_index=1.52)
    page.state.ask(y=default_axis("numerical_aperture", SMALL))
    origin = page.state.question.design.origin("numerical_aperture")
    assert origin.kind != "typed"
    moved(page, 0.4, canvas.point[1])
    assert page.state.question.design.origin("numerical_aperture") == origin
    volume = page.state.question.design.point["mode_volume"]
    moved(page, canvas.point[0], 0.2)
    assert page.state.question.design.point["mode_volume"] == volume
    assert page.state.question.design.origin("numerical_aperture").kind == "typed"


def test_a_small_change_of_an_input_is_not_undone_by_a_move_along_the_other(page) -> None:
    canvas = panel(page, "map").canvas
    page.state.ask(y=default_axis("resonance_wavelength", SMALL))
    page.state.give(resonance_wavelength=737.1e-9)
    page.state.give(resonance_wavelength=737.4e-9)
    axis = page.state.question.y
    assert canvas.point[1] == pytest.approx(float(axis.fraction(737.4e-9)), abs=1e-12)
    moved(page, 0.3, canvas.point[1])
    assert page.state.question.design.point["resonance_wavelength"] == 737.4e-9


@pytest.mark.parametrize("up", [1.0, 1.05])
def test_an_input_beyond_the_map_stays_when_the_point_moves_along_the_other(page, up) -> None:
    page.state.give(quality_factor=1e8)
    moved(page, 0.3, up)
    assert page.state.question.design.point["quality_factor"] == 1e8
    assert panel(page, "map").canvas.point[1] == 1.05
    moved(page, 0.3, 0.99)
    assert page.state.question.design.point["quality_factor"] < 1e6


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


def opened(page: Explorer, group: str, name: str):
    """The row of an input in a group that is opened for it."""
    (box,) = [box for box in panel(page, "values").children if f"group-{group}" in box._dom_classes]
    box.head.click()
    (row,) = [row for row in box.rows.children if f"input-{name}" in row._dom_classes]
    return row


@pytest.mark.parametrize("how", ["emitter", "load", "load the same"])
def test_what_was_typed_wrongly_goes_when_its_part_is_replaced(page, how) -> None:
    row, state = opened(page, "emitter", "biexciton_shift"), page.state
    shown = row.box.value
    design = state.question.design
    row.box.value = "abc"
    assert "abc" in row.wrong.value
    state.give(quality_factor=30.0)
    assert "abc" in row.wrong.value
    if how == "load the same":
        design = state.question.design
    if how == "emitter":
        panel(page, "emitter").menu.value = "nv_bulk"
    else:
        state.ask(design=design)
    assert row.wrong.value == ""
    assert row.box.value == shown
    assert state.problems == {}


def test_a_wrong_requirement_goes_with_the_design(page) -> None:
    wanted = panel(page, "wanted")
    wanted.rows.children[0].children[2].value = "lots"
    assert "lots" in wanted.wrong.value
    assert panel(page, "headline").wrong.value == ""
    page.state.give(quality_factor=30.0)
    assert "lots" in wanted.wrong.value
    page.state.ask(design=page.state.question.design)
    assert wanted.wrong.value == ""
    assert wanted.rows.children[0].children[2].value == "20.0 M/s"


def test_a_problem_without_a_row_is_said_in_the_headline(page) -> None:
    state, headline = page.state, panel(page, "headline")
    state.give(medium_index=1.52, numerical_aperture=1.2)
    panel(page, "map").across.value = "medium_index"
    assert panel(page, "map").across.value == "mode_volume"
    assert "The horizontal axis reaches 1 (Medium index)" in headline.wrong.value
    state.give(quality_factor=30.0)
    assert headline.wrong.value == ""
    state.give(spectrum=3.0)
    assert "Emission spectrum" in headline.wrong.value
    state.take_record("emitter", "nv_bulk")
    assert headline.wrong.value == ""
    state.give(biexciton_shift=1.0)
    assert "Biexciton shift" in headline.wrong.value
    row = opened(page, "emitter", "biexciton_shift")
    assert headline.wrong.value == ""
    assert "range" in row.wrong.value
    assert row.box.value == "0"


@pytest.mark.parametrize("limit", [1.2e-6, 35e-9])
def test_a_bare_number_keeps_the_unit_that_is_shown(limit) -> None:
    entry = Requirement("mode_radius", at_most=limit)
    shown = text(limit, "m")
    unit = shown.split()[1]
    assert limit_of(entry, "2") == explorer.units.to_si(2.0, unit)
    assert limit_of(entry, "2.5e1") == explorer.units.to_si(25.0, unit)
    assert limit_of(entry, "2 nm") == 2e-9
    assert limit_of(entry, shown) == limit


def test_a_bare_number_keeps_prefix_and_angle() -> None:
    rate = Requirement("rate_in_fibre", at_least=20e6)
    assert limit_of(rate, "5") == 5e6
    assert limit_of(replace(rate, at_least=3e3), "5") == 5e3
    assert limit_of(replace(rate, at_least=0.0), "5") == 5.0
    assert limit_of(Requirement("half_angle", at_most=0.5), "30") == np.radians(30)
    assert limit_of(Requirement("g2_zero", at_most=0.1), "0.2") == 0.2
    width = Requirement("resonator_linewidth", at_most=2 * np.pi * 5e9)
    assert limit_of(width, "7") == pytest.approx(2 * np.pi * 7e9)
    assert limit_of(replace(width, at_most=0.0), "7") == 7.0


@pytest.mark.parametrize("size", [0.0, 3.3e-9, 0.25, 40.0, 5.1e7, 6.2e13, 7.7e16])
@pytest.mark.parametrize(
    "name", ["rate_in_fibre", "half_angle", "g2_zero", "device_lifetime", "resonator_linewidth"]
)
def test_what_a_requirement_shows_can_be_typed_back(name, size) -> None:
    entry = Requirement(name, at_least=size)
    shown = text(size, REGISTRY.quantities[name].unit)
    assert limit_of(entry, shown) == size
    if size:  # and over another limit
        found = limit_of(Requirement(name, at_least=2.0), shown)
        assert found == pytest.approx(size, rel=0.006)


def test_an_edited_emitter_says_so_and_comes_back(page) -> None:
    shown, name = panel(page, "emitter"), emitters()["terrylene_crystal"].name
    before = page.state.question.design

    def band() -> str:
        header, _ = unpack(panel(page, "map").canvas.packed)
        (own,) = [band["text"] for band in header["bands"] if band["own"]]
        return own

    assert (shown.menu.label, band()) == (name, name)
    assert shown.published.layout.display == "none"
    page.state.give(fast_linewidth=1e-9, lifetime=1e-6)
    assert (shown.menu.label, band()) == (f"{name}, edited", f"{name}, edited")
    assert shown.menu.value == "terrylene_crystal"
    row = row_of(page, "fast_linewidth")
    assert not row.back.disabled
    row.back.click()
    assert row.box.value == "35"
    assert row.back.disabled
    assert shown.menu.label == f"{name}, edited"
    shown.published.click()
    assert page.state.question.design == before
    assert (shown.menu.label, band()) == (name, name)
    assert shown.published.layout.display == "none"


def test_a_hatched_cell_names_its_cautions(page) -> None:
    shown = panel(page, "map")
    shown.switches["hatching"].value = True
    page.state.give(radiative_share=0.5)
    header, arrays = unpack(shown.canvas.packed)
    texts = header["caution_texts"]
    assert REGISTRY.cautions["low_quality"].label in texts
    assert REGISTRY.cautions["absorbing_small_mode"].label in texts
    assert len(texts) <= 8
    bits = arrays["cautioned"].reshape(SMALL, SMALL)
    question = page.state.question
    low = bits >> texts.index(REGISTRY.cautions["low_quality"].label) & 1
    assert np.array_equal(low, np.broadcast_to(question.y.values[:, None] < 5, low.shape))
    small = bits >> texts.index(REGISTRY.cautions["absorbing_small_mode"].label) & 1
    assert np.array_equal(small, np.broadcast_to(question.x.values[None, :] < 1e-3, low.shape))
    assert np.array_equal(bits > 0, page.state.answer.map.caution)


def test_cautions_of_the_records_are_listed(page) -> None:
    key = next(
        key
        for key, entry in emitters().items()
        if "emitter_reference"
        in dict(record_cautions(replace(page.state.question.design, emitter=key)))
    )
    page.state.take_record("emitter", key)
    for _, sentence in record_cautions(page.state.question.design):
        assert sentence[:40].replace("'", "&#x27;") in panel(page, "cautions").list.value


def test_a_given_spectrum_stands_in_for_the_linewidth(page) -> None:
    """A slider that does nothing must not look as if it did."""
    row = row_of(page, "fast_linewidth")
    assert not row.slider.disabled
    page.state.take_record("emitter", "inas_gaas_dot")
    assert page.state.answer.values["spectrum"].follows
    assert not row.slider.disabled, "its line takes the width of the point"
    page.state.take_record("emitter", "siv_nanodiamond")
    assert page.state.answer.values["spectrum"] is not None
    assert row.slider.disabled
    assert row.box.disabled
    assert row.box.value == "spectrum"
    page.state.take_record("emitter", "")
    page.state.reset("spectrum")
    assert not row.slider.disabled


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
    files.save.send = lambda content, buffers=None: sent.append((content, buffers))
    files.save._hear(None, {"kind": "fetch"}, [])
    (content, (text,)) = sent[0]
    assert content["name"] == "harbour-to-lighthouse.json"
    before = page.state.question.design
    page.state.give(quality_factor=900.0)
    files.load._hear(None, {"kind": "file", "name": "a.json"}, [memoryview(text)])
    assert page.state.question.design == before
    files.load._hear(None, {"kind": "file", "name": "a.json"}, [memoryview(text[:200])])
    assert "a.json" in page.state.problems[""]
    assert page.state.question.design == before
    assert "a.json" in panel(page, "headline").wrong.value
    files.load._hear(None, {"kind": "too large", "name": "b.json", "size": 3e7}, [])
    assert page.state.problems[""] == "b.json has 30 MB; a design has at most 20 MB"


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


def test_a_temperature_that_changes_nothing_says_so(page) -> None:
    row = InputRow(page.state, "temperature")
    assert row.range.value == "no effect: no law of the linewidth"
    page.state.take_record("emitter", "siv_bulk")
    assert row.range.value == ""
    before = page.state.answer.values["fast_linewidth"]
    page.state.give(temperature=77.0)
    assert page.state.answer.values["fast_linewidth"] < before
    page.state.give(fast_linewidth=1e-9)
    assert row.range.value == "no effect: the linewidth is given"


def test_the_page_fits_between_kernel_and_server(monkeypatch: pytest.MonkeyPatch) -> None:
    """Their sockets hold 1000 messages on each side; what goes beyond is dropped where the server lags."""
    sent: list[str] = []

    class Counted(BaseComm):
        def publish_msg(self, msg_type: str, *_: Any, **__: Any) -> None:
            sent.append(msg_type)

    monkeypatch.setattr(comm, "create_comm", Counted)
    before = living()
    Explorer()
    assert "comm_open" in sent
    assert len(sent) < 1600
    close(before)
