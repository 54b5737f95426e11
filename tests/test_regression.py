"""The engine against certified values of a public set of nonlinear-regression problems.

Data, starting points and certified values: NIST Statistical Reference Datasets, Nonlinear Regression;
each file in tests/regression says where its numbers were seen. Agreement is counted in digits,
−log10 of the relative difference.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Generator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from explorer.measured.engine import Fit, Parameter, fit_steps
from explorer.measured.noise import Noise

Array = NDArray[np.float64]
FILES = sorted((Path(__file__).parent / "regression").glob("*.toml"))

MODELS: dict[str, Callable[[Array, Array], Array]] = {
    "Misra1a": lambda b, x: b[0] * (1 - np.exp(-b[1] * x)),
    "Lanczos3": lambda b, x: (
        b[0] * np.exp(-b[1] * x) + b[2] * np.exp(-b[3] * x) + b[4] * np.exp(-b[5] * x)
    ),
    "Eckerle4": lambda b, x: b[0] / b[1] * np.exp(-0.5 * ((x - b[2]) / b[1]) ** 2),
}

#: Digits that at least agree: of parameters, of their standard deviations, of the sum of squares. A
#: little below what was reached.
DIGITS = {"Misra1a": (8, 8, 10), "Lanczos3": (6, 6, 9), "Eckerle4": (7.5, 7.5, 10)}


def problem(file: Path) -> dict[str, Any]:
    return tomllib.loads(file.read_text(encoding="utf-8"))


def digits(found: Any, certified: Any) -> float:
    """The fewest digits in which any of the numbers agree."""
    wanted = np.array(certified, dtype=float)
    return float(np.min(-np.log10(np.abs(np.asarray(found) / wanted - 1) + 1e-16)))


def drained(steps: Generator[None, None, Fit]) -> Fit:
    while True:
        try:
            next(steps)
        except StopIteration as end:
            fit: Fit = end.value
            return fit


@pytest.mark.parametrize("start", [0, 1], ids=["first start", "second start"])
@pytest.mark.parametrize("file", FILES, ids=lambda file: file.stem)
# The certified starting points are far off: exponentials overflow on the way.
@pytest.mark.filterwarnings("ignore:overflow:RuntimeWarning")
def test_certified_values(file: Path, start: int) -> None:
    given = problem(file)
    x, y = np.array(given["x"]), np.array(given["y"])
    first = [float(value) for value in given["starts"][start]]
    parameters = [Parameter(f"b{at + 1}", value, 0.1 * value) for at, value in enumerate(first)]
    model = MODELS[given["name"]]
    fit = drained(fit_steps(lambda b: model(b, x), Noise(y), parameters))
    wanted = DIGITS[given["name"]]
    assert fit.valid
    assert digits(fit.values, given["parameters"]) >= wanted[0]
    assert digits(fit.errors, given["deviations"]) >= wanted[1]
    assert digits([fit.deviance], [given["sum_of_squares"]]) >= wanted[2]


def test_both_kinds_of_problem_are_there() -> None:
    kinds = {problem(file)["kind"] for file in FILES}
    assert kinds == {"exponential", "peak"}
    for file in FILES:
        given = problem(file)
        assert len(given["x"]) == len(given["y"]) == given["observations"]
        assert given["observations"] - len(given["parameters"]) == given["degrees"]
