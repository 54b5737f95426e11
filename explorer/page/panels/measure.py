"""What to measure first: the unknowns by what they do to a quantity."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

from ipywidgets import HTML, Button, Dropdown, VBox

from ...inputs import INPUTS
from ...question import Answer
from ...registry import REGISTRY
from ...units import text
from ...unknowns import Influence
from ..state import State

NOTHING = "Nothing is given as a range. Type one, such as 3.4–3.9, into the number box of what is not known."


class MeasurePanel(VBox):
    """A ranked list, behind a press."""

    def __init__(self, state: State) -> None:
        self._state = state
        self.head = Button(
            description="▸ What to measure first",
            tooltip="Which unknown leaves a quantity open most: open or close",
        )
        self.head.add_class("x-group")
        options = [(e.label, e.name) for e in REGISTRY.quantities.values() if e.kind == "number"]
        self.quantity = Dropdown(options=options, tooltip="Quantity whose unknowns are ranked")
        self.quantity.add_class("x-menu")
        self.list = HTML()
        self.body = VBox([self.quantity, self.list])
        self.body.layout.display = "none"
        super().__init__([self.head, self.body])
        self.add_class("panel-measure")
        self.head.on_click(self._toggle)
        self.quantity.observe(lambda _: self._ask(), "value")
        state.on_answer(self._draw)

    def _toggle(self, _: Button) -> None:
        opening = self.body.layout.display == "none"
        self.body.layout.display = "" if opening else "none"
        self.head.description = f"{'▾' if opening else '▸'} What to measure first"
        if opening:
            wanted = self._state.question.design.requirements
            self.quantity.value = wanted[0].quantity if wanted else "rate_in_fibre"
        self._ask()

    def _ask(self) -> None:
        opened = self.body.layout.display != "none"
        self._state.ask(ranked=self.quantity.value if opened else "")

    def _draw(self, answer: Answer) -> None:
        if not answer.question.ranked:
            return
        if answer.ranking is None:
            self.list.value = '<p class="x-plain">working …</p>'
            return
        unit = REGISTRY.quantities[answer.question.ranked].unit
        self.list.value = ranked(answer.ranking, unit)


def ranked(rows: Sequence[Influence], unit: str) -> str:
    """The list as HTML: unknown, bar and share, and what the quantity is at the ends of its range."""
    if not rows:
        return f'<p class="x-plain">{escape(NOTHING)}</p>'
    body = "".join(_line(row, unit) for row in rows)
    return (
        '<table class="x-budget x-ranked"><caption>share of what is open that hangs on each; the '
        "quantity at the ends of each range alone</caption>"
        f"<tbody>{body}</tbody></table>"
    )


def _line(row: Influence, unit: str) -> str:
    ends = " – ".join(_two(row.low, row.high, unit))
    share = 100 * row.share
    return (
        f"<tr><th scope=row>{escape(INPUTS[row.name].label)}</th>"
        f'<td class="x-bar"><b style="width:{share:.1f}%"></b>'
        f'<span class="{"x-in" if share > 60 else "x-out"}" style="--at:{share:.1f}%">{escape(ends)}</span></td>'
        f'<td class="x-factor">{share:.0f} %</td></tr>'
    )


def _two(low: float, high: float, unit: str) -> list[str]:
    """Both ends to two digits, to three where two do not tell them apart."""
    for digits in (2, 3):
        shown = ["no number" if math.isnan(e) else text(e, unit, digits) for e in (low, high)]
        if shown[0] != shown[1]:
            break
    return shown
