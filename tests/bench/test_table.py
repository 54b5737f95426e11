"""Prints how long a long table of candidates takes to show, sort and jump in the browser."""

from __future__ import annotations

import statistics

import pytest

from ..browser.test_table import ROWS, reader, sent, window

__all__ = ["reader", "window"]  # fixtures

pytestmark = [pytest.mark.bench, pytest.mark.browser]

FIVE_HUNDRED = 500


@pytest.mark.parametrize("count", [FIVE_HUNDRED, len(ROWS)])
def test_table(reader, capsys, count: int) -> None:  # the fixture
    """Times include two frames of the browser, which take about 33 ms by themselves."""
    rows = ROWS[:count]
    reader.run("alone.tables = arguments[0].map(alone.bytes)", [sent(rows), sent(rows[::-1])])
    far = 26 * count
    found = {
        "show": [reader.timed("alone.set('packed', alone.tables.reverse()[0]);") for _ in range(9)],
        "sort": [reader.timed("all('.t-title')[3].click();") for _ in range(9)],
        "scroll": [
            reader.timed("find('.t-grid').scrollTop = arguments[0];", far * part % far)
            for part in (0.9, 0.2, 0.7, 0.0, 0.5, 0.01, 0.8, 0.3, 0.6)
        ],
    }
    with capsys.disabled():
        print(
            f"\n{count} rows: "
            + ", ".join(
                f"{name} {statistics.median(times):.0f} ms (longest {max(times):.0f})"
                for name, times in found.items()
            )
            + "; wanted: no pause over 100 ms"
        )
    assert all(found.values())
