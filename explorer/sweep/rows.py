"""The work on one block of rows: evaluated as a grid, rows that cannot be left without number."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..domain import InputError, quoted
from ..evaluate import Evaluation
from ..inputs import INPUTS
from ..registry import REGISTRY
from .blocks import Block
from .faults import PlanError, culprits, mended, parts_that_can_be, reason_of

Array = NDArray[np.float64]


def kind_of(name: str) -> str:
    """'number', 'choice' or 'mask': what stands in a wanted column."""
    if name in REGISTRY.cautions:
        return "mask"
    if name in INPUTS:
        return "choice" if INPUTS[name].choices else "number"
    return REGISTRY.quantities[name].kind


def wanted_names(wanted: Any, columns: Iterable[str] = ()) -> tuple[str, ...]:
    """The wanted columns, each once, without those that are there anyway. Raises PlanError."""
    if not isinstance(wanted, str | Iterable) or isinstance(wanted, bytes):
        raise PlanError(f"wanted = {quoted(wanted)} is no list of names")
    names = [wanted] if isinstance(wanted, str) else list(dict.fromkeys(wanted))
    public = REGISTRY.quantities.keys() | REGISTRY.cautions.keys()
    for name in names:
        if not isinstance(name, str) or (name not in public and name not in INPUTS):
            known = ", ".join(sorted(public))
            raise PlanError(f"{quoted(name)} is no quantity; the quantities are: {known}")
        if name in INPUTS and INPUTS[name].types:
            raise PlanError(f"{name} is neither a number nor a choice, so it is no column", name)
    if not names:
        raise PlanError("nothing is wanted: name a quantity, a caution or an input")
    return tuple(name for name in names if name not in set(columns))


@dataclass(frozen=True, eq=False)
class Worked:
    """A block with its answers, each in a shape that broadcasts to `shape`.

    columns: number inputs, SI. found: wanted -> numbers (not-a-number where there is none), words or
    truth values. culprit: the input at fault, '' where none is. reason: of the first row at fault.
    """

    shape: tuple[int, ...]
    columns: Mapping[str, Array]
    found: Mapping[str, Any]
    culprit: NDArray[Any]
    reason: str = ""

    @cached_property
    def bad(self) -> NDArray[np.bool_]:
        """Where a row is refused."""
        return np.asarray(self.culprit != "")

    @property
    def refused(self) -> int:
        """How many rows are."""
        return int(np.broadcast_to(self.bad, self.shape).sum())


def work_out(block: Block, wanted: tuple[str, ...]) -> Worked:
    """Evaluate a block. Rows whose inputs cannot go together are refused, the others answered."""
    try:
        point, columns = block.point()
    except InputError as error:  # nothing can be drawn about what the rows share
        return _all_refused(block, wanted, error)
    fine: NDArray[Any] = np.array("", dtype=object)
    try:
        return Worked(block.shape, columns, _answers(Evaluation(point), wanted), fine)
    except InputError:
        pass
    culprit = culprits(point)
    whole = mended(point, culprit)
    try:
        answers = _answers(Evaluation(whole), wanted) if whole else {}
    except InputError:
        return _by_parts(block.shape, point, columns, wanted, culprit)
    bad = culprit != ""
    found = {name: _voided(name, answers.get(name), bad) for name in wanted}
    return Worked(block.shape, columns, found, culprit, _first_reason(block.shape, point, culprit))


def _answers(work: Evaluation, wanted: tuple[str, ...]) -> dict[str, Any]:
    found = {}
    for name in wanted:
        value = work.value(name) if name in INPUTS else work.result(name)
        found[name] = np.asarray(value, dtype=float if kind_of(name) == "number" else None)
    return found


def _empty(name: str) -> Any:
    return {"number": np.nan, "choice": "", "mask": False}[kind_of(name)]


def _voided(name: str, answer: Any, bad: NDArray[np.bool_]) -> NDArray[Any]:
    """An answer without what stands in the refused rows; None: all of them are."""
    return np.asarray(_empty(name)) if answer is None else np.where(bad, _empty(name), answer)


def _all_refused(block: Block, wanted: tuple[str, ...], error: InputError) -> Worked:
    culprit = np.array(error.name or "point", dtype=object)
    found = {name: np.asarray(_empty(name)) for name in wanted}
    empty = np.asarray(np.nan)
    return Worked(block.shape, dict.fromkeys(block.names, empty), found, culprit, str(error))


def _flat(value: Any, shape: tuple[int, ...]) -> Any:
    return np.broadcast_to(value, shape).ravel()


def _varies(name: str, value: Any) -> bool:
    return not INPUTS[name].whole and np.ndim(value) > 0


def _first_reason(shape: tuple[int, ...], point: Mapping[str, Any], culprit: Any) -> str:
    """The sentence that `evaluate` has for the first refused row."""
    index = int(np.argmax(_flat(culprit != "", shape)))
    row = {
        name: value if INPUTS[name].whole else float(_flat(value, shape)[index])
        for name, value in point.items()
    }
    return reason_of(row)


def _by_parts(
    shape: tuple[int, ...],
    point: Mapping[str, Any],
    columns: Mapping[str, Array],
    wanted: tuple[str, ...],
    culprit: NDArray[Any],
) -> Worked:
    """The same row by row where no rule tells which ones are at fault."""
    flat = {name: _flat(value, shape) for name, value in point.items() if _varies(name, value)}
    fixed = {name: value for name, value in point.items() if name not in flat}
    names = _flat(culprit, shape).copy()
    fitting, unfit = parts_that_can_be(fixed, flat, np.flatnonzero(names == ""))
    for part, name in unfit:
        names[part] = name
    found = {
        name: np.full(names.size, _empty(name), dtype=object if kind_of(name) == "choice" else None)
        for name in wanted
    }
    for part in fitting:
        work = Evaluation({**fixed, **{name: column[part] for name, column in flat.items()}})
        for name, answer in _answers(work, wanted).items():
            found[name][part] = answer
    names = names.reshape(shape)
    back = {name: value.reshape(shape) for name, value in found.items()}
    return Worked(shape, columns, back, names, _first_reason(shape, point, names))
