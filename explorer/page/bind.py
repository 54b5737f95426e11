"""One input as a row of the page: label, number box with its unit, reset, slider, complaint."""

from __future__ import annotations

from typing import Any

import numpy as np
from ipywidgets import Box, Button, Dropdown, FloatSlider, HBox, Label, Text, VBox

from ..design import written
from ..inputs import INPUTS
from ..question import Answer
from ..reading import ReadingError, read_number
from ..registry import Input
from .scales import Scale
from .state import State

#: Longest label that takes its symbol along.
SHORT = 18

#: The input that a given spectrum stands in for: its row says so and takes nothing.
IDLE = "fast_linewidth"


def typed(name: str, value: Any, digits: int = 12) -> str:
    """An input's value as its number box shows it: without the unit."""
    entry = INPUTS[name]
    text = written(name, value, digits)
    return text.removesuffix(f" {entry.shown}") if entry.shown != "1" else text


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
        self.back = Button(description="↺", tooltip=f"{self.entry.label}: back to its default")
        self.back.add_class("x-back")
        self.slider = FloatSlider(
            min=0.0, max=1.0, step=self._scale.step, readout=False, tooltip=self.entry.meaning
        )
        self.slider.add_class("x-slider")
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        head = HBox([self.label, self.box, self.unit, self.back])
        head.add_class("x-head")
        super().__init__([head, self.slider, self.wrong])
        self.add_class("x-row")
        self.add_class(f"input-{name}")
        self.slider.observe(self._slid, "value")
        self.box.observe(self._typed, "value")
        self.back.on_click(lambda _: state.reset(name))
        state.on_answer(self._follow)
        state.on_problem(self._complain)

    def _slid(self, change: dict[str, Any]) -> None:
        here = self._scale.stop(self._value)
        # The browser snaps to its own stops: what it says of the present value is no move.
        if not self._syncing and abs(change["new"] - here) > self._scale.step / 4:
            self._state.give(**{self.entry.name: self._scale.value(change["new"])})

    def _typed(self, change: dict[str, Any]) -> None:
        if self._syncing:
            return
        try:
            value = read_number(change["new"], self.entry.shown)
        except ReadingError as error:
            self._state.refuse(self.entry.name, str(error))
            return
        self._state.give(**{self.entry.name: value})

    def _follow(self, answer: Answer) -> None:
        name = self.entry.name
        value = float(np.asarray(answer.values[name]).reshape(()))
        given = name in answer.question.design.point
        self._syncing = True
        try:
            idle = name == IDLE and answer.values["spectrum"] is not None
            if name not in self._state.problems:
                self.box.value = "spectrum" if idle else typed(name, value, 12 if given else 4)
            self.box.disabled = self.slider.disabled = idle
            self._value = value
            stop = self._scale.stop(value)
            if abs(stop - self.slider.value) > self._scale.step / 4:
                self.slider.value = stop
            self.back.disabled = not given
        finally:
            self._syncing = False

    def _complain(self) -> None:
        text = self._state.problems.get(self.entry.name, "")
        text = text.removeprefix(f"{self.entry.name} = ")  # its label stands above
        if text != self.wrong.value:
            self.wrong.value = text
        if text:  # a slider that was pulled to where it may not be goes back
            self._syncing = True
            self.slider.value = self._scale.stop(self._value)
            self._syncing = False


class ChoiceRow(HBox):
    """A choice between words."""

    def __init__(self, state: State, name: str) -> None:
        self.entry = INPUTS[name]
        self._state = state
        label = Label(self.entry.label, tooltip=self.entry.meaning)
        label.add_class("x-name")
        options = [(word.replace("_", " "), word) for word in self.entry.choices]
        self.menu = Dropdown(options=options, tooltip=self.entry.meaning)
        self.back = Button(description="↺", tooltip=f"{self.entry.label}: back to its default")
        self.back.add_class("x-back")
        super().__init__([label, self.menu, self.back])
        self.add_class("x-head")
        self.add_class("x-row")
        self.add_class(f"input-{name}")
        self.back.on_click(lambda _: state.reset(name))
        state.on_answer(self._follow)
        state.on_problem(lambda: self._follow(state.answer))  # what was refused is not shown
        self.menu.observe(self._chosen, "value")

    def _chosen(self, change: dict[str, Any]) -> None:
        if change["new"] != self._state.answer.values[self.entry.name]:
            self._state.give(**{self.entry.name: change["new"]})

    def _follow(self, answer: Answer) -> None:
        self.menu.value = answer.values[self.entry.name]
        self.back.disabled = self.entry.name not in answer.question.design.point


def row(state: State, name: str) -> Box:
    """The row of an input of any kind that can be edited here."""
    return ChoiceRow(state, name) if INPUTS[name].choices else InputRow(state, name)
