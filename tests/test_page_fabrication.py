"""The page's fabrication: scatter, the devices that pass, what limits a design, and what it would take."""

from __future__ import annotations

import asyncio
import json
import math
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from itertools import pairwise
from typing import Any

import ipywidgets.widgets.widget as widgets
import numpy as np
import pytest
from jsonschema import Draft202012Validator
from scipy.special import ndtr

import explorer.answers as answers_module
import explorer.later as later_module
import explorer.page.panels.search as search_module
from explorer import Axis, Design, InputError, Requirement, Spread, Unknown
from explorer.fabrication import passing_cut
from explorer.inputs import INPUTS
from explorer.page.bind import InputRow
from explorer.page.canvas import unpack
from explorer.page.findings import DEVICES, survival
from explorer.page.panels.cut import CutPanel
from explorer.page.panels.headline import HeadlinePanel
from explorer.page.panels.limits import LEVERS, LimitsPanel
from explorer.page.panels.map import DRAWING, DRAWN, STOPPED, MapPanel
from explorer.page.panels.search import SearchPanel
from explorer.page.panels.wanted import WantedPanel
from explorer.page.proposal import Proposal, found_by_search, moved_to
from explorer.page.spreads import other_kind, spread_words
from explorer.page.state import State
from explorer.page.views import Views
from explorer.question import Answer, Question
from explorer.reading import ReadingError, read_spread
from explorer.record import design_from, design_text
from explorer.scenario import first_question
from explorer.schema import schema
from explorer.search import Found
from explorer.sentence import hundred, in_labels, passing_words
from explorer.sturdy import ROUNDS, sturdiest, sturdiest_steps
from explorer.unknowns import Range
from explorer.yield_maps import make_yield_map
from explorer.yields import PASSING, Share, Yield, yield_of

#: F = 3Q/(4π²V), so with Q alone scattering in its logarithm the share that passes is a normal one.
PURCELL = 3 * 100 / (4 * math.pi**2)
WIDTH = 0.2


def limited(score: float) -> Requirement:
    """A limit so many standard deviations below the Purcell factor of the design: Φ(score) pass."""
    return Requirement("peak_purcell", at_least=PURCELL * math.exp(-score * WIDTH))


def design_of(score: float = 1.0, **parts: Any) -> Design:
    known: dict[str, Any] = {
        "point": {"quality_factor": 100.0, "mode_volume": 1.0},
        "requirements": (limited(score),),
        "scatter": {"quality_factor": Spread("lognormal", WIDTH)},
    }
    return Design(**known | parts)


def question_of(design: Design, cells: int = 8, **parts: Any) -> Question:
    return Question(
        design,
        x=Axis("mode_volume", 0.05, 20.0, count=cells),
        y=Axis("quality_factor", 5.0, 2000.0, count=cells),
        **parts,
    )


def state_of(design: Design | None = None, cells: int = 8, **parts: Any) -> State:
    return State(question_of(design_of() if design is None else design, cells, **parts))


def heard(state: State) -> list[Answer]:
    """Answers from now on."""
    answers: list[Answer] = []
    state.on_answer(answers.append)
    answers.clear()
    return answers


def typed(box: Any, words: str) -> None:
    """What a person types into a box, Enter at the end."""
    box.value = words


def one_sentence(said: str) -> None:
    assert said
    assert "\n" not in said
    assert len(said) < 200


@pytest.fixture(autouse=True)
def no_widget_left() -> Iterator[None]:
    """Closes what a test made."""
    before = set(widgets._instances)
    yield
    for key in set(widgets._instances) - before:
        if key in widgets._instances:
            widgets._instances[key].close()


# -------------------------------------------------------------------- numbers with ± as people type them


@pytest.mark.parametrize(
    ("text", "unit", "value", "width"),
    [
        ("25 ± 3", "1", 25.0, 3.0),
        ("25±3", "1", 25.0, 3.0),
        ("25 +/- 3", "1", 25.0, 3.0),
        ("25+-3", "1", 25.0, 3.0),
        ("637 ± 2 nm", "nm", 637e-9, 2e-9),
        ("637 nm ± 2 nm", "nm", 637e-9, 2e-9),
        ("637 nm ± 2", "nm", 637e-9, 2e-9),
        ("0.637 µm ± 2 nm", "nm", 637e-9, 2e-9),
        ("637 ± 2", "nm", 637e-9, 2e-9),
        ("1,5 ± 0,2 ns", "ns", 1.5e-9, 0.2e-9),
        ("100 ± 10 %", "nm", 100e-9, 10e-9),
        ("100 nm ± 10 %", "nm", 100e-9, 10e-9),
        ("-40 ± 10 %", "nm", -40e-9, 4e-9),
        ("80 % ± 5 %", "1", 0.8, 0.05),
        ("1E4 ± 1E3", "1", 1e4, 1e3),
        ("1×10^4 ± 500", "1", 1e4, 500.0),
        ("-5 ± 2", "nm", -5e-9, 2e-9),
        ("25 ± 0", "1", 25.0, 0.0),
        ("25 ± -3", "1", 25.0, -3.0),
    ],
)
def test_numbers_with_more_and_less(text: str, unit: str, value: float, width: float) -> None:
    assert read_spread(text, unit) == pytest.approx((value, width), rel=1e-12)


@pytest.mark.parametrize("text", ["25", "3–4", "about 3", "± 3", "25 ±", "∞ ± 3", "", "25 ± x"])
def test_what_is_no_number_with_more_and_less_is_left_to_others(text: str) -> None:
    assert read_spread(text, "1") is None


@pytest.mark.parametrize("text", ["25 ± 3 kg", "25 kg ± 3", "25 ± 1.2.3", "25 ± 1e400", "3-4 ± 1"])
def test_a_width_that_cannot_be_read_is_refused_in_words(text: str) -> None:
    with pytest.raises(ReadingError) as caught:
        read_spread(text, "nm")
    one_sentence(str(caught.value))


# -------------------------------------------------------------------- scatter beside a slider


def test_a_press_begins_with_a_sensible_scatter_and_opens_its_line() -> None:
    state = state_of(design_of(scatter={}))
    row = InputRow(state, "quality_factor")
    assert row.scatter.description == "±"
    row.scatter.click()
    assert state.question.design.scatter == {"quality_factor": Spread("lognormal", 0.1)}
    assert row.scatter.description == "±10 %"
    line = row.children[2]
    assert (line.kind.value, line.box.value, line.unit.value) == ("lognormal", "10", "%")
    row.scatter.click()
    assert line.layout.display == "none"
    assert row.scatter.description == "±10 %", "a closed line takes no scatter away"
    row.scatter.click()
    assert line.layout.display == ""
    line.drop.click()
    assert state.question.design.scatter == {}
    assert row.scatter.description == "±"
    assert line.layout.display == "none"


@pytest.mark.parametrize(
    ("name", "spread", "words"),
    [
        ("lateral_offset", Spread("radial", 20e-9), "±20 nm"),
        ("dipole_alignment", Spread("direction"), "± any"),
        ("resonance_wavelength", Spread("normal", 2e-9), "±2 nm"),
        ("quantum_yield", Spread("normal", 0.02), "±0.02"),
        ("slow_linewidth", Spread("normal", 4e-12), "±0.004 nm"),  # at 0, which has no logarithm
    ],
)
def test_every_input_begins_with_a_scatter_that_suits_it(
    name: str, spread: Spread, words: str
) -> None:
    state = state_of()
    row = InputRow(state, name)
    row.scatter.click()
    assert state.problems == {}
    assert state.question.design.scatter[name] == spread
    assert row.scatter.description == words == spread_words(name, spread)


def test_every_number_can_scatter_at_a_press_or_says_why_not() -> None:
    """Each of the inputs of the page, as the first question has it."""
    state = state_of(replace(first_question().design, scatter={}, requirements=()))
    refused = set()
    for name, entry in INPUTS.items():
        if entry.whole:
            continue
        row = InputRow(state, name)
        row.scatter.click()
        if name not in state.question.design.scatter:
            refused.add(name)
            one_sentence(row.wrong.value)
        state.give_spread(name, None)
    assert refused == {"filter_width"}, "without a filter there is none that could scatter"


def test_another_kind_keeps_the_width_in_what_is_measured() -> None:
    """A tenth of 25 is 2.5, and back."""
    state = state_of(design_of(point={"quality_factor": 25.0}))
    state.give_spread("quality_factor", Spread("lognormal", 0.1))
    row = InputRow(state, "quality_factor")
    row.scatter.click()
    line = row.children[2]
    for kind, box, unit, words in (
        ("normal", "2.5", "", "±2.5"),
        ("uniform", "2.5", "", "±2.5"),
        ("lognormal", "10", "%", "±10 %"),
    ):
        line.kind.value = kind
        assert state.question.design.scatter["quality_factor"].kind == kind
        assert (line.box.value, line.unit.value) == (box, unit)
        assert row.scatter.description == words
    assert state.question.design.scatter["quality_factor"].width == pytest.approx(0.1)


def test_kinds_of_a_direction_and_of_a_plane() -> None:
    spread = other_kind("dipole_alignment", Spread("direction"), "normal", 0.5)
    assert spread == Spread("normal", 0.025)
    assert other_kind("dipole_alignment", spread, "direction", 0.5) == Spread("direction")
    radial = other_kind("lateral_offset", Spread("normal", 3e-9), "radial", 0.0)
    assert radial == Spread("radial", 3e-9)
    assert other_kind("quenching", Spread("normal", 1.0), "lognormal", 0.0) == Spread(
        "lognormal", 0.1
    )


@pytest.mark.parametrize(
    ("words", "scatter", "said"),
    [
        ("25 ± 3", Spread("normal", 3.0), "25"),
        ("120 ± 10 %", Spread("normal", 12.0), "120"),
        ("1e4 +/- 500", Spread("normal", 500.0), "10000"),
    ],
)
def test_a_scatter_is_typed_with_the_value(words: str, scatter: Spread, said: str) -> None:
    state = state_of(design_of(unknowns={"quality_factor": Unknown(50.0, 150.0)}))
    row = InputRow(state, "quality_factor")
    typed(row.box, words)
    design = state.question.design
    assert design.scatter["quality_factor"] == scatter
    assert design.point["quality_factor"] == float(said)
    assert design.origin("quality_factor").kind == "typed"
    assert design.unknowns == {}, "a number with its scatter is known"
    assert row.box.value == said
    assert row.wrong.value == ""


@pytest.mark.parametrize(
    ("name", "words", "said"),
    [
        ("quality_factor", "25 ± -3", "negative"),
        ("quality_factor", "25 ± 3 kg", "no unit"),
        ("quality_factor", "-25 ± 3", "range"),
        ("quality_factor", "25 ± 1e999", "too large"),
        ("numerical_aperture", "1.3 ± 0.1", "medium_index"),
    ],
)
def test_what_cannot_scatter_is_refused_beside_its_input(name: str, words: str, said: str) -> None:
    state = state_of()
    row, headline = InputRow(state, name), HeadlinePanel(state)
    before, answer = state.question, state.answer
    typed(row.box, words)
    one_sentence(row.wrong.value)
    assert said in row.wrong.value
    assert (state.question, state.answer) == (before, answer)
    assert row.box.value == words, "what was typed stays to be mended"
    assert headline.wrong.value == ""
    typed(row.box, "0.5" if name == "numerical_aperture" else "70")
    assert row.wrong.value == ""


@pytest.mark.parametrize(
    ("words", "said"), [("-3", "negative"), ("plenty", "no number"), ("∞", "finite"), ("", "")]
)
def test_a_width_that_cannot_be_is_refused_beside_its_input(words: str, said: str) -> None:
    state = state_of()
    row = InputRow(state, "quality_factor")
    row.scatter.click()
    line, before = row.children[2], state.question
    typed(line.box, words)
    one_sentence(row.wrong.value)
    assert said in row.wrong.value
    assert state.question == before
    state.ask(shown="g2_zero")  # another answer must not take away what is to be mended
    assert line.box.value == words
    assert row.wrong.value
    typed(line.box, "20")
    assert (row.wrong.value, line.box.value) == ("", "20")


def test_a_kind_that_cannot_be_is_refused_and_not_shown() -> None:
    """Around 0 there is no logarithm."""
    state = state_of()
    state.give_spread("slow_linewidth", Spread("normal", 1e-10))
    row = InputRow(state, "slow_linewidth")
    row.scatter.click()
    line = row.children[2]
    line.kind.value = "lognormal"
    assert "logarithm" in row.wrong.value
    one_sentence(row.wrong.value)
    assert state.question.design.scatter["slow_linewidth"] == Spread("normal", 1e-10)
    assert (line.kind.value, line.unit.value) == ("normal", "nm")


def test_no_filter_cannot_scatter_and_one_that_does_is_not_forgotten() -> None:
    state = state_of()
    row = InputRow(state, "filter_width")
    row.scatter.click()
    assert "∞" in row.wrong.value
    assert row.scatter.description == "±"
    typed(row.box, "20 ± 2")
    assert state.question.design.scatter["filter_width"] == Spread("normal", 2e-9)
    state.give(filter_width=math.inf)
    assert state.answer.passing is None
    assert "devices that pass: Filter width is ∞" in state.answer.sentence.detail
    state.give(filter_width=10e-9)
    assert state.answer.passing is not None


def test_a_scatter_goes_with_its_correlations() -> None:
    scatter = {
        name: Spread("lognormal", 0.1)
        for name in ("quality_factor", "mode_volume", "refractive_index")
    }
    correlation = {"quality_factor|mode_volume": 0.5, "mode_volume|refractive_index": 0.2}
    state = state_of(design_of(scatter=scatter, correlation=correlation))
    row = InputRow(state, "quality_factor")
    row.scatter.click()
    row.children[2].drop.click()
    design = state.question.design
    assert set(design.scatter) == {"mode_volume", "refractive_index"}
    assert design.correlation == {"mode_volume|refractive_index": 0.2}
    state.give_spread("mode_volume", None)
    assert state.question.design.correlation == {}


def test_a_displacement_in_the_plane_has_no_correlation() -> None:
    """Nor may it be chosen for an input that has one: the devices could not be drawn."""
    scatter = {
        "quality_factor": Spread("lognormal", 0.1),
        "lateral_offset": Spread("normal", 10e-9),
    }
    state = state_of(design_of(scatter=scatter, correlation={"quality_factor|lateral_offset": 0.5}))
    share = state.answer.passing
    state.give_spread("lateral_offset", Spread("radial", 10e-9))
    one_sentence(state.problems["lateral_offset"])
    assert state.question.design.scatter == scatter
    assert state.answer.passing is share


# -------------------------------------------------------------------- the headline


@pytest.mark.parametrize(
    ("share", "low", "high", "words"),
    [
        (0.0, 0.0, 0.0, "0"),
        (0.0, 0.0, 0.001, "under 1"),
        (0.004, 0.003, 0.005, "under 1"),
        (0.005, 0.004, 0.006, "under 1"),
        (0.0051, 0.004, 0.006, "1"),
        (0.614, 0.6, 0.63, "61"),
        (0.9949, 0.99, 1.0, "99"),
        (0.995, 0.99, 1.0, "over 99"),
        (1.0, 0.999, 1.0, "over 99"),
        (1.0, 1.0, 1.0, "100"),
    ],
)
def test_a_share_in_words(share: float, low: float, high: float, words: str) -> None:
    assert hundred(Share(share, low, high)) == words


def test_the_words_of_a_share_with_range_limit_and_fault() -> None:
    drawn = Yield(0.614, 0.6, 0.63, {}, 4096, 4096)
    design = design_of()
    assert passing_words(design, drawn).passing == "61 of 100 devices pass"
    assert passing_words(design, drawn, Range(0.402, 0.748)).passing.startswith("61 (40–75) of 100")
    assert passing_words(design, drawn, Range(0.611, 0.612)).passing.startswith("61 of 100")
    short = passing_words(replace(design, passing=0.8), drawn)
    assert (short.missed, short.short) == ("80 of 100 wanted ✗", True)
    assert passing_words(replace(design, passing=0.614), drawn).short is False
    nearly = passing_words(replace(design, passing=0.9999), drawn)
    assert nearly.missed == "99.99 of 100 wanted ✗"
    assert passing_words(design, None).passing == ""
    fault = passing_words(design, None, fault="filter_width is ∞")
    assert (fault.passing, fault.missed) == ("", "devices that pass: Filter width is ∞")


def test_messages_name_inputs_as_people_do() -> None:
    said = in_labels("filter_width, rate_in_fibre and lifetime; filter_widths")
    assert said == "Filter width, Photons/s in the fibre and lifetime; filter_widths"


@pytest.mark.parametrize(
    ("score", "words"),
    [(-4.0, "under 1"), (-1.0, "16"), (0.0, "50"), (1.0, "84"), (4.0, "over 99")],
)
def test_the_headline_says_how_many_devices_pass(score: float, words: str) -> None:
    """Φ(score) of them: Q scatters in its logarithm, and F is proportional to it."""
    answer = state_of(design_of(score)).answer
    assert answer.sentence.headline.endswith(f"; {words} of 100 devices pass.")
    assert answer.passing is not None
    assert answer.passing.share == pytest.approx(float(ndtr(score)), abs=0.005)


@pytest.mark.parametrize(("score", "words"), [(-1.0, "0"), (1.0, "100")])
def test_where_no_scatter_matters_all_devices_are_like_the_design(score: float, words: str) -> None:
    idle = {"lifetime": Spread("lognormal", 0.1)}
    answer = state_of(design_of(score, scatter=idle)).answer
    assert answer.sentence.headline.endswith(f"; {words} of 100 devices pass.")


def test_without_scatter_or_without_requirement_no_devices_are_spoken_of() -> None:
    for design in (design_of(scatter={}), design_of(requirements=())):
        answer = state_of(design).answer
        assert "devices" not in answer.sentence.headline
        assert answer.passing is None


def test_what_is_not_known_leaves_the_share_a_range() -> None:
    """V anywhere from 0.8 to 1.25 (±1.1 standard deviations of F)."""
    answer = state_of(design_of(0.0, unknowns={"mode_volume": Unknown(0.8, 1.25)})).answer
    around = answer.passing_range
    assert around is not None
    least, most = (float(ndtr(sign * math.log(1.25) / WIDTH)) for sign in (-1, 1))
    assert least < around.low < 0.3
    assert 0.7 < around.high < most
    said = f"; 50 ({100 * around.low:.0f}–{100 * around.high:.0f}) of 100 devices pass."
    assert answer.sentence.headline.endswith(said)


def test_the_number_of_devices_waits_for_rest_and_comes_by_itself() -> None:
    async def main() -> None:
        state = state_of()
        answers = heard(state)
        state.give_spread("quality_factor", Spread("lognormal", 0.4))
        assert "devices" not in answers[-1].sentence.headline, "the readouts do not wait"
        assert answers[-1].passing is None
        for _ in range(200):
            await asyncio.sleep(0.02)
            if answers[-1].passing is not None:
                break
        assert "69 of 100 devices pass" in answers[-1].sentence.headline  # Φ(1/2)

    asyncio.run(main())


# -------------------------------------------------------------------- a share that is wanted


def test_a_share_becomes_wanted_is_missed_and_is_met() -> None:
    state = state_of()  # 84 of 100 pass
    wanted, headline = WantedPanel(state), HeadlinePanel(state)
    assert wanted.share.layout.display == "none"
    wanted.more.value = PASSING
    assert state.question.design.passing == 0.8
    assert (wanted.share.layout.display, wanted.box.value) == ("", "80 %")
    assert "x-missed" not in wanted.share._dom_classes
    assert state.answer.sentence.met is True
    typed(wanted.box, "90")
    assert state.question.design.passing == pytest.approx(0.9)
    assert wanted.box.value == "90 %"
    assert "x-missed" in wanted.share._dom_classes
    said = state.answer.sentence
    assert said.met is False, "enough devices are wanted as well"
    assert said.detail.startswith("90 of 100 wanted ✗ · the design itself meets every requirement")
    assert "x-missed" in headline.text.value
    typed(wanted.box, "33.333 %")
    assert wanted.box.value == "33.333 %"
    assert state.answer.sentence.met is True
    assert "✗" not in state.answer.sentence.detail


@pytest.mark.parametrize(
    ("words", "said"), [("lots", "no number"), ("120 %", "0 to 1"), ("-1", "0 to 1")]
)
def test_a_share_that_cannot_be_wanted_is_said_in_its_panel(words: str, said: str) -> None:
    state = state_of(design_of(passing=0.8))
    wanted = WantedPanel(state)
    typed(wanted.box, words)
    one_sentence(wanted.wrong.value)
    assert said in wanted.wrong.value
    assert state.question.design.passing == 0.8
    state.give(lifetime=3e-9)
    assert wanted.box.value == words, "another answer does not take away what is to be mended"
    typed(wanted.box, "80 %")
    assert wanted.wrong.value == ""


def test_a_share_is_no_longer_wanted() -> None:
    state = state_of(design_of(passing=0.8))
    wanted = WantedPanel(state)
    wanted.share.children[-1].click()
    assert state.question.design.passing is None
    assert wanted.share.layout.display == "none"


def test_a_wanted_share_is_answered_even_where_nothing_scatters() -> None:
    for score, words, met in ((1.0, "100", True), (-1.0, "0", False)):
        answer = state_of(design_of(score, scatter={}, passing=0.8)).answer
        assert answer.sentence.headline.endswith(f"; {words} of 100 devices pass.")
        assert answer.sentence.met is met


# -------------------------------------------------------------------- the map of the devices that pass

CELLS, DRAWS = 32, 512


@pytest.fixture
def light(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """A lighter map of the devices that pass, in the same steps; collects its calls."""
    calls: list[int] = []
    steps = answers_module.passing_map_steps

    def counted(design: Design, x: Axis, *rest: Any) -> Any:
        calls.append(x.count)
        for step in steps(design, x, *rest):
            time.sleep(0.012)  # longer than a slice, so that every step is seen
            yield step

    monkeypatch.setattr(answers_module, "YIELD_CELLS", CELLS)
    monkeypatch.setattr(answers_module, "YIELD_DRAWS", DRAWS)
    monkeypatch.setattr(answers_module, "passing_map_steps", counted)
    return calls


def whole_map(state: State) -> Any:
    """The map that the page should end with."""
    question, design = state.question, state.question.design
    x, y = (replace(axis, count=CELLS) for axis in (question.x, question.y))
    return make_yield_map(
        design.point, x, y, design.scatter, design.requirements, DRAWS,
        correlation=design.correlation,
    )  # fmt: skip


async def until(true: Callable[[], Any], seconds: float = 20.0) -> None:
    end = time.monotonic() + seconds
    while not true():
        assert time.monotonic() < end, "it does not come"
        await asyncio.sleep(0.005)


def done(state: State) -> bool:
    return state.answer.whole and not state.answer.rest


@pytest.mark.usefixtures("light")
def test_a_map_of_devices_is_coarse_at_once_and_grows_to_the_whole() -> None:
    async def main() -> tuple[State, list[Answer]]:
        state = state_of(cells=64)
        await until(lambda: done(state))
        answers = heard(state)
        state.ask(shown=PASSING)
        await until(lambda: done(state))
        return state, answers

    state, answers = asyncio.run(main())
    maps = [answer.map for answer in answers if answer.map is not None]
    assert maps[0].x.count == 24, "the first picture is coarse"
    first = next(answer for answer in answers if answer.map is maps[0])
    assert (first.whole, first.progress) == (False, 0.0)
    progress = [answer.progress for answer in answers if answer.progress is not None]
    assert progress == sorted(progress)
    assert progress[0] == 0
    assert len(set(progress)) > 5
    last = state.answer
    assert (last.whole, last.progress, last.map.x.count) == (True, None, CELLS)
    expected = whole_map(state)
    for name in (PASSING, "passing_low", "passing_high"):
        np.testing.assert_array_equal(last.map.values[name], expected.values[name])
    np.testing.assert_array_equal(last.map.margin, expected.margin)
    early = [answer for answer in answers if answer.passing is not None and not answer.whole]
    assert early, "how many pass is said before the finest map is there"
    assert all("84 of 100 devices pass" in answer.sentence.headline for answer in early)


@pytest.mark.usefixtures("light")
def test_the_whole_map_is_the_closed_form() -> None:
    """Φ of ln(F/limit) over the scatter of Q, cell by cell."""
    state = state_of(cells=64)
    state.ask(shown=PASSING)
    drawn = state.answer.map
    factor = 3 * drawn.y.values[:, None] / (4 * math.pi**2 * drawn.x.values[None, :])
    share = ndtr(np.log(factor / state.question.design.requirements[0].limit) / WIDTH)
    np.testing.assert_allclose(drawn.values[PASSING], share, atol=0.02)  # of 512 devices


def test_moving_along_the_axes_keeps_the_map_and_a_spread_makes_a_new_one(light: list[int]) -> None:
    state = state_of(cells=64)
    state.ask(shown=PASSING)
    drawn = state.answer.map
    assert len(light) == 1
    state.give(quality_factor=321.0, mode_volume=2.0)
    state.give(lifetime=3e-9)  # on which no requirement depends
    assert state.answer.map is drawn
    assert len(light) == 1
    state.give_spread("quality_factor", Spread("lognormal", 0.5))
    assert state.answer.map is not drawn
    np.testing.assert_array_equal(
        state.answer.map.values[PASSING], whole_map(state).values[PASSING]
    )
    state.give_spread("mode_volume", Spread("lognormal", 0.5))
    correlated = replace(state.question.design, correlation={"quality_factor|mode_volume": 0.9})
    before = state.answer.map
    state.ask(design=correlated)
    assert not np.array_equal(state.answer.map.values[PASSING], before.values[PASSING])
    assert len(light) == 4


@pytest.mark.usefixtures("light")
def test_a_stopped_map_stays_as_it_was_and_the_next_question_is_answered() -> None:
    async def main() -> None:
        state = state_of(cells=64)
        shown = MapPanel(state)
        await until(lambda: done(state))
        assert shown.progress.layout.display == "none"
        state.ask(shown=PASSING)
        assert shown.progress.layout.display == ""
        assert shown.working.layout.visibility == shown.stop.layout.visibility == "visible"
        assert shown.doing.value == DRAWING
        await until(lambda: (state.answer.progress or 0) > 0.1)
        assert shown.working.value > 0
        partial = state.answer.map
        shown.stop.click()
        assert state.answer.map is partial
        assert (state.answer.whole, state.answer.progress) == (False, None)
        assert shown.working.layout.visibility == shown.stop.layout.visibility == "hidden"
        assert shown.doing.value == STOPPED
        packed = shown.canvas.packed
        await asyncio.sleep(0.5)
        assert state.answer.map is partial, "nothing goes on behind one's back"
        assert shown.canvas.packed is packed
        state.stop()  # once more does nothing
        state.give(quality_factor=150.0)
        await until(lambda: done(state))
        assert state.answer.map.x.count == CELLS
        assert state.answer.values["quality_factor"] == 150.0
        assert shown.doing.value == DRAWN
        assert shown.progress.layout.display == "", "its room is kept while this map is shown"
        assert "At the design point: 9" in shown.canvas.description, "Φ(3) of the devices"
        state.ask(shown="peak_purcell")
        await until(lambda: done(state))
        assert shown.progress.layout.display == "none"

    asyncio.run(main())


@pytest.mark.usefixtures("light")
def test_a_new_question_drops_the_rest_of_a_map() -> None:
    async def main() -> None:
        state = state_of(cells=64)
        await until(lambda: done(state))
        state.ask(shown=PASSING)
        await until(lambda: (state.answer.progress or 0) > 0.1)
        answers = heard(state)
        state.give_spread("quality_factor", Spread("lognormal", 0.5))
        await until(lambda: done(state))
        widths = {answer.question.design.scatter["quality_factor"].width for answer in answers}
        assert widths == {0.5}
        np.testing.assert_array_equal(
            state.answer.map.values[PASSING], whole_map(state).values[PASSING]
        )

    asyncio.run(main())


@pytest.mark.usefixtures("light")
def test_where_nothing_is_required_every_device_passes() -> None:
    """A design without requirement can be loaded whatever is shown."""
    state = state_of(cells=8, cut=(PASSING, "quality_factor"))
    shown = MapPanel(state)
    state.ask(shown=PASSING)
    assert "At the design point: 84.2 %" in shown.canvas.description
    state.ask(design=design_of(requirements=()))
    assert "At the design point: 100 %" in shown.canvas.description
    state.ask(design=design_of(-1.0, scatter={}))
    assert "At the design point: 0 %" in shown.canvas.description
    state.ask(design=design_of(requirements=()))
    assert state.problems == {}
    assert state.question.design.requirements == ()
    assert (state.answer.map.values[PASSING] == 1).all()
    assert state.answer.cut is not None
    assert (state.answer.cut.quantity == 1).all()
    state.ask(layers=state.question.layers | {"frontiers", "hatching", "iso"})
    assert state.problems == {}


@pytest.mark.usefixtures("light")
def test_a_scatter_that_cannot_be_drawn_is_said_and_the_map_stays() -> None:
    scatter = {"quality_factor": Spread("lognormal", 0.2), "filter_width": Spread("normal", 1e-9)}
    point = {"quality_factor": 100.0, "mode_volume": 1.0, "filter_width": 20e-9}
    wanted = (Requirement("rate_in_fibre", at_least=1e3),)
    state = state_of(design_of(point=point, scatter=scatter, requirements=wanted), cells=8)
    state.ask(shown=PASSING)
    before = state.answer.map
    state.give(filter_width=math.inf)
    one_sentence(state.problems["filter_width"])
    assert state.answer.values["filter_width"] == 20e-9
    assert state.answer.map is before


@pytest.mark.usefixtures("light")
@pytest.mark.parametrize("layer", ["iso", "frontiers", "hatching", "scales", "all_bands"])
def test_a_map_of_devices_takes_every_layer(layer: str) -> None:
    state = state_of(cells=8)
    shown = MapPanel(state)
    shown.shown.value = PASSING
    for on in (True, False):
        shown.switches[layer].value = on
        assert (layer in state.question.layers) is on
        assert state.problems == {}
        header, arrays = unpack(shown.canvas.packed)
        assert header["colour"]["title"] == "Devices that pass"
        expected = 100 * state.answer.map.values[PASSING].ravel()
        np.testing.assert_allclose(arrays["values"], expected, rtol=1e-6)


# -------------------------------------------------------------------- the cut of the devices that pass


def test_a_cut_of_devices_is_rough_at_once_and_finer_after_a_rest() -> None:
    async def main() -> tuple[State, list[Answer]]:
        state = state_of()
        await until(lambda: done(state))
        answers = heard(state)
        state.ask(cut=(PASSING, "quality_factor"))
        await until(lambda: done(state))
        return state, answers

    state, answers = asyncio.run(main())
    assert answers[0].cut is not None
    assert answers[0].cut.values.size == answers_module.ROUGH_CELLS
    last = state.answer.cut
    assert last is not None
    assert last.values.size == later_module.CUT_CELLS
    limit = state.question.design.requirements[0].limit
    share = ndtr(np.log(3 * last.values / (4 * math.pi**2) / limit) / WIDTH)
    np.testing.assert_allclose(last.quantity, share, atol=0.005)


def test_a_cut_of_devices_follows_scatter_and_requirements_at_once() -> None:
    async def main() -> None:
        state = state_of(cut=(PASSING, "quality_factor"))
        await until(lambda: done(state))
        for change in (
            lambda: state.give_spread("quality_factor", Spread("lognormal", 0.6)),
            lambda: state.ask(design=replace(state.question.design, requirements=(limited(-2.0),))),
        ):
            answers = heard(state)
            change()
            design = state.question.design
            rough = answers[0].cut
            assert rough is not None
            axis = Axis("quality_factor", *INPUTS["quality_factor"].slider, count=rough.values.size)
            expected = passing_cut(design, axis, answers_module.ROUGH_DEVICES)
            np.testing.assert_array_equal(rough.quantity, expected.quantity)
            await until(lambda: done(state))

    asyncio.run(main())


def test_the_cut_panel_draws_a_share_in_per_cent() -> None:
    state = state_of()
    shown = CutPanel(state)
    shown.quantity.value = PASSING
    assert state.question.cut == (PASSING, "quality_factor")
    assert shown.axes[1].label == "Devices that pass, %"
    assert 0 <= shown.curve.y.min() < 1
    assert 99 < shown.curve.y.max() <= 100


# -------------------------------------------------------------------- what limits the design


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The quantities whose limits were worked out."""
    made: list[str] = []
    limits = later_module.limits_of_design

    def counted(design: Design, quantity: str) -> Any:
        made.append(quantity)
        return limits(design, quantity)

    monkeypatch.setattr(later_module, "limits_of_design", counted)
    return made


def numbers(html: str) -> list[float]:
    """The figures of a ranked list, in order."""
    rows = html.split('<td class="x-factor">')[1:]
    shown = [row.split("<")[0].replace("−", "-").strip(" %×+") for row in rows]
    return [float(one) for one in shown if one not in ("·", "")]


def part(html: str, caption: str) -> str:
    """The table with a caption."""
    (found,) = [one for one in html.split("<table")[1:] if caption in one]
    return found.split("</table>")[0]


def test_limits_are_worked_out_only_while_their_view_is_open(asked: list[str]) -> None:
    state = state_of()
    panel = LimitsPanel(state)
    views = Views({"light": [], "limits": [panel]})
    state.give(quality_factor=120.0)
    assert asked == []
    assert (panel.improve.value, panel.fabricate.value) == ("", "")
    views.turn_to("limits")
    assert asked == ["peak_purcell"], "of what is required first"
    assert "photons/s" not in panel.improve.value
    views.turn_to("light")
    state.give(quality_factor=130.0)
    assert asked == ["peak_purcell"]
    views.turn_to("limits")
    assert asked == ["peak_purcell"] * 2
    panel.quantity.value = "rate_in_fibre"
    views.turn_to("light")
    views.turn_to("limits")
    assert panel.quantity.value == "rate_in_fibre", "what was chosen stays"
    assert asked[-1] == "rate_in_fibre"


def test_pressing_the_button_of_a_view_opens_it_and_twice_leaves_it_open() -> None:
    views = Views({"light": [], "limits": [], "search": []})
    for name in ("limits", "search", "light"):
        views.buttons[name].value = True
        assert views.shown == name
        assert [n for n, button in views.buttons.items() if button.value] == [name]
        assert [n for n, one in views.stacks.items() if one.layout.display != "none"] == [name]
        views.buttons[name].value = False  # pressed again
        assert views.buttons[name].value is True


def test_the_limits_of_a_rate_are_ranked_lists() -> None:
    scatter = {"quality_factor": Spread("lognormal", 0.2), "mode_volume": Spread("lognormal", 0.05)}
    state = state_of(
        design_of(scatter=scatter, unknowns={"optics_transmission": Unknown(0.4, 0.9)})
    )
    panel = LimitsPanel(state)
    panel.opened(True)
    panel.quantity.value = "rate_in_fibre"
    gains = numbers(part(panel.improve.value, "if this step alone"))
    assert gains == sorted(gains, reverse=True)
    assert min(gains) >= 1
    levers = numbers(part(panel.improve.value, "what 1 % more"))
    sizes = [abs(one) for one in levers]
    assert sizes == sorted(sizes, reverse=True)
    assert 0 < len(levers) <= LEVERS
    by = part(panel.fabricate.value, "devices that meet each requirement")
    assert "Purcell" in by
    passing = state.answer.passing
    assert passing is not None
    assert f"{100 * passing.share:.0f} of 100 devices meet everything" in panel.fabricate.value
    costs = numbers(part(panel.fabricate.value, "if this alone stopped"))
    assert costs == sorted(costs, reverse=True)
    assert costs[0] > 5, "of the two, the wide one costs most"
    assert panel.fabricate.value.index("Quality factor") < panel.fabricate.value.index(
        "Mode volume"
    )
    assert "Optics transmission" in panel.list.value


@pytest.mark.parametrize(
    ("changes", "said"),
    [
        ({"scatter": {}}, "Nothing scatters"),
        ({"requirements": ()}, "Nothing is required"),
        (
            {"scatter": {"filter_width": Spread("normal", 1e-9)}},
            "Filter width is ∞, and what is without end cannot scatter",
        ),
    ],
)
def test_limits_say_why_a_list_is_empty(changes: dict[str, Any], said: str) -> None:
    state = state_of(design_of(**changes))
    panel = LimitsPanel(state)
    panel.opened(True)
    assert said in panel.fabricate.value
    assert "working" not in panel.improve.value + panel.fabricate.value + panel.list.value
    assert "Nothing is given as a range" in panel.list.value


# -------------------------------------------------------------------- what it would take


def search_of(state: State, kind: str = "nearest", **bounds: tuple[float, float]) -> SearchPanel:
    panel = SearchPanel(state)
    panel.kind.value = kind
    if bounds:
        panel.bounds._ends = dict(bounds)
    return panel


def can_press(panel: SearchPanel) -> set[str]:
    names = ("go", "stop", "take", "drop", "along")
    return {name for name in names if getattr(panel, name).layout.display != "none"}


BOX = {"quality_factor": (10.0, 1000.0)}


def test_the_nearest_design_is_proposed_taken_and_meets_what_it_met() -> None:
    """F = 3Q/(4π²V): with Q alone to change, Q goes up by what is missing."""
    state = state_of(design_of(-1.0))
    before = state.question
    panel = search_of(state, "nearest", **BOX)
    assert can_press(panel) == {"go"}
    panel.go.click()
    needed = 100 * math.exp(WIDTH)
    proposal = state.proposal
    assert proposal is not None
    assert proposal.words == "nearest"
    assert proposal.point["quality_factor"] == pytest.approx(needed, rel=0.01)
    assert "Every requirement is met." in panel.said.value
    assert f"100 → <b>{proposal.point['quality_factor']:g}</b>" in panel.said.value
    assert state.question == before, "nothing changes until it is taken"
    assert can_press(panel) == {"go", "take", "drop"}
    panel.take.click()
    design = state.question.design
    assert design.point["quality_factor"] == proposal.point["quality_factor"] >= needed
    assert len(repr(design.point["quality_factor"])) <= 5, "few digits"
    assert design.origin("quality_factor").where == "found by a search"
    assert state.answer.sentence.met is True
    assert state.proposal is None
    assert (panel.said.value, can_press(panel)) == ("", {"go"})


def test_the_best_of_one_quantity() -> None:
    state = state_of(design_of(0.5))
    panel = search_of(state, "best", **BOX)
    assert [row.layout.display for row in panel.goals] == ["", "none"]
    panel.goals[0].quantity.value = "peak_purcell"
    panel.go.click()
    assert state.proposal is not None
    assert state.proposal.words == "best"
    assert state.proposal.point["quality_factor"] == 1000.0
    assert "100 → <b>1000</b>" in panel.said.value


def test_a_trade_off_is_a_line_of_designs_to_choose_from() -> None:
    """The Purcell factor against the linewidth of the resonator: every Q is one of them."""
    state = state_of(design_of(0.5))
    shown = MapPanel(state)
    panel = search_of(state, "front", **BOX)
    assert [row.layout.display for row in panel.goals] == ["", ""]
    for row, name in zip(panel.goals, ("peak_purcell", "resonator_linewidth"), strict=True):
        row.quantity.value, row.most.value = name, True
    panel.go.click()
    assert "along" in can_press(panel)
    path = shown.canvas.proposal["path"]
    assert len(path) > 5
    ups = [place[1] for place in path]
    assert ups == sorted(ups)
    seen = []
    for index in (1, len(path)):
        panel.along.value = index
        assert f"{index} of {len(path)}:" in panel.said.value
        assert state.proposal is not None
        seen.append(state.proposal.point["quality_factor"])
        assert shown.canvas.proposal["place"] == pytest.approx(path[index - 1], abs=0.002)
        assert shown.canvas.proposal["text"] == "trade-off"
    assert seen[0] < seen[1]
    panel.take.click()
    assert state.question.design.point["quality_factor"] == seen[1] == 1000.0
    assert shown.canvas.proposal == {}


def test_the_sturdiest_is_proposed_with_its_share() -> None:
    window = (limited(1.0), Requirement("peak_purcell", at_most=PURCELL * math.exp(3 * WIDTH)))
    state = state_of(design_of(requirements=window))
    panel = search_of(state, "sturdy", **BOX)
    panel.go.click()
    assert state.proposal is not None
    assert state.proposal.words == "sturdiest"
    assert "of 100 devices pass, the most found within these bounds." in panel.said.value
    share = state.answer.passing
    panel.take.click()
    assert share is not None
    assert state.answer.passing is not None
    assert state.answer.passing.share > share.share


@pytest.mark.parametrize("kind", ["nearest", "best", "sturdy"])
def test_what_cannot_be_reached_says_what_fails_and_proposes_the_closest(kind: str) -> None:
    state = state_of(design_of(requirements=(Requirement("peak_purcell", at_least=500.0),)))
    panel = search_of(state, kind, **BOX)
    panel.go.click()
    assert "Not reachable within these bounds: Peak Purcell factor" in panel.said.value
    assert "at best 76.0 of 500 wanted" in panel.said.value  # 3 · 1000/4π²
    assert panel.wrong.value == ""
    assert state.proposal is not None
    assert state.proposal.words == "closest"
    assert state.proposal.point["quality_factor"] == 1000.0
    panel.take.click()
    assert state.question.design.point["quality_factor"] == 1000.0


def test_a_trade_off_that_cannot_be_reached_says_what_fails() -> None:
    state = state_of(design_of(requirements=(Requirement("peak_purcell", at_least=500.0),)))
    panel = search_of(state, "front", **BOX)
    panel.go.click()
    assert "Not reachable within these bounds: Peak Purcell factor" in panel.said.value
    assert state.proposal is None
    assert can_press(panel) == {"go"}


def test_a_design_that_needs_no_search_says_so() -> None:
    state = state_of(design_of(1.0))
    panel = search_of(state, "nearest", **BOX)
    panel.go.click()
    assert "meets every requirement as it is" in panel.said.value
    assert state.proposal is None


CONTRADICTION = (
    Requirement("rate_in_fibre", at_least=2e7),
    Requirement("rate_in_fibre", at_most=1e6),
)


@pytest.mark.parametrize("kind", ["nearest", "best", "sturdy", "front"])
@pytest.mark.parametrize(
    ("requirements", "bounds", "said"),
    [
        (CONTRADICTION, BOX, "contradict"),
        ((limited(1.0),), {"quality_factor": (1000.0, 10.0)}, "run backwards"),
        ((limited(1.0),), {"quality_factor": (-5.0, 10.0)}, "too far"),
        ((limited(1.0),), {"numerical_aperture": (0.1, 1.4)}, "too far"),
        ((limited(1.0),), {"filter_width": (math.inf, math.inf)}, "finite"),
        ((limited(1.0),), {}, "no input to change"),
    ],
)
def test_a_search_that_cannot_be_is_one_sentence_and_nothing_is_lost(
    kind: str, requirements: tuple[Requirement, ...], bounds: dict[str, Any], said: str
) -> None:
    state = state_of(design_of(requirements=requirements))
    headline = HeadlinePanel(state)
    panel = search_of(state, kind)
    panel.bounds._ends = dict(bounds)
    before, answer = state.question, state.answer
    panel.go.click()
    one_sentence(panel.wrong.value)
    assert said in panel.wrong.value
    assert "_" not in panel.wrong.value, "inputs are called by their labels"
    assert panel.said.value == ""
    assert can_press(panel) == {"go"}
    assert (state.question, state.answer) == (before, answer)
    assert panel.bounds.bounds() == bounds
    assert headline.wrong.value == ""
    panel.bounds._ends = dict(BOX)
    state.ask(design=design_of(-1.0))
    panel.kind.value = "nearest"
    panel.go.click()
    assert panel.wrong.value == ""
    assert state.proposal is not None


@pytest.mark.parametrize(
    ("kind", "said"), [("nearest", "nothing is required"), ("sturdy", "requires nothing")]
)
def test_where_nothing_is_required_there_is_nothing_to_look_for(kind: str, said: str) -> None:
    state = state_of(design_of(requirements=()))
    panel = search_of(state, kind, **BOX)
    panel.go.click()
    assert said in panel.wrong.value


# -------------------------------------------------------------------- bounds


def boxes(panel: SearchPanel, name: str) -> tuple[Any, Any]:
    (row,) = [row for row in panel.bounds.rows.children if f"bounds-{name}" in row._dom_classes]
    return row.children[1], row.children[3]


def test_bounds_begin_with_the_axes_and_grow() -> None:
    state = state_of()
    panel = SearchPanel(state)
    assert panel.bounds.bounds() == {"quality_factor": (5.0, 2000.0), "mode_volume": (0.05, 20.0)}
    panel.bounds.more.value = "emission_wavelength"
    assert panel.bounds.more.value == ""
    assert panel.bounds.bounds()["emission_wavelength"] == INPUTS["emission_wavelength"].slider
    low, high = boxes(panel, "emission_wavelength")
    assert (low.value, high.value) == ("300", "2000")
    typed(low, "0.6 µm")
    typed(high, "700")
    assert panel.bounds.bounds()["emission_wavelength"] == pytest.approx((600e-9, 700e-9))
    panel.bounds.more.value = "emission_wavelength"  # again: nothing new
    assert len(panel.bounds.rows.children) == 3
    low, _ = boxes(panel, "emission_wavelength")
    assert low.value == "600", "what was typed stays"
    panel.bounds.rows.children[0].children[-1].click()
    assert set(panel.bounds.bounds()) == {"mode_volume", "emission_wavelength"}


def test_a_bound_keeps_all_digits_that_were_typed() -> None:
    panel = SearchPanel(state_of())
    typed(boxes(panel, "quality_factor")[0], "12.3456789")
    panel.bounds.more.value = "lifetime"  # draws the rows anew
    assert boxes(panel, "quality_factor")[0].value == "12.35"
    typed(boxes(panel, "quality_factor")[1], "99")
    assert panel.bounds.bounds()["quality_factor"] == (12.3456789, 99.0)


def test_an_aperture_may_go_as_far_as_its_medium_lets_it() -> None:
    panel = SearchPanel(state_of())
    panel.bounds.more.value = "numerical_aperture"
    assert panel.bounds.bounds()["numerical_aperture"] == (0.05, 1.0)


def test_a_bound_that_is_no_number_is_not_searched_within() -> None:
    """The box shows it, so it must not be quietly replaced by what stood there before."""
    state = state_of(design_of(-1.0))
    panel = SearchPanel(state)
    low, high = boxes(panel, "quality_factor")
    typed(low, "plenty")
    assert "plenty" in panel.wrong.value
    typed(high, "500")
    assert "plenty" in panel.wrong.value, "mending another box does not mend this one"
    panel.go.click()
    one_sentence(panel.wrong.value)
    assert "plenty" in panel.wrong.value
    assert state.proposal is None
    typed(low, "10")
    assert panel.wrong.value == ""
    panel.go.click()
    assert state.proposal is not None


# -------------------------------------------------------------------- long searches


def found(value: float, met: bool = True, at: int = 0) -> Found:
    point = {"quality_factor": value, "mode_volume": 1.0}
    changes = {"quality_factor": (100.0, value)}
    return Found(point, met, f"found {at}", 0.1, changes, {"peak_purcell": 9.0}, None, None, at, 99)


@pytest.fixture
def slow(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """A search for the nearest that takes for ever, and counts its steps."""
    steps: list[int] = []

    def forever(*_: Any) -> Iterator[Found]:
        for at in range(100_000):
            time.sleep(0.004)
            steps.append(at)
            yield found(150.0 + at, met=at > 20, at=at)

    monkeypatch.setattr(search_module, "nearest_steps", forever)
    return steps


def test_a_stopped_search_keeps_the_best_so_far(slow: list[int]) -> None:
    async def main() -> None:
        state = state_of(design_of(-1.0))
        panel = search_of(state, "nearest", **BOX)
        panel.go.click()
        assert can_press(panel) == {"stop"}
        await until(lambda: "searching … 5 of 99" in panel.said.value)
        assert state.proposal is None, "what misses something is proposed only at the end"
        await until(lambda: state.proposal is not None)
        await until(lambda: len(slow) > 33)
        panel.stop.click()
        last = slow[-1]
        assert state.proposal is not None
        assert state.proposal.point["quality_factor"] == 150.0 + last
        assert "searching" not in panel.said.value
        assert can_press(panel) == {"go", "take", "drop"}
        await asyncio.sleep(0.1)
        assert slow[-1] == last
        panel.take.click()
        assert state.question.design.point["quality_factor"] == 150.0 + last

    asyncio.run(main())


def test_a_search_that_is_stopped_before_it_found_anything_proposes_the_closest(
    slow: list[int],
) -> None:
    async def main() -> None:
        state = state_of(design_of(-5.0))
        panel = search_of(state, "nearest", **BOX)
        panel.go.click()
        await until(lambda: len(slow) > 2)
        panel.stop.click()
        assert state.proposal is not None
        assert state.proposal.words == "closest"
        assert "found" in panel.said.value
        panel.drop.click()
        assert state.proposal is None
        assert (panel.said.value, can_press(panel)) == ("", {"go"})

    asyncio.run(main())


@pytest.mark.parametrize("busy", [True, False])
def test_another_design_drops_the_search_and_the_proposal(slow: list[int], busy: bool) -> None:
    async def main() -> None:
        state = state_of(design_of(-1.0))
        shown = MapPanel(state)
        panel = search_of(state, "nearest", **BOX)
        panel.go.click()
        await until(lambda: state.proposal is not None)
        if not busy:
            panel.stop.click()
        state.ask(shown="g2_zero", layers=state.question.layers | {"iso"})
        assert shown.canvas.proposal, "what is shown of a design does not change it"
        state.give(mode_volume=1.1)
        assert state.proposal is None
        assert shown.canvas.proposal == {}
        assert (panel.said.value, can_press(panel)) == ("", {"go"})
        count = len(slow)
        await asyncio.sleep(0.1)
        assert len(slow) == count

    asyncio.run(main())


def test_a_search_that_fails_says_so_and_can_be_tried_again(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    def fails(*_: Any) -> Iterator[Found]:
        yield found(150.0, met=False)
        raise InputError("quality_factor cannot be")

    monkeypatch.setattr(search_module, "nearest_steps", fails)
    panel = search_of(state_of(), "nearest", **BOX)
    panel.go.click()
    assert panel.wrong.value == "Quality factor cannot be"
    assert panel.said.value == ""
    assert can_press(panel) == {"go"}


def test_a_proposal_off_the_map_lies_just_outside() -> None:
    question = question_of(design_of())
    for quality, place in ((1e5, 1.05), (1.0, -0.05), (100.0, float(question.y.fraction(100.0)))):
        proposal = Proposal({"quality_factor": quality, "mode_volume": 1.0}, "there")
        assert proposal.on(question.x, question.y)["place"][1] == pytest.approx(place)


@pytest.mark.parametrize("side", ["at_least", "at_most"])
@pytest.mark.parametrize("value", [123.456789, 99.9996, 12345.678, 1.0000001])
def test_a_found_value_is_taken_in_few_digits_that_still_meet(side: str, value: float) -> None:
    """Right at the limit, where every other rounding misses it."""
    limit = design_of().with_values(quality_factor=value).outcome(["peak_purcell"])["peak_purcell"]
    (wanted,) = requirements = (Requirement("peak_purcell", **{side: limit}),)
    taken = found_by_search(design_of(requirements=requirements), {"quality_factor": value})
    assert wanted.met(taken.outcome(["peak_purcell"])["peak_purcell"])
    found = taken.point["quality_factor"]
    assert found == float(f"{found:.3g}")
    assert found == pytest.approx(value, rel=0.01)


def test_one_requirement_is_not_traded_for_another() -> None:
    """Rounded up Q misses the first, rounded down the second: more digits are kept."""
    value = 123.4561
    limits = [3 * value * end / (4 * math.pi**2) for end in (1 - 1e-5, 1 + 1e-5)]
    design = design_of(
        requirements=(
            Requirement("peak_purcell", at_least=limits[0]),
            Requirement("peak_purcell", at_most=limits[1]),
        )
    )
    taken = found_by_search(design, {"quality_factor": value})
    assert taken.point["quality_factor"] == 123.456
    assert moved_to(design, taken.point) == {"quality_factor": 123.456}


# -------------------------------------------------------------------- the record

PLAIN = Draft202012Validator(schema())


def test_a_record_carries_scatter_correlation_share_and_what_limits() -> None:
    scatter = {
        "quality_factor": Spread("lognormal", 0.2),
        "mode_volume": Spread("normal", 0.05),
        "lateral_offset": Spread("radial", 20e-9),
        "dipole_alignment": Spread("direction"),
        "resonance_wavelength": Spread("uniform", 3e-9),
    }
    design = design_of(
        scatter=scatter, correlation={"quality_factor|mode_volume": -0.4}, passing=0.875
    )
    text = design_text(design)
    record = json.loads(text)
    assert next(PLAIN.iter_errors(record), None) is None
    back = design_from(text.encode())
    assert back == design
    assert (back.scatter, back.correlation, back.passing) == (
        scatter,
        {"quality_factor|mode_volume": -0.4},
        0.875,
    )
    drawn = yield_of(design, scatter, design.requirements, correlation=design.correlation)
    assert record["yield"]["share"] == {
        "value": drawn.share,
        "low": drawn.low,
        "high": drawn.high,
    }
    assert record["yield"]["count"] == drawn.count
    assert set(record["yield"]["by_requirement"]) == {"peak_purcell"}
    assert record["passing"] == 0.875
    steps = [row["step"] for row in record["headroom"]]
    assert steps == [row["step"] for row in record["budget"]]
    assert all(float(row["alone"]) >= 1 for row in record["headroom"])


def test_a_record_of_a_page_comes_back_to_the_page() -> None:
    state = state_of(design_of(passing=0.9))
    text = design_text(state.question.design)
    state.give_spread("quality_factor", None)
    state.ask(design=replace(state.question.design, passing=None))
    state.ask(design=design_from(text.encode()))
    assert "84 of 100 devices pass" in state.answer.sentence.headline
    assert state.answer.sentence.detail.startswith("90 of 100 wanted ✗")


@pytest.mark.parametrize(
    ("changes", "has"),
    [
        ({"scatter": {}}, False),
        ({"requirements": ()}, False),
        ({"scatter": {"filter_width": Spread("normal", 1e-9)}}, False),  # ∞ cannot
        ({"point": {"quantum_yield": 0.9, "filter_width": 1e-11, "filter_centre": 3e-7}}, True),
    ],
)
def test_a_record_is_valid_whatever_the_devices_do(changes: dict[str, Any], has: bool) -> None:
    design = design_of(**changes)
    record = json.loads(design_text(design))
    assert next(PLAIN.iter_errors(record), None) is None
    assert ("yield" in record) is has
    assert len(record["headroom"]) == len(record["budget"])
    assert "passing" not in record


# -------------------------------------------------------------------- the sturdiest design


def window(low: float, high: float, **parts: Any) -> Design:
    """A Purcell factor between two ends."""
    ends = (Requirement("peak_purcell", at_least=low), Requirement("peak_purcell", at_most=high))
    return design_of(requirements=ends, **parts)


def test_the_middle_of_a_window_is_the_sturdiest() -> None:
    """Q scatters in its logarithm, so the middle is that of the logarithms, and 2Φ(w/2σ) − 1 pass."""
    design = window(10.0, 20.0)
    best = sturdiest(design, {"quality_factor": (10.0, 1e4)}, count=2**14)
    middle = math.sqrt(10.0 * 20.0) * 4 * math.pi**2 / 3
    share = 2 * float(ndtr(math.log(2) / 2 / WIDTH)) - 1
    assert best.met
    assert best.value == pytest.approx(share, abs=2e-3)
    assert best.point["quality_factor"] == pytest.approx(middle, rel=0.03)
    assert best.changes["quality_factor"][0] == 100.0
    assert best.reason.startswith(f"{100 * best.value:.3g} of 100 devices pass, ")
    assert best.reason.endswith(
        f"the most found within these bounds, with Quality factor 100 → {best.point['quality_factor']:.4g}."
    )


def test_the_middle_of_a_placement_is_the_sturdiest() -> None:
    """ψ = exp(−2r²/w²) falls evenly in r², and a normal scatter of r has its middle between the ends."""
    requirements = (
        Requirement("placement", at_least=0.7),
        Requirement("placement", at_most=0.9),
    )
    width = 40e-9
    design = design_of(
        requirements=requirements, scatter={"lateral_offset": Spread("normal", width)}
    )
    radius = design.outcome(["mode_radius"])["mode_radius"]
    near, far = (radius * math.sqrt(-math.log(end) / 2) for end in (0.9, 0.7))
    best = sturdiest(design, {"lateral_offset": (0.0, 4e-7)}, count=2**14)
    share = 2 * float(ndtr((far - near) / 2 / width)) - 1
    assert 0.5 < share < 0.99
    assert best.point["lateral_offset"] == pytest.approx((near + far) / 2, abs=0.05 * width)
    assert best.value == pytest.approx(share, abs=3e-3)


def test_where_nearly_all_pass_the_best_is_still_found() -> None:
    """A ridge in Q and V: few devices would all pass long before the top."""
    scatter = {"quality_factor": Spread("lognormal", 0.3), "mode_volume": Spread("lognormal", 0.3)}
    design = window(10.0, 10.0 * math.exp(2.4), scatter=scatter)
    best = sturdiest(design, {"quality_factor": (10.0, 1e5), "mode_volume": (0.01, 100.0)})
    share = 2 * float(ndtr(1.2 / math.hypot(0.3, 0.3))) - 1  # 0.9953
    assert best.value == pytest.approx(share, abs=3e-3)
    drawn = yield_of(best.point, design.scatter, design.requirements, 2**16)
    assert drawn.share > share - 2e-3


def test_of_designs_that_do_equally_well_the_nearer_one_is_taken() -> None:
    """Above the limit all pass: no reason to go further than that."""
    design = design_of(-1.0)
    best = sturdiest(design, {"quality_factor": (10.0, 1e8)})
    assert best.value > 0.998
    assert 100 * math.exp(3 * WIDTH) < best.point["quality_factor"] < 100 * math.exp(8 * WIDTH)


def test_without_scatter_the_sturdiest_is_one_that_meets_everything() -> None:
    best = sturdiest(design_of(-1.0, scatter={}), {"quality_factor": (10.0, 1e4)})
    assert (best.met, best.value) == (True, 1.0)
    assert best.point["quality_factor"] == pytest.approx(100 * math.exp(WIDTH), rel=0.02)


def test_the_steps_never_get_worse_and_end_with_the_answer() -> None:
    design, bounds = window(10.0, 20.0), {"quality_factor": (10.0, 1e4)}
    steps = list(sturdiest_steps(design, bounds, count=1024))
    values = [step.value for step in steps]
    # The nearer of two is taken even if a little fewer pass: NEARER for the length of a slider.
    assert all(after >= before - 0.002 for before, after in pairwise(values))
    assert values[0] < 0.5 < values[-1]
    assert (steps[-1].done, steps[-1].starts) == (len(ROUNDS), len(ROUNDS))
    assert [step.done for step in steps] == sorted(step.done for step in steps)
    last = sturdiest(design, bounds, count=1024)
    assert dict(last.point) == dict(steps[-1].point)
    assert (last.value, last.reason) == (steps[-1].value, steps[-1].reason)


def test_another_seed_draws_other_devices_and_finds_the_same() -> None:
    design, bounds = window(10.0, 20.0), {"quality_factor": (10.0, 1e4)}
    one, other = (sturdiest(design, bounds, seed=seed) for seed in (0, 1))
    assert one.value != other.value
    assert one.value == pytest.approx(other.value, abs=0.01)


def test_where_no_device_passes_anywhere_what_fails_is_said() -> None:
    design = design_of(requirements=(Requirement("peak_purcell", at_least=1e6),))
    best = sturdiest(design, {"quality_factor": (10.0, 1000.0)})
    assert (best.met, best.value) == (False, 0.0)
    assert best.failing == design.requirements[0]
    assert best.reason.startswith("Not reachable within these bounds")
    assert best.point["quality_factor"] == pytest.approx(1000.0)


def test_bounds_that_leave_nothing_to_change() -> None:
    best = sturdiest(design_of(1.0), {"quality_factor": (100.0, 100.0)})
    assert best.changes == {}
    assert best.value == pytest.approx(float(ndtr(1.0)), abs=5e-3)
    assert (
        best.reason
        == f"{100 * best.value:.3g} of 100 devices pass, the most found within these bounds, with nothing changed."
    )
    idle = sturdiest(design_of(1.0), {"lifetime": (1e-9, 1e-6)})
    assert idle.changes == {}, "what changes nothing is left as it is"


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"design": {"quality_factor": 1.0}}, "a Design"),
        ({"design": design_of(requirements=())}, "requires nothing"),
        ({"design": design_of(requirements=CONTRADICTION)}, "contradict"),
        ({"design": design_of(scatter={"filter_width": Spread("normal", 1e-9)})}, "without end"),
        ({"bounds": {}}, "no input to change"),
        ({"bounds": None}, "no mapping"),
        ({"bounds": {"colour": (1, 2)}}, "no input"),
        ({"bounds": {"quality_factor": (5, 2)}}, "backwards"),
        ({"bounds": {"quality_factor": (0.0, 2.0)}}, "too far"),
        ({"bounds": {"destination": (1, 2)}}, "no number"),
        ({"count": 0}, "whole number"),
        ({"count": "many"}, "whole number"),
        ({"seed": -1}, "seed"),
        ({"seed": 1.5}, "seed"),
    ],
)
def test_what_cannot_be_sought_is_refused_in_one_sentence(
    change: dict[str, Any], said: str
) -> None:
    given = {"design": design_of(), "bounds": {"quality_factor": (10.0, 1000.0)}} | change
    with pytest.raises(InputError) as caught:
        sturdiest(**given)
    one_sentence(str(caught.value))
    assert said in str(caught.value)


def test_a_find_says_how_many_of_its_devices_would_pass() -> None:
    """The same share as `yield_of` gives; nothing is said where nothing scatters."""
    design = first_question().design
    point = {**design.point, "quality_factor": 30.7, "mode_volume": 0.42}
    passing = yield_of(point, design.scatter, design.requirements, DEVICES)
    words = survival(design, point)
    assert f"{100 * passing.share:.0f} of 100 such devices would pass" in words
    assert "most devices that pass" in words
    assert survival(replace(design, scatter={}), point) == ""
