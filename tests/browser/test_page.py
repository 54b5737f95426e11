"""The served page in a real browser: hands change it, files leave it and come back, it all fits."""

import json
import math
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
import pytest
from selenium.webdriver.common.action_chains import ActionChains
from selenium.webdriver.common.keys import Keys
from selenium.webdriver.support.ui import Select

import explorer
from explorer.catalogue import emitters, resonators
from explorer.inputs import INPUTS
from explorer.page.panels.map import LAYERS
from explorer.page.panels.values import MAIN
from explorer.registry import REGISTRY
from explorer.scenario import first_question

from .conftest import Browser
from .hands import Hands

SIZES = ((1280, 720), (1920, 1080))
NUMBERS = [entry for entry in INPUTS.values() if not entry.whole]


@pytest.fixture
def hands(page: Browser, tmp_path: Path) -> Iterator[Hands]:
    """The shared page at its first question; what a test changes is put back through the page."""
    person = Hands(page)
    person.rest()
    yield person
    page.resize(1280, 720)
    put_back(person, tmp_path)


def put_back(person: Hands, folder: Path) -> None:
    home = folder / "home.json"
    explorer.save_design(first_question().design, home)
    person.give_file(home)
    person.click(".panel-map .x-link")
    person.choose(".panel-map .x-shown select", REGISTRY.quantities["rate_in_fibre"].label)
    for name, words in LAYERS.items():
        on = name in first_question().layers
        person.browser.run(
            "for (const button of document.querySelectorAll('.x-layers button'))"
            "if (button.textContent === arguments[0]"
            " && button.classList.contains('mod-active') !== arguments[1]) button.click();",
            words,
            on,
        )
    person.rest()


@pytest.fixture(autouse=True)
def no_error_anywhere(page: Browser) -> Iterator[None]:
    """No test of this module may leave a console error, a traceback or a foreign request."""
    yield
    assert page.console_errors() == []
    assert page.foreign_requests() == []
    assert "Traceback" not in page.run("return document.body.innerText")


# -------------------------------------------------------------------- hands


def test_first_visit_misses_the_target_and_names_the_next_step(hands) -> None:
    assert "reach the fibre" in hands.headline()
    assert "too few" in hands.headline()
    assert "nearest" in hands.text(".panel-headline p")
    assert hands.frame() >= 1


def test_dragging_the_point_moves_readouts_and_leaves_the_map(hands) -> None:
    before, frame = hands.rest(), hands.frame()
    hands.drag_point((-10, -10), (-20, -30), (-15, -20), release=False)
    while_held = hands.changed(before, "headline", "budget", "point")
    assert while_held["pixels"] == before["pixels"]
    assert hands.frame() == frame, "the map was drawn anew while the point was dragged"
    hands.browser.driver.execute_cdp_cmd(
        "Input.dispatchMouseEvent", {"type": "mouseReleased", "x": 600, "y": 400, "button": "left"}
    )
    hands.rest()
    assert float(hands.number("quality_factor")) > 25
    assert float(hands.number("mode_volume")) < 1


def test_arrow_keys_move_the_point(hands) -> None:
    before = hands.rest()
    hands.browser.run("document.querySelector('.explorer-map [role=slider]').focus()")
    surface = hands.browser.find(".explorer-map [role=slider]")[0]
    surface.send_keys(Keys.ARROW_LEFT * 5)
    after = hands.changed(before, "headline", "budget", "point")
    assert after["point"][0] == pytest.approx(before["point"][0] - 0.05, abs=0.002)


def test_arrow_keys_along_one_axis_leave_the_other_input(hands) -> None:
    before = hands.rest()
    hands.type(hands.box("quality_factor"), "12345.678")
    before = hands.changed(before, "headline", "point")
    surface = hands.browser.find(".explorer-map [role=slider]")[0]
    surface.send_keys(Keys.ARROW_LEFT * 3)
    before = hands.changed(before, "point")
    hands.drag_point((-20, 0), (-20, 0))
    before = hands.changed(before, "point")
    assert hands.number("quality_factor") == "12345.678"
    hands.type(hands.box("quality_factor"), "1e8")
    before = hands.changed(before, "headline", "point")
    surface.send_keys(Keys.ARROW_RIGHT * 3)
    hands.changed(before, "point")
    assert hands.number("quality_factor") == "100000000"


def test_an_edited_emitter_goes_back_to_what_is_published(hands) -> None:
    before = hands.rest()
    hands.type(hands.box("fast_linewidth"), "2")
    after = hands.changed(before, "headline", "budget", "pixels")
    menu = hands.browser.find(".panel-emitter select")[0]
    assert Select(menu).first_selected_option.text.endswith(", edited")
    hands.click(".panel-emitter .x-link", "as published")
    assert hands.changed(after, "headline", "budget", "pixels") == before
    menu = hands.browser.find(".panel-emitter select")[0]
    assert not Select(menu).first_selected_option.text.endswith(", edited")


def test_a_refused_axis_is_said_in_the_headline(hands) -> None:
    hands.click(".group-collection .x-group")
    hands.browser.wait_for(".input-medium_index .x-number input")
    before = hands.rest()
    hands.type(hands.box("medium_index"), "1.52")
    before = hands.changed(before, "headline")
    hands.type(hands.box("numerical_aperture"), "1.2")
    before = hands.changed(before, "headline")
    hands.click(".group-collection .x-group")
    across = hands.browser.find(".x-maphead select")[2]
    Select(across).select_by_visible_text(INPUTS["medium_index"].label)
    assert "horizontal axis" in hands.browser.wait_until(hands.complaint)
    assert hands.rest() == before
    across = hands.browser.find(".x-maphead select")[2]
    assert Select(across).first_selected_option.text == INPUTS["mode_volume"].label


def test_pressing_a_device_takes_its_place(hands) -> None:
    before = hands.rest()
    surface = hands.browser.find(".explorer-map [role=slider]")[0]
    marks = hands.browser.run(
        "return [...document.querySelectorAll('.explorer-map li')].map((item) => item.textContent)"
    )
    assert marks
    record = resonators()["nanobeam_snv_kuruma2021"]  # one of those nearest in wavelength
    question = first_question()
    across = float(question.x.fraction(record.values["mode_volume"].value_si))
    up = float(question.y.fraction(record.values["quality_factor"].value_si))
    size = surface.size
    offset = (round((across - 0.5) * size["width"]), round((0.5 - up) * size["height"]))
    ActionChains(hands.browser.driver).move_to_element_with_offset(
        surface, *offset
    ).click().perform()
    hands.changed(before, "headline", "point")
    assert float(hands.number("quality_factor")) == record.values["quality_factor"].value_si
    assert float(hands.number("mode_volume")) == record.values["mode_volume"].value_si


@pytest.mark.parametrize("name", ["fast_linewidth", "resonance_wavelength"])
def test_slider_keys_change_map_and_readouts(hands, name) -> None:
    before, shown = hands.rest(), hands.number(name)
    hands.handle(name).send_keys(Keys.ARROW_LEFT * 60)
    hands.changed(before, "headline", "budget", "pixels")
    assert float(hands.number(name)) < float(shown)


def test_slider_follows_the_pointer(hands) -> None:
    before, shown = hands.rest(), hands.number("resonance_wavelength")
    hands.drag_by(hands.handle("resonance_wavelength"), (6, 0), (6, 0))
    hands.changed(before, "headline", "budget", "pixels")
    assert float(hands.number("resonance_wavelength")) > float(shown)


def test_every_quantity_can_be_shown(hands) -> None:
    before = hands.rest()
    for quantity in REGISTRY.quantities.values():
        frame = hands.frame()
        if quantity.name == "rate_in_fibre":
            continue
        hands.choose(".panel-map .x-shown select", quantity.label)
        hands.browser.wait_until(lambda frame=frame: hands.frame() > frame)
    after = hands.rest()
    assert after["headline"] == before["headline"]
    hands.choose(".panel-map .x-shown select", REGISTRY.quantities["regime"].label)
    assert hands.rest()["pixels"] != before["pixels"]


def test_number_box_changes_everything_and_goes_back(hands) -> None:
    before = hands.rest()
    hands.type(hands.box("fast_linewidth"), "0.002 µm")
    after = hands.changed(before, "headline", "budget", "pixels")
    assert hands.number("fast_linewidth") == "2"
    hands.click(".input-fast_linewidth .x-back")
    hands.changed(after, "headline", "budget", "pixels")
    assert hands.number("fast_linewidth") == "35", "the width that the emitter's record gives"
    assert not [
        part for part in hands.browser.find(".input-fast_linewidth .x-back") if part.is_displayed()
    ]


@pytest.mark.parametrize(
    ("name", "typed", "said"),
    [
        ("fast_linewidth", "about a lot", "no number"),
        ("fast_linewidth", "3 kg", "no unit that fits nm"),
        ("fast_linewidth", "-5", "range"),
        ("quality_factor", "0", "range"),
        ("quality_factor", "1e99", "range"),
        ("numerical_aperture", "1.3", "medium_index"),
        ("mode_volume", "nan", "no number"),
        ("mode_volume", "∞", "range"),
        ("resonance_wavelength", "<img src=x onerror=alert(1)>", "no number"),
        ("resonance_wavelength", "", "no number"),
    ],
)
def test_nonsense_in_a_number_box_says_one_sentence_beside_it(hands, name, typed, said) -> None:
    before = hands.rest()
    hands.type(hands.box(name), typed or Keys.DELETE)
    sentence = hands.browser.wait_until(lambda: hands.complaint(f".input-{name}"))
    assert said in sentence
    assert "\n" not in sentence
    assert hands.rest() == before
    assert hands.complaint() == ""
    good = {"numerical_aperture": "0.1", "fast_linewidth": "22"}.get(name, "601")
    hands.type(hands.box(name), good)
    hands.changed(before, "headline")
    assert hands.complaint(f".input-{name}") == ""


def test_requirement_box_moves_the_outline_and_the_sentence(hands) -> None:
    before, frame = hands.rest(), hands.frame()
    box = hands.browser.find(".wanted-rate_in_fibre .x-number input")[0]
    hands.type(box, "5 M/s")
    after = hands.changed(before, "headline")
    assert "as wanted" in after["headline"]
    assert hands.frame() > frame
    assert after["budget"] == before["budget"]
    box = hands.browser.find(".wanted-rate_in_fibre .x-number input")[0]
    hands.type(box, "many")
    assert "no number" in hands.browser.wait_until(lambda: hands.complaint(".panel-wanted"))
    assert hands.rest() == after


def test_a_quantity_becomes_a_requirement_and_is_dropped(hands) -> None:
    hands.choose(".panel-wanted .x-more select", REGISTRY.quantities["indistinguishability"].label)
    hands.browser.wait_for(".wanted-indistinguishability")
    hands.rest()
    hands.click(".wanted-indistinguishability .x-back")
    hands.browser.wait_until(lambda: not hands.browser.find(".wanted-indistinguishability"))
    assert "too few" in hands.rest()["headline"]


def test_emitter_menu_changes_everything(hands) -> None:
    seen = {hands.rest()["headline"]}
    for record in emitters().values():
        before = hands.rest()
        hands.choose(".panel-emitter select", record.name)
        if record.key != first_question().design.emitter:
            seen.add(hands.changed(before, "headline", "budget")["headline"])
    assert len(seen) > len(emitters()) / 2
    hands.click(".panel-emitter .x-link", "sources")
    assert "seen" in hands.browser.wait_until(lambda: hands.text(".x-sources"))
    hands.click(".panel-emitter .x-link", "sources")


def test_every_layer_switches_on_and_off(hands) -> None:
    for words in LAYERS.values():
        for _ in range(2):
            frame = hands.frame()
            hands.click(".x-layers button", words)
            hands.browser.wait_until(lambda frame=frame: hands.frame() > frame)
    hands.rest()


def test_all_layers_pressed_in_one_breath(hands) -> None:
    for _ in range(4):
        frame = hands.frame()
        hands.browser.run(
            "for (const b of document.querySelectorAll('.x-layers button')) b.click()"
        )
        hands.browser.wait_until(lambda frame=frame: hands.frame() > frame)
        hands.rest()
    before = hands.rest()
    hands.handle("fast_linewidth").send_keys(Keys.ARROW_LEFT * 3)
    hands.changed(before, "headline", "pixels")


def test_groups_open_and_their_fields_work(hands) -> None:
    before = hands.rest()
    hands.click(".group-collection .x-group")
    hands.browser.wait_for(".input-optics_transmission .x-number input")
    hands.type(hands.box("optics_transmission"), "90 %")
    hands.changed(before, "headline", "budget", "pixels")
    hands.click(".group-collection .x-group")


# -------------------------------------------------------------------- axes


@pytest.mark.parametrize("side", ["x", "y"])
def test_every_input_can_be_an_axis(hands, side) -> None:
    """Each draws a map, or says in one sentence why not and keeps the last one."""
    menus = hands.browser.find(".x-maphead select")
    menu = menus[2 if side == "x" else 1]
    refused = {}
    for entry in NUMBERS:
        if entry.name in ("quality_factor", "mode_volume"):
            continue
        frame = hands.frame()
        hands.browser.run(
            "const [menu, text] = arguments;"
            "menu.selectedIndex = [...menu.options].findIndex((o) => o.textContent.replaceAll('\\u00a0', ' ') === text);"
            "menu.dispatchEvent(new Event('change', { bubbles: true }));",
            menu,
            entry.label,
        )
        hands.browser.wait_until(
            lambda frame=frame, entry=entry: (
                hands.frame() > frame
                or hands.complaint()
                or hands.complaint(f".input-{entry.name}")
            )
        )
        if hands.frame() == frame:
            refused[entry.name] = hands.text(".x-wrong")
    assert refused == {}
    hands.rest()


def test_point_is_dragged_on_other_axes(hands) -> None:
    menus = hands.browser.find(".x-maphead select")
    before = hands.rest()
    Select(menus[1]).select_by_visible_text(INPUTS["numerical_aperture"].label)
    before = hands.changed(before, "pixels", "point")
    Select(menus[2]).select_by_visible_text(INPUTS["fast_linewidth"].label)
    before = hands.changed(before, "pixels", "point")
    hands.drag_point((-25, -20), (-25, -10))
    after = hands.changed(before, "headline", "budget", "point")
    assert after["pixels"] == before["pixels"]
    assert float(hands.number("numerical_aperture")) > 0.65
    assert float(hands.number("fast_linewidth")) < 35
    hands.click(".panel-map .x-link")
    hands.changed(after, "pixels", "point")
    assert Select(menus[2]).first_selected_option.text == INPUTS["mode_volume"].label


# -------------------------------------------------------------------- files


def test_saved_design_is_what_the_page_shows_and_loads_back(hands) -> None:
    before = hands.rest()
    hands.type(hands.box("quality_factor"), "33.3")
    shown = hands.changed(before, "headline", "budget")
    path = hands.save()
    design = explorer.load_design(path)
    record = json.loads(path.read_text(encoding="utf-8"))
    expected = first_question().design.with_values(quality_factor=33.3)
    assert dict(design.point) == dict(expected.point)
    assert design.requirements == expected.requirements
    for name, entry in record["outcome"].items():
        kind = REGISTRY.quantities[name]
        again = design.outcome([name])[name]
        if kind.kind != "number":
            assert entry["value"] == again
        elif isinstance(again, float) and math.isfinite(again):
            saved = explorer.units.to_si(float(entry["value"]), entry["unit"])
            np.testing.assert_allclose(again, saved, rtol=1e-12)
    rows = shown["budget"]
    assert record["outcome"]["rate_in_fibre"]["shown"] in rows
    assert record["outcome"]["rate_detected"]["shown"] in rows
    hands.handle("fast_linewidth").send_keys(Keys.ARROW_LEFT * 9)
    other = hands.changed(shown, "headline", "budget", "pixels")
    hands.give_file(path)
    assert hands.changed(other, "headline", "budget", "pixels") == shown
    again = json.loads(hands.save().read_text(encoding="utf-8"))
    assert again | {"saved": ""} == record | {"saved": ""}


def broken_files() -> dict[str, Callable[[str], bytes]]:
    def changed(**parts: object) -> Callable[[str], bytes]:
        return lambda good: json.dumps(json.loads(good) | parts).encode()

    return {
        "truncated": lambda good: good[: len(good) // 2].encode(),
        "empty": lambda _: b"",
        "not JSON": lambda _: b"\x89PNG\r\n\x1a\n" + bytes(range(256)),
        "another JSON": lambda _: b'[1, 2, {"three": 4}]',
        "wrong version": changed(version=99),
        "wrong format": changed(format="recipe"),
        "no inputs": changed(inputs=None),
        "25 MB": lambda good: good.encode() + b" " * 25_000_000,
        "deep": lambda _: b"[" * 100_000 + b"]" * 100_000,
        "script as name of an input": lambda good: good.replace(
            '"quality_factor"', '"<img src=x onerror=document.title=1>"', 1
        ).encode(),
    }


@pytest.mark.parametrize("kind", list(broken_files()))
def test_broken_file_leaves_the_page_alive_with_one_sentence(hands, tmp_path, kind) -> None:
    before = hands.rest()
    path = tmp_path / "broken.json"
    path.write_bytes(broken_files()[kind](explorer.design_text(first_question().design)))
    hands.give_file(path)
    sentence = hands.browser.wait_until(hands.complaint)
    assert "\n" not in sentence
    assert "broken.json" in sentence
    assert len(sentence) < 400
    assert hands.rest() == before
    assert hands.browser.find(".panel-headline img") == []
    hands.handle("fast_linewidth").send_keys(Keys.ARROW_LEFT)
    hands.changed(before, "budget", "pixels")
    assert hands.complaint() == "", "the sentence goes away with the next answer"


def test_script_in_text_fields_stays_text(hands, tmp_path) -> None:
    bad = "<img src=x onerror=\"document.title='ran'\"><script>document.title='ran'</script>"
    record = json.loads(explorer.design_text(first_question().design))
    record["name"] = record["note"] = bad
    record["decision"] = {"who": bad, "why": bad, "doubts": bad}
    for origin in record.get("origins", {}).values():
        if "where" in origin:
            origin["where"] = bad
    path = tmp_path / "script.json"
    path.write_text(json.dumps(record), encoding="utf-8")
    hands.give_file(path)
    hands.rest()
    hands.click(".panel-emitter .x-link", "sources")
    time.sleep(0.5)
    assert hands.browser.find(".explorer img, .explorer script") == []
    assert hands.browser.driver.title == "explorer"
    hands.click(".panel-emitter .x-link", "sources")
    assert hands.complaint() == ""
    saved = hands.save()
    assert saved.name.startswith("img-src")
    assert explorer.load_design(saved).note == bad


# -------------------------------------------------------------------- layout

WHOLLY_SEEN = """
const seen = (element) => {
  const box = element.getBoundingClientRect();
  if (box.width < 4 || box.height < 4) return "has no size";
  if (box.left < 0 || box.top < 0 || box.right > innerWidth + 0.5 || box.bottom > innerHeight + 0.5)
    return `reaches out of the window: ${[box.left, box.top, box.right, box.bottom].map(Math.round)}`;
  const hit = [[0.5, 0.5], [0.03, 0.1], [0.97, 0.1], [0.03, 0.9], [0.97, 0.9]].map(([x, y]) =>
    document.elementFromPoint(box.left + x * box.width, box.top + y * box.height));
  const covered = hit.find((other) => !other || !(element.contains(other) || other.contains(element)));
  return covered === undefined ? "" : `is covered by ${covered && covered.className}`;
};
return arguments[0].flatMap((selector) => {
  const found = [...document.querySelectorAll(selector)];
  if (!found.length) return [`${selector} is missing`];
  return found.map(seen).filter((text) => text).map((text) => `${selector} ${text}`);
});
"""


@pytest.mark.parametrize("size", SIZES)
def test_the_main_job_is_seen_without_scrolling(hands, size) -> None:
    hands.browser.resize(*size)
    hands.rest()
    main = [
        f".input-{name} {part}" for name in MAIN for part in (".x-name", ".x-number", ".x-slider")
    ]
    wanted = [
        ".panel-headline h1",
        ".panel-headline p",
        ".explorer-map",
        ".panel-budget table",
        ".panel-files .x-button",
        ".panel-keeper .x-button",
    ]
    assert hands.browser.run(WHOLLY_SEEN, [*wanted, *main, ".panel-wanted", ".panel-emitter"]) == []
    scrolled = hands.browser.run(
        "const root = document.scrollingElement;"
        "return [root.scrollWidth - innerWidth, root.scrollHeight - innerHeight]"
    )
    assert max(scrolled) <= 0
    lines = hands.browser.run(
        "return parseFloat(getComputedStyle(document.querySelector('.panel-headline h1')).fontSize)"
    )
    assert lines >= 22


SMALL_TEXT = """
const found = [];
const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
while (walk.nextNode()) {
  const parent = walk.currentNode.parentElement;
  const text = walk.currentNode.textContent.trim();
  if (!text || parent.closest("script, style, noscript, template")) continue;
  const box = parent.getBoundingClientRect();
  const style = getComputedStyle(parent);
  const hidden = style.visibility === "hidden" || !parent.checkVisibility();
  if (hidden || (box.width <= 1 && box.height <= 1)) continue;
  const { a, b } = parent.ownerSVGElement ? parent.getScreenCTM() : { a: 1, b: 0 };
  const ratio = Math.hypot(a, b); // of turned text too
  const size = parseFloat(style.fontSize) * ratio;
  if (size < 13.99) found.push(`${size.toFixed(1)} px: ${text.slice(0, 30)} (${parent.className})`);
}
for (const field of document.querySelectorAll("input, select, button")) {
  const size = parseFloat(getComputedStyle(field).fontSize);
  if (field.checkVisibility() && size < 13.99) found.push(`${size} px: field ${field.className}`);
}
return found;
"""

WIDE = """
const found = [];
for (const element of document.querySelectorAll(".explorer, .explorer *")) {
  if (!element.checkVisibility() || element.closest("svg, .explorer-map, select, .slider-container")) continue;
  const over = element.scrollWidth - element.clientWidth;
  const style = getComputedStyle(element);
  if (element.clientWidth > 1 && over > 1 && style.display !== "inline")
    found.push(`${element.tagName} ${element.className} by ${over} px: ${element.textContent.slice(0, 40)}`);
}
return found;
"""


def open_everything(person: Hands) -> None:
    person.browser.run(
        "for (const b of document.querySelectorAll('.x-group, .x-count, .panel-emitter .x-link')) b.click()"
    )


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("opened", [False, True])
def test_no_small_text_and_nothing_too_wide(hands, size, opened) -> None:
    hands.browser.resize(*size)
    if opened:
        open_everything(hands)
        hands.browser.wait_for(".input-bright_share")
    hands.rest()
    small, wide = hands.browser.run(SMALL_TEXT), hands.browser.run(WIDE)
    if opened:
        open_everything(hands)
    assert small == []
    assert wide == []


def test_no_small_text_on_the_map(served, new_browser) -> None:
    """Every text that the canvases draw, layers and all, at both sizes."""
    browser = new_browser()
    browser.driver.execute_cdp_cmd(
        "Page.addScriptToEvaluateOnNewDocument",
        {
            "source": """
        window.drawn = [];
        const draw = CanvasRenderingContext2D.prototype.fillText;
        CanvasRenderingContext2D.prototype.fillText = function (text, ...rest) {
          const { a, b } = this.getTransform(); // of turned text too
          const size = parseFloat(this.font.match(/([\\d.]+)px/)[1]) * Math.hypot(a, b);
          window.drawn.push([size / devicePixelRatio, text]);
          return draw.call(this, text, ...rest);
        };
    """
        },
    )
    browser.open(served.url)
    person = Hands(browser)
    person.rest()
    browser.run("for (const b of document.querySelectorAll('.x-layers button')) b.click()")
    person.rest()
    browser.resize(1920, 1080)
    person.rest()
    drawn = browser.run("return window.drawn")
    assert len(drawn) > 40
    assert [entry for entry in drawn if entry[0] < 13.99] == []
    assert browser.console_errors() == []


def test_narrow_window_folds_to_one_column(hands) -> None:
    hands.browser.resize(820, 1180)
    hands.rest()
    lefts = hands.browser.run(
        "return ['.seat-left', '.seat-middle', '.seat-right'].map((seat) =>"
        " document.querySelector(seat).getBoundingClientRect().left)"
    )
    assert len(set(lefts)) == 1
    assert hands.browser.run(WIDE) == []
    assert hands.browser.run("return document.scrollingElement.scrollWidth - innerWidth") <= 0


# -------------------------------------------------------------------- more than one


def test_two_browsers_keep_their_own_states(served, hands, new_browser) -> None:
    other = Hands(new_browser())
    other.browser.open(served.url)
    mine, theirs = hands.rest(), other.rest()
    assert mine["headline"] == theirs["headline"]
    other.type(other.box("fast_linewidth"), "5")
    changed = other.changed(theirs, "headline", "budget", "pixels")
    assert hands.rest() == mine
    hands.type(hands.box("quality_factor"), "400")
    hands.changed(mine, "headline", "budget")
    assert other.rest() == changed
    assert other.number("quality_factor") == "25"
    assert other.browser.console_errors() == []
