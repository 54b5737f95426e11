"""Catalogue records as the page takes them: point entries, origins, cautions."""

from __future__ import annotations

from typing import Any

from ..catalogue import emitters, optics, resonators
from ..design import Design, Origin

KINDS = {"emitter": emitters, "resonator": resonators, "optic": optics}


def point_of(kind: str, key: str) -> tuple[dict[str, Any], dict[str, Origin]]:
    """The entries of a record and where they come from; empty for no record."""
    record = KINDS[kind]().get(key)
    if record is None:
        return {}, {}
    values = record.inputs()
    origins = {}
    for name, (checked, where) in record.origins().items():
        value = record.values.get(name)
        origins[name] = Origin(checked, value.source if value else "", where[:1000])
    return values, {name: origin for name, origin in origins.items() if name in values}


def record_cautions(design: Design) -> list[str]:
    """Cautions that belong to the records a design came from, not to its numbers."""
    found = []
    record = emitters().get(design.emitter)
    if record is not None and record.caution:
        found.append(record.caution)
    shape = resonators().get(design.resonator)
    if shape is not None:
        if shape.caution:
            found.append(shape.caution)
        if shape.gaussian_beam is False and not {"pattern"} & design.point.keys():
            found.append(
                f"{shape.name}: a resonator of this class is not known to radiate a Gaussian beam; "
                "angles and collected share assume one."
            )
    return found
