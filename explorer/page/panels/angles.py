"""Into what angles: the pattern with the collected cone, and what an aperture collects."""

from __future__ import annotations

import math

import numpy as np
from ipywidgets import HBox, Label, VBox

from ...curves import Angles
from ...question import Answer
from ...units import text
from ..plot import Curve, Frame, Plot
from ..state import State

#: Common numerical apertures of single-mode fibres (common practice, no source).
FIBRE_APERTURES = (0.12, 0.14, 0.2)

_TURN = np.linspace(-np.pi / 2, np.pi / 2, 61)
_RIM = Curve(np.sin(_TURN), np.cos(_TURN), "quiet", 1.0)


class AnglesPanel(VBox):
    """Half-polar pattern on the left, collected share against the aperture on the right."""

    def __init__(self, state: State) -> None:
        self._drawn: Angles | None = None
        title = Label("Into what angles")
        title.add_class("x-title")
        self.text = Label("")
        self.text.add_class("x-plain")
        self.pattern, self.share = Plot(), Plot()
        self.pattern.add_class("x-pattern")
        self.share.add_class("x-share")
        row = HBox([self.pattern, self.share])
        row.add_class("x-figures")
        super().__init__([title, row, self.text])
        self.add_class("panel-angles")
        state.on_answer(self._draw)

    def _draw(self, answer: Answer) -> None:
        seen = answer.angles
        if seen is not self._drawn:
            self._drawn = seen
            self._draw_pattern(seen, answer)
            self._draw_share(seen, answer)
        share = answer.outcome["collected_share"]
        if not math.isnan(share):
            aperture = float(answer.values["numerical_aperture"])
            self.text.value = (
                f"NA {text(aperture, '1', 2)}: {text(share, '%')} · half-angle "
                f"{text(answer.outcome['half_angle'], 'rad')} · gain "
                f"×{text(answer.outcome['brightness_gain'], '1')}"
            )

    def _draw_pattern(self, seen: Angles, answer: Answer) -> None:
        turn = np.concatenate([-seen.theta[::-1], seen.theta])
        power = np.concatenate([seen.power[::-1], seen.power])
        arc = np.linspace(-seen.edge, seen.edge, 31)
        cone = Curve(
            np.concatenate([[0.0], np.sin(arc), [0.0]]),
            np.concatenate([[0.0], np.cos(arc), [0.0]]),
            "sea", 1.0, fill="inside", opacity=0.16,
        )  # fmt: skip
        lobe = Curve(power * np.sin(turn), power * np.cos(turn), "red")
        self.pattern.show(
            Frame((-1.03, 1.03), (0.0, 1.03), square=True),
            [cone, _RIM, lobe],
            f"Angular pattern; half-angle {text(answer.outcome['half_angle'], 'rad')}, the aperture "
            f"takes {text(seen.edge, 'rad')} to each side.",
        )

    def _draw_share(self, seen: Angles, answer: Answer) -> None:
        widest = max(1.0, float(answer.values["medium_index"]))
        aperture = float(answer.values["numerical_aperture"])
        here = Curve([aperture, aperture], [0.0, 1.0], "red", 2.0, dashed=True)
        fibres = [Curve([a, a], [0.0, 0.07], "amber", 2.0) for a in FIBRE_APERTURES]
        share = Curve(seen.aperture, seen.collected, "sea")
        self.share.show(
            Frame(
                (0.0, widest),
                (0.0, 1.05),
                tuple((mark, f"{mark:g}") for mark in (0.0, 0.5, 1.0, 1.5) if mark <= widest),
                ((0.0, "0"), (0.5, "0.5"), (1.0, "1")),
                label="NA",
            ),
            [*fibres, share, here],
            "Collected share of the upward light against the numerical aperture; amber: common "
            "apertures of single-mode fibres.",
        )
