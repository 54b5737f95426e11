"""The panel of measured data: from a file to the design, and what a bad file leaves alone."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from explorer.measured.data import DataError
from explorer.measured.reading import read_decay, read_pattern, read_spectrum
from explorer.page.built import KEY, BuiltMarks, spanned, table
from explorer.page.kinds import KINDS
from explorer.page.measured_plots import STRETCHES, drawing
from explorer.page.measured_words import g2_of, understood
from explorer.page.measuring import Measuring, columns_of
from explorer.page.panels.map import MapPanel
from explorer.page.panels.measured import SEAT, MeasuredPanel
from explorer.page.state import State
from explorer.scenario import first_question
from explorer.whole import Samples

from .measured_files import hostile

FOLDER = Path(__file__).parent.parent / "notebooks" / "measured"

FILES = {
    "spectrum": "emission.csv",
    "decay": "decay_bare.csv",
    "coincidences": "coincidences.txt",
    "pattern": "pattern.txt",
}


@pytest.fixture
def panel() -> Iterator[MeasuredPanel]:
    made = MeasuredPanel(State(first_question()))
    made.opened(True)
    yield made
    made.close()


def give(panel: MeasuredPanel, kind: str, role: str = "", name: str = "") -> None:
    panel.turn_to(kind)
    name = name or FILES[kind]
    panel.take(role, name, (FOLDER / name).read_bytes())


def press(panel: MeasuredPanel, label: str, device: str = "") -> None:
    row = next(row for row in panel.uses.children if row.children[0].description == label)
    if device:
        row.children[1].value = device
    row.children[0].click()


def option(panel: MeasuredPanel, name: str) -> Any:
    return next(one for one in panel.now.kind.options if one.name == name)


def offered(panel: MeasuredPanel) -> list[str]:
    return [row.children[0].description for row in panel.uses.children]


def design(panel: MeasuredPanel) -> Any:
    return panel._state.question.design


# ---------------------------------------------------------------- from a file to the design


@pytest.mark.parametrize("kind", FILES)
def test_each_kind_is_read_shown_and_offered(panel: MeasuredPanel, kind: str) -> None:
    give(panel, kind)
    assert panel.wrong.value == ""
    assert FILES[kind] in panel.read.value
    assert panel.plot.packed
    assert panel.plot.layout.display == ""
    assert panel.result.value.startswith("<table")
    assert offered(panel)
    assert design(panel) == first_question().design  # nothing is used before a press


def test_the_fit_finds_the_truth_that_the_invented_files_state(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    fit = panel.now.fit
    assert fit.centre.low < 583e-9 < fit.centre.high
    assert fit.fast_linewidth.low < 26e-9 < fit.fast_linewidth.high
    assert fit.slow_linewidth.low < 9e-9 < fit.slow_linewidth.high
    give(panel, "decay")
    assert panel.now.fit.low < 3.6e-9 < panel.now.fit.high
    give(panel, "coincidences")
    assert panel.now.fit.low < 0.06 < panel.now.fit.high


def test_a_fitted_line_replaces_the_design_s(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    fit = panel.now.fit
    press(panel, "Use the fitted line")
    point, made = design(panel).point, design(panel)
    assert point["emission_wavelength"] == fit.centre.value
    assert point["fast_linewidth"] == fit.fast_linewidth.value
    assert made.unknowns["slow_linewidth"].high == fit.slow_linewidth.high
    assert made.origin("fast_linewidth").kind == "measured"
    assert made.data == {"emission.csv": panel.now.data.digest}
    assert "In the design" in panel.said.value


def test_a_spectrum_as_measured_replaces_the_line(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    press(panel, "Use the spectrum as measured")
    spectrum = design(panel).point["spectrum"]
    assert isinstance(spectrum, Samples)
    assert len(spectrum) == 601
    assert design(panel).point["slow_linewidth"] == 0.0
    assert panel._state.answer.outcome["rate_in_fibre"] > 0
    width = float(design(panel).evaluation.value("emission_width"))
    assert 25e-9 < width < 33e-9  # 29 nm are fitted
    press(panel, "Use the fitted line")  # and back to a line
    assert "spectrum" not in design(panel).point


def test_the_line_of_a_resonator_gives_its_quality_factor(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    press(panel, "Use as the resonator's line")
    fit, made = panel.now.fit, design(panel)
    assert made.point["resonance_wavelength"] == fit.centre.value
    assert made.point["quality_factor"] == pytest.approx(583 / 26, rel=0.05)
    assert made.unknowns["quality_factor"].low == pytest.approx(
        fit.centre.low / fit.fast_linewidth.high
    )


def test_power_is_turned_into_photons(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    before = panel.now.data
    panel.choose(option(panel, "of"), "power")
    ratio = panel.now.data.counts / before.counts
    assert np.allclose(ratio / ratio[0], before.wavelengths / before.wavelengths[0])
    assert panel.now.fit is not None
    assert "power" in panel.read.value


def test_lines_and_sidebands_become_lines(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    panel.choose(option(panel, "line"), ("voigt", 1))
    press(panel, "Use the fitted lines")
    assert len(design(panel).point["spectrum"].lines) == 2


def test_a_decay_becomes_the_lifetime_or_a_device(panel: MeasuredPanel) -> None:
    give(panel, "decay")
    press(panel, "Use as the bare emitter's lifetime")
    lifetime = design(panel).point["lifetime"]
    assert lifetime == panel.now.fit.lifetime
    panel.take("", "decay_device.csv", (FOLDER / "decay_device.csv").read_bytes())
    panel.take("response", "response.csv", (FOLDER / "response.csv").read_bytes())
    assert panel.now.fit.low < 4.4e-9 < panel.now.fit.high
    assert "Rate enhancement" in panel.result.value
    press(panel, "Add lifetime to", "harbour 1")
    device = design(panel).built[0]
    assert device.name == "harbour 1"
    total = device.measured["rate_enhancement"]
    assert total.value == pytest.approx(lifetime / panel.now.fit.lifetime)
    assert total.low < 3.6 / 4.4 < total.high
    assert set(design(panel).data) == {"decay_bare.csv", "decay_device.csv"}
    assert "harbour 1" in panel.devices.value
    panel.remove.value = "harbour 1"
    assert design(panel).built == ()
    assert "harbour 1" not in panel.devices.value


def test_two_exponentials_say_mean_and_first_slope_apart(panel: MeasuredPanel) -> None:
    give(panel, "decay", name="decay_device.csv")
    panel.choose(option(panel, "components"), 2)
    assert "Add mean time to" in offered(panel)
    assert "Add first slope to" in offered(panel)
    press(panel, "Add first slope to", "slope")
    assert set(design(panel).built[0].measured) == {"initial_decay_rate"}


def test_coincidences_become_a_device_s_or_the_biexciton_s(panel: MeasuredPanel) -> None:
    give(panel, "coincidences")
    press(panel, "Add g²(0) to", "harbour 1")
    assert design(panel).built[0].measured["g2_zero"] == g2_of(panel.now.fit)
    press(panel, "Use as the emitter's biexciton yield")
    share = float(design(panel).evaluation.value("quantum_yield"))
    assert design(panel).point["biexciton_yield"] == pytest.approx(panel.now.fit.g2_zero * share)


def test_a_pattern_replaces_the_gaussian_aperture(panel: MeasuredPanel) -> None:
    give(panel, "pattern")
    before = panel._state.answer.outcome["collected_share"]
    press(panel, "Use as the angular pattern")
    after = panel._state.answer.outcome["collected_share"]
    assert design(panel).origin("pattern").kind == "measured"
    data = panel.now.data
    assert after == pytest.approx(data.collected(0.65), rel=1e-9)
    assert after != before


def test_a_device_is_a_mark_beside_its_prediction(panel: MeasuredPanel) -> None:
    give(panel, "coincidences")
    press(panel, "Add g²(0) to", "harbour 1")
    state = panel._state
    state.ask(shown="g2_zero")
    (mark,) = BuiltMarks().of(state.answer)
    assert mark.own
    assert mark.key == f"{KEY}harbour 1"
    fit = g2_of(panel.now.fit)
    assert f"{spanned(fit, '1')}, predicted" in mark.text
    state.give(quality_factor=200.0)
    MapPanel(state)._marked(mark.key)
    assert state.question.design.point["quality_factor"] == 25.0


def test_a_device_that_no_longer_fits_the_design_is_left_off_the_map(panel: MeasuredPanel) -> None:
    give(panel, "coincidences")
    panel._state.give(resonance_wavelength=585e-9)
    press(panel, "Add g²(0) to", "harbour 1")
    panel._state.ask(y=panel._state.question.x, x=panel._state.question.y)  # axes change places
    assert len(BuiltMarks().of(panel._state.answer)) == 1
    assert "harbour 1" in table(design(panel))


# ---------------------------------------------------------------- read otherwise, choices


def test_units_can_be_said_otherwise(panel: MeasuredPanel) -> None:
    give(panel, "decay")
    panel.reread("µs", "counts", "1, 2")
    assert panel.now.data.times[-1] == pytest.approx(49.992e-6)
    panel.reread("nm", "counts", "1, 2")  # no time
    assert "nm" in panel.wrong.value
    assert panel.now.data.times[-1] == pytest.approx(49.992e-6)  # the last reading stays


def test_columns_count_from_one() -> None:
    assert columns_of("1, 3") == (0, 2)
    assert columns_of("time; dark") == ("time", "dark")
    assert columns_of("") is None
    for words in ("0, 1", "1", "1, 2, 3"):
        with pytest.raises(ValueError, match="columns"):
            columns_of(words)


def test_an_option_that_is_no_number_is_refused_and_the_fit_stays(panel: MeasuredPanel) -> None:
    give(panel, "decay")
    fit = panel.now.fit
    period = option(panel, "period")
    panel.form.numbered(panel.now, period, "soon")
    assert "soon" in panel.wrong.value
    assert panel.now.fit is fit
    panel.form.numbered(panel.now, period, "80 ns")
    assert panel.now.values["period"] == 80e-9
    assert panel.wrong.value == ""


def test_switching_kinds_keeps_what_was_loaded(panel: MeasuredPanel) -> None:
    give(panel, "decay")
    fit = panel.now.fit
    give(panel, "spectrum")
    panel.turn_to("decay")
    assert panel.now.fit is fit
    assert "decay_bare.csv" in panel.read.value


def test_a_background_is_taken_away_and_given_back(panel: MeasuredPanel) -> None:
    give(panel, "spectrum")
    before = panel.now.data.counts.copy()
    give(panel, "spectrum", "background", "emission_background.csv")
    assert np.median(before - panel.now.data.counts) / np.median(before) > 0.1
    panel.drop("background")
    assert np.array_equal(panel.now.data.counts, before)


# ---------------------------------------------------------------- files that cannot be read


@pytest.fixture(scope="module")
def loaded() -> Iterator[MeasuredPanel]:
    """A panel with a file of each kind, for all files that must change nothing."""
    made = MeasuredPanel(State(first_question()))
    made.opened(True)
    for kind in FILES:
        give(made, kind)
    yield made
    made.close()


@pytest.mark.parametrize("bad", hostile(), ids=lambda bad: bad.name)
def test_a_file_that_cannot_be_read_says_why_and_loses_nothing(
    loaded: MeasuredPanel, bad: Any
) -> None:
    panel = loaded
    panel.turn_to(bad.kind)
    held, before, seen = panel.now, design(panel), panel.read.value
    data, fit = held.data, held.fit
    panel.take("", bad.name, bad.content)
    assert panel.wrong.value
    assert "\n" not in panel.wrong.value
    assert bad.says in panel.wrong.value
    assert design(panel) == before
    assert panel.now.data is data
    assert panel.now.fit is fit
    assert panel.read.value == seen
    assert offered(panel)
    panel.opened(False)
    panel.opened(True)  # what was said is settled, what was loaded is there
    assert panel.wrong.value == ""
    assert panel.read.value == seen


def test_script_in_a_header_or_a_file_name_is_text(panel: MeasuredPanel) -> None:
    script = "<img src=x onerror=alert(1)>"
    content = (FOLDER / "decay_bare.csv").read_text().replace("Time (ns)", f"{script} (ns)")
    panel.turn_to("decay")
    panel.take("", f"{script}.csv", content.encode())
    assert panel.wrong.value == ""
    press(panel, "Add lifetime to", script)
    press(panel, "Use as the bare emitter's lifetime")
    for widget in (panel.read, panel.result, panel.devices, panel.said):
        assert "<img" not in widget.value
    assert "&lt;img" in panel.read.value
    assert "&lt;img" in panel.devices.value


def test_refusals_of_the_browser_are_said(panel: MeasuredPanel) -> None:
    upload = panel.form.files.children[0]
    upload._hear(None, {"kind": "too large", "name": "big.csv", "size": 2e8}, [])
    assert "big.csv has 200 MB" in panel.wrong.value
    upload._hear(None, {"kind": "unreadable", "name": "gone.csv"}, [])
    assert "gone.csv cannot be read" in panel.wrong.value
    assert panel._state.problems[SEAT]


# ---------------------------------------------------------------- plots and words


def test_a_plot_of_many_points_keeps_their_extremes() -> None:
    data = read_decay(FOLDER / "decay_bare.csv")
    frame, curves, words = drawing(data).main
    assert len(curves[0].x) == 2 * STRETCHES
    assert np.max(curves[0].y) == pytest.approx(np.log10(data.counts.max()))
    assert frame.y[1] > np.max(curves[0].y)
    assert "3125 points" in words


def test_a_spectrum_is_drawn_over_its_maximum() -> None:
    frame, curves, _ = drawing(read_spectrum(FOLDER / "emission.csv")).main
    assert np.max(curves[0].y) == pytest.approx(1.0)
    assert frame.x == pytest.approx((480.0, 720.0))


def test_what_is_left_out_is_counted_and_listed() -> None:
    rows = "\n".join(f"{a},{2 + a % 3}" for a in range(0, 80, 2))
    bad = "\n".join(f"oops{i}," for i in range(3))
    data = read_pattern(f"angle (deg),power\n{rows}\n{bad}\n".encode(), name="p.csv")
    words = understood(data)
    assert "3 rows left out" in words
    assert "line 42" in words


@pytest.mark.parametrize("name", KINDS)
def test_nothing_is_fitted_before_there_is_data(name: str) -> None:
    held = Measuring(KINDS[name])
    assert list(held.fit_steps()) == []
    held.drop("response")
    assert held.data is None


def test_errors_name_file_and_line() -> None:
    error = DataError("“x” is no number", "a.csv", 7)
    assert str(error) == "a.csv, line 7: “x” is no number"
