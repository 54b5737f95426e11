"""How many fabricated devices pass: the share that meets every requirement, and how sure it is."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import devices
from .design import Design, Requirement
from .devices import Counts, Job, Run, Tile
from .domain import InputError, quoted
from .evaluate import Evaluation
from .registry import REGISTRY, Quantity
from .sampling import BATCHES
from .scatter import Spread

Array = NDArray[np.float64]

#: The name of the share of devices that pass, where quantities are named.
PASSING = "passing_share"

REGISTRY.collective[PASSING] = Quantity(
    PASSING,
    "%",
    "Devices that pass",
    "",
    "definition",
    "fabrication",
    False,
    "number",
    (),
    "",
    "Share of fabricated devices that meet every requirement, from the scatter of the design.",
)

#: An interval holds the share with this probability.
CONFIDENCE = 0.95

#: With fewer passes or failures than this the batches say too little: their binomial interval stands.
FEW = 24


@dataclass(frozen=True)
class Share:
    """A share of devices, 0..1, and the interval that holds it with 95 % (numbers, or arrays of a map)."""

    share: Any
    low: Any
    high: Any


@dataclass(frozen=True)
class Quantiles:
    """levels: 0..1; values: of the quantity there, SI, (levels, *axes); low, high: 95 % interval of each.

    missing: share of devices for which the quantity has no number.
    """

    levels: tuple[float, ...]
    values: Array
    low: Array
    high: Array
    missing: Any


@dataclass(frozen=True)
class Yield:
    """How many devices pass.

    share, low, high: of devices that meet every requirement, and its 95 % interval from 16
    independently scrambled batches; numbers for one design, arrays for a point with arrays.
    by_requirement: the same of each requirement alone, by quantity (with its sense and limit where
    one quantity is required twice). count: devices drawn so far; of: to be drawn.
    """

    share: Any
    low: Any
    high: Any
    by_requirement: Mapping[str, Share]
    count: int
    of: int
    _run: Any = field(repr=False, compare=False, default=None)

    def quantile(self, quantity: str, levels: Any = 0.5) -> Quantiles:
        """Quantiles of any quantity over the same devices. levels: one or several, 0..1."""
        return _quantiles(self._run, quantity, levels)


def interval(passes: Counts, each: int) -> Share:
    """Share and interval from the passes of independent batches, (batches, ...), of `each` draws.

    Student's t over the batches; with few passes or failures Jeffreys' interval of the binomial, as
    in Brown, Cai and DasGupta, Stat. Sci. 16, 101 (2001), from memory.
    """
    from scipy.special import betaincinv, stdtrit

    batches = len(passes)
    count = batches * each
    total = passes.sum(axis=0)
    share = total / count
    tail = (1 - CONFIDENCE) / 2
    low = np.where(total > 0, betaincinv(total + 0.5, count - total + 0.5, tail), 0.0)
    high = np.where(total < count, betaincinv(total + 0.5, count - total + 0.5, 1 - tail), 1.0)
    if batches > 1:
        reach = stdtrit(batches - 1, 1 - tail) * passes.std(axis=0, ddof=1) / each
        reach = reach / np.sqrt(batches)
        enough = np.minimum(total, count - total) >= FEW
        low = np.where(enough, np.maximum(share - reach, 0.0), low)
        high = np.where(enough, np.minimum(share + reach, 1.0), high)
    return Share(share, low, high)


def _certain(passes: Counts, count: int) -> Share:
    """The share where nothing scatters: exactly 0 or 1."""
    share = passes / count
    return Share(share, share, share)


def _made(run: Run, passes: Counts, done: int) -> Yield:
    """A yield from the passes of the first `done` batches: (batches, 1 + requirements, *axes)."""
    shares = []
    for index, moves in enumerate(run.moved):
        if moves:
            found = interval(passes[:done, index], run.each)
        else:  # nothing scatters that reaches it: exactly 0 or 1
            sure = passes[0, index] / run.each
            found = Share(sure, sure, sure)
        if not run.shape:
            found = Share(float(found.share), float(found.low), float(found.high))
        shares.append(found)
    first, *others = shares
    by_requirement = dict(zip(run.names, others, strict=True))
    return Yield(
        first.share, first.low, first.high, by_requirement, done * run.each, run.count, run
    )


def yield_of(
    point: Mapping[str, Any] | Design,
    scatter: Mapping[str, Spread],
    requirements: Iterable[Requirement],
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
    threads: int = 1,
) -> Yield:
    """The share of fabricated devices that meet every requirement.

    point: input name -> SI value, or a `Design` (its point alone counts); arrays (a map, a curve)
    give arrays of shares. scatter: input name -> `Spread`. requirements: one `Requirement` or more. count:
    devices drawn for each cell, rounded up to 16 times a power of two. seed, correlation: see
    `scattered`. threads: how many share the work; the result is the same. A device for which a
    required quantity has no number does not pass. Raises InputError.
    """
    *_, last = yield_steps(point, scatter, requirements, count, seed, correlation, threads)
    return last  # type: ignore[return-value]  # the last step always is one


def yield_steps(
    point: Mapping[str, Any] | Design,
    scatter: Mapping[str, Spread],
    requirements: Iterable[Requirement],
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
    threads: int = 1,
) -> Iterator[Yield | None]:
    """The same as it grows: a `Yield` after every batch of a map, None between two blocks."""
    yield from grown(Run(point, scatter, requirements, count, seed, correlation), threads)


def grown(run: Run, threads: int, upto: int = BATCHES) -> Iterator[Yield | None]:
    """A yield as it grows, batch by batch; `upto`: batches that are enough."""
    passes = np.zeros((BATCHES, len(run.moved), *run.shape), dtype=np.int64)
    if not run.moved[0]:  # one device tells all
        for tile in run.tiles(devices.BLOCK):
            found = run.passes(([tile], slice(0, 1)))[0][1]
            one: Any = (0, slice(None), *tile)
            passes[one] = found[0] * run.each
        yield _made(run, passes, BATCHES)
        return
    with ThreadPoolExecutor(max_workers=max(1, threads)) as pool:
        for batches, jobs in run.stages():
            for tile, found in _worked(run, jobs, pool if threads > 1 else None):
                part: Any = (slice(batches.start, batches.stop), slice(None), *tile)
                passes[part] += found
                yield None
            yield _made(run, passes, batches.stop)
            if batches.stop >= upto:
                return


def _worked(
    run: Run, jobs: Sequence[Job], pool: ThreadPoolExecutor | None
) -> Iterator[tuple[Tile, Counts]]:
    """The tiles of the jobs one by one; with a pool, jobs side by side."""
    for job in [] if pool else jobs:
        yield from run.walk(job)
    for done in pool.map(run.passes, jobs) if pool else ():
        yield from done


def quantiles(
    point: Mapping[str, Any] | Design,
    scatter: Mapping[str, Spread],
    quantity: str,
    levels: Any = (0.05, 0.5, 0.95),
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
) -> Quantiles:
    """Quantiles of a quantity over fabricated devices; see `yield_of` for the arguments.

    levels: one or several, 0..1; 0.1 is what nine of ten devices reach or exceed. Raises InputError.
    """
    known = _numbers(quantity)
    dummy = Requirement(known, at_least=0.0)
    run = Run(point, scatter, [dummy], count, seed, correlation)
    return _quantiles(run, known, levels)


def _numbers(quantity: str) -> str:
    known = REGISTRY.quantities.get(quantity) if isinstance(quantity, str) else None
    if known is None or known.kind != "number":
        raise InputError(f"{quoted(quantity)} is no quantity that is a number")
    return quantity


def _levels(levels: Any) -> tuple[float, ...]:
    found = np.atleast_1d(np.asarray(levels, dtype=float))
    if found.ndim != 1 or not ((found >= 0) & (found <= 1)).all():
        raise InputError(f"a level of a quantile is a number from 0 to 1; got {quoted(levels)}")
    return tuple(found.tolist())


def _quantiles(run: Run, quantity: str, levels: Any) -> Quantiles:
    from scipy.special import stdtrit

    wanted = _levels(levels)
    _numbers(quantity)
    shape = (len(wanted), *run.shape)
    middle, low, high = (np.empty(shape) for _ in range(3))
    missing = np.empty(run.shape)
    reach = stdtrit(BATCHES - 1, (1 + CONFIDENCE) / 2) / np.sqrt(BATCHES)
    for tile in run.tiles(max(1, devices.BLOCK // run.count)):
        size = tuple(part.stop - part.start for part in tile)
        found = Evaluation(run.devices(tile, slice(None))).result(quantity)
        values = np.broadcast_to(np.asarray(found, dtype=float), (run.count, *size))
        batches = values.reshape(BATCHES, run.each, *size)
        missing[tile] = np.isnan(values).mean(axis=0)
        with np.errstate(all="ignore"):
            at = np.nanquantile(values, wanted, axis=0)
            each = np.nanquantile(batches, wanted, axis=1)
            half = reach * each.std(axis=1, ddof=1)
        here = (slice(None), *tile)
        middle[here] = at
        low[here], high[here] = at - half, at + half
    return Quantiles(wanted, middle, low, high, missing if run.shape else float(missing))
