"""The map canvas: one quantity over two inputs, drawn and dragged in the browser.

The kernel sends a whole picture as one binary message; colour, legend, readout, labels and the
design point are the browser's work (``map.js``). Nothing is computed here.

Layout of the message: a little-endian uint32 with the length of the header, the header (JSON in
UTF-8, padded with spaces so that what follows is aligned to 4 bytes), then the arrays one after
the other, each aligned to 4 bytes. ``header["arrays"]`` maps a name to ``[kind, offset, count]``,
the offset in bytes from the end of the header. Masks are planes of bits, low bit first, a plane
for every bit that is used; the values come last, because the browser's comparison of an old and
a new message may start at either end and should find a difference soon.
"""

import json
import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal

import anywidget
import numpy as np
import traitlets

KINDS = {"float32": np.dtype("<f4"), "uint32": np.dtype("<u4"), "uint8": np.dtype("u1")}


@dataclass(frozen=True)
class AxisScale:
    """One axis of the map, in the unit that is shown."""

    label: str
    low: float
    high: float
    unit: str = ""  # "" or "1": a plain number
    log: bool = False


@dataclass(frozen=True)
class ColourScale:
    """What the colours stand for; values beyond the limits take the colour of the limit."""

    title: str  # for the readout and screen readers; the canvas draws no title
    low: float
    high: float
    unit: str = ""  # "1/s" is written with SI prefixes: 8.4 M/s
    log: bool = False
    categories: tuple[str, ...] = ()  # given: values are codes 0, 1, ... into these names


@dataclass(frozen=True)
class SecondScale:
    """A second reading of an axis: ticks at axis fractions with finished texts."""

    label: str
    ticks: tuple[tuple[float, str], ...]  # (fraction, text)


@dataclass(frozen=True)
class Band:
    """A horizontal band between two fractions of the y axis, for instance an emitter's line."""

    low: float
    high: float
    text: str
    own: bool = False  # the design's own emitter: drawn stronger, its text never dropped


@dataclass(frozen=True)
class Mark:
    """A small triangle at a place, with a name beside it and a longer text on hover.

    own: a device of the user's, which was measured: a disc, and never dropped for room.
    """

    x: float  # axis fraction
    y: float  # axis fraction
    text: str
    tooltip: str = ""
    key: str = ""  # handed to the handlers of ``on_mark``
    own: bool = False


@dataclass(frozen=True)
class Label:
    """A text beside a place of an outline, such as the requirement that binds there."""

    x: float  # axis fraction
    y: float  # axis fraction
    text: str


@dataclass(frozen=True)
class Line:
    """An iso-line, an outline of the region that meets everything, or a frontier."""

    kind: Literal["iso", "outline", "frontier"]
    paths: tuple[np.ndarray, ...]  # each (n, 2), columns x and y in axis fractions
    text: str = ""  # written along iso-lines and frontiers where there is room
    level: float | None = None  # iso-lines: the value, which decides between ink and paper


@dataclass(frozen=True)
class Picture:
    """Everything that a redraw needs. Fractions run from 0 (low end of an axis) to 1 (high end)."""

    values: np.ndarray
    """(ny, nx) numbers, row 0 the lowest y; sent as float32; NaN where there is no number."""
    x: AxisScale
    y: AxisScale
    colour: ColourScale
    ends_included: bool = True
    """True: sample i of n lies at fraction i/(n-1); False: at (i + 1/2)/n."""
    cautioned: np.ndarray | None = None
    """(ny, nx) bool, or uint8 with bit k set where caution k holds; hatched where not 0."""
    caution_texts: tuple[str, ...] = ()
    """Name of each bit of ``cautioned``, for the readout."""
    holds: np.ndarray | None = None
    """(ny, nx) bool: every requirement holds; closes the outline at the border of the map."""
    lines: tuple[Line, ...] = ()
    labels: tuple[Label, ...] = ()
    """Texts at the outline."""
    bands: tuple[Band, ...] = ()
    marks: tuple[Mark, ...] = ()
    top: SecondScale | None = None
    right: SecondScale | None = None
    layers: Mapping[str, bool] = field(default_factory=dict)
    """Layers to hide: any of outline, iso, frontiers, bands, marks, hatching, scales -> False.
    ``bands`` False keeps the design's own band."""


def pack(picture: Picture) -> bytes:
    """One binary message from a picture; raises ValueError for shapes or numbers that don't fit."""
    values = np.asarray(picture.values)
    if values.ndim != 2 or values.size == 0:
        raise ValueError(f"values must have the shape (ny, nx), not {values.shape}")
    header = _words(picture) | {"shape": list(values.shape)}
    header["lines"], points, starts = _joined(picture.lines)
    arrays = {"points": points, "starts": starts}
    for name in ("cautioned", "holds"):
        mask = getattr(picture, name)
        if mask is not None and np.shape(mask) != values.shape:
            raise ValueError(f"{name} has the shape {np.shape(mask)}, values {values.shape}")
        if mask is not None and np.any(mask):
            arrays[name] = _planes(np.asarray(mask).astype("u1"))
    return message_of(header, arrays | {"values": np.ascontiguousarray(values, "<f4")})


def unpack(message: bytes) -> tuple[dict[str, Any], dict[str, np.ndarray]]:
    """Header and arrays of a packed picture: what the browser reads, for tests and tools."""
    start = 4 + int(np.frombuffer(message, "<u4", 1)[0])
    header = json.loads(message[4:start])
    arrays = {
        name: np.frombuffer(message, KINDS[kind], count, start + offset)
        for name, (kind, offset, count) in header["arrays"].items()
    }
    count = math.prod(header["shape"])
    for name in {"cautioned", "holds"} & arrays.keys():
        planes = arrays[name].reshape(-1, -(-count // 8))
        bits = np.unpackbits(planes, axis=1, count=count, bitorder="little")
        arrays[name] = np.packbits(bits, axis=0, bitorder="little")[0]
    return header, arrays


def _words(picture: Picture) -> dict[str, Any]:
    one = ("x", "y", "colour", "top", "right")
    many = ("labels", "bands", "marks")
    header: dict[str, Any] = {
        name: part and vars(part) for name in one for part in [getattr(picture, name)]
    }
    header |= {name: [vars(row) for row in getattr(picture, name)] for name in many}
    return header | {
        "ends_included": picture.ends_included,
        "caution_texts": list(picture.caution_texts),
        "layers": dict(picture.layers),
    }


def _planes(mask: np.ndarray) -> np.ndarray:
    flat = mask.ravel()
    used = int(flat.max()).bit_length()
    return np.stack([np.packbits(flat >> bit & 1, bitorder="little") for bit in range(used)])


def _joined(lines: tuple[Line, ...]) -> tuple[list[dict[str, Any]], np.ndarray, np.ndarray]:
    rows, paths = [], []
    for line in lines:
        row = {"kind": line.kind, "text": line.text, "level": line.level}
        rows.append(row | {"first": len(paths), "count": len(line.paths)})
        paths += [np.asarray(path, "<f4").reshape(-1, 2) for path in line.paths]
    points = np.concatenate([np.empty((0, 2), "<f4"), *paths])
    starts = np.cumsum([0, *map(len, paths)], dtype="<u4")
    return rows, points, starts


def message_of(header: dict[str, Any], arrays: dict[str, np.ndarray]) -> bytes:
    """Header and arrays in the layout that the module describes."""
    parts: list[Any] = []  # arrays are joined as they are: a copy less of the values
    places, offset = {}, 0
    for name, array in arrays.items():
        places[name] = [array.dtype.name, offset, array.size]
        padding = -array.nbytes % 4
        parts += [array, bytes(padding)]
        offset += array.nbytes + padding
    # allow_nan: a NaN limit would only show as a parse error in the browser
    header["arrays"] = places
    words = json.dumps(header, allow_nan=False, default=np.generic.item).encode()
    words += b" " * (-len(words) % 4)
    return b"".join([np.uint32(len(words)).astype("<u4").tobytes(), words, *parts])


class MapCanvas(anywidget.AnyWidget):
    """The map with its draggable design point.

    ``point`` is ``[fx, fy]`` in axis fractions, both ways; outside 0..1 the ring waits at the
    border. ``proposal`` is empty, or a design that is not taken yet: its ``place`` in axis fractions,
    a ``text`` beside it, and the ``path`` of those it was chosen from. ``description`` is the text alternative of the map.
    """

    _esm = Path(__file__).parent / "map.js"
    packed = traitlets.Bytes(b"").tag(sync=True)
    point = traitlets.List(traitlets.Float(), default_value=[0.5, 0.5]).tag(sync=True)
    proposal = traitlets.Dict(default_value={}).tag(sync=True)
    description = traitlets.Unicode("Map of one quantity over two inputs").tag(sync=True)
    # The browser numbers its moves and the kernel repeats the last number it has worked through:
    # until then a point from the kernel is an echo of an older move, and the ring ignores it.
    move_sent = traitlets.Int(0).tag(sync=True)
    move_done = traitlets.Int(0).tag(sync=True)

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._mark_handlers: list[Callable[[str], None]] = []
        self.on_msg(self._hear)

    def show(self, picture: Picture) -> None:
        """Draw this picture, in one message; an equal picture sends nothing."""
        self.packed = pack(picture)

    def on_mark(self, handler: Callable[[str], None]) -> None:
        """Call the handler with a mark's key when the mark is clicked (the point moves there)."""
        self._mark_handlers.append(handler)

    def set_state(self, sync_data: dict[str, Any]) -> None:
        """Take a change from the browser; what follows from it goes back as one message."""
        with self.hold_sync():
            try:
                super().set_state(sync_data)
            finally:  # even a failing handler has worked the move through
                if "move_sent" in sync_data:
                    self.move_done = self.move_sent

    @traitlets.validate("point")
    def _check_point(self, proposal: dict[str, Any]) -> list[float]:
        point = proposal["value"]
        if len(point) != 2 or not all(math.isfinite(fraction) for fraction in point):
            raise traitlets.TraitError(f"a point is two finite axis fractions, not {point}")
        return point

    def _hear(self, _widget: object, content: dict[str, Any], _buffers: object) -> None:
        if content.get("kind") == "mark":
            for handler in self._mark_handlers:
                handler(content["key"])
