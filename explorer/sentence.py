"""The meeting's question answered in words: one headline, and a smaller line below it."""

from __future__ import annotations

import math
import re
from collections import Counter
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
from .unknowns import Range, open_names
from .yields import Share, Yield

#: Where a rate arrives, after "… photons/s".
ARRIVALS = {
    "rate_at_lens": "reach the lens",
    "rate_in_fibre": "reach the fibre",
    "rate_detected": "are detected",
}

#: Step of the budget -> what it is held back by, and what is said where nothing comes through.
HINDRANCES = {
    "excited and decayed": ("pulses that excite nothing", "no pulse excites anything"),
    "photon emitted": ("decays that give no light", "no decay gives light"),
    "escaped the resonator": ("absorption in the resonator", "no light leaves the resonator"),
    "towards the optic": ("light that heads away from the optic", "no light heads for the optic"),
    "inside the aperture": ("light outside the aperture", "no light enters the aperture"),
    "through the filter": ("the filter", "no light passes the filter"),
    "through the optics": ("the optics behind the lens", "no light passes the optics"),
    "in the fibre": ("the match to the fibre", "no light enters the fibre"),
    "detected": ("the detector", "the detector counts nothing"),
}

#: The same under continuous pumping, where it differs.
CONTINUOUS = {
    "excited and decayed": ("the time until the next excitation", "the pump excites nothing")
}

_MULTIPLES = ((1e9, "billion"), (1e6, "million"), (1e3, "thousand"))


#: Kind of origin -> the mark that stands for it on the page.
MARKS = {"seen": "●", "from memory": "○", "measured": "◆", "typed": "✎", "default": "·"}


@dataclass(frozen=True)
class Sentence:
    """headline, detail, known: three lines of text.

    met: whether every requirement holds (None: there is none), and as many devices pass as are wanted,
    once that is known.
    """

    headline: str
    detail: str
    met: bool | None
    known: str = ""


@dataclass(frozen=True)
class Devices:
    """How many devices pass, for the headline, and what is said of it in the line below.

    short: whether they are fewer than wanted.
    """

    passing: str = ""
    missed: str = ""
    short: bool = False


#: Names that are no plain words, and the labels of what they name.
_LABELS = {
    name: entry.label
    for known in (INPUTS, REGISTRY.quantities)
    for name, entry in known.items()
    if "_" in name
}
_NAMES = re.compile(rf"\b({'|'.join(sorted(_LABELS, key=len, reverse=True))})\b")

#: Nothing is said of devices.
NOT_ASKED = Devices()


def _count(value: float, around: Range | None = None) -> str:
    size, word = next((pair for pair in _MULTIPLES if value >= 0.9995 * pair[0]), (1.0, ""))
    scaled = around and Range(around.low / size, around.high / size)
    return f"{text(value / size, '1')}{_bracket(scaled, '1')} {word}".rstrip()


def _bracket(around: Range | None, unit: str) -> str:
    """The range that what is not known leaves, in brackets; nothing where there is none."""
    if around is None:
        return ""
    low, high = text(around.low, unit, 2), text(around.high, unit, 2)
    return "" if low == high else f" ({low}–{high})"


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


def quantity_label(name: str, free: bool) -> str:
    """A quantity's label; `free`: the photons are wanted in free space, where no fibre is."""
    if free and name == "rate_in_fibre":
        return "Photons/s behind the optics"
    return REGISTRY.shown(name).label


def _headline(
    requirement: Requirement | None,
    outcome: Mapping[str, Any],
    free: bool,
    ranges: Mapping[str, Range],
) -> str:
    name = requirement.quantity if requirement else "rate_in_fibre"
    value, around = outcome[name], ranges.get(name)
    if name in ARRIVALS:
        arrival = "pass the optics" if free and name == "rate_in_fibre" else ARRIVALS[name]
        start = (
            "No number of photons"
            if math.isnan(value)
            else f"{_count(value, around)} photons/s {arrival}"
        )
    else:
        quantity = REGISTRY.quantities[name]
        shown = f"{text(value, quantity.unit)}{_bracket(around, quantity.unit)}"
        start = f"{quantity.label} is {shown}"
    return f"{start}, {verdict(requirement, value)}." if requirement else f"{start}."


def _clause(requirement: Requirement, value: float, free: bool, around: Range | None = None) -> str:
    quantity = REGISTRY.quantities[requirement.quantity]
    limit = text(requirement.limit, quantity.unit)
    word = "wanted" if requirement.at_least is not None else "allowed"
    mark = "" if requirement.met(value) else " ✗"
    label = quantity_label(requirement.quantity, free)
    label = label[0].lower() + label[1:]
    shown = f"{text(value, quantity.unit)}{_bracket(around, quantity.unit)}"
    return f"{label} {shown} of {limit} {word}{mark}"


def provenance(design: Design, open_: int = 0) -> str:
    """Where the values come from, counted, and what the brackets mean; `open_`: unknowns drawn."""
    kinds = Counter(design.origin(name).kind for name in INPUTS)
    words = {"default": "at defaults"}
    counts = [
        f"{mark} {kinds[kind]} {words.get(kind, kind)}"
        for kind, mark in MARKS.items()
        if kinds[kind]
    ]
    said = f"values: {', '.join(counts)}"
    if open_:
        said += f" · in brackets: what {open_} unknown{'s' if open_ > 1 else ''} leave{'' if open_ > 1 else 's'} open"
    return said


def hindrance(rows: Sequence[Step], continuous: bool = False) -> str:
    """The step that takes most, in words: 'most is lost to the filter (×1.3)'; '' if none does.

    Where nothing comes through a step, the first such. continuous: how the emitter is pumped.
    """
    words = HINDRANCES | (CONTINUOUS if continuous else {})
    for row in rows:
        if row.factor == 0:
            return words[row.step][1]
    factors = [(row.factor, row.step) for row in rows if row.factor is not None and row.factor > 0]
    factor, step = min(factors, default=(1.0, ""))
    return (
        f"most is lost to {words[step][0]} (×{text(1 / factor, '1', 2)})" if factor < 0.995 else ""
    )


def sentence(
    design: Design,
    outcome: Mapping[str, Any],
    rows: Sequence[Step],
    free: bool,
    ranges: Mapping[str, Range] | None = None,
    devices: Devices = NOT_ASKED,
) -> Sentence:
    """The three lines for a design.

    free: the photons are wanted in free space, not in a fibre. ranges: of the quantities, from what
    is not known, where they are worked out. devices: how many of them pass, in words, once that is known.
    """
    around = ranges or {}
    first, *others = design.requirements or (None,)
    clauses = [
        _clause(entry, outcome[entry.quantity], free, around.get(entry.quantity))
        for entry in others
        if entry
    ]
    if devices.missed and not devices.short:
        clauses.append(devices.missed)
    worst = hindrance(rows, design.evaluation.value("pumping") == "continuous")
    if worst:
        clauses.append(worst)
    met = met_by(design, outcome)
    if met:
        who = "the design itself meets every requirement"
        clauses.insert(0, who if devices.short else "every requirement is met")
        met = not devices.short
    if devices.short:  # next to how many pass, at the end of the headline
        clauses.insert(0, devices.missed)
    known = provenance(design, len(open_names(design)) if around else 0)
    headline = _headline(first, outcome, free, around)
    if devices.passing:
        headline = f"{headline.removesuffix('.')}; {devices.passing}."
    return Sentence(headline, " · ".join(clauses), met, known)


def in_labels(message: str) -> str:
    """A message with the labels of inputs and quantities in place of their names."""
    return _NAMES.sub(lambda found: _LABELS[found[0]], message)


def met_by(design: Design, outcome: Mapping[str, Any]) -> bool | None:
    """Whether an outcome meets every requirement of a design; None where nothing is required."""
    met = [bool(entry.met(outcome[entry.quantity])) for entry in design.requirements]
    return all(met) if met else None


def passing_words(
    design: Design, passing: Yield | None, around: Range | None = None, fault: str = ""
) -> Devices:
    """How many fabricated devices pass: '61 (40–75) of 100 devices pass', and what is said beside."""
    if passing is None:
        return Devices("", f"devices that pass: {in_labels(fault)}" if fault else "")
    shown = hundred(passing)
    if around is not None:
        ends = [f"{100 * end:.0f}" for end in (around.low, around.high)]
        shown += "" if ends[0] == ends[1] else f" ({'–'.join(ends)})"
    wanted = design.passing
    short = wanted is not None and passing.share < wanted
    missed = f"{100 * (wanted or 0):.5g} of 100 wanted ✗" if short else ""
    return Devices(f"{shown} of 100 devices pass", missed, short)


def hundred(passing: Yield | Share) -> str:
    """A share as so many of a hundred; what the draws cannot tell from none or all is said so."""
    share = float(passing.share)
    if passing.low == passing.high and share in (0.0, 1.0):  # nothing scatters that matters
        return "100" if share else "0"
    if share >= 0.995:
        return "over 99"
    if share <= 0.005:
        return "under 1"
    return f"{100 * share:.0f}"


def next_step(
    drawn: Map,
    place: tuple[float, float],
    requirements: Sequence[Requirement],
    free: bool = False,
) -> str:
    """What the map says to a design that misses: the nearest place that meets everything.

    place: the design's values on the two axes, SI. Nearest in fractions of the axes. free: the
    photons are wanted in free space.
    """
    if drawn.margin is None:
        return ""
    holds = drawn.margin >= 0
    if not holds.any():
        worst = _worst(drawn, place, requirements, free)
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
            value = written(axis.name, float(f"{axis.values[index]:.2g}"), 6)  # 120, not 1.2e+02
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


def _worst(
    drawn: Map, place: tuple[float, float], requirements: Sequence[Requirement], free: bool
) -> str:
    """The requirement that binds at the design's own cell, in words."""
    if drawn.binding is None:
        return "a requirement"
    ny, nx = drawn.binding.shape
    column = min(int(_inside(drawn.x, place[0]) * nx), nx - 1)
    row = min(int(_inside(drawn.y, place[1]) * ny), ny - 1)
    return quantity_label(requirements[int(drawn.binding[row, column])].quantity, free)
