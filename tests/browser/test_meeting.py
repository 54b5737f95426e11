"""What a meeting does on the page: decide, take a brief home, compare with what was kept, turn it dark."""

import base64
from collections.abc import Iterator
from pathlib import Path

import pytest

from explorer.record import save_design
from explorer.scenario import first_question

from .conftest import Browser
from .hands import Hands
from .test_fabrication import NAMELESS
from .test_page import SIZES, SMALL_TEXT, WIDE

VIEW = ".seat-right .x-switch button"


@pytest.fixture
def hands(page: Browser, tmp_path: Path) -> Iterator[Hands]:
    """The shared page at its first question."""
    person = Hands(page)
    page.resize(1280, 720)
    path = tmp_path / "first.json"
    save_design(first_question().design, path)
    person.give_file(path)
    page.wait_until(lambda: "1.8 times too few" in person.headline())
    person.rest()
    yield person
    assert page.console_errors() == []
    assert page.foreign_requests() == []


def test_a_decision_goes_into_the_brief_and_the_record(hands: Hands) -> None:
    browser = hands.browser
    hands.click(".open-decision")
    why = browser.wait_for(".panel-decision textarea[placeholder^='Why']")
    why.send_keys("the widest <b>margin</b>")
    browser.find(".panel-decision input")[0].click()  # the text is taken when the field is left
    browser.wait_until(browser.find(".panel-steps button")[0].is_enabled)
    for old in browser.downloads.glob("*"):
        old.unlink()
    hands.click(".x-download", "Save brief")
    brief = browser.downloaded("*.html").read_text(encoding="utf-8")
    assert "the widest &lt;b&gt;margin&lt;/b&gt;" in brief
    assert "1.8 times too few" in brief
    hands.click(".x-download", "Save map as SVG")
    assert browser.downloaded("*.svg").read_text(encoding="utf-8").startswith("<svg")
    assert "the widest <b>margin</b>" in hands.save().read_text(encoding="utf-8")
    assert browser.run(WIDE) == []
    assert browser.run(NAMELESS) == []
    hands.click(".x-close")


def test_the_brief_prints_on_one_page(hands: Hands, new_browser) -> None:
    hands.click(".open-decision")
    for old in hands.browser.downloads.glob("*"):
        old.unlink()
    hands.click(".x-download", "Save brief")
    path = hands.browser.downloaded("*.html")
    reader = new_browser()
    reader.driver.get(path.as_uri())
    printed = reader.driver.execute_cdp_cmd(
        "Page.printToPDF", {"preferCSSPageSize": True, "printBackground": True}
    )
    content = base64.b64decode(printed["data"])
    assert content.count(b"/Type /Page\n") == 1
    assert reader.console_errors() == []
    hands.click(".x-close")


def test_a_kept_design_is_compared_live(hands: Hands) -> None:
    browser = hands.browser
    hands.click(".x-keep")
    browser.wait_until(lambda: browser.find(".card-A"))
    hands.click(VIEW, "compare")
    browser.wait_until(lambda: "Every input is the same" in hands.text(".panel-compare"))
    hands.type(hands.box("quality_factor"), "60")
    browser.wait_until(lambda: "×1.18" in hands.text(".panel-compare"))
    assert "Quality factor" in hands.text(".panel-compare")
    for width, height in SIZES:
        browser.resize(width, height)
        hands.rest()
        assert browser.run(WIDE) == []
        assert browser.run(SMALL_TEXT) == []
    hands.click(".panel-compare button", "delete")
    browser.wait_until(lambda: not browser.find(".card-A"))
    hands.click(".panel-compare button", "bring back")
    browser.wait_until(lambda: browser.find(".card-A"))
    hands.click(".panel-compare button", "delete")
    hands.click(VIEW, "light")


def test_the_page_turns_dark_and_remembers(hands: Hands) -> None:
    browser = hands.browser
    paper = "return getComputedStyle(document.querySelector('.explorer')).backgroundColor"
    light, pixels = browser.run(paper), hands.pixels()
    hands.click(".x-look")
    browser.wait_until(lambda: browser.run(paper) == "rgb(18, 25, 29)")
    browser.wait_until(lambda: hands.pixels() != pixels)
    browser.driver.refresh()
    browser.wait_for(".panel-headline h1", 120)
    browser.wait_until(lambda: browser.run(paper) == "rgb(18, 25, 29)")
    hands.rest()
    hands.click(".x-look")
    browser.wait_until(lambda: browser.run(paper) == light)


def test_buttons_undo_and_redo(hands: Hands) -> None:
    browser = hands.browser
    hands.type(hands.box("mode_volume"), "0.4")
    undo, redo = browser.find(".panel-steps button")
    browser.wait_until(undo.is_enabled)
    undo.click()
    browser.wait_until(lambda: hands.number("mode_volume") == "1")
    browser.wait_until(redo.is_enabled)
    redo.click()
    browser.wait_until(lambda: hands.number("mode_volume") == "0.4")
