"""The sentence: the meeting's question answered in words."""

from __future__ import annotations

from html import escape

from ipywidgets import HTML, VBox

from ...question import Answer
from ..state import State


class HeadlinePanel(VBox):
    """Headline, details, and a complaint that belongs to no input."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._hint = ""
        self.text = HTML()
        self.wrong = HTML()
        super().__init__([self.text, self.wrong])
        self.add_class("panel-headline")
        state.on_answer(self._draw)
        state.on_problem(self._complain)

    def _draw(self, answer: Answer) -> None:
        said = answer.sentence
        if answer.whole or said.met:  # until the map is there, its last hint stays
            self._hint = answer.hint
        parts = [part for part in (said.detail, self._hint) if part]
        word = {True: "met", False: "missed", None: "free"}[said.met]
        self.text.value = (
            f'<div class="x-said x-{word}" aria-live="polite" role="status">'
            f"<h1>{escape(said.headline)}</h1><p>{escape(' · '.join(parts))}</p></div>"
        )

    def _complain(self) -> None:
        text = self._state.problems.get("", "")
        self.wrong.value = f'<p class="x-wrong" role="alert">{escape(text)}</p>' if text else ""
