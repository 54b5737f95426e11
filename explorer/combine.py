"""Designs with catalogue records in them: which inputs a record stands for, and how it is taken.

A record replaces every input of its part of the device, so that nothing of an older choice is left:
an emitter all emitter inputs, a resonator all resonator inputs, an optic the optic's own. What the
record does not give goes back to its default. Excitation, filter and requirements stay.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any, Final

from .catalogue import emitters, optics, resonators
from .design import Design, Origin, Unknown
from .inputs import EMITTER, RESONATOR
from .published import Record

#: Inputs that an optic stands for; a filter and its detector's background are the user's own.
OPTIC: Final = (
    "numerical_aperture",
    "medium_index",
    "optics_transmission",
    "destination",
    "fibre_mode_radius",
    "magnification",
    "fibre_offset",
    "detector_efficiency",
    "reference_side",
)

#: Kind of record -> the inputs that it stands for.
PARTS: Final[Mapping[str, tuple[str, ...]]] = {
    "emitter": tuple(entry.name for entry in EMITTER),
    "resonator": tuple(entry.name for entry in RESONATOR),
    "optic": OPTIC,
}

#: Longest sentence that an origin carries.
LONGEST_PLACE: Final = 1000


def records_of(kind: str) -> Mapping[str, Record]:
    """The catalogue of a kind: 'emitter', 'resonator' or 'optic'. KeyError for another word."""
    return {"emitter": emitters, "resonator": resonators, "optic": optics}[kind]()


def origins_of(record: Record) -> dict[str, Origin]:
    """Where each input of a record comes from."""
    found = {}
    for name, (checked, where) in record.origins().items():
        value = record.values.get(name)
        found[name] = Origin(checked, value.source if value else "", where[:LONGEST_PLACE])
    return found


def with_record(design: Design, kind: str, key: str, *, scaled: bool = False) -> Design:
    """A design with a record's values, their origins and what is not known of them.

    kind: 'emitter', 'resonator' or 'optic'. key '': the values stay, and count as the user's own.
    scaled: the resonance follows the emission: the same Q and V in (λ/n)³ at another wavelength,
    which nobody published. Raises InputError, and KeyError for an unknown key.
    """
    if not key:
        return replace(design, **{kind: ""})  # type: ignore[arg-type]  # kind names a text
    record = records_of(kind)[key]
    names = PARTS[kind]
    values = record.inputs(own_wavelength=not scaled)
    kept = {name: value for name, value in design.point.items() if name not in names}
    origins = {name: origin for name, origin in design.origins.items() if name not in names}
    origins |= {name: found for name, found in origins_of(record).items() if name in values}
    unknowns = {name: range_ for name, range_ in design.unknowns.items() if name not in names}
    return replace(
        design,
        point={**kept, **values},
        origins=origins,
        unknowns={**unknowns, **unknowns_of(record, values)},
        **{kind: key},  # type: ignore[arg-type]  # kind names a text
    )


def with_place(design: Design, key: str, names: tuple[str, ...]) -> Design:
    """A design that takes only some inputs of a published resonator, with their origins."""
    record = resonators()[key]
    values = {name: value for name, value in record.inputs().items() if name in names}
    origins = origins_of(record)
    return replace(
        design,
        point={**design.point, **values},
        origins={**design.origins, **{name: origins[name] for name in values}},
        unknowns={**design.unknowns, **unknowns_of(record, values)},
    )


def unknowns_of(record: Record, values: Mapping[str, Any]) -> dict[str, Unknown]:
    """The published ranges of those values, where low and high differ."""
    return {name: Unknown(*ends) for name, ends in record.ranges().items() if name in values}


def combined(
    design: Design, emitter: str, resonator: str, optic: str, *, scaled: bool = False
) -> Design:
    """A design made of three records; an empty key keeps the design's own part."""
    made = with_record(design, "emitter", emitter) if emitter else design
    made = with_record(made, "resonator", resonator, scaled=scaled) if resonator else made
    return with_record(made, "optic", optic) if optic else made
