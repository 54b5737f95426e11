"""Prints how long a full candidate table and the ranges of one design take, beside a map's redraw."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from typing import Any

import pytest

from explorer import candidates, influences, make_map, ranges
from explorer.question import READ_OUT
from explorer.scenario import first_question

ROUNDS = 9


def medians(works: dict[str, Callable[[], Any]]) -> dict[str, float]:
    """Median time of each work [ms], taken in turn, so that all see the same load."""
    times: dict[str, list[float]] = {name: [] for name in works}
    for number in range(ROUNDS + 2):
        for name, work in works.items():
            start = time.perf_counter()
            work()
            if number >= 2:  # the first ones warm up
                times[name].append(1000 * (time.perf_counter() - start))
    return {name: statistics.median(found) for name, found in times.items()}


@pytest.mark.bench
def test_choice(capsys) -> None:
    question = first_question()
    design = question.design
    assert design.unknowns
    wanted = (question.shown,)
    found = medians(
        {
            "one map redraw": lambda: make_map(
                design.point, question.x, question.y, wanted, design.requirements
            ),
            "full candidate table": lambda: candidates(design),
            "scaled candidate table": lambda: candidates(design, scaled=True),
            "ranges of the headline quantities": lambda: ranges(design, READ_OUT),
            "ranking of the rate's unknowns": lambda: influences(design, "rate_in_fibre"),
        }
    )
    rows = len(candidates(design))
    unit = found["one map redraw"]
    with capsys.disabled():
        print(f"\n{'':36}{'median ms':>10}{'map redraws':>13}   ({rows} candidates)")
        for name, value in found.items():
            print(f"{name:36}{value:10.1f}{value / unit:13.1f}")
        print("wanted: table under 300 ms, ranges under 150 ms, on 2 cores")
    assert rows > 3000
