"""Steps back and forward through what was asked. Knows no widget and no clock of its own."""

from __future__ import annotations

from dataclasses import dataclass, field

from ..question import Question

#: Steps that are kept.
MOST = 500

#: Changes of one cause that follow each other within this time are one step [s]: a drag, a typed row.
TOGETHER = 0.8


@dataclass
class History:
    """Questions before the present one, and those after it that were left by going back."""

    past: list[Question] = field(default_factory=list)
    future: list[Question] = field(default_factory=list)
    _cause: str = ""
    _time: float = float("-inf")

    def note(self, before: Question, cause: str, now: float) -> None:
        """Remember the question before a change; what was ahead is forgotten.

        cause: what is changed, '' for a change that is a step of its own. now: a time [s].
        """
        same = cause != "" and cause == self._cause and now - self._time < TOGETHER
        if not (same and self.past and not self.future):
            self.past.append(before)
            del self.past[:-MOST]
        self.future.clear()
        self._cause, self._time = cause, now

    def forget(self, before: Question) -> None:
        """Take back a step that was refused."""
        if self.past and self.past[-1] == before:
            self.past.pop()
        self._cause = ""

    def back(self, present: Question) -> Question | None:
        """The question before; None where there is none."""
        return self._move(self.past, self.future, present)

    def forward(self, present: Question) -> Question | None:
        """The question that was left by going back; None where there is none."""
        return self._move(self.future, self.past, present)

    def _move(
        self, source: list[Question], target: list[Question], present: Question
    ) -> Question | None:
        if not source:
            return None
        target.append(present)
        self._cause = ""
        return source.pop()
