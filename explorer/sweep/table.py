"""A sweep as a data frame: the rows of a plan, or of a table that somebody has, with their answers."""

from __future__ import annotations

from asyncio import CancelledError
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from ..combine import PARTS
from ..design import Design
from ..domain import InputError, number_of, quoted
from ..inputs import INPUTS
from .axes import Slow, base_point, record_column, whole_column
from .blocks import Block, Chunk
from .faults import PlanError
from .plan import Plan
from .rows import Worked, kind_of, wanted_names, work_out
from .run import CHUNK, WINDOW, SweepError, checked, in_words, results
from .texts import REFUSED

if TYPE_CHECKING:
    import pandas as pd

Rows = NDArray[np.intp] | slice


@dataclass(frozen=True, eq=False)
class Columns:
    """Full columns of a chunk by name, and why its first refused row is, '' where none is."""

    values: Mapping[str, NDArray[Any]]
    reason: str


def columns_of(chunk: Chunk, wanted: tuple[str, ...], inputs: bool) -> Columns:
    """The columns of a chunk; inputs: those of the plan too."""
    parts: list[dict[str, NDArray[Any]]] = []
    reason = ""
    for block in chunk:
        worked = work_out(block, wanted)
        reason = reason or worked.reason
        parts.append(_block_columns(block, worked, wanted, inputs))
    values = {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}
    return Columns(values, reason)


def _block_columns(
    block: Block, worked: Worked, wanted: tuple[str, ...], inputs: bool
) -> dict[str, NDArray[Any]]:
    def full(value: Any) -> NDArray[Any]:
        return np.broadcast_to(value, worked.shape).ravel()

    found: dict[str, NDArray[Any]] = {}
    if inputs:
        found |= {name: full(np.array(label, dtype=object)) for name, label in block.labels}
        found |= {name: full(worked.columns[name]) for name in block.names}
    for name in wanted:
        answer: Any = worked.found[name]
        found[name] = full(answer.astype(object) if kind_of(name) == "choice" else answer)
    found[REFUSED] = full(worked.culprit)
    return found


def sweep(
    table: Plan | pd.DataFrame | Mapping[str, Any],
    wanted: Any,
    executor: Any = None,
    *,
    base: Mapping[str, Any] | Design | None = None,
    chunk: int = CHUNK,
    window: int = WINDOW,
) -> pd.DataFrame:
    """The wanted quantities of every row of a table, beside its inputs, in the same order.

    table: a plan, or columns of equal length: numbers in SI, words and other whole values as objects
    (missing: not given), keys of records in `emitter`, `resonator`, `optic` (missing or '': the
    base's own part). base: the inputs that are no column of such a table. wanted: names of
    quantities, cautions or inputs. executor: None, or anything with `map(function, iterable)`: a pool
    of `concurrent.futures`, a cluster client's `get_executor()`; the answers are the same. chunk: rows
    evaluated at a time. window: chunks that are with the executor at a time, at least twice its workers.

    Returns a data frame: input columns (numbers in SI; labels of whole values and keys of records),
    wanted columns in SI, not-a-number where there is no number, words for a choice, truth values for
    a caution (missing where the row is refused); and `refused`: the input at fault where a row's
    inputs cannot go together, '' elsewhere. How many rows that are, and the reason of the first, are
    in its `attrs` as `refused` and `reason`. Raises PlanError, and SweepError where an executor fails.
    """
    size, step = checked(executor, chunk, window)
    frame: pd.DataFrame | None = None
    if isinstance(table, Plan):
        if base is not None:
            raise PlanError("a plan has a base of its own; leave base out")
        names, made = wanted_names(wanted, table.columns), _planned(table, size)
    else:
        frame = _frame(table)
        names, made = wanted_names(wanted, frame.columns), _grouped(frame, base or {}, size)
    work = partial(columns_of, wanted=names, inputs=frame is None)
    columns, reason = _collected(made, results(executor, work, Columns, made.tasks, step))
    return _finished(frame, columns, names, reason)


def _collected(made: _Tasks, answers: Iterable[Columns]) -> tuple[dict[str, NDArray[Any]], str]:
    """The columns of all chunks in the order of the rows, and why the first refused row is."""
    columns: dict[str, NDArray[Any]] = {}
    reason, done = "", 0
    try:
        for place, part in zip(made.places, answers, strict=True):
            reason = reason or part.reason
            for name, values in part.values.items():
                if name not in columns:
                    columns[name] = np.empty(made.rows, dtype=values.dtype)
                columns[name][place] = values
            done += len(part.values[REFUSED])
    except PlanError:
        raise
    except (Exception, CancelledError) as error:
        what = f"the sweep stopped after {done:,} of {made.rows:,} rows"
        raise SweepError(f"{what}: {in_words(error)}", done) from error
    return columns, reason


@dataclass(frozen=True, eq=False)
class _Tasks:
    """Chunks, and the rows of the table that each of them answers."""

    rows: int
    places: Iterable[Rows]
    tasks: Iterable[Chunk]


def _planned(plan: Plan, size: int) -> _Tasks:
    cut = plan.layout(size)
    starts = (cut.start(index) for index in range(cut.count))
    ends = (*(cut.start(index) for index in range(1, cut.count)), plan.rows)
    return _Tasks(
        plan.rows,
        map(slice, starts, ends),
        (plan.chunk(cut, index) for index in range(cut.count)),
    )


def _frame(table: Any) -> pd.DataFrame:
    """A table that somebody has, as a data frame of its own. Raises PlanError."""
    import pandas as pd

    if not isinstance(table, pd.DataFrame | Mapping):
        raise PlanError(f"a table is a plan, a data frame or columns by name, not {quoted(table)}")
    try:
        frame = pd.DataFrame(dict(table) if isinstance(table, Mapping) else table)
    except ValueError as error:
        raise PlanError(f"the columns of the table do not fit: {str(error).lower()}") from error
    for name in frame.columns:
        if name not in INPUTS and name not in PARTS:
            known = ", ".join([*PARTS, *sorted(INPUTS)])
            raise PlanError(f"{quoted(name)} is no input; a column is one of: {known}")
    if not frame.columns.is_unique:
        twice = frame.columns[frame.columns.duplicated()][0]
        raise PlanError(f"the table has the column {twice} twice", twice)
    if not len(frame) or not len(frame.columns):
        raise PlanError("the table has no rows")
    return frame


def _numbers(name: str, column: pd.Series[Any]) -> NDArray[np.float64]:
    """A number column, SI; missing ones are not-a-number. Raises InputError."""
    from pandas.api import types

    entry = INPUTS[name]
    if types.is_bool_dtype(column) or not types.is_numeric_dtype(column):
        return number_of(entry, column.tolist())
    if types.is_complex_dtype(column):
        return number_of(entry, column.to_numpy())
    return column.to_numpy(dtype=float, na_value=np.nan)


def _slow(name: str, column: pd.Series[Any]) -> tuple[Slow, NDArray[np.intp]]:
    """A column of whole values or records, and which of its entries each row has."""
    import pandas as pd

    codes, found = pd.factorize(column)
    entries: list[Any] = list(found)
    if (codes < 0).any():
        codes = np.where(codes < 0, len(entries), codes)
        entries.append("" if name in PARTS else None)
    made = record_column(name, entries) if name in PARTS else whole_column(name, entries)
    return made, codes


def _grouped(frame: Any, base: Any, size: int) -> _Tasks:
    """The rows of a table by their whole values and records, cut into blocks of at most `size`."""
    slow, codes, numbers = [], np.zeros(len(frame), dtype=np.intp), {}
    try:
        for name in frame.columns:
            if name in PARTS or INPUTS[name].whole:
                column, which = _slow(name, frame[name])
                slow.append(column)
                codes = codes * len(column.labels) + which
            else:
                numbers[name] = _numbers(name, frame[name])
        plan = Plan(base_point(base), tuple(slow), {})
    except InputError as error:
        raise PlanError(str(error), error.name) from error
    order = np.argsort(codes, kind="stable")
    ends = np.flatnonzero(np.diff(codes[order])) + 1
    places = [
        rows[start : start + size]
        for rows in np.split(order, ends)
        for start in range(0, len(rows), size)
    ]
    tasks = ((_rows_block(plan, int(codes[rows[0]]), numbers, rows),) for rows in places)
    return _Tasks(len(frame), places, tasks)


def _rows_block(
    plan: Plan, group: int, numbers: Mapping[str, NDArray[np.float64]], rows: NDArray[np.intp]
) -> Block:
    """Rows of a table as a block; what is the same in all of them is given once."""
    fixed, labels = plan.group(group)
    piece = {}
    for name, column in numbers.items():
        values = column[rows]
        if (values == values[0]).all():
            fixed[name] = float(values[0])
        else:
            piece[name] = values
            fixed.pop(name, None)
    return Block(fixed, labels, (), (piece,) if piece else ())


def _finished(
    frame: pd.DataFrame | None,
    columns: Mapping[str, NDArray[Any]],
    wanted: tuple[str, ...],
    reason: str,
) -> pd.DataFrame:
    """The table of all columns, truth values missing where a row is refused."""
    import pandas as pd

    refused = np.asarray(columns[REFUSED] != "")
    made = {
        name: pd.arrays.BooleanArray(values, refused)
        if name in wanted and kind_of(name) == "mask"
        else values
        for name, values in columns.items()
    }
    index = None if frame is None else frame.index
    found = pd.DataFrame(made, index=index, copy=False)
    if frame is not None:
        found = pd.concat([frame, found], axis=1)
    found.attrs.update(refused=int(refused.sum()), reason=reason)
    return found
