"""The steps that one start tries in one round of a descent."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from .step import Array, Step, step

#: Reach of the trials of a round, over the reach that the last one left.
LADDER = (8.0, 1.0, 0.125, 1 / 64)


@dataclass(frozen=True)
class Try:
    """A step with its reach; family 0: the same reach on every axis, 1: each axis on its own scale."""

    step: Step
    family: int
    reach: float
    box: Array


@dataclass(eq=False)
class Trials:
    """Steps of falling reach from a place (n,) with outcome `seen` (1 + m,) and its slopes (1 + m, n).

    root: B^(-1/2) of the model, see `step`. reaches: of the two families. scale: of each axis (n,).
    """

    place: Array
    seen: Array
    slopes: Array
    root: Array
    reaches: Array
    scale: Array
    tries: list[Try] = field(default_factory=list)
    found: Array | None = None
    second: Trials | None = None
    weight: float = 0.0

    def filled(self) -> Trials:
        """The same with its steps worked out."""
        even = np.ones_like(self.scale)
        families = [even] if np.all(self.scale == 1) else [even, self.scale]
        for family, scale in enumerate(families):
            for factor in LADDER:
                reach = min(float(self.reaches[family]) * factor, 1 / float(scale.min()))
                self._add(family, reach, np.minimum(reach * scale, 1.0), self.seen[1:])
        # What is unmet weighs more than the constraints press, so that no step gains by breaking them.
        pressed = min((float(entry.step.pressure.sum()) for entry in self.tries), default=0.0)
        self.weight = min(2 * pressed + 1e-3, 1e6)
        return self

    def _add(self, family: int, reach: float, box: Array, margin: Array) -> None:
        last = self.tries[-1] if self.tries else None
        if last is not None and last.family == family and np.all(np.abs(last.step.move) <= box):
            return  # the same step again
        low, high = np.maximum(-self.place, -box), np.minimum(1 - self.place, box)
        found = step(self.root, self.slopes[0], margin, self.slopes[1:], low, high)
        if found is not None:
            self.tries.append(Try(found, family, reach, box))

    def corrected(self) -> Trials:
        """The same steps with the constraints as they are found at their ends."""
        assert self.found is not None  # the trials have been evaluated
        second = replace(self, tries=[], found=None)
        for entry, row in zip(self.tries, self.found, strict=True):
            margin = row[1:] - self.slopes[1:] @ entry.step.move
            second._add(entry.family, entry.reach, entry.box, margin)
        self.second = second
        return second

    def places(self) -> Array:
        """Where the steps lead, (tries, n)."""
        moves = np.reshape([entry.step.move for entry in self.tries], (-1, self.place.size))
        return np.asarray(np.clip(self.place + moves, 0.0, 1.0))

    def merit(self, seen: Array) -> Array:
        """The objective with what is unmet, of outcomes (…, 1 + m)."""
        unmet = np.maximum(-seen[..., 1:].min(axis=-1, initial=0.0), 0.0)
        return np.asarray(seen[..., 0] + self.weight * unmet)

    def gains(self) -> Array:
        """By how much each trial is better."""
        if self.found is None:
            return np.zeros(0)
        return np.asarray(self.merit(self.seen) - self.merit(self.found))

    def bent(self) -> bool:
        """Whether no trial is better, because the constraints bend away from their straight lines."""
        return bool(self.tries) and float(self.gains().max()) <= 0

    def best(self) -> tuple[Array, Array, Try] | None:
        """Place, outcome and step of the best trial; None where none is better."""
        least = 1e-15 * (1 + abs(float(self.merit(self.seen))))
        found = None
        for entry in (self, self.second):
            if entry is not None and entry.found is not None and len(entry.found):
                gains = entry.gains()
                at = int(np.argmax(gains))
                if gains[at] > least:
                    least, found = gains[at], (entry.places()[at], entry.found[at], entry.tries[at])
        return found

    def hope(self) -> bool:
        """Whether the model promises anything of the longest step."""
        if not self.tries:
            return False
        unmet = max(-float(self.seen[1:].min(initial=0.0)), 0.0)
        promised = [
            self.weight * (unmet - entry.step.unmet) - float(self.slopes[0] @ entry.step.move)
            for entry in self.tries
        ]
        return max(promised) > 1e-12 * (1 + abs(float(self.merit(self.seen))))
