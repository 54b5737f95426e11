"""What is not known: draws of it, the range it leaves each quantity, and what to measure first.

An unknown is a range for one number, not scatter: nothing is said within it. It is drawn evenly on
the scale of its input (in the logarithm where the slider is logarithmic), by a scrambled Sobol
sequence with a fixed seed, so that the same design gives the same ranges.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .design import Design, Unknown
from .evaluate import Evaluation
from .inputs import INPUTS
from .registry import REGISTRY, dependencies

Array = NDArray[np.float64]

#: Draws for a range; a power of two, as the sequence wants.
DRAWS = 1024

#: A range holds this share of the draws, the same number left out at either end.
INSIDE = 0.9

#: Base draws of the sensitivity indices; a power of two; times (number of unknowns + 2) evaluations.
BASE = 128

SEED = 20010


@dataclass(frozen=True)
class Range:
    """Where nine tenths of the draws of a quantity lie, SI. missing: share of draws without number."""

    low: float
    high: float
    missing: float = 0.0


@dataclass(frozen=True)
class Influence:
    """What one unknown does to a quantity.

    share: of the variance of the quantity (of its logarithm where its scale is logarithmic) in which
    this unknown takes part, alone or with others: the total-order index, 0..1. low, high: the
    quantity with this one at the ends of its range and the others as in the design, SI.
    """

    name: str
    share: float
    low: float
    high: float


def spread(name: str, unknown: Unknown, fraction: Any) -> Array:
    """Values of an unknown, SI, at fractions 0..1 of its range, even on the scale of its input."""
    low, high = unknown.low, unknown.high
    f = np.asarray(fraction, dtype=float)
    if INPUTS[name].scale.startswith("log") and low > 0:
        return np.clip(low * (high / low) ** f, low, high)
    return np.clip(low + (high - low) * f, low, high)


def open_names(design: Design) -> list[str]:
    """The inputs of a design that are given as a range of some width."""
    return [name for name, unknown in design.unknowns.items() if unknown.low < unknown.high]


def unknowns_of(design: Design, wanted: Iterable[str]) -> list[str]:
    """The unknowns of a design that any of the wanted quantities can depend on."""
    needs: frozenset[str] = frozenset().union(*(dependencies(name) for name in wanted))
    return [name for name in open_names(design) if name in needs]


@lru_cache(maxsize=32)
def _fractions(count: int, columns: int) -> Array:
    from scipy.stats import qmc

    drawn = qmc.Sobol(columns, scramble=True, rng=SEED).random(count)
    drawn.setflags(write=False)
    return np.asarray(drawn)


def drawn_point(design: Design, count: int = DRAWS) -> dict[str, Any]:
    """The point of a design with its unknowns drawn: arrays of shape (count,)."""
    names = open_names(design)
    if not names:
        return dict(design.point)
    fractions = _fractions(count, len(names))
    drawn = {
        name: spread(name, design.unknowns[name], fractions[:, column])
        for column, name in enumerate(names)
    }
    return {**design.point, **drawn}


def ranges(design: Design, wanted: Iterable[str], count: int = DRAWS) -> dict[str, Range]:
    """The range that what is not known leaves each wanted quantity.

    Quantities that no unknown reaches, and those that are no numbers, are left out. count: a power
    of two. Raises InputError where values within the ranges cannot go together.
    """
    return dict(range_steps(design, wanted, count))


def range_steps(
    design: Design, wanted: Iterable[str], count: int = DRAWS
) -> Iterator[tuple[str, Range]]:
    """The same, one quantity after the other."""
    names = [
        name
        for name in dict.fromkeys(wanted)
        if REGISTRY.quantities[name].kind == "number" and unknowns_of(design, [name])
    ]
    if not names:
        return
    work = Evaluation(drawn_point(design, count))
    for name in names:
        yield name, range_of(np.asarray(work.result(name), dtype=float))


def range_of(values: Array) -> Range:
    """The range of a quantity from its draws."""
    known = np.sort(values[~np.isnan(values)], axis=None)
    if known.size == 0:
        return Range(float("nan"), float("nan"), 1.0)
    edge = (1 - INSIDE) / 2
    low, high = np.quantile(known, [edge, 1 - edge])
    return Range(float(low), float(high), 1 - known.size / max(values.size, 1))


def influences(design: Design, quantity: str, base: int = BASE) -> tuple[Influence, ...]:
    """What to measure first: the unknowns of a design by what they do to a quantity, most first.

    Total-order sensitivity indices by the method of Saltelli et al., Comput. Phys. Commun. 181, 259
    (2010), as scipy.stats.sobol_indices has it. base: a power of two. Raises InputError.
    """
    names = unknowns_of(design, [quantity])
    if not names:
        return ()
    shares = _total_indices(design, quantity, names, base)
    rows = []
    for name, share in zip(names, shares, strict=True):
        unknown = design.unknowns[name]
        ends = np.array([unknown.low, unknown.high])
        values = np.broadcast_to(Evaluation({**design.point, name: ends}).result(quantity), (2,))
        if values[0] != values[1] or share > 0:  # else it does not reach the quantity after all
            rows.append(Influence(name, float(share), float(values[0]), float(values[1])))
    return tuple(sorted(rows, key=lambda row: -row.share))


def _total_indices(design: Design, quantity: str, names: list[str], base: int) -> Array:
    from scipy import stats

    log = REGISTRY.quantities[quantity].log

    def outcome(fractions: Array) -> Array:
        """Fractions (d, ...) of the ranges -> the quantity (1, ...), in the logarithm where it is so."""
        shape = fractions.shape[1:]
        drawn: Mapping[str, Any] = {
            name: spread(name, design.unknowns[name], fractions[row])
            for row, name in enumerate(names)
        }
        value = np.broadcast_to(Evaluation({**design.point, **drawn}).result(quantity), shape)
        empty = np.isnan(value)
        if empty.any():
            value = np.where(empty, 0.0 if empty.all() else np.nanmean(value), value)
        return (np.log(np.maximum(value, 1e-300)) if log else np.array(value))[None]

    if np.ptp(outcome(_fractions(base, len(names)).T)) == 0:  # the library has no index for that
        return np.zeros(len(names))
    if len(names) == 1:  # nor for a single unknown, on which everything hangs
        return np.ones(1)
    dists: Any = [stats.uniform()] * len(names)
    with np.errstate(divide="ignore", invalid="ignore"):
        found = stats.sobol_indices(func=outcome, n=base, dists=dists, rng=SEED)
    shares = np.atleast_2d(found.total_order)[0]
    return np.asarray(np.clip(np.nan_to_num(shares, nan=0.0), 0.0, 1.0))
