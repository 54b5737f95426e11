"""A table of thousands of rows that scrolls, sorts and filters in the browser (``table.js``).

The kernel sends a whole table as one binary message in the layout of ``canvas.py``: texts in the
header, column by column, and one array ``ranks``. A rank is the place of a cell's value among the
distinct values of its column, so that the browser sorts whole numbers and compares no words.
"""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal, NamedTuple

import anywidget
import numpy as np
import traitlets

from .canvas import message_of

KINDS = ("text", "number", "pass")
TONES = ("", "met", "quiet")

#: The rank of a cell without a value: sorts last in both directions.
BLANK = 2**32 - 1

NUMBER = re.compile(r"(\d+(?:\.\d+)?)")


@dataclass(frozen=True)
class Column:
    """A column: ``key`` is its name for sorting, ``label`` its heading.

    kind: "text"; "number", to the right in even digits; "pass", a mark ✓ or ✗ for a value that
    is true or false. width: px, or None for one that fits the texts and shares what room is left.
    """

    key: str
    label: str
    kind: Literal["text", "number", "pass"] = "text"
    tooltip: str = ""
    width: float | None = None
    first_descending: bool = False  # the first click on the heading puts the highest on top


class Cell(NamedTuple):
    """What is shown, what is sorted by (None and NaN come last), and a tooltip.

    In a "pass" column ``text`` is the word that stands for the mark, for filter and screen reader.
    """

    text: str
    value: float | str | None
    title: str = ""


class Row(NamedTuple):
    """A row: a key of its own, a cell for every column, and a tone.

    tone: "met" tints the row and is what "only what meets everything" leaves; "quiet" greys it.
    """

    key: str
    cells: tuple[Cell, ...]
    tone: Literal["", "met", "quiet"] = ""


def pack(columns: Sequence[Column], rows: Sequence[Row], description: str) -> bytes:
    """One binary message from a table; raises ValueError for what does not fit together."""
    _check(columns, rows)
    texts, values, titles = _columnwise(rows)
    parts, ranks = [], []
    for k, column in enumerate(columns):
        mine = slice(k, None, len(columns))
        sent = {"texts": texts[mine], "titles": None, "marks": None}
        if any(titles[mine]):
            sent["titles"] = titles[mine]
        if column.kind == "pass":
            sent["marks"] = "".join(map(_mark, values[mine]))
        parts.append(vars(column) | sent)
        ranks.append(_ranks(values[mine]))
    header = {
        "description": description,
        "columns": parts,
        "keys": [row.key for row in rows],
        "tones": [row.tone for row in rows],
    }
    return message_of(header, {"ranks": np.array(ranks)})


def _check(columns: Sequence[Column], rows: Sequence[Row]) -> None:
    if not columns:
        raise ValueError("a table needs a column")
    for name, keys in (("column", columns), ("row", rows)):
        if len({part.key for part in keys}) < len(keys):
            raise ValueError(f"two {name}s of a table have the same key")
        if not all(part.key and isinstance(part.key, str) for part in keys):
            raise ValueError(f"every {name}'s key is a word")
    for column in columns:
        if column.kind not in KINDS:
            raise ValueError(f"a column's kind is one of {KINDS}, not {column.kind!r}")
    for row in rows:
        if len(row.cells) != len(columns):
            raise ValueError(f"row {row.key!r} has {len(row.cells)} cells, not {len(columns)}")
        if row.tone not in TONES:
            raise ValueError(f"a row's tone is one of {TONES}, not {row.tone!r}")


def _columnwise(rows: Sequence[Row]) -> tuple[list[Any], list[Any], list[Any]]:
    """Texts, values and titles of all cells, row by row: a stride apart lies a column."""
    cells = [cell for row in rows for cell in row.cells]
    texts, values, titles = ([cell[k] for cell in cells] for k in range(3))
    return texts, values, titles


def _ranks(values: Sequence[Any]) -> np.ndarray:
    """Place of every value among the distinct ones: numbers, then words; BLANK for none."""
    if not any(issubclass(kind, str) for kind in set(map(type, values))):
        return _ranks_of_numbers(np.array(values, float))
    distinct = {value for value in values if not _is_blank(value)}
    words = {value for value in distinct if isinstance(value, str)}
    ordered = sorted(distinct - words) + sorted(words, key=_as_read)
    places = {value: place for place, value in enumerate(ordered)}
    return np.array([places.get(value, BLANK) for value in values], "<u4")


def _ranks_of_numbers(numbers: np.ndarray) -> np.ndarray:
    ranks = np.full(numbers.shape, BLANK, "<u4")
    known = ~np.isnan(numbers)
    ranks[known] = np.unique(numbers[known], return_inverse=True)[1]
    return ranks


def _is_blank(value: Any) -> bool:
    return value is None or value != value  # noqa: PLR0124  # NaN alone differs from itself


def _as_read(word: str) -> tuple[list[Any], str]:
    """Sorts as a person reads: capitals are no matter, "NA 0.9" comes before "NA 0.95" and 10."""
    parts: list[Any] = NUMBER.split(word.casefold())
    parts[1::2] = map(float, parts[1::2])
    return parts, word


def _mark(value: Any) -> str:
    if _is_blank(value):
        return "–"
    return "✓" if value else "✗"


class Table(anywidget.AnyWidget):
    """Rows to look through, to choose from and to keep.

    ``current`` is the key of the row that is the present design, or "". The browser keeps order,
    filter, scrolled place and focused row when other rows are shown. Its height is that of what
    it stands in, 420 px of rows where that has none of its own.
    """

    _esm = Path(__file__).parent / "table.js"
    _css = Path(__file__).parent / "table.css"
    packed = traitlets.Bytes(b"").tag(sync=True)
    current = traitlets.Unicode("").tag(sync=True)

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._keys: frozenset[str] = frozenset()
        self._handlers: dict[str, list[Callable[[str], None]]] = {"pick": [], "keep": []}
        self.on_msg(self._hear)

    def show(self, columns: Sequence[Column], rows: Sequence[Row], description: str) -> None:
        """Show these rows, in one message; an equal table sends nothing.

        description: the text alternative. Raises ValueError, and changes nothing, where a key
        comes twice, a row has not a cell for every column, or a kind or tone is unknown.
        """
        packed = pack(columns, rows, description)
        self._keys = frozenset(row.key for row in rows)
        self.packed = packed

    def on_pick(self, handler: Callable[[str], None]) -> None:
        """Call the handler with a row's key when the row is clicked or Enter is pressed on it."""
        self._handlers["pick"].append(handler)

    def on_keep(self, handler: Callable[[str], None]) -> None:
        """Call the handler with a row's key when it is to be kept: its button, or the key k."""
        self._handlers["keep"].append(handler)

    def _hear(self, _widget: object, content: Any, _buffers: object) -> None:
        """Hand a key on; what is not a present row's key is dropped, whoever sent it."""
        if not isinstance(content, dict):
            return
        kind, key = content.get("kind"), content.get("key")
        if isinstance(kind, str) and isinstance(key, str) and key in self._keys:
            for handler in self._handlers.get(kind, ()):
                handler(key)
