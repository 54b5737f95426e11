"""Starting and stopping the page's server, without a browser."""

import http.client
import json
import os
import signal
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Callable
from pathlib import Path

import psutil
import pytest

from explorer.__main__ import main

REPOSITORY = Path(__file__).resolve().parent.parent
# A page that needs neither the computation nor the panels: these tests are about serving.
SMALL_PAGE = "import ipywidgets\n\nipywidgets.Label('harbour office')"


@pytest.fixture(scope="module")
def small(start_server: Callable[..., object]):
    """A server of a small page, shared by the tests that only ask it something."""
    return start_server(code=SMALL_PAGE)


def answer(url: str, **headers: str) -> tuple[int, dict[str, str], str]:
    """Status, headers and text of the answer."""
    request = urllib.request.Request(url, headers=headers)
    try:
        with urllib.request.urlopen(request, timeout=60) as reply:
            return reply.status, dict(reply.headers), reply.read().decode()
    except urllib.error.HTTPError as refusal:
        return refusal.code, dict(refusal.headers), refusal.read().decode()


def test_taken_port_is_one_sentence_and_exit_code_2() -> None:
    with socket.create_server(("127.0.0.1", 0)) as taken:
        port = taken.getsockname()[1]
        command = [sys.executable, "-m", "explorer", "--no-browser", "--port", str(port)]
        ended = subprocess.run(
            command, capture_output=True, text=True, timeout=60, cwd=REPOSITORY, check=False
        )
    assert ended.returncode == 2
    assert ended.stdout == ""
    assert ended.stderr.splitlines() == [
        f"Port {port} is taken: choose another with --port, or leave --port out to get a free one."
    ]


@pytest.mark.parametrize("text", ["-1", "65536", "80a", "1.5", "", "٣"])
def test_port_that_is_none_is_refused(text: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main(["--no-browser", f"--port={text}"])
    assert ended.value.code == 2
    assert "a port is a whole number from 0 to 65535" in capsys.readouterr().err


def wait_for_kernels(served, number: int, seconds: float = 30) -> list[psutil.Process]:
    deadline = time.monotonic() + seconds
    while len(found := served.kernels()) != number and time.monotonic() < deadline:
        time.sleep(0.1)
    assert len(found) == number
    return found


@pytest.mark.skipif(
    os.name == "nt", reason="these signals cannot be sent to one process on Windows"
)
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_stops_without_a_word_and_without_kernels(start_server, number: int) -> None:
    served = start_server(code=SMALL_PAGE)
    wait_for_kernels(served, 1)
    assert answer(served.url)[0] == 200
    wait_for_kernels(served, 2)
    kernels = served.kernels()
    opened = [Path(path) for kernel in kernels for path in kernel.cmdline() if "explorer_" in path]
    assert served.stop(number) == 0
    assert served.lines == [f"explorer is at {served.url} (Ctrl-C stops it)\n"]
    assert not [kernel for kernel in kernels if kernel.is_running()]
    assert opened
    assert not [path for path in opened if path.exists()], "private files are left behind"


@pytest.mark.skipif(
    os.name == "nt", reason="these signals cannot be sent to one process on Windows"
)
@pytest.mark.parametrize("wait", [0.0, pytest.param(0.3, marks=pytest.mark.slow), 1.0])
def test_stops_cleanly_while_the_first_kernel_starts(start_server, wait: float) -> None:
    served = start_server(code=SMALL_PAGE)
    time.sleep(wait)
    kernels = served.kernels()
    assert served.stop() == 0
    assert "Traceback" not in "".join(served.lines)
    assert not [kernel for kernel in kernels if kernel.is_running()]


def test_listens_on_the_loopback_address_only(small) -> None:
    listening = [
        connection.laddr
        for connection in psutil.Process(small.process.pid).net_connections("inet")
        if connection.status == psutil.CONN_LISTEN
    ]
    assert {address.ip for address in listening} == {"127.0.0.1"}
    assert small.port in {address.port for address in listening}


@pytest.mark.parametrize("host", ["explorer.example", "127.0.0.1.example", "0.0.0.0", "192.0.2.1"])
def test_answers_no_foreign_name(small, host: str) -> None:
    for path in ("", "voila/static/voila.js", "api/kernels/x"):
        assert answer(small.url + path, Host=f"{host}:{small.port}")[0] == 404


def test_foreign_page_cannot_reach_a_kernel(small) -> None:
    _, _, text = answer(small.url)
    config = text.split('id="jupyter-config-data" type="application/json">')[1].split("</script>")[
        0
    ]
    kernel = json.loads(config)["kernelId"]
    socket_headers = {
        "Connection": "Upgrade",
        "Upgrade": "websocket",
        "Sec-WebSocket-Version": "13",
        "Sec-WebSocket-Key": "aGFyYm91ciBvZmZpY2UhIQ==",
        "Origin": "http://explorer.example",
    }
    connection = http.client.HTTPConnection("127.0.0.1", small.port, timeout=30)
    connection.request(
        "GET", f"/api/kernels/{kernel}/channels?session_id=x", headers=socket_headers
    )
    assert connection.getresponse().status == 403
    connection.close()
    assert answer(f"{small.url}api/kernels/{kernel}", Origin="http://explorer.example")[0] in (
        403,
        404,
    )


def test_source_is_hidden_and_no_file_is_shared(small) -> None:
    status, _, text = answer(small.url)
    assert status == 200
    assert "import ipywidgets" not in text
    for name in (
        "explorer.ipynb",
        "kernels/explorer/kernel.json",
        "../kernels/explorer/kernel.json",
        "x.png",
    ):
        assert answer(f"{small.url}voila/files/{name}")[0] in (403, 404)


def test_headers_allow_no_other_host(small) -> None:
    status, headers, text = answer(small.url)
    assert status == 200
    policy = dict(
        part.strip().split(" ", 1) for part in headers["Content-Security-Policy"].split(";")
    )
    assert policy["default-src"] == "'self'"
    assert "unsafe" not in policy["script-src"]
    assert policy["frame-ancestors"] == "'none'"
    assert not [value for value in policy.values() if "http" in value or "*" in value]
    markup = text.split('<script id="jupyter-config-data"')[0]
    assert not [
        part for part in ('src="http', 'href="http', "url(http", 'src="//') if part in markup
    ]
    assert headers["X-Content-Type-Options"] == "nosniff"
    assert headers["Referrer-Policy"] == "no-referrer"


def test_first_bytes_are_the_waiting_line(small) -> None:
    _, _, text = answer(small.url)
    assert '<html lang="en">' in text
    assert "<title>explorer</title>" in text
    assert text.index("Loading the page…") < text.index('id="rendered_cells"')


def test_a_cell_is_given_time_to_bring_what_it_shows(tmp_path: Path) -> None:
    """On a busy machine the page's output came over 4 s after the reply, and was left out: an empty page."""
    import nbformat
    from voila.execute import VoilaExecutor

    from explorer.page.server import page_config

    config = page_config(port=1, folder=tmp_path, notebook=tmp_path / "page.ipynb")
    assert VoilaExecutor(nbformat.v4.new_notebook(), config=config).iopub_timeout >= 30


@pytest.mark.slow
def test_works_from_an_installed_wheel_outside_a_clone(start_server, tmp_path: Path) -> None:
    pip = [sys.executable, "-m", "pip", "--disable-pip-version-check", "--quiet"]
    subprocess.run(
        [*pip, "wheel", "--no-deps", "-w", tmp_path, REPOSITORY], check=True, timeout=300
    )
    (wheel,) = tmp_path.glob("*.whl")
    installed = tmp_path / "installed"
    subprocess.run(
        [*pip, "install", "--no-deps", "--target", installed, wheel], check=True, timeout=300
    )
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    code = "import explorer, ipywidgets\n\nipywidgets.Label('from ' + explorer.__file__)"
    served = start_server(code=code, python_path=str(installed), folder=elsewhere)
    assert "Loading the page…" in answer(served.url)[2]
    kernel = served.kernels()[0]
    assert kernel.environ()["PYTHONPATH"] == str(installed)
    assert (installed / "share/jupyter/voila/templates/explorer/index.html.j2").is_file()
    page = start_server(python_path=str(installed), folder=elsewhere)
    assert "Traceback" not in answer(page.url)[2]
    assert [line for line in page.lines if page.url not in line] == []
