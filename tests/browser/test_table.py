"""The table of thousands of rows in a real browser, under the page's own policy.

Most tests render the module anew, with a model of their own; a few use the widget and its kernel.
"""

import base64
import inspect
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from selenium.webdriver.common.action_chains import ActionChains
from selenium.webdriver.common.keys import Keys
from selenium.webdriver.remote.webelement import WebElement

import explorer
from explorer.page.table import Cell, Column, Row, pack

from .conftest import Browser, start_browser

SCRIPT = "<img src=x onerror=\"document.title='ran'\">"


def columns() -> list[Column]:
    """Fourteen: two names, a rate, a short number, a mark, nine more numbers."""
    return [
        Column("emitter", "Emitter", tooltip="what emits"),
        Column("optic", "Optic"),
        Column("rate", "Photons per second in the fibre", "number", first_descending=True),
        Column("g2", "g²(0)", "number"),
        Column("holds", "Rate", "pass"),
        *(Column(f"more {k}", f"One more number {k}", "number") for k in range(9)),
    ]


def row(number: int, emitters: tuple[str, ...]) -> Row:
    """One of 4000: rates 0.1, 0.2, ... in a scattered order, every fiftieth not known."""
    rate = None if number % 50 == 7 else (number * 1237 % 4000 + 1) / 10
    emitter, optic = emitters[number % 4], ("NA 0.65", "NA 0.9")[number // 4 % 2]
    return Row(
        f"row {number}",
        (
            Cell(emitter, emitter),
            Cell(optic, optic),
            Cell("not known" if rate is None else f"{rate:.1f} M/s", rate, "limited by the fibre"),
            Cell(f"{number % 10 / 100}", number % 10 / 100),
            Cell("", None if rate is None else rate > 20),
            *(Cell(str(number * (k + 3) % 97), number * (k + 3) % 97) for k in range(9)),
        ),
        "met" if number % 16 == 0 else "",
    )


EMITTERS = ("diamond NV centre", "CdSe nanocrystal", "InAs dot", SCRIPT)
ROWS = [row(number, EMITTERS) for number in range(4000)]

# The widget with its kernel; "half" shows every second row.
PAGE = f"""
from ipywidgets import Button, Label, VBox
from explorer.page.table import Cell, Column, Row, Table

{inspect.getsource(columns)}
{inspect.getsource(row)}
ROWS = [row(number, {EMITTERS!r}) for number in range(4000)]
said = Label("")
said.add_class("said")
table = Table()
table.layout.height = "560px"
table.show(columns(), ROWS, "Candidates")

def pick(key):
    said.value = f"pick {{key}}"
    table.current = key

table.on_pick(pick)
table.on_keep(lambda key: setattr(said, "value", f"keep {{key}}"))
half = Button(description="half")
half.on_click(lambda _: table.show(columns(), ROWS[::2], "Half of the candidates"))
VBox([table, said, half])
"""

# Keeps what follows to one of the two tables; `find` and `all` are used below.
FIND = """
const find = (selector) => document.querySelector(`${where} ${selector}`);
const all = (selector) => [...document.querySelectorAll(`${where} ${selector}`)];
"""

# The texts of a column, by its number, of the rows in view from top to bottom.
IN_VIEW = """
const frame = find(".t-grid").getBoundingClientRect();
const top = frame.top + find(".t-head").offsetHeight;
return all(".t-row").filter((row) => {
  const box = row.getBoundingClientRect();
  return box.bottom > top + 2 && box.top < frame.bottom - 2;
}).map((row) => row.children[arguments[0]].firstChild.textContent);
"""

# Row (1: the heading) and column of the active descendant, and whether it is in view.
FOCUSED = """
const cell = document.getElementById(find(".t-grid").getAttribute("aria-activedescendant"));
const [box, frame] = [cell.getBoundingClientRect(), find(".t-grid").getBoundingClientRect()];
const seen = box.top >= frame.top && box.bottom <= frame.bottom && box.left >= frame.left && box.right <= frame.right;
return [Number(cell.parentElement.ariaRowIndex), [...cell.parentElement.children].indexOf(cell), seen];
"""

# Do something and wait for two frames: the first paints it, the second begins after it was painted.
TIMED = """
const done = arguments[arguments.length - 1];
const begin = performance.now();
{ACT}
requestAnimationFrame(() => requestAnimationFrame(() => done(performance.now() - begin)));
"""

# The module on its own, with a model that tells what is listened to and sent.
ALONE = """
const [source, done] = arguments;
const state = { packed: new DataView(new ArrayBuffer(0)), current: "" };
const heard = new Map();
const model = {
  get: (name) => state[name],
  on: (name, run) => heard.set(name, [...(heard.get(name) ?? []), run]),
  off: (name, run) => heard.set(name, (heard.get(name) ?? []).filter((other) => other !== run)),
  send: (content) => alone.sent.push([content.kind, content.key]),
};
const set = (name, value) => {
  state[name] = value;
  for (const run of heard.get(`change:${name}`)) run();
};
const bytes = (text) => new DataView(Uint8Array.from(atob(text), (c) => c.charCodeAt(0)).buffer);
const address = URL.createObjectURL(new Blob([source], { type: "text/javascript" }));
import(address).then(({ default: make }) => {
  const el = document.createElement("div");
  el.id = "alone";
  el.style.cssText = "position:fixed;inset:0;z-index:9";
  document.body.append(el);
  const widget = make();
  const render = () => { alone.clean = widget.render({ model, el }); };
  window.alone = { bytes, set, render, el, sent: [], listeners: () => [...heard.values()].flat().length };
  render();
  done(true);
}, (error) => done(String(error)));
"""


def sent(rows: list[Row], description: str = "Candidates") -> str:
    return base64.b64encode(pack(columns(), rows, description)).decode()


class Reader:
    """A person in front of one table."""

    def __init__(self, browser: Browser, where: str) -> None:
        self.browser = browser
        self.where = where

    def run(self, script: str, *arguments: object) -> Any:
        return self.browser.run(f"const where = {self.where!r};{FIND}{script}", *arguments)

    def find(self, selector: str) -> list[WebElement]:
        return self.browser.find(f"{self.where} {selector}")

    def timed(self, act: str, *arguments: object) -> float:
        """Milliseconds from an act until it was painted."""
        script = f"const where = {self.where!r};{FIND}{TIMED.replace('{ACT}', act)}"
        return self.browser.driver.execute_async_script(script, *arguments)

    def column(self, number: int) -> list[str]:
        return self.run(IN_VIEW, number)

    def rates(self) -> list[float | None]:
        return [None if text == "not known" else float(text.split()[0]) for text in self.column(3)]

    def count(self) -> str:
        return self.find(".t-count")[0].text.replace("\u202f", " ")

    def focused(self) -> tuple[int, int]:
        """Row as it is counted for screen readers (1: the heading), and column."""
        line, column, seen = self.run(FOCUSED)
        assert seen, "the focused cell is out of view"
        return line, column

    def top(self) -> int:
        return self.run("return find('.t-grid').scrollTop")

    def scroll(self, top: int) -> None:
        self.timed("find('.t-grid').scrollTop = arguments[0];", top)

    def heading(self, label: str) -> WebElement:
        headings = self.find(".t-title")
        return next(one for one in headings if one.text.replace("\n", " ").startswith(label))

    def filter(self, words: str) -> None:
        field = self.find(".t-filter")[0]
        field.send_keys(Keys.CONTROL, "a")
        field.send_keys(words or Keys.DELETE)

    def press(self, *keys: str) -> None:
        for key in keys:
            ActionChains(self.browser.driver).send_keys(key).perform()

    def enter_grid(self) -> None:
        """By the keyboard, as the next stop after the toggle."""
        self.run("find('.t-met-only').focus()")
        self.press(Keys.TAB)
        assert self.run("return document.activeElement === find('.t-grid')")

    def show(self, rows: list[Row], description: str = "Candidates") -> None:
        self.run("alone.set('packed', alone.bytes(arguments[0]))", sent(rows, description))

    def told(self) -> list[list[str]]:
        """What was sent to the kernel since the last question."""
        return self.run("return alone.sent.splice(0)")

    def says(self, words: str) -> None:
        """Wait for the kernel's word."""
        self.browser.wait_until(lambda: self.browser.find(".said")[0].text == words, 10)


@pytest.fixture(scope="module")
def window(start_server: Callable, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    browser = start_browser(tmp_path_factory.mktemp("table"))
    browser.open(start_server(code=PAGE).url, ".t-row")
    yield browser
    browser.driver.quit()


@pytest.fixture(autouse=True)
def nothing_wrong(window: Browser) -> Iterator[None]:
    """No test may leave an error, a foreign request or a script that ran."""
    yield
    assert window.console_errors() == []
    assert window.foreign_requests() == []
    assert window.driver.title == "explorer"


@pytest.fixture
def reader(window: Browser) -> Iterator[Reader]:
    """A new table over the page, with all rows and without a kernel."""
    source = (Path(explorer.__file__).parent / "page" / "table.js").read_text("utf-8")
    assert window.driver.execute_async_script(ALONE, source) is True
    person = Reader(window, "#alone")
    person.show(ROWS)
    yield person
    window.run("alone.clean(); alone.el.remove()")
    window.resize(1280, 720)


# -------------------------------------------------------------------- order and filter


def test_only_the_rows_in_view_are_in_the_page(reader) -> None:
    assert len(reader.find(".t-row")) < 60
    assert reader.run("return find('.t-grid').ariaRowCount") == "4001"
    assert reader.count() == "4 000 of 4 000 candidates"


def test_a_heading_sorts_and_sorts_back(reader) -> None:
    heading = reader.heading("Photons per second")
    assert heading.get_attribute("aria-sort") == "none"
    heading.click()
    assert heading.get_attribute("aria-sort") == "descending"
    assert reader.rates()[:3] == [400.0, 399.9, 399.8]
    heading.click()
    assert heading.get_attribute("aria-sort") == "ascending"
    rates = reader.rates()
    assert rates == sorted(rates)
    assert rates[0] == 0.1
    reader.heading("Emitter").click()
    assert heading.get_attribute("aria-sort") == "none"
    assert set(reader.column(1)) == {SCRIPT}
    assert reader.heading("Emitter").get_attribute("aria-sort") == "ascending"


def test_what_is_not_known_comes_last_in_both_directions(reader) -> None:
    for _ in range(2):
        reader.heading("Photons per second").click()
        assert None not in reader.rates()
        reader.scroll(10**7)
        assert set(reader.rates()) == {None}


def test_marks_are_sorted(reader) -> None:
    heading = reader.heading("Rate")
    heading.click()
    assert set(reader.column(5)) == {"✗"}
    heading.click()
    assert set(reader.column(5)) == {"✓"}
    reader.scroll(10**7)
    assert set(reader.column(5)) == {"–"}


def test_rows_that_are_equal_keep_the_order_before(reader) -> None:
    reader.heading("Photons per second").click()
    reader.heading("g²(0)").click()
    assert set(reader.column(4)) == {"0.0"}
    rates = reader.rates()
    assert rates == sorted(rates, reverse=True)


def test_every_word_of_the_filter_must_occur(reader) -> None:
    reader.filter("DIAMOND na 0.9")
    assert reader.count() == "500 of 4 000 candidates"
    assert set(reader.column(1)) == {"diamond NV centre"}
    assert set(reader.column(2)) == {"NA 0.9"}
    reader.filter("lighthouse")
    assert reader.count() == "0 of 4 000 candidates"
    assert reader.column(1) == []
    assert reader.find(".t-none")[0].is_displayed()
    reader.filter("")
    assert reader.count() == "4 000 of 4 000 candidates"
    assert not reader.find(".t-none")[0].is_displayed()


def test_digits_of_numbers_are_not_searched(reader) -> None:
    reader.filter("0.65")
    assert reader.count() == "2 000 of 4 000 candidates"
    assert set(reader.column(2)) == {"NA 0.65"}


def test_the_toggle_leaves_what_meets_everything(reader) -> None:
    toggle = reader.find(".t-met-only")[0]
    toggle.click()
    assert toggle.get_attribute("aria-pressed") == "true"
    assert reader.count() == "250 of 4 000 candidates"
    assert reader.find(".t-row:not(.t-met)") == []
    toggle.click()
    assert reader.count() == "4 000 of 4 000 candidates"


def test_other_rows_leave_order_filter_place_and_focus(reader) -> None:
    reader.filter("dot")
    reader.heading("Photons per second").click()
    reader.scroll(520)
    reader.find('.t-row[aria-rowindex="25"] .t-number')[0].click()
    focused, before, top = reader.focused(), reader.rates(), reader.top()
    assert top == 520
    reader.show(ROWS[::2], "Half of the candidates")  # all dots are in this half
    assert reader.count() == "1 000 of 2 000 candidates"
    assert (reader.focused(), reader.rates(), reader.top()) == (focused, before, top)
    assert reader.heading("Photons per second").get_attribute("aria-sort") == "descending"
    assert reader.run("return find('.t-grid').ariaLabel") == "Half of the candidates"
    reader.show(ROWS[:4])
    assert reader.count() == "1 of 4 candidates"


# -------------------------------------------------------------------- keys, clicks, messages


def test_keys_move_through_the_rows(reader) -> None:
    reader.enter_grid()
    assert reader.focused() == (2, 1)
    reader.press(Keys.ARROW_DOWN, Keys.ARROW_DOWN, Keys.ARROW_RIGHT)
    assert reader.focused() == (4, 2)
    reader.press(Keys.PAGE_DOWN)
    assert 20 < reader.focused()[0] < 30
    reader.press(Keys.END)
    assert reader.focused() == (4001, 2)
    reader.press(Keys.PAGE_UP, Keys.PAGE_DOWN, Keys.ARROW_DOWN)
    assert reader.focused() == (4001, 2)
    reader.press(Keys.HOME)
    assert reader.focused() == (2, 2)
    reader.press(*6 * [Keys.ARROW_LEFT])
    assert reader.focused() == (2, 0)
    reader.press(*20 * [Keys.ARROW_RIGHT])
    assert reader.focused() == (2, 14)


def test_the_grid_is_one_stop(reader) -> None:
    reader.enter_grid()
    reader.press(Keys.TAB)
    assert not reader.run("return find('.t-grid').contains(document.activeElement)")


def test_a_heading_is_sorted_by_the_keyboard(reader) -> None:
    reader.enter_grid()
    reader.press(Keys.ARROW_RIGHT, Keys.ARROW_RIGHT, Keys.ARROW_UP)
    assert reader.focused() == (1, 3)
    reader.press(Keys.ENTER)
    assert reader.heading("Photons per second").get_attribute("aria-sort") == "descending"
    reader.press("k", Keys.ARROW_DOWN)
    assert reader.focused() == (2, 3)
    assert reader.rates()[0] == 400.0
    assert reader.told() == []


def test_enter_picks_and_k_keeps(reader) -> None:
    reader.enter_grid()
    reader.press(Keys.ARROW_DOWN, Keys.ENTER, Keys.ARROW_DOWN, "k")
    reader.press(Keys.ARROW_LEFT, Keys.ENTER)  # on the button itself
    assert reader.told() == [["pick", "row 1"], ["keep", "row 2"], ["keep", "row 2"]]


def test_k_is_a_letter_in_the_filter(reader) -> None:
    reader.filter("k")
    assert reader.count() == "0 of 4 000 candidates"
    assert reader.told() == []


def test_a_click_picks_and_the_button_keeps(reader) -> None:
    reader.scroll(2600)
    reader.find('.t-row[aria-rowindex="105"] .t-number')[0].click()
    assert reader.focused() == (105, 3)
    button = reader.find('.t-row[aria-rowindex="107"] button')[0]
    assert button.accessible_name == "keep CdSe nanocrystal, NA 0.65"
    button.click()
    assert reader.told() == [["pick", "row 103"], ["keep", "row 105"]]
    reader.press(Keys.ARROW_DOWN)
    assert reader.focused() == (108, 0)


def test_the_first_click_does_not_move_the_rows(reader) -> None:
    """The focus begins at the present design, wherever it is; a finger begins where it presses."""
    reader.run("alone.set('current', 'row 3')")
    reader.scroll(26 * 500)
    reader.find('.t-row[aria-rowindex="510"] .t-number')[0].click()
    reader.run("find('.t-filter').focus()")
    reader.find('.t-row[aria-rowindex="512"] button')[0].click()
    assert reader.told() == [["pick", "row 508"], ["keep", "row 510"]]
    assert reader.top() == 26 * 500


def test_the_present_design_is_marked_and_the_focus_begins_there(reader) -> None:
    reader.run("alone.set('current', 'row 300')")
    assert reader.find('.t-row[aria-selected="true"]') == []
    reader.enter_grid()
    assert reader.focused() == (302, 1)
    marked = reader.find('.t-row[aria-selected="true"]')
    assert [row.get_attribute("aria-rowindex") for row in marked] == ["302"]


def test_the_focus_survives_a_filter_that_leaves_nothing(reader) -> None:
    reader.enter_grid()
    reader.press(Keys.ARROW_DOWN)
    reader.filter("lighthouse")
    reader.enter_grid()
    for key in (Keys.END, Keys.PAGE_UP, Keys.ARROW_DOWN, Keys.ARROW_LEFT, Keys.ENTER, "k"):
        reader.press(key)
    assert reader.told() == []
    reader.filter("")
    reader.enter_grid()
    reader.press(Keys.ARROW_DOWN, Keys.ARROW_RIGHT, Keys.ENTER)
    assert reader.told() == [["pick", "row 0"]]


def test_what_the_mouse_is_told_the_keyboard_is_told_too(reader) -> None:
    reader.enter_grid()
    note = reader.find(".t-note")[0]
    reader.press(Keys.ARROW_RIGHT, Keys.ARROW_RIGHT)
    assert note.text == "limited by the fibre"
    reader.press(Keys.ESCAPE)
    assert not note.is_displayed()
    reader.press(Keys.ARROW_LEFT, Keys.ARROW_LEFT, Keys.ARROW_UP)
    assert note.text == "what emits"


# -------------------------------------------------------------------- texts, sizes, cleaning up


def test_script_in_a_text_shows_as_text(reader) -> None:
    reader.filter("onerror")
    assert reader.count() == "1 000 of 4 000 candidates"
    assert set(reader.column(1)) == {SCRIPT}
    assert reader.find("img") == []


def test_its_style_arrives_and_no_text_is_small(reader) -> None:
    sizes = reader.run("return all('*').map((part) => parseFloat(getComputedStyle(part).fontSize))")
    assert min(sizes) >= 14
    assert reader.run("return getComputedStyle(find('.t-head')).position") == "sticky"
    assert set(reader.run("return all('.t-row').map((row) => row.offsetHeight)")) == {26}


def test_a_narrow_table_scrolls_sideways_and_the_page_does_not(reader) -> None:
    reader.browser.resize(700, 720)
    reader.browser.wait_until(
        lambda: reader.run("return find('.t-grid').scrollWidth > find('.t-grid').clientWidth")
    )
    assert reader.run("return find('.explorer-table').scrollWidth <= 700")
    reader.enter_grid()
    reader.press(*14 * [Keys.ARROW_RIGHT])
    assert reader.focused() == (2, 14)
    assert reader.run("return find('.t-row .t-name').getBoundingClientRect().left") < 3
    reader.press(*13 * [Keys.ARROW_LEFT])
    reader.press(Keys.ARROW_RIGHT)
    assert reader.focused() == (2, 2)


def test_a_folded_table_opens_where_it_was(reader) -> None:
    reader.scroll(5200)
    before = reader.column(3)
    reader.run("alone.el.style.display = 'none'")
    reader.show(ROWS)
    reader.timed("alone.el.style.display = 'block';")
    assert (reader.top(), reader.column(3)) == (5200, before)


def test_it_is_taken_away_whole_and_comes_back_as_it_was(reader) -> None:
    reader.filter("dot")
    reader.heading("g²(0)").click()
    reader.scroll(260)
    before = reader.column(3)
    reader.run("alone.old = find('.t-grid'); alone.clean()")
    assert reader.run("return [alone.listeners(), alone.el.childElementCount]") == [0, 0]
    reader.run("document.body.append(alone.old); alone.old.querySelector('.t-row').click()")
    reader.run("alone.old.remove()")
    assert reader.told() == []
    reader.run("alone.render()")
    assert reader.count() == "1 000 of 4 000 candidates"
    assert reader.run("return find('.t-filter').value") == "dot"
    assert reader.column(3) == before


# -------------------------------------------------------------------- with its kernel


def test_the_kernel_hears_a_pick_and_a_keep_and_shows_other_rows(window) -> None:
    reader = Reader(window, "#rendered_cells")
    reader.heading("Photons per second").click()
    reader.enter_grid()
    reader.press(Keys.ARROW_DOWN, Keys.ARROW_DOWN, Keys.ENTER)  # from the heading
    picked = next(one.key for one in ROWS if one.cells[2].value == 399.9)
    reader.says(f"pick {picked}")
    marked = window.wait_for('#rendered_cells .t-row[aria-selected="true"]')
    assert marked.get_attribute("aria-rowindex") == "3"
    reader.find(".t-row button")[0].click()
    kept = next(one.key for one in ROWS if one.cells[2].value == 400.0)
    reader.says(f"keep {kept}")
    next(one for one in window.find("button") if one.text == "half").click()
    window.wait_until(lambda: reader.count() == "2 000 of 2 000 candidates", 10)
    rates = reader.rates()
    assert rates == sorted(rates, reverse=True)
