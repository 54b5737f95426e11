"""Chunks handed to an executor a window at a time, and their results in order."""

from __future__ import annotations

import contextlib
import os
from collections import deque
from collections.abc import Callable, Generator, Iterable, Iterator
from itertools import islice
from typing import TYPE_CHECKING, Any, Final, TypeVar

from ..domain import InputError, quoted
from .draws import whole_number
from .faults import PlanError

if TYPE_CHECKING:
    from concurrent.futures import ProcessPoolExecutor

#: Rows that are evaluated and stored at a time.
CHUNK: Final = 2**16

#: Chunks that are with an executor at a time.
WINDOW: Final = 16

#: A worker of a pool computes in one thread: there are as many workers as are wanted.
_THREADS: Final = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

Task = TypeVar("Task")
Result = TypeVar("Result")


class SweepError(RuntimeError):
    """A sweep that stopped midway; the message says what is kept. rows: finished ones."""

    def __init__(self, message: str, rows: int = 0) -> None:
        super().__init__(message)
        self.rows = rows


def checked(executor: Any, chunk: Any, window: Any) -> tuple[int, int]:
    """Chunk and window as whole numbers. Raises PlanError, for what is no executor too."""
    if executor is not None and not callable(getattr(executor, "map", None)):
        raise PlanError(
            f"executor = {quoted(executor)} has no map; give a pool of concurrent.futures, or a "
            "cluster client's get_executor()"
        )
    try:
        return (
            whole_number(chunk, "chunk", 1, 10**9),
            whole_number(window, "window", 2, 10**6),
        )
    except InputError as error:
        raise PlanError(str(error)) from error


def results(
    executor: Any,
    work: Callable[[Task], Result],
    kind: type[Result],
    tasks: Iterable[Task],
    window: int,
) -> Generator[Result, None, None]:
    """The work on each task, in order, each result of a kind; at most `window` are with the executor.

    executor: anything with `map(function, iterable)`, or None for this process. Half a window is
    handed over while the other half is awaited, so that workers do not wait for this process.
    Raises PlanError where the executor gives something else than results.
    """
    waiting: deque[Iterator[Result]] = deque()
    left = iter(tasks)
    if executor is None:
        yield from map(work, left)
        return
    while True:
        while len(waiting) < 2 and (batch := list(islice(left, max(1, window // 2)))):
            waiting.append(iter(executor.map(work, batch)))
        if not waiting:
            return
        for result in waiting.popleft():
            if not isinstance(result, kind):
                raise PlanError(
                    f"the map of the executor gives {quoted(result)} in place of results; of a "
                    "cluster client take its get_executor()"
                )
            yield result


def in_words(error: BaseException) -> str:
    """What went wrong with an executor or a file, on one line."""
    if isinstance(error, OSError) and error.strerror:
        return error.strerror.lower()
    chain: BaseException | None = error
    kinds: list[str] = []
    while chain is not None:
        kinds.append(type(chain).__name__)
        chain = chain.__cause__ or chain.__context__  # a clean-up may fail after what went wrong
    if any("Cancelled" in kind or "Closed" in kind for kind in kinds):
        return "the executor gave the work up, for its workers or its cluster are gone"
    if any(kind.startswith("Broken") and kind != "BrokenPipeError" for kind in kinds):
        return "a worker process ended"
    kind = kinds[0]
    text = " ".join(str(error).split()) or "no reason given"
    return f"{kind}: {text if len(text) <= 200 else f'{text[:199]}…'}"


@contextlib.contextmanager
def process_pool(workers: int) -> Iterator[ProcessPoolExecutor]:
    """A pool of fresh processes for `sweep` and `sweep_to`, each computing in one thread.

    A script that uses it guards its main part with `if __name__ == "__main__":`. Raises PlanError.
    """
    from concurrent.futures import ProcessPoolExecutor
    from multiprocessing import get_context

    try:
        count = whole_number(workers, "workers", 1, 4096)
    except InputError as error:
        raise PlanError(str(error)) from error
    known = {name: os.environ.get(name) for name in _THREADS}
    os.environ.update(dict.fromkeys(_THREADS, "1"))
    # Fresh processes: a copy of this one may hold locks of threads that the copy does not have.
    pool = ProcessPoolExecutor(count, get_context("spawn"), initializer=_begin_worker)
    try:
        yield pool
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
        for name, value in known.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


def _begin_worker() -> None:
    """Ctrl-C is for the process that has the pool; a worker ends with it, however it ended."""
    import signal
    from multiprocessing import parent_process
    from threading import Thread

    signal.signal(signal.SIGINT, signal.SIG_IGN)
    parent = parent_process()
    if parent is not None:
        Thread(target=_end_with, args=(parent,), daemon=True).start()


def _end_with(parent: Any) -> None:
    parent.join()
    os._exit(1)
