"""A design as JSON and back, exactly; the published schema; atomic writing.

Numbers are written in the unit that the page shows, as the exact decimal of the SI value shifted by
the unit's power of ten, and read back the same way, so every input returns bit for bit.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from .atomic import write_whole
from .budget import budget_rows
from .design import Decision, Design, Origin, Requirement, Unknown
from .domain import InputError, quoted
from .exact import RecordError, number_in, parse, serialise, value_of
from .inputs import INPUTS
from .limits import headroom
from .record_parts import (
    read_built,
    read_number,
    read_whole,
    written_built,
    written_number,
    written_whole,
)
from .registry import REGISTRY
from .scatter import Spread
from .schema import FORMAT, VERSION, problems
from .units import text
from .version import __version__
from .whole import WholeError
from .yields import Share, Yield, yield_of

#: Largest record that is read [bytes].
LARGEST = 20_000_000

Json = dict[str, Any]


def _input(name: str, value: Any) -> Json:
    entry = INPUTS[name]
    if entry.whole:
        return {"value": written_whole(value)}
    return written_number(float(value), entry.shown)


def _inputs(design: Design) -> Json:
    """Given inputs apart from the defaults filled in for the others."""
    work = design.evaluation
    given = {name: _input(name, design.point[name]) for name in INPUTS if name in design.point}
    defaults = {}
    for name, entry in INPUTS.items():
        if name not in design.point:
            value = work.value(name)
            if value is not None or not entry.whole:
                defaults[name] = _input(name, value)
    return {"given": given, "defaults": defaults}


def _outcome(design: Design) -> Json:
    found: Json = {}
    for name, value in design.outcome().items():
        quantity = REGISTRY.quantities[name]
        if quantity.kind == "number":
            found[name] = {
                **written_number(value, quantity.unit),
                "shown": text(value, quantity.unit),
            }
        else:
            found[name] = {"value": value}
    return found


def _requirement(requirement: Requirement) -> Json:
    unit = REGISTRY.quantities[requirement.quantity].unit
    side = "at_most" if requirement.at_least is None else "at_least"
    return {"quantity": requirement.quantity, side: written_number(requirement.limit, unit)}


def _budget(design: Design) -> list[Json]:
    rows = []
    for row in budget_rows(design.evaluation):
        streams = {name: number_in(value, "1/s") for name, value in row.streams.items()}
        factor = None if row.factor is None else number_in(row.factor, "1")
        rows.append(
            {
                "step": row.step,
                "total": written_number(row.total, "1/s"),
                "factor": factor,
                "streams": streams,
            }
        )
    return rows


def _sources(design: Design) -> Json:
    """The references behind the inputs and the quantities, by key."""
    from .catalogue import references

    keys = {origin.source for origin in design.origins.values()}
    keys |= {quantity.source for quantity in REGISTRY.quantities.values()}
    known = references()
    return {key: known[key].text for key in sorted(keys) if key in known}


def given_of(design: Design) -> Json:
    """The part of a record that was given and not worked out, as a JSON object."""
    return {
        "format": FORMAT,
        "version": VERSION,
        "name": design.name,
        "note": design.note,
        "decision": {
            "who": design.decision.who,
            "why": design.decision.why,
            "doubts": design.decision.doubts,
        },
        "records": {
            "emitter": design.emitter,
            "resonator": design.resonator,
            "optic": design.optic,
        },
        "inputs": {"given": _inputs(design)["given"]},
        "requirements": [_requirement(entry) for entry in design.requirements],
        "scatter": {name: _spread(name, spread) for name, spread in design.scatter.items()},
        "correlation": {pair: number_in(value, "1") for pair, value in design.correlation.items()},
        **({} if design.passing is None else {"passing": number_in(design.passing, "1")}),
        "unknowns": {
            name: {
                "low": written_number(unknown.low, INPUTS[name].shown),
                "high": written_number(unknown.high, INPUTS[name].shown),
            }
            for name, unknown in design.unknowns.items()
        },
        "origins": {
            name: {"kind": origin.kind, "source": origin.source, "where": origin.where}
            for name, origin in design.origins.items()
        },
        "data": dict(design.data),
        **({"measured": written_built(design)} if design.built else {}),
    }


def record_of(design: Design) -> Json:
    """The record of a design as a JSON object; numbers are exact decimals (see `exact`)."""
    given = given_of(design)
    built = {"measured": given.pop("measured")} if design.built else {}
    return {
        "format": given.pop("format"),
        "version": given.pop("version"),
        "tool": {"name": "explorer", "version": __version__},
        "saved": datetime.now(UTC).isoformat(timespec="seconds"),
        **given,
        "inputs": _inputs(design),
        "outcome": _outcome(design),
        "budget": _budget(design),
        **_devices(design),
        "headroom": _headroom(design),
        **built,
        "cautions": _cautions(design),
        "sources": _sources(design),
    }


def _devices(design: Design) -> Json:
    """The share of devices that pass, where something scatters and something is required."""
    if not (design.scatter and design.requirements):
        return {}
    try:
        found = yield_of(
            design, design.scatter, design.requirements, correlation=design.correlation
        )
    except InputError:  # what cannot scatter there
        return {}

    def part(share: Share | Yield) -> Json:
        values = {"value": share.share, "low": share.low, "high": share.high}
        return {name: number_in(float(value), "1") for name, value in values.items()}

    by = {name: part(share) for name, share in found.by_requirement.items()}
    return {"yield": {"share": part(found), "count": found.count, "by_requirement": by}}


def _headroom(design: Design) -> list[Json]:
    """What each step of the budget would give if it alone were ideal."""
    return [
        {
            "step": row.step,
            "headroom": number_in(row.headroom, "1"),
            "alone": number_in(row.alone, "1"),
        }
        for row in headroom(design, "rate_detected")
    ]


def _cautions(design: Design) -> list[Json]:
    """The model's cautions that hold here, and those of the records the values came from."""
    from .advice import record_cautions  # reads the catalogue, which nobody has asked for before

    model = [(name, REGISTRY.cautions[name].sentence) for name in design.cautions()]
    return [
        {"name": name, "sentence": sentence}
        for name, sentence in (*model, *record_cautions(design))
    ]


def _spread(name: str, spread: Spread) -> Json:
    unit = "1" if spread.kind in ("lognormal", "direction") else INPUTS[name].shown
    return {"kind": spread.kind, "width": written_number(spread.width, unit)}


def design_text(design: Design | Mapping[str, Any]) -> str:
    """The record of a design or of a bare point as JSON text. Raises InputError."""
    if not isinstance(design, Design):
        design = Design(point=design)
    return serialise(record_of(design)) + "\n"


def save_design(design: Design | Mapping[str, Any], path: str | os.PathLike[str]) -> None:
    """Write the record of a design or of a bare point as JSON, whole or not at all.

    An interruption leaves the file that was there; see `write_whole` for links and rights. Raises
    InputError for a bad point, RecordError if it cannot be written.
    """
    text = design_text(design)
    name = quoted(Path(path).name)
    try:
        write_whole(text, path)
    except OSError as error:
        raise RecordError(f"the design was not saved to {name}: {error.strerror}") from error
    except ValueError as error:  # a path that no file system takes
        raise RecordError(f"the design was not saved to {name}: {error}") from error


def load_design(path: str | os.PathLike[str]) -> Design:
    """Read a design from its JSON record.

    Inputs come back bit for bit; the outcome is worked out afresh. Raises RecordError, in one
    sentence, for what is no readable record.
    """
    target = Path(path)
    try:
        size = target.stat().st_size
        if size > LARGEST:
            raise RecordError(
                f"{target.name} has {size / 1e6:.0f} MB; a design record has at most "
                f"{LARGEST / 1e6:.0f} MB"
            )
        content = target.read_bytes()
    except OSError as error:
        raise RecordError(f"{quoted(target.name)} cannot be read: {error.strerror}") from error
    except ValueError as error:  # a path that no file system takes
        raise RecordError(f"{quoted(target.name)} cannot be read: {error}") from error
    return design_from(content, target.name)


def design_from(content: bytes, name: str = "the record") -> Design:
    """The same from the bytes of a record; `name` stands in the messages."""
    if len(content) > LARGEST:
        raise RecordError(f"{name} is larger than the {LARGEST / 1e6:.0f} MB of a design record")
    record = migrated(parse(content, name), name)
    found = problems(record)
    if found:
        raise RecordError(f"{name} is no design record: {found}")
    return design_of(record, name)


def design_of(record: Json, name: str) -> Design:
    """The design that the given part of a checked record says. Raises RecordError."""
    try:
        return _design(record)
    except (InputError, WholeError, RecordError) as error:
        raise RecordError(f"{name} holds what cannot be: {error}") from error


def migrated(record: Any, name: str) -> Json:
    """A record of this version, from one of an older version; refuses others in words."""
    if not isinstance(record, dict) or record.get("format") != FORMAT:
        raise RecordError(f"{name} is no design record: it does not name the format {FORMAT!r}")
    version = record.get("version")
    if version != VERSION:
        raise RecordError(
            f"{name} has version {str(version)[:20]!r} of the record, and this tool reads version "
            f"{VERSION}; save it again with the tool that wrote it, or update this one"
        )
    return record


def _read_point(given: Json) -> dict[str, Any]:
    point: dict[str, Any] = {}
    for name, entry in given.items():
        row = INPUTS.get(name)
        if row is None:
            raise InputError(f"{name!r:.80} is no input")
        point[name] = (
            read_whole(entry["value"]) if row.whole else read_number(entry, name, row.shown)
        )
    return point


def _read_requirement(entry: Json) -> Requirement:
    quantity = REGISTRY.quantities.get(entry["quantity"])
    if quantity is None:
        raise InputError(f"{entry['quantity']!r:.60} is no quantity that can be required")
    limits = {
        side: read_number(entry[side], f"the requirement on {quantity.name}", quantity.unit)
        for side in ("at_least", "at_most")
        if side in entry
    }
    return Requirement(quantity.name, **limits)


def _read_spread(name: str, entry: Json) -> Spread:
    shown = INPUTS[name].shown if name in INPUTS else "1"
    unit = "1" if entry["kind"] in ("lognormal", "direction") else shown
    return Spread(entry["kind"], read_number(entry["width"], f"the scatter of {name}", unit))


def _read_unknown(name: str, entry: Json) -> Unknown:
    unit = INPUTS[name].shown if name in INPUTS else "1"
    ends = (read_number(entry[end], f"the range of {name}", unit) for end in ("low", "high"))
    return Unknown(*ends)


def _design(record: Json) -> Design:
    return Design(
        point=_read_point(record["inputs"]["given"]),
        requirements=tuple(_read_requirement(entry) for entry in record["requirements"]),
        scatter={name: _read_spread(name, entry) for name, entry in record["scatter"].items()},
        correlation={pair: value_of(value, "1") for pair, value in record["correlation"].items()},
        unknowns={name: _read_unknown(name, entry) for name, entry in record["unknowns"].items()},
        origins={name: Origin(**entry) for name, entry in record["origins"].items()},
        passing=value_of(record["passing"], "1") if "passing" in record else None,
        name=record["name"],
        note=record["note"],
        decision=Decision(**record["decision"]),
        data=record["data"],
        built=tuple(read_built(entry) for entry in record.get("measured", ())),
        **record["records"],
    )
