"""`python -m explorer sweep FILE`: a table from a plan in a file, with progress, gone on with later."""

from __future__ import annotations

import argparse
import contextlib
import signal
import sys
import time
from pathlib import Path
from typing import Any, Final

from .sweep.faults import PlanError
from .sweep.run import SweepError, process_pool
from .sweep.writing import Progress, sweep_to
from .sweep_file import EXAMPLE, SweepFile, read_sweep_file

#: Seconds between two lines of progress: on a terminal one line changes, elsewhere lines add up.
_PAUSE: Final = (0.5, 15.0)

DESCRIPTION: Final = """\
Write the table that a plan asks for. The same command goes on where an earlier one stopped.
Ends with 0 when the table is complete, with 2 when it cannot be made, with 1 when it stopped midway."""


def add_options(parser: argparse.ArgumentParser) -> None:
    """The options of the command."""
    parser.formatter_class = argparse.RawDescriptionHelpFormatter
    parser.description = DESCRIPTION
    parser.epilog = f"A plan; it needs what is wanted, and axes, records or draws:\n\n{EXAMPLE}"
    parser.add_argument("file", metavar="FILE", help="the plan, a TOML file")
    parser.add_argument(
        "--out",
        metavar="PATH",
        help="a .csv file or a .parquet folder (as the plan says, or FILE.csv)",
    )
    parser.add_argument(
        "--workers", type=int, default=1, metavar="N", help="processes that compute (1)"
    )
    parser.add_argument(
        "--restart", action="store_true", help="replace what is there instead of going on"
    )
    parser.add_argument("--quiet", action="store_true", help="no progress")


def run(chosen: argparse.Namespace) -> int:
    """Run the command; returns the exit code."""
    report = _Report(quiet=chosen.quiet)
    known = signal.signal(signal.SIGTERM, _interrupt)
    try:
        return _run(chosen, report)
    except PlanError as error:
        report.last(str(error))
        return 2
    except SweepError as error:
        report.last(f"{error}.")
        return 1
    except KeyboardInterrupt:
        report.last(f"Stopped; {report.kept}. The same command goes on from there.")
        return 1
    finally:
        signal.signal(signal.SIGTERM, known)


def _interrupt(*_: Any) -> None:
    raise KeyboardInterrupt


def _run(chosen: argparse.Namespace, report: _Report) -> int:
    asked: SweepFile = read_sweep_file(chosen.file)
    path = chosen.out or asked.output or Path(chosen.file).with_suffix(".csv")
    with contextlib.ExitStack() as stack:
        pool = stack.enter_context(process_pool(chosen.workers)) if chosen.workers != 1 else None
        written = sweep_to(
            path,
            asked.plan,
            asked.wanted,
            pool,
            chunk=asked.chunk,
            window=max(16, 4 * chosen.workers),
            progress=report,
            restart=chosen.restart,
        )
    name = written.path.name
    if not written.new:
        report.last(f"{name} is complete already: {written.rows:,} rows. --restart makes it anew.")
    else:
        took = f"{written.new:,} of them now, in {_duration(written.seconds)}"
        report.last(f"{name} is complete: {written.rows:,} rows, {took}.")
    if written.refused:
        print(
            f"{written.refused:,} rows are without numbers, since their inputs cannot go together; "
            f"the first: {written.reason}.",
            file=sys.stderr,
        )
    return 0


class _Report:
    """Progress on stderr."""

    def __init__(self, *, quiet: bool) -> None:
        self._quiet = quiet
        self._terminal = sys.stderr.isatty()
        self._next = time.monotonic() + _PAUSE[not self._terminal]
        self._open = False
        self.kept = "nothing was computed yet in this run"

    def __call__(self, now: Progress) -> None:
        self.kept = f"{now.rows:,} of {now.total:,} rows are kept"
        if self._quiet or time.monotonic() < self._next:
            return
        self._next = time.monotonic() + _PAUSE[not self._terminal]
        text = (
            f"{now.rows:,} of {now.total:,} rows, {now.rate:,.0f} rows/s, "
            f"{_duration(now.remaining)} to go"
        )
        if now.refused:
            text += f", {now.refused:,} refused"
        end = "" if self._terminal else "\n"
        print(f"\r{text:<79}" if self._terminal else text, end=end, file=sys.stderr, flush=True)
        self._open = self._terminal

    def last(self, text: str) -> None:
        """A sentence below the progress."""
        print(f"\n{text}" if self._open else text, file=sys.stderr)
        self._open = False


def _duration(seconds: float) -> str:
    if seconds == float("inf"):
        return "unknown time"
    minutes, rest = divmod(round(seconds), 60)
    hours, minutes = divmod(minutes, 60)
    if hours:
        return f"{hours} h {minutes:02d} min"
    return f"{minutes} min {rest:02d} s" if minutes else f"{rest} s"
