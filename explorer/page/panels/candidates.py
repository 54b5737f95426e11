"""Candidates: every published emitter in every published resonator, ranked by what is wanted."""

from __future__ import annotations

from typing import Any

from ipywidgets import Checkbox, Dropdown, HBox, Label, VBox

from ...candidates import Batch, batch_steps
from ...combine import combined
from ...design import Design
from ...domain import InputError
from ...question import Answer
from ..candidate_rows import columns, key_of, keys_of, rows
from ..records import PLACE
from ..state import State
from ..table import Table
from ..work import Work

#: How long a design must rest before the candidates are worked out anew [s].
REST = 0.3

OPTICS = (("optic: as in the design", "own"), ("optic: every one", "all"))


class CandidatesPanel(VBox):
    """A table of candidates; worked out only while it is open."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._work = Work()
        self._made: Any = None
        self._open = False
        self.optic = Dropdown(options=OPTICS, tooltip="Which optics are tried")
        self.scaled = Checkbox(
            description="resonators moved to the emitter's wavelength (nobody published them there)",
            tooltip="The same Q and the same V in (λ/n)³ at another wavelength",
            indent=False,
        )
        self.said = Label("")
        self.said.add_class("x-plain")
        head = HBox([self.optic, self.scaled, self.said])
        head.add_class("x-maphead")
        self.table = Table()
        self.table.add_class("x-table")
        super().__init__([head, self.table])
        self.add_class("panel-candidates")
        self.table.on_pick(self._pick)
        self.table.on_keep(self._keep)
        for menu in (self.optic, self.scaled):
            menu.observe(lambda _: self._ask(), "value")
        state.on_answer(self._follow)

    def opened(self, is_open: bool) -> None:
        """Called when the sheet that holds the table opens or closes."""
        self._open = is_open
        if is_open:
            self._ask(delay=0.001)
        elif self._work.busy:
            self._work.stop()
            self._made = None  # it was not finished

    def _key(self, design: Design) -> tuple[Any, ...]:
        return design, self.optic.value, self.scaled.value

    def _follow(self, answer: Answer) -> None:
        design = answer.question.design
        optic = "" if self.optic.value == "own" else design.optic
        self.table.current = key_of(design.emitter, design.resonator, optic)
        if self._open and self._made != self._key(design):
            self._ask()

    def _ask(self, delay: float = REST) -> None:
        design = self._state.question.design
        key = self._key(design)
        if not self._open or key == self._made:
            return
        self._made = key
        self.said.value = "working …"
        own = [""] if self.optic.value == "own" else None  # as it is, edited or not
        steps = batch_steps(design, optics=own, scaled=self.scaled.value)
        self._work.start(steps, lambda made: self._show(made, design), self._failed, delay)

    def _show(self, made: Batch, design: Design) -> None:
        every = self.optic.value == "all"
        found, count = rows(made, design, every)
        passing = sum(row.tone == "met" for row in found)
        cut = f", the best {len(found)} shown" if len(found) < count else ""
        said = f"{passing} of {count} meet everything{cut}"
        self.table.show(columns(design, every), found, f"Candidates: {said}")
        self.said.value = said

    def _failed(self, error: Exception) -> None:
        self.said.value = f"no candidates: {error}"

    def _design(self, row: str) -> Design:
        return combined(self._state.question.design, *keys_of(row), scaled=self.scaled.value)

    def _pick(self, row: str) -> None:
        self._state.change(lambda _: self._design(row), PLACE)

    def _keep(self, row: str) -> None:
        try:
            self._state.shortlist.keep(self._design(row))
        except InputError as error:  # a value of the design that does not go with these records
            self._state.refuse("", str(error))
