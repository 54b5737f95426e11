"""Maps of the share of devices that pass, from few cells and draws on."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from typing import Any

from .design import Design, Requirement
from .devices import Run, point_of, required
from .maps import Axis, Map, make_map, mesh
from .sampling import BATCHES, whole_count
from .scatter import Spread
from .yields import PASSING, Yield, grown

#: Cells along an axis of the maps that come before the whole one, and most devices of a run of which
#: each shows one batch.
COARSER = ((24, 1024), (48, 2048))


def make_yield_map(
    point: Mapping[str, Any] | Design,
    x: Axis,
    y: Axis,
    scatter: Mapping[str, Spread],
    requirements: Iterable[Requirement],
    count: int = 2048,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
    threads: int = 1,
) -> Map:
    """The share of devices that pass over two inputs; see `yield_of` and `make_map`.

    `values` holds `passing_share` with `passing_low` and `passing_high`, and `margin` is of the
    designs themselves, without scatter. Raises InputError.
    """
    steps = yield_map_steps(point, x, y, scatter, requirements, count, seed, correlation, threads)
    return deque(steps, maxlen=1).pop()[1]  # type: ignore[return-value]  # the last step always is one


def yield_map_steps(
    point: Mapping[str, Any] | Design,
    x: Axis,
    y: Axis,
    scatter: Mapping[str, Spread],
    requirements: Iterable[Requirement],
    count: int = 2048,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
    threads: int = 1,
    cautions: Iterable[str] = (),
    lines: Iterable[str] = (),
) -> Iterator[tuple[float, Map | None]]:
    """The same as it grows, from few cells and draws on.

    Pairs of the share of the work that is done, 0 to 1, and a `Map`, or None between two blocks.
    cautions, lines: as `make_map` takes its cautions and its wanted quantities.
    """
    point = point_of(point)
    wanted, lines, marks = required(requirements), list(lines), list(cautions)
    count = whole_count(count)
    most = max(x.count, y.count)
    for cells, drawn in (*(pair for pair in COARSER if pair[0] < most), (most, count)):
        whole = cells == most
        across, up = (replace(axis, count=min(cells, axis.count)) for axis in (x, y))
        base = make_map(point, across, up, [*lines, *marks], wanted, marks)
        entries = {**point, **mesh(across, up)}
        run = Run(entries, scatter, wanted, min(count, drawn), seed, correlation)
        blocks, done = max(run.blocks, 1), 0
        for found in grown(run, threads, BATCHES if whole else 1):
            done += found is None
            share = min(done / blocks, 1.0) if whole else 0.0
            if found is not None and whole and found.count == found.of:
                share = 1.0
            yield share, None if found is None else _drawn(base, found)


def _drawn(base: Map, found: Yield) -> Map:
    """A map of designs with the share of devices that pass in front."""
    values = {PASSING: found.share, "passing_low": found.low, "passing_high": found.high}
    return replace(base, values=values | dict(base.values))
