"""The served page in a real browser: nothing from elsewhere, no error, quick when preheated."""

import statistics
import time

import pytest
from selenium.webdriver.common.by import By

# A page of its own, so that what is measured here is the serving and not the panels.
SMALL_PAGE = """
import anywidget, bqplot, ipywidgets, traitlets


class Parcel(anywidget.AnyWidget):
    _esm = '''
    export default {
      render({ model, el }) {
        const button = document.createElement("button");
        button.className = "send";
        button.textContent = "send";
        button.onclick = () => {
          model.set("parcel", new DataView(new ArrayBuffer(20 * 2 ** 20)));
          model.save_changes();
        };
        model.on("change:arrived", () => { button.dataset.arrived = model.get("arrived"); });
        el.append(button);
      },
    };
    '''
    parcel = traitlets.Any(None).tag(sync=True)
    arrived = traitlets.Int(0).tag(sync=True)


parcel = Parcel()
parcel.observe(lambda change: setattr(parcel, "arrived", memoryview(change.new).nbytes), "parcel")
scales = {"x": bqplot.LinearScale(), "y": bqplot.LinearScale()}
figure = bqplot.Figure(marks=[bqplot.Lines(x=[0, 1], y=[0, 1], scales=scales)])
text = ipywidgets.HTML("<b>lighthouse</b>")
ipywidgets.VBox([parcel, figure, text])
"""
FIGURE = ".bqplot"
PAPER = "rgb(251, 250, 246)"


@pytest.fixture(scope="module")
def small(start_server):
    return start_server(code=SMALL_PAGE)


def test_no_console_error_and_no_other_host(small, browser) -> None:
    browser.open(small.url, FIGURE)
    assert browser.driver.title == "explorer"
    assert browser.find(".send")
    assert browser.console_errors() == []
    assert browser.requests()
    assert browser.foreign_requests() == []


def test_the_page_itself_has_no_console_error_and_asks_no_other_host(served, browser) -> None:
    browser.open(served.url)
    time.sleep(1)  # what is fetched late counts too
    assert browser.console_errors() == []
    assert browser.foreign_requests() == []
    assert "Traceback" not in browser.driver.find_element(By.TAG_NAME, "body").text


def test_error_page_asks_no_other_host(small, browser) -> None:
    browser.driver.get(small.url + "voila/templates/explorer/nothing")
    browser.driver.get(small.url + "nothing")
    assert browser.foreign_requests() == []


def test_waiting_line_is_shown_on_paper_while_a_cold_kernel_starts(small, browser) -> None:
    look = """
        const line = document.querySelector("#loading");
        return line && [line.getAttribute("aria-live"), line.innerText.trim(),
                        getComputedStyle(line).backgroundColor];
    """
    browser.run("window.location = arguments[0]", small.url + "?theme=cold")
    shown = browser.wait_until(lambda: browser.run(look))
    assert shown == ["polite", "Loading the page…", PAPER]
    browser.wait_for(FIGURE)
    browser.wait_until(lambda: not browser.find("#loading"))
    assert browser.run("return getComputedStyle(document.body).backgroundColor") == PAPER


def test_large_message_arrives(small, browser) -> None:
    """The library's own limit is 10 MiB, and going over it ends the connection without a word."""
    browser.open(small.url, FIGURE)
    browser.find(".send")[0].click()
    assert browser.wait_for(f'.send[data-arrived="{20 * 2**20}"]', 30)


def test_script_in_a_text_does_not_run(small, browser) -> None:
    """The page's policy refuses inline handlers, should a text ever reach it unescaped."""
    browser.open(small.url, FIGURE)
    browser.run(
        "document.body.insertAdjacentHTML('beforeend', arguments[0])",
        "<img src=x onerror=\"document.title='ran'\">",
    )
    time.sleep(0.5)
    assert browser.driver.title == "explorer"
    assert any("Content Security Policy" in message for message in browser.console_errors())


def test_closing_the_tab_ends_its_kernel(small, browser) -> None:
    browser.open(small.url, FIGURE)
    time.sleep(5)  # until the next kernel is warm
    open_kernels = set(small.kernels())
    browser.driver.get("about:blank")
    browser.wait_until(
        lambda: len(open_kernels & set(small.kernels())) == len(open_kernels) - 1, 15
    )


@pytest.mark.slow
def test_preheated_kernel_opens_the_page_quicker(served, browser, capsys) -> None:
    """At most 0.7 of the time of a cold one, medians of alternating openings in one run."""
    seconds = {"preheated": [], "cold": []}
    browser.open(served.url)
    for _ in range(5):
        for kind, query in (("preheated", ""), ("cold", "?theme=cold")):
            browser.driver.get("about:blank")
            time.sleep(8)  # the pool is full again, and quiet
            seconds[kind].append(browser.open(served.url + query))
    preheated, cold = (statistics.median(seconds[kind]) for kind in ("preheated", "cold"))
    with capsys.disabled():
        print(
            f"\npage open: preheated {preheated:.2f} s, cold {cold:.2f} s,"
            f" ratio {preheated / cold:.2f}"
        )
    assert preheated <= 0.7 * cold
