"""Scatter of an input from device to device: its kinds, which inputs they suit, and correlations."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .domain import InputError, finite_number, quoted
from .inputs import INPUTS

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
            raise InputError(f"the correlation of {one}|{other} = {value:g} is outside -1 to 1")
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
