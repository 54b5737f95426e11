"""All a fresh clone needs besides Python: makes `.venv`, installs the project, runs a task.

    python3 tasks.py                opens the page (takes --port N and --no-browser)
    python3 tasks.py test           runs the tests; more words go to pytest
    python3 tasks.py slow           statistics, load and robot tests
    python3 tasks.py bench          speed figures
    python3 tasks.py lint           style
    python3 tasks.py types          types

The first run takes minutes, later ones start at once. Only the standard library is used here.
"""

import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path

HERE = Path(__file__).resolve().parent
ENVIRONMENT = HERE / ".venv"
OLDEST = (3, 11)
# task: what to install besides the project itself, and what to run (in the environment's Python)
TASKS = {
    "open": ("", [["-m", "explorer"]]),
    # Two files at a time: half of the tests wait for a browser or a server.
    "test": (
        "[test]",
        [["-m", "pytest", "-n", "2", "--dist", "loadfile"]],
    ),
    "slow": ("[test]", [["-m", "pytest", "-m", "slow"]]),
    "bench": ("[test]", [["-m", "pytest", "-m", "bench", "-s", "tests/bench"]]),
    "lint": ("[test]", [["-m", "ruff", "check"], ["-m", "ruff", "format", "--check"]]),
    "types": ("[test]", [["-m", "mypy"]]),
}


def main(words: list[str]) -> int:
    """Run the task named first (`open` if none is); every other word is passed on to it."""
    if sys.version_info < OLDEST:
        return fail(
            f"Python {OLDEST[0]}.{OLDEST[1]} or newer is needed; this is {sys.version.split()[0]}."
        )
    if words and words[0] in ("-h", "--help"):
        print(__doc__)
        return 0
    if words and words[0] == "check-notebooks":
        return check_notebooks(words[1:])
    task, rest = (
        (words[0], words[1:]) if words and not words[0].startswith("-") else ("open", words)
    )
    if task not in TASKS:
        return fail(f"There is no task {task!r}; the tasks are {', '.join(TASKS)}.")
    extra, commands = TASKS[task]
    problem = set_up(extra)
    if problem:
        return fail(problem)
    os.chdir(HERE)
    for command in commands[:-1]:
        code = subprocess.call([str(python()), *command])
        if code:
            return code
    return hand_over([str(python()), *commands[-1], *rest])


def set_up(extra: str) -> str | None:
    """Make the environment and install the project, unless done already; returns any problem."""
    done = ENVIRONMENT / f"installed{extra}"
    wanted = fingerprint()
    for mark in (done, ENVIRONMENT / "installed[test]"):  # the tests' environment has it all
        if mark.is_file() and mark.read_text(encoding="utf-8") == wanted:
            return None
    print("Setting up in .venv (a few minutes, once) …", flush=True)
    if not python().exists() and subprocess.call([sys.executable, "-m", "venv", str(ENVIRONMENT)]):
        return (
            "This Python cannot make environments; "
            "on Debian and Ubuntu `apt install python3-venv` helps."
        )
    install = [
        "-m",
        "pip",
        "install",
        "--quiet",
        "--disable-pip-version-check",
        "-e",
        f"{HERE}{extra}",
    ]
    if subprocess.call([str(python()), *install]):
        return "Installing the project failed; what pip said stands above."
    done.write_text(wanted, encoding="utf-8")
    return None


def fingerprint() -> str:
    """Changes whenever the environment has to be set up again."""
    project = (HERE / "pyproject.toml").read_bytes()
    return f"{sys.version} {HERE} {hashlib.sha256(project).hexdigest()}"


def python() -> Path:
    return ENVIRONMENT / ("Scripts/python.exe" if os.name == "nt" else "bin/python")


def hand_over(command: list[str]) -> int:
    """Become the command, so that signals reach it alone; where that cannot be, wait for it."""
    if os.name != "nt":
        sys.stdout.flush()
        os.execv(command[0], command)
    return subprocess.call(command)


def check_notebooks(paths: list[str]) -> int:
    """Notebooks are kept without outputs: they would go stale, and they hide changes."""
    for path in paths:
        cells = json.loads(Path(path).read_text(encoding="utf-8"))["cells"]
        if any(cell.get("outputs") or cell.get("execution_count") for cell in cells):
            return fail(f"{path} has outputs: clear them before committing.")
    return 0


def fail(sentence: str) -> int:
    print(sentence, file=sys.stderr)
    return 2


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
