"""How fast maps and single designs are: medians and ratios of one run, nothing asserted about time.

Every quantity on a 256×256 map of quality factor and mode volume, without and with slow wandering
and with a filter: in units of one `np.exp` pass over as many numbers, and against the same formulas
with every input expanded to the full grid.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from functools import partial
from typing import Any

import numpy as np
import pytest

from explorer import QUANTITIES, Axis, Design, mesh
from explorer.answers import Answers
from explorer.evaluate import Evaluation
from explorer.inputs import INPUTS
from explorer.question import Question
from explorer.scenario import first_question

pytestmark = pytest.mark.bench

SIDE = 256
CASES: dict[str, dict[str, Any]] = {
    "slow width 0": {},
    "slow width 5 nm": {"slow_linewidth": 5e-9},
    "slow width 0, filter 20 nm": {"filter_width": 20e-9},
    "slow width 5 nm, 2 nm detuned": {"slow_linewidth": 5e-9, "resonance_wavelength": 652e-9},
}
BASE: dict[str, Any] = {"destination": "fibre", "biexciton_yield": 0.05, "fast_linewidth": 20e-9}


def median(run: Callable[[], Any], count: int = 7) -> float:
    """Median time of a call [s], after one that is not counted."""
    run()
    times = []
    for _ in range(count):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return statistics.median(times)


def expanded(point: dict[str, Any]) -> dict[str, Any]:
    """Every number of the point, defaults too, as a full grid."""
    work = Evaluation(point)
    full = {}
    for name, entry in INPUTS.items():
        value = work.value(name)
        if not entry.whole:
            full[name] = np.ascontiguousarray(np.broadcast_to(value, (SIDE, SIDE)))
        elif value is not None:
            full[name] = value
    return full


def work_out(point: dict[str, Any], names: Any) -> None:
    work = Evaluation(point)
    for name in names:
        work.result(name)


@pytest.mark.parametrize("case", CASES)
def test_maps(case: str) -> None:
    numbers = np.random.default_rng(0).random(SIDE * SIDE)
    one = median(partial(np.exp, numbers), 201)
    axes = (Axis("mode_volume", 1e-4, 1e3, count=SIDE), Axis("quality_factor", 3, 1e6, count=SIDE))
    point = {**BASE, **CASES[case], **mesh(*axes)}
    full = expanded(point)
    print(f"\n{case}: one np.exp pass is {one * 1e3:.3f} ms")
    print(f"{'quantity':30}{'ms':>9}{'passes':>9}{'expanded/ours':>15}")
    for title, names in [*((name, [name]) for name in QUANTITIES), ("all together", QUANTITIES)]:
        ours = median(partial(work_out, point, names))
        theirs = median(partial(work_out, full, names), 3)
        print(f"{title:30}{ours * 1e3:9.2f}{ours / one:9.1f}{theirs / ours:15.1f}")


def test_designs() -> None:
    """One design point with all readouts, and a whole answer, fresh each time."""
    question = first_question()
    design = question.design
    quality = iter(np.linspace(10, 1000, 10_000))
    answers = Answers()
    answers.answer(question)

    def readouts() -> None:
        Design(point={**design.point, "quality_factor": float(next(quality))}).outcome()

    def moved() -> None:
        answers.answer(Question(design=design.with_values(quality_factor=float(next(quality)))))

    def redrawn() -> None:
        width = float(next(quality)) * 1e-10
        answers.answer(Question(design=design.with_values(fast_linewidth=width)))

    print(f"\none design, all {len(QUANTITIES)} readouts: {median(readouts, 51) * 1e3:.2f} ms")
    print(f"answer to a moved point (map kept): {median(moved, 51) * 1e3:.2f} ms")
    print(f"answer to a new width (map redrawn): {median(redrawn, 21) * 1e3:.2f} ms")
