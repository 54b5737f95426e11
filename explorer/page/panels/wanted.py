"""What is needed: the requirements, each editable, any quantity can become one."""

from __future__ import annotations

import math
from typing import Any

from ipywidgets import Button, Dropdown, HBox, Label, Text, VBox

from ...design import InputError, Requirement
from ...question import Answer, required
from ...reading import ReadingError, read_number
from ...registry import REGISTRY
from ...units import text
from ..state import State

#: Units in which a limit is typed.
TYPED = {"1/s": "M/s", "rad": "°", "s": "ns", "m": "nm", "rad/s": "rad/s", "1": "1"}


class WantedPanel(VBox):
    """A row a requirement, and a menu to add one."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._drawn: tuple[Requirement, ...] | None = None
        title = Label("Wanted")
        title.add_class("x-title")
        options = [("add…", "")] + [
            (quantity.label, quantity.name)
            for quantity in REGISTRY.quantities.values()
            if quantity.kind == "number"
        ]
        self.more = Dropdown(options=options, tooltip="Require another quantity")
        self.more.add_class("x-more")
        head = HBox([title, self.more])
        head.add_class("x-head")
        self.rows = VBox()
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        super().__init__([head, self.rows, self.wrong])
        self.add_class("panel-wanted")
        self.more.observe(self._add, "value")
        state.on_answer(self._draw)

    def _draw(self, answer: Answer) -> None:
        entries = answer.question.design.requirements
        if entries != self._drawn:
            self._drawn = entries
            for old in self.rows.children:
                old.close()
            self.rows.children = [self._row(index, entry) for index, entry in enumerate(entries)]
        for line, entry in zip(self.rows.children, entries, strict=True):
            met = bool(entry.met(answer.outcome[entry.quantity]))
            (line.remove_class if met else line.add_class)("x-missed")

    def _row(self, index: int, entry: Requirement) -> HBox:
        quantity = REGISTRY.quantities[entry.quantity]
        label = Label(quantity.label, tooltip=quantity.doc)
        label.add_class("x-name")
        sense = Button(description=entry.sense, tooltip="At least or at most: press to swap")
        sense.add_class("x-sense")
        shown = text(entry.limit, quantity.unit)
        box = Text(shown, continuous_update=False, tooltip=f"Limit of {quantity.label}")
        box.add_class("x-number")
        drop = Button(description="×", tooltip=f"No longer require {quantity.label}")
        drop.add_class("x-back")
        sense.on_click(lambda _: self._replace(index, _swapped(entry)))
        drop.on_click(lambda _: self._replace(index, None))
        box.observe(lambda change: self._typed(index, entry, change["new"]), "value")
        line = HBox([label, sense, box, drop])
        line.add_class("x-head")
        line.add_class(f"wanted-{entry.quantity}")
        return line

    def _typed(self, index: int, entry: Requirement, typed: str) -> None:
        unit = REGISTRY.quantities[entry.quantity].unit
        try:
            limit = read_number(typed, TYPED.get(unit, unit))
            side = "at_most" if entry.at_least is None else "at_least"
            changed = Requirement(entry.quantity, **{side: limit})
        except (ReadingError, InputError) as error:
            self.wrong.value = str(error)
            return
        self._replace(index, changed)

    def _replace(self, index: int, entry: Requirement | None) -> None:
        self.wrong.value = ""
        self._state.ask(design=required(self._state.question.design, entry, index))

    def _add(self, change: dict[str, Any]) -> None:
        name = change["new"]
        if not name:
            return
        self.more.value = ""
        value = self._state.reading(name)
        entry = Requirement(name, at_least=0.0 if math.isnan(value) else value)
        self._state.ask(design=required(self._state.question.design, entry))


def _swapped(entry: Requirement) -> Requirement:
    if entry.at_least is None:
        return Requirement(entry.quantity, at_least=entry.limit)
    return Requirement(entry.quantity, at_most=entry.limit)
