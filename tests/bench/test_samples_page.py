"""Prints what a slider step costs on the page with a measured spectrum of 4000 samples, beside a line.

One browser, two windows of the same page, one with each design, their keys pressed in turn: from the
key to the painted picture, as in `latency.py`.
"""

from __future__ import annotations

import time
from dataclasses import replace
from pathlib import Path

import pytest

from explorer.design import Design
from explorer.record import save_design
from explorer.scenario import first_question

from ..browser.conftest import start_browser
from ..browser.hands import Hands
from .latency import MAP, READOUT, TIMED, Steps
from .test_samples import measured

PRESSES = 30

#: Input -> whether the map follows, and the keys of a step to and fro.
SLIDERS = {
    "numerical_aperture": (MAP, ("PageUp", "PageDown")),
    "resonance_wavelength": (MAP, ("ArrowRight", "ArrowLeft")),
    "quality_factor": ("", ("ArrowRight", "ArrowLeft")),
}


def designs() -> dict[str, Design]:
    """The demonstration with a line, and with a measured spectrum."""
    first = first_question().design.without_values("temperature")
    line = first.with_values(fast_linewidth=8e-9)
    point = {name: value for name, value in line.point.items() if name != "fast_linewidth"}
    return {"line": line, "samples": replace(line, point={**point, "spectrum": measured(1)})}


@pytest.mark.bench
@pytest.mark.browser
def test_a_measured_spectrum_on_the_page(start_server, tmp_path: Path, capsys) -> None:
    served, browser = start_server(), start_browser(tmp_path)
    try:
        windows = {}
        for name, design in designs().items():
            if windows:
                browser.driver.switch_to.new_window("window")
            browser.resize(1280, 720)
            browser.open(served.url)
            browser.driver.execute_cdp_cmd("Network.disable", {})
            path = tmp_path / f"{name}.json"
            save_design(design, path)
            hands = Hands(browser)
            hands.rest()
            hands.give_file(path)
            hands.rest()
            windows[name] = browser.driver.current_window_handle
        found = {
            (slider, name): Steps(f"{slider}, {name}", lambda _: None)
            for slider in SLIDERS
            for name in windows
        }
        for number in range(-3, PRESSES):
            for (slider, name), kind in found.items():
                drawn, keys = SLIDERS[slider]
                browser.driver.switch_to.window(windows[name])
                send = {"target": f".input-{slider} .noUi-handle", "key": keys[number // 10 % 2]}
                kind.act = lambda _, send=send, drawn=drawn: browser.driver.execute_async_script(
                    TIMED, send, READOUT, drawn
                )
                kind.take(number)
                if number < 0:
                    kind.times.clear()
            time.sleep(0.2)
        with capsys.disabled():
            print(f"\n{'slider':24}{'line ms':>10}{'samples ms':>12}{'ratio':>8}  (wanted: 1.3)")
            for slider in SLIDERS:
                line, samples = (found[slider, name].median for name in windows)
                print(f"{slider:24}{line:10.1f}{samples:12.1f}{samples / line:8.2f}")
        assert all(kind.times for kind in found.values())
    finally:
        browser.driver.quit()
