"""A button that takes one file of the person's; its bytes come as a message, never over the server's disk."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import anywidget
import traitlets

#: Largest file that the browser sends [bytes].
LARGEST = 20_000_000


class Upload(anywidget.AnyWidget):
    """Calls `taken(name, content)` with a file, or `refused(sentence)` with why there is none.

    what: what a file is called in that sentence. largest: file that the browser sends [bytes]. accept:
    kinds of files that its dialogue shows, '' for all.
    """

    _esm = Path(__file__).parent / "upload.js"
    text = traitlets.Unicode("Load file").tag(sync=True)
    hint = traitlets.Unicode("").tag(sync=True)
    largest = traitlets.Int(LARGEST).tag(sync=True)
    accept = traitlets.Unicode("").tag(sync=True)

    def __init__(
        self,
        text: str,
        hint: str,
        taken: Callable[[str, bytes], None],
        refused: Callable[[str], None],
        what: str = "a measured file",
        largest: int = LARGEST,
        accept: str = "",
    ) -> None:
        super().__init__(text=text, hint=hint, largest=largest, accept=accept)
        self._taken, self._refused, self._what = taken, refused, what
        self.on_msg(self._hear)

    def _hear(self, _widget: Any, content: dict[str, Any], buffers: list[Any]) -> None:
        name = "".join(s for s in str(content.get("name", ""))[:200] if s.isprintable()) or "file"
        kind = content.get("kind")
        if kind == "too large":
            size = float(content.get("size", 0)) / 1e6
            self._refused(
                f"{name} has {size:.0f} MB; {self._what} has at most {self.largest / 1e6:.0f} MB"
            )
        elif kind == "unreadable":
            self._refused(f"{name} cannot be read")
        elif kind == "file" and buffers:
            self._taken(name, bytes(buffers[0]))
