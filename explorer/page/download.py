"""A button that hands one file to the person, made when it is pressed."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import anywidget
import traitlets

#: Name, media type and bytes of a file; None where there is none.
File = tuple[str, str, bytes]


class Download(anywidget.AnyWidget):
    """Calls `make()` when it is pressed, and gives the file to the browser."""

    _esm = Path(__file__).parent / "download.js"
    text = traitlets.Unicode("").tag(sync=True)
    hint = traitlets.Unicode("").tag(sync=True)

    def __init__(self, text: str, hint: str, make: Callable[[], File | None]) -> None:
        super().__init__(text=text, hint=hint)
        self._make = make
        self.on_msg(self._hear)

    def _hear(self, _widget: Any, content: dict[str, Any], _buffers: Any) -> None:
        made = self._make() if content.get("kind") == "fetch" else None
        if made is not None:
            name, kind, content_ = made
            self.send({"kind": "file", "name": name, "type": kind}, [content_])


def file_name(title: str, ending: str = "json") -> str:
    """A file name made of a design's name."""
    plain = re.sub(r"[^A-Za-z0-9]+", "-", title).strip("-").lower()[:60]
    return f"{plain or 'design'}.{ending}"
