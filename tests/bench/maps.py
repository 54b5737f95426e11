"""How fast maps and single designs are. Prints medians and ratios of one run; asserts no time.

Every quantity on a 256×256 map of quality factor and mode volume, without and with slow wandering:
in units of one `np.exp` pass over as many numbers, and against the same formulas with every input
expanded to the full grid. Run with `python tests/bench/maps.py`.
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from typing import Any

import numpy as np

from explorer import QUANTITIES, Axis, Design, Requirement, mesh
from explorer.evaluate import Evaluation
from explorer.inputs import INPUTS
from explorer.question import Answers, Question
from explorer.scenario import first_question

SIDE = 256
CASES = {
    "slow 0": {},
    "slow 5 nm": {"slow_linewidth": 5e-9},
    "filter 20 nm": {"filter_width": 20e-9},
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


def grid() -> dict[str, Any]:
    axes = (Axis("mode_volume", 1e-4, 1e3, count=SIDE), Axis("quality_factor", 3, 1e6, count=SIDE))
    return mesh(*axes)


def expanded(point: dict[str, Any]) -> dict[str, Any]:
    """Every number of the point, defaults too, as a full grid."""
    work = Evaluation(point)
    full = {}
    for name, entry in INPUTS.items():
        value = work.value(name)
        if entry.whole:
            if value is not None:
                full[name] = value
        else:
            full[name] = np.ascontiguousarray(np.broadcast_to(value, (SIDE, SIDE)))
    return full


def maps(print_: Callable[[str], None] = print) -> None:
    numbers = np.random.default_rng(0).random(SIDE * SIDE)
    for case, extra in CASES.items():
        pass_ = median(lambda: np.exp(numbers), 201)
        point = {**BASE, **extra, **grid()}
        full = expanded(point)
        print_(f"\n{case}: one np.exp pass is {pass_ * 1e3:.3f} ms")
        print_(f"{'quantity':30}{'ms':>9}{'passes':>9}{'expanded/ours':>15}")
        for name in QUANTITIES:
            ours = median(lambda name=name: Evaluation(point).result(name))
            theirs = median(lambda name=name: Evaluation(full).result(name), 3)
            print_(f"{name:30}{ours * 1e3:9.2f}{ours / pass_:9.1f}{theirs / ours:15.1f}")

        def everything(entries: dict[str, Any]) -> None:
            work = Evaluation(entries)
            for name in QUANTITIES:
                work.result(name)

        ours = median(lambda: everything(point))
        theirs = median(lambda: everything(full), 3)
        print_(f"{'all together':30}{ours * 1e3:9.2f}{ours / pass_:9.1f}{theirs / ours:15.1f}")


def designs(print_: Callable[[str], None] = print) -> None:
    """One design point with all readouts, and a whole answer, fresh each time."""
    question = first_question()
    point = dict(question.design.point)
    quality = iter(np.linspace(10, 1000, 10_000))

    def readouts() -> None:
        Design(point={**point, "quality_factor": float(next(quality))}).outcome()

    answers = Answers()
    answers.answer(question)

    def moved() -> None:
        design = question.design.with_values(quality_factor=float(next(quality)))
        answers.answer(Question(design=design))

    def redrawn() -> None:
        design = question.design.with_values(fast_linewidth=float(next(quality)) * 1e-10)
        answers.answer(Question(design=design))

    print_(f"\none design, all {len(QUANTITIES)} readouts: {median(readouts, 51) * 1e3:.2f} ms")
    print_(f"answer to a moved point (map kept): {median(moved, 51) * 1e3:.2f} ms")
    print_(f"answer to a new width (map redrawn): {median(redrawn, 21) * 1e3:.2f} ms")
    wanted = [Requirement("rate_in_fibre", at_least=2e7)]
    print_(f"(requirements in the question: {len(question.design.requirements)}; e.g. {wanted[0].quantity})")


if __name__ == "__main__":
    maps()
    designs()
