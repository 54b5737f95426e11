"""Scatter of an input from device to device: its kinds, which inputs they suit, their values, and correlations."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .domain import FARTHEST, InputError, finite_number, quoted, shown
from .inputs import INPUTS

Array = NDArray[np.float64]

#: Kinds of scatter, and what their width means.
SPREADS = {
    "normal": "standard deviation",
    "lognormal": "standard deviation of the logarithm",
    "uniform": "half-width",
    "radial": "standard deviation per axis of a displacement in the plane",
    "direction": "static random directions of the dipole; the width is not used",
}

#: Distances in a plane from a centre: the inputs that a displacement in the plane can scatter.
IN_PLANE = ("lateral_offset", "fibre_offset")

#: The input that the direction of a dipole is told by.
ALIGNMENT = "dipole_alignment"

#: Fractions of a distribution are kept this far off its ends, where a value has no number.
FIRST, LAST = 2.0**-60, 1 - 2.0**-53

#: Below this chance a truncation takes nothing that a double could show.
NEGLIGIBLE = 1e-17

#: A normal distribution this many times wider than its range is even on it, to 1e-8.
EVEN = 1e4

#: Coefficients may miss a correlation matrix by this much, as rounded ones do.
ROUNDING = 1e-9


@dataclass(frozen=True)
class Spread:
    """Scatter of an input from device to device: kind (see SPREADS) and width, SI, >= 0."""

    kind: str
    width: float = 0.0

    def __post_init__(self) -> None:
        if not isinstance(self.kind, str) or self.kind not in SPREADS:
            raise InputError(
                f"{quoted(self.kind)} is no kind of scatter; known: {', '.join(SPREADS)}"
            )
        width = finite_number(self.width, "the width of a scatter")
        if width < 0:
            raise InputError(f"the width of a scatter must not be negative; got {width}")
        object.__setattr__(self, "width", width)

    @property
    def still(self) -> bool:
        """Whether nothing scatters: no width, where the kind has one."""
        return self.width == 0 and self.kind != "direction"


def kinds_for(name: str) -> tuple[str, ...]:
    """The kinds of scatter that suit an input."""
    known = ["normal", "lognormal", "uniform"]
    if name in IN_PLANE:
        known.append("radial")
    if name == ALIGNMENT:
        known.append("direction")
    return tuple(known)


def check_scatter(scatter: Any) -> None:
    """InputError for what is no mapping from inputs to spreads that suit them."""
    if not isinstance(scatter, Mapping):
        raise InputError(f"scatter = {quoted(scatter)} is no mapping from names")
    for name, spread in scatter.items():
        if name not in INPUTS:
            raise InputError(f"scatter names {quoted(name)}, which is no input")
        if not isinstance(spread, Spread):
            raise InputError(f"scatter of {name} is no Spread", name)
        if INPUTS[name].whole:
            raise InputError(f"{name} is no number, so it has no scatter", name)
        if spread.kind not in kinds_for(name):
            raise InputError(
                f"scatter of the kind {spread.kind!r} does not suit {name}; it takes "
                f"{', '.join(kinds_for(name))}",
                name,
            )


def _pair(key: Any) -> tuple[str, str]:
    """The two inputs that a correlation is of."""
    names = key.split("|") if isinstance(key, str) else list(key) if isinstance(key, tuple) else []
    known = [
        name
        for name in names
        if isinstance(name, str) and name in INPUTS and not INPUTS[name].whole
    ]
    if len(names) != 2 or len(set(known)) != 2:
        raise InputError(
            f"a correlation is of two inputs that scatter, 'one|other'; got {quoted(key)}"
        )
    return known[0], known[1]


def correlation_matrix(
    correlation: Mapping[Any, Any], names: Sequence[str] | None = None
) -> tuple[tuple[str, ...], NDArray[np.float64]]:
    """The inputs that pairs of coefficients speak of, and the matrix of their correlation.

    correlation: 'one|other' (or a pair of names) -> coefficient from -1 to 1, of the normal scores of
    the two. names: inputs that may be spoken of; None: any that are numbers. Raises InputError for
    what is no correlation, and where the coefficients cannot hold together.
    """
    if not isinstance(correlation, Mapping):
        raise InputError(f"correlation = {quoted(correlation)} is no mapping from pairs of names")
    found: dict[frozenset[str], float] = {}
    for key, value in correlation.items():
        one, other = _pair(key)
        for name in (one, other):
            if names is not None and name not in names:
                raise InputError(f"a correlation names {name}, which does not scatter in a line")
        number = finite_number(value, f"the correlation of {one}|{other}")
        if not -1 <= number <= 1:
            raise InputError(f"the correlation of {one}|{other} = {number!r} is outside -1 to 1")
        if found.setdefault(frozenset((one, other)), number) != number:
            raise InputError(f"the correlation of {one} and {other} is given twice")
    involved = [name for name in INPUTS if any(name in pair for pair in found)]
    matrix = np.eye(len(involved))
    for pair, number in found.items():
        row, column = (involved.index(name) for name in pair)
        matrix[row, column] = matrix[column, row] = number
    if involved and np.linalg.eigvalsh(matrix)[0] < -ROUNDING:
        raise InputError(
            f"the correlations of {', '.join(involved)} cannot hold together: they are those of no "
            "quantities"
        )
    return tuple(involved), matrix


def root_of(matrix: NDArray[np.float64]) -> NDArray[Any]:
    """A matrix that makes independent normal scores into ones of this correlation."""
    try:
        return np.asarray(np.linalg.cholesky(matrix))
    except np.linalg.LinAlgError:  # on the edge: some of them follow the others exactly
        sizes, vectors = np.linalg.eigh(matrix)
        return np.asarray(vectors * np.sqrt(np.maximum(sizes, 0.0)))


def values_of(
    name: str, spread: Spread, centre: Any, fractions: Sequence[Array], low: Any, high: Any
) -> Array:
    """Values of one input, SI, at fractions 0 to 1 of its distribution, truncated to low..high.

    centre, low, high: SI, arrays that broadcast. fractions: one array, of a displacement in the plane
    two. Where nothing of a distribution lies between low and high, the nearer end stands. Raises
    InputError where the centre is ∞, or of a lognormal one not above 0.
    """
    if spread.kind == "direction":
        return np.square(fractions[0])
    if not np.all(np.isfinite(centre)):
        raise InputError(f"{name} is ∞, and what is without end cannot scatter", name)
    if spread.kind == "lognormal" and np.any(np.asarray(centre) <= 0):
        text = shown(float(np.min(centre)), INPUTS[name])
        raise InputError(
            f"{name} = {text} has no logarithm, so its scatter cannot be lognormal", name
        )
    if INPUTS[name].low_open:
        low = np.maximum(low, 1 / FARTHEST)
    with np.errstate(all="ignore"):
        found = _KINDS[spread.kind](fractions, centre, spread.width, low, high)
    return _inside(name, found, low, high)


def _normal(fractions: Sequence[Array], centre: Any, width: float, low: Any, high: Any) -> Array:
    return normal_at(fractions[0], centre, width, low, high)


def _lognormal(fractions: Sequence[Array], centre: Any, width: float, low: Any, high: Any) -> Array:
    ends = [np.log(np.maximum(end, 0.0) / centre) for end in (low, high)]
    return np.asarray(centre * np.exp(normal_at(fractions[0], np.zeros(()), width, *ends)))


def _uniform(fractions: Sequence[Array], centre: Any, width: float, low: Any, high: Any) -> Array:
    first, last = np.maximum(centre - width, low), np.minimum(centre + width, high)
    return np.asarray(first + fractions[0] * (last - first))


def _radial(fractions: Sequence[Array], centre: Any, width: float, low: Any, high: Any) -> Array:
    """Distances from the middle: how far a displacement goes, then which way, within the circle allowed.

    About the middle itself the first fraction alone tells the distance, as evenly as it is drawn.
    """
    reach, off = np.minimum(np.abs(low), high), np.abs(centre)
    turn = 2 * np.pi * fractions[1]
    along, across = np.cos(turn), np.sin(turn)
    edge = np.sqrt(np.maximum(reach**2 - (off * across) ** 2, 0.0)) - off * along
    inside = -np.expm1(-((edge / width) ** 2) / 2)  # share of displacements that way
    far = np.minimum(width * np.sqrt(-2 * np.log1p(-fractions[0] * inside)), edge)
    far = np.where(inside < NEGLIGIBLE, edge * np.sqrt(fractions[0]), far)
    return np.asarray(np.hypot(off + far * along, far * across))


_KINDS = {"normal": _normal, "lognormal": _lognormal, "uniform": _uniform, "radial": _radial}


def normal_at(fraction: Array, centre: Any, width: float, low: Any, high: Any) -> Array:
    """Values at fractions of a normal distribution truncated to low..high, wherever its centre is."""
    from scipy.special import ndtr, ndtri

    fraction = np.clip(fraction, FIRST, LAST)
    size = np.minimum(width, EVEN * np.maximum(high - centre, centre - low))
    size = np.maximum(size, np.finfo(float).tiny)
    first, last = (low - centre) / size, (high - centre) / size
    under, over = (np.where(one < NEGLIGIBLE, 0.0, one) for one in (ndtr(first), ndtr(-last)))
    if not (under.any() or over.any()):
        return np.asarray(centre + width * ndtri(fraction))
    score = ndtri(under + fraction * (1 - over - under))
    away = (first > 0) | (last < 0)
    if away.any():
        score = np.where(away, _tail(fraction, first, last), score)
    return np.asarray(centre + size * score)


def _tail(fraction: Array, first: Any, last: Any) -> Array:
    """Scores at fractions of a normal distribution between two scores on one side of its centre."""
    from scipy.special import log_ndtr, ndtri_exp

    right = first > 0
    far, near = np.where(right, -last, first), np.where(right, -first, last)  # below the centre
    share = np.where(right, 1 - fraction, fraction)
    ends = log_ndtr(far) + np.log1p(-share), log_ndtr(near) + np.log(share)
    score = np.maximum(ndtri_exp(np.logaddexp(*ends)), far)
    score = np.where(np.isfinite(log_ndtr(near)), score, near)
    return np.asarray(np.where(right, -score, score))


def _inside(name: str, values: Array, low: Any, high: Any) -> Array:
    """Values off the ends of a range: rounding may have put them there, or on an end that is open."""
    entry = INPUTS[name]
    least = np.nextafter(low, np.inf) if entry.low_open else low
    most = np.nextafter(high, -np.inf) if entry.high_open else high
    return np.clip(values, least, most)
