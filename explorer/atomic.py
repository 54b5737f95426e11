"""Files that are written whole or not at all."""

from __future__ import annotations

import os
import secrets
from pathlib import Path

#: As a program opens a new file: binary where the system has two ways, not handed on to children.
_NEW = os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0)


def write_whole(text: str, path: str | os.PathLike[str]) -> None:
    """Write a text in UTF-8; an interruption leaves the file that was there.

    The text is written beside the file and moved into its place. A link is followed and stays a
    link. A file that was there keeps its rights, a new one has those of any new file of this
    process. Raises OSError, ValueError for a path that no file system takes.
    """
    target = Path(os.path.realpath(path))
    try:
        rights = target.stat().st_mode & 0o777
    except FileNotFoundError:
        rights = None
    beside = target.with_name(f".{target.name}.{secrets.token_hex(4)}")
    handle = os.open(beside, _NEW, 0o666 if rights is None else rights)
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        if rights is not None:
            beside.chmod(rights)  # what the mask took away
        os.replace(beside, target)  # noqa: PTH105  # os's own name says that it is atomic
    finally:
        beside.unlink(missing_ok=True)
