"""The emitter: menu of the published ones, with their sources beside it."""

from __future__ import annotations

from html import escape
from typing import Any

from ipywidgets import HTML, Button, Dropdown, HBox, Label, VBox

from ...catalogue import emitters
from ...inputs import EMITTER, INPUTS
from ...question import Answer
from ..records import edited
from ..state import State


class EmitterPanel(VBox):
    """Menu of emitters; presses show where each number comes from, and undo what was edited."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._syncing = False
        self._edited = ""
        title = Label("Emitter")
        title.add_class("x-title")
        self.sources = Button(
            description="sources", tooltip="Where the emitter's numbers come from"
        )
        self.sources.add_class("x-link")
        self.published = Button(
            description="as published", tooltip="All values of this emitter as its record has them"
        )
        self.published.add_class("x-link")
        self.published.layout.display = "none"
        head = HBox([title, self.published, self.sources])
        head.add_class("x-head")
        self.menu = Dropdown(options=_options(""), tooltip="Published emitters")
        self.menu.add_class("x-menu")
        self.text = HTML()
        self.text.add_class("x-sources")
        self.text.layout.display = "none"
        super().__init__([head, self.menu, self.text])
        self.add_class("panel-emitter")
        self.sources.on_click(self._toggle)
        self.published.on_click(lambda _: state.take_record("emitter", self.menu.value))
        state.on_answer(self._draw)
        state.on_problem(lambda: self._draw(state.answer))  # what was refused is not shown
        self.menu.observe(self._chosen, "value")

    def _toggle(self, _: Button) -> None:
        hidden = self.text.layout.display == "none"
        self.text.layout.display = "" if hidden else "none"
        self._write(self._state.answer)

    def _chosen(self, change: dict[str, Any]) -> None:
        if self._syncing:
            return
        self._state.take_record("emitter", change["new"])

    def _draw(self, answer: Answer) -> None:
        design = answer.question.design
        self._syncing = True
        marked = design.emitter if edited(design) else ""
        if marked != self._edited:
            self._edited = marked
            self.menu.options = _options(marked)
            self.published.layout.display = "" if marked else "none"
        key = design.emitter if design.emitter in emitters() else ""
        if self.menu.value != key:
            self.menu.value = key
        self._syncing = False
        self._write(answer)

    def _write(self, answer: Answer) -> None:
        if self.text.layout.display == "none":
            return
        design = answer.question.design
        lines = []
        record = emitters().get(design.emitter)
        if record is not None:
            lines += [record.summary, record.doubts, record.caution]
        body = "".join(f"<p>{escape(line)}</p>" for line in lines if line)
        rows = "".join(
            f"<li><b>{escape(INPUTS[row.name].label)}</b>: {escape(design.origin(row.name).kind)}"
            f"{escape('; ' + design.origin(row.name).where if design.origin(row.name).where else '')}</li>"
            for row in EMITTER
        )
        self.text.value = f"{body}<ul>{rows}</ul>"


def _options(marked: str) -> list[tuple[str, str]]:
    """Lines of the menu; the record of one key is no longer as published."""
    named = [
        (f"{entry.name}, edited" if key == marked else entry.name, key)
        for key, entry in emitters().items()
    ]
    return [("own values", ""), *named]
