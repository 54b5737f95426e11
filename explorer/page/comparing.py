"""The present design beside a kept one: what comes out, and what went in, as HTML."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from html import escape
from typing import Any

from ..design import Design, written
from ..inputs import INPUTS
from ..question import READ_OUT, Answer
from ..registry import REGISTRY
from ..sentence import quantity_label
from ..units import text

#: A ratio closer to 1 than this is no change.
SAME = 5e-4


def compared(answer: Answer, letter: str, other: Design, outcome: Mapping[str, Any]) -> str:
    """Two tables: quantities of both with the change, and the inputs that differ.

    outcome: quantities of the kept design, all that `names_of` gives.
    """
    rows = "".join(_quantity(answer, name, other, outcome) for name in names_of(answer))
    head = f"<th scope=col>here</th><th scope=col>{letter}</th><th scope=col>change</th>"
    first = f'<table class="x-compared"><thead><tr><td></td>{head}</tr></thead><tbody>{rows}</tbody></table>'
    lines = "".join(_input(answer, name, other) for name in INPUTS if _differs(answer, name, other))
    if not lines:
        return f'{first}<p class="x-plain">Every input is the same as in {letter}.</p>'
    head = f"<th scope=col>here</th><th scope=col>{letter}</th>"
    return (
        f'{first}<table class="x-compared"><caption>inputs that differ</caption><thead><tr><td></td>'
        f"{head}</tr></thead><tbody>{lines}</tbody></table>"
    )


def names_of(answer: Answer) -> tuple[str, ...]:
    """The quantities that are compared: those required first, then what is always read out."""
    wanted = [entry.quantity for entry in answer.question.design.requirements]
    return tuple(dict.fromkeys([*wanted, *READ_OUT]))


def _quantity(answer: Answer, name: str, other: Design, outcome: Mapping[str, Any]) -> str:
    quantity = REGISTRY.quantities[name]
    here, there = answer.outcome[name], outcome[name]
    label = quantity_label(name, answer.values["destination"] == "free_space")
    if quantity.kind != "number":
        same = "·" if here == there else "other"
        return _row(label, [(str(here) or "none", ""), (str(there) or "none", ""), (same, "")])
    cells = [
        (text(float(value), quantity.unit), tone)
        for value, tone in (
            (here, _tone(answer.question.design, name, here)),
            (there, _tone(other, name, there)),
        )
    ]
    change, better = change_words(name, float(here), float(there)), ""
    for entry in answer.question.design.requirements:
        if entry.quantity == name and change != "·":
            more = float(here) > float(there)
            better = "x-fits" if more == (entry.at_least is not None) else "x-apart"
    return _row(label, [*cells, (change, better)])


def _tone(design: Design, name: str, value: Any) -> str:
    """How a value stands against the requirements of its own design."""
    wanted = [entry for entry in design.requirements if entry.quantity == name]
    if not wanted:
        return ""
    return "" if all(entry.met(float(value)) for entry in wanted) else "x-apart"


def change_words(name: str, here: float, there: float) -> str:
    """A change in the fewest signs: '×1.4' for what is compared in ratios, '+0.02' for the rest."""
    quantity = REGISTRY.quantities[name]
    if math.isnan(here) or math.isnan(there):
        return "·" if math.isnan(here) and math.isnan(there) else "no number"
    if here == there:
        return "·"
    if quantity.log and here > 0 and there > 0:
        ratio = here / there
        return "·" if abs(ratio - 1) < SAME else f"×{text(ratio, '1', 3)}"
    size = abs(here - there)
    if size < SAME * max(abs(here), abs(there)):
        return "·"
    return f"{'+' if here > there else '−'}{text(size, quantity.unit, 2)}"


def _differs(answer: Answer, name: str, other: Design) -> bool:
    return bool(answer.values[name] != other.evaluation.value(name))


def _input(answer: Answer, name: str, other: Design) -> str:
    entry = INPUTS[name]

    def words(value: Any) -> str:
        return "none" if value is None else written(name, value, 4)

    cells = [(words(answer.values[name]), ""), (words(other.evaluation.value(name)), "")]
    return _row(entry.label, cells)


def _row(label: str, cells: list[tuple[str, str]]) -> str:
    return f"<tr><th scope=row>{escape(label)}</th>{''.join(_cells(cells))}</tr>"


def _cells(cells: list[tuple[str, str]]) -> Iterator[str]:
    for words, tone in cells:
        yield f'<td class="{tone}">{escape(words)}</td>' if tone else f"<td>{escape(words)}</td>"
