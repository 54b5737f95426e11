"""What a plan is made of: its base, columns of numbers, of whole values and of records."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..combine import PARTS, records_of
from ..design import Design
from ..domain import quoted, whole_of
from ..inputs import INPUTS
from ..whole import Pattern, Samples
from .faults import PlanError, own_numbers

#: In place of a list of records, or of the words of a choice.
EVERY = "all"


@dataclass(frozen=True, eq=False)
class Slow:
    """A column of whole values or of records, which varies more slowly than every number.

    labels: what stands in the table. drops: the inputs that an entry takes out of the base; entries:
    what it puts in their place, SI.
    """

    name: str
    labels: tuple[str, ...]
    drops: tuple[str, ...]
    entries: tuple[Mapping[str, Any], ...]


def base_point(base: Any) -> dict[str, Any]:
    """The point of all rows, SI. Inputs may still need others to go together. Raises InputError."""
    if isinstance(base, Design):
        return dict(base.point)
    if not isinstance(base, Mapping):
        raise PlanError(f"the base is a point or a Design, not {quoted(base)}")
    point: dict[str, Any] = {}
    for name, given in base.items():
        if name not in INPUTS:
            known = ", ".join(sorted(INPUTS))
            raise PlanError(f"{quoted(name)} is no input; the inputs are: {known}")
        if INPUTS[name].whole:
            point[name] = whole_of(INPUTS[name], given)
            continue
        values = own_numbers(name, given)
        if values.shape:
            raise PlanError(f"{name} in the base is one number; give several as an axis", name)
        point[name] = float(values)
    return point


def _sequence(name: str, given: Any) -> list[Any]:
    """The entries of an axis. Raises PlanError."""
    if isinstance(given, np.ndarray) and given.ndim != 1:
        raise PlanError(f"the axis {name} is one-dimensional, not of shape {given.shape}", name)
    if isinstance(given, str | bytes | Mapping) or not hasattr(given, "__iter__"):
        raise PlanError(f"the axis {name} takes a list of values, not {quoted(given)}", name)
    entries = list(given)
    if not entries:
        raise PlanError(f"the axis {name} is empty", name)
    return entries


def number_axis(name: str, given: Any) -> NDArray[np.float64]:
    """The values of a number axis, SI. Raises InputError."""
    plain_array = isinstance(given, np.ndarray) and given.ndim == 1 and given.size
    values = own_numbers(name, given if plain_array else _sequence(name, given))
    if values.ndim != 1:
        raise PlanError(f"the axis {name} takes a list of numbers", name)
    values = values.copy()
    values.setflags(write=False)
    return values


def whole_column(name: str, given: Any) -> Slow:
    """A column of words of a choice, or of other whole values with their labels. Raises InputError."""
    entry = INPUTS[name]
    if entry.choices and isinstance(given, str) and given == EVERY:
        given = entry.choices
    if isinstance(given, Mapping) and not entry.choices:
        labels, values = [str(label) for label in given], list(given.values())
    else:
        values = _sequence(name, given)
        labels = [
            str(value) if entry.choices else f"{name} {index}"
            for index, value in enumerate(values, start=1)
        ]
    if not values:
        raise PlanError(f"the axis {name} is empty", name)
    entries = tuple({} if value is None else {name: whole_of(entry, value)} for value in values)
    return Slow(name, tuple(labels), (name,), entries)


def record_column(kind: str, given: Any, scaled: bool = False) -> Slow:
    """A column of catalogue records by key; '' is the base's own part. Raises PlanError."""
    records = records_of(kind)
    if isinstance(given, str) and given == EVERY:
        given = [key for key, record in records.items() if record.placed]
    keys = _sequence(kind, given)
    for key in keys:
        if not isinstance(key, str) or (key and key not in records):
            known = ", ".join(sorted(records))
            raise PlanError(f"{quoted(key)} is no {kind} of the catalogue; its keys are: {known}")
    entries = tuple(records[key].inputs(own_wavelength=not scaled) if key else {} for key in keys)
    return Slow(kind, tuple(keys), PARTS[kind], entries)


def plain(point: Mapping[str, Any]) -> list[tuple[str, str]]:
    """Entries of a point as texts that are the same in every process, for a fingerprint."""
    return sorted((name, _plain(value)) for name, value in point.items())


def _plain(value: Any) -> str:
    if isinstance(value, Samples):
        columns = (value.offsets, value.counts)
    elif isinstance(value, Pattern):
        columns = (value.angles, value.powers)
    else:
        return repr(value)
    digest = hashlib.sha256(b"".join(column.tobytes() for column in columns))
    return f"{type(value).__name__} {digest.hexdigest()}"
