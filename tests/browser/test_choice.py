"""Choosing in a real browser: candidates, the shortlist, ranges, origins, devices, the key link."""

import re
from collections.abc import Iterator
from pathlib import Path

import pytest
from selenium.webdriver.common.keys import Keys

import explorer
from explorer.catalogue import emitters
from explorer.prediction import predictions
from explorer.scenario import first_question

from .conftest import Browser
from .hands import Hands

ROWS = ".panel-candidates .t-row"


@pytest.fixture
def hands(page: Browser, tmp_path: Path) -> Iterator[Hands]:
    """The shared page at its first question, every sheet closed and nothing kept."""
    person = Hands(page)
    page.resize(1280, 720)
    page.run("for (const b of document.querySelectorAll('.x-cards .x-back')) b.click();")
    page.run("for (const b of document.querySelectorAll('.x-openers .mod-active')) b.click();")
    home = tmp_path / "home.json"
    explorer.save_design(first_question().design, home)
    person.give_file(home)
    person.rest()
    yield person
    assert page.console_errors() == []
    assert page.foreign_requests() == []
    assert "Traceback" not in page.find("body")[0].text


def opened(hands: Hands) -> None:
    hands.click(".x-openers button", "Candidates")
    hands.browser.wait_until(lambda: " meet everything" in hands.text(".panel-candidates"))
    hands.browser.wait_for(ROWS)


def cards(hands: Hands) -> list[str]:
    return [one for one in hands.text(".x-cards .x-card").splitlines() if one]


def test_from_first_visit_to_a_kept_candidate_in_two_clicks(hands) -> None:
    opened(hands)
    hands.click(f"{ROWS} .t-keep")
    hands.browser.wait_until(lambda: len(cards(hands)) == 1)
    assert cards(hands)[0].startswith("A")


def test_the_table_holds_the_present_design_and_its_numbers(hands) -> None:
    before = re.search(r"[\d.]+", hands.headline())
    assert before is not None
    opened(hands)
    hands.type(hands.browser.find(".t-filter")[0], "terrylene own")
    hands.browser.wait_until(lambda: len(hands.browser.find(ROWS)) < 5)
    assert f"{before.group()} M/s" in hands.text(ROWS)
    hands.type(hands.browser.find(".t-filter")[0], "")


def test_a_row_is_taken_to_the_map(hands) -> None:
    opened(hands)
    before = hands.headline()
    hands.type(hands.browser.find(".t-filter")[0], "circular Bragg grating")
    row = hands.browser.wait_for(ROWS)
    name = next(one.name for one in emitters().values() if one.name in row.text)
    row.find_elements("css selector", "[role=gridcell]")[3].click()
    hands.browser.wait_until(lambda: hands.headline() != before)
    hands.click(".x-sheet .x-close")
    hands.rest()
    menu = hands.browser.find(".panel-emitter select")[0]
    chosen = hands.browser.run("return arguments[0].selectedOptions[0].textContent", menu)
    assert name in str(chosen).replace("\xa0", " ")
    assert not [part for part in hands.browser.find(".panel-candidates") if part.is_displayed()]


def test_every_optic_gives_more_candidates_and_scaling_others(hands) -> None:
    opened(hands)
    before = hands.text(".panel-candidates .x-maphead .widget-label")
    hands.choose(".panel-candidates .widget-dropdown select", "optic: every one")
    said = ".panel-candidates .x-plain"
    hands.browser.wait_until(lambda: "best" in hands.text(said))
    several = hands.text(said)
    hands.browser.find(".panel-candidates input[type=checkbox]")[0].click()
    hands.browser.wait_until(lambda: hands.text(said) not in (several, "working …"))
    assert before != several
    hands.browser.find(".panel-candidates input[type=checkbox]")[0].click()
    hands.choose(".panel-candidates .widget-dropdown select", "optic: as in the design")
    hands.browser.wait_until(lambda: "best" not in hands.text(said) and "meet" in hands.text(said))


def test_four_are_kept_shown_again_and_dropped(hands) -> None:
    opened(hands)
    for number in range(4):
        hands.browser.find(f"{ROWS} .t-keep")[number].click()
        hands.browser.wait_until(lambda number=number: len(cards(hands)) == number + 1)
    assert [card[0] for card in cards(hands)] == list("ABCD")
    assert not hands.browser.find(".x-keep")[0].is_enabled()
    before = hands.headline()
    hands.browser.find(".card-C .x-card")[0].click()
    hands.browser.wait_until(lambda: hands.headline() != before)
    assert "x-here" in str(hands.browser.find(".card-C")[0].get_attribute("class"))
    hands.browser.find(".card-B .x-back")[0].click()
    hands.browser.wait_until(lambda: len(cards(hands)) == 3)
    wide = hands.browser.run(
        "const s = document.querySelector('.x-shelf'); return [s.scrollWidth, s.clientWidth]"
    )
    assert wide[0] <= wide[1] + 1


def test_a_typed_range_opens_the_headline_and_a_number_closes_it(hands) -> None:
    hands.type(hands.box("numerical_aperture"), "0.3–0.7")
    row = ".input-numerical_aperture"
    hands.browser.wait_until(lambda: "0.3–0.7 not known" in hands.text(row))
    hands.browser.wait_until(lambda: "what 5 unknowns leave open" in hands.text(".panel-headline"))
    assert re.search(r"\d \([\d.]+–[\d.]+\)", hands.text(".panel-headline"))
    saved = explorer.load_design(hands.save())
    assert (
        saved.unknowns["numerical_aperture"].low,
        saved.unknowns["numerical_aperture"].high,
    ) == (
        0.3,
        0.7,
    )
    hands.type(hands.box("numerical_aperture"), "0.5")
    hands.browser.wait_until(lambda: "not known" not in hands.text(row))
    hands.rest()
    assert "what 4 unknowns leave open" in hands.text(".panel-headline")


def test_a_range_that_runs_backwards_is_refused_beside_its_box(hands) -> None:
    before = hands.headline()
    hands.type(hands.box("quality_factor"), "100–10")
    hands.browser.wait_until(lambda: "low end" in hands.complaint(".input-quality_factor"))
    assert hands.headline().split(" ")[0] == before.split(" ")[0]
    hands.type(hands.box("quality_factor"), "25")


def test_what_to_measure_first_is_a_ranking_of_the_ranges(hands) -> None:
    hands.click(".x-switch button", "limits")
    ranking = ".panel-limits > :last-child .x-ranked"
    hands.browser.wait_until(lambda: "Optics transmission" in hands.text(ranking))
    shares = [int(one) for one in re.findall(r"(\d+) %", hands.text(f"{ranking} tbody"))]
    assert shares == sorted(shares, reverse=True)
    assert shares[0] > 50
    hands.click(".x-switch button", "light")


def test_every_row_says_where_its_value_comes_from(hands) -> None:
    rows = hands.browser.find(".x-row")
    assert len(rows) >= 5
    for row in rows:
        assert re.search(
            r"\bfrom-(seen|from-memory|measured|typed|default)\b", str(row.get_attribute("class"))
        )
    classes = str(hands.browser.find(".input-fast_linewidth")[0].get_attribute("class"))
    assert "from-from-memory" in classes
    hands.type(hands.box("fast_linewidth"), "30")
    hands.browser.wait_until(
        lambda: (
            "from-typed"
            in str(hands.browser.find(".input-fast_linewidth")[0].get_attribute("class"))
        )
    )
    hands.rest()
    counts = hands.text(".panel-headline")
    assert re.search(
        r"values: ● \d+ seen, ○ \d+ from memory, ✎ \d+ typed, · \d+ at defaults", counts
    )


def test_published_devices_are_drawn_with_what_is_missed(hands) -> None:
    hands.click(".x-openers button", "Published devices")
    hands.browser.wait_until(lambda: "inside" in hands.text(".panel-devices"))
    seen = hands.text(".panel-devices")
    for row in predictions():
        assert row.name in seen
    assert "missed:" in seen
    assert "Not predicted, and what is missing" in seen
    assert len(hands.browser.find(".panel-devices svg circle")) == len(predictions())
    hands.click(".x-sheet .x-close")


def test_a_key_rate_becomes_the_requirements(hands) -> None:
    hands.click(".panel-keylink .x-group")
    said = ".panel-keylink .x-plain"
    hands.browser.wait_until(lambda: "needs 19.9 M/s in the fibre" in hands.text(said))
    field = hands.browser.find(".link-key input")[0]
    hands.type(field, "100")
    hands.browser.wait_until(lambda: "needs 19.9" not in hands.text(said))
    needed = re.search(r"needs ([\d.]+ M/s)", hands.text(said))
    assert needed is not None
    hands.click(".panel-keylink button", "require this")
    hands.rest()
    assert hands.browser.find(".wanted-rate_in_fibre input")[0].get_property(
        "value"
    ) == needed.group(1)
    hands.type(field, "1e9")
    hands.browser.wait_until(lambda: "gives at most" in hands.text(said))
    hands.type(field, "soon")
    hands.browser.wait_until(lambda: "Secret key" in hands.text(said))
    hands.type(field, "150")
    hands.click(".panel-keylink .x-group")


def test_temperature_is_an_axis_that_says_how_cold(hands) -> None:
    name = emitters()["siv_bulk"].name
    hands.choose(".panel-emitter select", name)
    hands.rest()
    assert hands.number("fast_linewidth") in ("spectrum", "5")
    selects = hands.browser.find(".panel-map .x-maphead select")
    assert len(selects) == 3
    hands.browser.run(
        "const s = document.querySelectorAll('.panel-map .x-maphead select')[2];"
        "s.value = [...s.options].find((o) => o.textContent === 'Temperature').value;"
        "s.dispatchEvent(new Event('change', {bubbles: true}));"
    )
    hands.rest()
    label = hands.browser.find(".explorer-map [role=img]")[0].get_attribute("aria-label")
    assert "Temperature" in str(label)
    hands.click(".panel-map .x-link")


def test_a_sheet_is_left_by_keyboard(hands) -> None:
    opened(hands)
    close = next(part for part in hands.browser.find(".x-close") if part.is_displayed())
    close.send_keys(Keys.ENTER)
    hands.browser.wait_until(
        lambda: not [part for part in hands.browser.find(".x-sheet") if part.is_displayed()]
    )
