"""What can wait until a hand rests: ranges, rankings, limits, and the devices that pass.

Each part is kept with what it was worked out from, and worked out again when that changed.
"""

from __future__ import annotations

from collections.abc import Callable, Generator, Iterator
from dataclasses import replace
from typing import Any

from .curves import Cut
from .design import Design
from .domain import InputError
from .fabrication import Passing, fabrication_key, passing_cut, scatters
from .limiting import Limits, limits_of_design
from .question import Answer, Question, fitting_axis
from .sentence import passing_words, sentence
from .unknowns import Influence, Range, influences, open_names, range_steps
from .yields import PASSING

#: Places along a cut of the devices that pass, and devices drawn at each.
CUT_CELLS, CUT_DEVICES = 121, 2048


class Kept:
    """Parts that were worked out, each with what it depends on."""

    def __init__(self) -> None:
        self._parts: dict[str, tuple[Any, Any]] = {}

    def part(self, name: str, key: Any, make: Callable[[], Any]) -> Any:
        """A part, worked out anew where its key changed."""
        if not self.has(name, key):
            self.put(name, key, make())
        return self._parts[name][1]

    def has(self, name: str, key: Any) -> bool:
        """Whether a part is there for this key."""
        return name in self._parts and bool(self._parts[name][0] == key)

    def put(self, name: str, key: Any, value: Any) -> None:
        """Keep a part."""
        self._parts[name] = (key, value)

    def last(self, name: str) -> Any:
        """The last part of a name, whatever it was for; None if there was none."""
        return self._parts[name][1] if name in self._parts else None


class Later:
    """Works out what can wait, in pieces of some ten milliseconds."""

    def __init__(self) -> None:
        self._kept = Kept()

    @staticmethod
    def wanted(question: Question) -> bool:
        """Whether there is anything of the kind."""
        design = question.design
        cut = question.cut is not None and question.cut[0] == PASSING and bool(design.scatter)
        return bool(open_names(design) or question.ranked or cut or scatters(design))

    def steps(self, whole: Answer) -> Iterator[Answer]:
        """The whole answer again and again, and at last with everything that could wait."""
        design = whole.question.design
        ranges = yield from self._ranges(whole)
        ranking = yield from self._ranking(whole)
        line = yield from self._cut(whole)
        limits = yield from self._limits(whole)
        made = yield from self._passing(whole)
        free = whole.values["destination"] == "free_space"
        devices = passing_words(design, made.share, made.around, made.fault)
        yield replace(
            whole,
            ranges=ranges,
            ranking=ranking,
            limits=limits,
            cut=line,
            passing=made.share,
            passing_range=made.around,
            sentence=sentence(design, whole.outcome, whole.rows, free, ranges, devices),
            rest=False,
        )

    def _ranges(self, whole: Answer) -> Generator[Answer, None, dict[str, Range] | None]:
        """The ranges that the unknowns of the design leave."""
        design = whole.question.design
        if not open_names(design):
            return None
        key = (design.point, design.unknowns, tuple(whole.outcome))
        if not self._kept.has("ranges", key):
            found: dict[str, Range] = {}
            try:
                for name, between in range_steps(design, whole.outcome):
                    found[name] = between
                    yield whole
            except InputError:  # values within the ranges that cannot go together
                found = {}
            self._kept.put("ranges", key, found)
        known: dict[str, Range] = self._kept.last("ranges")
        return known

    def _ranking(self, whole: Answer) -> Generator[Answer, None, tuple[Influence, ...] | None]:
        """The unknowns by what they do to the quantity that is asked about."""
        design, quantity = whole.question.design, whole.question.ranked
        if not quantity:
            return None
        yield whole
        key = (design.point, design.unknowns, quantity)
        found: tuple[Influence, ...] = self._kept.part(
            "ranking", key, lambda: _influences(design, quantity)
        )
        return found

    def _cut(self, whole: Answer) -> Generator[Answer, None, Cut | None]:
        """The cut; of the devices that pass, one in more places and of more devices."""
        asked, design = whole.question.cut, whole.question.design
        if whole.cut is None or asked is None or asked[0] != PASSING:
            return whole.cut
        yield whole
        axis = fitting_axis(design, asked[1], CUT_CELLS)
        key = (fabrication_key(design), axis)
        found: Cut = self._kept.part("cut", key, lambda: passing_cut(design, axis, CUT_DEVICES))
        return found

    def _limits(self, whole: Answer) -> Generator[Answer, None, Limits | None]:
        """What holds back the quantity that is asked about."""
        design, quantity = whole.question.design, whole.question.ranked
        if not quantity:
            return None
        key = (fabrication_key(design), quantity)
        found: Limits | None = self._kept.last("limits") if self._kept.has("limits", key) else None
        if found is None or not found.whole:
            for found in limits_of_design(design, quantity):
                self._kept.put("limits", key, found)
                yield whole
        return found

    def _passing(self, whole: Answer) -> Generator[Answer, None, Passing]:
        """The devices that pass, where they are asked for and something is required."""
        design = whole.question.design
        if not scatters(design):
            return Passing(design)
        made: Passing = self._kept.part("passing", fabrication_key(design), lambda: Passing(design))
        for _ in made.steps():
            yield whole
        return made


def _influences(design: Design, quantity: str) -> tuple[Influence, ...]:
    try:
        return influences(design, quantity)
    except InputError:  # values within the ranges that cannot go together
        return ()
