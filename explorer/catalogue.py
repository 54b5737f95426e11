"""Published emitters, resonators and optics: records whose every number carries its source.

A record is one TOML file in `data/`; a number in it has the value and unit as published, where it
was found, under which conditions, and whether it was seen there or written down from memory. Read
when first asked, once. To add a record, add a file: menus, points, marks and tests follow.
"""

from __future__ import annotations

import math
import re
import tomllib
from collections.abc import Mapping
from functools import cache
from importlib import resources
from importlib.resources.abc import Traversable
from types import MappingProxyType
from typing import Any, Final

from scipy import constants

from . import units
from .broadening import Broadening
from .inputs import INPUTS, slider_holds
from .published import (
    COMMON,
    DECIDING,
    OTHER_VALUES,
    Enhancement,
    Law,
    Line,
    Record,
    Reference,
    Value,
    cubic_wavelengths,
    spectral_width,
)

KINDS: Final = ("emitters", "resonators", "optics")
CHECKED: Final = ("seen", "from memory")
NEEDED: Final = ("value", "unit", "source", "where", "checked")
TEXTS: Final = ("source", "where", "conditions", "checked", "remark")
#: Values whose published unit may be an energy or a frequency.
WIDTHS: Final = ("fast_linewidth", "slow_linewidth", "width")


class CatalogueError(ValueError):
    """A record that cannot be used; the message names the file, the entry and what is wrong."""


def emitters() -> Mapping[str, Record]:
    """The published emitters by key; raises CatalogueError."""
    return _records("emitters")


def resonators() -> Mapping[str, Record]:
    """The published resonators by key; raises CatalogueError."""
    return _records("resonators")


def optics() -> Mapping[str, Record]:
    """Collecting optics and fibres by key; raises CatalogueError."""
    return _records("optics")


@cache
def references() -> Mapping[str, Reference]:
    """Every source by key; raises CatalogueError."""
    table = _toml(_data() / "references.toml")
    found = {}
    for key, entry in table.items():
        try:
            found[key] = Reference(key=key, **entry)
        except TypeError as error:
            raise CatalogueError(f"references.toml: {key}: {error}") from error
    return MappingProxyType(found)


@cache
def _records(kind: str) -> Mapping[str, Record]:
    return MappingProxyType({file.name[:-5]: parse_record(kind, file) for file in _files(kind)})


def _data() -> Traversable:
    return resources.files(__package__) / "data"


def _files(kind: str) -> list[Traversable]:
    files = (file for file in (_data() / kind).iterdir() if file.name.endswith(".toml"))
    return sorted(files, key=lambda file: file.name)


def _toml(file: Traversable) -> dict[str, Any]:
    try:
        return tomllib.loads(file.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise CatalogueError(f"{file.name}: {error}") from error


def parse_record(kind: str, file: Traversable) -> Record:
    """The record in a file; kind: 'emitters', 'resonators' or 'optics'. Raises CatalogueError."""
    table, place = _toml(file), f"{kind}/{file.name}"
    for name in ("name", "class", "summary", "values"):
        if not table.get(name):
            raise CatalogueError(f"{place}: {name} is missing")
    try:
        return _record(kind, file.name[:-5], table)
    except (AttributeError, KeyError, TypeError, ValueError) as error:
        raise CatalogueError(f"{place}: {error}") from error


def _record(kind: str, key: str, table: Mapping[str, Any]) -> Record:
    values = _values(table["values"])
    if kind == "emitters" and "temperature" not in values:
        values |= _temperature(table.get("temperature", ""))
    boost = table.get("enhancement")
    if boost and "meaning" not in boost:
        raise ValueError("enhancement has no meaning: of what is it the ratio?")
    return Record(
        key=key,
        kind=kind,
        name=table["name"],
        class_=table["class"],
        summary=table["summary"],
        doubts=table.get("doubts", ""),
        temperature=table.get("temperature", ""),
        caution=table.get("caution", ""),
        gaussian_beam=table.get("gaussian_beam"),
        measured_with=table.get("measured_with", ""),
        values=MappingProxyType(values),
        lines=tuple(_line(entry, values) for entry in table.get("line", ())),
        choices=MappingProxyType(dict(table.get("choices", {}))),
        enhancement=_enhancement(boost) if boost else None,
        law=_law(table["broadening"], values) if "broadening" in table else None,
        device=MappingProxyType(_values(table.get("device", {}), values)),
    )


#: Room temperature as records mean it [K].
ROOM: Final = 295


def _temperature(words: str) -> dict[str, Value]:
    """The temperature [K] that an emitter was measured at, from the words of its record."""
    if not words:
        return {}
    found = re.fullmatch(r"(\d+(?:\.\d+)?) K", words)
    if words != "room temperature" and found is None:
        raise ValueError(f"temperature = {words!r} is neither 'room temperature' nor a number in K")
    kelvin = float(found[1]) if found else float(ROOM)
    return {
        "temperature": Value(
            value_si=kelvin,
            low_si=None,
            high_si=None,
            shown=f"{kelvin:g} K",
            unit="K",
            source=COMMON,
            where=f"temperature of the record: {words}",
            conditions="",
            checked="from memory",
            remark="",
            reference=None,
        )
    }


def _enhancement(table: Mapping[str, Any]) -> Enhancement:
    value = _value("enhancement", table)
    miss, at_least = str(table.get("miss", "")), bool(table.get("at_least", False))
    return Enhancement(value, str(table["meaning"]), miss, at_least)


def _law(table: Mapping[str, Any], values: Mapping[str, Value]) -> Law:
    """A published broadening law; its terms in Hz and eV."""
    missing = [
        part for part in ("source", "where", "checked", "low", "high", "term") if part not in table
    ]
    if missing:
        raise ValueError(f"broadening has no {missing[0]}")
    wavelength = values["emission_wavelength"].value_si
    terms = [_term(entry, wavelength) for entry in table["term"]]
    checked, source, reference = _cited("broadening", table)
    cited = reference.text if reference else f"{COMMON}, no source"
    shown = " + ".join(str(entry["printed"]) for entry in table["term"])
    details = ", ".join(str(table[part]) for part in ("where", "conditions") if table.get(part))
    return Law(
        Broadening(terms, table["low"], table["high"]),
        checked,
        source,
        f"{shown}, {table['low']:g}–{table['high']:g} K: {cited} ({details}); {checked}",
        reference,
    )


def _term(entry: Mapping[str, Any], wavelength: float) -> tuple[str, float, float]:
    """One term: form, coefficient [Hz], exponent or energy [eV]; 'printed' is as its source has it.

    Either its coefficient is given, or a width at a temperature [K] through which it goes.
    """
    if "printed" not in entry:
        raise ValueError("a term of broadening does not say how it is printed")
    power = entry["form"] == "power"
    more = (
        float(entry["exponent"])
        if power
        else units.to_si(float(entry["energy"]), str(entry.get("energy_unit", "meV")))
    )
    through = "at" in entry
    width = spectral_width(
        float(entry["width" if through else "coefficient"]),
        str(entry["unit"]),
        wavelength=wavelength,
    )
    size = constants.c * width / (wavelength**2 - width**2 / 4)
    if through:
        shape = Broadening([(entry["form"], 1.0, more)], 1, 1)
        size /= float(shape.width(float(entry["at"])))
    return str(entry["form"]), size, more


def _values(
    tables: Mapping[str, Any], beside: Mapping[str, Value] | None = None
) -> dict[str, Value]:
    """Values in the order of the file; wavelength and index first, since the others convert by them.

    beside: values that give wavelength and index where the tables do not.
    """
    beside = beside or {}
    unknown = [name for name in tables if name not in INPUTS and name not in OTHER_VALUES]
    if unknown:
        raise ValueError(f"values.{unknown[0]} is no input of a point")
    first = ("emission_wavelength", "resonance_wavelength", "refractive_index")
    known = {name: _value(name, tables[name]) for name in first if name in tables}
    at = {**{name: beside[name] for name in first if name in beside}, **known}
    given = at.get("emission_wavelength") or at.get("resonance_wavelength")
    index = at.get("refractive_index")
    for name, table in tables.items():
        if name not in known:
            known[name] = _value(
                name,
                table,
                wavelength=given.value_si if given else math.nan,
                refractive_index=index.value_si if index else math.nan,
            )
    return {name: known[name] for name in tables}


def _line(entry: Mapping[str, Any], values: Mapping[str, Value]) -> Line:
    missing = [part for part in ("role", "share") if part not in entry]
    if missing or "emission_wavelength" not in values:
        raise ValueError(f"a line needs {missing[0] if missing else 'an emission_wavelength'}")
    centre = _value("emission_wavelength", entry["centre"]) if "centre" in entry else None
    at = centre or values["emission_wavelength"]
    width = _value("width", entry["width"], wavelength=at.value_si) if "width" in entry else None
    follows = bool(entry.get("follows", False))
    if follows and "fast_linewidth" not in values:
        raise ValueError("a line follows fast_linewidth, which is not given")
    return Line(entry["role"], _value("share", entry["share"]), centre, width, follows)


def _value(
    name: str,
    table: Mapping[str, Any],
    *,
    wavelength: float = math.nan,
    refractive_index: float = math.nan,
) -> Value:
    missing = [part for part in NEEDED if part not in table]
    if missing:
        raise ValueError(f"{name} has no {missing[0]}")
    _, _, reference = _cited(name, table)
    unit = str(table["unit"])
    converted = {
        part: _converted(name, float(table[part]), unit, wavelength, refractive_index)
        for part in ("value", "low", "high")
        if part in table
    }
    return Value(
        value_si=converted["value"],
        low_si=converted.get("low"),
        high_si=converted.get("high"),
        shown=_shown(table, unit),
        unit=unit,
        reference=reference,
        **{part: str(table.get(part, "")) for part in TEXTS},
    )


def _cited(name: str, table: Mapping[str, Any]) -> tuple[str, str, Reference | None]:
    """How a number was checked, the key of its source, and the source (None: common practice)."""
    if table["checked"] not in CHECKED:
        raise ValueError(f"{name}: checked is {table['checked']!r}, not 'seen' or 'from memory'")
    if table["source"] == COMMON:
        return table["checked"], COMMON, None
    if table["source"] not in references():
        raise ValueError(f"{name}: no source {table['source']!r} in references.toml")
    return table["checked"], table["source"], references()[table["source"]]


def _converted(
    name: str, number: float, unit: str, wavelength: float, refractive_index: float
) -> float:
    if name in WIDTHS:
        result = spectral_width(number, unit, wavelength=wavelength)
    elif name == "mode_volume":
        result = cubic_wavelengths(
            number, unit, wavelength=wavelength, refractive_index=refractive_index
        )
    else:
        result = units.to_si(number, unit)
        family = INPUTS[name].unit if name in INPUTS else OTHER_VALUES.get(name, "1")
        if units.si_unit(unit) != family:
            raise ValueError(f"{name}: {unit!r} is no unit of it")
    if not math.isfinite(result):
        raise ValueError(
            f"{name}: {number:g} {unit} needs a wavelength and an index to be converted"
        )
    return result


def _shown(table: Mapping[str, Any], unit: str) -> str:
    number = f"{table['value']:g}"
    if "low" in table or "high" in table:
        number += f" ({table.get('low', '…')}–{table.get('high', '…')})"
    return number if unit in ("1", "") else f"{number} {unit}"


def check_records() -> list[str]:
    """Everything wrong with the records, one sentence each; an empty list is right."""
    problems = []
    for kind in KINDS:
        for file in _files(kind):
            try:
                record = parse_record(kind, file)
            except CatalogueError as error:
                problems.append(str(error))
            else:
                problems += [f"{kind}/{file.name}: {text}" for text in _faults(record)]
    return problems


def _faults(record: Record) -> list[str]:
    missing = [name for name in DECIDING.get(record.kind, ()) if name not in record.deciding()]
    if record.kind == "resonators":  # without Q and V it is listed, not placed
        listed = record.enhancement is not None or len(missing) < len(DECIDING["resonators"])
        missing = [] if listed else missing
        if record.gaussian_beam is None:
            missing.append("gaussian_beam")
    faults = [f"no {name}" for name in missing]
    if not record.doubts and any(value.checked != "seen" for value in record.every_value()):
        faults.append("values from memory, but doubts is empty")
    for value in record.every_value():
        low = value.value_si if value.low_si is None else value.low_si
        high = value.value_si if value.high_si is None else value.high_si
        if not low <= value.value_si <= high:
            faults.append(f"{value.shown}: the value is outside its own range")
        if not value.where:
            faults.append(f"{value.shown}: no place in the source")
        if value.checked == "seen" and (not value.reference or value.reference.seen == "nothing"):
            faults.append(f"{value.shown}: seen in a source of which nothing was read")
    for name, number in record.inputs().items():
        if isinstance(number, float) and not slider_holds(name, number):
            faults.append(f"{name}: outside the range of its slider")
    return faults
