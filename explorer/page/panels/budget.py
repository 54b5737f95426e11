"""Where the photons go: the budget, step by step, on a logarithmic scale."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

from ipywidgets import HTML, Label, VBox

from ...budget import STEPS, Step
from ...question import Answer
from ...units import text
from ..state import State

#: What each step counts.
MEANINGS = dict(STEPS)

#: Decades below the first step that a bar shows.
DECADES = 3.0


class BudgetPanel(VBox):
    """A bar a step: what is left, and what the step took."""

    def __init__(self, state: State) -> None:
        self._drawn: Sequence[Step] | None = None
        title = Label("Where the photons go")
        title.add_class("x-title")
        self.table = HTML()
        super().__init__([title, self.table])
        self.add_class("panel-budget")
        state.on_answer(self._draw)

    def _draw(self, answer: Answer) -> None:
        if answer.rows is self._drawn:
            return
        self._drawn = answer.rows
        first = answer.rows[0].total
        worst = min((row.factor for row in answer.rows if row.factor), default=1.0)
        body = "".join(_line(row, before, first, worst) for row, before in _pairs(answer.rows))
        self.table.value = (
            '<table class="x-budget"><caption>per second after each step, logarithmic; share kept</caption>'
            f"<tbody>{body}</tbody></table>"
        )


def _pairs(rows: Sequence[Step]) -> list[tuple[Step, float]]:
    return [(row, rows[max(index - 1, 0)].total) for index, row in enumerate(rows)]


def _length(value: float, first: float) -> float:
    """Length of a bar [%]."""
    if not value > 0 or not first > 0:
        return 0.0
    return 100 * min(max(1 + math.log10(value / first) / DECADES, 0.0), 1.0)


def _line(row: Step, before: float, first: float, worst: float) -> str:
    left, was = _length(row.total, first), _length(before, first)
    factor = "" if row.factor is None else _factor(row.factor)
    strong = ' class="x-worst"' if row.factor is not None and row.factor <= worst < 0.995 else ""
    return (
        f'<tr{strong}><th scope=row title="{escape(MEANINGS[row.step])}">{escape(row.step)}</th>'
        f'<td class="x-bar"><i style="width:{was:.1f}%"></i><b style="width:{left:.1f}%"></b>'
        f'<span class="{"x-in" if left > 48 else "x-out"}" style="--at:{max(was, left):.1f}%">'
        f"{escape(text(row.total, '1/s'))}</span></td>"
        f'<td class="x-factor">{escape(factor)}</td></tr>'
    )


def _factor(factor: float) -> str:
    if math.isnan(factor):
        return "–"
    if abs(factor - 1) < 0.0005:
        return "·"
    return f"{text(factor, '%', 3 if factor > 0.1 else 2)}"
