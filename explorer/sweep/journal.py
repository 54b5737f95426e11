"""What is known of a table that is being written: a small file beside it, always whole."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import asdict, dataclass, fields
from pathlib import Path
from typing import Any, Final

from ..atomic import write_whole
from ..domain import quoted
from ..version import __version__
from .faults import PlanError

FORMAT: Final = "explorer sweep"

#: Version of the journal and of what it speaks of; others are refused.
VERSION: Final = 1


@dataclass(frozen=True)
class Journal:
    """plan: fingerprint. tool: version that began the table. rows, chunk, chunks: of the whole table.

    done: chunks that are stored for good; size, tail: bytes of a text file then, and the check sum of
    its last chunk, which is as long as `last`. refused, reason: as in `sweep`. columns: what varies,
    in words; base: what does not.
    """

    plan: str
    rows: int
    chunk: int
    chunks: int
    columns: Mapping[str, str]
    base: Mapping[str, str]
    wanted: tuple[str, ...]
    tool: str = __version__
    done: int = 0
    size: int = 0
    last: int = 0
    tail: int = 0
    refused: int = 0
    reason: str = ""

    @property
    def complete(self) -> bool:
        """Whether the table is finished."""
        return self.done == self.chunks

    def save(self, path: Path) -> None:
        """Write it, whole or not at all. Raises OSError."""
        text = {"format": FORMAT, "version": VERSION, **asdict(self)}
        write_whole(json.dumps(text, ensure_ascii=False, indent=1) + "\n", path)


def load(path: Path) -> Journal | None:
    """The journal in a file, None where there is none. Raises PlanError for a file that is none."""
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError:
        return None
    except (OSError, ValueError) as error:
        raise PlanError(f"{quoted(path.name)} cannot be read; {_RESTART}") from error
    if not isinstance(found, dict) or found.pop("format", None) != FORMAT:
        raise PlanError(f"{quoted(path.name)} is no journal of a sweep; {_RESTART}")
    if found.pop("version", None) != VERSION or found.get("tool") != __version__:
        tool = str(found.get("tool", "?"))[:20]
        raise PlanError(
            f"{quoted(path.name)} is of version {tool} of this tool, and this is {__version__}: "
            f"finish the table with that one, or {_RESTART}"
        )
    kinds = {entry.name: entry.type for entry in fields(Journal)}
    whole = {name for name, kind in kinds.items() if kind == "int"}
    if found.keys() != kinds.keys() or not all(_count(found[name]) for name in whole):
        raise PlanError(f"{quoted(path.name)} has been changed; {_RESTART}")
    found["wanted"] = tuple(found["wanted"])
    return Journal(**found)


_RESTART: Final = "ask for a restart, which begins the table anew"


def _count(value: Any) -> bool:
    return isinstance(value, int) and value >= 0
