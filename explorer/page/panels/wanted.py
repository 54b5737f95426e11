"""What is needed: the requirements, each editable, any quantity can become one."""

from __future__ import annotations

import math
import re
from dataclasses import replace
from typing import Any

from ipywidgets import Button, Dropdown, HBox, Label, Text, VBox

from ...design import Design, InputError, Requirement
from ...question import Answer
from ...reading import ReadingError, read_number
from ...registry import REGISTRY
from ...sentence import quantity_label
from ...units import text
from ...yields import PASSING
from ..state import State

#: Units in which a limit is typed where none is shown.
TYPED = {"1/s": "M/s", "rad": "°", "s": "ns", "m": "nm", "rad/s": "rad/s", "1": "1"}

#: The panel's own name among the problems of the page.
SEAT = "wanted"

#: A number as a box shows it, between what stands before and after it.
_SHOWN = re.compile(r"(?P<before>2π × )?[−-]?[\d.]+(?:×10\^-?\d+)?(?P<after>.*)")

#: A number as it is typed, without a unit.
_BARE = re.compile(r"[\d\s.,+−\-/eE×x*·^]*\d[\d\s.,+−\-/eE×x*·^]*")


class WantedPanel(VBox):
    """A row a requirement, and a menu to add one."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._drawn: Any = None
        self._shown = ""
        title = Label("Wanted")
        title.add_class("x-title")
        options = [("add…", ""), (REGISTRY.shown(PASSING).label, PASSING)] + [
            (quantity.label, quantity.name)
            for quantity in REGISTRY.quantities.values()
            if quantity.kind == "number"
        ]
        self.more = Dropdown(options=options, tooltip="Require another quantity")
        self.more.add_class("x-more")
        head = HBox([title, self.more])
        head.add_class("x-head")
        self.rows = VBox()
        self.share = self._share_row()
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        super().__init__([head, self.rows, self.share, self.wrong])
        self.add_class("panel-wanted")
        self.more.observe(self._add, "value")
        state.on_answer(self._draw)
        state.on_problem(self._complain)
        state.seat(SEAT)

    def _draw(self, answer: Answer) -> None:
        entries = answer.question.design.requirements
        free = answer.values["destination"] == "free_space"
        if (entries, free) != self._drawn:
            self._drawn = (entries, free)
            for old in self.rows.children:
                old.close()
            self.rows.children = [
                self._row(index, entry, free) for index, entry in enumerate(entries)
            ]
        for line, entry in zip(self.rows.children, entries, strict=True):
            met = bool(entry.met(answer.outcome[entry.quantity]))
            (line.remove_class if met else line.add_class)("x-missed")

        self._show_share(answer)

    def _share_row(self) -> HBox:
        """The share of devices that must pass, hidden while none is asked for."""
        name = REGISTRY.shown(PASSING).label
        label = Label(name, tooltip=REGISTRY.shown(PASSING).doc)
        label.add_class("x-name")
        self.box = Text(continuous_update=False, tooltip="Share of devices that must pass")
        self.box.add_class("x-number")
        drop = Button(description="×", tooltip=f"No longer require {name}")
        drop.add_class("x-back")
        drop.on_click(lambda _: self._require_share(None))
        self.box.observe(lambda change: self._share_typed(change["new"]), "value")
        sense = Label("≥")
        sense.add_class("x-sense")
        line = HBox([label, sense, self.box, drop])
        line.add_class("x-head")
        line.add_class(f"wanted-{PASSING}")
        return line

    def _show_share(self, answer: Answer) -> None:
        wanted = answer.question.design.passing
        self.share.layout.display = "none" if wanted is None else ""
        if wanted is not None:
            shown = f"{100 * wanted:.10g} %"
            if shown != self._shown or SEAT not in self._state.problems:
                self._shown = self.box.value = shown
            missed = answer.passing is not None and answer.passing.share < wanted
            (self.share.add_class if missed else self.share.remove_class)("x-missed")

    def _share_typed(self, typed: str) -> None:
        if typed == self._shown:
            self._state.settle(SEAT)
            return
        try:
            self._require_share(read_number(typed, "%"))
        except ReadingError as error:
            self._state.refuse(SEAT, str(error))

    def _require_share(self, share: float | None) -> None:
        self._state.change(lambda design: replace(design, passing=share), {SEAT})

    def _complain(self) -> None:
        said = self._state.problems.get(SEAT, "")
        if self.wrong.value and not said:  # what was typed gives way to the requirements
            self._drawn = None
            self._draw(self._state.answer)
        self.wrong.value = said

    def _row(self, index: int, entry: Requirement, free: bool) -> HBox:
        quantity = REGISTRY.quantities[entry.quantity]
        name = quantity_label(entry.quantity, free)
        label = Label(name, tooltip=quantity.doc)
        label.add_class("x-name")
        sense = Button(description=entry.sense, tooltip="At least or at most: press to swap")
        sense.add_class("x-sense")
        shown = text(entry.limit, quantity.unit)
        box = Text(shown, continuous_update=False, tooltip=f"Limit of {name}")
        box.add_class("x-number")
        drop = Button(description="×", tooltip=f"No longer require {name}")
        drop.add_class("x-back")
        sense.on_click(lambda _: self._replace(index, _swapped(entry)))
        drop.on_click(lambda _: self._replace(index, None))
        box.observe(lambda change: self._typed(index, entry, change["new"]), "value")
        line = HBox([label, sense, box, drop])
        line.add_class("x-head")
        line.add_class(f"wanted-{entry.quantity}")
        return line

    def _typed(self, index: int, entry: Requirement, typed: str) -> None:
        try:
            side = "at_most" if entry.at_least is None else "at_least"
            changed = Requirement(entry.quantity, **{side: limit_of(entry, typed)})
        except (ReadingError, InputError) as error:
            self._state.refuse(SEAT, str(error))
            return
        self._replace(index, changed)

    def _replace(self, index: int | None, entry: Requirement | None) -> None:
        self._state.change(lambda design: required(design, entry, index), {SEAT})

    def _add(self, change: dict[str, Any]) -> None:
        name = change["new"]
        if not name:
            return
        self.more.value = ""
        if name == PASSING:
            self._require_share(0.8)
            return
        value = self._state.reading(name)
        self._replace(None, Requirement(name, at_least=0.0 if math.isnan(value) else value))


def limit_of(entry: Requirement, typed: str) -> float:
    """SI value of a limit typed over the one shown, whose unit a bare number keeps."""
    unit = REGISTRY.quantities[entry.quantity].unit
    shown = text(entry.limit, unit)
    if typed.strip() == shown:
        return entry.limit
    frame = _SHOWN.fullmatch(shown)
    if frame is not None and _BARE.fullmatch(typed.strip()):
        typed = f"{frame['before'] or ''}{typed.strip()}{frame['after']}"
    return read_number(typed, TYPED.get(unit, unit))


def required(design: Design, entry: Requirement | None, at: int | None = None) -> Design:
    """A design with a requirement added, replaced at an index, or (None) taken away."""
    entries = list(design.requirements)
    if at is None:
        entries += [entry] if entry else []
    elif entry is None:
        del entries[at]
    else:
        entries[at] = entry
    return replace(design, requirements=tuple(entries))


def _swapped(entry: Requirement) -> Requirement:
    if entry.at_least is None:
        return Requirement(entry.quantity, at_least=entry.limit)
    return Requirement(entry.quantity, at_most=entry.limit)
