"""Catalogue records behind a design of the page: what they give, and what was changed since."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from functools import cache
from typing import Any

from ..catalogue import resonators
from ..combine import PARTS, origins_of, records_of, unknowns_of, with_place
from ..design import Design, Origin, Unknown

#: What makes a published resonator the one on the map.
PLACE = ("quality_factor", "mode_volume")

#: Kind of record of each input.
KINDS = {name: kind for kind, names in PARTS.items() for name in names}

Given = tuple[Mapping[str, Any], Mapping[str, Origin], Mapping[str, Unknown]]


@cache
def _given(kind: str, key: str) -> Given:
    """Values, origins and ranges of a record; empty for no record."""
    record = records_of(kind).get(key)
    if record is None:
        return {}, {}, {}
    values = record.inputs()
    return values, origins_of(record), unknowns_of(record, values)


def _behind(design: Design, name: str) -> Given:
    """The same of the record that an input of a design may come from, if it gives that input."""
    kind = KINDS.get(name, "")
    given = _given(kind, getattr(design, kind)) if kind else ({}, {}, {})
    return given if name in given[0] else ({}, {}, {})


def can_go_back(design: Design, name: str) -> bool:
    """Whether an input is anything but published, or at its default where nothing is published."""
    values, origins, _ = _behind(design, name)
    if name not in design.point:
        return name in values
    if name not in values:
        return True
    return bool(design.point[name] != values[name] or design.origins.get(name) != origins[name])


def as_published(design: Design, names: tuple[str, ...]) -> Design:
    """A design with inputs as its records give them; those that none gives at their defaults."""
    bare = design.without_values(*names)
    point, origins, unknowns = dict(bare.point), dict(bare.origins), dict(bare.unknowns)
    for name in names:
        given, places, ranges = _behind(design, name)
        for own, published in ((point, given), (origins, places), (unknowns, ranges)):
            if name in published:
                own[name] = published[name]
    return replace(bare, point=point, origins=origins, unknowns=unknowns)


def edited(design: Design) -> bool:
    """Whether a value of the emitter's record was replaced since it was taken."""
    values, _, _ = _given("emitter", design.emitter)
    if not values:
        return False
    point = design.point
    # A width or a spectrum stands before what the record says of the line.
    names = (*values, "fast_linewidth", "spectrum")
    return any(point.get(name) != values.get(name) for name in names)


def placed(design: Design, key: str, names: tuple[str, ...]) -> Design:
    """A design at the place of a published resonator, named while Q and V are its own."""
    found = with_place(design, key, names)
    return replace(found, resonator=key) if set(PLACE) <= set(names) else found


def still_placed(design: Design) -> Design:
    """The same design; it no longer names a resonator whose Q or V it has left."""
    record = resonators().get(design.resonator)
    if record is None or all(
        design.point.get(name) == record.values[name].value_si
        for name in PLACE
        if name in record.values
    ):
        return design
    return replace(design, resonator="")
