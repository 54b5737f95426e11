"""The state of one page: one question, one answer. Knows no widget.

Panels ask with `ask`, `give`, `reset`; they draw in `on_answer`. An equal question notifies nobody,
which ends two-way loops. What cannot be is refused in one sentence, and the last answer stays.
"""

from __future__ import annotations

import asyncio
import time
from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from typing import Any

from ..answers import BAND, SLICE, Answers
from ..combine import PARTS, with_record
from ..design import Design, Unknown
from ..domain import InputError
from ..kept import Page
from ..question import Answer, Question
from ..sampling import displaced, draws
from ..scatter import Spread
from ..unknowns import spread as drawn_at
from .history import History
from .proposal import Proposal, found_by_search, moved_to
from .records import PLACE, as_published, placed, still_placed
from .shortlist import Shortlist

#: How long a hand must rest before a draft of the map gives way to the whole map [s].
REST = 0.3

Listener = Callable[[Answer], None]


class State:
    """One question and its answer, for one page.

    problems: what was refused, by the input (or the panel) that asked for it; '' is the page.
    seats: the names beside which a problem is shown; the headline shows all others.
    """

    def __init__(self, question: Question) -> None:
        self.question = self._before = question
        self.history = History()
        self.problems: dict[str, str] = {}
        self.seats: set[str] = set()
        self._cause = ""
        self.shortlist = Shortlist()
        self.proposal: Proposal | None = None
        self._onlookers: list[Callable[[], None]] = []
        self._answers = Answers()
        self._listeners: list[Listener] = []
        self._complaints: list[Callable[[], None]] = []
        self._handle: asyncio.TimerHandle | None = None
        steps = self._answers.steps(question)
        self._work: Iterator[Answer] | None = steps
        self.answer = self._whole = next(answer for answer in steps if answer.whole)
        self._rested = self.answer
        if not self._later(REST):  # what is not known can wait until the page stands
            for self.answer in steps:
                self._whole = self.answer

    def on_answer(self, listener: Listener) -> None:
        """Call a listener with every answer, the present one at once."""
        self._listeners.append(listener)
        listener(self.answer)

    def on_problem(self, listener: Callable[[], None]) -> None:
        """Call a listener when `problems` or `seats` changed."""
        self._complaints.append(listener)

    def seat(self, name: str) -> None:
        """From now on problems of this name are shown beside it."""
        self.seats.add(name)
        if name in self.problems:
            self._complain()

    def ask(self, **changes: Any) -> None:
        """Change parts of the question and answer it; equal questions do nothing.

        A question that cannot be is refused: its sentence goes to `problems`, nothing else changes.
        With a whole new design no older complaint stands.
        """
        try:
            question = replace(self.question, **changes)
        except InputError as error:
            self.refuse("", str(error))
            return
        self._go(question, self.problems if "design" in changes else ())

    def give(self, **values: Any) -> None:
        """Give inputs of the design, in SI, as typed by a person."""
        self.change(lambda design: design.with_values(**values), values)

    def give_range(self, name: str, low: float, high: float) -> None:
        """Say that an input is not known, but lies within a range, SI.

        Its value stays if it lies there, else it goes to the middle on the scale of its slider.
        """

        def change(design: Design) -> Design:
            value = float(design.evaluation.value(name))
            if not low <= value <= high:
                design = design.with_values(
                    **{name: float(drawn_at(name, Unknown(low, high), 0.5))}
                )
            elif name not in design.point:
                design = design.with_values(**{name: value})
            return replace(design, unknowns={**design.unknowns, name: Unknown(low, high)})

        self.change(change, (name,))

    def give_spread(self, name: str, spread: Spread | None) -> None:
        """Say that an input scatters from device to device, or (None) that it no longer does."""

        self.change(lambda design: scattering(design, name, spread), (name,))

    def give_scattering(self, name: str, centre: float, width: float) -> None:
        """Give an input with a normal scatter around it, SI, as a person typed both."""

        def change(design: Design) -> Design:
            return scattering(design.with_values(**{name: centre}), name, Spread("normal", width))

        self.change(change, (name,))

    def reset(self, *names: str) -> None:
        """Let inputs go back to what the design's records say of them, else to their defaults."""
        self.change(lambda design: as_published(design, names), names)

    def take_record(self, kind: str, key: str) -> None:
        """Take a catalogue record in place of that part of the design; '' keeps the values."""
        names = PARTS[kind] if key else ()
        self.change(lambda design: with_record(design, kind, key), names)

    def take_place(self, key: str, names: tuple[str, ...]) -> None:
        """Take only some inputs of a published resonator, with their origins."""
        self.change(lambda design: placed(design, key, names), names)

    def take_built(self, name: str) -> None:
        """Move the resonator to that of a measured device."""
        found = next((row for row in self.question.design.built if row.name == name), None)
        if found is not None:
            self.give(**found.point)

    def reading(self, name: str) -> float:
        """A quantity of the present design, also one that the answer does not carry."""
        if name in self.answer.outcome:
            return float(self.answer.outcome[name])
        return float(self.question.design.outcome([name])[name])

    def change(self, change: Callable[[Design], Design], names: Iterable[str]) -> None:
        """Change the design; `names`: what that settles, and beside which a refusal is said."""
        names = tuple(names)
        cause = names[0] if len(names) == 1 else ""
        try:
            design = change(self.question.design)
            if not set(PLACE).isdisjoint(names):
                design = still_placed(design)
        except InputError as error:
            self.refuse(cause, str(error))
            return
        same = design == self.question.design
        self._go(self.question if same else replace(self.question, design=design), names, cause)

    def undo(self) -> None:
        """Go back one step, if there is one."""
        self._visit(self.history.back(self.question))

    def redo(self) -> None:
        """Go forward one step that was gone back, if there is one."""
        self._visit(self.history.forward(self.question))

    def _visit(self, question: Question | None) -> None:
        """Show a question of the history; what is ranked belongs to the view that is open."""
        if question is not None:
            self.propose(None)
            self._go(replace(question, ranked=self.question.ranked), self.problems, step=False)

    def restore(self, page: Page) -> None:
        """Show a question and a shortlist that were kept; there is no step back from it."""
        self.propose(None)
        self.shortlist.replace(page.kept)
        self._go(page.question, self.problems, step=False)
        self.history = History()
        self._tell(self.answer)

    def on_proposal(self, listener: Callable[[], None]) -> None:
        """Call a listener when `proposal` changed."""
        self._onlookers.append(listener)

    def propose(self, proposal: Proposal | None) -> None:
        """Show a design that may be taken, or (None) none."""
        if proposal is not self.proposal:
            self.proposal = proposal
            for listener in self._onlookers:
                listener()

    def take_proposal(self) -> None:
        """Make the proposed design the present one."""
        if self.proposal is None:
            return
        moved = moved_to(self.question.design, self.proposal.point)
        self.propose(None)
        self.change(lambda design: found_by_search(design, moved), moved)

    def settle(self, name: str) -> None:
        """Drop what was said beside a name."""
        if name in self.problems:
            self.problems = {key: said for key, said in self.problems.items() if key != name}
            self._complain()

    def refuse(self, name: str, message: str) -> None:
        """Say beside an input (or, with '', on the page) why something was not done."""
        self.problems = {**self.problems, name: message}
        self._complain()

    def _go(
        self, question: Question, names: Iterable[str], cause: str = "", step: bool = True
    ) -> None:
        """Settle the problems of some names and of the page, and answer a question if it is new.

        step: whether it can be undone; another ranking cannot, since it shows a view, and no change.
        """
        names = tuple(names)
        kept = {name: text for name, text in self.problems.items() if name and name not in names}
        settled = kept != self.problems
        self.problems = kept
        if question != self.question:
            if step and replace(question, ranked=self.question.ranked) != self.question:
                self.history.note(self.question, " ".join(sorted(names)), time.monotonic())
            self._start(question, cause)
        if settled:  # after the answer, so that a field goes to its new value at once
            self._complain()

    def _complain(self) -> None:
        for listener in self._complaints:
            listener()

    def _start(self, question: Question, cause: str = "") -> None:
        """Answer a new question; what is left of an older one is dropped."""
        if self._handle is not None:
            self._handle.cancel()
        self._before, self._cause = self.question, cause
        self.question = question
        self._work = self._answers.steps(question)
        self._go_on(first=True)

    def stop(self) -> None:
        """Leave what is being worked out as it is: the last that was finished stays on the page."""
        if self._handle is not None:
            self._handle.cancel()
        self._handle, self._work = None, None
        if self.answer.progress is not None:
            self._tell(replace(self.answer, progress=None, rest=False))

    def _go_on(self, first: bool = False) -> None:
        """Work for one slice; the rest waits for its turn on the event loop, if there is one.

        The first part goes out before the map is begun: the browser draws it meanwhile.
        """
        self._handle = None
        end = time.perf_counter() + (SLICE if first else BAND)
        newest: Answer | None = None
        try:
            for newest in self._work or ():
                if first and not newest.whole and _in_a_loop():
                    self._tell(newest)
                first = False
                if newest.rest and newest is not self._rested:  # once, however often it comes
                    self._rested = newest
                    if self._later(REST):
                        break
                if time.perf_counter() > end and self._later():
                    break
        except InputError as error:  # an axis of the map reaches beyond what another input allows
            self._return(str(error))
            return
        if newest is not None and newest is not self.answer:
            self._tell(newest)

    def _return(self, message: str) -> None:
        """Go back to the question before the one that its map refused, and finish its answer."""
        before, cause = self._before, self._cause
        self.history.forget(before)
        # Should the map refuse that one too, the last question with a whole map is left.
        self.question = self._whole.question
        if self.answer.whole and not self.answer.rest and self.answer.question == before:
            self.question, self._work = before, None
        else:
            self._start(before)
        self.refuse(cause, message)

    def _tell(self, answer: Answer) -> None:
        self.answer = answer
        if answer.whole:
            self._whole = answer
        for listener in self._listeners:
            listener(answer)

    def _later(self, delay: float = 0.001) -> bool:
        if not _in_a_loop():
            return False
        self._handle = asyncio.get_running_loop().call_later(delay, self._go_on)
        return True


def scattering(design: Design, name: str, spread: Spread | None) -> Design:
    """A design of which an input scatters so, or no longer. InputError where it cannot."""
    changed = design.with_scatter(name, spread)
    if spread is not None:
        draws(changed.scatter, 1, correlation=changed.correlation)
        displaced(draws({name: spread}, 1), design.point)
    return changed


def _in_a_loop() -> bool:
    """Whether an event loop runs here, as it does in a kernel."""
    try:
        asyncio.get_running_loop()
    except RuntimeError:
        return False
    return True
