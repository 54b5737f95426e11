"""The page: which panel sits where."""

from __future__ import annotations

from pathlib import Path

import anywidget
from ipywidgets import HTML, Box, HBox, VBox

from ..question import Question
from ..scenario import first_question
from .panels.angles import AnglesPanel
from .panels.budget import BudgetPanel
from .panels.candidates import CandidatesPanel
from .panels.cautions import CautionsPanel
from .panels.colours import ColoursPanel
from .panels.compare import ComparePanel
from .panels.cut import CutPanel
from .panels.decision import DecisionPanel
from .panels.devices import DevicesPanel
from .panels.emitter import EmitterPanel
from .panels.files import FilesPanel
from .panels.headline import HeadlinePanel
from .panels.keeper import KeeperPanel
from .panels.keylink import KeyLinkPanel
from .panels.limits import LimitsPanel
from .panels.map import MapPanel
from .panels.measured import MeasuredPanel
from .panels.search import SearchPanel
from .panels.shortlist import ShortlistPanel
from .panels.steps import StepsPanel
from .panels.values import ValuesPanel
from .panels.wanted import WantedPanel
from .sheets import Sheets
from .state import State
from .views import Views


def _seat(name: str, *panels: Box) -> VBox:
    box = VBox(list(panels))
    box.add_class(f"seat-{name}")
    return box


class Look(anywidget.AnyWidget):
    """Light or dark, by a press; this browser remembers it. The kernel has no part in it."""

    _esm = Path(__file__).parent / "look.js"


class Explorer(Box):
    """The whole page; `state` is what code talks to.

    question: what it shows. Without one it shows what this browser kept of the last visit, and at a
    first visit the demonstration.
    """

    def __init__(self, question: Question | None = None) -> None:
        self.state = State(question or first_question())
        state = self.state
        style = HTML(f"<style>{(Path(__file__).parent / 'page.css').read_text('utf-8')}</style>")
        style.layout.display = "none"
        sheets = Sheets(
            {
                "Candidates": CandidatesPanel(state),
                "Published devices": DevicesPanel(state),
                "Measured data": MeasuredPanel(state),
                "Decision": DecisionPanel(state),
            }
        )
        light = (BudgetPanel(state), AnglesPanel(state), ColoursPanel(state), CutPanel(state))
        self.views = Views(
            {
                "light": light,
                "compare": [ComparePanel(state)],
                "limits": [LimitsPanel(state)],
                "search": [SearchPanel(state)],
            }
        )
        keeper = KeeperPanel(state, keeps=question is None)
        shelf = HBox([sheets.buttons, ShortlistPanel(state), Look(), keeper, FilesPanel(state)])
        shelf.add_class("x-shelf")
        super().__init__(
            [
                style,
                _seat("top", HeadlinePanel(state)),
                _seat(
                    "left",
                    WantedPanel(state),
                    KeyLinkPanel(state),
                    EmitterPanel(state),
                    ValuesPanel(state, StepsPanel(state)),
                ),
                _seat("middle", MapPanel(state)),
                _seat("right", self.views),
                sheets,
                _seat("foot", shelf, CautionsPanel(state)),
            ]
        )
        self.add_class("explorer")
