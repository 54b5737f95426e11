"""Taking a design away as JSON, and bringing one back."""

from __future__ import annotations

from ipywidgets import HBox

from ...exact import RecordError
from ...record import LARGEST, design_from, design_text
from ..download import Download, File, file_name
from ..state import State
from ..upload import Upload


class FilesPanel(HBox):
    """Save and load."""

    def __init__(self, state: State) -> None:
        self._state = state
        self.save = Download("Save design", "Save this design point as JSON", self._saved)
        self.load = Upload(
            "Load design",
            "Load a design point from JSON",
            self._loaded,
            lambda words: state.refuse("", words),
            what="a design",
            largest=LARGEST,
            accept=".json,application/json",
        )
        super().__init__([self.save, self.load])
        self.add_class("panel-files")

    def _saved(self) -> File:
        design = self._state.question.design
        return file_name(design.name), "application/json", design_text(design).encode()

    def _loaded(self, name: str, content: bytes) -> None:
        try:
            design = design_from(content, name)
        except RecordError as error:
            self._state.refuse("", str(error))
            return
        self._state.ask(design=design)
