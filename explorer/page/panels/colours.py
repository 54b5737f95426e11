"""In what colours: the emitter's line, the resonance, what leaves, the filter."""

from __future__ import annotations

from ipywidgets import HTML, Label, VBox

from ...curves import Colours
from ...question import Answer
from ..plot import Curve, Frame, Plot
from ..state import State
from ..ticks import limits, written


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
