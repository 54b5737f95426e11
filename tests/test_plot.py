"""The small plot: points keep their digits, and the panel of colours tells its ticks apart."""

from __future__ import annotations

import json
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from explorer.curves import Colours, colours
from explorer.evaluate import Evaluation
from explorer.page.panels.colours import ColoursPanel
from explorer.page.plot import Curve, Frame, Plot
from explorer.page.ticks import limits, written


def sent(plot: Plot) -> tuple[dict[str, Any], list[NDArray[np.float32]]]:
    """Header and curves of the last message, as the browser reads them."""
    start = 4 + int(np.frombuffer(plot.packed, "<u4", 1)[0])
    header = json.loads(plot.packed[4:start])
    _, offset, count = header["arrays"]["points"]
    points = np.frombuffer(plot.packed, "<f4", count, start + offset).reshape(-1, 2)
    return header, np.split(points, np.cumsum([curve["count"] for curve in header["curves"]])[:-1])


def drawn_by_panel(**point: Any) -> tuple[dict[str, Any], list[NDArray[np.float32]], Colours, str]:
    panel = ColoursPanel(SimpleNamespace(on_answer=lambda _: None))
    seen = colours(Evaluation(point))
    panel._draw(SimpleNamespace(colours=seen))
    header, curves = sent(panel.plot)
    description = panel.plot.description
    panel.close()
    return header, curves, seen, description


def test_points_count_from_the_lower_end_of_the_frame() -> None:
    plot = Plot()
    x = 650.0 + np.arange(200) * 1e-9
    frame = Frame((649.9999999, 650.0000002), (0.0, 1.0), ((650.0, "650"),))
    plot.show(frame, [Curve(x, np.ones(200), "ink"), Curve([650.0, 650.0], [0, 1], "red")], "")
    header, (first, second) = sent(plot)
    assert header["x"] == [649.9999999, 650.0000002], "ticks and ends stay absolute"
    assert header["ticks"] == [[650.0, "650"]]
    assert first[:, 0] == pytest.approx(x - frame.x[0], rel=1e-6, abs=1e-13)
    assert np.unique(first[:, 0]).size == 200
    assert second[:, 1].tolist() == [0, 1]
    plot.close()


@pytest.mark.parametrize(
    "point",
    [
        {"quality_factor": 1e7, "fast_linewidth": 1e-14},
        {"quality_factor": 1e10, "fast_linewidth": 1e-14, "lifetime": 1e-6},
        {"emission_wavelength": 9.87e-6, "quality_factor": 1e10, "fast_linewidth": 1e-14},
        {},
    ],
)
def test_the_panel_of_colours_keeps_every_place_apart(point: dict[str, float]) -> None:
    header, curves, seen, description = drawn_by_panel(**point)
    places = np.unique(seen.wavelength * 1e9 - header["x"][0])
    for curve in curves:
        assert np.unique(curve[:, 0]).size > 0.9 * np.unique(places.round(13)).size
    span = header["x"][1] - header["x"][0]
    assert curves[0][:, 0] == pytest.approx(seen.wavelength * 1e9 - header["x"][0], abs=1e-6 * span)
    labels = [label for _, label in header["ticks"]]
    assert len(labels) >= 2
    assert len(set(labels)) == len(labels)
    for at, label in header["ticks"]:
        assert float(label) == pytest.approx(at, rel=1e-12)
    low, high = description.split("from ")[1].split(" nm")[0].split(" to ")
    assert float(low) < float(high)


def test_ticks_of_any_frame() -> None:
    rng = np.random.default_rng(41)
    for _ in range(2000):
        middle, half = rng.uniform(300, 9000), 10 ** rng.uniform(-4.6, 2.2)
        low, high, marks = limits(middle - half, middle + half * rng.uniform(0.3, 1))
        assert middle - half <= low < high <= middle + half
        assert 2 <= len(marks) <= 6
        assert low <= marks[0] < marks[-1] <= high
        labels = written(marks)
        assert len(set(labels)) == len(labels)
        assert [float(label) for label in labels] == marks


def test_numbers_are_written_in_as_few_decimals_as_they_need() -> None:
    assert written([0.0, 200.0, 400.0]) == ["0", "200", "400"]
    assert written([649.5, 650.0]) == ["649.5", "650.0"]
    assert written([649.99998, 650.0, 650.00002]) == ["649.99998", "650.00000", "650.00002"]
