"""One input as a row of the page: label, number box with its unit, reset, slider, complaint."""

from __future__ import annotations

from typing import Any

import numpy as np
from ipywidgets import Box, Button, Dropdown, FloatSlider, HBox, Label, Text, VBox

from ..design import Design, Origin, written
from ..inputs import INPUTS
from ..question import Answer
from ..reading import ReadingError, read_number, read_range, read_spread
from ..registry import Input
from ..sentence import MARKS
from .records import can_go_back
from .scales import Scale
from .spreads import SpreadLine, first_spread, scatter_tooltip, spread_words
from .state import State

#: Longest label that takes its symbol along.
SHORT = 18

#: Significant digits in which a box shows what nobody typed, by kind of origin.
DIGITS = {"default": 4, "measured": 5}

#: The input that a given spectrum stands in for: its row says so and takes nothing.
IDLE = "fast_linewidth"


def typed(name: str, value: Any, digits: int = 12) -> str:
    """An input's value as its number box shows it: without the unit."""
    entry = INPUTS[name]
    text = written(name, value, digits)
    return text.removesuffix(f" {entry.shown}") if entry.shown != "1" else text


def back_button(state: State, entry: Input) -> Button:
    """A press takes an input back to its record's value, or to its default."""
    back = Button(
        description="↺", tooltip=f"{entry.label}: back to its published value, or its default"
    )
    back.add_class("x-back")
    back.on_click(lambda _: state.reset(entry.name))
    return back


class OriginMark:
    """The mark beside a label that says where the value comes from, and the same in its tooltip."""

    def __init__(self, row: Box, label: Label, entry: Input) -> None:
        self._row, self._label, self._entry = row, label, entry
        self._last: Origin | None = None

    def follow(self, design: Design) -> None:
        """Mark the row as this design has it; nothing is sent where that is the same."""
        origin = design.origin(self._entry.name)
        if origin == self._last:
            return
        if self._last is None or self._last.kind != origin.kind:
            if self._last is not None:
                self._row.remove_class(_origin_class(self._last))
            self._row.add_class(_origin_class(origin))
        self._last = origin
        where = f": {origin.where}" if origin.where else ""
        self._label.tooltip = f"{self._entry.meaning} {MARKS[origin.kind]} {origin.kind}{where}"


def _origin_class(origin: Origin) -> str:
    return f"from-{origin.kind.replace(' ', '-')}"


def open_words(design: Design, name: str) -> str:
    """The range of an input that is not known: '3.4–3.9 ns not known'; '' where it is known."""
    unknown = design.unknowns.get(name)
    if unknown is None or unknown.low == unknown.high:
        return ""
    return f"{typed(name, unknown.low, 4)}–{written(name, unknown.high, 4)} not known"


def stands_in(spectrum: Any) -> bool:
    """Whether a spectrum is given in place of the single line, and no line of it has its width."""
    return spectrum is not None and not getattr(spectrum, "follows", False)


def unheard(answer: Answer, name: str) -> str:
    """Why an input changes nothing; '' where it does."""
    if name != "temperature":
        return ""
    if answer.values["broadening"] is None:
        return "no effect: no law of the linewidth"
    if "fast_linewidth" in answer.question.design.point:
        return "no effect: the linewidth is given"
    return ""


class InputRow(VBox):
    """A number: slider and box that follow each other, and say what is wrong."""

    def __init__(self, state: State, name: str) -> None:
        self.entry: Input = INPUTS[name]
        self._state = state
        self._scale = Scale(self.entry)
        self._syncing = False
        self._value = 0.0
        label = f"{self.entry.label} {self.entry.symbol}"
        if len(label) > SHORT:
            label = self.entry.label
        self.label = Label(label, tooltip=self.entry.meaning)
        self.label.add_class("x-name")
        self.box = Text(
            continuous_update=False, tooltip=f"{self.entry.meaning} Typical: {self.entry.typical}"
        )
        self.box.add_class("x-number")
        self.unit = Label("" if self.entry.shown == "1" else self.entry.shown)
        self.unit.add_class("x-unit")
        self.back = back_button(state, self.entry)
        self.slider = FloatSlider(
            min=0.0, max=1.0, step=self._scale.step, readout=False, tooltip=self.entry.meaning
        )
        self.slider.add_class("x-slider")
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        self.scatter = Button(description="±")
        self.scatter.add_class("x-scatter")
        self._opened = False
        self._line: SpreadLine | None = None
        self.range = Label("", tooltip="Given as a range: not known. Type one number to close it")
        self.range.add_class("x-open")
        self._origin = OriginMark(self, self.label, self.entry)
        head = HBox([self.label, self.box, self.unit, self.back])
        head.add_class("x-head")
        slide = HBox([self.slider, self.scatter])
        slide.add_class("x-slide")
        super().__init__([head, slide, self.range, self.wrong])
        self.add_class("x-row")
        self.add_class(f"input-{name}")
        self.slider.observe(self._slid, "value")
        self.box.observe(self._typed, "value")
        self.scatter.on_click(self._pressed)
        self._follow(state.answer, anew=True)
        state.on_answer(self._follow)
        state.on_problem(self._complain)
        state.seat(name)

    def _slid(self, change: dict[str, Any]) -> None:
        here = self._scale.stop(self._value)
        # The browser snaps to its own stops: what it says of the present value is no move.
        if not self._syncing and abs(change["new"] - here) > self._scale.step / 4:
            self._state.give(**{self.entry.name: self._scale.value(change["new"])})

    def _typed(self, change: dict[str, Any]) -> None:
        if self._syncing:
            return
        name, text = self.entry.name, change["new"]
        try:
            ends = read_range(text, self.entry.shown)
            around = read_spread(text, self.entry.shown)
            if around is not None:
                self._state.give_scattering(name, *around)
            elif ends is not None:
                self._state.give_range(name, *ends)
            else:
                self._state.give(**{name: read_number(text, self.entry.shown)})
        except ReadingError as error:
            self._state.refuse(name, str(error))

    def _follow(self, answer: Answer, anew: bool = False) -> None:
        name = self.entry.name
        value = float(np.asarray(answer.values[name]).reshape(()))
        self._syncing = True
        try:
            idle = name == IDLE and stands_in(answer.values["spectrum"])
            if anew or name not in self._state.problems:
                digits = DIGITS.get(answer.question.design.origin(name).kind, 12)
                self.box.value = "spectrum" if idle else typed(name, value, digits)
            self.box.disabled = self.slider.disabled = idle
            self._value = value
            stop = self._scale.stop(value)
            if abs(stop - self.slider.value) > self._scale.step / 4:
                self.slider.value = stop
            self.back.disabled = not can_go_back(answer.question.design, name)
            self._origin.follow(answer.question.design)
            self._follow_scatter(answer.question.design)
            self.range.value = open_words(answer.question.design, name) or unheard(answer, name)
        finally:
            self._syncing = False

    def _pressed(self, _: Button) -> None:
        """Open or close the line of the scatter; an input that has none begins with one."""
        name = self.entry.name
        self._opened = not self._opened or name not in self._state.question.design.scatter
        if self._opened and name not in self._state.question.design.scatter:
            self._state.give_spread(name, first_spread(self.entry, self._value))
        self._follow_scatter(self._state.question.design)

    def _follow_scatter(self, design: Design) -> None:
        """What the button says, and the line below, made when it is first opened."""
        spread = design.scatter.get(self.entry.name)
        words = spread_words(self.entry.name, spread)
        if self.scatter.description != words:
            self.scatter.description = words
            (self.scatter.add_class if spread else self.scatter.remove_class)("x-on")
            self.scatter.tooltip = scatter_tooltip(self.entry, spread)
        if self._line is None and spread is not None and self._opened:
            self._line = SpreadLine(self._state, self.entry.name)
            self.children = (*self.children[:2], self._line, *self.children[2:])
        if self._line is not None:
            shown = "" if spread is not None and self._opened else "none"
            if self._line.layout.display != shown:
                self._line.layout.display = shown
            if spread is not None:
                self._line.follow(design)

    def _complain(self) -> None:
        text = self._state.problems.get(self.entry.name, "")
        text = text.removeprefix(f"{self.entry.name} = ")  # its label stands above
        if text != self.wrong.value:
            self.wrong.value = text
            if not text:  # settled from elsewhere: what was typed gives way to the value
                self._follow(self._state.answer)
        if text:  # a slider that was pulled to where it may not be goes back
            self._syncing = True
            self.slider.value = self._scale.stop(self._value)
            self._syncing = False


class ChoiceRow(HBox):
    """A choice between words; the headline says what is refused."""

    def __init__(self, state: State, name: str) -> None:
        self.entry = INPUTS[name]
        self._state = state
        label = Label(self.entry.label, tooltip=self.entry.meaning)
        label.add_class("x-name")
        options = [(word.replace("_", " "), word) for word in self.entry.choices]
        self.menu = Dropdown(options=options, tooltip=self.entry.meaning)
        self.back = back_button(state, self.entry)
        self._origin = OriginMark(self, label, self.entry)
        super().__init__([label, self.menu, self.back])
        self.add_class("x-head")
        self.add_class("x-row")
        self.add_class(f"input-{name}")
        state.on_answer(self._follow)
        state.on_problem(lambda: self._follow(state.answer))  # what was refused is not shown
        self.menu.observe(self._chosen, "value")

    def _chosen(self, change: dict[str, Any]) -> None:
        if change["new"] != self._state.answer.values[self.entry.name]:
            self._state.give(**{self.entry.name: change["new"]})

    def _follow(self, answer: Answer) -> None:
        self.menu.value = answer.values[self.entry.name]
        self._origin.follow(answer.question.design)
        self.back.disabled = not can_go_back(answer.question.design, self.entry.name)


def row(state: State, name: str) -> Box:
    """The row of an input of any kind that can be edited here."""
    return ChoiceRow(state, name) if INPUTS[name].choices else InputRow(state, name)
