"""The shortlist at the foot: up to four kept designs, A to D, and what opens the sheets."""

from __future__ import annotations

from ipywidgets import Button, HBox, VBox

from ...question import Answer
from ...registry import REGISTRY
from ...units import text
from ..shortlist import short_name
from ..state import State

#: Quantities on a card where the design has no requirements.
USUAL = ("rate_in_fibre", "g2_zero")


class ShortlistPanel(HBox):
    """Cards of kept designs; pressing one shows it again."""

    def __init__(self, state: State) -> None:
        self._state = state
        self.keep = Button(
            description="keep this", tooltip="Keep the present design to compare it (A to D)"
        )
        self.keep.add_class("x-keep")
        self.cards = HBox()
        self.cards.add_class("x-cards")
        super().__init__([self.cards, self.keep])
        self.add_class("panel-shortlist")
        self.keep.on_click(lambda _: state.shortlist.keep(state.question.design))
        state.shortlist.on_change(self._draw)
        state.on_answer(self._mark)
        self._draw()

    def _draw(self) -> None:
        for old in self.cards.children:
            old.close()
        self.cards.children = [self._card(letter) for letter in self._state.shortlist.kept]
        self._mark(self._state.answer)

    def _card(self, letter: str) -> VBox:
        design = self._state.shortlist.kept[letter]
        wanted = list(dict.fromkeys(entry.quantity for entry in design.requirements))[:2]
        found = design.outcome([*(wanted or USUAL), *(e.quantity for e in design.requirements)])
        met = all(bool(entry.met(found[entry.quantity])) for entry in design.requirements)
        values = " · ".join(_shown(name, found[name]) for name in (wanted or USUAL))
        mark = "" if not design.requirements else " ✓" if met else " ✗"
        name = short_name(design)
        show = Button(
            description=f"{letter}  {values}{mark}",
            tooltip=f"{letter}: {name}. Press to show this design",
        )
        show.add_class("x-card")
        if met:
            show.add_class("x-met")
        drop = Button(description="×", tooltip=f"Keep {letter} no longer")
        drop.add_class("x-back")
        show.on_click(lambda _: self._state.ask(design=design))
        drop.on_click(lambda _: self._state.shortlist.drop(letter))
        box = HBox([show, drop])
        box.add_class(f"card-{letter}")
        return box

    def _mark(self, answer: Answer) -> None:
        kept = self._state.shortlist.kept
        here = next((one for one, design in kept.items() if design == answer.question.design), "")
        for letter, box in zip(kept, self.cards.children, strict=True):
            (box.add_class if letter == here else box.remove_class)("x-here")
        self.keep.disabled = bool(here) or self._state.shortlist.full


def _shown(name: str, value: float) -> str:
    """A quantity on a card: '21.3 M/s', 'g²(0) 0.0446'."""
    quantity = REGISTRY.quantities[name]
    words = text(value, quantity.unit)
    return words if quantity.unit == "1/s" else f"{quantity.symbol} {words}"
