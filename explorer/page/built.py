"""Measured devices as marks on the map and as a table, each beside what is predicted for it."""

from __future__ import annotations

import math
from html import escape
from typing import Any

import numpy as np

from ..built import KEPT, Built, Estimate
from ..design import Design
from ..domain import InputError
from ..maps import Axis
from ..measured.use import predicted
from ..question import Answer
from ..registry import REGISTRY
from ..units import text
from .canvas import Mark

#: What the key of a mark of a measured device begins with.
KEY = "built "

NO_DEVICE = (
    "No device of your own yet: fit its decay or its coincidences and press “add to device”."
)


class BuiltMarks:
    """Makes the marks of an answer, and remembers the last ones."""

    def __init__(self) -> None:
        self._key: Any = None
        self._last: tuple[Mark, ...] = ()

    def of(self, answer: Answer) -> tuple[Mark, ...]:
        """A mark for every measured device that lies on the map."""
        question = answer.question
        design = question.design
        if not design.built:
            return ()
        rest = tuple((name, value) for name, value in design.point.items() if name not in KEPT)
        key = (design.built, rest, question.x, question.y, question.shown)
        if key != self._key:
            self._key = key
            found = (
                _mark(design, device, question.x, question.y, question.shown)
                for device in design.built
            )
            self._last = tuple(mark for mark in found if mark is not None)
        return self._last


def _mark(design: Design, device: Built, x: Axis, y: Axis, shown: str) -> Mark | None:
    try:
        work = design.evaluation.changed(device.point, without=KEPT - device.point.keys())
        place = [float(axis.fraction(float(np.asarray(work.value(axis.name))))) for axis in (x, y)]
        says = predicted(design, device)
    except InputError:  # its resonator does not go with what the design has become
        return None
    if not all(0 <= fraction <= 1 for fraction in place):
        return None
    lines = [
        f"{REGISTRY.quantities[name].label} {interval(estimate, name)} measured, "
        f"{number(says[name], name)} predicted"
        for name, estimate in device.measured.items()
    ]
    label = device.name
    if shown in device.measured:
        label += (
            f": {interval(device.measured[shown], shown)}, predicted {number(says[shown], shown)}"
        )
    return Mark(*place, label, f"{device.name}: {'; '.join(lines)}", KEY + device.name, own=True)


def number(value: float, name: str, digits: int = 3) -> str:
    """A value of a quantity as people write it."""
    return text(value, REGISTRY.quantities[name].unit, digits)


def interval(estimate: Estimate, name: str) -> str:
    """A measured value with its interval: '3.6 ns (3.5–3.7)'."""
    return spanned(estimate, REGISTRY.quantities[name].unit)


def spanned(estimate: Estimate, unit: str) -> str:
    """The same in any unit, in the digits that show the interval; an end that is open is '…'."""
    ends = (estimate.value, estimate.low, estimate.high)
    digits = _digits(estimate)
    value, low, high = (text(end, unit, digits) if math.isfinite(end) else "…" for end in ends)
    if value == low == high:
        return value
    own = f" {value.rpartition(' ')[2]}" if " " in value else "°" if value.endswith("°") else ""
    return f"{value} ({low.removesuffix(own)}–{high.removesuffix(own)})"


def _digits(estimate: Estimate) -> int:
    """Significant digits in which an interval's ends differ from its value in two figures."""
    half = (estimate.high - estimate.low) / 2
    if not (math.isfinite(half) and half > 0 and estimate.value):
        return 3
    return min(max(1 - math.floor(math.log10(half / abs(estimate.value))), 3), 8)


def table(design: Design) -> str:
    """Every measured device with what is predicted for it, as HTML."""
    if not design.built:
        return f'<p class="x-plain">{escape(NO_DEVICE)}</p>'
    rows = "".join(_rows(design, device) for device in design.built)
    return (
        '<table class="x-built"><thead><tr><td></td><th scope=col>measured</th>'
        f"<th scope=col>predicted</th></tr></thead>{rows}</table>"
    )


def _rows(design: Design, device: Built) -> str:
    try:
        says = predicted(design, device)
    except InputError:
        says = {}
    lines = [f"<tr><th scope=rowgroup colspan=3>{escape(device.name)}</th></tr>"]
    for name, estimate in device.measured.items():
        value = says.get(name, math.nan)
        fits = estimate.low <= value <= estimate.high
        words = number(value, name) + ("" if fits else _beyond(estimate, value))
        lines.append(
            f"<tr><th scope=row>{escape(REGISTRY.quantities[name].label)}</th>"
            f"<td>{escape(interval(estimate, name))}</td>"
            f'<td class="{"x-fits" if fits else "x-apart"}">{escape(words)}</td></tr>'
        )
    return f"<tbody>{''.join(lines)}</tbody>"


def _beyond(estimate: Estimate, value: float) -> str:
    """In words where a prediction lies that its interval does not hold."""
    if math.isnan(value):
        return ""
    return ", above" if value > estimate.high else ", below"
