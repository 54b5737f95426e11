"""What a small change of each input does to a quantity: derivatives of the logarithms."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..design import Design
from ..domain import InputError, quoted
from ..evaluate import Evaluation
from ..inputs import INPUTS
from ..registry import REGISTRY, dependencies
from ..units import text
from .steps import ARRIVALS, one_design

Array = NDArray[np.float64]

#: Inputs of which "1 % more" is no step that anybody takes: what comes with the emitter or with a
#: medium, and wavelengths, which are moved by linewidths and not by percent of themselves.
NO_LEVERS = frozenset(
    {
        "emission_wavelength",
        "lifetime",
        "biexciton_rate_ratio",
        "biexciton_shift",
        "bulk_rate_ratio",
        "refractive_index",
        "medium_index",
        "resonance_wavelength",
        "filter_centre",
    }
)

#: Logarithms of the steps to either side: each is half of the next.
STEPS = 2.5e-4 * 2.0 ** np.arange(8)

#: Where a quantity turns within these, they are taken that much finer, one after the other.
FINER = (1.0, 2.0**-8, 2.0**-16, 2.0**-24)

#: Estimates from two neighbouring steps agree to this where a derivative is settled; to the second
#: where it is still one.
SETTLED, AGREED = 1e-7, 1e-4

#: A quantity that changes by more than this factor (its logarithm) over a stencil is not told by it.
STRAIGHT = 0.5


@dataclass(frozen=True)
class Elasticity:
    """Change of a quantity in percent for one percent of an input: d ln(quantity)/d ln(input).

    error: how far two estimates differ. side: 'both', or 'below' or 'above' where the input is at an
    end of its range and the derivative is one-sided. lever: whether a small change of the input is a
    step that somebody could take (see NO_LEVERS). words: the change in plain words.
    """

    name: str
    value: float
    error: float
    side: str
    lever: bool
    words: str


def elasticities(
    point: Mapping[str, Any] | Design, quantity: str, names: Iterable[str] | None = None
) -> tuple[Elasticity, ...]:
    """What a small change of each input does to a quantity, the largest effect first.

    point: one design, SI, or a `Design`. Of every positive finite number that the quantity depends
    on, or of `names` (each of which must be one). Those without an effect are left out unless named;
    those for which there is no derivative (the quantity jumps there or has a corner) always are.
    Inputs that follow others by default keep following. Empty where the quantity is not above 0. By
    differences on halving steps of the logarithm, extrapolated once in the middle and twice at an end
    of a range. Raises InputError.
    """
    found = list(elasticity_steps(point, quantity, names))
    return found[-1] if found else ()


def elasticity_steps(
    point: Mapping[str, Any] | Design, quantity: str, names: Iterable[str] | None = None
) -> Iterator[tuple[Elasticity, ...]]:
    """The same as it grows, one input more a step; those that are no levers come last."""
    known = REGISTRY.quantities.get(quantity) if isinstance(quantity, str) else None
    if known is None or known.kind != "number":
        raise InputError(f"{quoted(quantity)} is no quantity that is a number")
    work = one_design(point, "an elasticity")
    named = None if names is None else _named(work, names)
    if not 0 < float(work.result(quantity)) < math.inf:
        return
    needed = dependencies(quantity, work.given)
    every = [name for name in INPUTS if name in needed and _has_logarithm(work, name)]
    rows: list[Elasticity] = []
    for name in sorted(every if named is None else named, key=NO_LEVERS.__contains__):
        slope = _slope(work, name, quantity) if name in needed else (0.0, 0.0, "both")
        if slope is not None and (named or slope[:2] != (0.0, 0.0)):
            words = _change(name, quantity, slope[0], slope[2])
            rows.append(Elasticity(name, *slope, name not in NO_LEVERS, words))
        yield tuple(sorted(rows, key=lambda row: -abs(row.value)))


def _has_logarithm(work: Evaluation, name: str) -> bool:
    return not INPUTS[name].whole and bool(0 < work.value(name) < np.inf)


def _named(work: Evaluation, names: Iterable[str]) -> list[str]:
    """The inputs asked for; InputError for what has no logarithm."""
    if isinstance(names, str) or not isinstance(names, Iterable):
        raise InputError(f"names is a sequence of inputs; got {quoted(names)}")
    found = list(dict.fromkeys(names))
    for name in found:
        if not isinstance(name, str) or name not in INPUTS or INPUTS[name].whole:
            raise InputError(f"{quoted(name)} is no input that is a number")
        if not _has_logarithm(work, name):
            raise InputError(
                f"{name} is not a finite number above 0 here, so it has no logarithm", name
            )
    return found


def _slope(work: Evaluation, name: str, quantity: str) -> tuple[float, float, str] | None:
    """Derivative of the logarithms, its error and its side; None where there is none."""
    for side, room in _rooms(work, name).items():
        found: list[tuple[float, float, str]] = []
        told = False
        for finer in FINER:
            scale = min(finer, room)
            logs = _logarithms(work, name, quantity, side, scale)
            if logs is None:
                continue
            told = True
            if not any(part.any() for part in logs):
                return 0.0, 0.0, side
            value, error = _settled(logs, scale)
            size = max(1.0, abs(value))
            if error <= AGREED * size:
                if _cornered(logs, scale):
                    return None
                found.append((value, error, side))
            if error <= SETTLED * size:
                break
        if told:  # one-sided only where there is nothing on the other side
            return min(found, key=lambda row: row[1], default=None)
    return None


def _rooms(work: Evaluation, name: str) -> dict[str, float]:
    """Sides that the range of an input leaves room on, and how much: in units of the longest step."""
    value = float(work.value(name))
    low, high = (float(end) for end in work.domain(name))
    down = math.log(value / low) if low > 0 else math.inf
    up = math.inf if INPUTS[name].infinite else math.log(high / value)
    below, above = (room * 0.999 / STEPS[-1] for room in (down, up))
    rooms = {"both": min(below, above), "below": below, "above": above}
    return {side: room for side, room in rooms.items() if room >= FINER[1]}


def _logarithms(
    work: Evaluation, name: str, quantity: str, side: str, scale: float
) -> tuple[Array, ...] | None:
    """ln(quantity over its own value) at the steps up, or down, or both; None where it has no number.

    Those on the lower side alone with the sign of the derivative, as if they were above.
    """
    signs = {"both": (1, -1), "below": (-1,), "above": (1,)}[side]
    exponents = np.concatenate([[0.0], *(sign * scale * STEPS for sign in signs)])
    values = work.value(name) * np.exp(exponents)
    try:
        found = np.asarray(work.changed({name: values}).result(quantity), dtype=float)
    except InputError:  # the range of another input follows this one
        return None
    found = np.broadcast_to(found, values.shape)
    if not (np.isfinite(found) & (found > 0)).all():
        return None
    taken = np.log1p((values[1:] - values[0]) / values[0])  # what rounding left of each step
    with np.errstate(over="ignore", divide="ignore"):
        logs = np.log1p((found[1:] - found[0]) / found[0]) * (exponents[1:] / taken)
    return (-logs,) if side == "below" else tuple(np.split(logs, len(signs)))


def _settled(logs: tuple[Array, ...], scale: float) -> tuple[float, float]:
    """Derivative and error from halving steps, where two neighbouring estimates agree best.

    logs: above and below, or on one side. Not-a-number and ∞ where the steps are all too long.
    """
    orders = (2,) if len(logs) == 2 else (1, 2)
    with np.errstate(invalid="ignore"):  # of steps that are far too long
        mean = (logs[0] - logs[1]) / 2 if len(logs) == 2 else logs[0]
        slopes = mean / (scale * STEPS)
        for order in orders:  # Richardson's extrapolation
            slopes = slopes[:-1] + (slopes[:-1] - slopes[1:]) / (2**order - 1)
        differ = np.abs(np.diff(slopes))
    reach = np.maximum.reduce([np.abs(part) for part in logs])[len(orders) + 1 :]
    differ = np.where(reach <= STRAIGHT, differ, np.inf)
    best = int(np.argmin(differ))
    return float(slopes[best]), float(differ[best])


def _cornered(logs: tuple[Array, ...], scale: float) -> bool:
    """Whether the derivatives from above and from below are both settled, and are two."""
    if len(logs) == 1:
        return False
    (up, up_error), (down, down_error) = (_settled((part,), scale) for part in (logs[0], -logs[1]))
    apart, unsure = abs(up - down), up_error + down_error
    size = max(1.0, abs(up), abs(down))
    return unsure <= AGREED * size and apart > max(10 * AGREED * size, 100 * unsure)


def _plain(label: str) -> str:
    """A label within a sentence: 'Linewidth, fast' -> 'fast linewidth'."""
    noun, _, kind = label.partition(", ")
    return f"{kind} {noun[0].lower()}{noun[1:]}".strip()


def _change(name: str, quantity: str, value: float, side: str) -> str:
    """An elasticity in plain words: '1 % more quality factor gives 0.4 % fewer photons'."""
    percent = 1.0
    while abs(value) * percent > 10:  # beyond, a derivative says too little
        percent /= 10
    less = side == "below"
    effect = -value * percent if less else value * percent
    start = f"{text(percent, '1', 1)} % {'less' if less else 'more'} {_plain(INPUTS[name].label)}"
    size = text(abs(effect), "1", 2)
    if quantity in ARRIVALS:
        if abs(effect) < 0.005:
            return f"{start} leaves the photons as many"
        return f"{start} gives {size} % {'more' if effect > 0 else 'fewer'} photons"
    noun = _plain(REGISTRY.quantities[quantity].label)
    if abs(effect) < 0.005:
        return f"{start} leaves {noun} as it is"
    return f"{start} makes {noun} {size} % {'higher' if effect > 0 else 'lower'}"
