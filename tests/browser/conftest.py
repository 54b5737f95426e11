"""Headless Chromium for the browser tests; they skip, saying so, where there is none."""

import json
import os
import shutil
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any
from urllib.parse import urlsplit

import pytest
from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.common.by import By
from selenium.webdriver.remote.webelement import WebElement
from selenium.webdriver.support.ui import WebDriverWait

BROWSERS = ("chromium", "chromium-browser", "google-chrome")
DRIVERS = ("chromedriver", "chromium.chromedriver")
FLAGS = (
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--hide-scrollbars",
    "--force-color-profile=srgb",
)
LOCAL = {"127.0.0.1", "localhost"}
# Shown once the page's widgets are drawn.
DRAWN = "#rendered_cells .jupyter-widgets"


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    for item in items:
        if Path(__file__).parent in item.path.parents:
            item.add_marker("browser")


class Browser:
    """One Chromium window and what a test asks of it."""

    def __init__(self, driver: webdriver.Chrome, downloads: Path) -> None:
        self.driver = driver
        self.downloads = downloads
        self._events: list[dict] = []
        self._complaints: list[str] = []

    def resize(self, width: int, height: int) -> None:
        """Set the size of the page itself, without the window's frame."""
        size = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": False}
        self.driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", size)

    def open(self, url: str, drawn: str = DRAWN, seconds: float = 120) -> float:
        """Open the address, wait until `drawn` is shown and return the seconds it took."""
        begin = time.perf_counter()
        self.driver.get(url)
        self.wait_for(drawn, seconds)
        self.wait_until(lambda: not self.find("#loading"), seconds)
        return time.perf_counter() - begin

    def find(self, selector: str) -> list[WebElement]:
        return self.driver.find_elements(By.CSS_SELECTOR, selector)

    def wait_for(self, selector: str, seconds: float = 30) -> WebElement:
        """The first shown element that the selector matches."""
        shown = WebDriverWait(self.driver, seconds, poll_frequency=0.02).until(
            lambda _: next(
                (element for element in self.find(selector) if element.is_displayed()), None
            ),
            f"nothing matches {selector!r}",
        )
        assert shown is not None
        return shown

    def wait_until(self, true: Callable[[], Any], seconds: float = 30) -> Any:
        """Wait until the function returns something true, and return that."""
        return WebDriverWait(self.driver, seconds, poll_frequency=0.02).until(lambda _: true())

    def run(self, script: str, *arguments: object) -> object:
        return self.driver.execute_script(script, *arguments)

    def console_errors(self) -> list[str]:
        """Errors on the console since the window was opened, failed requests included."""
        for entry in self.driver.get_log("browser"):
            if entry["level"] == "SEVERE":
                self._complaints.append(entry["message"])
        return list(self._complaints)

    def requests(self) -> list[str]:
        """Every address asked for since the window was opened, web sockets included."""
        for entry in self.driver.get_log("performance"):
            message = json.loads(entry["message"])["message"]
            if message["method"] == "Network.requestWillBeSent":
                self._events.append(message["params"]["request"]["url"])
            elif message["method"] == "Network.webSocketCreated":
                self._events.append(message["params"]["url"])
        return list(self._events)

    def foreign_requests(self) -> list[str]:
        """Those that went to another host."""
        network = {"http", "https", "ws", "wss", "ftp"}
        parts = [(url, urlsplit(url)) for url in self.requests()]
        return [url for url, part in parts if part.scheme in network and part.hostname not in LOCAL]

    def downloaded(self, pattern: str = "*", seconds: float = 15) -> Path:
        """The newest finished download whose name fits the pattern."""

        def newest() -> Path | None:
            files = [
                file
                for file in self.downloads.glob(pattern)
                if file.suffix not in (".crdownload", ".tmp") and file.stat().st_size
            ]
            return max(files, key=lambda file: file.stat().st_mtime, default=None)

        return self.wait_until(newest, seconds)

    def screenshot(self, path: Path | str) -> None:
        self.driver.save_screenshot(str(path))


def installed_chromium() -> tuple[str, str]:
    """Paths of the browser and of its driver; skips the test, or fails it, where there is none."""
    found = [next(filter(None, map(shutil.which, names)), None) for names in (BROWSERS, DRIVERS)]
    program, driver = found
    if program and driver:
        return program, driver
    reason = "no Chromium with its driver here (Debian: apt install chromium chromium-driver)"
    if os.environ.get("EXPLORER_REQUIRE_BROWSER"):
        pytest.fail(f"EXPLORER_REQUIRE_BROWSER is set, but there is {reason}", pytrace=False)
    pytest.skip(reason)  # the machine has no browser: the reason says so and how to get one


def pytest_runtest_setup() -> None:
    installed_chromium()  # before any fixture starts a server in vain


def start_browser(folder: Path, width: int = 1280, height: int = 720) -> Browser:
    """A new window with a fresh profile; the caller quits its driver."""
    program, driver = installed_chromium()
    downloads = folder / "downloads"
    downloads.mkdir(parents=True, exist_ok=True)
    options = webdriver.ChromeOptions()
    options.binary_location = program
    for flag in (
        *FLAGS,
        f"--user-data-dir={folder / 'profile'}",
        f"--window-size={width},{height}",
    ):
        options.add_argument(flag)
    options.add_experimental_option("prefs", {"download.default_directory": str(downloads)})
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    browser = Browser(webdriver.Chrome(options=options, service=Service(driver)), downloads)
    browser.resize(width, height)
    return browser


@pytest.fixture
def new_browser(tmp_path: Path) -> Iterator[Callable[..., Browser]]:
    """Opens windows, `new_browser(width=1920, height=1080)`, and closes them with the test."""
    opened: list[Browser] = []

    def open_window(width: int = 1280, height: int = 720) -> Browser:
        opened.append(start_browser(tmp_path / f"browser{len(opened)}", width, height))
        return opened[-1]

    yield open_window
    for browser in opened:
        browser.driver.quit()


@pytest.fixture
def browser(new_browser: Callable[..., Browser]) -> Browser:
    """One window of 1280×720 with nothing open in it yet, for one test."""
    return new_browser()


@pytest.fixture(scope="module")
def page(served, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    """The page, open and drawn at 1280×720, shared by the tests of one module."""
    window = start_browser(tmp_path_factory.mktemp("page"))
    window.open(served.url)
    yield window
    window.driver.quit()
