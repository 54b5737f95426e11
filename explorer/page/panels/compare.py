"""Compare: the present design against a kept one, live; and the order and names of those kept."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from ipywidgets import HTML, Button, Dropdown, HBox, Text, VBox

from ...design import Design
from ...domain import InputError
from ...question import Answer
from ..comparing import compared, names_of
from ..shortlist import short_name
from ..state import State

NOTHING = (
    '<p class="x-plain">No design is kept yet: press “keep this” at the foot, change something, and '
    "every number shows its change here.</p>"
)


class ComparePanel(VBox):
    """A menu of kept designs, two tables, and what can be done with a kept one."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._open = self._quiet = False
        self._outcome: dict[str, Any] = {}
        self._of: Any = None
        self.menu = Dropdown(options=[("", "")], tooltip="Kept design to compare with")
        self.menu.add_class("x-menu")
        self.name = Text("", continuous_update=False, tooltip="Name of this kept design")
        self.earlier = Button(description="◂", tooltip="One letter earlier")
        self.later = Button(description="▸", tooltip="One letter later")
        self.drop = Button(description="delete", tooltip="Keep this design no longer")
        self.back = Button(description="bring back", tooltip="Bring back the design deleted last")
        self.tools = HBox([self.name, self.earlier, self.later, self.drop])
        self.tools.add_class("x-tools")
        self.table = HTML(NOTHING)
        super().__init__([self.menu, self.tools, self.back, self.table])
        self.add_class("panel-compare")
        self.menu.observe(lambda _: self._chosen(), "value")
        self.name.observe(lambda change: self._named(change["new"]), "value")
        self.earlier.on_click(lambda _: self._move(-1))
        self.later.on_click(lambda _: self._move(+1))
        self.drop.on_click(lambda _: state.shortlist.drop(self.menu.value))
        self.back.on_click(lambda _: state.shortlist.bring_back())
        state.shortlist.on_change(self._listed)
        state.on_answer(self._draw)
        self._listed()

    def opened(self, is_open: bool) -> None:
        """Hear that the view is opened or closed; nothing is compared in a closed one."""
        self._open = is_open
        self._draw(self._state.answer)

    def _listed(self) -> None:
        """Follow the shortlist: the menu keeps its letter where it can."""
        kept = self._state.shortlist.kept
        letter = self.menu.value if self.menu.value in kept else next(iter(kept), "")
        self._quiet = True
        self.menu.options = [
            (f"against {one}: {short_name(design)}", one) for one, design in kept.items()
        ] or [("", "")]
        self.menu.value = letter
        self._quiet = False
        self.menu.layout.display = self.tools.layout.display = "" if kept else "none"
        self.back.layout.display = "" if self._state.shortlist.deleted else "none"
        self._chosen()

    def _chosen(self) -> None:
        if self._quiet:
            return
        kept = self._state.shortlist.kept
        design = kept.get(self.menu.value)
        letters = list(kept)
        self._quiet = True
        self.name.value = design.name if design else ""
        self._quiet = False
        self.earlier.disabled = not letters or self.menu.value == letters[0]
        self.later.disabled = not letters or self.menu.value == letters[-1]
        self._draw(self._state.answer)

    def _named(self, words: str) -> None:
        design = self._state.shortlist.kept.get(self.menu.value)
        if self._quiet or design is None:
            return
        try:
            named = replace(design, name=words)
        except InputError as error:
            self._state.refuse("", str(error))
            return
        self._state.shortlist.exchange(self.menu.value, named)

    def _move(self, by: int) -> None:
        letter = self._state.shortlist.move(self.menu.value, by)
        self.menu.value = letter

    def _draw(self, answer: Answer) -> None:
        if not self._open:
            return
        design = self._state.shortlist.kept.get(self.menu.value)
        if design is None:
            words = NOTHING
        else:
            words = compared(answer, self.menu.value, design, self._outcomes(answer, design))
        if words != self.table.value:
            self.table.value = words

    def _outcomes(self, answer: Answer, design: Design) -> dict[str, Any]:
        """Quantities of the kept design, worked out once."""
        names = names_of(answer)
        if self._of != (design, names):
            self._of, self._outcome = (design, names), design.outcome(list(names))
        return self._outcome
