"""Designs that are kept to be compared: at most four, A to D. Knows no widget."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from ..catalogue import emitters, resonators
from ..design import Design

LETTERS = "ABCD"


class Shortlist:
    """Letter -> design; listeners hear of every change."""

    def __init__(self) -> None:
        self.kept: dict[str, Design] = {}
        self.deleted: list[tuple[str, Design]] = []  # the last one last
        self._listeners: list[Callable[[], None]] = []

    def on_change(self, listener: Callable[[], None]) -> None:
        """Call a listener after every change."""
        self._listeners.append(listener)

    def keep(self, design: Design) -> str | None:
        """Keep a design under the first free letter; None where all are taken.

        A design that is kept already stays under its letter.
        """
        for letter, known in self.kept.items():
            if known == design:
                return letter
        letter = next((one for one in LETTERS if one not in self.kept), None)
        if letter is not None:
            self.kept = dict(sorted({**self.kept, letter: design}.items()))
            self._tell()
        return letter

    def drop(self, letter: str) -> None:
        """Keep a design no longer; `bring_back` undoes it."""
        if letter in self.kept:
            self.deleted.append((letter, self.kept[letter]))
            self.kept = {one: design for one, design in self.kept.items() if one != letter}
            self._tell()

    def bring_back(self) -> None:
        """Keep the design again that was dropped last, under its letter, or the first that is free."""
        if not self.deleted or self.full:
            return
        letter, design = self.deleted.pop()
        if letter in self.kept:
            letter = next(one for one in LETTERS if one not in self.kept)
        self.kept = dict(sorted({**self.kept, letter: design}.items()))
        self._tell()

    def exchange(self, letter: str, design: Design) -> None:
        """Keep another design under a letter that is taken."""
        if letter in self.kept and self.kept[letter] != design:
            self.kept = {**self.kept, letter: design}
            self._tell()

    def move(self, letter: str, by: int) -> str:
        """Change places with the next kept design, earlier (−1) or later (+1); gives the new letter."""
        letters = list(self.kept)
        place = letters.index(letter) + by if letter in letters else -1
        if not 0 <= place < len(letters):
            return letter
        other = letters[place]
        self.kept = {**self.kept, letter: self.kept[other], other: self.kept[letter]}
        self._tell()
        return other

    def replace(self, kept: Mapping[str, Design]) -> None:
        """Keep these designs in place of all others."""
        if dict(kept) != self.kept:
            self.kept = {letter: kept[letter] for letter in sorted(kept) if letter in LETTERS}
            self._tell()

    @property
    def full(self) -> bool:
        """Whether every letter is taken."""
        return len(self.kept) == len(LETTERS)

    def _tell(self) -> None:
        for listener in self._listeners:
            listener()


def short_name(design: Design) -> str:
    """What a kept design is called: its emitter in its resonator, else its own name."""
    emitter, resonator = emitters().get(design.emitter), resonators().get(design.resonator)
    parts = [_first(record.name) for record in (emitter, resonator) if record is not None]
    return " · ".join(parts) or design.name or "own values"


def _first(name: str) -> str:
    """A record's name up to its first comma."""
    return name.split(",", maxsplit=1)[0]
