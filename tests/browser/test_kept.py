"""Work survives in a real browser: a reload, a closed tab, a lost kernel, a link to another browser."""

import time
from collections.abc import Callable

import pytest

from explorer.kept import Page, page_text
from explorer.registry import REGISTRY
from explorer.scenario import first_question

from ..conftest import Served
from .conftest import Browser
from .hands import Hands

GAIN = REGISTRY.quantities["brightness_gain"].label

#: The number that a browser keeps under the page's name, and whether it holds a text.
KEPT = "return (localStorage.getItem('explorer page') ?? '').includes(arguments[0])"


@pytest.fixture
def hands(served: Served, browser: Browser) -> Hands:
    """A browser of its own at its first visit."""
    browser.open(served.url)
    person = Hands(browser)
    person.rest()
    return person


def change(hands: Hands, value: str = "77") -> None:
    """Type a quality factor, and wait until the browser has it."""
    hands.type(hands.box("quality_factor"), value)
    hands.browser.wait_until(lambda: hands.browser.run(KEPT, f'"value": {value}'))


def number(hands: Hands) -> str:
    return hands.number("quality_factor")


def test_a_reload_brings_everything_back(hands: Hands, served: Served) -> None:
    change(hands)
    hands.click(".x-keep")
    hands.browser.wait_until(lambda: hands.browser.find(".card-A"))
    hands.choose(".panel-map .x-shown select", GAIN)
    hands.browser.wait_until(lambda: hands.browser.run(KEPT, '"quantity": "brightness_gain"'))
    hands.browser.open(served.url)
    hands.browser.wait_until(lambda: number(hands) == "77")
    hands.browser.wait_until(lambda: hands.browser.find(".card-A"))
    shown = hands.browser.run(
        "const s = document.querySelector('.panel-map .x-shown select'); return s.selectedOptions[0].text"
    )
    assert str(shown).replace("\xa0", " ") == GAIN
    assert hands.browser.console_errors() == []


def test_a_closed_tab_loses_nothing(hands: Hands, served: Served) -> None:
    change(hands)
    driver = hands.browser.driver
    old = driver.current_window_handle
    driver.switch_to.new_window("window")
    fresh = driver.current_window_handle
    driver.switch_to.window(old)
    driver.close()
    driver.switch_to.window(fresh)
    hands.browser.open(served.url)
    hands.browser.wait_until(lambda: number(hands) == "77")


def test_a_lost_kernel_loses_nothing(start_server: Callable[..., Served], browser: Browser) -> None:
    served = start_server()
    browser.open(served.url)
    hands = Hands(browser)
    hands.rest()
    change(hands)
    # The page's own is the one that has worked most; others wait for the next visit.
    max(served.kernels(), key=lambda kernel: sum(kernel.cpu_times()[:2])).kill()
    browser.open(served.url)
    browser.wait_until(lambda: number(hands) == "77")
    hands.rest()
    change(hands, "88")


def test_a_network_that_is_cut_for_ten_seconds_loses_nothing(hands: Hands, served: Served) -> None:
    driver = hands.browser.driver
    change(hands)
    cut = {"offline": True, "latency": 0, "downloadThroughput": 0, "uploadThroughput": 0}
    driver.execute_cdp_cmd("Network.enable", {})
    driver.execute_cdp_cmd("Network.emulateNetworkConditions", cut)
    time.sleep(10)
    open_ = {"offline": False, "latency": 0, "downloadThroughput": -1, "uploadThroughput": -1}
    driver.execute_cdp_cmd("Network.emulateNetworkConditions", open_)
    time.sleep(1)
    assert number(hands) == "77"
    hands.type(hands.box("quality_factor"), "88")
    hands.browser.wait_until(lambda: hands.browser.run(KEPT, '"value": 88'))
    hands.browser.open(served.url)
    hands.browser.wait_until(lambda: number(hands) == "88")


def test_a_link_opens_the_page_at_its_question(hands: Hands, served: Served, new_browser) -> None:
    change(hands)
    hands.click(".x-linked")
    link = hands.browser.wait_until(
        lambda: (url := hands.browser.driver.current_url) and "#q=" in url and url
    )
    other = new_browser()
    other.open(link)
    guest = Hands(other)
    other.wait_until(lambda: number(guest) == "77")
    other.wait_until(
        lambda: "#" not in other.driver.current_url
    )  # a reload shows what was done since
    change(guest, "99")
    other.open(served.url)
    other.wait_until(lambda: number(guest) == "99")
    assert other.console_errors() == []


def test_a_broken_link_and_broken_memory_are_said_and_run_nothing(
    served: Served, browser: Browser
) -> None:
    browser.open(served.url + "#q=%3Cimg%20src=x%20onerror=window.hurt=1%3E")
    hands = Hands(browser)
    assert "link" in browser.wait_until(hands.complaint)
    kept = page_text(Page(first_question())).replace(
        "Harbour to lighthouse", "<img src=x onerror=window.hurt=1>"
    )
    browser.run("localStorage.setItem('explorer page', arguments[0])", kept)
    browser.open(served.url)
    hands.rest()
    browser.run(
        "localStorage.setItem('explorer page', '{\"format\": \"<script>window.hurt=1</script>\"}')"
    )
    browser.open(served.url)
    browser.wait_until(lambda: "brought back" in hands.complaint())
    assert browser.run("return window.hurt ?? null") is None
    assert "too few" in hands.headline()


def test_keys_undo_and_redo_but_not_in_a_field(hands: Hands) -> None:
    from selenium.webdriver.common.keys import Keys

    before = number(hands)
    hands.type(hands.box("quality_factor"), "77")
    hands.browser.wait_until(lambda: "Q 77" in hands.headline() or number(hands) == "77")
    hands.rest()
    undo = hands.browser.wait_for(".panel-steps button")
    hands.browser.wait_until(undo.is_enabled)
    hands.browser.run("document.activeElement.blur()")
    body = hands.browser.find("body")[0]
    body.send_keys(Keys.CONTROL, "z")
    hands.browser.wait_until(lambda: number(hands) == before)
    body.send_keys(Keys.CONTROL, "y")
    hands.browser.wait_until(lambda: number(hands) == "77")
    box = hands.box("quality_factor")
    box.click()
    box.send_keys("5", Keys.CONTROL, "z")  # the field's own undo
    hands.rest()
    assert "77" in number(hands)
