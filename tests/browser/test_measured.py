"""Measured data in a real browser: from a file to the map, for each kind, and files that lose nothing."""

from collections.abc import Iterator
from pathlib import Path

import pytest

from explorer.design import Design
from explorer.record import load_design, save_design
from explorer.scenario import first_question

from ..measured_files import hostile
from .conftest import Browser
from .hands import Hands
from .test_fabrication import NAMELESS
from .test_page import SIZES, SMALL_TEXT, WIDE

FOLDER = Path(__file__).parent.parent.parent / "notebooks" / "measured"
PANEL = ".panel-measured"


@pytest.fixture
def hands(page: Browser, tmp_path: Path) -> Iterator[Hands]:
    """The shared page at its first question, with the sheet of measured data open."""
    person = Hands(page)
    page.resize(1280, 720)
    given(person, first_question().design, tmp_path)
    page.wait_until(lambda: "1.8 times too few" in person.headline())
    if not page.find(f"{PANEL} .x-switch")[0].is_displayed():
        person.click(".open-measured")
        page.wait_for(f"{PANEL} .x-upload")
    yield person
    assert page.console_errors() == []
    assert page.foreign_requests() == []


def given(hands: Hands, design: Design, folder: Path) -> None:
    path = folder / "given.json"
    save_design(design, path)
    hands.give_file(path)


def turn(hands: Hands, kind: str) -> None:
    hands.click(f"{PANEL} .x-switch button", kind)


def load(hands: Hands, path: Path, kind: str, role: str = "") -> None:
    """Give a file to a button of the panel: the data itself, or what goes with it."""
    button = f"{PANEL} .upload-{kind}{f'-{role}' if role else ''}"
    hands.browser.wait_for(f"{button} .x-upload")
    hands.browser.find(f"{button} .x-pick")[0].send_keys(str(path))


def fitted(hands: Hands, name: str, kind: str) -> str:
    """Load a file of a kind and wait for the fit."""
    turn(hands, kind)
    load(hands, FOLDER / name, kind.lower())
    hands.browser.wait_until(lambda: name in hands.text(f"{PANEL} .x-understood"))
    hands.browser.wait_until(lambda: hands.text(f"{PANEL} .x-result table"), 60)
    return hands.text(f"{PANEL} .x-result")


def use(hands: Hands, label: str) -> None:
    button = hands.browser.wait_until(
        lambda: next(
            (part for part in hands.browser.find(f"{PANEL} .x-use") if part.text == label), None
        )
    )
    button.click()
    hands.browser.wait_until(lambda: hands.text(f"{PANEL} .x-to .x-first"))


def saved(hands: Hands) -> Design:
    return load_design(hands.save())


def test_a_spectrum_goes_from_its_file_to_the_map(hands: Hands) -> None:
    before = hands.seen()
    words = fitted(hands, "emission.csv", "Spectrum")
    assert "Fast width" in words
    use(hands, "Use the spectrum as measured")
    hands.changed(before, "headline", "pixels")
    assert hands.number("fast_linewidth") == "spectrum"
    design = saved(hands)
    assert len(design.point["spectrum"]) == 601
    assert design.origin("spectrum").kind == "measured"
    assert "emission.csv" in design.data
    use(hands, "Use the fitted line")
    hands.browser.wait_until(lambda: hands.number("fast_linewidth").startswith("2"))
    assert "not known" in hands.text(".input-fast_linewidth .x-open")


def test_a_decay_goes_from_its_file_to_the_map(hands: Hands) -> None:
    before = hands.seen()
    words = fitted(hands, "decay_device.csv", "Decay")
    assert "Rate enhancement" in words
    use(hands, "Add lifetime to")
    hands.browser.wait_until(lambda: "Device 1" in hands.text(f"{PANEL} .x-built"))
    fitted(hands, "decay_bare.csv", "Decay")
    use(hands, "Use as the bare emitter's lifetime")
    hands.changed(before, "headline", "pixels")
    design = saved(hands)
    assert design.origin("lifetime").kind == "measured"
    assert design.built[0].measured["device_lifetime"].value == pytest.approx(4.4e-9, rel=0.02)
    hands.click(".x-close")
    hands.browser.wait_until(
        lambda: (
            "Device 1"
            in str(
                hands.browser.run("return document.querySelector('.explorer-map ul').textContent")
            )
        )
    )


def test_a_response_is_folded_in(hands: Hands) -> None:
    fitted(hands, "decay_device.csv", "Decay")
    load(hands, FOLDER / "response.csv", "decay", "response")
    hands.browser.wait_until(lambda: "response.csv" in hands.text(f"{PANEL} .x-given"))
    hands.browser.wait_until(lambda: hands.text(f"{PANEL} .x-result table"), 60)
    # The tail alone gives 4.383 ns; with the response, 4.390.
    hands.browser.wait_until(lambda: "4.39" in hands.text(f"{PANEL} .x-result"), 60)


def test_coincidences_go_from_their_file_to_the_map(hands: Hands) -> None:
    before = hands.seen()
    words = fitted(hands, "coincidences.txt", "Coincidences")
    assert "g²(0)" in words
    use(hands, "Use as the emitter's biexciton yield")
    hands.changed(before, "headline")
    use(hands, "Add g²(0) to")
    design = saved(hands)
    assert design.built[0].measured["g2_zero"].value == pytest.approx(0.06, abs=0.01)
    assert design.origin("biexciton_yield").kind == "measured"


def test_a_pattern_goes_from_its_file_to_the_map(hands: Hands) -> None:
    before = hands.seen()
    turn(hands, "Angular pattern")
    load(hands, FOLDER / "pattern.txt", "pattern")
    hands.browser.wait_until(lambda: "Half-angle" in hands.text(f"{PANEL} .x-result"))
    use(hands, "Use as the angular pattern")
    hands.changed(before, "headline", "pixels")
    assert "half-angle 16" in hands.text(".panel-headline")
    design = saved(hands)
    assert design.origin("pattern").kind == "measured"


@pytest.mark.parametrize("name", ["scripts.csv", "sheet.csv", "empty.csv"])
def test_a_file_that_cannot_be_read_says_why_and_loses_nothing(
    hands: Hands, tmp_path: Path, name: str
) -> None:
    bad = next(entry for entry in hostile() if entry.name == name)
    good = {"spectrum": "emission.csv", "decay": "decay_bare.csv"}[bad.kind]
    fitted(hands, good, bad.kind.capitalize())
    before, words = hands.rest(), hands.text(f"{PANEL} .x-result")
    path = tmp_path / name
    path.write_bytes(bad.content)
    load(hands, path, bad.kind)
    hands.browser.wait_until(lambda: name in hands.complaint(PANEL))
    assert hands.seen() == before
    assert hands.text(f"{PANEL} .x-result") == words
    assert hands.browser.run("return window.hurt ?? null") is None


def test_a_file_of_200_megabytes_stays_in_the_browser(hands: Hands, tmp_path: Path) -> None:
    fitted(hands, "decay_bare.csv", "Decay")
    before = hands.seen()
    path = tmp_path / "long.csv"
    with path.open("wb") as file:
        file.truncate(200_000_000)
    load(hands, path, "decay")
    hands.browser.wait_until(lambda: "long.csv has 200 MB" in hands.complaint(PANEL))
    assert hands.seen() == before
    assert "decay_bare.csv" in hands.text(f"{PANEL} .x-understood")


@pytest.mark.parametrize(("width", "height"), SIZES)
def test_the_sheet_fits_its_sizes(hands: Hands, width: int, height: int) -> None:
    fitted(hands, "decay_bare.csv", "Decay")
    hands.browser.resize(width, height)
    hands.rest()
    assert hands.browser.run(WIDE) == []
    assert hands.browser.run(SMALL_TEXT) == []
    assert hands.browser.run(NAMELESS) == []
