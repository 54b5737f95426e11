"""The published schema of a design record (JSON Schema 2020-12), made from the names.

`data/design.schema.json` is this schema written out; a test keeps the two equal.
"""

from __future__ import annotations

import json
from functools import cache
from importlib.resources import files
from itertools import islice
from pathlib import Path
from typing import Any

from .broadening import FORMS, Broadening
from .built import LONGEST_NAME, MOST
from .design import LONGEST_TEXT, ORIGINS
from .inputs import INPUTS
from .registry import REGISTRY, Input
from .scatter import SPREADS
from .units import EXPONENTS, si_unit
from .whole import MOST_SAMPLES, Lines, Pattern

FORMAT = "emitter and resonator design"
PAGE_FORMAT = "emitter and resonator page"
VERSION = 1

#: In place of a line's width: it is the point's own fast linewidth.
FOLLOWS = "fast_linewidth"

Json = dict[str, Any]

_TEXT: Json = {"type": "string", "maxLength": LONGEST_TEXT}
_NUMBER: Json = {"$ref": "#/$defs/number"}
_ANY_NUMBER: Json = {
    "oneOf": [{"type": "number"}, {"enum": ["infinite", "minus infinite", "none"]}]
}


_FAMILY_NAMES = {
    "1": "plain",
    "1/s": "per_second",
    "(λ/n)³": "cubic_wavelengths",
    "λ/n": "wavelengths",
}


def _object(properties: Json, required: list[str] | None = None, **more: Any) -> Json:
    return {
        "type": "object",
        "properties": properties,
        "required": list(properties) if required is None else required,
        "additionalProperties": False,
        **more,
    }


def _units_like(unit: str) -> list[str]:
    """Units that a value of this kind may be written in."""
    return [name for name in EXPONENTS if si_unit(name) == si_unit(unit) and name not in ("%", "°")]


def _with_unit(unit: str) -> Json:
    return {"$ref": f"#/$defs/{_family(unit)}"}


def _family(unit: str) -> str:
    """Name of the definition of a number with a unit of this kind."""
    name = si_unit(unit)
    return "number_in_" + _FAMILY_NAMES.get(name, name.replace("/", "_per_"))


def _families() -> Json:
    found: Json = {"number": _ANY_NUMBER}
    for unit in EXPONENTS:
        fields = {"value": _NUMBER, "unit": {"enum": _units_like(unit)}, "shown": _TEXT}
        found[_family(unit)] = _object(fields, ["value", "unit"])
    return found


def _rows(kind: str, units: list[str], most: int, columns: list[Json] | None = None) -> Json:
    row: Json = {"type": "array", "minItems": len(units), "maxItems": len(units)}
    row |= {"prefixItems": columns} if columns else {"items": _NUMBER}
    return _object(
        {
            "kind": {"const": kind},
            "units": {"const": units},
            "rows": {"type": "array", "items": row, "minItems": 1, "maxItems": most},
        }
    )


def _input_value(entry: Input) -> Json:
    if entry.choices:
        return _object({"value": {"enum": list(entry.choices)}}, description=entry.meaning)
    if Pattern in entry.types:
        value = _rows("pattern", ["rad", "1/sr"], MOST_SAMPLES)
        return _object({"value": value}, description=entry.meaning)
    if Broadening in entry.types:
        columns = [{"enum": list(FORMS)}, _NUMBER, _NUMBER]
        value = _rows("broadening", ["", "Hz", ""], 10, columns)
        for end in ("low", "high"):
            value["properties"][end] = _with_unit("K")
            value["required"].append(end)
        return _object({"value": value}, description=entry.meaning)
    if Lines in entry.types:
        width = {"oneOf": [{"type": "number"}, {"enum": ["infinite", "none", FOLLOWS]}]}
        lines = _rows("lines", ["1", "nm", "nm"], 50, [_NUMBER, _NUMBER, width])
        samples = _rows("samples", ["nm", "1/nm"], MOST_SAMPLES)
        return _object({"value": {"oneOf": [lines, samples]}}, description=entry.meaning)
    return {**_with_unit(entry.shown), "description": entry.meaning}


def _by_input(value: Any, numbers_only: bool = True) -> Json:
    """An object with an entry for any input; `value` makes the entry from the input."""
    rows = [row for row in INPUTS.values() if not (numbers_only and row.whole)]
    return _object({row.name: value(row) for row in rows}, [])


def _outcome() -> Json:
    found: Json = {}
    for quantity in REGISTRY.quantities.values():
        if quantity.kind == "number":
            entry = _with_unit(quantity.unit)
        elif quantity.kind == "choice":
            entry = _object({"value": {"enum": [*quantity.choices, ""]}})
        else:
            entry = _object({"value": {"type": "boolean"}})
        found[quantity.name] = {**entry, "description": quantity.label}
    return found


def _requirement() -> Json:
    numbers = [entry for entry in REGISTRY.quantities.values() if entry.kind == "number"]
    unit = {
        "type": "string",
        "maxLength": 20,
        "description": "any unit of the quantity's kind; an angle may be in °, written '°' or 'deg'",
    }
    limit = _object({"value": {"type": "number"}, "unit": unit})
    return _object(
        {
            "quantity": {"enum": [entry.name for entry in numbers]},
            "at_least": limit,
            "at_most": limit,
        },
        ["quantity"],
        oneOf=[{"required": ["at_least"]}, {"required": ["at_most"]}],
    )


def _step() -> Json:
    streams = {"type": "object", "additionalProperties": _NUMBER}
    factor = {"oneOf": [{"type": "null"}, _NUMBER]}
    return _object(
        {"step": _TEXT, "total": _with_unit("1/s"), "factor": factor, "streams": streams}
    )


def _open_slots() -> Json:
    """Slots that a record may carry or not."""
    interval = _object(
        {"value": _NUMBER, "low": _NUMBER, "high": _NUMBER, "unit": _TEXT}, ["value"]
    )
    by_name: Json = {"type": "object", "additionalProperties": interval}
    table: Json = {"type": "array", "items": {"type": "object"}}
    return {
        "ranges": {**by_name, "description": "range of each quantity from what is not known"},
        "yield": {
            **_object(
                {"share": interval, "count": {"type": "number"}, "by_requirement": by_name},
                ["share"],
            ),
            "description": "share of fabricated devices that pass",
        },
        "headroom": {**table, "description": "what each step alone could give back"},
        "measured": _measured(),
        "bounds": {
            **_by_input(
                lambda row: _object({"low": _with_unit(row.shown), "high": _with_unit(row.shown)})
            ),
            "description": "bounds of a search",
        },
        "shown": {"type": "object", "description": "what the page showed"},
        "passing": {"type": "number", "description": "share of devices that must pass"},
    }


def _measured() -> Json:
    """Devices that were built and measured."""
    value = _object(
        {"value": _NUMBER, "low": _NUMBER, "high": _NUMBER, "unit": _TEXT, "predicted": _NUMBER},
        ["value", "low", "high", "unit"],
    )
    device = _object(
        {
            "name": {"type": "string", "minLength": 1, "maxLength": LONGEST_NAME},
            "inputs": _by_input(lambda row: _with_unit(row.shown)),
            "values": {"type": "object", "additionalProperties": value},
            "files": {"type": "array", "items": _TEXT, "maxItems": 50},
        }
    )
    return {
        "type": "array",
        "items": device,
        "maxItems": MOST,
        "description": "devices that were measured, with the intervals, and what is predicted for them",
    }


@cache
def schema() -> Json:
    """The schema as a JSON object."""
    spread = {"kind": {"enum": list(SPREADS)}}
    properties: Json = {
        "format": {"const": FORMAT},
        "version": {"const": VERSION},
        "tool": _object({"name": _TEXT, "version": _TEXT}),
        "saved": {"type": "string", "format": "date-time", "maxLength": 40},
        "name": _TEXT,
        "note": _TEXT,
        "decision": _object({"who": _TEXT, "why": _TEXT, "doubts": _TEXT}),
        "records": _object({"emitter": _TEXT, "resonator": _TEXT, "optic": _TEXT}),
        "inputs": _object(
            {
                "given": _by_input(_input_value, numbers_only=False),
                "defaults": _by_input(_input_value, numbers_only=False),
            }
        ),
        "requirements": {"type": "array", "items": _requirement(), "maxItems": 50},
        "scatter": _by_input(
            lambda row: _object(
                {**spread, "width": {"anyOf": [_with_unit(row.shown), _with_unit("1")]}}
            )
        ),
        "correlation": {"type": "object", "additionalProperties": {"type": "number"}},
        "unknowns": _by_input(
            lambda row: _object({"low": _with_unit(row.shown), "high": _with_unit(row.shown)})
        ),
        "origins": _by_input(
            lambda _: _object({"kind": {"enum": list(ORIGINS)}, "source": _TEXT, "where": _TEXT}),
            numbers_only=False,
        ),
        "data": {"type": "object", "additionalProperties": _TEXT},
        "outcome": _object(_outcome(), []),
        "budget": {"type": "array", "items": _step()},
        "cautions": {"type": "array", "items": _object({"name": _TEXT, "sentence": _TEXT})},
        "sources": {"type": "object", "additionalProperties": _TEXT},
    }
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Design of a single-photon source: emitter, resonator, optic, and what came of it",
        **_object({**properties, **_open_slots()}, list(properties)),
        "$defs": _families(),
    }


#: Parts of a record that are worked out, and not needed to bring a design back.
WORKED_OUT = ("tool", "saved", "outcome", "budget", "cautions", "sources")


@cache
def page_schema() -> Json:
    """The schema of what a page keeps in the browser: the question, and the designs of the shortlist."""
    whole = schema()
    given = {name: part for name, part in whole["properties"].items() if name not in WORKED_OUT}
    required = [name for name in whole["required"] if name not in WORKED_OUT]
    given["inputs"] = _object({"given": whole["properties"]["inputs"]["properties"]["given"]})
    design = {"type": "object", "properties": given, "required": required}
    axis = _object(
        {
            "input": {"enum": [row.name for row in INPUTS.values() if not row.whole]},
            "low": _ANY_NUMBER,
            "high": _ANY_NUMBER,
            "log": {"type": "boolean"},
        }
    )
    shown = _object(
        {
            "quantity": _TEXT,
            "x": axis,
            "y": axis,
            "layers": {"type": "array", "items": _TEXT, "maxItems": 20},
            "cut": {"type": "array", "items": _TEXT, "maxItems": 2},
        }
    )
    return {
        **_object(
            {
                "format": {"const": PAGE_FORMAT},
                "version": {"const": VERSION},
                "design": {**design, "additionalProperties": False},
                "shown": shown,
                "kept": _object(
                    {letter: {**design, "additionalProperties": False} for letter in "ABCD"}, []
                ),
            }
        ),
        "$defs": _families(),
    }


def shipped() -> Json:
    """The schema as shipped beside the data."""
    text = files("explorer").joinpath("data/design.schema.json").read_text(encoding="utf-8")
    loaded: Json = json.loads(text)
    return loaded


#: Errors looked at before the most telling one is named: a large file may hold a million.
ENOUGH = 100

_KINDS = {
    "object": "set of names and values",
    "array": "list",
    "string": "text",
    "number": "number",
}


def problems(record: Any, page: bool = False) -> str:
    """The most telling problem of a record against the schema in one sentence; '' if none.

    page: whether it is what a page keeps, and not the record of a design.
    """
    from jsonschema import Draft202012Validator

    errors = islice(_validator(Draft202012Validator, page).iter_errors(record), ENOUGH)
    worst = min(errors, key=lambda error: len(error.absolute_path), default=None)
    if worst is None:
        return ""
    place = " → ".join(str(part) for part in worst.absolute_path)
    return f"at {quoted_name(place) or 'the record'}: {_in_words(worst)}"


def quoted_name(text: str) -> str:
    """A place or a name in a record, on one line, cut where it is long."""
    line = "".join(sign if sign.isprintable() else "?" for sign in text)
    return line if len(line) <= 120 else f"{line[:119]}…"


def _as_written(value: Any) -> str:
    """A value of a record as its file has it, cut where it is long."""
    text = quoted_name(json.dumps(value, default=_figure, ensure_ascii=False))
    return text if len(text) <= 60 else f"{text[:59]}…"


def _figure(number: Any) -> int | float:
    """A decimal of a record as JSON writes it."""
    figure = float(number)
    return int(figure) if figure.is_integer() else figure


def _in_words(error: Any) -> str:
    """What an error of the validator means, in the words of this tool."""
    found, rule, limit = _as_written(error.instance), error.validator, error.validator_value
    if rule == "required":
        missing = next(name for name in limit if name not in error.instance)
        return f"{missing!r} is missing"
    if rule == "additionalProperties" and limit is False:
        extra = next(name for name in error.instance if name not in error.schema["properties"])
        return f"{quoted_name(str(extra))!r} is not known here"
    if rule == "type":
        return f"{found} is no {_KINDS.get(limit, limit)}"
    if rule == "enum" and len(limit) <= 10:
        return f"{found} is none of {', '.join(str(word) for word in limit)}"
    if rule == "const":
        return f"{found} is not {_as_written(limit)}"
    if rule == "maxLength":
        return f"the text is longer than {limit} signs"
    if rule == "oneOf" and error.schema == _ANY_NUMBER:
        return f"{found} is no number"
    if rule == "oneOf" and "quantity" in error.schema.get("properties", {}):
        return "a requirement takes at_least or at_most, one of them"
    if rule == "oneOf" and isinstance(error.instance, dict) and "rows" in error.instance:
        return "the table needs a known kind, the units of that kind, and rows of as many numbers"
    if isinstance(error.instance, dict) and "unit" in error.instance:
        return f"{found} is no number in a unit that fits"
    return f"{found} is not known here"


@cache
def _validator(kind: Any, page: bool) -> Any:
    from decimal import Decimal

    from jsonschema import validators

    def is_number(_: Any, value: Any) -> bool:
        return isinstance(value, int | float | Decimal) and not isinstance(value, bool)

    extended: Any = validators.extend  # untyped in its stubs
    checked = extended(kind, type_checker=kind.TYPE_CHECKER.redefine("number", is_number))
    return checked(page_schema() if page else schema())


def write() -> None:
    """Write the schema out beside the data, in a clone."""
    target = Path(__file__).parent / "data" / "design.schema.json"
    target.write_text(json.dumps(schema(), indent=1, ensure_ascii=False) + "\n", encoding="utf-8")
