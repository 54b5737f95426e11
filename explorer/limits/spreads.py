"""What the scatter of each input costs: the same devices with one input held still, or alone."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ..design import Design, Requirement
from ..domain import InputError, quoted
from ..evaluate import Evaluation
from ..inputs import INPUTS
from ..registry import REGISTRY
from ..sampling import displaced, draws

#: Devices drawn for the cost of a spread.
DEVICES = 1024

#: Share of the devices that reach what `Devices.reached` says.
MOST_DEVICES = 0.9


@dataclass(frozen=True)
class Devices:
    """A figure over many devices.

    value: the share of them that pass, or the mean of a quantity [SI] over those that have a number.
    reached: what nine of ten reach: of a quantity that is required at most a value, what nine of ten
    stay below (not-a-number for a share). missing: share of devices without a number.
    """

    value: float
    reached: float = math.nan
    missing: float = 0.0


@dataclass(frozen=True)
class SpreadCost:
    """What the scatter of one input costs.

    cost: what `value` would gain if this input alone stopped scattering, in the wanted direction (of
    a quantity [SI]; of the share of devices 0.01 is a percentage point). without: the devices then.
    only: the devices if this input alone scattered.
    """

    name: str
    cost: float
    without: Devices
    only: Devices


@dataclass(frozen=True)
class SpreadCosts:
    """The inputs that scatter, the most costly first; now: as they are, still: without any scatter.

    quantity: what is looked at, '' for the share of devices that pass.
    """

    quantity: str
    now: Devices
    still: Devices
    rows: tuple[SpreadCost, ...]


def cost_of_spread(
    design: Design, quantity: str = "", count: int = DEVICES, seed: int = 0
) -> SpreadCosts:
    """What each scattering input of a design costs.

    quantity: '' for the share of devices that meet every requirement, or a quantity, whose mean and
    whose value for nine of ten devices are told; where the design requires it at most, less is
    better. count, seed: see `sampling.scattered`. The same draws in every comparison, so an input
    that does not matter costs exactly 0; a correlation goes with the input that stops. A dipole of
    random direction stops at the alignment of the design. Raises InputError.
    """
    *_, last = cost_steps(design, quantity, count, seed)
    return last


def cost_steps(
    design: Design, quantity: str = "", count: int = DEVICES, seed: int = 0
) -> Iterator[SpreadCosts]:
    """The same as it grows: first without rows, then with one input more a step."""
    asked = _asked(design, quantity)
    drawn = draws(design.scatter, count, seed, design.correlation)
    point = displaced(drawn, design.point)
    nominal, work = design.evaluation, Evaluation(point)
    now = _devices(work, asked, quantity, drawn.count)
    found = SpreadCosts(quantity, now, _devices(nominal, asked, quantity, 1), ())
    yield found
    sense = -1.0 if quantity and asked and asked[0].at_most is not None else 1.0
    for name in drawn.names:
        others = [other for other in drawn.names if other != name]
        parts = (work, point, [name]), (nominal, design.point, others)
        without, only = (
            _devices(
                _changed(one, old, displaced(drawn, design.point, still=still)),
                asked,
                quantity,
                drawn.count,
            )
            for one, old, still in parts
        )
        cost = sense * (without.value - now.value)
        rows = [*found.rows, SpreadCost(name, cost, without, only)]
        found = replace(found, rows=tuple(sorted(rows, key=_costliest)))
        yield found


def _costliest(row: SpreadCost) -> float:
    return math.inf if math.isnan(row.cost) else -row.cost


def _asked(design: Any, quantity: Any) -> tuple[Requirement, ...]:
    """The requirements that count: of a quantity its own, if any."""
    if not isinstance(design, Design):
        raise InputError(f"the cost of a spread is of a Design; got {quoted(design)}")
    if quantity == "":
        if not design.requirements:
            raise InputError("the design requires nothing, so every device passes: name a quantity")
        return design.requirements
    known = REGISTRY.quantities.get(quantity) if isinstance(quantity, str) else None
    if known is None or known.kind != "number":
        raise InputError(f"{quoted(quantity)} is no quantity that is a number")
    return tuple(entry for entry in design.requirements if entry.quantity == quantity)


def _changed(work: Evaluation, old: Mapping[str, Any], new: Mapping[str, Any]) -> Evaluation:
    """The evaluation of a new point from that of an old one; what is the same is kept."""
    entries = {
        name: value
        for name, value in new.items()
        if name not in old
        or not (value is old[name] or INPUTS[name].whole or np.array_equal(value, old[name]))
    }
    return work.changed(entries, without=old.keys() - new.keys())


def _devices(work: Evaluation, asked: Sequence[Requirement], quantity: str, count: int) -> Devices:
    """The share that passes, or the mean of a quantity and what most devices reach."""
    wanted = [quantity] if quantity else [entry.quantity for entry in asked]
    values = [
        np.broadcast_to(np.asarray(work.result(name), dtype=float), (count,)) for name in wanted
    ]
    empty = np.logical_or.reduce([np.isnan(value) for value in values])
    missing = float(empty.mean())
    if not quantity:
        met = [entry.met(value) for entry, value in zip(asked, values, strict=True)]
        return Devices(float(np.logical_and.reduce(met).mean()), math.nan, missing)
    known = values[0][~empty]
    if known.size == 0:
        return Devices(math.nan, math.nan, missing)
    below = bool(asked) and asked[0].at_most is not None
    level = MOST_DEVICES if below else 1 - MOST_DEVICES
    mean = known[0] if (known == known[0]).all() else known.mean()  # exact where all are alike
    return Devices(float(mean), float(np.quantile(known, level)), missing)
