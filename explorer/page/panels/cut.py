"""A cut: any quantity against any input through the design point, behind a press."""

from __future__ import annotations

from typing import Any

import numpy as np
from ipywidgets import Button, Dropdown, HBox, Label, VBox

from ...inputs import INPUTS
from ...question import Answer
from ...registry import REGISTRY
from ...units import from_si
from ..look import INK, RED, SEA
from ..state import State


class CutPanel(VBox):
    """Two menus and a curve; the plotting library is loaded when it is first opened."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._drawn: Any = None
        self._kind: Any = None
        self.head = Button(
            description="▸ Cut", tooltip="A quantity against an input: open or close"
        )
        self.head.add_class("x-group")
        quantities = [(e.label, e.name) for e in REGISTRY.quantities.values() if e.kind == "number"]
        numbers = [(e.label, name) for name, e in INPUTS.items() if not e.whole]
        self.quantity = Dropdown(options=quantities, value="rate_in_fibre", tooltip="Quantity")
        self.along = Dropdown(options=numbers, value="quality_factor", tooltip="Input along")
        menus = HBox([self.quantity, Label("along"), self.along])
        menus.add_class("x-maphead")
        self.body = VBox([menus, VBox()])
        self.body.layout.display = "none"
        super().__init__([self.head, self.body])
        self.add_class("panel-cut")
        self.head.on_click(self._toggle)
        for menu in (self.quantity, self.along):
            menu.observe(lambda _: self._ask(), "value")
        state.on_answer(self._draw)

    def _toggle(self, _: Button) -> None:
        opening = self.body.layout.display == "none"
        self.body.layout.display = "" if opening else "none"
        self.head.description = "▾ Cut" if opening else "▸ Cut"
        self._ask()

    def _opened(self) -> bool:
        return self.body.layout.display != "none"

    def _ask(self) -> None:
        wanted = (self.quantity.value, self.along.value)
        self._state.ask(cut=wanted if self._opened() else None)

    def _draw(self, answer: Answer) -> None:
        seen, wanted = answer.cut, answer.question.cut
        if seen is None or wanted is None or seen is self._drawn or not self._opened():
            return
        self._drawn = seen
        quantity, entry = REGISTRY.quantities[wanted[0]], INPUTS[wanted[1]]
        y = np.degrees(seen.quantity) if quantity.unit == "rad" else np.asarray(seen.quantity)
        kept = np.isfinite(y)
        x, y = np.array([from_si(float(v), entry.shown) for v in seen.values])[kept], y[kept]
        logs = (entry.scale.startswith("log"), quantity.log and bool((y > 0).all()))
        if (wanted, logs) != self._kind or not y.size:
            self._kind = (wanted, logs)
            self.curve, self.here, self.axes, figure = _figure(entry, quantity, logs)
            self.body.children[-1].children = [figure]
        if y.size:
            place = from_si(float(answer.values[entry.name]), entry.shown)
            for axis, values, log in zip(self.axes, (x, y), logs, strict=True):
                axis.tick_values = ticks(float(values.min()), float(values.max()), log)
            with self.curve.hold_sync():
                self.curve.x, self.curve.y = x, y
            with self.here.hold_sync():
                self.here.x, self.here.y = [place, place], [float(y.min()), float(y.max())]


def _figure(entry: Any, quantity: Any, logs: tuple[bool, bool]) -> tuple[Any, Any, Any, Any]:
    """Curve, line at the design point, axes, and the figure that holds them."""
    from bqplot import Axis, Figure, LinearScale, Lines, LogScale

    scales = {
        name: (LogScale if log else LinearScale)() for name, log in zip("xy", logs, strict=True)
    }
    curve = Lines(x=[1, 2], y=[1, 2], scales=scales, colors=[SEA], stroke_width=2.5)
    here = Lines(
        x=[1, 1], y=[1, 2], scales=scales, colors=[RED], stroke_width=2, line_style="dashed"
    )
    unit = "" if entry.shown == "1" else f" ({entry.shown})"
    common = {"grid_lines": "none", "color": INK, "label_color": INK}
    axes = [
        Axis(
            scale=scales["x"],
            label=f"{entry.label}{unit}",
            label_offset="2.4em",
            tick_format="~g",
            **common,
        ),
        Axis(
            scale=scales["y"],
            side="left",
            tick_format="~s" if quantity.unit == "1/s" else "~g",
            **common,
        ),
    ]
    margins = {"top": 10, "bottom": 44, "left": 62, "right": 16}
    figure = Figure(marks=[curve, here], axes=axes, animation_duration=0, fig_margin=margins)
    return curve, here, axes, figure


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
