"""What limits a design, gathered for one quantity, in pieces beside its answer."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

from .design import Design
from .domain import InputError
from .limits import (
    Elasticity,
    Headroom,
    SpreadCosts,
    cost_steps,
    elasticity_steps,
    headroom,
    what_first,
)
from .limits.steps import ARRIVALS
from .registry import REGISTRY


@dataclass(frozen=True)
class Limits:
    """What to improve first, for one quantity.

    steps: of the budget, for a photon rate, and first: the one to improve first, in words. levers:
    inputs by what a small change of each gives. costs: of the scatter, in devices that pass. fault,
    scatter_fault: why levers or costs are missing. whole: nothing is still to come.
    """

    quantity: str
    steps: tuple[Headroom, ...] = ()
    first: str = ""
    levers: tuple[Elasticity, ...] = ()
    costs: SpreadCosts | None = None
    fault: str = ""
    scatter_fault: str = ""
    whole: bool = False


def limits_of_design(design: Design, quantity: str) -> Iterator[Limits]:
    """The same as it grows, in pieces of some ten milliseconds."""
    found = Limits(quantity)
    if quantity in ARRIVALS:
        rows = headroom(design, quantity)
        found = replace(found, steps=rows, first=what_first(rows).sentence)
        yield found
    try:
        if REGISTRY.quantities[quantity].kind == "number":
            for levers in elasticity_steps(design, quantity):
                found = replace(found, levers=levers)
                yield found
    except InputError as error:  # no slope here
        found = replace(found, fault=str(error))
    try:
        if design.scatter and design.requirements:
            for costs in cost_steps(design):
                found = replace(found, costs=costs)
                yield found
    except InputError as error:  # what scatters cannot
        found = replace(found, scatter_fault=str(error))
    yield replace(found, whole=True)
