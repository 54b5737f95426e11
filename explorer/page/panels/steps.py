"""Undo and redo: two buttons, and their keys."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import anywidget
from ipywidgets import Button, HBox

from ...question import Answer
from ..state import State


class Keys(anywidget.AnyWidget):
    """Hears the keys of undo and redo wherever the page has the focus."""

    _esm = Path(__file__).parent.parent / "keys.js"


class StepsPanel(HBox):
    """A step back, a step forward."""

    def __init__(self, state: State) -> None:
        self._state = state
        self.undo = Button(description="↶", tooltip="Undo the last change (Ctrl+Z)")
        self.redo = Button(description="↷", tooltip="Redo what was undone (Ctrl+Shift+Z)")
        self.shortcuts = Keys()
        super().__init__([self.undo, self.redo, self.shortcuts])
        self.add_class("panel-steps")
        self.undo.on_click(lambda _: state.undo())
        self.redo.on_click(lambda _: state.redo())
        self.shortcuts.on_msg(self._hear)
        state.on_answer(self._draw)

    def _hear(self, _widget: Any, content: dict[str, Any], _buffers: Any) -> None:
        if content.get("kind") == "undo":
            self._state.undo()
        elif content.get("kind") == "redo":
            self._state.redo()

    def _draw(self, _: Answer) -> None:
        history = self._state.history
        for button, steps in ((self.undo, history.past), (self.redo, history.future)):
            if button.disabled != (not steps):
                button.disabled = not steps
