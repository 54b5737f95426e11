"""What a search may change, and between which ends: a row an input, any number can be added."""

from __future__ import annotations

from typing import Any

from ipywidgets import Button, Dropdown, HBox, Label, Text, VBox

from ..domain import InputError
from ..inputs import INPUTS
from ..question import fitting_axis
from ..reading import ReadingError, read_number
from .bind import typed
from .state import State

Ends = tuple[float, float]


class BoundsBox(VBox):
    """Rows of an input with its lowest and its highest value."""

    def __init__(self, state: State, seat: str) -> None:
        self._state, self._seat = state, seat
        self._ends: dict[str, Ends] = {}
        self._wrong: dict[tuple[str, int], str] = {}
        title = Label("may change, from – to")
        title.add_class("x-name")
        numbers = [(entry.label, name) for name, entry in INPUTS.items() if not entry.whole]
        self.more = Dropdown(options=[("add…", ""), *numbers], tooltip="Let another input change")
        self.more.add_class("x-more")
        head = HBox([title, self.more])
        head.add_class("x-head")
        self.rows = VBox()
        super().__init__([head, self.rows])
        self.add_class("x-bounds")
        self.more.observe(self._add, "value")
        for axis in (state.question.y, state.question.x):
            self._ends[axis.name] = (axis.low, axis.high)
        self._draw()

    def bounds(self) -> dict[str, Ends]:
        """The inputs that may change, with their ends, SI. InputError while a box holds no number."""
        for said in self._wrong.values():
            raise InputError(said)
        return dict(self._ends)

    def _add(self, change: dict[str, Any]) -> None:
        name = change["new"]
        if not name:
            return
        self.more.value = ""
        try:
            axis = fitting_axis(self._state.question.design, name)
        except InputError as error:
            self._state.refuse(self._seat, str(error))
            return
        self._ends.setdefault(name, (axis.low, axis.high))
        self._draw()

    def _draw(self) -> None:
        """All rows anew, with what they hold."""
        self._wrong.clear()
        for old in self.rows.children:
            old.close()
        self.rows.children = [self._row(name) for name in self._ends]

    def _row(self, name: str) -> HBox:
        entry = INPUTS[name]
        label = Label(entry.label, tooltip=entry.meaning)
        label.add_class("x-name")
        boxes = []
        for side, word in enumerate(("from", "to")):
            box = Text(
                shown_end(name, self._ends[name][side]),
                continuous_update=False,
                tooltip=f"{entry.label} {word}, {entry.shown if entry.shown != '1' else 'a number'}",
            )
            box.add_class("x-number")
            box.observe(lambda change, side=side: self._typed(name, side, change["new"]), "value")
            boxes.append(box)
        unit = Label("" if entry.shown == "1" else entry.shown)
        unit.add_class("x-unit")
        drop = Button(description="×", tooltip=f"{entry.label} stays as it is")
        drop.add_class("x-back")
        drop.on_click(lambda _: self._remove(name))
        line = HBox([label, boxes[0], Label("–"), boxes[1], unit, drop])
        line.add_class("x-head")
        line.add_class(f"bounds-{name}")
        return line

    def _remove(self, name: str) -> None:
        del self._ends[name]
        self._draw()

    def _typed(self, name: str, side: int, words: str) -> None:
        ends = list(self._ends[name])
        self._wrong.pop((name, side), None)
        try:
            if words != shown_end(name, ends[side]):  # which may have been rounded
                ends[side] = read_number(words, INPUTS[name].shown)
        except ReadingError as error:
            self._wrong[name, side] = str(error)
        self._ends[name] = (ends[0], ends[1])
        said = next(iter(self._wrong.values()), "")
        (self._state.refuse(self._seat, said) if said else self._state.settle(self._seat))


def shown_end(name: str, value: float) -> str:
    """An end as its box shows it: '1e6', not '1e+06'."""
    return typed(name, value, 4).replace("e+0", "e").replace("e+", "e")
