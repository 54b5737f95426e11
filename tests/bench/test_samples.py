"""Prints what a slider step costs with a measured spectrum of 4000 samples, beside a single line.

In turn, so that both see the same load: until the readouts are there (first), until a map is
(drawn, in fewer cells where it is slow), and until the map is whole; medians, and their ratios. Times
are those of the thread, so what others on the machine take does not count.
"""

from __future__ import annotations

import statistics
import time
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from explorer import Samples
from explorer.answers import Answers
from explorer.question import Question
from explorer.scenario import first_question

pytestmark = pytest.mark.bench

ROUNDS = 9
STAGES = ("first", "drawn", "whole")

#: Inputs that are stepped, and what one step multiplies them by.
STEPS = {
    "quality_factor": 1.01,
    "mode_volume": 1.01,
    "numerical_aperture": 1.005,
    "resonance_wavelength": 1.0002,
    "slow_linewidth": 1.01,
    "repetition_rate": 1.01,
}


def measured(seed: int) -> Samples:
    """A line of 8 nm with a phonon wing, 4000 samples over 120 nm, with counting noise.

    Another seed is another spectrum, so that no case finds the tables of the one before.
    """
    offsets = np.linspace(-60e-9, 60e-9, 4000)
    shape = 1 / (1 + (offsets / 4e-9) ** 2) + 0.2 / (1 + ((offsets - 15e-9) / 8e-9) ** 2)
    return Samples(offsets, np.random.default_rng(seed).poisson(1e4 * shape))


def question(spectrum: Samples | None, slow: float, quality: float) -> Question:
    """The demonstration, with another spectrum and another resonator."""
    asked = first_question()
    left = ("spectrum", "fast_linewidth")
    point: dict[str, Any] = {k: v for k, v in asked.design.point.items() if k not in left}
    point |= {"fast_linewidth": 8e-9} if spectrum is None else {"spectrum": spectrum}
    point |= {"slow_linewidth": slow, "quality_factor": quality}
    return replace(asked, design=replace(asked.design, point=point))


def stages(answers: Answers, asked: Question) -> list[float]:
    """Times of the stages of one answer [ms], not counting what others on the machine take."""
    start, found = time.thread_time(), [0.0] * len(STAGES)
    for answer in answers.steps(asked):
        now = 1000 * (time.thread_time() - start)
        for index, there in enumerate((True, answer.map is not None, answer.whole)):
            if there and not found[index]:
                found[index] = now
        if answer.whole:
            break
    return found


def stepped(kinds: dict[str, Question], name: str, factor: float) -> dict[str, list[float]]:
    """Medians of the stages of both kinds, stepped in turn; the first step is not counted."""
    pages = {kind: Answers() for kind in kinds}
    times: dict[str, list[list[float]]] = {kind: [] for kind in kinds}
    for number in range(-1, ROUNDS + 1):
        for kind, asked in kinds.items():
            base = float(asked.design.evaluation.value(name))
            value = base * factor ** (number + 1)
            found = stages(
                pages[kind], replace(asked, design=asked.design.with_values(**{name: value}))
            )
            if number > 0:
                times[kind].append(found)
    return {
        kind: [statistics.median(each) for each in zip(*times[kind], strict=True)] for kind in kinds
    }


@pytest.mark.parametrize("slow", [0.0, 5e-9])
@pytest.mark.parametrize("quality", [25.0, 1e5])
def test_steps(slow: float, quality: float, capsys: pytest.CaptureFixture[str]) -> None:
    kinds = {
        "line": question(None, slow, quality),
        "samples": question(measured(int(quality + 1e9 * slow)), slow, quality),
    }
    lines = [f"\nslow width {slow * 1e9:g} nm, Q {quality:g}: line / samples [ms], ratio"]
    lines.append(f"{'step of':22}" + "".join(f"{stage:>26}" for stage in STAGES))
    for name, factor in STEPS.items():
        if slow == 0 and name == "slow_linewidth":
            continue
        found = stepped(kinds, name, factor)
        cells = [
            f"{line:8.1f} /{samples:7.1f} {samples / line:8.2f}"
            for line, samples in zip(found["line"], found["samples"], strict=True)
        ]
        lines.append(f"{name:22}" + "".join(f"{cell:>26}" for cell in cells))
        assert all(time > 0 for times in found.values() for time in times)
    with capsys.disabled():
        print("\n".join(lines))
