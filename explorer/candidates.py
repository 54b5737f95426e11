"""Candidates: every emitter × resonator × optic of the catalogue as a point, in one batch.

A candidate is the design with three records in it (see `combine`): its excitation, filter and
requirements stay. Records that share their whole values are evaluated together, emitters along the
first axis, resonators along the second, optics along the third.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from .advice import record_cautions
from .combine import PARTS, origins_of, records_of
from .design import Design
from .evaluate import Evaluation
from .inputs import INPUTS
from .maps import margins
from .published import DECIDING
from .registry import REGISTRY

if TYPE_CHECKING:
    import pandas as pd

#: Kinds of record in the order of the axes.
KINDS: Final = ("emitter", "resonator", "optic")

#: Quantities of every candidate besides the required ones.
SHOWN: Final = ("rate_in_fibre", "g2_zero", "half_angle", "device_lifetime", "spectral_overlap")

#: Inputs without which a record says little: absent, they are at their defaults and counted.
NEEDED: Final[Mapping[str, tuple[str, ...]]] = {
    "emitter": (*DECIDING["emitters"], "dipole_alignment"),
    "resonator": (*DECIDING["resonators"], "radiative_share", "upward_share", "other_modes"),
    "optic": ("numerical_aperture", "optics_transmission"),
}


@dataclass(frozen=True)
class Part:
    """One record as a candidate takes it; key '' is the design's own part."""

    kind: str
    key: str
    name: str
    inputs: Mapping[str, Any]
    memory: int
    assumed: int
    cautions: tuple[str, ...]

    def same(self) -> tuple[Any, ...]:
        """What parts must share to be evaluated together.

        Whole values, and which inputs are given whose default follows other inputs; beyond NA 1 the
        side from which the bare reference is watched differs too.
        """
        shared: list[Any] = [
            (name, self.inputs.get(name) if INPUTS[name].whole else name in self.inputs)
            for name in PARTS[self.kind]
            if INPUTS[name].whole or callable(INPUTS[name].default)
        ]
        return (*shared, float(self.inputs.get("numerical_aperture", 0.0)) > 1)


def parts(
    design: Design, kind: str, keys: Iterable[str] | None = None, *, scaled: bool = False
) -> list[Part]:
    """The records of a kind that can be candidates, or those with the given keys, as parts.

    Resonators need Q and V. The design's own part (key '') comes first where it is no record's.
    Raises KeyError for an unknown key.
    """
    records = records_of(kind)
    if keys is None:
        found = [key for key, record in records.items() if record.placed]
        own = getattr(design, kind) == "" and any(name in design.point for name in PARTS[kind])
        keys = ["", *found] if own else found
    return [_part(design, kind, key, scaled) for key in keys]


def _part(design: Design, kind: str, key: str, scaled: bool) -> Part:
    if key:
        record = records_of(kind)[key]
        values = record.inputs(own_wavelength=not scaled)
        name, origins = record.name, origins_of(record)
        words = record_cautions(Design(**{kind: key}))  # type: ignore[arg-type]  # kind names a text
    else:
        values = {name: value for name, value in design.point.items() if name in PARTS[kind]}
        name, origins = f"own {kind}", {entry: design.origin(entry) for entry in values}
        words = ()
    memory = sum(origins[entry].kind == "from memory" for entry in values if entry in origins)
    given = {*values, *(("fast_linewidth",) if {"spectrum", "broadening"} & values.keys() else ())}
    assumed = sum(entry not in given for entry in NEEDED[kind])
    return Part(kind, key, name, values, memory, assumed, tuple(caution for caution, _ in words))


def _grouped(found: Sequence[Part]) -> list[list[Part]]:
    groups: dict[tuple[Any, ...], list[Part]] = {}
    for entry in found:
        groups.setdefault(entry.same(), []).append(entry)
    return list(groups.values())


def _entries(group: Sequence[Part], axis: int) -> dict[str, Any]:
    """Point entries of the parts of one group, numbers as arrays along their axis."""
    shape = tuple(len(group) if place == axis else 1 for place in range(len(KINDS)))
    found: dict[str, Any] = {}
    for name in PARTS[group[0].kind]:
        if not any(name in entry.inputs for entry in group):
            continue
        if INPUTS[name].whole:
            found[name] = group[0].inputs[name]
        else:
            default = INPUTS[name].default
            column = [entry.inputs.get(name, default) for entry in group]
            found[name] = np.array(column, dtype=float).reshape(shape)
    return found


@dataclass(frozen=True)
class Batch:
    """Candidates of one evaluation: their parts along three axes, quantities and margins."""

    parts: tuple[list[Part], list[Part], list[Part]]
    found: Mapping[str, np.ndarray[Any, Any]]
    margins: list[np.ndarray[Any, Any]]
    cautions: Mapping[str, np.ndarray[Any, Any]]

    @property
    def shape(self) -> tuple[int, ...]:
        return tuple(len(group) for group in self.parts)


def batches(
    design: Design,
    *,
    emitters: Iterable[str] | None = None,
    resonators: Iterable[str] | None = None,
    optics: Iterable[str] | None = None,
    scaled: bool = False,
) -> Iterator[Batch]:
    """The candidates of a design, evaluated batch by batch (see `candidates`)."""
    chosen = (emitters, resonators, optics)
    groups = [
        _grouped(parts(design, kind, keys, scaled=scaled))
        for kind, keys in zip(KINDS, chosen, strict=True)
    ]
    taken = {name for names in PARTS.values() for name in names}
    rest = {name: value for name, value in design.point.items() if name not in taken}
    needed = [*SHOWN, *(entry.quantity for entry in design.requirements)]
    work: Evaluation | None = None
    for light in groups[0]:
        for mode in groups[1]:
            for optic in groups[2]:
                if work is None or optic is groups[2][0]:
                    entries = _entries(light, 0) | _entries(mode, 1) | _entries(optic, 2)
                    work = Evaluation(rest | entries)
                else:  # what the optic does not touch is not worked out again
                    work = work.changed(_entries(optic, 2), without=PARTS["optic"])
                values = {name: work.result(name) for name in dict.fromkeys(needed)}
                yield Batch(
                    (light, mode, optic),
                    values,
                    margins(values, design.requirements),
                    {name: work.value(name) for name in REGISTRY.cautions},
                )


def candidates(
    design: Design,
    *,
    emitters: Iterable[str] | None = None,
    resonators: Iterable[str] | None = None,
    optics: Iterable[str] | None = None,
    scaled: bool = False,
) -> pd.DataFrame:
    """Every emitter × resonator with Q and V × optic against a design's requirements.

    emitters, resonators, optics: keys of records, all by default; '' is the design's own part. scaled:
    resonators follow the emitter's wavelength, with the same Q and the same V in (λ/n)³, which
    nobody published; else each stays at its own.

    Returns a table, best first, one row a candidate: `emitter`, `resonator`, `optic` (keys) and
    their names; the wanted quantities, SI; `meets_<quantity>_<side>` for each requirement; `meets_all`;
    `margin` of the requirement that is met worst (above 0 met; natural logarithm of the ratio) and
    which it is, `held_back_by`; `from_memory` and `assumed`, counts of inputs written down from
    memory and at their defaults; `cautions`, their names; `scaled`. Raises InputError, KeyError.
    """
    import pandas as pd

    found = [
        _columns(batch, design)
        for batch in batches(
            design, emitters=emitters, resonators=resonators, optics=optics, scaled=scaled
        )
    ]
    if not found:
        return pd.DataFrame()
    joined = {name: np.concatenate([columns[name] for columns in found]) for name in found[0]}
    best = np.lexsort((-np.nan_to_num(joined["margin"], nan=-np.inf), ~joined["meets_all"]))
    table = pd.DataFrame({name: column[best] for name, column in joined.items()})
    table["scaled"] = scaled
    return table


def side_name(requirement: Any) -> str:
    """'rate_in_fibre_at_least': the quantity and side of a requirement, for a column."""
    return f"{requirement.quantity}_{'at_most' if requirement.at_least is None else 'at_least'}"


def _columns(batch: Batch, design: Design) -> dict[str, Any]:
    """The columns of the table for the candidates of one batch."""
    shape = batch.shape
    places = np.indices(shape).reshape(len(KINDS), -1)
    columns: dict[str, Any] = {}
    for axis, kind in enumerate(KINDS):
        group = batch.parts[axis]
        columns[kind] = np.array([entry.key for entry in group], dtype=object)[places[axis]]
        columns[f"{kind}_name"] = np.array([entry.name for entry in group], dtype=object)[
            places[axis]
        ]
    for name, value in batch.found.items():
        columns[name] = np.broadcast_to(value, shape).ravel()
    margin = np.full(shape, np.inf)
    worst = np.full(shape, -1)
    for index, (entry, found) in enumerate(zip(design.requirements, batch.margins, strict=True)):
        here = np.broadcast_to(found, shape)
        columns[f"meets_{side_name(entry)}"] = (here >= 0).ravel()
        worse = ~(here >= margin)
        worst, margin = np.where(worse, index, worst), np.where(worse, here, margin)
    columns["meets_all"] = (margin >= 0).ravel()
    columns["margin"] = np.where(np.isinf(margin), 0.0, margin).ravel()
    names = np.array([*(entry.quantity for entry in design.requirements), ""], dtype=object)
    columns["held_back_by"] = names[worst.ravel()]
    for name in ("from_memory", "assumed"):
        counts = [
            np.array(
                [getattr(entry, "memory" if name == "from_memory" else name) for entry in group]
            )
            for group in batch.parts
        ]
        columns[name] = sum(count[places[axis]] for axis, count in enumerate(counts))
    columns["cautions"] = _cautions(batch, places)
    return columns


def _cautions(batch: Batch, places: np.ndarray[Any, Any]) -> np.ndarray[Any, Any]:
    """Names of the cautions of each candidate: the model's, then those of its records."""
    shape = batch.shape
    rows: list[list[str]] = [[] for _ in range(places.shape[1])]
    for name, mask in batch.cautions.items():
        if np.any(mask):
            for index in np.flatnonzero(np.broadcast_to(mask, shape).ravel()):
                rows[index].append(name)
    for axis, group in enumerate(batch.parts):
        for index, place in enumerate(places[axis]):
            rows[index].extend(group[place].cautions)
    found = np.empty(len(rows), dtype=object)
    found[:] = [tuple(row) for row in rows]
    return found
