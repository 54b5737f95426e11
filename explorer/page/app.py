"""The page: which panel sits where."""

from __future__ import annotations

from pathlib import Path

from ipywidgets import HTML, Box, VBox

from ..question import Question
from ..scenario import first_question
from .panels.angles import AnglesPanel
from .panels.budget import BudgetPanel
from .panels.cautions import CautionsPanel
from .panels.colours import ColoursPanel
from .panels.cut import CutPanel
from .panels.emitter import EmitterPanel
from .panels.files import FilesPanel
from .panels.headline import HeadlinePanel
from .panels.map import MapPanel
from .panels.values import ValuesPanel
from .panels.wanted import WantedPanel
from .state import State


def _seat(name: str, *panels: Box) -> VBox:
    box = VBox(list(panels))
    box.add_class(f"seat-{name}")
    return box


class Explorer(Box):
    """The whole page for one question; `state` is what code talks to."""

    def __init__(self, question: Question | None = None) -> None:
        self.state = State(question or first_question())
        state = self.state
        style = HTML(f"<style>{(Path(__file__).parent / 'page.css').read_text('utf-8')}</style>")
        style.layout.display = "none"
        super().__init__(
            [
                style,
                _seat("top", HeadlinePanel(state), FilesPanel(state)),
                _seat("left", WantedPanel(state), EmitterPanel(state), ValuesPanel(state)),
                _seat("middle", MapPanel(state)),
                _seat(
                    "right",
                    BudgetPanel(state),
                    AnglesPanel(state),
                    ColoursPanel(state),
                    CutPanel(state),
                ),
                _seat("foot", CautionsPanel(state)),
            ]
        )
        self.add_class("explorer")
