"""What a person's hands and eyes do on the page, for tests."""

import time
from pathlib import Path
from typing import Any

from selenium.webdriver.common.action_chains import ActionChains
from selenium.webdriver.common.by import By
from selenium.webdriver.common.keys import Keys
from selenium.webdriver.remote.webelement import WebElement
from selenium.webdriver.support.ui import Select

from .conftest import Browser

# The pixels of the map's cells, as one number.
PIXELS = """
const canvas = document.querySelector(".explorer-map canvas");
const { data } = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height);
let sum = 0;
for (let i = 0; i < data.length; i += 4) sum = (31 * sum + 7 * data[i] + 5 * data[i + 1] + data[i + 2]) | 0;
return sum;
"""


class Hands:
    """A person at a browser's window with the page in it."""

    def __init__(self, browser: Browser) -> None:
        self.browser = browser

    # ---------------------------------------------------------------- reading

    def text(self, selector: str) -> str:
        return str(
            self.browser.run(
                "return [...document.querySelectorAll(arguments[0])]"
                ".filter((part) => part.offsetParent !== null)"
                ".map((part) => part.innerText).join('\\n')",
                selector,
            )
        ).strip()

    def headline(self) -> str:
        return self.text(".panel-headline h1")

    def budget(self) -> str:
        return self.text(".panel-budget table")

    def complaint(self, place: str = ".panel-headline") -> str:
        return self.text(f"{place} .x-wrong")

    def frame(self) -> int:
        return int(self.browser.run("return document.querySelector('.explorer-map').dataset.frame"))

    def point(self) -> tuple[float, float]:
        place = self.browser.run("return document.querySelector('.explorer-map').dataset.point")
        across, up = map(float, str(place).split(","))
        return across, up

    def pixels(self) -> int:
        return int(self.browser.run(PIXELS))

    def box(self, name: str) -> WebElement:
        return self.browser.find(f".input-{name} .x-number input")[0]

    def number(self, name: str) -> str:
        return str(self.box(name).get_property("value"))

    def handle(self, name: str) -> WebElement:
        return self.browser.find(f".input-{name} .noUi-handle")[0]

    def seen(self) -> dict[str, Any]:
        """Everything that a change may change."""
        return {
            "headline": self.headline(),
            "budget": self.budget(),
            "pixels": self.pixels(),
            "point": self.point(),
        }

    # ---------------------------------------------------------------- waiting

    def rest(self, seconds: float = 20, quiet: float = 0.7) -> dict[str, Any]:
        """Wait until nothing has changed for a while, and return what is seen.

        Longer than the page waits before a map drawn in fewer cells is drawn whole, and then before
        it says what is not known.
        """
        last, since = self.seen(), time.monotonic()
        end = since + seconds
        while time.monotonic() < end:
            time.sleep(0.1)
            now = self.seen()
            if now != last:
                last, since = now, time.monotonic()
            elif time.monotonic() - since > quiet:
                return now
        raise AssertionError("the page does not come to rest")

    def changed(self, before: dict[str, Any], *parts: str, seconds: float = 15) -> dict[str, Any]:
        """Wait until these parts differ from before, then for rest."""
        self.browser.wait_until(
            lambda: (now := self.seen()) and all(now[part] != before[part] for part in parts),
            seconds,
        )
        return self.rest()

    # ---------------------------------------------------------------- doing

    def click(self, selector: str, text: str | None = None) -> None:
        shown = [part for part in self.browser.find(selector) if part.is_displayed()]
        next(part for part in shown if text is None or part.text == text).click()

    def choose(self, selector: str, text: str) -> None:
        Select(self.browser.find(selector)[0]).select_by_visible_text(text)

    def type(self, field: WebElement, text: str) -> None:
        field.click()
        field.send_keys(Keys.CONTROL, "a")
        field.send_keys(text + Keys.ENTER)

    def drag_by(self, element: WebElement, *moves: tuple[int, int]) -> None:
        """Real pointer events: press in the middle, move in steps, release."""
        hand = ActionChains(self.browser.driver, duration=30).move_to_element(element)
        hand.click_and_hold()
        for across, down in moves:
            hand.move_by_offset(across, down)
        hand.release().perform()

    def drag_point(self, *moves: tuple[int, int], release: bool = True) -> None:
        """Take the design point where it is, and move it in steps of pixels."""
        surface = self.browser.find(".explorer-map [role=slider]")[0]
        across, up = self.point()
        size = surface.size
        start = (round((across - 0.5) * size["width"]), round((0.5 - up) * size["height"]))
        hand = ActionChains(self.browser.driver, duration=30)
        hand.move_to_element_with_offset(surface, *start).click_and_hold()
        for right, down in moves:
            hand.move_by_offset(right, down)
        (hand.release() if release else hand).perform()

    def give_file(self, path: Path) -> None:
        self.browser.driver.find_element(By.CSS_SELECTOR, ".panel-files .x-pick").send_keys(
            str(path)
        )

    def save(self) -> Path:
        for old in self.browser.downloads.glob("*"):
            old.unlink()
        self.click(".x-button", "Save design")
        return self.browser.downloaded("*.json")
