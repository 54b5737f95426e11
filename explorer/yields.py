"""How many fabricated devices pass: the share that meets every requirement, and how sure it is."""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import devices
from .design import Design, Requirement
from .devices import Counts, Job, Run, Tile
from .domain import InputError, quoted, real_number
from .registry import REGISTRY, Quantity
from .sampling import BATCHES, whole_number
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

#: Most threads of one call.
MOST_THREADS = 1024

#: Variance of rounding to a whole number.
ROUNDED = 1 / 12

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
    in Brown, Cai and DasGupta, Stat. Sci. 16, 101 (2001), from memory. A batch counts whole devices:
    the variance of that rounding, 1/12, is added to that between the batches, since evenly drawn
    ones often count the same although their share lies between two whole numbers.
    """
    from scipy.special import stdtrit

    batches = len(passes)
    count = batches * each
    total = np.asarray(passes.sum(axis=0))
    share = total / count
    few = np.minimum(total, count - total) < (FEW if batches > 1 else count)
    reach = np.zeros(total.shape)
    if batches > 1:
        between = passes.var(axis=0, ddof=1) + ROUNDED
        reach = stdtrit(batches - 1, (1 + CONFIDENCE) / 2) * np.sqrt(between / batches) / each
    low, high = np.array(np.maximum(share - reach, 0.0)), np.array(np.minimum(share + reach, 1.0))
    low[few], high[few] = _jeffreys(total[few], count)
    return Share(share, low, high)


def _jeffreys(passes: Counts, count: int) -> tuple[Array, Array]:
    """Jeffreys' interval of a binomial share, from none or to all where none or all pass."""
    from scipy.special import betaincinv

    number, place = np.unique(passes, return_inverse=True)  # a map asks for the same few many times
    tail = (1 - CONFIDENCE) / 2
    ends = [betaincinv(number + 0.5, count - number + 0.5, chance) for chance in (tail, 1 - tail)]
    return np.where(number > 0, ends[0], 0.0)[place], np.where(number < count, ends[1], 1.0)[place]


def _made(run: Run, passes: Counts, done: int) -> Yield:
    """A yield from the passes of the first `done` batches: (batches, 1 + requirements, *axes)."""
    shares = []
    never = np.zeros(run.shape, dtype=bool)
    for index, moves in reversed(list(enumerate(run.moved))):  # that of all of them last
        if moves:
            found = interval(passes[:done, index], run.each)
        else:  # nothing scatters that reaches it: exactly 0 or 1
            sure = passes[0, index] / run.each
            found = Share(sure, sure, sure)
            never |= sure == 0
        if index == 0:
            found = Share(found.share, found.low, np.where(never, 0.0, found.high))
        if not run.shape:
            found = Share(float(found.share), float(found.low), float(found.high))
        shares.append(found)
    *others, first = shares
    by_requirement = dict(zip(run.names, reversed(others), strict=True))
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
    steps = yield_steps(point, scatter, requirements, count, seed, correlation, threads)
    return deque(steps, maxlen=1).pop()  # type: ignore[return-value]  # the last step always is one


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
    threads = whole_number(threads, "threads", 1, MOST_THREADS)
    passes = np.zeros((BATCHES, len(run.moved), *run.shape), dtype=np.int64)
    if not run.moved[0]:  # one device tells all
        for tile in run.tiles(devices.BLOCK):
            found = run.passes(([tile], slice(0, 1)))[0][1]
            one: Any = (0, slice(None), *tile)
            passes[one] = found[0] * run.each
        yield _made(run, passes, BATCHES)
        return
    devices.keep_memory()
    pool = ThreadPoolExecutor(max_workers=threads)  # starts them when it is first used
    try:
        for batches, jobs in run.stages():
            for tile, found in _worked(run, jobs, pool if threads > 1 else None):
                part: Any = (slice(batches.start, batches.stop), slice(None), *tile)
                passes[part] += found
                yield None
            yield _made(run, passes, batches.stop)
            if batches.stop >= upto:
                return
    finally:  # of work that is given up, what was not begun is not
        pool.shutdown(cancel_futures=True)


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
    one = real_number(levels) is not None
    several = isinstance(levels, Sequence | np.ndarray) and not isinstance(levels, str | bytes)
    found = [real_number(level) for level in ([levels] if one else levels if several else [])]
    known = tuple(level for level in found if level is not None and 0 <= level <= 1)
    if not known or len(known) < len(found):
        raise InputError(f"a level of a quantile is a number from 0 to 1; got {quoted(levels)}")
    return known


def _quantiles(run: Run, quantity: str, levels: Any) -> Quantiles:
    """Quantiles with the interval of Woodruff, J. Am. Stat. Assoc. 47, 635 (1952), from memory.

    It is that of the share of devices below the quantile, read off as levels.
    """
    wanted = _levels(levels)
    _numbers(quantity)
    shape = (len(wanted), *run.shape)
    middle, low, high = (np.empty(shape) for _ in range(3))
    missing = np.empty(run.shape)
    for tile in run.tiles(max(1, devices.BLOCK // run.count)):
        values = run.values(tile, quantity)
        ordered = np.sort(values, axis=0)  # not-a-number comes last
        known = np.count_nonzero(~np.isnan(values), axis=0)
        missing[tile] = (run.count - known) / run.count
        for index, level in enumerate(wanted):
            here: Any = (index, *tile)
            middle[here] = _at_level(ordered, known, level)
            below = (values <= middle[here]).reshape(BATCHES, run.each, *values.shape[1:])
            found = interval(np.count_nonzero(below, axis=1), run.each)
            for ends, end in ((low, found.low), (high, found.high)):
                apart = (end - found.share) * run.count / np.maximum(known, 1)
                ends[here] = _at_level(ordered, known, np.clip(level + apart, 0.0, 1.0))
    return Quantiles(wanted, middle, low, high, missing if run.shape else float(missing))


def _at_level(ordered: Array, known: Any, level: Any) -> Array:
    """A quantile of sorted values, along the first axis, of which so many are known."""
    last = np.maximum(known - 1, 0)
    place = level * last
    below = place.astype(np.int64)
    first, second = (
        np.take_along_axis(ordered, np.minimum(at, last)[None], axis=0)[0]
        for at in (below, below + 1)
    )
    with np.errstate(invalid="ignore"):
        between = first + (place - below) * (second - first)
    return np.asarray(np.where(first == second, first, between))
