"""Taking a design away as JSON, and bringing one back."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import anywidget
import traitlets
from ipywidgets import VBox

from ...exact import RecordError
from ...record import LARGEST, design_from, design_text
from ..download import file_name
from ..state import State


class Files(anywidget.AnyWidget):
    """Two buttons in the browser; files go through messages, never through the server's disk."""

    _esm = Path(__file__).parent.parent / "files.js"
    largest = traitlets.Int(LARGEST).tag(sync=True)


class FilesPanel(VBox):
    """Save and load."""

    def __init__(self, state: State) -> None:
        self._state = state
        self.files = Files()
        super().__init__([self.files])
        self.add_class("panel-files")
        self.files.on_msg(self._hear)

    def _hear(self, _widget: Any, content: dict[str, Any], buffers: list[Any]) -> None:
        kind, name = content.get("kind"), str(content.get("name", ""))[:200]
        if kind == "save":
            design = self._state.question.design
            self.files.send(
                {"kind": "file", "name": file_name(design.name)}, [design_text(design).encode()]
            )
        elif kind == "too large":
            size = float(content.get("size", 0)) / 1e6
            self._state.refuse(
                "", f"{name} has {size:.0f} MB; a design has at most {LARGEST / 1e6:.0f} MB"
            )
        elif kind == "load" and buffers:
            try:
                design = design_from(bytes(buffers[0]), name)
            except RecordError as error:
                self._state.refuse("", str(error))
                return
            self._state.ask(design=design)
