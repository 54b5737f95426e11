"""The cautions: those of the point, and the standing ones."""

from __future__ import annotations

from html import escape

from ipywidgets import HTML, Button, HBox, VBox

from ...advice import record_cautions
from ...question import Answer
from ...registry import REGISTRY
from ..state import State

STANDING = (
    "Planning estimates. Lasers here are often class 3B or 4 (IEC 60825-1), some emitters toxic, some "
    "cryogenic: follow the laser-safety officer, local codes, safety data sheets."
)


class CautionsPanel(VBox):
    """A short standing caution, and a press that opens the list for this point."""

    def __init__(self, state: State) -> None:
        self._state = state
        standing = HTML(f'<p class="x-standing">{escape(STANDING)}</p>')
        self.count = Button(description="", tooltip="Cautions for this design point: open or close")
        self.count.add_class("x-count")
        self.list = HTML()
        self.list.add_class("x-cautions")
        self.list.layout.display = "none"
        line = HBox([standing, self.count])
        line.add_class("x-foot")
        super().__init__([self.list, line])
        self.add_class("panel-cautions")
        self.count.on_click(self._toggle)
        state.on_answer(self._draw)

    def _toggle(self, _: Button) -> None:
        hidden = self.list.layout.display == "none"
        self.list.layout.display = "" if hidden else "none"

    def _draw(self, answer: Answer) -> None:
        sentences = [REGISTRY.cautions[name].sentence for name in answer.cautions]
        sentences += [text for _, text in record_cautions(answer.question.design)]
        number = len(sentences)
        words = {0: "no caution", 1: "1 caution"}.get(number, f"{number} cautions")
        self.count.description = f"{words} for this point"
        items = "".join(f"<li>{escape(text)}</li>" for text in sentences)
        body = f"<ul>{items}</ul>" if items else "<p>None of the model's cautions holds here.</p>"
        if body != self.list.value:
            self.list.value = body
