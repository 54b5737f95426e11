"""A small plot of curves, drawn in the browser from one binary message (``plot.js``).

For plots that follow a dragged point: a step costs one message and about a millisecond of drawing.
The layout of the message is that of ``canvas.py``; its points count from the lower end of x, so that
they keep their digits in a frame that is narrow and far from zero. Nothing is computed here.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import anywidget
import numpy as np
import traitlets

from .canvas import message_of

#: Numbers and texts at places of an axis.
Ticks = tuple[tuple[float, str], ...]


@dataclass(frozen=True)
class Frame:
    """What the curves are drawn in: ranges, ticks, the label below, and whether x and y share a scale."""

    x: tuple[float, float]
    y: tuple[float, float]
    ticks: Ticks = ()
    y_ticks: Ticks = ()
    label: str = ""
    square: bool = False


@dataclass(frozen=True)
class Curve:
    """A line through points. colour: ink, quiet, sea, amber or red; fill: '', 'base' (down to the
    lower end of y) or 'inside'; opacity of the fill."""

    x: Any
    y: Any
    colour: str
    width: float = 2.5
    dashed: bool = False
    fill: str = ""
    opacity: float = 0.18


class Plot(anywidget.AnyWidget):
    """Curves in a frame; ``description`` is the text alternative."""

    _esm = Path(__file__).parent / "plot.js"
    packed = traitlets.Bytes(b"").tag(sync=True)
    description = traitlets.Unicode("").tag(sync=True)

    def show(self, frame: Frame, curves: Sequence[Curve], description: str) -> None:
        """Draw these curves, in one message; an equal drawing sends nothing."""
        rows, points = [], [np.empty((0, 2), "<f4")]
        for curve in curves:
            x = np.asarray(curve.x, float) - frame.x[0]
            path = np.column_stack([x, curve.y]).astype("<f4")
            row = {name: value for name, value in vars(curve).items() if name not in ("x", "y")}
            rows.append(row | {"count": len(path)})
            points.append(path)
        header = {**vars(frame), "curves": rows}
        with self.hold_sync():
            self.packed = message_of(header, {"points": np.concatenate(points)})
            self.description = description
