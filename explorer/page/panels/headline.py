"""The sentence: the meeting's question answered in words."""

from __future__ import annotations

from html import escape

from ipywidgets import HTML, VBox

from ...inputs import INPUTS
from ...question import Answer
from ..state import State


class HeadlinePanel(VBox):
    """Headline, details, and the complaints that are shown nowhere else."""

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
            f"<h1>{escape(said.headline)}</h1><p>{escape(' · '.join(parts))}"
            f"{'<br>' if parts else ''}{escape(said.known)}</p></div>"
        )

    def _complain(self) -> None:
        state = self._state
        said = [_of(name, text) for name, text in state.problems.items() if name not in state.seats]
        text = " · ".join(said)
        self.wrong.value = f'<p class="x-wrong" role="alert">{escape(text)}</p>' if text else ""


def _of(name: str, text: str) -> str:
    """A complaint with the label of its input in front."""
    return f"{INPUTS[name].label}: {text.removeprefix(f'{name} = ')}" if name in INPUTS else text
