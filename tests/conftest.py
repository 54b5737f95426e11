"""Shared fixtures: the page, served as a person would start it."""

import contextlib
import os
import queue
import signal
import socket
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path

import psutil
import pytest

REPOSITORY = Path(__file__).resolve().parent.parent
START_SECONDS = 60


@dataclass
class Served:
    """A running server of the page."""

    process: subprocess.Popen[str]
    port: int
    lines: list[str] = field(default_factory=list)  # what it printed, errors included

    @property
    def url(self) -> str:
        return f"http://127.0.0.1:{self.port}/"

    def kernels(self) -> list[psutil.Process]:
        """Its kernel processes."""
        return [child for child in psutil.Process(self.process.pid).children() if _is_kernel(child)]

    def stop(self, number: int = signal.SIGINT, seconds: float = 30) -> int:
        """Send the signal, wait for the end and return the exit code."""
        if self.process.poll() is None:
            self.process.send_signal(number)
        return self.process.wait(seconds)


def _is_kernel(process: psutil.Process) -> bool:
    try:
        return "ipykernel_launcher" in process.cmdline()
    except psutil.Error:  # ended meanwhile
        return False


def free_port() -> int:
    with socket.create_server(("127.0.0.1", 0)) as listener:
        port: int = listener.getsockname()[1]
        return port


def start(
    *,
    code: str | None = None,
    port: int | None = None,
    python_path: str = "",
    folder: Path | None = None,
) -> Served:
    """Start the page, or a page that runs `code`, and wait until it says where it is."""
    port = port or free_port()
    command = [sys.executable, "-m", "explorer", "--no-browser", "--port", str(port)]
    if code is not None:
        call = f"serve(port={port}, open_browser=False, code={code!r})"
        command = [sys.executable, "-c", f"from explorer.serve import serve; {call}"]
    environment = os.environ | {"PYTHONPATH": python_path or str(REPOSITORY)}
    process = subprocess.Popen(
        command,
        cwd=folder or REPOSITORY,
        env=environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        encoding="utf-8",
    )
    served = Served(process, port)
    try:
        _wait_for_address(served)
    except BaseException:  # whatever it was, Ctrl-C too: no server is left behind
        process.kill()
        raise
    return served


def _wait_for_address(served: Served) -> None:
    """Collect what the server prints, and return when its address is among it."""
    heard: queue.Queue[str | None] = queue.Queue()

    def listen() -> None:
        assert served.process.stdout is not None
        for line in served.process.stdout:
            served.lines.append(line)
            heard.put(line)
        heard.put(None)

    threading.Thread(target=listen, daemon=True).start()
    deadline = time.monotonic() + START_SECONDS
    while served.url not in (
        line := heard.get(timeout=max(deadline - time.monotonic(), 0.1)) or ""
    ):
        assert line, f"the server ended before it answered: {''.join(served.lines)}"


@pytest.fixture(scope="session")
def start_server() -> Iterator[Callable[..., Served]]:
    """A function that starts a server; whatever it started is stopped at the end."""
    started: list[Served] = []

    def start_and_remember(**keywords: object) -> Served:
        started.append(start(**keywords))
        return started[-1]

    yield start_and_remember
    for served in started:
        with contextlib.suppress(subprocess.TimeoutExpired):
            served.stop()
        served.process.kill()


@pytest.fixture(scope="session")
def served(start_server: Callable[..., Served]) -> Served:
    """The page as `python -m explorer --no-browser --port N` serves it, once for the whole run."""
    return start_server()
