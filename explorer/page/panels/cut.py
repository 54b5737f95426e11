"""A cut: any quantity against any input through the design point, behind a press."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from ipywidgets import Button, Dropdown, HBox, Label, VBox

from ...curves import Cut
from ...inputs import INPUTS
from ...question import Answer
from ...registry import REGISTRY
from ...units import EXPONENTS, from_si, si_unit
from ..look import INK, RED, SEA
from ..state import State

#: SI unit of a quantity -> the units that its axis chooses from, ascending.
FITTING = {
    "m": ("pm", "nm", "µm", "mm", "m"),
    "s": ("fs", "ps", "ns", "µs", "ms", "s"),
    "1/s": ("1/s", "k/s", "M/s", "G/s"),
    "rad/s": ("Hz", "kHz", "MHz", "GHz", "THz"),  # a frequency times 2π
    "eV": ("µeV", "meV", "eV"),
}


class CutPanel(VBox):
    """Two menus and a curve; the plotting library is loaded when it is first opened."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._drawn: Any = None
        self._kind: Any = None
        self._figure: Any = None
        self._syncing = False
        self.head = Button(
            description="▸ Cut", tooltip="A quantity against an input: open or close"
        )
        self.head.add_class("x-group")
        known = [*REGISTRY.collective.values(), *REGISTRY.quantities.values()]
        quantities = [(e.label, e.name) for e in known if e.kind == "number"]
        numbers = [(e.label, name) for name, e in INPUTS.items() if not e.whole]
        self.quantity = Dropdown(options=quantities, value="rate_in_fibre", tooltip="Quantity")
        self.along = Dropdown(options=numbers, value="quality_factor", tooltip="Input along")
        menus = HBox([self.quantity, Label("along"), self.along])
        menus.add_class("x-maphead")
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        self.plot = VBox()
        self.body = VBox([menus, self.wrong, self.plot])
        self.body.layout.display = "none"
        super().__init__([self.head, self.body])
        self.add_class("panel-cut")
        self.head.on_click(lambda _: self._ask(not self._opened()))
        for menu in (self.quantity, self.along):
            menu.observe(lambda _: self._ask(True), "value")
        state.on_answer(self._draw)
        state.on_problem(lambda: self._draw(state.answer))  # what was refused is not shown

    def _opened(self) -> bool:
        return bool(self.body.layout.display != "none")

    def _ask(self, opened: bool) -> None:
        if not self._syncing:
            wanted = (self.quantity.value, self.along.value)
            self._state.ask(cut=wanted if opened else None)

    def _follow(self, wanted: tuple[str, str] | None) -> None:
        """Open or closed, with the menus at what the question cuts along."""
        self._syncing = True
        self.body.layout.display = "none" if wanted is None else ""
        self.head.description = "▸ Cut" if wanted is None else "▾ Cut"
        for menu, name in zip((self.quantity, self.along), wanted or (), strict=False):
            if name in (value for _, value in menu.options):
                menu.value = name
        self._syncing = False

    def _draw(self, answer: Answer) -> None:
        wanted, seen = answer.question.cut, answer.cut
        if wanted is None and not self._opened():
            return
        self._follow(wanted)
        self.wrong.value = answer.cut_fault
        shown = () if seen is None or self._figure is None else (self._figure,)
        if self.plot.children != shown:
            self.plot.children = shown
        if seen is not None and wanted is not None and seen is not self._drawn:
            self._drawn = seen
            self._trace(answer, seen, *wanted)

    def _trace(self, answer: Answer, seen: Cut, quantity_name: str, name: str) -> None:
        quantity, entry = REGISTRY.shown(quantity_name), INPUTS[name]
        y, unit = fitted(seen.quantity, quantity.unit)
        kept = np.isfinite(y)
        x, y = np.array([from_si(float(v), entry.shown) for v in seen.values])[kept], y[kept]
        logs = (entry.scale.startswith("log"), quantity.log and bool((y > 0).all()))
        kind = (quantity_name, name, logs)
        title = f"{quantity.label}, {unit}" if unit else quantity.label
        if kind != self._kind or not y.size:
            self._kind = kind
            self.curve, self.here, self.axes, self._figure = _figure(entry, logs)
            self.plot.children = [self._figure]
        if self.axes[1].label != title:
            self.axes[1].label = title
        if y.size:
            place = from_si(float(answer.values[entry.name]), entry.shown)
            for axis, values, log in zip(self.axes, (x, y), logs, strict=True):
                axis.tick_values = ticks(float(values.min()), float(values.max()), log)
            with self.curve.hold_sync():
                self.curve.x, self.curve.y = x, y
            with self.here.hold_sync():
                self.here.x, self.here.y = [place, place], [float(y.min()), float(y.max())]


def _figure(entry: Any, logs: tuple[bool, bool]) -> tuple[Any, Any, Any, Any]:
    """Curve, line at the design point, axes, and the figure that holds them."""
    from bqplot import Axis, Figure, LinearScale, Lines, LogScale

    scales = {
        name: (LogScale if log else LinearScale)() for name, log in zip("xy", logs, strict=True)
    }
    curve = Lines(x=[1, 2], y=[1, 2], scales=scales, colors=[SEA], stroke_width=2.5)
    here = Lines(
        x=[1, 1], y=[1, 2], scales=scales, colors=[RED], stroke_width=2, line_style="dashed"
    )
    unit = "" if entry.shown == "1" else f", {entry.shown}"
    common = {"grid_lines": "none", "color": INK, "label_color": INK, "tick_format": "~g"}
    axes = [
        Axis(scale=scales["x"], label=f"{entry.label}{unit}", label_offset="2.4em", **common),
        Axis(scale=scales["y"], side="left", label_offset="3.9em", **common),
    ]
    margins = {"top": 10, "bottom": 44, "left": 76, "right": 16}
    figure = Figure(marks=[curve, here], axes=axes, animation_duration=0, fig_margin=margins)
    return curve, here, axes, figure


def fitted(values: Any, unit: str) -> tuple[np.ndarray, str]:
    """SI values in the unit that suits the largest of them, and that unit as a label."""
    y = np.asarray(values, dtype=float)
    if unit == "rad":
        return np.degrees(y), "°"
    if unit == "%":
        return 100 * y, "%"
    family = si_unit(unit)
    if family not in FITTING:
        return y, "" if unit == "1" else unit
    if family == "rad/s":
        y = y / (2 * math.pi)
    largest = float(np.abs(y[np.isfinite(y)]).max(initial=0.0)) or 1.0
    sizes = {name: EXPONENTS[name][1] for name in FITTING[family]}
    fits = [name for name, power in sizes.items() if largest >= 0.9995 * 10.0**power]
    name = fits[-1] if fits else FITTING[family][0]
    return y / 10.0 ** sizes[name], f"2π × {name}" if family == "rad/s" else name


def ticks(low: float, high: float, log: bool) -> list[float]:
    """At most six round numbers within a range."""
    if log:
        first, last = np.ceil(np.log10(low) - 1e-9), np.floor(np.log10(high) + 1e-9)
        if last - first >= 1:
            step = max(1, int(np.ceil((last - first) / 5)))
            return [10.0**power for power in np.arange(first, last + 1, step)]
    if not high > low:
        return [low]
    power = 10.0 ** np.floor(np.log10((high - low) / 3))
    step = max(size * power for size in (1, 2, 5) if size * power <= (high - low) / 3 * 1.000001)
    return [
        float(f"{k * step:.12g}") for k in range(int(np.ceil(low / step)), int(high / step) + 1)
    ]
