"""How long the page takes to follow a hand, against the least that any widget page takes.

One run, one browser, two windows: a bare page (a slider and a label that the kernel writes) and the
whole page, measured in turn, so that both see the same load. Times are taken in the browser:

- key: from a key event on a slider's handle until the changed readout is in the page, the map has
  drawn its new picture (where the input is on no axis), and two more frames have begun: the first
  paints the change, the second begins after it was painted.
- drag: the same from a move of the pointer, the design point held; the map must draw no picture.
- open: from the request of the address until the widgets are drawn, a waiting kernel against a cold one.
"""

import statistics
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

from ..browser.conftest import Browser, start_browser
from ..conftest import Served

LABEL_PAGE = """
from ipywidgets import IntSlider, Label, VBox

slider, label = IntSlider(max=1000, readout=False), Label("0")
label.add_class("bare")
slider.observe(lambda change: setattr(label, "value", str(change["new"])), "value")
VBox([slider, label])
"""

# What the page's readouts are, and the part of the answer that every step changes.
READOUT = ".panel-headline, .panel-budget"
MAP = ".explorer-map"

# arguments: event to send, what reads out, the map whose picture must change ("" for none)
TIMED = """
const [send, readout, map, done] = arguments;
const parts = () => [...document.querySelectorAll(readout)];
const said = () => parts().map((part) => part.textContent).join();
const picture = () => (map ? document.querySelector(map).dataset.frame : "");
const [words, frame] = [said(), picture()];
let begin;
const look = () => {
  if (said() === words || (map && picture() === frame)) return;
  watch.disconnect();
  clearTimeout(late);
  requestAnimationFrame(() => requestAnimationFrame(() => done(performance.now() - begin)));
};
const watch = new MutationObserver(look);
const late = setTimeout(() => { watch.disconnect(); done(null); }, 8000);
for (const part of parts()) watch.observe(part, { childList: true, characterData: true, subtree: true });
if (map) watch.observe(document.querySelector(map), { attributes: true, attributeFilter: ["data-frame"] });
const act = () => {
  const target = document.querySelector(send.target);
  const event = send.key
    ? new KeyboardEvent("keydown", { key: send.key, bubbles: true, cancelable: true })
    : new PointerEvent("pointermove", { clientX: send.x, clientY: send.y, bubbles: true });
  begin = performance.now();
  target.dispatchEvent(event);
};
requestAnimationFrame(() => setTimeout(act, 5 + 12 * Math.random()));
"""

PAUSE = 0.15  # seconds between two steps: what a step leaves behind must not slow the next


@dataclass
class Steps:
    """Times of one kind of step [ms]; `lost` steps changed nothing that is read out."""

    name: str
    act: Callable[[int], float | None]
    times: list[float] = field(default_factory=list)
    lost: int = 0

    def take(self, number: int) -> None:
        time.sleep(PAUSE)
        found = self.act(number)
        if found is None:
            self.lost += 1
        else:
            self.times.append(found)

    @property
    def median(self) -> float:
        return statistics.median(self.times)

    @property
    def slow(self) -> float:
        """95 of 100 steps are quicker."""
        return sorted(self.times)[round(0.95 * (len(self.times) - 1))]


class Windows:
    """One browser with a window for the bare page and one for the whole page."""

    def __init__(self, browser: Browser, bare: Served, whole: Served) -> None:
        self.browser = browser
        self.bare = self._open(bare)
        browser.driver.switch_to.new_window("window")
        browser.resize(1280, 720)
        self.whole = self._open(whole)
        self.start = (0.0, 0.0)

    def _open(self, served: Served) -> str:
        self.browser.open(served.url)
        # Or the driver would be sent a copy of every message of the page.
        self.browser.driver.execute_cdp_cmd("Network.disable", {})
        return self.browser.driver.current_window_handle

    def use(self, window: str) -> None:
        if self.browser.driver.current_window_handle != window:
            self.browser.driver.switch_to.window(window)
        assert self.browser.run("return document.visibilityState") == "visible"

    def timed(self, send: dict, readout: str, drawn: str = "") -> float | None:
        return self.browser.driver.execute_async_script(TIMED, send, readout, drawn)

    def bare_key(self, _number: int) -> float | None:
        self.use(self.bare)
        return self.timed({"target": ".noUi-handle", "key": "ArrowRight"}, ".bare")

    def whole_key(
        self, name: str, drawn: str, keys: tuple[str, str] = ("ArrowRight", "ArrowLeft")
    ) -> Callable[[int], float | None]:
        """Steps of one slider, to and fro, so that no end is reached."""

        def act(number: int) -> float | None:
            self.use(self.whole)
            key = keys[number // 10 % 2]
            return self.timed({"target": f".input-{name} .noUi-handle", "key": key}, READOUT, drawn)

        return act

    def take_point(self) -> None:
        """Press on the design point and hold it."""
        self.use(self.whole)
        box, fractions = self.browser.run(
            "const map = document.querySelector('.explorer-map');"
            "const box = map.querySelector('[role=slider]').getBoundingClientRect();"
            "return [[box.x, box.y, box.width, box.height], map.dataset.point.split(',').map(Number)]"
        )
        self.start = (box[0] + fractions[0] * box[2], box[1] + (1 - fractions[1]) * box[3])
        self._mouse("mousePressed")

    def leave_point(self) -> None:
        self.use(self.whole)
        self._mouse("mouseReleased")

    def _mouse(self, kind: str) -> None:
        x, y = self.start
        event = {"type": kind, "x": x, "y": y, "button": "left", "clickCount": 1}
        self.browser.driver.execute_cdp_cmd("Input.dispatchMouseEvent", event)

    def drag(self, number: int) -> float | None:
        self.use(self.whole)
        far = 6 * (number % 20 + 1)
        x, y = self.start[0] - far, self.start[1] - far / 2
        return self.timed({"target": f"{MAP} [role=slider]", "x": x, "y": y}, READOUT)

    def frame(self) -> str:
        self.use(self.whole)
        return self.browser.run(f"return document.querySelector('{MAP}').dataset.frame")


def steps(windows: Windows, presses: int = 40) -> dict[str, Steps]:
    """Times of every kind of step, taken in turn; the point is dragged in rounds of its own."""
    kinds = [
        Steps("label", windows.bare_key),
        Steps("linewidth", windows.whole_key("fast_linewidth", MAP)),
        # Five stops at a time: a single one often changes no digit that is read out.
        Steps("aperture", windows.whole_key("numerical_aperture", MAP, ("PageUp", "PageDown"))),
        Steps("quality factor", windows.whole_key("quality_factor", "")),
    ]
    bare = Steps("label beside drag", windows.bare_key)
    drag = Steps("drag", windows.drag)
    for number in range(-3, presses):
        for kind in kinds:
            kind.take(number)
        if number < 0:  # the first ones warm up
            for kind in kinds:
                kind.times.clear()
    windows.take_point()
    time.sleep(1)  # a map drawn in fewer cells while the sliders moved is drawn whole meanwhile
    before = windows.frame()
    for number in range(presses):
        bare.take(number)
        drag.take(number)
    assert windows.frame() == before, "dragging the point drew the map anew"
    windows.leave_point()
    return {kind.name: kind for kind in (*kinds, bare, drag)}


def openings(browser: Browser, served: Served, rounds: int = 4) -> dict[str, Steps]:
    """Times of opening the page, with a waiting kernel and with a cold one, in turn [ms]."""

    def opening(query: str) -> Callable[[int], float]:
        def act(_number: int) -> float:
            browser.driver.get("about:blank")
            time.sleep(8)  # until the next kernel is warm, and the machine quiet
            return 1000 * browser.open(served.url + query)

        return act

    kinds = [Steps("waiting kernel", opening("")), Steps("cold kernel", opening("?theme=cold"))]
    browser.open(served.url)
    for number in range(rounds):
        for kind in kinds:
            kind.take(number)
    return {kind.name: kind for kind in kinds}


#: What is divided by what, and the most that is wanted.
RATIOS = (
    ("linewidth", "label", 2.0),
    ("aperture", "label", 2.0),
    ("quality factor", "label", 2.0),
    ("drag", "label beside drag", 1.3),
    ("waiting kernel", "cold kernel", 0.7),
)


def report(found: dict[str, Steps]) -> str:
    """The figures as a small table."""
    lines = [f"{'':20}{'median ms':>10}{'95 %':>8}{'count':>7}{'lost':>6}"]
    for name, kind in found.items():
        count = len(kind.times)
        lines.append(f"{name:20}{kind.median:10.1f}{kind.slow:8.1f}{count:7d}{kind.lost:6d}")
    lines.append("")
    for above, below, most in RATIOS:
        if above in found and below in found:
            ratio = found[above].median / found[below].median
            lines.append(f"{above + ' / ' + below:40}{ratio:6.2f}  (wanted: at most {most})")
    return "\n".join(lines)


def measure(
    start_server: Callable[..., Served], folder: Path, presses: int = 40, rounds: int = 4
) -> dict[str, Steps]:
    """Everything of this module in one browser."""
    bare, whole = start_server(code=LABEL_PAGE), start_server()
    browser = start_browser(folder)
    try:
        found = steps(Windows(browser, bare, whole), presses)
        return found | (openings(browser, whole, rounds) if rounds else {})
    finally:
        browser.driver.quit()
