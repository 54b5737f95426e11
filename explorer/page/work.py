"""Long work in short slices on the kernel's event loop, so that a press is heard meanwhile."""

from __future__ import annotations

import asyncio
import time
from collections.abc import Callable, Iterator
from typing import Any

#: Longest slice [s].
SLICE = 0.03

#: How long after a slice the loop is left to others [s].
PAUSE = 0.001


def in_a_loop() -> bool:
    """Whether an event loop runs here, as it does in a kernel."""
    try:
        asyncio.get_running_loop()
    except RuntimeError:
        return False
    return True


class Work:
    """Runs one iterator at a time; a new one, or `stop`, drops what is left of the last."""

    def __init__(self) -> None:
        self._steps: Iterator[Any] | None = None
        self._done: Callable[[Any], None] = lambda _: None
        self._failed: Callable[[Exception], None] | None = None
        self._handle: asyncio.TimerHandle | None = None
        self._last: Any = None

    def start(
        self,
        steps: Iterator[Any],
        done: Callable[[Any], None],
        failed: Callable[[Exception], None] | None = None,
        delay: float = PAUSE,
    ) -> None:
        """Run `steps` and call `done` with the last thing they gave; without a loop, at once.

        failed: called with a ValueError or KeyError of the work; without it, the error is raised.
        delay: how long to wait before the first slice [s].
        """
        self.stop()
        self._steps, self._done, self._failed = steps, done, failed
        if in_a_loop():
            self._handle = asyncio.get_running_loop().call_later(delay, self._slice)
        else:
            self._slice()

    def stop(self) -> None:
        """Drop the work that is under way, if there is any."""
        if self._handle is not None:
            self._handle.cancel()
        self._handle, self._steps = None, None

    @property
    def busy(self) -> bool:
        """Whether work is under way."""
        return self._steps is not None

    def _slice(self) -> None:
        steps, self._handle = self._steps, None
        end = time.perf_counter() + SLICE
        try:
            for self._last in steps or ():
                if time.perf_counter() > end and in_a_loop():
                    self._handle = asyncio.get_running_loop().call_later(PAUSE, self._slice)
                    return
        except (ValueError, KeyError) as error:
            self._steps = None
            if self._failed is None:
                raise
            self._failed(error)
            return
        self._steps = None
        self._done(self._last)
