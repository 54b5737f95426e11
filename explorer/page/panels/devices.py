"""Published devices: what the model predicts for them, beside what was measured."""

from __future__ import annotations

from html import escape

from ipywidgets import HTML, VBox

from ...prediction import prediction_steps, predictions, unpredicted
from ..forest import html
from ..state import State
from ..work import Work

WORDS = (
    "Each published enhancement is predicted as its source defines it, from the published Q, V and "
    "emitter; bars are nine tenths of what the unknowns leave open. Nothing is fitted. A filled mark "
    "was seen in its source, an open one is from memory; red misses its bar, for the reason given."
)


class DevicesPanel(VBox):
    """Drawing, table, and what is not predicted; made when first opened."""

    def __init__(self, state: State) -> None:
        del state  # predictions know no design
        self._work = Work()
        self._made = False
        self.text = HTML()
        self.text.add_class("x-predictions")
        super().__init__([self.text])
        self.add_class("panel-devices")

    def opened(self, is_open: bool) -> None:
        """Called when the sheet that holds this opens or closes."""
        if is_open and not self._made:
            self._made = True
            self.text.value = "<p>working …</p>"
            self._work.start(prediction_steps(), lambda _: self._show())

    def _show(self) -> None:
        self.text.value = f"<p>{escape(WORDS)}</p>{html(predictions(), unpredicted())}"
