"""The devices of a design that pass, worked out in pieces beside its answer."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from .curves import Cut
from .design import Design
from .domain import InputError
from .maps import Axis, Map, make_map
from .unknowns import Range, drawn_point, open_names, range_of
from .yield_maps import yield_map_steps
from .yields import PASSING, Yield, yield_of, yield_steps

#: Draws of what is not known, and devices of each, for the range of the share that passes.
UNKNOWN_DRAWS, UNKNOWN_DEVICES = 64, 256


def passing_cut(design: Design, axis: Axis, count: int) -> Cut:
    """The share of devices that pass along an input through a design. Raises InputError.

    Where nothing is required, every device passes.
    """
    if not design.requirements:
        return Cut(axis.values, np.ones(axis.count))
    point = {**design.point, axis.name: axis.values}
    asked = (design.scatter, design.requirements)
    found = yield_of(point, *asked, count, correlation=design.correlation)
    return Cut(axis.values, found.share)


def passing_map_steps(
    design: Design, x: Axis, y: Axis, count: int, lines: Sequence[str], cautions: Sequence[str]
) -> Iterator[tuple[float, Map | None]]:
    """The map of the devices that pass as it grows, see `yield_map_steps`. Raises InputError.

    Where nothing is required, every device passes.
    """
    if design.requirements:
        yield from yield_map_steps(
            design.point,
            x,
            y,
            design.scatter,
            design.requirements,
            count=count,
            correlation=design.correlation,
            cautions=cautions,
            lines=lines,
        )
        return
    drawn = make_map(design.point, x, y, [*lines, *cautions], (), cautions)
    every = {PASSING: np.ones((y.count, x.count))}
    yield 1.0, replace(drawn, values=every | dict(drawn.values))


def scatters(design: Design) -> bool:
    """Whether the devices that pass are asked for: some scatter, or a share of them is wanted."""
    wanted = bool(design.scatter) or design.passing is not None
    return wanted and bool(design.requirements)


def fabrication_key(design: Design) -> tuple[Any, ...]:
    """What the devices that pass depend on."""
    return (
        design.point,
        design.scatter,
        design.correlation,
        design.requirements,
        design.unknowns,
    )


class Passing:
    """The devices of a design that pass, and the range that what is not known leaves their share."""

    def __init__(self, design: Design) -> None:
        self._design = design
        self.share: Yield | None = None
        self._grown: Yield | None = None
        self.around: Range | None = None
        self.fault = ""

    def steps(self) -> Iterator[None]:
        """Work it out, in pieces; what is done is kept."""
        design = self._design
        asked = (design.scatter, design.requirements)
        try:
            if self.share is None and not self.fault:
                for found in yield_steps(design, *asked, correlation=design.correlation):
                    self._grown = found
                    yield
                self.share = self._grown
            if self.around is None and open_names(design):
                point = drawn_point(design, UNKNOWN_DRAWS)
                drawn = yield_of(point, *asked, UNKNOWN_DEVICES, correlation=design.correlation)
                self.around = range_of(drawn.share)
        except InputError as error:  # what scatters cannot there, or ranges that cannot go together
            self.fault = str(error)
