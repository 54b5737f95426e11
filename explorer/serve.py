"""Starts the page on this machine, for this machine only, and stops it leaving nothing behind."""

import errno
import json
import os
import signal
import sys
import tempfile
import threading
import webbrowser
from collections.abc import Callable
from pathlib import Path
from socket import create_server, socket
from types import FrameType

ADDRESS = "127.0.0.1"
PAGE_CODE = "from explorer.page.app import Explorer\n\nExplorer()"
TEMPLATES = Path(__file__).parent / "page" / "template"


class CannotServe(Exception):
    """The page cannot be started; the message is one sentence for the person who asked."""


def serve(*, port: int = 0, open_browser: bool = True, code: str = PAGE_CODE) -> None:
    """Serve the page until Ctrl-C or SIGTERM; print its address once it answers.

    port: 0 takes any free one. code: the cell that the page runs.
    Raises CannotServe where the port cannot be had.
    """
    signal.signal(signal.SIGTERM, _interrupt)
    listener = bound_socket(port)
    try:
        with (
            listener,
            tempfile.TemporaryDirectory(prefix="explorer_", ignore_cleanup_errors=True) as name,
        ):
            folder = Path(name)
            notebook = write_private_files(folder, code)
            use_private_files(folder)
            keep_memory()
            # Voilà takes a second to load: only now, so that a taken port is told at once.
            from explorer.page import server

            announce = _announcement(listener, open_browser)
            server.run(listener=listener, folder=folder, notebook=notebook, announce=announce)
    except KeyboardInterrupt:
        pass  # asked to stop before there was anything to stop


def bound_socket(port: int) -> socket:
    """A listening socket on the loopback address; raises CannotServe with the reason in words."""
    try:
        return create_server((ADDRESS, port))
    except OSError as error:
        if error.errno == errno.EADDRINUSE:
            reason = (
                f"Port {port} is taken: choose another with --port, "
                "or leave --port out to get a free one."
            )
        elif error.errno == errno.EACCES:
            reason = f"Port {port} needs rights you do not have: choose one above 1023 with --port."
        else:
            reason = f"Port {port} cannot be used: {error.strerror}."
        raise CannotServe(reason) from error


def write_private_files(folder: Path, code: str) -> Path:
    """Write the notebook to serve and the kernel that runs it; returns the notebook's path.

    The notebook has a folder to itself. The kernel is this very interpreter, whatever others are
    registered on the machine, and keeps clear of the user's own start-up files.
    """
    kernel = folder / "kernels" / "explorer" / "kernel.json"
    kernel.parent.mkdir(parents=True)
    kernel.write_text(json.dumps(_kernel(folder)), encoding="utf-8")
    notebook = folder / "page" / "explorer.ipynb"
    notebook.parent.mkdir()
    notebook.write_text(json.dumps(_notebook(code)), encoding="utf-8")
    return notebook


def _kernel(folder: Path) -> dict[str, object]:
    quiet = ["--HistoryManager.enabled=False", "--IPKernelApp.log_level=ERROR"]
    return {
        "argv": [sys.executable, "-m", "ipykernel_launcher", "-f", "{connection_file}", *quiet],
        "display_name": "explorer",
        "language": "python",
        "env": {"IPYTHONDIR": str(folder / "ipython"), "PYDEVD_DISABLE_FILE_VALIDATION": "1"},
    }


def _notebook(code: str) -> dict[str, object]:
    cell: dict[str, object] = {
        "cell_type": "code",
        "id": "page",
        "execution_count": None,
        "metadata": {},
        "outputs": [],
        "source": code,
    }
    kernel = {"name": "explorer", "display_name": "explorer", "language": "python"}
    return {"cells": [cell], "metadata": {"kernelspec": kernel}, "nbformat": 4, "nbformat_minor": 5}


def use_private_files(folder: Path) -> None:
    """Put the kernel and the shipped template where Voilà looks first."""
    paths = [str(folder), str(TEMPLATES), os.environ.get("JUPYTER_PATH", "")]
    os.environ["JUPYTER_PATH"] = os.pathsep.join(path for path in paths if path)


def keep_memory() -> None:
    """Let kernels keep freed memory: a map's arrays are then not fetched anew from the system.

    That halves the time of a map under Linux's usual allocator, which reads these names; others
    ignore them. What the person set already stays.
    """
    for name, size in (
        ("MALLOC_MMAP_THRESHOLD_", 1 << 30),
        ("MALLOC_TRIM_THRESHOLD_", 1 << 28),
        ("MALLOC_TOP_PAD_", 1 << 24),
    ):
        os.environ.setdefault(name, str(size))


def _announcement(listener: socket, open_browser: bool) -> Callable[[], None]:
    address = f"http://{ADDRESS}:{listener.getsockname()[1]}/"

    def announce() -> None:
        print(f"explorer is at {address} (Ctrl-C stops it)", flush=True)
        if open_browser:
            # In a thread of its own: some systems wait until the browser is closed.
            threading.Thread(target=webbrowser.open, args=(address,), daemon=True).start()

    return announce


def _interrupt(_number: int, _frame: FrameType | None) -> None:
    raise KeyboardInterrupt
