"""Candidates as rows of a table: what is read out, in words and units."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence

import numpy as np

from ..candidates import SHOWN, Batch, worst
from ..design import Design, Requirement
from ..registry import REGISTRY
from ..units import text
from .table import Cell, Column, Row

#: Most rows that are shown at once; the best ones.
MOST = 2000

#: Headings of quantities where their label is long.
SHORT = {
    "rate_in_fibre": "Photons/s in fibre",
    "half_angle": "Half-angle",
    "device_lifetime": "Lifetime",
    "spectral_overlap": "Overlap",
}


def quantities(design: Design) -> list[str]:
    """The quantities that the table shows: those wanted, then the usual ones."""
    return list(dict.fromkeys([*(entry.quantity for entry in design.requirements), *SHOWN]))


def columns(design: Design, with_optic: bool) -> list[Column]:
    """The headings."""
    found = [
        Column("met", "meets all", "pass", "Whether every requirement holds"),
        Column(
            "margin",
            "worst",
            "number",
            "How far the requirement that is met worst is away",
            None,
            True,
        ),
        Column("emitter", "Emitter", "text", "Published emitter", 230),
        Column("temperature", "at", "text", "Temperature of the emitter"),
        Column("resonator", "Resonator", "text", "Published resonator with Q and V", 240),
    ]
    if with_optic:
        found.append(Column("optic", "Optic", "text", "Collecting optic", 180))
    for name in quantities(design):
        quantity = REGISTRY.quantities[name]
        label = SHORT.get(name, quantity.label)
        found.append(Column(name, label, "number", quantity.label, None, quantity.log))
    found += [
        Column(
            "memory",
            "from memory",
            "number",
            "Values written down from memory, not seen in their source",
        ),
        Column(
            "assumed",
            "assumed",
            "number",
            "Values that decide and are not published: at their defaults",
        ),
        Column("cautions", "cautions", "number", "Cautions that hold for this candidate"),
    ]
    return found


def key_of(emitter: str, resonator: str, optic: str) -> str:
    """The key of a row: the three records."""
    return json.dumps([emitter, resonator, optic])


def keys_of(row: str) -> tuple[str, str, str]:
    """The three records of a row's key."""
    emitter, resonator, optic = json.loads(row)
    return emitter, resonator, optic


def distance(margin: float, requirement: Requirement | None) -> str:
    """A margin in words: '1.8× short', '2.1× spare'."""
    if requirement is None:
        return ""
    if math.isnan(margin):
        return "no number"
    if requirement.limit <= 0:
        return "met" if margin >= 0 else "missed"
    ratio = math.exp(min(abs(margin), 700.0))
    if ratio < 1.005:
        return "just met" if margin >= 0 else "just missed"
    if ratio < 1.1:
        return f"{100 * (ratio - 1):.0f} % {'spare' if margin >= 0 else 'short'}"
    number = text(ratio, "1", 2) if ratio < 1e4 else f"{ratio:.0e}"
    return f"{number}× {'spare' if margin >= 0 else 'short'}"


def rows(made: Batch, design: Design, with_optic: bool) -> tuple[list[Row], int]:
    """The best rows, best first, and how many candidates there are."""
    margin, which = worst(made)
    flat = margin.ravel()
    order = np.argsort(-np.nan_to_num(flat, nan=-np.inf), kind="stable")[:MOST]
    places = np.array(np.unravel_index(order, made.marks.shape)).T.tolist()
    return [_row(made, design, place, margin, which, with_optic) for place in places], flat.size


def _row(
    made: Batch,
    design: Design,
    place: Sequence[int],
    margin: np.ndarray,
    which: np.ndarray,
    with_optic: bool,
) -> Row:
    at = tuple(place)
    light, mode, optic = (made.parts[axis][index] for axis, index in enumerate(place))
    far, index = float(margin[at]), int(which[at])
    binding = design.requirements[index] if index >= 0 else None
    met = far >= 0
    held = REGISTRY.quantities[binding.quantity].label if binding else ""
    cells = [
        Cell("meets all" if met else "misses", met),
        Cell(distance(far, binding), far, held and f"{held}: furthest from what is wanted"),
        Cell(light.name, light.name),
        Cell(light.temperature.replace("room temperature", "room"), light.temperature),
        Cell(mode.name, mode.name),
    ]
    if with_optic:
        cells.append(Cell(optic.name, optic.name))
    for name in quantities(design):
        value = float(made.found[name][at])
        shown = "–" if math.isnan(value) else text(value, REGISTRY.quantities[name].unit)
        cells.append(Cell(shown, value))
    parts = (light, mode, optic)
    bits = int(made.marks[at])
    names = [
        caution.label for bit, caution in enumerate(REGISTRY.cautions.values()) if bits >> bit & 1
    ]
    names += [note.replace("_", " ") for part in parts for note in part.cautions]
    cells += [
        Cell(str(sum(part.memory for part in parts)), sum(part.memory for part in parts)),
        Cell(str(sum(part.assumed for part in parts)), sum(part.assumed for part in parts)),
        Cell(str(len(names)), len(names), "; ".join(names)),
    ]
    return Row(key_of(light.key, mode.key, optic.key), tuple(cells), "met" if met else "")
