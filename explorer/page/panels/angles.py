"""Into what angles: the pattern with the collected cone, and what an aperture collects."""

from __future__ import annotations

import math

import numpy as np
from bqplot import Axis, Figure, LinearScale, Lines
from ipywidgets import HBox, Label, VBox

from ...curves import Angles
from ...question import Answer
from ...units import text
from ..look import AMBER, INK, QUIET, RED, SEA
from ..state import State

#: Common numerical apertures of single-mode fibres (common practice, no source).
FIBRE_APERTURES = (0.12, 0.14, 0.2)


class AnglesPanel(VBox):
    """Half-polar pattern on the left, collected share against the aperture on the right."""

    def __init__(self, state: State) -> None:
        self._drawn: Angles | None = None
        title = Label("Into what angles")
        title.add_class("x-title")
        self.text = Label("")
        self.text.add_class("x-plain")
        row = HBox([self._pattern_figure(), self._share_figure()])
        row.add_class("x-figures")
        super().__init__([title, row, self.text])
        self.add_class("panel-angles")
        state.on_answer(self._draw)

    def _pattern_figure(self) -> Figure:
        scales = {"x": LinearScale(min=-1.05, max=1.05), "y": LinearScale(min=0.0, max=1.05)}
        turn = np.linspace(-np.pi / 2, np.pi / 2, 61)
        rim = Lines(x=np.sin(turn), y=np.cos(turn), scales=scales, colors=[QUIET], stroke_width=1)
        self.cone = Lines(
            x=[0, 0], y=[0, 0], scales=scales, colors=[SEA], fill="inside", fill_opacities=[0.16],
            fill_colors=[SEA], stroke_width=1, opacities=[0.5],
        )
        self.lobe = Lines(x=[0, 0], y=[0, 0], scales=scales, colors=[RED], stroke_width=2.5)
        figure = Figure(
            marks=[self.cone, rim, self.lobe],
            fig_margin={"top": 4, "bottom": 6, "left": 4, "right": 4},
            min_aspect_ratio=1.9, max_aspect_ratio=1.9, animation_duration=0,
        )
        figure.add_class("x-pattern")
        return figure

    def _share_figure(self) -> Figure:
        scales = {"x": LinearScale(min=0.0, max=1.0), "y": LinearScale(min=0.0, max=1.05)}
        self._aperture_scale = scales["x"]
        self.share = Lines(x=[0, 1], y=[0, 1], scales=scales, colors=[SEA], stroke_width=2.5)
        self.here = Lines(x=[0, 0], y=[0, 1], scales=scales, colors=[RED], stroke_width=2, line_style="dashed")
        fibres = Lines(
            x=[[a, a] for a in FIBRE_APERTURES], y=[[0, 0.06]] * len(FIBRE_APERTURES),
            scales=scales, colors=[AMBER], stroke_width=2,
        )
        across = Axis(scale=scales["x"], label="NA", label_offset="2.4em", tick_values=[0, 0.5, 1], grid_lines="none", color=INK, label_color=INK)
        up = Axis(scale=scales["y"], side="left", tick_values=[0, 0.5, 1], grid_lines="none", color=INK)
        figure = Figure(
            marks=[fibres, self.share, self.here], axes=[across, up],
            fig_margin={"top": 8, "bottom": 42, "left": 36, "right": 12}, animation_duration=0,
        )
        figure.add_class("x-share")
        return figure

    def _draw(self, answer: Answer) -> None:
        seen = answer.angles
        if seen is self._drawn:
            return
        self._drawn = seen
        turn = np.concatenate([-seen.theta[::-1], seen.theta])
        power = np.concatenate([seen.power[::-1], seen.power])
        with self.lobe.hold_sync():
            self.lobe.x, self.lobe.y = power * np.sin(turn), power * np.cos(turn)
        arc = np.linspace(-seen.edge, seen.edge, 31)
        with self.cone.hold_sync():
            self.cone.x = np.concatenate([[0.0], np.sin(arc), [0.0]])
            self.cone.y = np.concatenate([[0.0], np.cos(arc), [0.0]])
        index = float(answer.values["medium_index"])
        aperture = float(answer.values["numerical_aperture"])
        self._aperture_scale.max = max(1.0, index)
        with self.share.hold_sync():
            self.share.x, self.share.y = seen.aperture, seen.collected
        self.here.x = [aperture, aperture]
        share = answer.outcome["collected_share"]
        gain = answer.outcome["brightness_gain"]
        half = answer.outcome["half_angle"]
        if not math.isnan(share):
            self.text.value = (
                f"NA {text(aperture, '1')} takes {text(share, '%')} of the upward light · "
                f"half-angle {text(half, 'rad')} · brightness gain ×{text(gain, '1')}"
            )
