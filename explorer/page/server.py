"""The page's web server: Voilà, narrowed to one notebook, one socket and this machine.

Started by `explorer.serve`; nothing else imports it, for it loads the whole of Voilà.
"""

import asyncio
import contextlib
import logging
import secrets
import signal
from collections.abc import Callable
from pathlib import Path
from socket import socket
from types import FrameType

import psutil
from tornado.httpserver import HTTPServer
from tornado.ioloop import IOLoop
from tornado.routing import HostMatches, Rule, RuleRouter
from traitlets.config import Config
from voila.app import Voila
from voila.tornado.handler import TornadoVoilaHandler

ADDRESS = "127.0.0.1"
TEMPLATE = "explorer"
LARGEST_MESSAGE = (
    32 * 2**20
)  # bytes; a longer web-socket message would close the page's connection without a word
IDLE_SECONDS = (
    600  # an unconnected kernel lives this long: long enough for a network that comes and goes
)
CULL_SECONDS = 60
OUTPUT_SECONDS = 60  # how long what a cell shows may come after its reply
REFILL_SECONDS = (
    3  # the next kernel is warmed only when the page that took the last one has been drawn
)
# The only front-end extensions the page needs; others that happen to be installed stay out.
WIDGETS = [
    "@jupyter-widgets/jupyterlab-manager",
    "@voila-dashboards/widgets-manager8",
    "anywidget",
    "bqplot",
    "bqscales",
]


class PageHandler(TornadoVoilaHandler):
    """The page itself, sent with the cookie it needs to end its kernel when its tab is closed."""

    async def get(self, path=None):
        self.xsrf_token  # noqa: B018  # reading it is what sets the cookie
        await super().get(path)


class PageServer(Voila):
    """Voilà on a socket that is already bound, ended by Ctrl-C or SIGTERM without a word."""

    def __init__(self, *, listener: socket, announce, **kwargs):
        super().__init__(**kwargs)
        self._listener = listener
        self._announce = announce

    def initialize(self, argv=None):
        super().initialize(argv or [])
        self._on_stop_signals(self._ask_to_stop)

    def init_handlers(self):
        return [_with_cookie(entry) for entry in super().init_handlers()]

    def listen(self):
        """Serve until asked to stop, then stop every kernel."""
        self.ioloop = IOLoop.current()
        server = HTTPServer(_for_this_machine_only(self.app))
        self._listener.setblocking(False)
        server.add_socket(self._listener)
        self.ioloop.add_callback(self._announce)
        try:
            self.ioloop.start()
        finally:
            self._on_stop_signals(signal.SIG_IGN)  # a second Ctrl-C must not leave kernels behind
            server.stop()
            self.stop()

    def stop(self):
        """End every kernel at once.

        None of them holds anything worth a slow goodbye, and one that is just starting would
        answer a polite request with a traceback. They are known by the private folder in their
        command line: a browser that was opened from here is a child of this process too.
        """
        loop = self.ioloop.asyncio_loop
        tasks = asyncio.all_tasks(loop)
        for task in tasks:
            task.cancel()
        loop.run_until_complete(asyncio.gather(*tasks, return_exceptions=True))
        kernels = [child for child in psutil.Process().children() if self._is_kernel(child)]
        ended = [
            process for kernel in kernels for process in (*kernel.children(recursive=True), kernel)
        ]
        for process in ended:
            with contextlib.suppress(psutil.NoSuchProcess):
                process.kill()
        psutil.wait_procs(ended, timeout=5)

    def _is_kernel(self, process: psutil.Process) -> bool:
        try:
            return any(self.connection_dir_root in word for word in process.cmdline())
        except psutil.Error:  # ended meanwhile
            return False

    def _ask_to_stop(self, _number: int, _frame: FrameType | None) -> None:
        self.ioloop.add_callback_from_signal(self.ioloop.stop)

    @staticmethod
    def _on_stop_signals(action) -> None:
        for number in (signal.SIGINT, signal.SIGTERM):
            signal.signal(number, action)


def _with_cookie(entry: tuple) -> tuple:
    pattern, handler, *rest = entry
    return (pattern, PageHandler if handler is TornadoVoilaHandler else handler, *rest)


def _for_this_machine_only(application) -> RuleRouter:
    """Answer only requests that name this machine: no foreign name can be pointed at the page."""
    return RuleRouter([Rule(HostMatches(r"(127\.0\.0\.1|localhost)"), application)])


def run(*, listener: socket, folder: Path, notebook: Path, announce: Callable[[], None]) -> None:
    """Serve `notebook` on the bound `listener` until asked to stop.

    Private files go into `folder`; `announce` is called once the page answers.
    """
    for name in ("tornado.access", "tornado.general"):
        logging.getLogger(name).setLevel(
            logging.ERROR
        )  # a refused request is no news in the terminal
    port = listener.getsockname()[1]
    config = page_config(port=port, folder=folder, notebook=notebook)
    server = PageServer(listener=listener, announce=announce, config=config)
    server.initialize()
    server.start()


def page_config(*, port: int, folder: Path, notebook: Path) -> Config:
    """Everything that Voilà and the kernels are told, in one place."""
    nonce = secrets.token_urlsafe(16)
    return Config(
        {
            "Voila": {
                "ip": ADDRESS,
                "port": port,
                "open_browser": False,
                "notebook_path": str(notebook),
                "root_dir": str(notebook.parent),
                "connection_dir_root": str(folder),
                "config_file_paths": [],  # a stray voila.json must not open what is closed here
                "log_level": "ERROR",
                "tornado_settings": {
                    "websocket_max_message_size": LARGEST_MESSAGE,
                    "allow_remote_access": False,
                    "local_hostnames": ["localhost", ADDRESS],
                    "headers": _headers(nonce),
                },
            },
            "VoilaConfiguration": {
                "template": TEMPLATE,
                "theme": "light",
                "allow_template_override": "NO",
                "allow_theme_override": "NO",
                "strip_sources": True,
                "show_tracebacks": False,
                "file_allowlist": [],
                "extension_allowlist": WIDGETS,
                "preheat_kernel": True,
                "default_pool_size": 1,
                "resources": {"explorer_nonce": nonce},
            },
            "VoilaKernelManager": {"fill_delay": REFILL_SECONDS},
            "MappingKernelManager": {
                "cull_idle_timeout": IDLE_SECONDS,
                "cull_interval": CULL_SECONDS,
                "cull_connected": False,
            },
            "VoilaExecutor": {
                "cell_error_instruction": "The terminal that started the page says why.",
                # A busy machine may bring what a cell shows seconds after its reply; a cell that gave
                # up on it would leave an empty page.
                "iopub_timeout": OUTPUT_SECONDS,
            },
        }
    )


def _headers(nonce: str) -> dict[str, str]:
    """Headers of the page: everything comes from this server or from the page itself."""
    policy = {
        "default-src": "'self'",
        # anywidget imports its modules from blobs; inline handlers in user text never run.
        "script-src": f"'self' blob: 'nonce-{nonce}'",
        "style-src": "'self' 'unsafe-inline'",  # the widget library writes style elements
        "img-src": "'self' data: blob:",
        "font-src": "'self' data:",
        "object-src": "'none'",
        "base-uri": "'none'",
        "form-action": "'none'",
        "frame-ancestors": "'none'",
    }
    return {
        "Content-Security-Policy": "; ".join(f"{name} {value}" for name, value in policy.items()),
        "Cross-Origin-Opener-Policy": "same-origin",
        "Referrer-Policy": "no-referrer",
    }
