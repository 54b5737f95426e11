"""The map as the place: one quantity over two inputs, with the design point on it."""

from __future__ import annotations

from typing import Any

import numpy as np
from ipywidgets import Button, Dropdown, FloatProgress, HBox, Label, ToggleButton, VBox

from ...inputs import INPUTS
from ...maps import Map
from ...question import Answer, Question, fitting_axis
from ...registry import REGISTRY
from ...sentence import quantity_label
from ...yields import PASSING
from ..backdrop import Backdrop
from ..built import KEY, BuiltMarks
from ..canvas import MapCanvas
from ..picture import described, is_free, picture_of
from ..scales import rounded
from ..state import State

#: Layers with a switch, and what the switch says.
LAYERS = {
    "iso": "iso-lines",
    "frontiers": "frontiers",
    "hatching": "cautions",
    "scales": "second scales",
    "all_bands": "all emitters",
    "marks": "devices",
    "all_marks": "all devices",
}

#: What is said above a map of the devices that pass.
DRAWING, STOPPED = "drawing devices", "stopped: a coarse map"
DRAWN = "share of devices that meet everything"

#: Least change of an axis fraction that is a move, not a rounding of pixels.
STILL = 1e-9


class MapPanel(VBox):
    """Menu of quantities, switches of layers, the canvas, and the inputs on the axes."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._backdrop, self._built = Backdrop(), BuiltMarks()
        self._drawn: tuple[Any, ...] = ()
        self._held: tuple[Any, ...] = ()
        self._map: Map | None = None
        self._quiet = False
        self._free = is_free(state.answer)
        self.shown = Dropdown(options=_quantities(self._free), tooltip="Quantity shown as colour")
        self.shown.add_class("x-shown")
        self.switches = {
            name: ToggleButton(description=words, tooltip=f"Show or hide {words}")
            for name, words in LAYERS.items()
        }
        numbers = [(entry.label, name) for name, entry in INPUTS.items() if not entry.whole]
        self.across = Dropdown(options=numbers, tooltip="Input on the horizontal axis")
        self.up = Dropdown(options=numbers, tooltip="Input on the vertical axis")
        self.home = Button(description="Q–V", tooltip="Quality factor against mode volume again")
        self.home.add_class("x-link")
        over, against = Label("over"), Label("and")
        head = HBox([self.shown, over, self.up, against, self.across, self.home])
        head.add_class("x-maphead")
        layers = HBox(list(self.switches.values()))
        layers.add_class("x-layers")
        self.doing = Label("")
        self.working = FloatProgress(min=0.0, max=1.0, tooltip="How much of the map is drawn")
        self.stop = Button(description="stop", tooltip="Leave the map as it is now")
        self.progress = HBox([self.doing, self.working, self.stop])
        self.progress.add_class("x-progress")
        self.progress.layout.display = "none"
        self.canvas = MapCanvas()
        self.canvas.add_class("x-canvas")
        super().__init__([head, layers, self.progress, self.canvas])
        self.add_class("panel-map")
        self._listen()
        state.on_answer(self._draw)
        state.on_proposal(self._propose)
        state.on_problem(lambda: self._draw(state.answer))  # what was refused is not shown

    def _listen(self) -> None:
        self.shown.observe(lambda change: self._ask(shown=change["new"]), "value")
        self.across.observe(lambda change: self._axis("x", change["new"]), "value")
        self.up.observe(lambda change: self._axis("y", change["new"]), "value")
        self.canvas.observe(self._moved, "point")
        self.canvas.on_mark(self._marked)
        self.stop.on_click(lambda _: self._state.stop())
        self.home.on_click(lambda _: self._ask(x=Question().x, y=Question().y))
        for name, switch in self.switches.items():
            switch.observe(lambda change, name=name: self._switch(name, change["new"]), "value")

    def _ask(self, **changes: Any) -> None:
        if not self._quiet:
            self._state.ask(**changes)

    def _switch(self, name: str, on: bool) -> None:
        layers = self._state.question.layers
        self._ask(layers=layers | {name} if on else layers - {name})

    def _axis(self, side: str, name: str) -> None:
        question = self._state.question
        home = {axis.name: axis for axis in (Question().x, Question().y)}
        axis = home.get(name) or fitting_axis(question.design, name)
        other = "y" if side == "x" else "x"
        changes: dict[str, Any] = {side: axis}
        if getattr(question, other).name == name:  # the two inputs change places
            changes[other] = getattr(question, side)
        self._ask(**changes)

    def _moved(self, change: dict[str, Any]) -> None:
        if self._quiet:
            return
        question = self._state.question
        old, new = ([_inside(fraction) for fraction in change[end]] for end in ("old", "new"))
        values = {
            axis.name: rounded(float(axis.at(here)))
            for axis, before, here in zip((question.x, question.y), old, new, strict=True)
            if abs(here - before) > STILL
        }
        if values:
            self._state.give(**values)
        self._place(self._state.answer)

    def _marked(self, key: str) -> None:
        if key.startswith(KEY):
            self._state.take_built(key.removeprefix(KEY))
            return
        self._state.take_place(key, (self._state.question.x.name, self._state.question.y.name))

    def _draw(self, answer: Answer) -> None:
        self._quiet = True
        try:
            self._follow(answer)
            # A map that is still of an older question is on the canvas already.
            if answer.map is not None and (answer.whole or answer.map is not self._map):
                self._paint(answer, answer.map)
                self._describe(answer, answer.map)
            self._place(answer)
            self._report(answer)
            self._propose()
        finally:
            self._quiet = False

    def _propose(self) -> None:
        """A design that may be taken, where it lies on this map."""
        proposal, question = self._state.proposal, self._state.question
        self.canvas.proposal = {} if proposal is None else proposal.on(question.x, question.y)

    def _report(self, answer: Answer) -> None:
        """How far a map is that takes long; its row keeps its room, so that the map stays in place."""
        done = answer.progress
        row = "" if answer.question.shown == PASSING else "none"
        busy = "hidden" if done is None else "visible"
        words = DRAWN if done is None else DRAWING
        if done is None and not answer.whole:
            words = STOPPED
        for widget, shown in ((self.working, busy), (self.stop, busy)):
            if widget.layout.visibility != shown:
                widget.layout.visibility = shown
        if self.progress.layout.display != row:
            self.progress.layout.display = row
        if self.doing.value != words:
            self.doing.value = words
        if done is not None and (abs(done - self.working.value) > 0.02 or done == 0):
            self.working.value = done

    def _place(self, answer: Answer) -> None:
        """Put the point of the canvas where the design is; just outside where it is outside."""
        place = [
            float(axis.fraction(float(answer.values[axis.name])))
            for axis in (answer.question.x, answer.question.y)
        ]
        here = [float(value) for value in np.clip(np.nan_to_num(place), -0.05, 1.05)]
        if here != self.canvas.point:
            quiet, self._quiet = self._quiet, True
            self.canvas.point = here
            self._quiet = quiet

    def _follow(self, answer: Answer) -> None:
        question = answer.question
        if self._free != is_free(answer):
            self._free = not self._free
            self.shown.options = _quantities(self._free)
        wanted = (
            (self.shown, question.shown),
            (self.across, question.x.name),
            (self.up, question.y.name),
            *((switch, name in question.layers) for name, switch in self.switches.items()),
        )
        for widget, value in wanted:
            if widget.value != value:  # to look is quicker than to set what is there
                widget.value = value

    def _paint(self, answer: Answer, drawn: Map) -> None:
        back, own = self._backdrop.of(answer), self._built.of(answer)
        key = (id(drawn), answer.question.layers, id(back), id(own), self._free)
        if key == self._drawn:
            return
        self._map = drawn
        self._drawn, self._held = key, (drawn, back, own)  # held, so that their ids stay theirs
        self.canvas.show(picture_of(answer, drawn, back, own))

    def _describe(self, answer: Answer, drawn: Map) -> None:
        """The map and the design on it in words, once a hand rests."""
        if answer.progress is None and not answer.rest:
            words = described(answer, drawn)
            if words != self.canvas.description:
                self.canvas.description = words


def _quantities(free: bool) -> list[tuple[str, str]]:
    """The lines of the menu of quantities."""
    names = (*REGISTRY.collective, *REGISTRY.quantities)
    return [(quantity_label(name, free), name) for name in names]


def _inside(fraction: float) -> float:
    """A fraction as a hand can reach it."""
    return min(max(fraction, 0.0), 1.0)
