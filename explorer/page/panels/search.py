"""What it would take: the nearest design that meets everything, the best one, or a trade-off."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from ipywidgets import HTML, Button, Dropdown, HBox, IntSlider, Label, VBox

from ...design import Design
from ...domain import InputError
from ...inputs import INPUTS
from ...question import Answer
from ...registry import REGISTRY
from ...search import Found, Front, Goal, best_steps, front_steps, nearest_steps
from ...sentence import in_labels
from ...sturdy import sturdiest_steps
from ...units import text
from ..bounds import BoundsBox
from ..findings import changes, in_few_digits, outcome, paragraph, said, so_far, survival
from ..proposal import Proposal, found_by_search, moved_to
from ..state import State
from ..work import Work

#: What can be looked for.
KINDS = {
    "nearest that meets all": "nearest",
    "best in one quantity": "best",
    "most devices that pass": "sturdy",
    "trade-off of two": "front",
}

#: The panel's own name among the problems of the page.
SEAT = "search"


class GoalRow(HBox):
    """Most or least of a quantity."""

    def __init__(self, quantity: str, most: bool) -> None:
        names = [(e.label, e.name) for e in REGISTRY.quantities.values() if e.kind == "number"]
        self.most = Dropdown(
            options=[("most", True), ("least", False)], value=most, tooltip="Most or least"
        )
        self.quantity = Dropdown(options=names, value=quantity, tooltip="Of this quantity")
        super().__init__([self.most, self.quantity])
        self.add_class("x-goal")

    @property
    def goal(self) -> Goal:
        """What the row asks for."""
        return Goal(self.quantity.value, self.most.value)


class SearchPanel(VBox):
    """What to look for, within which bounds, and what was found; nothing changes until it is taken."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._work = Work()
        self._asked: Design | None = None
        self._sought = ""
        self._last: Found | Front | None = None
        self._front: Front | None = None
        self.kind = Dropdown(options=list(KINDS.items()), tooltip="What to look for")
        self.kind.add_class("x-menu")
        self.goals = (GoalRow("rate_in_fibre", True), GoalRow("half_angle", False))
        self.bounds = BoundsBox(state, SEAT)
        self.go = Button(description="search", tooltip="Look for it within these bounds")
        self.stop = Button(description="stop", tooltip="Keep the best so far")
        self.take = Button(description="take it", tooltip="Make it the design")
        self.take.add_class("mod-active")
        self.drop = Button(description="leave it", tooltip="Forget what was found")
        self.said = HTML()
        self.along = IntSlider(
            min=1, max=2, value=1, readout=False, tooltip="Which design of the trade-off"
        )
        self.along.add_class("x-slider")
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        buttons = HBox([self.go, self.stop, self.take, self.drop])
        buttons.add_class("x-choices")
        super().__init__(
            [
                _title("What would it take?"),
                self.kind,
                *self.goals,
                self.bounds,
                buttons,
                self.wrong,
                self.along,
                self.said,
            ]
        )
        self.add_class("panel-search")
        self._listen()
        self._show()

    def _listen(self) -> None:
        self.kind.observe(lambda _: self._show(), "value")
        self.go.on_click(lambda _: self._start())
        self.stop.on_click(lambda _: self._stop())
        self.take.on_click(lambda _: self._take())
        self.drop.on_click(lambda _: self._forget())
        self.along.observe(lambda _: self._choose(), "value")
        self._state.on_answer(self._follow)
        self._state.on_problem(self._complain)
        self._state.seat(SEAT)

    # ------------------------------------------------------------ asking

    def _steps(self, design: Design) -> Iterator[Any]:
        bounds = self.bounds.bounds()
        kind = self.kind.value
        if kind == "nearest":
            return nearest_steps(design.point, design.requirements, bounds)
        if kind == "sturdy":
            return sturdiest_steps(design, bounds)
        if kind == "best":
            return best_steps(design.point, self.goals[0].goal, design.requirements, bounds)
        goals = tuple(row.goal for row in self.goals)
        return front_steps(design.point, goals, design.requirements, bounds)

    def _start(self) -> None:
        self._forget()
        self._state.settle(SEAT)
        self._asked, self._sought = self._state.question.design, self.kind.value
        self.along.value, self._last = 1, None
        try:
            steps = self._steps(self._asked)
        except InputError as error:
            self._state.refuse(SEAT, str(error))
            return
        self._work.start(self._watched(steps), self._finish, self._failed)
        self._show()

    def _watched(self, steps: Iterator[Any]) -> Iterator[Any]:
        """The steps, with what is found so far said now and then."""
        for count, found in enumerate(steps):
            self._last = found
            if count % 5 == 0:
                self._tell(found, final=False)
            yield found

    def _stop(self) -> None:
        self._work.stop()
        if self._last is not None:
            self._tell(self._last, final=True)
        self._show()

    def _failed(self, error: Exception) -> None:
        self.said.value = ""
        self._state.refuse(SEAT, str(error))
        self._show()

    def _finish(self, found: Found | Front) -> None:
        self._tell(found, final=True)
        self._show()

    # ------------------------------------------------------------ showing

    def _tell(self, found: Found | Front, final: bool) -> None:
        """Say and show what is found so far or, finally, at all."""
        if isinstance(found, Front):
            self._front = found if found.points else None
            self.along.max = max(len(found.points), 2)
            self._choose()
            if self._front is None:
                self.said.value = paragraph(found.reason if final else so_far(found))
            return
        if final and self._asked is not None:
            found = in_few_digits(self._asked, found)
        reached = found.met or (self._sought == "sturdy" and bool(found.value))
        if found.changes and (final or reached):
            self._propose(found.point, reached)
        words = said(found) if final else so_far(found)
        table = changes(found.changes) + outcome(found.outcome)
        if final and self._asked is not None and self._sought != "sturdy":
            table += survival(self._asked, found.point)
        self.said.value = paragraph(words) + table

    def _choose(self) -> None:
        """Show one design of a trade-off, and the others as a line on the map."""
        front, asked = self._front, self._asked
        if front is None or asked is None:
            return
        index = min(self.along.value, len(front.points)) - 1
        point = front.points[index]
        if not self._work.busy:
            point = found_by_search(asked, moved_to(asked, point)).point
        self._propose(point, True, front.points)
        values = " · ".join(
            f"{REGISTRY.quantities[goal.quantity].label} "
            f"{text(float(value), REGISTRY.quantities[goal.quantity].unit)}"
            for goal, value in zip(front.goals, front.values[index], strict=True)
        )
        place = f"{index + 1} of {len(front.points)}: {values}" if len(front.points) > 1 else ""
        before = asked.evaluation
        moved = {
            name: (float(before.value(name)), float(value))
            for name, value in moved_to(asked, point).items()
            if not INPUTS[name].whole
        }
        alive = "" if self._work.busy else survival(asked, point)
        self.said.value = paragraph(front.reason) + paragraph(place) + changes(moved) + alive

    def _propose(
        self, point: Mapping[str, Any], met: bool, path: tuple[Mapping[str, Any], ...] = ()
    ) -> None:
        words = {"sturdy": "sturdiest", "front": "trade-off"}.get(self._sought, self._sought)
        self._state.propose(Proposal(dict(point), words if met else "closest", path))

    def _show(self) -> None:
        """What can be pressed now."""
        busy, found = self._work.busy, self._state.proposal is not None
        count = {"best": 1, "front": 2}.get(self.kind.value, 0)
        for index, row in enumerate(self.goals):
            row.layout.display = "" if index < count else "none"
        for widget, shown in (
            (self.go, not busy),
            (self.stop, busy),
            (self.take, found and not busy),
            (self.drop, found and not busy),
            (self.along, self._front is not None and len(self._front.points) > 1),
        ):
            widget.layout.display = "" if shown else "none"

    def _complain(self) -> None:
        self.wrong.value = in_labels(self._state.problems.get(SEAT, ""))

    # ------------------------------------------------------------ taking

    def _take(self) -> None:
        self._state.take_proposal()

    def _forget(self) -> None:
        self._work.stop()
        self._front = None
        self._state.propose(None)
        self.said.value = ""
        self._show()

    def _follow(self, answer: Answer) -> None:
        """What was found belongs to the design that was asked about."""
        if self._asked is not None and answer.question.design != self._asked:
            self._asked = None
            self._forget()


def _title(words: str) -> Label:
    label = Label(words)
    label.add_class("x-title")
    return label
