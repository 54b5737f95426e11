"""Fabrication in a real browser: scatter, the map of the devices that pass, limits, and the search."""

import math
import re
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from selenium.webdriver.common.action_chains import ActionChains
from selenium.webdriver.common.keys import Keys

import explorer
from explorer import Design, Requirement, Spread
from explorer.registry import REGISTRY
from explorer.scenario import first_question
from explorer.yields import PASSING

from .conftest import Browser
from .hands import Hands
from .test_page import SIZES, SMALL_TEXT, WIDE

DEVICES = REGISTRY.collective[PASSING].label
RATE = REGISTRY.quantities["rate_in_fibre"].label
SHOWN = ".panel-map .x-shown select"
VIEWS = ("light", "limits", "search")

#: F = 3Q/(4π²V) one standard deviation of Q above its limit: Φ(1), 84 of 100 devices, pass.
QUICK = Design(
    {"quality_factor": 100.0, "mode_volume": 1.0, "destination": "fibre"},
    requirements=(
        Requirement("peak_purcell", at_least=3 * 100 / (4 * math.pi**2) * math.exp(-0.2)),
    ),
    scatter={"quality_factor": Spread("lognormal", 0.2)},
)

#: Buttons, menus and boxes in sight that no name tells apart.
NAMELESS = """
const name = (e) => [
  e.getAttribute("aria-label"),
  document.getElementById(e.getAttribute("aria-labelledby") ?? "")?.innerText,
  [...(e.labels ?? [])].map((label) => label.innerText).join(" "),
  e.getAttribute("title"),
  e.tagName === "BUTTON" ? e.innerText : "",
].find((text) => text?.trim());
return [...document.querySelectorAll(".explorer button, .explorer select, .explorer input")]
  .filter((e) => e.checkVisibility({ visibilityProperty: true }) && !name(e))
  .map((e) => e.outerHTML.slice(0, 150));
"""


@pytest.fixture
def hands(page: Browser, tmp_path: Path) -> Iterator[Hands]:
    """The shared page at its first question, with the map and the view of a first visit."""
    person = Hands(page)
    page.resize(1280, 720)
    turn(person, "light")
    person.choose(SHOWN, RATE)
    given(person, first_question().design, tmp_path)
    page.wait_until(lambda: person.headline().endswith("; under 1 of 100 devices pass."))
    yield person
    assert page.console_errors() == []
    assert page.foreign_requests() == []
    assert "Traceback" not in page.find("body")[0].text


def given(person: Hands, design: Design, folder: Path) -> None:
    """Load a design from a file."""
    path = folder / "design.json"
    explorer.save_design(design, path)
    person.give_file(path)


def turn(person: Hands, view: str) -> None:
    """Open a view of the right column."""
    person.click(".x-switch button", view)
    panel = {"light": ".panel-budget"}.get(view, f".panel-{view}")
    person.browser.wait_until(lambda: seen(person, panel))


def quick(person: Hands, folder: Path) -> None:
    given(person, QUICK, folder)
    person.browser.wait_until(lambda: "84 of 100 devices pass" in person.headline())


def proposal(person: Hands) -> str:
    found = person.browser.run("return document.querySelector('.explorer-map').dataset.proposal")
    return str(found or "")


def canvas_box(person: Hands) -> list[float]:
    found = person.browser.run(
        "const b = document.querySelector('.explorer-map').getBoundingClientRect();"
        "return [b.left, b.top, b.width, b.height].map(Math.round)"
    )
    return list(found)


def seen(person: Hands, selector: str) -> bool:
    return any(part.is_displayed() for part in person.browser.find(selector))


# -------------------------------------------------------------------- scatter


def test_a_scatter_is_pressed_typed_and_taken_away(hands, tmp_path) -> None:
    quick(hands, tmp_path)
    row = ".input-quality_factor"
    press = hands.browser.find(f"{row} .x-scatter")[0]
    assert press.text == "±20 %"
    press.click()
    width = hands.browser.wait_for(f"{row} .x-spread input")
    hands.type(width, "40")
    hands.browser.wait_until(lambda: "69 of 100 devices pass" in hands.headline())  # Φ(1/2)
    assert press.text == "±40 %"
    hands.type(width, "-3")
    said = hands.browser.wait_until(lambda: hands.complaint(row))
    assert "negative" in said
    assert "\n" not in said
    assert "69 of 100" in hands.headline()
    hands.type(width, "20")
    hands.browser.wait_until(lambda: "84 of 100 devices pass" in hands.headline())
    assert hands.complaint(row) == ""
    hands.choose(f"{row} .x-spread select", "± normal")
    hands.browser.wait_until(lambda: press.text == "±20")
    assert width.get_property("value") == "20"
    hands.click(f"{row} .x-spread button", "×")
    hands.browser.wait_until(lambda: press.text == "±")
    hands.browser.wait_until(lambda: "devices" not in hands.headline())
    assert not seen(hands, f"{row} .x-spread")


def test_a_value_is_typed_with_its_scatter(hands, tmp_path) -> None:
    quick(hands, tmp_path)
    hands.type(hands.box("mode_volume"), "1 ± 10 %")
    press = hands.browser.find(".input-mode_volume .x-scatter")[0]
    hands.browser.wait_until(lambda: press.text == "±0.1 (λ/n)³")
    assert hands.number("mode_volume") == "1"
    hands.browser.wait_until(lambda: re.search("8[0-3] of 100 devices pass", hands.headline()))
    saved = explorer.load_design(hands.save())
    assert saved.scatter == {**QUICK.scatter, "mode_volume": Spread("normal", 0.1)}
    assert hands.browser.run(WIDE) == []


def test_a_share_that_is_wanted_is_missed_and_met(hands, tmp_path) -> None:
    quick(hands, tmp_path)
    hands.choose(".panel-wanted .x-more select", DEVICES)
    field = hands.browser.wait_for(f".wanted-{PASSING} input")
    hands.type(field, "90")
    hands.browser.wait_until(lambda: "90 of 100 wanted ✗" in hands.text(".panel-headline p"))
    assert hands.browser.find(f".wanted-{PASSING}.x-missed")
    assert hands.browser.find(".panel-headline .x-missed")
    hands.type(field, "most")
    assert "no number" in hands.browser.wait_until(lambda: hands.complaint(".panel-wanted"))
    hands.type(field, "80 %")
    hands.browser.wait_until(lambda: hands.browser.find(".panel-headline .x-met"))
    hands.browser.wait_until(lambda: "84 of 100" in hands.headline())
    assert "✗" not in hands.text(".panel-headline p")
    assert hands.complaint(".panel-wanted") == ""


# -------------------------------------------------------------------- the map of the devices that pass


def test_the_map_of_devices_grows_in_its_place_and_its_progress_goes(hands, tmp_path) -> None:
    quick(hands, tmp_path)
    frame, before = hands.frame(), hands.rest()
    assert not seen(hands, ".x-progress")
    hands.choose(SHOWN, DEVICES)
    hands.browser.wait_until(lambda: hands.frame() > frame)
    hands.browser.wait_until(lambda: seen(hands, ".x-progress .progress-bar"))
    place = canvas_box(hands)
    coarse = hands.pixels()
    hands.browser.wait_until(lambda: not seen(hands, ".x-progress .progress-bar"))
    assert canvas_box(hands) == place, "the map does not jump when it is ready"
    after = hands.rest()
    assert coarse != after["pixels"] != before["pixels"]
    assert "84 of 100" in after["headline"]
    assert after["point"] == before["point"]
    label = hands.browser.find(".explorer-map [role=img]")[0]
    words = f"Map of {DEVICES} over"
    hands.browser.wait_until(lambda: words in str(label.get_attribute("aria-label")))
    assert "At the design point: 84" in str(label.get_attribute("aria-label"))
    frame = hands.frame()
    surface = hands.browser.find(".explorer-map [role=slider]")[0]
    surface.send_keys(Keys.ARROW_UP * 3)
    moved = hands.changed(after, "headline", "point")
    assert moved["pixels"] == after["pixels"]
    assert hands.frame() == frame, "moving along the axes draws nothing anew"


def test_a_map_that_takes_long_can_be_stopped(hands) -> None:
    frame = hands.frame()
    hands.choose(SHOWN, DEVICES)
    stop = hands.browser.wait_for(".x-progress button")
    hands.browser.wait_until(lambda: hands.frame() > frame)
    hands.browser.wait_until(lambda: "devices pass" in hands.headline())
    stop.click()
    hands.browser.wait_until(lambda: "stopped" in hands.text(".x-progress"))
    assert not seen(hands, ".x-progress button")
    stopped = hands.rest()
    frame = hands.frame()
    hands.choose(SHOWN, RATE)
    hands.browser.wait_until(lambda: hands.frame() > frame)
    hands.browser.wait_until(lambda: not seen(hands, ".x-progress"))
    assert hands.rest()["pixels"] != stopped["pixels"]


# -------------------------------------------------------------------- limits


def test_the_limits_are_three_ranked_lists(hands) -> None:
    turn(hands, "limits")
    panel = ".panel-limits"
    hands.browser.wait_until(lambda: "Optics transmission" in hands.text(f"{panel} .x-ends"))
    words = hands.text(panel)
    for title in ("What to improve first", "What to fabricate better", "What to measure first"):
        assert title in words
    assert "working" not in words
    gains = [float(one) for one in re.findall(r"×([\d.]+)", words)]
    assert len(gains) > 4
    assert gains == sorted(gains, reverse=True)
    assert "Under 1 of 100 devices meet everything" in words
    hands.choose(f"{panel} .x-menu select", REGISTRY.quantities["g2_zero"].label)
    hands.browser.wait_until(lambda: "×" not in hands.text(panel))
    turn(hands, "light")
    assert not seen(hands, panel)


# -------------------------------------------------------------------- the search


def test_a_found_design_is_shown_taken_and_meets_everything(hands) -> None:
    turn(hands, "search")
    before = hands.point()
    assert proposal(hands) == ""
    hands.click(".panel-search button", "search")
    hands.browser.wait_until(lambda: seen(hands, ".panel-search .mod-active"))
    place = [float(part) for part in proposal(hands).split(",")]
    assert hands.point() == before, "nothing changes until it is taken"
    assert "Every requirement is met." in hands.text(".panel-search")
    hands.click(".panel-search button", "take it")
    hands.browser.wait_until(lambda: hands.point() != before)
    hands.browser.wait_until(lambda: "every requirement is met" in hands.text(".panel-headline p"))
    assert hands.point() == pytest.approx(place, abs=1e-3)
    assert "as wanted" in hands.headline()
    hands.browser.wait_until(lambda: proposal(hands) == "")
    assert not seen(hands, ".panel-search .mod-active")
    hands.browser.wait_until(lambda: "devices pass" in hands.headline())


def test_what_was_found_can_be_left_and_goes_with_another_design(hands) -> None:
    turn(hands, "search")
    for leave in (
        lambda: hands.click(".panel-search button", "leave it"),
        lambda: hands.type(hands.box("quality_factor"), "26"),
    ):
        hands.click(".panel-search button", "search")
        hands.browser.wait_until(lambda: seen(hands, ".panel-search .mod-active"))
        assert proposal(hands)
        leave()
        hands.browser.wait_until(lambda: proposal(hands) == "")
        assert not seen(hands, ".panel-search .mod-active")


def test_bounds_that_cannot_be_say_one_sentence(hands) -> None:
    turn(hands, "search")
    low = hands.browser.find(".bounds-quality_factor input")[0]
    hands.type(low, "1e7")
    hands.click(".panel-search button", "search")
    said = hands.browser.wait_until(lambda: hands.complaint(".panel-search"))
    assert "Quality factor run backwards" in said
    assert "\n" not in said
    assert hands.complaint() == ""
    hands.type(low, "3")
    hands.browser.wait_until(lambda: hands.complaint(".panel-search") == "")


def tab_to(person: Hands, true: Callable[[str], bool], most: int = 120) -> None:
    """Press the tabulator until the focus is where it is wanted."""
    for _ in range(most):
        ActionChains(person.browser.driver).send_keys(Keys.TAB).perform()
        found = person.browser.run(
            "const e = document.activeElement;"
            "return [e.closest('[class*=panel-]')?.className, e.className, e.innerText || e.title].join(' | ')"
        )
        if true(str(found)):
            return
    raise AssertionError("the tabulator does not come there")


def press(person: Hands, key: str) -> None:
    ActionChains(person.browser.driver).send_keys(key).perform()


def test_a_search_needs_no_pointer(hands) -> None:
    hands.browser.run("document.querySelector('.explorer-map [role=slider]').focus()")
    before = hands.point()
    tab_to(hands, lambda where: where.endswith(" | search") and "panel-search" not in where)
    press(hands, Keys.ENTER)
    hands.browser.wait_until(lambda: seen(hands, ".panel-search"))
    tab_to(hands, lambda where: "panel-search" in where and where.endswith(" | search"))
    press(hands, Keys.ENTER)
    hands.browser.wait_until(lambda: seen(hands, ".panel-search .mod-active"))
    tab_to(hands, lambda where: where.endswith(" | take it"), most=6)
    press(hands, Keys.ENTER)
    hands.browser.wait_until(lambda: hands.point() != before)
    hands.browser.wait_until(lambda: "every requirement is met" in hands.text(".panel-headline p"))


def test_a_trade_off_is_a_line_to_choose_from(hands) -> None:
    turn(hands, "search")
    hands.choose(".panel-search .x-menu select", "trade-off of two")
    hands.click(".panel-search button", "search")
    hands.browser.wait_until(lambda: seen(hands, ".panel-search .mod-active"))
    first = proposal(hands)
    for size in SIZES:
        hands.browser.resize(*size)
        hands.rest()
        assert hands.browser.run(SMALL_TEXT) == []
        assert hands.browser.run(WIDE) == []
    hands.browser.resize(1280, 720)
    assert hands.browser.run(NAMELESS) == []
    hands.browser.find(".panel-search .noUi-handle")[0].send_keys(Keys.ARROW_RIGHT * 12)
    hands.browser.wait_until(lambda: proposal(hands) != first)
    assert re.search(r"\d+ of \d+:", hands.text(".panel-search"))
    hands.click(".panel-search button", "leave it")
    hands.choose(".panel-search .x-menu select", "nearest that meets all")
    hands.browser.wait_until(lambda: proposal(hands) == "")


# -------------------------------------------------------------------- what is seen


@pytest.mark.parametrize("size", SIZES)
def test_every_view_fits_is_legible_and_has_names(hands, size) -> None:
    hands.browser.resize(*size)
    hands.click(".input-quality_factor .x-scatter")
    hands.choose(SHOWN, DEVICES)
    for view in VIEWS:
        turn(hands, view)
        if view == "limits":
            hands.browser.wait_until(lambda: "Optics transmission" in hands.text(".x-ends"))
        assert hands.browser.run(SMALL_TEXT) == []
        assert hands.browser.run(WIDE) == []
        assert hands.browser.run(NAMELESS) == []
    hands.click(".input-quality_factor .x-scatter")
