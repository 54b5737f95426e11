"""Sheets: what is too wide for a column opens over map and plots, one at a time, and closes again."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from ipywidgets import Box, Button, HBox, Label, VBox


class Sheet(VBox):
    """A titled panel with a button that closes it; `panel.opened` hears of both."""

    def __init__(self, title: str, panel: Box, close: Callable[[], None]) -> None:
        self.panel: Any = panel
        words = Label(title)
        words.add_class("x-title")
        self.close_button = Button(description="close ×", tooltip=f"{title}: close")
        self.close_button.add_class("x-close")
        head = HBox([words, self.close_button])
        head.add_class("x-head")
        super().__init__([head, panel])
        self.add_class("x-sheet")
        self.layout.display = "none"
        self.close_button.on_click(lambda _: close())

    def show(self, is_open: bool) -> None:
        """Open or close; the panel inside hears of it."""
        self.layout.display = "" if is_open else "none"
        self.panel.opened(is_open)


class Sheets(VBox):
    """All sheets, and the buttons that open them (`buttons`); at most one is open."""

    def __init__(self, panels: dict[str, Box]) -> None:
        self._open = ""
        self.sheets = {
            title: Sheet(title, panel, lambda: self.turn_to("")) for title, panel in panels.items()
        }
        super().__init__(list(self.sheets.values()))
        self.add_class("seat-sheet")
        self.layout.display = "none"
        self.buttons = HBox([self._button(title) for title in panels])
        self.buttons.add_class("x-openers")

    def _button(self, title: str) -> Button:
        button = Button(description=title, tooltip=f"{title}: open or close")
        button.add_class(f"open-{title.split(maxsplit=1)[0].lower()}")
        button.on_click(lambda _: self.turn_to("" if self._open == title else title))
        return button

    def turn_to(self, title: str) -> None:
        """Open one sheet and close the other; '' closes all."""
        before, self._open = self._open, title
        for name, sheet in self.sheets.items():
            if (name == before) != (name == title):
                sheet.show(name == title)
        self.layout.display = "" if title else "none"
        for button in self.buttons.children:
            (button.add_class if button.description == title else button.remove_class)("mod-active")
