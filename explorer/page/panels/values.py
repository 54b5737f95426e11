"""The inputs: main sliders always visible, the others in groups that open."""

from __future__ import annotations

from ipywidgets import Box, Button, HBox, Label, VBox

from ...inputs import GROUPS, INPUTS
from ..bind import row
from ..state import State

#: Sliders that are always visible.
MAIN = (
    "fast_linewidth",
    "quality_factor",
    "mode_volume",
    "resonance_wavelength",
    "numerical_aperture",
)

TITLES = {
    "emitter": "Emitter, more",
    "resonator": "Resonator, more",
    "collection": "Collection",
    "excitation": "Excitation",
}


class Group(VBox):
    """The other inputs of one group; its rows are made when it is first opened."""

    def __init__(self, state: State, group: str) -> None:
        self._state = state
        self._names = [
            entry.name
            for entry in INPUTS.values()
            if entry.group == group and entry.name not in MAIN and not entry.types
        ]
        self.title = TITLES[group]
        self.head = Button(description=f"▸ {self.title}", tooltip=f"{self.title}: open or close")
        self.head.add_class("x-group")
        self.rows = VBox()
        self.rows.layout.display = "none"
        super().__init__([self.head, self.rows])
        self.add_class(f"group-{group}")
        self.head.on_click(self._toggle)

    def _toggle(self, _: Button) -> None:
        opening = self.rows.layout.display == "none"
        if opening and not self.rows.children:
            self.rows.children = [row(self._state, name) for name in self._names]
        self.rows.layout.display = "" if opening else "none"
        self.head.description = f"{'▾' if opening else '▸'} {self.title}"


class ValuesPanel(VBox):
    """Main sliders and groups; `beside` the title stands what another panel brings."""

    def __init__(self, state: State, *beside: Box) -> None:
        words = Label("Design")
        words.add_class("x-title")
        title = HBox([words, *beside])
        title.add_class("x-head")
        main = VBox([row(state, name) for name in MAIN])
        main.add_class("x-main")
        self.groups = {group: Group(state, group) for group in GROUPS}
        super().__init__([title, main, *self.groups.values()])
        self.add_class("panel-values")
