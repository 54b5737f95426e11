"""Draws of what scatters from device to device: the same for every cell of a map.

Scrambled Sobol points in independent batches, each scrambled by itself, so that the spread between
the batches tells how sure a figure is. Correlated inputs share a Gaussian copula: a coefficient is of
the normal scores, and every input keeps its own distribution, truncated to its domain.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.constants import speed_of_light

from .domain import CLOSEST, SPECTRUM_REACH, InputError, quoted, real_number
from .evaluate import Evaluation, limits_of
from .inputs import BROADEST, INPUTS
from .registry import dependencies
from .scatter import FIRST, LAST, Spread, check_scatter, correlation_matrix, root_of, values_of
from .whole import Samples

Array = NDArray[np.float64]

#: Batches of draws, each scrambled by itself.
BATCHES = 16

#: Most draws of one call.
MOST = 2**22

#: What is bought or written once for all devices: where it follows others by default, it follows
#: the design and not the single device.
BUILT_ONCE = ("resonance_wavelength", "filter_centre", "magnification")

#: Numbers of a set of points up to which it is kept for the next call.
KEPT = 2**20

#: Inputs that the ranges of others follow.
LIMITING = frozenset[str]().union(*(limits_of(name) for name in INPUTS))

#: Width of the broadest line in frequency times its wavelength [m/s].
WIDEST = speed_of_light * BROADEST / (1 - BROADEST**2 / 4)

#: How far a limit that comes from another input keeps off rounding.
CLEAR = 1 + 1e-12


def whole_number(given: Any, what: str, least: int, most: float = np.inf) -> int:
    """A whole number within limits. Raises InputError."""
    number = real_number(given)
    if number is None or not least <= number <= most or int(given) != given:
        ends = f"from {least} to {most}" if most < np.inf else f"from {least} on"
        raise InputError(f"{what} is a whole number {ends}; got {quoted(given)}")
    return int(given)


def whole_count(count: Any, what: str = "count", most: int = MOST) -> int:
    """The draws of a call: at least `count`, BATCHES times a power of two. Raises InputError."""
    number = whole_number(count, what, 1, most)
    return BATCHES << max(0, (-(-number // BATCHES) - 1).bit_length())


def whole_seed(seed: Any) -> int:
    """A seed of random numbers. Raises InputError."""
    if isinstance(seed, float | np.floating):
        raise InputError(f"seed is a whole number from 0 on; got {quoted(seed)}")
    return whole_number(seed, "seed", 0)


def _points(each: int, columns: int, seed: int, correlated: Any) -> Array:
    """Points of the unit cube, (BATCHES * each, columns), batch by batch, read-only.

    correlated: pairs of (column, row of the root of a correlation matrix), or ().
    """
    from scipy.special import ndtr, ndtri
    from scipy.stats import qmc

    drawn = np.empty((BATCHES, each, columns))
    for batch in range(BATCHES):
        rng = np.random.default_rng([seed, batch])
        drawn[batch] = qmc.Sobol(columns, scramble=True, rng=rng).random(each)
    points = drawn.reshape(-1, columns)
    if correlated:
        places = [column for column, _ in correlated]
        root = np.array([row for _, row in correlated])
        points[:, places] = ndtr(ndtri(np.clip(points[:, places], FIRST, LAST)) @ root.T)
    points.setflags(write=False)
    return points


_kept_points = lru_cache(maxsize=16)(_points)


@dataclass(frozen=True)
class Draws:
    """Scrambled points for the inputs of a scatter: (count, columns), values 0 to 1, and whose they are."""

    scatter: Mapping[str, Spread]
    columns: Mapping[str, int]
    fractions: Array

    @property
    def count(self) -> int:
        """Devices drawn."""
        return len(self.fractions)

    @property
    def names(self) -> list[str]:
        """The inputs that scatter, those first that the ranges or the values of others follow."""
        moving = [name for name in self.columns if not self.scatter[name].still]
        return sorted(moving, key=lambda name: len(_followed(name).intersection(moving)))


def draws(
    scatter: Mapping[str, Spread],
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
) -> Draws:
    """Draws for a scatter. An input of zero width keeps its column, so that the others keep theirs.

    Raises InputError for what is no scatter, no correlation of what scatters, no count or no seed.
    """
    check_scatter(scatter)
    each = whole_count(count) // BATCHES
    columns: dict[str, int] = {}
    width = 0
    for name in INPUTS:
        if name in scatter:
            columns[name] = width
            width += 2 if scatter[name].kind == "radial" else 1
    alone = [name for name in columns if scatter[name].kind not in ("radial", "direction")]
    involved, matrix = correlation_matrix({} if correlation is None else correlation, alone)
    rows = root_of(matrix) if involved else np.zeros((0, 0))
    correlated = tuple(
        (columns[name], tuple(row)) for name, row in zip(involved, rows.tolist(), strict=True)
    )
    width = max(width, 1)
    made = _kept_points if BATCHES * each * width <= KEPT else _points
    return Draws(dict(scatter), columns, made(each, width, whole_seed(seed), correlated))


def displaced(
    drawn: Draws, point: Mapping[str, Any], rows: slice = slice(None), still: Sequence[str] = ()
) -> dict[str, Any]:
    """A point with its scattering inputs drawn: the draws in front, the axes of the point last.

    point: input name -> SI value, arrays allowed. rows: which draws. still: inputs that do not
    scatter this time. Raises InputError.
    """
    nominal = Evaluation(point)
    names = [name for name in drawn.names if name not in still]
    found = {**point, **_built_once(nominal, names)}
    lift = (slice(None), *(None,) * len(nominal.shape))
    room = Room(nominal, {name: drawn.scatter[name] for name in names}, found)
    for name in names:
        column = drawn.columns[name]
        wide = 2 if drawn.scatter[name].kind == "radial" else 1
        parts = [drawn.fractions[rows, column + index][lift] for index in range(wide)]
        found[name] = room.values(name, parts)
    return found


def _built_once(nominal: Evaluation, names: Sequence[str]) -> dict[str, Any]:
    """What follows scattering inputs by default but is the same for all devices, as designed."""
    moved = set(names)
    return {
        name: nominal.value(name)
        for name in BUILT_ONCE
        if name not in nominal.given
        and name not in moved
        and not dependencies(name, nominal.given).isdisjoint(moved)
    }


@cache
def _followed(name: str) -> frozenset[str]:
    """What must be drawn before an input: what its default, its range or `Room` asks for."""
    more = {"emission_wavelength"} if name == "temperature" else set()
    return dependencies(name) | limits_of(name) | more


@dataclass(frozen=True)
class Room:
    """Where the values of scattering inputs lie beside the others.

    An input whose range follows others stays within what was drawn of them; one that ranges follow
    stays where the inputs that hold still are allowed. So every device is one that can be evaluated.
    """

    nominal: Evaluation
    scatter: Mapping[str, Spread]
    #: The point with what was drawn so far.
    found: Mapping[str, Any]

    def values(self, name: str, fractions: Sequence[Array]) -> Array:
        """Values of an input, SI, at fractions of its distribution."""
        return values_of(name, self.scatter[name], self.centre(name), fractions, *self.ends(name))

    def centre(self, name: str) -> Any:
        """The value about which an input scatters: one that follows others does so device by device."""
        given = self.nominal.given
        needs = dependencies(name, given)
        if name in given or name in BUILT_ONCE or needs.isdisjoint(self.scatter.keys() - {name}):
            return self.nominal.value(name)
        return Evaluation({key: self.found[key] for key in needs if key in self.found}).value(name)

    def ends(self, name: str) -> tuple[Any, Any]:
        """The least and the greatest value of an input beside the others, SI."""
        work, follows = self.nominal, limits_of(name)
        if not follows.isdisjoint(self.scatter):
            beside = (*follows, "reference_side")
            work = Evaluation({key: self.found[key] for key in beside if key in self.found})
        low, high = work.domain(name)
        for least in self._least(name) if name in LIMITING else ():
            low = np.minimum(np.maximum(low, least * CLEAR), high)
        for most in self._most(name):
            high = np.maximum(np.minimum(high, most / CLEAR), low)
        return low, high

    def _least(self, name: str) -> Iterator[Any]:
        """Least values that leave room for what holds still; the ranges of others are proportional."""
        for other in self.nominal.given - self.scatter.keys():
            ends = (INPUTS[other].low, INPUTS[other].high) if name in limits_of(other) else ()
            for end in (end for end in ends if callable(end)):
                yield self.nominal.value(other) / end(**{name: 1.0})
        for offset, width in self._rows() if name == "emission_wavelength" else ():
            own = np.max(self.nominal.value("fast_linewidth")) if width is None else width
            yield max(offset / (reach - 1) for reach in SPECTRUM_REACH)
            yield own / BROADEST - offset

    def _most(self, name: str) -> Iterator[Any]:
        """Greatest values at which the spectrum, or a law of the line's width, is still allowed."""
        law, spectrum = (self.nominal.value(whole) for whole in ("broadening", "spectrum"))
        if law is not None and "fast_linewidth" not in self.nominal.given:
            with np.errstate(divide="ignore"):
                if name == "emission_wavelength":
                    yield WIDEST / law.width(self.nominal.value("temperature"))
                if name == "temperature":
                    yield _hottest(law, WIDEST / self._wavelength(LAST))
        if name == "emission_wavelength" and isinstance(spectrum, Samples):
            yield np.diff(spectrum.offsets).min() / CLOSEST
        first = [row[0] for row in self._rows() if row[1] is None]
        if name == "fast_linewidth" and first:
            yield BROADEST * (np.min(self._wavelength(FIRST)) + min(first))

    def _rows(self) -> list[tuple[float, float | None]]:
        """Offset and width of each line of the spectrum; of samples the ends."""
        spectrum = self.nominal.value("spectrum")
        if isinstance(spectrum, Samples):
            return [(float(spectrum.offsets[end]), 0.0) for end in (0, -1)]
        return [line[1:] for line in spectrum.lines] if spectrum else []

    def _wavelength(self, fraction: float) -> Any:
        """The emission wavelength at a fraction of its distribution."""
        name = "emission_wavelength"
        value = self.nominal.value(name)
        return self.values(name, [np.asarray(fraction)]) if name in self.scatter else value


def _hottest(law: Any, width: Any) -> Any:
    """The temperature [K] up to which a law stays at a width [Hz] or below."""
    entry = INPUTS["temperature"]
    low, high = (np.full(np.shape(width), end) for end in (entry.low, entry.high))
    for _ in range(64 if np.any(law.width(high) > width) else 0):
        middle = (low + high) / 2
        below = law.width(middle) <= width
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return high


def scattered(
    point: Mapping[str, Any],
    scatter: Mapping[str, Spread],
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
) -> dict[str, Any]:
    """A fabrication run: the point of so many devices, ready for `evaluate`.

    point: input name -> SI value; arrays (a map) may broadcast. scatter: input name -> `Spread`,
    around the point's own value and truncated to the input's domain beside the others (see `Room`).
    count: devices, rounded up to 16 times a power of two: 16 batches of scrambled Sobol points, one
    batch after the other. correlation: 'one|other' -> coefficient of their normal scores.
    Scattering inputs come as arrays of shape (count, *axes of the point); the rest stays as it was.
    `resonance_wavelength`, `filter_centre` and `magnification`, where they follow others by default,
    follow the design; whatever else follows others follows each device, and scatters about that.
    Raises InputError.
    """
    return displaced(draws(scatter, count, seed, correlation), point)
