"""Parts of a record: numbers with their units, whole values, and the devices that were measured."""

from __future__ import annotations

from typing import Any

from .broadening import Broadening
from .built import Built, Estimate
from .design import Design
from .domain import InputError
from .exact import RecordError, number_in, value_of
from .inputs import INPUTS
from .measured.use import predicted
from .registry import REGISTRY
from .schema import FOLLOWS
from .units import si_unit, to_si, unit_name
from .whole import Lines, Pattern, Samples

Json = dict[str, Any]


def written_number(value: float, unit: str) -> Json:
    """An SI number in JSON, with its unit."""
    return {"value": number_in(value, unit), "unit": unit}


def written_whole(value: Any) -> Any:
    """A whole value in JSON: a word, or a table with its units."""
    if isinstance(value, Lines):
        rows = [
            [
                number_in(share, "1"),
                number_in(offset, "nm"),
                FOLLOWS if width is None else number_in(width, "nm"),
            ]
            for share, offset, width in value.lines
        ]
        return {"kind": "lines", "units": ["1", "nm", "nm"], "rows": rows}
    if isinstance(value, Samples):
        rows = [
            [number_in(offset, "nm"), number_in(count, "1")]
            for offset, count in zip(value.offsets.tolist(), value.counts.tolist(), strict=True)
        ]
        return {"kind": "samples", "units": ["nm", "1/nm"], "rows": rows}
    if isinstance(value, Pattern):
        rows = [
            [number_in(angle, "rad"), number_in(power, "1")]
            for angle, power in zip(value.angles.tolist(), value.powers.tolist(), strict=True)
        ]
        return {"kind": "pattern", "units": ["rad", "1/sr"], "rows": rows}
    if isinstance(value, Broadening):
        rows = [
            [form, number_in(size, "1"), number_in(more, "1")] for form, size, more in value.terms
        ]
        ends = {end: written_number(getattr(value, end), "K") for end in ("low", "high")}
        return {"kind": "broadening", "units": ["", "Hz", ""], "rows": rows, **ends}
    return value


def read_whole(entry: Any) -> Any:
    """A whole value from its JSON. Raises WholeError and RecordError."""
    if isinstance(entry, str):
        return entry
    rows = entry["rows"]
    if entry["kind"] == "lines":
        return Lines(
            [
                (
                    value_of(share, "1"),
                    value_of(offset, "nm"),
                    None if width == FOLLOWS else value_of(width, "nm"),
                )
                for share, offset, width in rows
            ]
        )
    if entry["kind"] == "broadening":
        terms = [(form, value_of(size, "1"), value_of(more, "1")) for form, size, more in rows]
        ends = (
            read_number(entry[end], f"the {end} end of a broadening", "K")
            for end in ("low", "high")
        )
        return Broadening(terms, *ends)
    kind, unit = (Samples, "nm") if entry["kind"] == "samples" else (Pattern, "rad")
    return kind([value_of(row[0], unit) for row in rows], [value_of(row[1], "1") for row in rows])


def read_number(entry: Any, what: str, unit: str) -> float:
    """SI value of a {value, unit}; the unit must be one of the same kind."""
    try:
        name = unit_name(entry["unit"])
    except ValueError as error:
        raise RecordError(f"{what}: {error}") from error
    if si_unit(name) != si_unit(unit):
        raise RecordError(f"{what} is given in {entry['unit']!r}; it takes {unit}")
    if name == "°":  # no power of ten lies between it and its SI unit
        return to_si(value_of(entry["value"], "1"), name)
    return value_of(entry["value"], name)


def written_built(design: Design) -> list[Json]:
    """The measured devices of a design, each with what the model says of it."""
    return [_written_device(design, device) for device in design.built]


def _written_device(design: Design, device: Built) -> Json:
    try:
        says = predicted(design, device)
    except InputError:  # its resonator does not go with what the design has become
        says = dict.fromkeys(device.measured, float("nan"))
    values = {}
    for name, estimate in device.measured.items():
        unit = REGISTRY.quantities[name].unit
        ends = {end: number_in(getattr(estimate, end), unit) for end in ("value", "low", "high")}
        values[name] = {**ends, "unit": unit, "predicted": number_in(says[name], unit)}
    return {
        "name": device.name,
        "inputs": {
            name: written_number(value, INPUTS[name].shown) for name, value in device.point.items()
        },
        "values": values,
        "files": list(device.files),
    }


def read_built(entry: Json) -> Built:
    """A measured device from its JSON. Raises InputError and RecordError."""
    point, measured = {}, {}
    for name, value in entry["inputs"].items():
        if name not in INPUTS:
            raise InputError(f"{name!r:.80} is no input")
        point[name] = read_number(value, name, INPUTS[name].shown)
    for name, value in entry["values"].items():
        if name not in REGISTRY.quantities:
            raise InputError(f"{name!r:.60} is no quantity that can be measured")
        unit = REGISTRY.quantities[name].unit
        ends = [
            read_number({"value": value[end], "unit": value["unit"]}, f"{end} of {name}", unit)
            for end in ("value", "low", "high")
        ]
        measured[name] = Estimate(*ends)
    return Built(entry["name"], point, measured, tuple(entry["files"]))
