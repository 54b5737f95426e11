"""The state of one page: one question, one answer. Knows no widget.

Panels ask with `ask`, `give`, `reset`; they draw in `on_answer`. An equal question notifies nobody,
which ends two-way loops. What cannot be is refused in one sentence, and the last answer stays.
"""

from __future__ import annotations

import asyncio
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Any

from ..design import Design
from ..domain import InputError
from ..question import BAND, SLICE, Answer, Answers, Question
from .records import point_of

#: How long a hand must rest before a draft of the map gives way to the whole map [s].
REST = 0.3

Listener = Callable[[Answer], None]


class State:
    """One question and its answer, for one page."""

    def __init__(self, question: Question) -> None:
        self.question = question
        self.problems: dict[str, str] = {}
        self._answers = Answers()
        self._listeners: list[Listener] = []
        self._complaints: list[Callable[[], None]] = []
        self._work: Iterator[Answer] | None = None
        self._handle: asyncio.TimerHandle | None = None
        self.answer = self._whole = self._answers.answer(question)

    def on_answer(self, listener: Listener) -> None:
        """Call a listener with every answer, the present one at once."""
        self._listeners.append(listener)
        listener(self.answer)

    def on_problem(self, listener: Callable[[], None]) -> None:
        """Call a listener when `problems` changed."""
        self._complaints.append(listener)

    def ask(self, **changes: Any) -> None:
        """Change parts of the question and answer it; equal questions do nothing.

        A question that cannot be is refused: its sentence goes to `problems`, nothing else changes.
        """
        try:
            question = replace(self.question, **changes)
        except InputError as error:
            self.refuse(error.name or "", str(error))
            return
        self._settle(set())
        if question != self.question:
            self._start(question)

    def give(self, **values: Any) -> None:
        """Give inputs of the design, in SI, as typed by a person."""
        self._change(lambda design: design.with_values(**values), set(values))

    def reset(self, *names: str) -> None:
        """Let inputs go back to their defaults."""
        self._change(lambda design: design.without_values(*names), set(names))

    def take_record(self, kind: str, key: str, replaced: tuple[str, ...]) -> None:
        """Take a catalogue record: its values with their origins, in place of `replaced`."""
        values, origins = point_of(kind, key)

        def change(design: Design) -> Design:
            cleared = design.without_values(*replaced) if key else design
            return replace(
                cleared,
                point={**cleared.point, **values},
                origins={**cleared.origins, **origins},
                **{kind: key},
            )

        self._change(change, set(values))

    def take_place(self, key: str, names: tuple[str, ...]) -> None:
        """Take only some inputs of a published resonator, with their origins."""
        values, origins = point_of("resonator", key)
        values = {name: value for name, value in values.items() if name in names}

        def change(design: Design) -> Design:
            return replace(
                design,
                point={**design.point, **values},
                origins={**design.origins, **{name: origins[name] for name in values}},
            )

        self._change(change, set(values))

    def reading(self, name: str) -> float:
        """A quantity of the present design, also one that the answer does not carry."""
        if name in self.answer.outcome:
            return float(self.answer.outcome[name])
        return float(self.question.design.outcome([name])[name])

    def _change(self, change: Callable[[Design], Design], names: set[str]) -> None:
        try:
            design = change(self.question.design)
        except InputError as error:
            self.refuse(next(iter(names)) if len(names) == 1 else error.name or "", str(error))
            return
        self._settle(names)
        if design != self.question.design:
            self._start(replace(self.question, design=design))

    def refuse(self, name: str, message: str) -> None:
        """Say beside an input (or, with '', on the page) why something was not done."""
        self.problems = {**self.problems, name: message}
        self._complain()

    def _settle(self, names: set[str]) -> None:
        kept = {name: text for name, text in self.problems.items() if name and name not in names}
        if kept != self.problems:
            self.problems = kept
            self._complain()

    def _complain(self) -> None:
        for listener in self._complaints:
            listener()

    def _start(self, question: Question) -> None:
        """Answer a new question; what is left of an older one is dropped."""
        if self._handle is not None:
            self._handle.cancel()
        self.question = question
        self._work = self._answers.steps(question)
        self._go_on(first=True)

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
                if newest.rest and self._later(REST):
                    break
                if not newest.whole and time.perf_counter() > end and self._later():
                    break
        except InputError as error:  # an axis of the map reaches beyond what another input allows
            self.question = self._whole.question
            if self.answer is not self._whole:
                self._tell(self._whole)
            self.refuse(error.name or "", str(error))
            return
        if newest is not None and newest is not self.answer:
            self._tell(newest)

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


def _in_a_loop() -> bool:
    """Whether an event loop runs here, as it does in a kernel."""
    try:
        asyncio.get_running_loop()
    except RuntimeError:
        return False
    return True
