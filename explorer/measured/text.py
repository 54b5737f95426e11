"""Bytes of a measured file to lines of text, or one sentence that says why it is no text."""

from __future__ import annotations

import codecs
import hashlib
import os
import re
import stat
from dataclasses import dataclass
from typing import Final

from .data import DataError

#: What a file is read from: its path, or its bytes.
Source = str | os.PathLike[str] | bytes | bytearray | memoryview | tuple[str, bytes]

#: Largest file that is read [bytes].
LARGEST: Final = 20_000_000

#: Most lines of a file.
MOST_LINES: Final = 500_000

#: First bytes of files that are no text, and what they are in words.
_KINDS: Final[tuple[tuple[bytes, str], ...]] = (
    (b"\xd0\xcf\x11\xe0", "this is a spreadsheet file, save it as CSV text"),
    (b"\x1f\x8b", "this is a compressed file, unpack it first"),
    (b"BZh", "this is a compressed file, unpack it first"),
    (b"\xfd7zXZ", "this is a compressed file, unpack it first"),
    (b"7z\xbc\xaf", "this is a compressed file, unpack it first"),
    (b"%PDF", "this is a PDF document, not a table of numbers as text"),
    (b"{\\rtf", "this is a document of a word processor, save it as plain text"),
    (b"\x89PNG", "this is a picture, not a table of numbers as text"),
    (b"\xff\xd8\xff", "this is a picture, not a table of numbers as text"),
    (b"GIF8", "this is a picture, not a table of numbers as text"),
    (b"II*\x00", "this is a picture, not a table of numbers as text"),
    (b"MM\x00*", "this is a picture, not a table of numbers as text"),
    (b"\x89HDF", "this is an HDF5 file, export the columns as text"),
    (b"\x93NUMPY", "this is a NumPy file, export the columns as text"),
    (b"MATLAB 5", "this is a file of matrices, export the columns as text"),
)

#: Byte-order marks; the longer ones first.
_MARKS: Final = (
    (codecs.BOM_UTF8, "utf-8", "UTF-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le", "UTF-32"),
    (codecs.BOM_UTF32_BE, "utf-32-be", "UTF-32"),
    (codecs.BOM_UTF16_LE, "utf-16-le", "UTF-16"),
    (codecs.BOM_UTF16_BE, "utf-16-be", "UTF-16"),
)

#: Control characters that no text holds in number; tabulators, line ends and escapes are none of them.
_CONTROL: Final = bytes(one for one in range(32) if one not in (9, 10, 11, 12, 13, 26, 27))

#: Typeset signs and their plain ones: minus, and the spaces that do not break a line.
_PLAIN: Final = str.maketrans(
    {"−": "-", "\u00a0": " ", "\u202f": " ", "\u2009": " ", "\u2007": " "}
)


@dataclass(frozen=True)
class Document:
    """The text of a file.

    name: of the file, without its folder. digest: SHA-256 of the bytes, hexadecimal. lines: without
    line ends; line 1 is the first. encoding: in words.
    """

    name: str
    digest: str
    lines: tuple[str, ...]
    encoding: str

    def error(self, reason: str, line: int | None = None) -> DataError:
        """The error to raise for this file."""
        return DataError(reason, self.name, line)


def load(source: Source, name: str = "") -> Document:
    """The text behind a path, or in the bytes of a file called `name`, or in a pair of name and bytes.

    Takes UTF-8, UTF-16 and UTF-32 with or (UTF-8 and UTF-16) without a byte-order mark, and Latin-1;
    line ends of every system. Raises DataError for what is missing, empty, above LARGEST, or no text.
    """
    data, name = _bytes(source, name)
    if len(data) > LARGEST:
        raise DataError(_too_large(len(data)), name)
    if not data.strip():
        raise DataError("the file is empty", name)
    text, encoding = _decoded(data, name)
    text = text.removeprefix("\ufeff").rstrip("\x1a\x00")
    if not text.strip():
        raise DataError("the file is empty", name)
    if "\r" in text:
        text = re.sub("\r+\n|\r", "\n", text)
    if not text.isascii():
        text = text.translate(_PLAIN)
    if (count := text.count("\n")) > MOST_LINES:
        raise DataError(f"{count:,} lines are more than the {MOST_LINES:,} that are read", name)
    return Document(name, hashlib.sha256(data).hexdigest(), tuple(text.split("\n")), encoding)


def plain_name(name: str) -> str:
    """The last part of a path, printable, at most 80 characters."""
    last = re.split(r"[/\\]", name)[-1]
    return "".join(sign if sign.isprintable() else "?" for sign in last[:80])


def _too_large(size: int) -> str:
    return f"the file has {size / 1e6:,.1f} MB, the largest that is read has {LARGEST / 1e6:.0f} MB"


def _bytes(source: Source, name: str) -> tuple[bytes, str]:
    """The bytes and the name; a file that is too large is not read."""
    if isinstance(source, tuple) and len(source) == 2 and isinstance(source[1], bytes):
        name, source = str(source[0]), source[1]
    if isinstance(source, bytes | bytearray | memoryview):
        if (size := memoryview(source).nbytes) > LARGEST:
            raise DataError(_too_large(size), plain_name(name))
        return bytes(source), plain_name(name)
    if not isinstance(source, str | os.PathLike):
        raise DataError(
            f"a file is given by its path or its bytes, not by {type(source).__name__!r}"
        )
    path = os.fspath(source)
    name = plain_name(name or path)
    try:
        found = os.stat(path)  # noqa: PTH116 - a path may be of any kind, also one with a null byte
        if not stat.S_ISREG(found.st_mode):
            raise DataError("this is no file but a folder or a device", name)
        if found.st_size > LARGEST:
            raise DataError(_too_large(found.st_size), name)
        with open(path, "rb") as file:  # noqa: PTH123 - as above
            return file.read(LARGEST + 1), name
    except OSError as error:
        raise DataError(_why(error), name) from error
    except ValueError as error:
        if isinstance(error, DataError):
            raise
        raise DataError("this is no path of a file", name) from error


def _why(error: OSError) -> str:
    if isinstance(error, FileNotFoundError):
        return "there is no such file"
    return f"the file cannot be read: {(error.strerror or 'unknown fault').lower()}"


def _decoded(data: bytes, name: str) -> tuple[str, str]:
    """Text and the name of its encoding."""
    for start, words in _KINDS:
        if data.startswith(start):
            raise DataError(words, name)
    if data.startswith(b"PK\x03\x04"):
        raise DataError(_packed(data), name)
    for mark, codec, encoding in _MARKS:
        if data.startswith(mark):
            return _strict(data[len(mark) :], codec, encoding, name), encoding
    if codec := _wide(data):
        return _strict(data, codec, "UTF-16", name), "UTF-16"
    _refuse_binary(data, name)
    try:
        return data.decode("utf-8"), "UTF-8"
    except UnicodeDecodeError:
        pass
    try:
        return data.decode("cp1252"), "Latin-1"
    except UnicodeDecodeError:
        return data.decode("latin-1"), "Latin-1"


def _packed(data: bytes) -> str:
    """What a zip archive is: spreadsheets are kept in such ones."""
    sheets = (b"xl/", b"[Content_Types].xml", b"opendocument.spreadsheet", b".sheet")
    if any(word in data for word in sheets):
        return "this is a spreadsheet file, save it as CSV text"
    return "this is a compressed file, unpack it first"


def _strict(data: bytes, codec: str, encoding: str, name: str) -> str:
    """Text of a file that says its encoding; a mark in front of something else is refused."""
    try:
        text = data.decode(codec)
    except UnicodeDecodeError as error:
        line = data[: error.start].decode(codec, "replace").count("\n") + 1
        raise DataError(f"the file says that it is {encoding}, and is not", name, line) from error
    _refuse_binary(text.encode("utf-8", "replace"), name)
    return text


def _wide(data: bytes) -> str:
    """The codec of text in two bytes a character without a mark; '' where it is no such text."""
    head = data[:4096]
    odd, even = head[1::2], head[::2]
    if len(odd) > 3 and odd.count(0) > 0.8 * len(odd) and not even.count(0):
        return "utf-16-le"
    if len(even) > 3 and even.count(0) > 0.8 * len(even) and not odd.count(0):
        return "utf-16-be"
    return ""


def _refuse_binary(data: bytes, name: str) -> None:
    """DataError for bytes that are no text; a few stray control characters are let through."""
    body = data.rstrip(b"\x00\x1a")
    null = body.find(0)
    if null >= 0:
        line = body.count(b"\n", 0, null) + 1
        raise DataError("this is a binary file (it holds a null byte), not text", name, line)
    control = len(body) - len(body.translate(None, _CONTROL))
    if control > max(8, 0.005 * len(body)):
        raise DataError("this is a binary file, not text", name)
