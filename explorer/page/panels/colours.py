"""In what colours: the emitter's line, the resonance, what leaves, the filter."""

from __future__ import annotations

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
        axis = Axis(scale=self.across, num_ticks=4, grid_lines="none", color=INK, label="nm", label_offset="2.1em", label_color=INK)
        return Figure(
            marks=[self.passed, self.emitter, self.resonator, self.leaving], axes=[axis],
            fig_margin={"top": 6, "bottom": 40, "left": 18, "right": 20}, animation_duration=0,
        )

    def _draw(self, answer: Answer) -> None:
        seen = answer.colours
        if seen is self._drawn:
            return
        self._drawn = seen
        nanometres = seen.wavelength * 1e9
        filtered = bool((seen.passed < 1).any())
        curves = (
            (self.emitter, seen.emitter),
            (self.resonator, seen.resonator),
            (self.leaving, seen.leaving),
            (self.passed, seen.passed if filtered else 0 * seen.passed),
        )
        for mark, values in curves:
            with mark.hold_sync():
                mark.x, mark.y = nanometres, values
        with self.across.hold_sync():
            self.across.min, self.across.max = float(nanometres[0]), float(nanometres[-1])
