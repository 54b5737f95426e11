"""Tables on disk: written a chunk at a time, each whole or not at all, and gone on with later."""

from __future__ import annotations

import contextlib
import glob
import os
import secrets
import time
import zlib
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Final

from ..domain import quoted
from . import journal
from .faults import PlanError
from .journal import Journal
from .texts import csv_rows, head

#: What a worker gives back: bytes to store, rows refused, reason of the first.
Made = tuple[bytes, int, str]

#: A chunk of a Parquet table: names sort as the chunks do.
PART: Final = "part-{:09d}.parquet"
PARTS_PATTERN: Final = "part-*.parquet"


#: Seconds between two times that what was stored is made sure of: a disk takes its time for that.
SURE: Final = 0.5


class Store:
    """An open table.

    work: makes the bytes of a chunk for the names in `wanted`. journal: what is stored; what of it
    would outlast a crash is what the file beside the table says.
    """

    work: Callable[..., Made]

    def __init__(self, target: Path, beside: Path, fresh: Journal, restart: bool) -> None:
        self.target, self._beside = target, beside
        with refusing(target):
            known = self._known(fresh) if self._begun() and not restart else None
        try:
            with refusing(target):
                self._open()
                # What a killed run was writing when it ended.
                for file in beside.parent.glob(f".{glob.escape(beside.name)}.*"):
                    file.unlink(missing_ok=True)
                self.journal = self._sure = known or fresh
                self._sure_at = time.monotonic()
                if known is None:
                    fresh.save(beside)
                    self._clear()
                elif not known.complete:
                    self._go_on()
        except BaseException:  # Ctrl-C too: the lock is given back
            self._release()
            raise

    def _known(self, fresh: Journal) -> Journal | None:
        """The journal of a table that was begun. Raises PlanError where it is another table's."""
        known = journal.load(self._beside)
        name = quoted(self.target.name)
        if known is None:
            raise PlanError(
                f"{name} is there already and no sweep of this tool wrote it; choose another name, or "
                "ask for a restart, which replaces it"
            )
        if known.plan != fresh.plan:
            state = "all" if known.complete else f"{known.done:,} of {known.chunks:,} chunks"
            raise PlanError(
                f"{name} holds {state} of another plan; choose another name, or ask for a restart, "
                "which replaces it"
            )
        return known

    def add(self, made: Made) -> None:
        """Store the next chunk. Raises OSError; then nothing of it is stored."""
        content, refused, reason = made
        now = self._append(content)
        self.journal = replace(
            now,
            done=now.done + 1,
            refused=now.refused + refused,
            reason=now.reason or reason,
        )
        if self.journal.complete or time.monotonic() - self._sure_at > SURE:
            self._make_sure()

    def _make_sure(self) -> None:
        self._flush()
        self.journal.save(self._beside)
        self._sure, self._sure_at = self.journal, time.monotonic()

    def settle(self) -> None:
        """Make sure of what is stored, or cut the table back to what is sure."""
        if self.journal is not self._sure:
            try:
                self._cut()
                self._make_sure()
            except OSError:
                self.journal = self._sure
        if not self.journal.complete:
            with contextlib.suppress(OSError):
                self._cut()

    def close(self) -> None:
        """End the work on the table; half a chunk is cut off."""
        self.settle()
        self._release()

    def _begun(self) -> bool:
        raise NotImplementedError

    def _open(self) -> None:
        raise NotImplementedError

    def _clear(self) -> None:
        raise NotImplementedError

    def _go_on(self) -> None:
        raise NotImplementedError

    def _append(self, content: bytes) -> Journal:
        raise NotImplementedError

    def _flush(self) -> None:
        """Wait until the disk has what was stored."""
        raise NotImplementedError

    def _cut(self) -> None:
        """Cut off what is behind the chunks that the journal counts."""
        raise NotImplementedError

    def _release(self) -> None:
        """Let others have the table."""
        raise NotImplementedError


class CsvStore(Store):
    """One growing file; its journal says how long it is for good."""

    work = staticmethod(csv_rows)

    def __init__(
        self, target: Path, fresh: Journal, restart: bool, columns: tuple[str, ...]
    ) -> None:
        self._head = head(columns, fresh.wanted)
        self._handle = -1
        super().__init__(target, target.with_name(f"{target.name}.sweep.json"), fresh, restart)

    def _begun(self) -> bool:
        return self.target.exists() and self.target.stat().st_size > 0

    def _open(self) -> None:
        flags = os.O_RDWR | os.O_CREAT | os.O_APPEND | getattr(os, "O_BINARY", 0)
        self._handle = os.open(self.target, flags, 0o666)
        _lock(self._handle, self.target)

    def _clear(self) -> None:
        self._cut()

    def _go_on(self) -> None:
        """Cut off what was not stored for good. Raises PlanError where the rest is not as it was."""
        state = self.journal
        with self.target.open("rb") as stream:
            stream.seek(state.size - state.last)
            tail = stream.read(state.last)
        if len(tail) != state.last or zlib.crc32(tail) != state.tail:
            raise PlanError(
                f"{quoted(self.target.name)} has been changed since the sweep stopped; ask for a "
                "restart, which replaces it"
            )
        self._cut()

    def _append(self, content: bytes) -> Journal:
        state = self.journal
        content = content if state.done else self._head + content
        left = memoryview(content)
        while left:
            left = left[os.write(self._handle, left) :]
        size = state.size + len(content)
        return replace(state, size=size, last=len(content), tail=zlib.crc32(content))

    def _release(self) -> None:
        if self._handle >= 0:
            os.close(self._handle)
            self._handle = -1

    def _flush(self) -> None:
        os.fsync(self._handle)

    def _cut(self) -> None:
        os.ftruncate(self._handle, self.journal.size)


class ParquetStore(Store):
    """A folder with one file a chunk, and the journal under a name that readers pass over."""

    def __init__(self, target: Path, fresh: Journal, restart: bool) -> None:
        try:
            from .parquet import parquet_rows
        except ImportError as error:
            raise PlanError(
                "a Parquet table needs pyarrow, which is not installed: "
                'pip install "emitter-resonator-explorer[parquet]", or write a .csv file'
            ) from error
        self.work = parquet_rows
        self._handle = -1
        super().__init__(target, target / "_sweep.json", fresh, restart)

    def _begun(self) -> bool:
        if not self.target.exists():
            return False
        own = {self._beside.name, *(file.name for file in self.target.glob(PARTS_PATTERN))}
        foreign = [
            file.name
            for file in self.target.iterdir()
            if file.name not in own and not file.name.startswith((".part-", "._sweep.json."))
        ]
        if foreign:
            raise PlanError(
                f"the folder {quoted(self.target.name)} holds {quoted(min(foreign))}, which is no "
                "part of a sweep; choose another name"
            )
        return any(self.target.iterdir())

    def _open(self) -> None:
        self.target.mkdir(exist_ok=True)
        if os.name != "nt":  # a folder cannot be opened there
            self._handle = os.open(self.target, os.O_RDONLY)
            _lock(self._handle, self.target)

    def _clear(self) -> None:
        self._cut()

    def _go_on(self) -> None:
        names = {file.name for file in self.target.glob(PARTS_PATTERN)}
        missing = {PART.format(index) for index in range(self.journal.done)} - names
        if missing:
            raise PlanError(
                f"{quoted(min(missing))} is gone from {quoted(self.target.name)}; ask for a restart, "
                "which replaces the table"
            )
        self._cut()

    def _append(self, content: bytes) -> Journal:
        target = self.target / PART.format(self.journal.done)
        beside = self.target / f".{target.name}.{secrets.token_hex(4)}"
        try:
            with beside.open("xb") as stream:
                stream.write(content)
            beside.replace(target)
        finally:
            beside.unlink(missing_ok=True)
        return self.journal

    def _flush(self) -> None:
        for index in range(self._sure.done, self.journal.done):
            with (self.target / PART.format(index)).open("rb+") as stream:
                os.fsync(stream.fileno())

    def _cut(self) -> None:
        kept = {PART.format(index) for index in range(self.journal.done)}
        for file in [*self.target.glob(PARTS_PATTERN), *self.target.glob(".part-*")]:
            if file.name not in kept:
                file.unlink()

    def _release(self) -> None:
        if self._handle >= 0:
            os.close(self._handle)
            self._handle = -1


@contextlib.contextmanager
def refusing(target: Path) -> Iterator[None]:
    """PlanError where a file cannot be opened or written at the start."""
    try:
        yield
    except OSError as error:
        why = (error.strerror or str(error)).lower()
        raise PlanError(f"{quoted(target.name)} cannot be written: {why}") from error


def _lock(handle: int, target: Path) -> None:
    """Keep a second sweep away from a table until this one ends, where the system can."""
    try:
        import fcntl
    except ImportError:
        return
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError as error:
        raise PlanError(f"another sweep is writing {quoted(target.name)}") from error
    except OSError:  # a file system without locks
        return
