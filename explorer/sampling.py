"""Draws of what scatters from device to device: the same for every cell of a map.

Scrambled Sobol points in independent batches, each scrambled by itself, so that the spread between
the batches tells how sure a figure is. Correlated inputs share a Gaussian copula: a coefficient is of
the normal scores, and every input keeps its own distribution, truncated to its domain.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .domain import FARTHEST, InputError, quoted, real_number, shown
from .evaluate import Evaluation, limits_of
from .inputs import INPUTS
from .registry import dependencies
from .scatter import Spread, check_scatter, correlation_matrix, root_of

Array = NDArray[np.float64]

#: Batches of draws, each scrambled by itself.
BATCHES = 16

#: Most draws of one call.
MOST = 2**22

#: What is bought or written once for all devices: where it follows others by default, it follows
#: the design and not the single device.
BUILT_ONCE = ("resonance_wavelength", "filter_centre", "magnification")

#: Below this chance a truncation takes nothing that a double could show.
NEGLIGIBLE = 1e-17


def whole_count(count: Any, what: str = "count", most: int = MOST) -> int:
    """The draws of a call: at least `count`, BATCHES times a power of two. Raises InputError."""
    number = real_number(count)
    if number is None or number != int(number) or not 1 <= number <= most:
        raise InputError(f"{what} is a whole number from 1 to {most}; got {quoted(count)}")
    each = 1
    while each * BATCHES < number:
        each *= 2
    return each * BATCHES


def whole_seed(seed: Any) -> int:
    """A seed of random numbers. Raises InputError."""
    number = None if isinstance(seed, float) else real_number(seed)
    if number is None or number < 0:
        raise InputError(f"seed is a whole number from 0 on; got {quoted(seed)}")
    return int(seed)


@lru_cache(maxsize=16)
def _fractions(each: int, columns: int, seed: int, correlated: Any) -> Array:
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
        points[:, places] = ndtr(ndtri(np.clip(points[:, places], 2.0**-60, 1 - 2.0**-53)) @ root.T)
    points.setflags(write=False)
    return points


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
        """The inputs that scatter, those first that the ranges of others follow."""
        moving = [name for name in self.columns if not self.scatter[name].still]
        return sorted(moving, key=lambda name: bool(limits_of(name) & set(moving)))


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
    involved, matrix = correlation_matrix(correlation or {}, alone)
    rows = root_of(matrix) if involved else np.zeros((0, 0))
    correlated = tuple(
        (columns[name], tuple(row)) for name, row in zip(involved, rows.tolist(), strict=True)
    )
    points = _fractions(each, max(width, 1), whole_seed(seed), correlated)
    return Draws(dict(scatter), columns, points)


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
    if not names:
        return found
    lift = (slice(None), *(None,) * len(nominal.shape))
    for name in names:
        work = nominal
        if limits_of(name) & set(names):
            work = nominal.changed({key: found[key] for key in names if key in limits_of(name)})
        low, high = work.domain(name)
        column = drawn.columns[name]
        wide = 2 if drawn.scatter[name].kind == "radial" else 1
        parts = [drawn.fractions[rows, column + index][lift] for index in range(wide)]
        found[name] = _values(name, drawn.scatter[name], nominal.value(name), parts, low, high)
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


def _values(
    name: str, spread: Spread, centre: Any, parts: Sequence[Array], low: Any, high: Any
) -> Array:
    """Values of one input, SI, from fractions 0 to 1 of its distribution, truncated to low and high."""
    if spread.kind == "direction":
        return np.square(parts[0])
    if not np.all(np.isfinite(centre)):
        raise InputError(f"{name} is ∞, and what is without end cannot scatter", name)
    if spread.kind == "radial":
        reach = np.asarray(high) / np.sqrt(2)  # the square within the circle that is allowed
        across = _normal(parts[0], np.abs(centre), spread.width, -reach, reach)
        return np.hypot(across, _normal(parts[1], np.zeros(()), spread.width, -reach, reach))
    if spread.kind == "uniform":
        first, last = (
            np.maximum(centre - spread.width, low),
            np.minimum(centre + spread.width, high),
        )
        found = first + parts[0] * (last - first)
    elif spread.kind == "lognormal":
        if np.any(np.asarray(centre) <= 0):
            text = shown(float(np.min(centre)), INPUTS[name])
            raise InputError(
                f"{name} = {text} has no logarithm, so its scatter cannot be lognormal", name
            )
        with np.errstate(divide="ignore", invalid="ignore"):
            ends = [np.log(np.maximum(end, 0.0) / centre) for end in (low, high)]
        found = centre * np.exp(_normal(parts[0], np.zeros(()), spread.width, *ends))
    else:
        found = _normal(parts[0], centre, spread.width, low, high)
    return _inside(name, found, low, high)


def _normal(fraction: Array, centre: Any, width: float, low: Any, high: Any) -> Array:
    """Values of a normal distribution truncated to low..high, at fractions of it."""
    from scipy.special import ndtr, ndtri

    under, over = ndtr((low - centre) / width), ndtr((centre - high) / width)
    fraction = np.clip(fraction, 2.0**-60, 1 - 2.0**-53)
    if np.all(under < NEGLIGIBLE) and np.all(over < NEGLIGIBLE):
        return np.asarray(centre + width * ndtri(fraction))
    inner = under + fraction * (1 - over - under)
    return np.asarray(centre + width * ndtri(inner))


def _inside(name: str, values: Array, low: Any, high: Any) -> Array:
    """Values off the ends of a range: rounding may have put them there, or on an end that is open."""
    entry = INPUTS[name]
    least = np.nextafter(low, np.inf) if entry.low_open else low
    if entry.low_open:
        least = np.maximum(least, 1 / FARTHEST)
    most = np.nextafter(high, -np.inf) if entry.high_open else high
    return np.clip(values, least, most)


def scattered(
    point: Mapping[str, Any],
    scatter: Mapping[str, Spread],
    count: int = 4096,
    seed: int = 0,
    correlation: Mapping[Any, float] | None = None,
) -> dict[str, Any]:
    """A fabrication run: the point of so many devices, ready for `evaluate`.

    point: input name -> SI value; arrays (a map) may broadcast. scatter: input name -> `Spread`,
    around the point's own value and truncated to the input's domain. count: devices, rounded up to 16
    times a power of two: 16 batches of scrambled Sobol points, one batch after the other. correlation:
    'one|other' -> coefficient of their normal scores.
    Scattering inputs come as arrays of shape (count, *axes of the point); the rest stays as it was.
    `resonance_wavelength`, `filter_centre` and `magnification`, where they follow others by default,
    follow the design, not each device. Raises InputError.
    """
    return displaced(draws(scatter, count, seed, correlation), point)
