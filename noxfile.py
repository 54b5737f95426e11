"""Every check as a session of its own: `nox -l` lists them and marks those that `nox` runs."""

import re
import tomllib
from pathlib import Path

import nox

nox.needs_version = ">=2024.10"
nox.options.sessions = ["lint", "types", "tests", "minimum"]
nox.options.default_venv_backend = "venv"

PROJECT = tomllib.loads(Path("pyproject.toml").read_text(encoding="utf-8"))["project"]


@nox.session
def tests(session: nox.Session) -> None:
    """The quick tests, browser included where there is one."""
    session.install("-e", ".[test]")
    session.run("pytest", "-n", "2", "--dist", "loadfile", *session.posargs)


@nox.session
def slow(session: nox.Session) -> None:
    """Statistics, load and robot tests."""
    session.install("-e", ".[test]")
    session.run("pytest", "-m", "slow", *session.posargs)


@nox.session
def bench(session: nox.Session) -> None:
    """Speed figures: medians and ratios of one run."""
    session.install("-e", ".[test]")
    session.run("pytest", "-m", "bench", "-s", "tests/bench", *session.posargs)


@nox.session
def lint(session: nox.Session) -> None:
    """Style and layout."""
    session.install("ruff>=0.9")
    session.run("ruff", "check")
    session.run("ruff", "format", "--check")


@nox.session
def types(session: nox.Session) -> None:
    """Types, strict everywhere but on the page."""
    session.install("-e", ".[test]")
    session.run("mypy")


@nox.session
def minimum(session: nox.Session) -> None:
    """The quick tests with the oldest versions that the project says it works with."""
    lowest = Path(session.create_tmp()).resolve() / "lowest.txt"
    lowest.write_text("\n".join(map(lowest_version, PROJECT["dependencies"])), encoding="utf-8")
    session.install("-e", ".[test]", "-c", str(lowest))
    session.run("pytest", *session.posargs)


def lowest_version(requirement: str) -> str:
    """`numpy>=2.0,<3` -> `numpy==2.0`."""
    name, version = re.match(r"([\w-]+)>=([\d.]+)", requirement).groups()
    return f"{name}=={version}"
