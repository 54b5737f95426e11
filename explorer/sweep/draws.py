"""Random rows of a sweep: scrambled Sobol points, each worked out from its index."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import Unknown
from ..domain import InputError, quoted
from ..evaluate import Evaluation
from ..sampling import Draws, displaced
from ..scatter import Spread, correlation_matrix, root_of
from ..unknowns import spread

Array = NDArray[np.float64]

#: Most draws: the sequence has no more points.
MOST = 2**30

#: A column of its own for each coordinate of a displacement.
_WIDE = {"radial": 2}


@dataclass(frozen=True)
class Draw:
    """What is drawn: ranges, even on the scale of their inputs, and scatter about the base's values.

    The same seed gives the same rows, whatever the chunks. scatter is as `scattered` has it; what it
    scatters about is the point with every range in its middle.
    """

    count: int
    seed: int
    ranges: Mapping[str, Unknown]
    scatter: Mapping[str, Spread]
    correlation: Mapping[Any, float]

    @property
    def names(self) -> tuple[str, ...]:
        """The inputs that are drawn, ranges first."""
        return (*self.ranges, *self.scatter)

    def fractions(self, start: int, stop: int) -> Array:
        """Points start to stop of the unit cube, (stop - start, columns)."""
        from scipy.stats import qmc

        width = len(self.ranges) + sum(_WIDE.get(one.kind, 1) for one in self.scatter.values())
        sequence = qmc.Sobol(width, scramble=True, rng=self.seed)
        if start:
            sequence.fast_forward(start)
            return np.asarray(sequence.random(stop - start))
        # From its start the sequence gives powers of two only without a warning.
        whole = 1 << (stop - 1).bit_length()
        return np.asarray(sequence.random(whole)[:stop])


@dataclass(frozen=True)
class Drawn:
    """Rows start to stop of a draw."""

    draw: Draw
    start: int
    stop: int

    def __len__(self) -> int:
        return self.stop - self.start

    def columns(self, point: Mapping[str, Any]) -> tuple[dict[str, Array], dict[str, Any]]:
        """Values of the drawn inputs, SI, of shape (rows,), and further entries of the point.

        point: the entries that all rows share. Raises InputError where nothing can scatter about it.
        """
        draw = self.draw
        points = draw.fractions(self.start, self.stop)
        columns = {
            name: spread(name, range_, points[:, column])
            for column, (name, range_) in enumerate(draw.ranges.items())
        }
        if not draw.scatter:
            return columns, {}
        middle = {name: float(spread(name, range_, 0.5)) for name, range_ in draw.ranges.items()}
        nominal = {**point, **middle}
        found = displaced(self._scatter(points[:, len(columns) :]), nominal)
        for name in draw.scatter:
            value = found.pop(name) if name in found else Evaluation(nominal).value(name)
            columns[name] = np.broadcast_to(np.asarray(value, dtype=float), (len(self),))
        return columns, {name: value for name, value in found.items() if name not in draw.ranges}

    def _scatter(self, points: Array) -> Draws:
        """The draws of what scatters, with its correlation."""
        columns: dict[str, int] = {}
        width = 0
        for name, one in self.draw.scatter.items():
            columns[name] = width
            width += _WIDE.get(one.kind, 1)
        involved, matrix = correlated(self.draw.scatter, self.draw.correlation)
        if involved:
            from scipy.special import ndtr, ndtri

            places = [columns[name] for name in involved]
            scores = ndtri(np.clip(points[:, places], 2.0**-60, 1 - 2.0**-53))
            points = points.copy()
            points[:, places] = ndtr(scores @ root_of(matrix).T)
        return Draws(dict(self.draw.scatter), columns, points)


def correlated(
    scatter: Mapping[str, Spread], correlation: Mapping[Any, float]
) -> tuple[tuple[str, ...], Array]:
    """The correlated inputs of a scatter, and the matrix; InputError for what cannot be one."""
    alone = [name for name, one in scatter.items() if one.kind not in ("radial", "direction")]
    return correlation_matrix(correlation, alone)


def whole_number(given: Any, what: str, least: int, most: int) -> int:
    """A whole number within limits; InputError for any other."""
    number = isinstance(given, int | np.integer) and not isinstance(given, bool)
    if not number or not least <= given <= most:
        raise InputError(f"{what} is a whole number from {least} to {most}, not {quoted(given)}")
    return int(given)
