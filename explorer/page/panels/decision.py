"""The decision: what the design is called, who decided, why, and what is open; and the brief."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import Any

from ipywidgets import HBox, Label, Text, Textarea, VBox

from ...brief import brief_of
from ...brief.drawings import map_drawing
from ...design import Decision, Design
from ...question import Answer
from ...registry import REGISTRY
from ..download import Download, File, file_name
from ..state import State

#: Where the panel's refusals are shown.
SEAT = "decision"

#: Field -> its label and what it is for.
FIELDS = {
    "name": ("Name", "What the design is called, in the brief and in file names"),
    "note": ("Note", "What a reader should know of it"),
    "who": ("Decided by", "Who decided, or who is to"),
    "why": ("Because", "Why this design and no other"),
    "doubts": ("Open doubts", "What could still turn the decision"),
}

LONG = ("note", "why", "doubts")


class DecisionPanel(VBox):
    """Five fields that go into the record and the brief, and the files to take away."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._quiet = False
        self.fields: dict[str, Any] = {}
        rows = [self._row(name, *words) for name, words in FIELDS.items()]
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        self.brief = Download("Save brief", "One page to print, as HTML", self._brief)
        self.picture = Download("Save map as SVG", "The map as a drawing", self._picture)
        buttons = HBox([self.brief, self.picture])
        buttons.add_class("x-extras")
        super().__init__([*rows, self.wrong, buttons])
        self.add_class("panel-decision")
        for name in (*FIELDS, ""):
            state.seat(_seat(name))
        state.on_answer(self._follow)
        state.on_problem(self._complain)

    def opened(self, is_open: bool) -> None:
        """Hear that the sheet opens or closes."""
        if not is_open:
            for name in (*FIELDS, ""):
                self._state.settle(_seat(name))

    def _row(self, name: str, label: str, hint: str) -> HBox:
        words = Label(label, tooltip=hint)
        words.add_class("x-name")
        kind = Textarea if name in LONG else Text
        field = kind("", continuous_update=False, tooltip=hint, placeholder=hint)
        field.observe(lambda change: self._written(name, change["new"]), "value")
        self.fields[name] = field
        row = HBox([words, field])
        row.add_class("x-head")
        return row

    def _written(self, name: str, words: str) -> None:
        if self._quiet:
            return

        def change(design: Design) -> Design:
            if name in {field.name for field in fields(Decision)}:
                return replace(design, decision=replace(design.decision, **{name: words}))
            return replace(design, **{name: words})

        self._state.change(change, (_seat(name),))

    def _follow(self, answer: Answer) -> None:
        design = answer.question.design
        self._quiet = True
        for name, field in self.fields.items():
            if _seat(name) in self._state.problems:  # what was typed stays until it is mended
                continue
            value = getattr(design.decision, name, None)
            value = getattr(design, name) if value is None else value
            if field.value != value:
                field.value = value
        self._quiet = False

    def _complain(self) -> None:
        problems = self._state.problems
        words = " ".join(filter(None, (problems.get(_seat(name)) for name in (*FIELDS, ""))))
        if words != self.wrong.value:
            self.wrong.value = words

    def _brief(self) -> File:
        name = file_name(self._state.question.design.name, "html")
        return name, "text/html", brief_of(self._state.answer).encode()

    def _picture(self) -> File | None:
        answer = self._state.answer
        drawn, shown = answer.map, answer.question.shown
        quantity = REGISTRY.quantities.get(shown)
        if (
            drawn is None
            or quantity is None
            or quantity.kind != "number"
            or shown not in drawn.values
        ):
            self._state.refuse(
                _seat(""), "Only a map of a number is saved as a drawing: choose another quantity."
            )
            return None
        place = (float(answer.values[drawn.x.name]), float(answer.values[drawn.y.name]))
        svg = map_drawing(drawn, shown, place, f"Map of {quantity.label}")
        return "map.svg", "image/svg+xml", svg.encode()


def _seat(name: str) -> str:
    """Where a refusal of a field is shown; '' is the panel itself."""
    return f"{SEAT} {name}".rstrip()
