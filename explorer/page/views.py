"""Views of one column: buttons on top, one view below them; only the shown one is kept up to date."""

from __future__ import annotations

from collections.abc import Sequence

from ipywidgets import Box, HBox, ToggleButton, VBox


class Views(VBox):
    """Named stacks of panels, one of which is shown; a panel with `opened` hears of it."""

    def __init__(self, views: dict[str, Sequence[Box]]) -> None:
        self.stacks = {name: VBox(list(panels)) for name, panels in views.items()}
        for stack in self.stacks.values():
            stack.add_class("x-view")
        self.buttons = {
            name: ToggleButton(description=name, tooltip=f"Show: {name}") for name in views
        }
        switch = HBox(list(self.buttons.values()))
        switch.add_class("x-switch")
        super().__init__([switch, *self.stacks.values()])
        self.add_class("x-views")
        self.shown = ""
        self._quiet = False
        for name, button in self.buttons.items():
            button.observe(lambda _, name=name: self._pressed(name), "value")
        self.turn_to(next(iter(views)))

    def _pressed(self, name: str) -> None:
        if not self._quiet:
            self.turn_to(name)

    def turn_to(self, name: str) -> None:
        """Show one view; pressing the shown one again changes nothing."""
        before, self.shown = self.shown, name
        self._quiet = True
        for other, button in self.buttons.items():
            button.value = other == name
            self.stacks[other].layout.display = "" if other == name else "none"
        self._quiet = False
        if before != name:
            self._tell(before, False)
            self._tell(name, True)

    def _tell(self, name: str, is_open: bool) -> None:
        for panel in self.stacks[name].children if name else ():
            if hasattr(panel, "opened"):
                panel.opened(is_open)
