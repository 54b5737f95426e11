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
from numpy.typing import NDArray

from .advice import record_cautions
from .combine import PARTS, origins_of, records_of
from .design import Design, Requirement
from .evaluate import Evaluation
from .inputs import INPUTS
from .maps import margins
from .published import DECIDING
from .registry import REGISTRY

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]

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
    temperature: str
    inputs: Mapping[str, Any]
    memory: int
    assumed: int
    cautions: tuple[str, ...]

    def same(self) -> tuple[Any, ...]:
        """What parts must share to be evaluated together.

        Whole values, and which inputs are given whose default follows other inputs.
        """
        return tuple(
            (name, self.inputs.get(name) if INPUTS[name].whole else name in self.inputs)
            for name in PARTS[self.kind]
            if INPUTS[name].whole or callable(INPUTS[name].default)
        )


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
        name, warmth, origins = record.name, record.temperature, origins_of(record)
        words = record_cautions(Design(**{kind: key}))  # type: ignore[arg-type]  # kind names a text
    else:
        values = {name: value for name, value in design.point.items() if name in PARTS[kind]}
        warmth = f"{design.evaluation.value('temperature'):g} K"
        name, origins = f"own {kind}", {entry: design.origin(entry) for entry in values}
        words = ()
    memory = sum(origins[entry].kind == "from memory" for entry in values if entry in origins)
    given = {*values, *(("fast_linewidth",) if {"spectrum", "broadening"} & values.keys() else ())}
    assumed = sum(entry not in given for entry in NEEDED[kind])
    return Part(
        kind, key, name, warmth, values, memory, assumed, tuple(caution for caution, _ in words)
    )


def _grouped(found: Sequence[Part]) -> list[list[int]]:
    """Indices of the parts that can be evaluated together."""
    groups: dict[tuple[Any, ...], list[int]] = {}
    for index, entry in enumerate(found):
        groups.setdefault(entry.same(), []).append(index)
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
    """All candidates: their parts along three axes, and numbers in the shape of the three.

    found: quantities, SI; margins: of each requirement (see `maps.margins`); marks: bit k of each
    candidate is caution k of the registry.
    """

    parts: tuple[list[Part], list[Part], list[Part]]
    found: Mapping[str, Array]
    margins: tuple[Array, ...]
    marks: NDArray[np.int64]


def batch(design: Design, **chosen: Any) -> Batch:
    """The candidates of a design as arrays; `chosen` as in `candidates`. Raises InputError, KeyError."""
    *_, made = batch_steps(design, **chosen)
    assert made is not None  # the steps end with the candidates
    return made


def batch_steps(
    design: Design,
    *,
    emitters: Iterable[str] | None = None,
    resonators: Iterable[str] | None = None,
    optics: Iterable[str] | None = None,
    scaled: bool = False,
) -> Iterator[Batch | None]:
    """The same in pieces of a few milliseconds: None after each, the candidates at the end."""
    chosen = (emitters, resonators, optics)
    every = [
        parts(design, kind, keys, scaled=scaled) for kind, keys in zip(KINDS, chosen, strict=True)
    ]
    shape = tuple(len(entries) for entries in every)
    needed = dict.fromkeys([*SHOWN, *(entry.quantity for entry in design.requirements)])
    found = {name: np.full(shape, np.nan) for name in needed}
    marks = np.zeros(shape, dtype=np.int64)
    for place, work in _evaluations(design, every):
        for name in needed:
            found[name][place] = work.result(name)
        bits: Any = 0
        for index, name in enumerate(REGISTRY.cautions):
            holds = work.value(name)
            if np.any(holds):
                bits = bits | (np.asarray(holds, dtype=np.int64) << index)
        marks[place] = bits
        yield None
    margin = [np.broadcast_to(one, shape) for one in margins(found, design.requirements)]
    yield Batch((every[0], every[1], every[2]), found, tuple(margin), marks)


def _evaluations(
    design: Design, every: Sequence[Sequence[Part]]
) -> Iterator[tuple[Any, Evaluation]]:
    """The evaluation of each set of parts that share their whole values, and where it belongs."""
    taken = {name for names in PARTS.values() for name in names}
    rest = {name: value for name, value in design.point.items() if name not in taken}
    lights, modes, optics = (_grouped(entries) for entries in every)
    for mode in modes:
        # What the emitter does not touch is worked out once an optic, what the optic does not
        # touch once an emitter.
        known: list[Evaluation] = []
        for light in lights:
            work: Evaluation | None = None
            for index, optic in enumerate(optics):
                entries = _entries([every[2][place] for place in optic], 2)
                if work is not None:
                    work = work.changed(entries, without=PARTS["optic"])
                else:
                    entries |= _entries([every[0][place] for place in light], 0)
                    entries |= _entries([every[1][place] for place in mode], 1)
                    work = Evaluation(rest | entries)
                if index < len(known):
                    work.adopt(known[index], apart=PARTS["emitter"])
                yield np.ix_(light, mode, optic), work
                if index == len(known):
                    known.append(work)


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
    their names; `temperature` of the emitter in words; the wanted quantities, SI;
    `meets_<quantity>_<side>` for each requirement; `meets_all`; `margin` of the requirement that is
    met worst (above 0 met; natural logarithm of the ratio) and which it is, `held_back_by`;
    `from_memory` and `assumed`, counts of inputs written down from memory and at their defaults;
    `cautions`, their names; `scaled`. Raises InputError, KeyError.
    """
    import pandas as pd

    made = batch(design, emitters=emitters, resonators=resonators, optics=optics, scaled=scaled)
    columns = _columns(made, design)
    order = np.lexsort((-np.nan_to_num(columns["margin"], nan=-np.inf), ~columns["meets_all"]))
    table = pd.DataFrame({name: column[order] for name, column in columns.items()})
    table["scaled"] = scaled
    return table


def side_name(requirement: Requirement) -> str:
    """'rate_in_fibre_at_least': the quantity and side of a requirement, for a column."""
    return f"{requirement.quantity}_{'at_most' if requirement.at_least is None else 'at_least'}"


def worst(made: Batch) -> tuple[Array, NDArray[np.int64]]:
    """The smallest margin of each candidate, and the index of its requirement (-1: none wanted)."""
    shape = made.marks.shape
    margin, which = np.full(shape, np.inf), np.full(shape, -1)
    for index, here in enumerate(made.margins):
        worse = ~(here >= margin)
        which, margin = np.where(worse, index, which), np.where(worse, here, margin)
    return margin, which


def _columns(made: Batch, design: Design) -> dict[str, Any]:
    """The columns of the table, emitters slowest."""
    columns: dict[str, Any] = {}
    for axis, kind in enumerate(KINDS):
        for name, words in ((kind, "key"), (f"{kind}_name", "name")):
            columns[name] = _along(made, axis, words, object).ravel()
    columns["temperature"] = _along(made, 0, "temperature", object).ravel()
    columns |= {name: value.ravel() for name, value in made.found.items()}
    for entry, margin in zip(design.requirements, made.margins, strict=True):
        columns[f"meets_{side_name(entry)}"] = (margin >= 0).ravel()
    margin, which = worst(made)
    columns["meets_all"] = (margin >= 0).ravel()
    columns["margin"] = np.where(np.isinf(margin), 0.0, margin).ravel()
    names = np.array([*(entry.quantity for entry in design.requirements), ""], dtype=object)
    columns["held_back_by"] = names[which.ravel()]
    for name, counted in (("from_memory", "memory"), ("assumed", "assumed")):
        columns[name] = sum(_along(made, axis, counted, np.int64) for axis in range(3)).ravel()  # type: ignore[union-attr]  # three arrays
    columns["cautions"] = _cautions(made).ravel()
    return columns


def _along(made: Batch, axis: int, attribute: str, kind: Any) -> NDArray[Any]:
    """Something of the parts along one axis, in the shape of all candidates."""
    column = np.empty(len(made.parts[axis]), dtype=kind)
    column[:] = [getattr(entry, attribute) for entry in made.parts[axis]]
    shape = [1, 1, 1]
    shape[axis] = column.size
    return np.broadcast_to(column.reshape(shape), made.marks.shape)


def _cautions(made: Batch) -> NDArray[Any]:
    """Names of the cautions of each candidate: the model's, then those of its records."""
    own = [_along(made, axis, "cautions", object).ravel() for axis in range(3)]
    names = list(REGISTRY.cautions)
    known: dict[Any, tuple[str, ...]] = {}
    found = np.empty(made.marks.size, dtype=object)
    for index, key in enumerate(zip(made.marks.ravel().tolist(), *own, strict=True)):
        if key not in known:
            model = [name for bit, name in enumerate(names) if key[0] >> bit & 1]
            known[key] = (*model, *key[1], *key[2], *key[3])
        found[index] = known[key]
    return found.reshape(made.marks.shape)
