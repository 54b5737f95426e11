"""The brief: everything that was decided stands in it, escaped, and nothing in it runs or loads."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import replace
from xml.etree import ElementTree

import pytest

from explorer.answers import Answers
from explorer.brief import STANDING, brief, brief_of
from explorer.brief.drawings import map_drawing, ticks
from explorer.built import Estimate
from explorer.design import Decision, Design
from explorer.inputs import INPUTS
from explorer.maps import Axis, make_map
from explorer.measured.use import with_device, with_measured
from explorer.page.panels.decision import SEAT, DecisionPanel
from explorer.page.state import State
from explorer.question import Question
from explorer.scenario import first_question
from explorer.yields import PASSING

SCRIPT = "<script>alert(1)</script><img src=x onerror=alert(2)>"


def question() -> Question:
    first = first_question()
    decision = Decision("the device team", "the widest margin", "the yield")
    design = replace(first.design, decision=decision)
    lifetime = {"lifetime": Estimate(3.6e-9, 3.5e-9, 3.7e-9)}
    design = with_measured(design, lifetime, "bare.csv", "ab" * 32, "one exponential")
    design = with_device(design, "sample 1", {"g2_zero": Estimate(0.06, 0.05, 0.07)})
    return replace(first, design=design)


def svgs(html: str) -> list[ElementTree.Element]:
    return [
        ElementTree.fromstring(found) for found in re.findall(r"<svg.*?</svg>", html, re.DOTALL)
    ]


def test_everything_that_was_decided_stands_in_it() -> None:
    html = brief(question())
    for words in (
        "Harbour to lighthouse",
        "the device team",
        "the widest margin",
        "the yield",
        "million photons/s reach the fibre",
        "Photons/s in the fibre",
        "times too few",
        "Lifetime, bare: 3.5 ns to 3.7 ns",
        "Resonance scatters: normal",
        "sample 1",
        "bare.csv",
        "ab" * 32,
        STANDING,
        "of 100",
    ):
        assert words in html, words
    for entry in INPUTS.values():
        if not entry.whole:
            assert f"{entry.label}:" in html
    assert len(svgs(html)) == 3  # map, budget, angles: each well formed


def test_nothing_in_it_runs_or_loads() -> None:
    first = first_question()
    design = replace(
        first.design, name=SCRIPT, note=SCRIPT, decision=Decision(SCRIPT, SCRIPT, SCRIPT)
    )
    design = with_device(design, SCRIPT[:60], {"g2_zero": Estimate(0.06, 0.05, 0.07)}, SCRIPT, "x")
    html = brief(replace(first, design=design))
    assert "<script" not in html
    assert "<img" not in html
    assert "&lt;script&gt;" in html
    assert not re.findall(r'(?:src|href|url)\s*[=(]\s*["\']?http', html)
    assert "default-src 'none'" in html


def test_a_bare_design_has_a_brief() -> None:
    html = brief(Design())
    assert "Nothing is required." in html
    assert len(svgs(html)) == 3


@pytest.mark.parametrize("shown", ["regime", PASSING])
def test_a_map_of_words_or_of_devices_is_left_out(shown: str) -> None:
    asked = replace(first_question(), shown=shown)
    if shown == PASSING:
        html = brief(asked)  # its map takes long: the brief draws the rate
        assert len(svgs(html)) == 3
    else:
        html = brief_of(Answers().answer(asked))
        assert len(svgs(html)) == 2


def test_the_point_of_the_drawing_is_where_the_design_is() -> None:
    x, y = Axis("mode_volume", 0.01, 100.0, count=40), Axis("quality_factor", 1.0, 1e4, count=40)
    drawn = make_map({}, x, y, ["rate_in_fibre"])
    root = ElementTree.fromstring(map_drawing(drawn, "rate_in_fibre", (1.0, 1e2), "map"))
    circles = [one for one in root.iter() if one.tag.endswith("circle")]
    rect = next(one for one in root.iter() if one.tag.endswith("rect"))
    left, top, side = (float(rect.attrib[key]) for key in ("x", "y", "width"))
    assert len(circles) == 2
    for circle in circles:
        assert float(circle.attrib["cx"]) == pytest.approx(left + side / 2, abs=0.1)
        assert float(circle.attrib["cy"]) == pytest.approx(top + side / 2, abs=0.1)
    outside = map_drawing(drawn, "rate_in_fibre", (1e6, 1e2), "map")
    assert "circle" not in outside


def test_the_bands_cover_the_whole_map() -> None:
    x, y = Axis("mode_volume", 0.01, 100.0, count=30), Axis("quality_factor", 1.0, 1e4, count=30)
    drawn = make_map({}, x, y, ["rate_in_fibre"])
    svg = map_drawing(drawn, "rate_in_fibre", (1.0, 1e2), "map")
    area = 0.0
    for path in re.findall(r'<path d="([^"]*)" fill="#', svg):
        for ring in path.split("Z"):
            points = [tuple(map(float, pair.split())) for pair in re.split("[ML]", ring) if pair]
            area += sum(
                (a[0] * b[1] - b[0] * a[1]) / 2
                for a, b in zip(points, points[1:] + points[:1], strict=True)
            )
    assert abs(area) == pytest.approx(300.0**2, rel=2e-3)


@pytest.mark.parametrize(
    ("low", "high", "log", "expected"),
    [
        (1.0, 1000.0, True, [1, 10, 100, 1000]),
        (0.0, 1.0, False, [0, 0.2, 0.4, 0.6, 0.8, 1.0]),
        (2.0, 8.0, True, [2, 4, 6, 8]),
    ],
)
def test_ticks_are_round(low: float, high: float, log: bool, expected: list[float]) -> None:
    assert ticks(low, high, log) == pytest.approx(expected)


# ---------------------------------------------------------------- the panel


@pytest.fixture
def panel() -> Iterator[DecisionPanel]:
    made = DecisionPanel(State(first_question()))
    yield made
    made.close()


def test_what_is_written_goes_into_the_design(panel: DecisionPanel) -> None:
    for name, field in panel.fields.items():
        field.value = f"words of {name}"
    design = panel._state.question.design
    assert design.name == "words of name"
    assert design.decision == Decision("words of who", "words of why", "words of doubts")
    panel._state.undo()
    assert panel._state.question != first_question()
    assert panel.fields["name"].value == panel._state.question.design.name


def test_a_text_that_is_too_long_is_said_and_stays_in_its_field(panel: DecisionPanel) -> None:
    panel.fields["why"].value = "x" * 5000
    assert panel.wrong.value
    assert panel._state.question.design.decision.why == ""
    panel._state.give(quality_factor=30.0)
    assert len(panel.fields["why"].value) == 5000
    panel.fields["why"].value = "short"
    assert panel.wrong.value == ""
    assert panel._state.question.design.decision.why == "short"


def test_the_brief_and_the_map_are_handed_over(panel: DecisionPanel) -> None:
    sent: list[tuple[dict, list[bytes]]] = []
    for button in (panel.brief, panel.picture):
        button.send = lambda message, buffers: sent.append((message, buffers))
        button._hear(None, {"kind": "fetch"}, [])
        button._hear(None, {"kind": "other"}, [])
    (brief_message, brief_bytes), (map_message, map_bytes) = sent
    assert brief_message["name"] == "harbour-to-lighthouse.html"
    assert b"Harbour to lighthouse" in brief_bytes[0]
    assert map_message == {"kind": "file", "name": "map.svg", "type": "image/svg+xml"}
    ElementTree.fromstring(map_bytes[0])


def test_a_map_of_words_is_no_drawing(panel: DecisionPanel) -> None:
    panel._state.ask(shown="regime")
    assert panel._picture() is None
    assert "number" in panel._state.problems[SEAT]


def test_half_angles_are_written_as_people_do() -> None:
    design = Design({"aperture_radius": 1e-6})
    half = math.degrees(float(design.outcome(["half_angle"])["half_angle"]))
    assert f"half-angle {half:.2f}°" in brief(design)
