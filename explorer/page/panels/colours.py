"""In what colours: the emitter's line, the resonance, what leaves, the filter."""

from __future__ import annotations

import math

from bqplot import Axis, Figure, LinearScale, Lines
from ipywidgets import HTML, Label, VBox

from ...curves import Colours
from ...question import Answer
from ..look import AMBER, INK, QUIET, RED
from ..state import State


class ColoursPanel(VBox):
    """Spectra over wavelength, each over its own maximum."""

    def __init__(self, state: State) -> None:
        self._drawn: Colours | None = None
        title = Label("In what colours")
        title.add_class("x-title")
        legend = HTML(
            '<span class="x-key x-emitter">emitter</span><span class="x-key x-resonator">resonator'
            '</span><span class="x-key x-leaves">leaves the mode</span>'
        )
        super().__init__([title, legend, self._figure()])
        self.add_class("panel-colours")
        state.on_answer(self._draw)

    def _figure(self) -> Figure:
        self.across = LinearScale(min=0.0, max=1.0)
        scales = {"x": self.across, "y": LinearScale(min=0.0, max=1.06)}
        self.emitter = Lines(
            x=[0, 1], y=[0, 0], scales=scales, colors=[AMBER], fill="bottom",
            fill_colors=[AMBER], fill_opacities=[0.18], stroke_width=2,
        )
        self.passed = Lines(
            x=[0, 1], y=[0, 0], scales=scales, colors=[QUIET], fill="bottom",
            fill_colors=[QUIET], fill_opacities=[0.25], stroke_width=0,
        )
        self.resonator = Lines(
            x=[0, 1], y=[0, 0], scales=scales, colors=[INK], stroke_width=2, line_style="dashed"
        )
        self.leaving = Lines(x=[0, 1], y=[0, 0], scales=scales, colors=[RED], stroke_width=2.5)
        self.axis = Axis(scale=self.across, grid_lines="none", color=INK, label="nm", label_offset="2.4em", label_color=INK)
        return Figure(
            marks=[self.passed, self.emitter, self.resonator, self.leaving], axes=[self.axis],
            fig_margin={"top": 6, "bottom": 42, "left": 18, "right": 20}, animation_duration=0,
        )

    def _draw(self, answer: Answer) -> None:
        seen = answer.colours
        if seen is self._drawn:
            return
        self._drawn = seen
        nanometres = seen.wavelength * 1e9
        # The limits first: new ones make the browser draw every curve again.
        low, high, marks = limits(float(nanometres[0]), float(nanometres[-1]))
        if (low, high) != (self.across.min, self.across.max):
            self.axis.tick_values = marks
            with self.across.hold_sync():
                self.across.min, self.across.max = low, high
        curves = [
            (self.emitter, seen.emitter),
            (self.resonator, seen.resonator),
            (self.leaving, seen.leaving),
        ]
        filtered = bool((seen.passed < 1).any())
        self.passed.visible = filtered
        if filtered:
            curves.append((self.passed, seen.passed))
        for mark, values in curves:
            with mark.hold_sync():
                mark.x, mark.y = nanometres, values


def limits(low: float, high: float) -> tuple[float, float, list[float]]:
    """Ends of the axis just within a range, on round numbers that seldom change; and its ticks."""
    first, *_, last = multiples(low, high, tidy((high - low) / 16))
    return first, last, multiples(first, last, tidy((high - low) / 1.6))


def multiples(low: float, high: float, step: float) -> list[float]:
    """Multiples of a step from low to high, both included."""
    first, last = math.ceil(low / step - 1e-6), math.floor(high / step + 1e-6)
    return [float(f"{i * step:.13g}") for i in range(first, last + 1)]


def tidy(value: float) -> float:
    """The next lower of 1, 2 and 5 times a power of ten."""
    power = 10.0 ** math.floor(math.log10(value))
    return max(size * power for size in (1, 2, 5) if size * power <= value)
