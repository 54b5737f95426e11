"""In what colours: the emitter's line, the resonance, what leaves, the filter."""

from __future__ import annotations

import math
from collections.abc import Sequence
from decimal import Decimal

from ipywidgets import HTML, Label, VBox

from ...curves import Colours
from ...question import Answer
from ..plot import Curve, Frame, Plot
from ..state import State


class ColoursPanel(VBox):
    """Spectra over wavelength, each over its own maximum."""

    def __init__(self, state: State) -> None:
        self._drawn: Colours | None = None
        title = Label("In what colours")
        title.add_class("x-title")
        legend = HTML(
            '<span class="x-key x-emitter">emitter</span><span class="x-key x-resonator">resonator'
            '</span><span class="x-key x-leaves">leaves</span>'
        )
        self.plot = Plot()
        self.plot.add_class("x-plot")
        super().__init__([title, legend, self.plot])
        self.add_class("panel-colours")
        state.on_answer(self._draw)

    def _draw(self, answer: Answer) -> None:
        seen = answer.colours
        if seen is self._drawn:
            return
        self._drawn = seen
        x = seen.wavelength * 1e9
        low, high, marks = limits(float(x[0]), float(x[-1]))
        ends = written([low, high])
        curves = [
            Curve(x, seen.emitter, "amber", 2.0, fill="base"),
            Curve(x, seen.resonator, "ink", 2.0, dashed=True),
            Curve(x, seen.leaving, "red"),
        ]
        if (seen.passed < 1).any():
            curves.insert(0, Curve(x, seen.passed, "quiet", 0.0, fill="base", opacity=0.22))
        ticks = tuple(zip(marks, written(marks), strict=True))
        self.plot.show(
            Frame((low, high), (0.0, 1.06), ticks, label="nm"),
            curves,
            f"Spectra from {ends[0]} to {ends[1]} nm: the emitter's own, the resonance, and what "
            "leaves through the mode, each over its maximum.",
        )


def limits(low: float, high: float) -> tuple[float, float, list[float]]:
    """Ends of the axis just within a range, on round numbers that seldom change; and its ticks."""
    first, *_, last = multiples(low, high, tidy((high - low) / 16))
    step = tidy((high - low) / 1.6)
    marks = multiples(first, last, step)
    return first, last, marks if len(marks) > 1 else multiples(first, last, tidy(step / 1.5))


def multiples(low: float, high: float, step: float) -> list[float]:
    """Multiples of a step from low to high, both included."""
    first, last = math.ceil(low / step - 1e-6), math.floor(high / step + 1e-6)
    return [float(f"{i * step:.13g}") for i in range(first, last + 1)]


def written(values: Sequence[float]) -> list[str]:
    """Numbers in the fewest decimals, the same for all, that still name each as it is."""
    figures = [Decimal(f"{value:.13g}").normalize() for value in values]
    places = max(0, *(-int(figure.as_tuple().exponent) for figure in figures))
    return [f"{figure:.{places}f}" for figure in figures]


def tidy(value: float) -> float:
    """The next lower of 1, 2 and 5 times a power of ten."""
    power = 10.0 ** math.floor(math.log10(value))
    return max(size * power for size in (1, 2, 5) if size * power <= value)
