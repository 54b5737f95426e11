"""What a page keeps and what a link carries: back bit for bit, and checked like any file."""

from __future__ import annotations

import json
import random
import string
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given

from explorer import Design, InputError, Requirement, Samples
from explorer.exact import RecordError
from explorer.kept import LONGEST_LINK, Page, from_link, link_of, page_from, page_text
from explorer.maps import Axis
from explorer.measured.use import with_measured
from explorer.page.panels.keeper import FULL, KeeperPanel
from explorer.page.state import State
from explorer.question import Question
from explorer.scenario import first_question

from . import strategies

FIRST = first_question()


def spectrum(count: int = 4000) -> Samples:
    offsets = np.linspace(-40e-9, 40e-9, count)
    return Samples(offsets, 1 / (1 + (offsets / 5e-9) ** 2) + 0.01 * np.sin(1e9 * offsets) ** 2)


def test_the_first_question_comes_back() -> None:
    page = Page(FIRST, {"A": FIRST.design, "C": FIRST.design.with_values(quality_factor=9.0)})
    assert page_from(page_text(page)) == page
    assert from_link(link_of(FIRST)).question == FIRST


@strategies.tried(60)
@given(point=strategies.points())
def test_any_design_comes_back_bit_for_bit(point: dict[str, Any]) -> None:
    try:
        design = Design(point=point)
    except InputError:
        return
    question = replace(FIRST, design=design)
    assert page_from(page_text(Page(question))).question == question


def test_axes_layers_and_cut_come_back() -> None:
    question = Question(
        FIRST.design,
        "g2_zero",
        Axis("lifetime", 1e-9, 1e-7, log=True, count=256),
        Axis("numerical_aperture", 0.1, 0.9, log=False, count=256),
        frozenset({"iso", "hatching"}),
        ("half_angle", "mode_volume"),
    )
    assert page_from(page_text(Page(question))).question == question
    assert from_link(link_of(question)).question == question


def test_a_measured_spectrum_is_kept_but_only_named_in_a_link() -> None:
    design = with_measured(FIRST.design, {"spectrum": spectrum()}, "light.csv", "ab" * 32)
    question = replace(FIRST, design=design)
    assert page_from(page_text(Page(question))).question == question
    link = link_of(question)
    assert len(link) <= LONGEST_LINK
    page = from_link(link)
    assert "spectrum" not in page.question.design.point
    assert page.missing == {"light.csv": "ab" * 32}


def test_a_link_that_would_be_too_long_is_refused_in_a_sentence() -> None:
    noise = "".join(random.Random(1).choices(string.printable[:90], k=4000))
    decision = replace(FIRST.design.decision, why=noise, doubts=noise[::-1], who=noise[7:])
    question = replace(FIRST, design=replace(FIRST.design, note=noise, decision=decision))
    with pytest.raises(InputError, match="save the design instead"):
        link_of(question)


def bad_links() -> dict[str, str]:
    link = link_of(FIRST)
    bomb = __import__("zlib").compress(b" " * 50_000_000, 9)
    encoded = __import__("base64").urlsafe_b64encode(bomb).decode().rstrip("=")
    return {
        "empty": "",
        "other": "s=abc",
        "cut": link[: len(link) // 2],
        "letters": "q=" + "A" * 100,
        "signs": "q=<script>alert(1)</script>",
        "umlaut": "q=äöü",
        "long": "q=" + "A" * 9000,
        "bomb": "q=" + encoded[: LONGEST_LINK - 2],
        "changed": link[:200] + "XXXX" + link[204:],
    }


@pytest.mark.parametrize("name", bad_links())
def test_a_bad_link_is_refused_in_one_sentence(name: str) -> None:
    with pytest.raises(RecordError) as caught:
        from_link(bad_links()[name])
    assert "\n" not in str(caught.value)
    assert len(str(caught.value)) < 300


def changed(path: str, value: Any) -> str:
    record = json.loads(page_text(Page(FIRST, {"A": FIRST.design})))
    place = record
    *steps, last = path.split("/")
    for step in steps:
        place = place[int(step) if step.isdigit() else step]
    place[last] = value
    return json.dumps(record)


@pytest.mark.parametrize(
    ("path", "value"),
    [
        ("format", "something else"),
        ("version", 99),
        ("more", 1),
        ("shown/quantity", "no_such"),
        ("shown/quantity", 3),
        ("shown/cut", ["rate_in_fibre"] * 3),
        ("shown/cut", ["no_such", "quality_factor"]),
        ("shown/x/input", "spectrum"),
        ("shown/x/input", "quality_factor"),
        ("shown/x/low", -5),
        ("shown/x/high", "infinite"),
        ("shown/layers", "iso"),
        ("kept/E", {}),
        ("kept/A", {}),
        ("design/inputs/given/quality_factor/value", -1),
        ("design/inputs/given/quality_factor/value", "<img src=x onerror=alert(1)>"),
        ("design/inputs/given/no_such", {"value": 1, "unit": "1"}),
        ("design/requirements/0/quantity", "no_such"),
        ("design/name", "x" * 5000),
        ("design/origins/lifetime/kind", "guessed"),
    ],
)
def test_a_page_that_cannot_be_is_refused_in_one_sentence(path: str, value: Any) -> None:
    with pytest.raises(RecordError) as caught:
        page_from(changed(path, value))
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    "text", ["", "{", "[]", "null", "1", '{"format": NaN}', "[" * 5000, "\x00"]
)
def test_what_is_no_page_is_refused_in_one_sentence(text: str) -> None:
    with pytest.raises(RecordError) as caught:
        page_from(text)
    assert "\n" not in str(caught.value)


# ---------------------------------------------------------------- the panel


class Heard:
    """A keeper's panel and what it sent to the browser."""

    def __init__(self, keeps: bool = True) -> None:
        self.state = State(FIRST)
        self.panel = KeeperPanel(self.state, keeps)
        self.sent: list[dict[str, Any]] = []
        self.panel.keeper.send = self.sent.append

    def hear(self, **content: Any) -> None:
        self.panel._hear(None, content, [])

    def texts(self, kind: str) -> list[str]:
        return [message.get("text", "") for message in self.sent if message["kind"] == kind]


def test_every_change_is_kept_and_comes_back() -> None:
    first = Heard()
    first.hear(kind="open", text="", kept="")
    first.state.give(quality_factor=77.0)
    first.state.shortlist.keep(first.state.question.design)
    first.state.ask(shown="g2_zero")
    second = Heard()
    second.hear(kind="open", text="", kept=first.texts("keep")[-1])
    assert second.state.question == first.state.question
    assert second.state.answer.question == first.state.question
    assert second.state.shortlist.kept == first.state.shortlist.kept
    assert second.state.history.past == []
    assert second.texts("keep") == []  # what has just come is there already


def test_nothing_is_kept_before_the_browser_has_spoken() -> None:
    heard = Heard()
    heard.state.give(quality_factor=77.0)
    assert heard.sent == []


def test_a_page_with_a_question_of_its_own_keeps_nothing() -> None:
    heard = Heard(keeps=False)
    heard.state.give(quality_factor=77.0)
    heard.hear(kind="open", text="", kept=page_text(Page(FIRST)))
    assert heard.texts("keep") == []
    assert heard.state.question.design.point["quality_factor"] == 77.0


def test_a_link_stands_before_what_was_kept() -> None:
    heard = Heard()
    other = replace(FIRST, design=FIRST.design.with_values(quality_factor=55.0))
    heard.hear(kind="open", text=link_of(other), kept=page_text(Page(FIRST)))
    assert heard.state.question == other
    assert [message["kind"] for message in heard.sent] == ["taken"]
    heard.hear(kind="link")
    assert heard.texts("link") == [link_of(other)]


@pytest.mark.parametrize("content", [{"text": "q=broken"}, {"text": "", "kept": "{broken"}])
def test_what_cannot_be_read_is_said_and_the_first_question_stays(content: dict[str, str]) -> None:
    heard = Heard()
    heard.hear(kind="open", **content)
    assert heard.state.question == FIRST
    assert heard.state.problems[""]
    heard.state.give(quality_factor=77.0)
    assert heard.texts("keep")  # and from now on the work is kept


def test_a_link_without_its_measured_data_asks_for_it() -> None:
    design = with_measured(FIRST.design, {"spectrum": spectrum()}, "light.csv", "ab" * 32)
    heard = Heard()
    heard.hear(kind="open", text=link_of(replace(FIRST, design=design)))
    assert "light.csv (abababab…)" in heard.state.problems[""]


def test_a_browser_without_room_says_so() -> None:
    heard = Heard()
    heard.hear(kind="full")
    assert heard.state.problems[""] == FULL


def test_a_link_that_is_too_long_is_said() -> None:
    noise = "".join(random.Random(1).choices(string.printable[:90], k=4000))
    decision = replace(FIRST.design.decision, why=noise, doubts=noise[::-1], who=noise[7:])
    heard = Heard()
    heard.state.ask(design=replace(FIRST.design, note=noise, decision=decision))
    heard.hear(kind="link")
    assert "save the design instead" in heard.state.problems[""]


def test_requirements_come_back_in_their_order() -> None:
    wanted = (Requirement("g2_zero", at_most=0.2), Requirement("rate_in_fibre", at_least=1e6))
    question = replace(FIRST, design=replace(FIRST.design, requirements=wanted, passing=0.3))
    back = from_link(link_of(question)).question
    assert back.design.requirements == wanted
    assert back.design.passing == 0.3
