"""Answers: each part of an answer is derived from the inputs that it needs, and kept while they stay.

`Answers.steps(question)` gives answers that grow: the design first, then the map, then what is not
known. A part whose inputs did not change is the same object as before, so whoever draws it can tell by
identity.
"""

from __future__ import annotations

import time
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from .budget import budget_rows
from .curves import Cut, angles, colours, cut
from .design import Design
from .domain import InputError
from .evaluate import Evaluation
from .fabrication import fabrication_key, passing_cut, passing_map_steps
from .inputs import INPUTS
from .later import CUT_CELLS, Kept, Later
from .maps import FRONTIERS, Axis, Map, make_map, stacked
from .question import READ_OUT, Answer, Question, fitting_axis
from .refusals import beyond
from .registry import REGISTRY, dependencies
from .sentence import met_by, next_step, sentence
from .yields import PASSING

#: Longest piece of work between two chances to hear of a newer question [s].
SLICE = 0.04

#: Longest that a map may take while a hand moves [s]; a slower one is drawn in fewer cells first.
DRAFT = 0.003

#: Longest band of rows of the whole map [s]: a key pressed meanwhile waits no longer.
BAND = 0.01

#: What a map takes however few its cells are [s]: not counted when bands are measured out.
FIXED = 0.003

#: Cells along an axis of a map of the devices that pass, and devices drawn for each cell.
YIELD_CELLS, YIELD_DRAWS = 96, 2048

#: Places along a cut of the devices that pass, and devices drawn at each, while a hand moves.
ROUGH_CELLS, ROUGH_DEVICES = 61, 256

#: Cells along each axis of a draft.
COARSER = (160, 128, 96, 64)


def _key(point: Mapping[str, Any], names: frozenset[str]) -> tuple[Any, ...]:
    """The entries of a point that a set of inputs and formulas can depend on."""
    return tuple((name, value) for name, value in point.items() if name in names)


def _needs(*names: str) -> frozenset[str]:
    return frozenset().union(*(dependencies(name) for name in names))


class Answers:
    """Works out answers, and remembers the parts of the last one.

    Not shared between threads; one a page.
    """

    def __init__(self) -> None:
        self._kept = Kept()
        self._later = Later()
        self._pace = 0.0  # seconds a cell of the last map

    def answer(self, question: Question) -> Answer:
        """The whole answer. Raises InputError."""
        *_, last = self.steps(question)
        return last

    def steps(self, question: Question) -> Iterator[Answer]:
        """The answer as it grows, in pieces of at most about SLICE seconds each.

        First the design, then the map, and after a moment of rest what is not known of it.
        """
        more = self._later.wanted(question)
        for answer in self._grown(question):
            whole = replace(answer, rest=True) if answer.whole and more else answer
            yield whole
        if more:
            yield from self._later.steps(whole)

    def _grown(self, question: Question) -> Iterator[Answer]:
        """The answer without ranges, as it grows."""
        first = self._without_map(question)
        key = self._map_key(question)
        if self._kept.has("map", key):
            yield self._finished(first, self._kept.last("map"))
            return
        if question.shown == PASSING:
            yield from self._passing_map(question, key, first)
            return
        waiting = first
        if self._pace * question.x.count * question.y.count > DRAFT:
            _check_ends(question)  # before a part of the map is shown
            for waiting in self._drafted(question, key, first):
                yield waiting
            waiting = replace(waiting, rest=False)
        for drawn in self._bands(question):
            if drawn is None:
                yield waiting
            else:
                self._kept.put("map", key, drawn)
                yield self._finished(first, drawn)

    def _passing_map(self, question: Question, key: Any, first: Answer) -> Iterator[Answer]:
        """The map of the devices that pass: coarse at once, the rest after a moment of rest.

        What else waits for rest comes before the finest map, which takes long.
        """
        _check_ends(question)
        x, y = (
            replace(axis, count=min(YIELD_CELLS, axis.count)) for axis in (question.x, question.y)
        )
        lines = tuple(name for name in self._wanted(question) if name != PASSING)
        marks, waiting = self._marks(question), first
        for done, drawn in passing_map_steps(question.design, x, y, YIELD_DRAWS, lines, marks):
            if done > 0 and waiting.map is not None and first.map is None:
                for answer in self._later.steps(waiting):
                    yield answer
                first = waiting = answer
            if drawn is not None and done < 1:
                waiting = replace(self._finished(first, drawn), whole=False, progress=done)
                yield replace(waiting, rest=waiting.progress == 0)
            elif drawn is not None:
                self._kept.put("map", key, drawn)
                yield self._finished(first, drawn)
            else:
                yield replace(waiting, progress=done)

    def _drafted(self, question: Question, key: Any, first: Answer) -> Iterator[Answer]:
        """A map of fewer cells, as many as DRAFT allows; a moment to rest before the whole one."""
        if not self._kept.has("draft", key):
            counts = [count for count in COARSER if self._pace * count**2 <= DRAFT]
            count = counts[0] if counts else COARSER[-1]
            if self._pace * count**2 > SLICE:  # slow even so: the readouts do not wait for it
                last = self._kept.last("map")
                yield replace(first, map=last if self._same_place(last, question) else None)
            x, y = (
                replace(axis, count=min(count, axis.count)) for axis in (question.x, question.y)
            )
            self._kept.put("draft", key, self._timed_map(question, x, y))
        drawn = self._kept.last("draft")
        yield replace(self._finished(first, drawn), whole=False, rest=True)

    def _finished(self, first: Answer, drawn: Map) -> Answer:
        met = met_by(first.question.design, first.outcome)
        said = "" if met else self._hint(first, drawn)
        return replace(first, map=drawn, whole=True, hint=said, progress=None)

    def _hint(self, first: Answer, drawn: Map) -> str:
        place = (float(first.values[drawn.x.name]), float(first.values[drawn.y.name]))
        requirements = first.question.design.requirements
        free = first.values["destination"] == "free_space"
        said: str = (
            self._kept.part(  # the key holds the map, or another one could take its identity
                "hint",
                (drawn, place, requirements, free),
                lambda: next_step(drawn, place, requirements, free),
            )
        )
        return said

    @staticmethod
    def _same_place(last: Map | None, question: Question) -> bool:
        """Whether an older map may stay on screen: same axes, same quantity."""
        return (
            last is not None
            and (last.x, last.y) == (question.x, question.y)
            and question.shown in last.values
        )

    def _bands(self, question: Question) -> Iterator[Map | None]:
        """The whole map in bands of rows of at most about BAND seconds; None between two."""
        x, y = question.x, question.y
        bands: list[Map] = []
        start = 0
        while start < y.count:
            if bands:
                yield None
            rows = int(np.clip(BAND / max(self._pace * x.count, 1e-12), 2, y.count))
            stop = start + rows if start + rows < y.count - 1 else y.count
            low, high = (float(y.at(edge / y.count)) for edge in (start, stop))
            part = replace(y, low=low, high=high, count=stop - start)
            bands.append(self._timed_map(question, x, part if stop - start < y.count else y))
            start = stop
        yield stacked(bands, y)

    def _timed_map(self, question: Question, x: Axis, y: Axis) -> Map:
        """A map, and how long a cell takes, not counting what others on the machine take."""
        start = time.thread_time()
        design, marks = question.design, self._marks(question)
        wanted = (*self._wanted(question), *marks)
        try:
            drawn = make_map(design.point, x, y, wanted, design.requirements, marks)
        except InputError as error:
            raise _refusal(question, error) from error
        taken = time.thread_time() - start
        self._pace = max(taken - FIXED, taken / 4) / (x.count * y.count)
        return drawn

    def _without_map(self, question: Question) -> Answer:
        design = question.design
        needed = {entry.quantity for entry in design.requirements}
        work = self._kept.part("work", design.point, lambda: design.evaluation)
        values = self._kept.part(
            "values", design.point, lambda: {name: work.value(name) for name in INPUTS}
        )
        names = (*READ_OUT, *needed, *({question.shown} & REGISTRY.quantities.keys()))
        outcome = self._kept.part(
            "outcome", (design.point, names), lambda: {name: _scalar(work, name) for name in names}
        )
        marks = self._kept.part(
            "cautions",
            design.point,
            lambda: tuple(name for name in REGISTRY.cautions if bool(work.value(name))),
        )
        rows = self._kept.part("rows", design.point, lambda: tuple(budget_rows(work)))
        free = work.value("destination") == "free_space"
        said = self._kept.part(
            "sentence",
            (design.point, design.requirements, design.origins),
            lambda: sentence(design, outcome, rows, free),
        )
        wide = self._kept.part(
            "angles", _key(design.point, _needs("collected_share")), lambda: angles(work)
        )
        spectral = _needs("filter_share", "other_filter_share", "cavity_share")
        seen = self._kept.part("colours", _key(design.point, spectral), lambda: colours(work))
        beam = self._kept.part(
            "half_angles",
            (question.x, _key(design.point, _needs("half_angle") - {question.x.name})),
            lambda: _along(design, question.x, "half_angle"),
        )
        width = float(work.value("emission_width"))
        line, fault = self._kept.part(
            "cut", (question.cut, _cut_key(question)), lambda: _cut(work, question)
        )
        seen_first = (question, values, outcome, marks, rows, said, wide, seen, width, beam)
        return Answer(*seen_first, map=None, cut=line, whole=False, cut_fault=fault)

    def _wanted(self, question: Question) -> tuple[str, ...]:
        lines = [name for name, _, _ in FRONTIERS] if "frontiers" in question.layers else []
        return (question.shown, *lines)

    def _marks(self, question: Question) -> tuple[str, ...]:
        if "hatching" not in question.layers:
            return ()
        shown = (
            [entry.quantity for entry in question.design.requirements]
            if question.shown == PASSING
            else [question.shown]
        )
        about = _needs(*shown)
        return tuple(
            mark.name
            for mark in REGISTRY.cautions.values()
            if about & {*mark.voids, *mark.about} or not (mark.voids or mark.about)
        )

    def _map_key(self, question: Question) -> tuple[Any, ...]:
        design = question.design
        wanted = self._wanted(question)
        marks = self._marks(question)
        known = [name for name in wanted if name != PASSING]
        scattering = (design.scatter, design.correlation) if PASSING in wanted else ()
        names = _needs(*known, *marks, *(entry.quantity for entry in design.requirements))
        names -= {question.x.name, question.y.name}
        return (
            wanted,
            marks,
            question.x,
            question.y,
            design.requirements,
            scattering,
            frozenset(_key(design.point, names)),
        )


def _scalar(work: Evaluation, name: str) -> Any:
    return np.asarray(work.result(name)).reshape(()).item()


def _check_ends(question: Question) -> None:
    """InputError where the map reaches beyond what an input allows."""
    x, y = (axis.values[[0, -1]] for axis in (question.x, question.y))
    try:
        ends = {question.x.name: x[None, :], question.y.name: y[:, None]}
        Evaluation({**question.design.point, **ends})
    except InputError as error:
        raise _refusal(question, error) from error


def _refusal(question: Question, error: InputError) -> InputError:
    """The same refusal in terms of the map's axes."""
    axes = {"the horizontal axis": question.x, "the vertical axis": question.y}
    return InputError(beyond(axes, question.design.point, error), error.name)


def _along(design: Design, axis: Axis, quantity: str) -> Any:
    """A quantity along an axis of mode volume; None along another, or where it does not vary."""
    if axis.name != "mode_volume":
        return None
    value = Evaluation({**design.point, axis.name: axis.values}).result(quantity)
    return np.asarray(value) if np.shape(value) == axis.values.shape else None


def _cut_key(question: Question) -> Any:
    """What a cut depends on."""
    share = question.cut is not None and question.cut[0] == PASSING
    return fabrication_key(question.design) if share else question.design.point


def _cut(work: Evaluation, question: Question) -> tuple[Cut | None, str]:
    """A curve through the point along one input's slider range, or why there is none."""
    if question.cut is None:
        return None, ""
    quantity, name = question.cut
    axes = {}
    try:
        cells = ROUGH_CELLS if quantity == PASSING else CUT_CELLS
        axes["the cut"] = fitting_axis(question.design, name, cells)
        if quantity == PASSING:
            return passing_cut(question.design, axes["the cut"], ROUGH_DEVICES), ""
        return cut(work, quantity, name, axes["the cut"].values), ""
    except InputError as error:
        return None, beyond(axes, question.design.point, error) if axes else str(error)
