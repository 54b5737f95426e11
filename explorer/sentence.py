"""The meeting's question answered in words: one headline, and a smaller line below it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from .budget import Step
from .design import Design, Requirement, written
from .inputs import INPUTS
from .maps import Axis, Map
from .registry import REGISTRY
from .units import text

#: Where a rate arrives, after "… photons/s".
ARRIVALS = {
    "rate_at_lens": "reach the lens",
    "rate_in_fibre": "reach the fibre",
    "rate_detected": "are detected",
}

#: What each step of the budget is held back by, in words.
HINDRANCES = {
    "excited and decayed": "pulses that excite nothing",
    "photon emitted": "decays that give no light",
    "escaped the resonator": "absorption in the resonator",
    "towards the optic": "light that heads away from the optic",
    "inside the aperture": "light outside the aperture",
    "through the filter": "the filter",
    "through the optics": "the optics behind the lens",
    "in the fibre": "the match to the fibre",
    "detected": "the detector",
}

_MULTIPLES = ((1e9, "billion"), (1e6, "million"), (1e3, "thousand"))


@dataclass(frozen=True)
class Sentence:
    """headline, detail: two lines of text; met: whether every requirement holds (None: none)."""

    headline: str
    detail: str
    met: bool | None


def _count(value: float) -> str:
    for size, word in _MULTIPLES:
        if value >= 0.9995 * size:
            return f"{text(value / size, '1')} {word}"
    return text(value, "1")


def _times(ratio: float) -> str:
    return text(ratio, "1", 2) if ratio < 1e4 else text(ratio, "1", 1)


def verdict(requirement: Requirement, value: float) -> str:
    """How a value stands against its requirement: '2.4 times too few', 'as wanted'."""
    if math.isnan(value):
        return "no number"
    if requirement.met(value):
        return "as wanted"
    if value <= 0 or requirement.limit <= 0:
        return "not as wanted"
    few = requirement.at_least is not None
    ratio = requirement.limit / value if few else value / requirement.limit
    if ratio < 1.005:
        return "just short" if few else "just above"
    countable = requirement.quantity in ARRIVALS
    return f"{_times(ratio)} times too {('few' if countable else 'low') if few else 'high'}"


def _headline(requirement: Requirement | None, outcome: Mapping[str, Any], free: bool) -> str:
    name = requirement.quantity if requirement else "rate_in_fibre"
    value = outcome[name]
    if name in ARRIVALS:
        arrival = "pass the optics" if free and name == "rate_in_fibre" else ARRIVALS[name]
        start = (
            "No number of photons" if math.isnan(value) else f"{_count(value)} photons/s {arrival}"
        )
    else:
        start = (
            f"{REGISTRY.quantities[name].label} is {text(value, REGISTRY.quantities[name].unit)}"
        )
    return f"{start}, {verdict(requirement, value)}." if requirement else f"{start}."


def _clause(requirement: Requirement, value: float) -> str:
    quantity = REGISTRY.quantities[requirement.quantity]
    limit = text(requirement.limit, quantity.unit)
    word = "wanted" if requirement.at_least is not None else "allowed"
    mark = "" if requirement.met(value) else " ✗"
    label = quantity.label[0].lower() + quantity.label[1:]
    return f"{label} {text(value, quantity.unit)} of {limit} {word}{mark}"


def hindrance(rows: Sequence[Step]) -> str:
    """The step that takes most, in words: 'absorption in the resonator (×1.3)'; '' if none does."""
    factors = [(row.factor, row.step) for row in rows if row.factor is not None and row.factor > 0]
    if not factors:
        return ""
    factor, step = min(factors)
    return f"{HINDRANCES[step]} (×{text(1 / factor, '1', 2)})" if factor < 0.995 else ""


def sentence(
    design: Design, outcome: Mapping[str, Any], rows: Sequence[Step], free: bool
) -> Sentence:
    """The two lines for a design; `free`: the photons are wanted in free space, not in a fibre."""
    first, *others = design.requirements or (None,)
    clauses = [_clause(entry, outcome[entry.quantity]) for entry in others if entry]
    worst = hindrance(rows)
    if worst:
        clauses.append(f"most is lost to {worst}")
    met = None
    if design.requirements:
        met = all(bool(entry.met(outcome[entry.quantity])) for entry in design.requirements)
        if met:
            clauses.insert(0, "every requirement is met")
    return Sentence(_headline(first, outcome, free), " · ".join(clauses), met)


def next_step(drawn: Map, place: tuple[float, float], requirements: Sequence[Requirement]) -> str:
    """What the map says to a design that misses: the nearest place that meets everything.

    place: the design's values on the two axes, SI. Nearest in fractions of the axes.
    """
    if drawn.margin is None:
        return ""
    holds = drawn.margin >= 0
    if not holds.any():
        worst = _worst(drawn, place, requirements)
        return f"nowhere on this map is everything met; {worst} is furthest from it"
    ny, nx = holds.shape
    rows, columns = np.nonzero(holds)
    across = (columns + 0.5) / nx - _inside(drawn.x, place[0])
    up = (rows + 0.5) / ny - _inside(drawn.y, place[1])
    nearest = int(np.argmin(across**2 + up**2))
    goals = []
    for axis, index, move, count in (
        (drawn.x, columns[nearest], across[nearest], nx),
        (drawn.y, rows[nearest], up[nearest], ny),
    ):
        if abs(move) > 0.75 / count:
            value = written(axis.name, float(axis.values[index]), 2)
            goals.append(f"{_name(axis.name)} {value}")
    return f"nearest design that meets all: {', '.join(goals)}" if goals else ""


def _inside(axis: Axis, value: float) -> float:
    """Fraction of an axis at a value; beyond its ends (zero on a logarithmic one), the ends."""
    return float(np.clip(axis.fraction(value), 0.0, 1.0))


def _name(name: str) -> str:
    if INPUTS[name].symbol:
        return INPUTS[name].symbol
    label = INPUTS[name].label
    return label[0].lower() + label[1:]


def _worst(drawn: Map, place: tuple[float, float], requirements: Sequence[Requirement]) -> str:
    """The requirement that binds at the design's own cell, in words."""
    if drawn.binding is None:
        return "a requirement"
    ny, nx = drawn.binding.shape
    column = min(int(_inside(drawn.x, place[0]) * nx), nx - 1)
    row = min(int(_inside(drawn.y, place[1]) * ny), ny - 1)
    return REGISTRY.quantities[requirements[int(drawn.binding[row, column])].quantity].label
