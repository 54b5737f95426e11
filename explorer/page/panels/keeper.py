"""The page's work, kept in the browser: brought back on the next visit, or opened by a link."""

from __future__ import annotations

import asyncio
from pathlib import Path
from typing import Any

import anywidget
import traitlets
from ipywidgets import VBox

from ...domain import InputError
from ...exact import RecordError
from ...kept import Page, from_link, link_of, page_from, page_text
from ...question import Answer
from ..state import State
from ..work import in_a_loop

#: How long nothing must change before the work is kept [s].
QUIET = 0.25

#: Longest text that is taken from the browser [signs].
LONGEST = 20_000_000

FULL = "This browser has no room to keep the page: save the design as a file before you leave."

LOST = "What this browser had kept could not be brought back, and the first question stands here: "


class Keeper(anywidget.AnyWidget):
    """The button of the link, and the browser's own memory."""

    _esm = Path(__file__).parent.parent / "keeper.js"
    keeps = traitlets.Bool(True).tag(sync=True)


class KeeperPanel(VBox):
    """Keeps every question once a hand rests; keeps: whether to bring one back on opening."""

    def __init__(self, state: State, keeps: bool = True) -> None:
        self._state = state
        self._keeps = keeps
        self._last: Any = None
        self._opened = not keeps
        self._handle: asyncio.TimerHandle | None = None
        self.keeper = Keeper(keeps=keeps)
        super().__init__([self.keeper])
        self.add_class("panel-keeper")
        self.keeper.on_msg(self._hear)
        state.on_answer(self._answered)
        state.shortlist.on_change(self._changed)

    def _hear(self, _widget: Any, content: dict[str, Any], _buffers: Any) -> None:
        kind = content.get("kind")
        if kind == "link":
            self._give_link()
        elif kind == "full":
            self._state.refuse("", FULL)
        elif kind == "open" and not self._opened:
            self._opened = True
            self._open(str(content.get("text", "")), str(content.get("kept", "")))

    def _give_link(self) -> None:
        try:
            self.keeper.send({"kind": "link", "text": link_of(self._state.question)})
        except InputError as error:
            self._state.refuse("", str(error))

    def _open(self, link: str, kept: str) -> None:
        """Show what a link or the browser's memory holds; what cannot be read is said."""
        try:
            if link:
                page = from_link(link)
                self.keeper.send({"kind": "taken"})
            elif kept and len(kept) <= LONGEST:
                page = page_from(kept)
            else:
                return
        except RecordError as error:
            self._state.refuse("", f"{'' if link else LOST}{error}")
            return
        self._opened = False  # what comes back is there already
        self._state.restore(page)
        self._opened, self._last = True, (page.question, dict(page.kept))
        if page.missing:
            names = ", ".join(f"{name} ({digest[:8]}…)" for name, digest in page.missing.items())
            self._state.refuse(
                "", f"The link does not carry measured data: load {names} under “Measured data”"
            )

    def _answered(self, answer: Answer) -> None:
        if self._last is None or answer.question is not self._last[0]:
            self._changed()

    def _changed(self) -> None:
        """Keep the work after a moment of quiet; without an event loop at once."""
        if not self._keeps or not self._opened:
            return
        if self._handle is not None:
            self._handle.cancel()
        if in_a_loop():
            self._handle = asyncio.get_running_loop().call_later(QUIET, self._keep)
        else:
            self._keep()

    def _keep(self) -> None:
        self._handle = None
        now = (self._state.question, dict(self._state.shortlist.kept))
        if now != self._last:
            self._last = now
            self.keeper.send({"kind": "keep", "text": page_text(Page(*now))})
