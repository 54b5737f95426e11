"""sweep_to(): any number of rows to a file, in bounded memory, gone on with after any interruption."""

from __future__ import annotations

import contextlib
import os
import time
from asyncio import CancelledError
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import Any

from ..design import written as value_text
from ..domain import quoted
from .faults import PlanError
from .journal import Journal
from .plan import Plan
from .rows import wanted_names
from .run import CHUNK, WINDOW, SweepError, checked, in_words, results
from .store import CsvStore, ParquetStore, Store, refusing


@dataclass(frozen=True)
class Progress:
    """How far a sweep is. rows, total: of the table. new: rows of this run, in `seconds`."""

    rows: int
    total: int
    new: int
    seconds: float
    refused: int

    @property
    def rate(self) -> float:
        """Rows per second of this run."""
        return self.new / self.seconds if self.seconds > 0 else 0.0

    @property
    def remaining(self) -> float:
        """Seconds to go at this rate."""
        return (self.total - self.rows) / self.rate if self.rate else float("inf")


@dataclass(frozen=True)
class Written:
    """A finished table. new: rows that this call worked out, in `seconds`.

    refused: rows whose inputs cannot go together; reason: of the first of them, in a sentence.
    """

    path: Path
    rows: int
    new: int
    seconds: float
    refused: int
    reason: str


def sweep_to(
    path: str | os.PathLike[str],
    plan: Plan,
    wanted: Any,
    executor: Any = None,
    *,
    chunk: int = CHUNK,
    window: int = WINDOW,
    progress: Callable[[Progress], object] | None = None,
    restart: bool = False,
) -> Written:
    """Write the table of a plan to a file, a chunk at a time; the same call goes on where one stopped.

    path: a .csv file, or a .parquet folder of one file a chunk, which `pandas.read_parquet` reads in
    the order of the rows (needs the extra `parquet`). wanted, executor, chunk, window: as in `sweep`;
    a table that was begun keeps its chunk. progress: called with a `Progress` after every chunk.
    restart: replace what is there.

    Columns: inputs in the unit of the page, 'fast_linewidth (nm)', as the exact decimal of the SI value
    with its point moved (Parquet: the number nearest to it); quantities in SI, 'rate_in_fibre (1/s)'; true and false for cautions; an
    empty cell (Parquet: not-a-number) where there is no number; `refused` as in `sweep`.
    A journal (`<name>.sweep.json`, in a Parquet folder `_sweep.json`) says what is stored for good, so
    that no interruption loses or repeats a chunk; it stays, and tells what the table is.

    Raises PlanError for what cannot be done, and SweepError where the sweep stops midway: what is
    stored stays.
    """
    size, step = checked(executor, chunk, window)
    if not isinstance(plan, Plan):
        raise PlanError(f"sweep_to takes a plan (factorial, sampled), not {quoted(plan)}")
    names = wanted_names(wanted, plan.columns)
    store = _opened(path, plan, names, size, restart)
    try:
        return _filled(store, plan, executor, step, progress)
    finally:
        store.close()


def _opened(path: Any, plan: Plan, wanted: tuple[str, ...], size: int, restart: bool) -> Store:
    try:
        target = Path(os.path.realpath(path))
    except (TypeError, ValueError) as error:
        raise PlanError(f"{quoted(path)} is no path of a file") from error
    kind = target.suffix.lower()
    if kind not in (".csv", ".parquet"):
        raise PlanError(f"{quoted(target.name)} is neither a .csv nor a .parquet table")
    with refusing(target):
        if not target.parent.is_dir():
            folder = quoted(str(target.parent))
            raise PlanError(f"there is no folder {folder} for {quoted(target.name)}")
        if target.exists() and target.is_dir() != (kind == ".parquet"):
            what = "a folder" if kind == ".csv" else "a file, and a Parquet table is a folder"
            raise PlanError(f"{quoted(target.name)} is {what}; choose another name")
    cut = plan.layout(size)
    fresh = Journal(
        plan=plan.fingerprint((kind, *wanted)),
        rows=plan.rows,
        chunk=size,
        chunks=cut.count,
        columns=plan.words(),
        base={name: value_text(name, value) for name, value in plan.base.items()},
        wanted=wanted,
    )
    if kind == ".csv":
        return CsvStore(target, fresh, restart, plan.columns)
    return ParquetStore(target, fresh, restart)


def _filled(
    store: Store,
    plan: Plan,
    executor: Any,
    window: int,
    progress: Callable[[Progress], object] | None,
) -> Written:
    """Work out and store what is missing of a table."""
    begun, first = time.monotonic(), store.journal.done
    cut = plan.layout(store.journal.chunk)
    tasks = (plan.chunk(cut, index) for index in range(first, cut.count))
    work = partial(store.work, wanted=store.journal.wanted)

    def rows(done: int) -> int:
        return cut.start(done) if done < cut.count else plan.rows

    start = rows(first)
    with contextlib.closing(results(executor, work, tuple, tasks, window)) as made:
        for done in range(first + 1, cut.count + 1):
            with _stopping(store, rows):
                store.add(next(made))
            if progress is not None:
                seconds, refused = time.monotonic() - begun, store.journal.refused
                progress(Progress(rows(done), plan.rows, rows(done) - start, seconds, refused))
    return Written(
        store.target,
        plan.rows,
        plan.rows - start,
        time.monotonic() - begun,
        store.journal.refused,
        store.journal.reason,
    )


@contextlib.contextmanager
def _stopping(store: Store, rows: Callable[[int], int]) -> Iterator[None]:
    """SweepError, saying what is kept, for whatever an executor or a disk does."""
    try:
        yield
    except PlanError:
        raise
    except (Exception, CancelledError) as error:
        store.settle()
        kept = rows(store.journal.done)
        raise SweepError(
            f"the sweep stopped after {kept:,} of {store.journal.rows:,} rows: {in_words(error)}; "
            f"these rows are kept in {quoted(store.target.name)}, and the same sweep goes on behind "
            "them",
            kept,
        ) from error
