"""The map as the place: one quantity over two inputs, with the design point on it."""

from __future__ import annotations

from typing import Any

import numpy as np
from ipywidgets import Button, Dropdown, HBox, Label, ToggleButton, VBox

from ...design import Requirement
from ...inputs import INPUTS
from ...maps import FRONTIERS, Map
from ...question import Answer, Question, default_axis
from ...registry import REGISTRY
from ...units import from_si, text
from ..backdrop import Backdrop
from ..canvas import AxisScale, ColourScale, Line, MapCanvas, Picture
from ..canvas import Label as Note
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
}

#: Most decades that a logarithmic colour scale spans by itself.
DECADES = 3.0


class MapPanel(VBox):
    """Menu of quantities, switches of layers, the canvas, and the inputs on the axes."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._backdrop = Backdrop()
        self._drawn: tuple[Any, ...] = ()
        self._held: tuple[Any, ...] = ()
        self._map: Map | None = None
        self._quiet = False
        options = [(entry.label, entry.name) for entry in REGISTRY.quantities.values()]
        self.shown = Dropdown(options=options, tooltip="Quantity shown as colour")
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
        self.canvas = MapCanvas()
        self.canvas.add_class("x-canvas")
        super().__init__([head, layers, self.canvas])
        self.add_class("panel-map")
        self._listen()
        state.on_answer(self._draw)
        state.on_problem(lambda: self._draw(state.answer))  # what was refused is not shown

    def _listen(self) -> None:
        self.shown.observe(lambda change: self._ask(shown=change["new"]), "value")
        self.across.observe(lambda change: self._axis("x", change["new"]), "value")
        self.up.observe(lambda change: self._axis("y", change["new"]), "value")
        self.canvas.observe(self._moved, "point")
        self.canvas.on_mark(self._marked)
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
        axis = home.get(name) or default_axis(name)
        other = "y" if side == "x" else "x"
        changes: dict[str, Any] = {side: axis}
        if getattr(question, other).name == name:  # the two inputs change places
            changes[other] = getattr(question, side)
        self._ask(**changes)

    def _moved(self, change: dict[str, Any]) -> None:
        if self._quiet:
            return
        question = self._state.question
        across, up = (min(max(fraction, 0.0), 1.0) for fraction in change["new"])
        values = {
            axis.name: rounded(float(axis.at(fraction)))
            for axis, fraction in ((question.x, across), (question.y, up))
        }
        self._state.give(**values)

    def _marked(self, key: str) -> None:
        self._state.take_place(key, (self._state.question.x.name, self._state.question.y.name))

    def _draw(self, answer: Answer) -> None:
        self._quiet = True
        try:
            self._follow(answer)
            # A map that is still of an older question is on the canvas already.
            if answer.map is not None and (answer.whole or answer.map is not self._map):
                self._paint(answer, answer.map)
            question = answer.question
            place = [
                float(axis.fraction(float(answer.values[axis.name])))
                for axis in (question.x, question.y)
            ]
            here = [float(np.clip(value, -0.05, 1.05)) for value in np.nan_to_num(place)]
            if max(abs(a - b) for a, b in zip(here, self.canvas.point, strict=True)) > 2e-4:
                self.canvas.point = here
        finally:
            self._quiet = False

    def _follow(self, answer: Answer) -> None:
        question = answer.question
        self.shown.value = question.shown
        self.across.value, self.up.value = question.x.name, question.y.name
        for name, switch in self.switches.items():
            switch.value = name in question.layers

    def _paint(self, answer: Answer, drawn: Map) -> None:
        question = answer.question
        back = self._backdrop.of(answer)
        key = (id(drawn), question.layers, id(back))
        if key == self._drawn:
            return
        self._map = drawn
        self._drawn, self._held = key, (drawn, back)  # held, so that their ids stay theirs
        name = question.shown if question.shown in drawn.values else next(iter(drawn.values))
        layers = question.layers
        scale = colour_scale(name, drawn)
        caution = drawn.caution if "hatching" in layers else None
        border = drawn.outline()
        picture = Picture(
            values=coded(name, drawn.values[name]),
            x=axis_scale(drawn.x.name, drawn.x.low, drawn.x.high, drawn.x.log),
            y=axis_scale(drawn.y.name, drawn.y.low, drawn.y.high, drawn.y.log),
            colour=scale,
            ends_included=False,
            cautioned=caution if caution is not None and caution.any() else None,
            caution_texts=("a caution holds",),
            holds=None if drawn.margin is None else drawn.margin >= 0,
            lines=(
                *iso_lines(name, drawn, scale, layers),
                *frontiers(drawn, layers),
                *outline(border),
            ),
            labels=notes(border, drawn, answer),
            bands=back.bands if "all_bands" in layers else tuple(b for b in back.bands if b.own),
            marks=back.marks if "marks" in layers else (),
            top=back.top if "scales" in layers else None,
            right=back.right if "scales" in layers else None,
        )
        self.canvas.show(picture)
        self.canvas.description = described(answer, drawn)


def axis_scale(name: str, low: float, high: float, log: bool) -> AxisScale:
    """An axis of the picture in the unit that the input is shown in."""
    entry = INPUTS[name]
    unit = "" if entry.shown == "1" else entry.shown
    ends = (from_si(value, entry.shown) for value in (low, high))
    label = f"{entry.label} {entry.symbol}".strip()
    return AxisScale(label, *ends, unit=unit, log=log)


def coded(name: str, values: Any) -> Any:
    """Values as the canvas takes them: shown units, codes for words and masks."""
    quantity = REGISTRY.quantities[name]
    if quantity.kind == "choice":
        codes = np.full(values.shape, np.nan)
        for code, word in enumerate(quantity.choices):
            codes[values == word] = code
        return codes
    if quantity.unit == "rad":
        return np.degrees(values)
    return values


def colour_scale(name: str, drawn: Map) -> ColourScale:
    """Limits of the colours from the map, rounded outwards to 1, 2, 5."""
    quantity = REGISTRY.quantities[name]
    unit = {"1": "", "rad": "°"}.get(quantity.unit, quantity.unit)
    if quantity.kind == "choice":
        return ColourScale(
            quantity.label, 0, len(quantity.choices) - 1, categories=quantity.choices
        )
    if quantity.kind == "mask":
        return ColourScale(quantity.label, 0, 1, categories=("no", "yes"))
    values = coded(name, drawn.values[name])
    finite = values[np.isfinite(values) & (values > 0 if quantity.log else True)]
    if finite.size == 0:
        return ColourScale(quantity.label, 0.1 if quantity.log else 0.0, 1.0, unit, quantity.log)
    low, high = float(finite.min()), float(finite.max())
    if quantity.log:
        high = _round(high, up=True)
        low = max(_round(low, up=False), high / 10**DECADES)
        return ColourScale(quantity.label, min(low, high / 10), high, unit, True)
    high = _round(high, up=True) if high > 0 else 1.0
    return ColourScale(quantity.label, 0.0 if low >= 0 else low, high, unit, False)


def _round(value: float, up: bool) -> float:
    power = 10.0 ** np.floor(np.log10(value) + 1e-12)
    steps = [step * power for step in (1, 2, 5, 10)]
    if up:
        return float(next(step for step in steps if step >= value * (1 - 1e-9)))
    return float(max(step for step in steps if step <= value * (1 + 1e-9)))


def levels(scale: ColourScale) -> list[float]:
    """Levels of iso-lines within a colour scale, in its unit, at most eight."""
    if scale.log:
        decades = np.arange(np.ceil(np.log10(scale.low)), np.floor(np.log10(scale.high)) + 1)
        found = [step * 10.0**decade for decade in decades for step in (1.0, 3.0)]
        found = [level for level in found if scale.low < level < scale.high]
        return found[-8:]
    step = _round((scale.high - scale.low) / 6, up=True)
    return [step * i for i in range(1, 20) if scale.low < step * i < scale.high][:8]


def iso_lines(name: str, drawn: Map, scale: ColourScale, layers: frozenset[str]) -> list[Line]:
    """Iso-lines of the shown quantity with their values written along."""
    quantity = REGISTRY.quantities[name]
    if "iso" not in layers or quantity.kind != "number":
        return []
    wanted = levels(scale)
    inside = [np.radians(level) if quantity.unit == "rad" else level for level in wanted]
    return [
        Line("iso", tuple(paths), text(level, quantity.unit, 2), level=shown)
        for level, shown, paths in zip(inside, wanted, drawn.lines(name, inside), strict=True)
        if paths
    ]


def frontiers(drawn: Map, layers: frozenset[str]) -> list[Line]:
    """Lines on which the regime changes."""
    if "frontiers" not in layers:
        return []
    found = []
    for name, level, words in FRONTIERS:
        if name in drawn.values:
            paths = drawn.lines(name, [level])[0]
            if paths:
                found.append(Line("frontier", tuple(paths), words))
    return found


def outline(border: list[Any]) -> list[Line]:
    """Border of the region that meets everything."""
    return [Line("outline", tuple(border))] if border else []


def notes(border: list[Any], drawn: Map, answer: Answer) -> tuple[Note, ...]:
    """The requirement that binds, named at the longest stretch of the outline where it does."""
    if drawn.binding is None:
        return ()
    ny, nx = drawn.binding.shape
    best: dict[int, Any] = {}
    for path in border:
        inside = (path > 0.01).all(axis=1) & (path < 0.99).all(axis=1)
        column = np.clip((path[:, 0] * nx).astype(int), 0, nx - 1)
        line = np.clip((path[:, 1] * ny).astype(int), 0, ny - 1)
        which = np.where(inside, drawn.binding[line, column], -1)
        cuts = np.flatnonzero(np.diff(which)) + 1
        for run in np.split(np.arange(len(path)), cuts):
            index = int(which[run[0]])
            if index >= 0 and len(run) > len(best.get(index, ())):
                best[index] = path[run]
    entries = answer.question.design.requirements
    return tuple(
        Note(*map(float, run[len(run) // 2]), wish(entries[index]))
        for index, run in best.items()
        if index < len(entries)
    )


def wish(entry: Requirement) -> str:
    """A requirement as the outline names it: 'Photons/s in the fibre ≥ 20 M/s'."""
    quantity = REGISTRY.quantities[entry.quantity]
    return f"{quantity.label} {entry.sense} {text(entry.limit, quantity.unit, 2)}"


def described(answer: Answer, drawn: Map) -> str:
    """The map in words, for screen readers."""
    quantity = REGISTRY.quantities[answer.question.shown]
    value = answer.outcome.get(answer.question.shown)
    here = text(value, quantity.unit) if isinstance(value, float) else str(value)
    region = ""
    if drawn.margin is not None:
        share = float(np.mean(drawn.margin >= 0))
        region = f" {share:.0%} of the map meets every requirement."
    return (
        f"Map of {quantity.label} over {INPUTS[drawn.x.name].label} and {INPUTS[drawn.y.name].label}."
        f" At the design point: {here}.{region} Arrow keys move the point."
    )
