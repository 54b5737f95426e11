"""The brief: one page to print, with the question, the decision, the design and what is not known.

HTML that stands by itself: drawings are SVG in it, nothing is loaded, nothing runs. Text of people is
escaped.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from datetime import UTC, datetime
from html import escape
from typing import Any

from ..advice import record_cautions
from ..answers import Answers
from ..catalogue import references
from ..design import Design, written
from ..domain import InputError
from ..inputs import INPUTS
from ..measured.use import predicted
from ..question import Answer, Question
from ..registry import REGISTRY
from ..scatter import SPREADS
from ..sentence import MARKS, hundred, in_labels, quantity_label, verdict
from ..units import text
from ..version import __version__
from .drawings import angles_drawing, budget_drawing, map_drawing

STANDING = (
    "Planning estimates. Excitation lasers in this work are often class 3B or 4 (IEC 60825-1), some "
    "emitters contain toxic metals, some are cooled with cryogens: follow the laser-safety officer, local "
    "codes and the safety data sheets; where licensed practice is asked for, it decides."
)

STYLE = """
@page { size: A4; margin: 9mm; }
body { font: 11px/1.3 "Noto Sans", "Liberation Sans", Arial, "DejaVu Sans", sans-serif; color: #14222b;
  background: #fff; max-width: 190mm; margin: 0 auto; padding: 0 4px; }
h1 { font: 400 19px/1.2 "Noto Serif", "DejaVu Serif", Georgia, serif; margin: 0 0 2px; }
h2 { font-size: 12px; margin: 7px 0 2px; border-bottom: 1px solid #dedbd0; }
p, ul { margin: 2px 0; } ul { padding-left: 16px; }
table { border-collapse: collapse; } th { font-weight: 400; text-align: left; padding: 0 10px 0 0; }
td { padding: 0 10px 0 0; vertical-align: top; }
.said { font-size: 14px; font-weight: 600; } .met { color: #1f6b7c; } .missed { color: #c0272d; }
.quiet { color: #565f66; } .two { display: flex; gap: 16px; } .two > * { flex: 1 1 0; min-width: 0; }
.values { columns: 4; column-gap: 12px; font-size: 9px; line-height: 1.25; } .values div { break-inside: avoid; }
.sources { columns: 2; column-gap: 14px; font-size: 9px; line-height: 1.2; } section { break-inside: avoid; }
.map { max-width: 268px; }
.sources li { overflow-wrap: anywhere; }
svg text { font-family: "Noto Sans", "Liberation Sans", Arial, "DejaVu Sans", sans-serif; }
"""


def brief(question: Question | Design) -> str:
    """The brief of a design, or of a question (whose map it then draws), as HTML. Raises InputError."""
    asked = Question(design=question) if isinstance(question, Design) else question
    if REGISTRY.quantities.get(asked.shown) is None:
        asked = Question(asked.design, x=asked.x, y=asked.y)
    return brief_of(Answers().answer(asked))


def brief_of(answer: Answer) -> str:
    """The same of an answer that is there already; what it has not worked out is left out."""
    design = answer.question.design
    title = design.name or "Design of a single-photon source"
    parts = [
        _head(answer, title),
        _decision(design),
        f'<div class="two">{_wanted(answer)}{_unknown(answer)}</div>',
        f'<div class="two">{_map(answer)}<div>{_budget(answer)}{_angles(answer)}</div></div>',
        _measured(design),
        _cautions(answer),
        _values(answer),
        _sources(design),
    ]
    return (
        '<!DOCTYPE html><html lang="en"><head><meta charset="utf-8"><meta name="viewport" '
        'content="width=device-width"><meta http-equiv="Content-Security-Policy" content="default-src '
        f"'none'; style-src 'unsafe-inline'\"><title>{escape(title)}</title><style>{STYLE}</style></head>"
        f"<body>{''.join(parts)}</body></html>\n"
    )


def _section(title: str, *inside: str) -> str:
    body = "".join(inside)
    return f"<section><h2>{escape(title)}</h2>{body}</section>" if body else ""


def _listed(lines: Iterable[str]) -> str:
    items = "".join(f"<li>{escape(line)}</li>" for line in lines)
    return f"<ul>{items}</ul>" if items else ""


def _table(rows: Iterable[Sequence[str]]) -> str:
    body = "".join(
        f"<tr><th scope=row>{escape(first)}</th>{''.join(f'<td>{escape(cell)}</td>' for cell in rest)}</tr>"
        for first, *rest in rows
    )
    return f"<table><tbody>{body}</tbody></table>" if body else ""


def _head(answer: Answer, title: str) -> str:
    said = answer.sentence
    tone = {True: "met", False: "missed", None: "quiet"}[said.met]
    day = datetime.now(UTC).strftime("%d %B %Y").lstrip("0")
    note = answer.question.design.note
    return (
        f'<header><p class="quiet">{escape(day)} · explorer {escape(__version__)}</p>'
        f'<h1>{escape(title)}</h1><p class="said {tone}">{escape(said.headline)}</p>'
        f'<p class="quiet">{escape(said.detail)}</p>{f"<p>{escape(note)}</p>" if note else ""}</header>'
    )


def _decision(design: Design) -> str:
    found = design.decision
    rows = (("Decided by", found.who), ("Because", found.why), ("Open doubts", found.doubts))
    return _section("Decision", _table(row for row in rows if row[1]))


def _wanted(answer: Answer) -> str:
    design, free = answer.question.design, answer.values["destination"] == "free_space"
    rows = []
    for entry in design.requirements:
        unit, value = REGISTRY.quantities[entry.quantity].unit, answer.outcome[entry.quantity]
        rows.append(
            (
                quantity_label(entry.quantity, free),
                text(value, unit),
                f"{entry.sense} {text(entry.limit, unit)}",
                verdict(entry, value),
            )
        )
    if design.passing is not None:
        rows.append(("Devices that pass", _share(answer), f"≥ {100 * design.passing:.3g} %", ""))
    elif answer.passing is not None:
        rows.append(("Devices that pass", _share(answer), "", ""))
    return _section("Question: wanted and reached", _table(rows) or "<p>Nothing is required.</p>")


def _share(answer: Answer) -> str:
    found = answer.passing
    if found is None:
        return "not worked out"
    ends = f"{100 * float(found.low):.2g}–{100 * float(found.high):.2g}"
    return f"{hundred(found)} of 100 ({ends})"


def _unknown(answer: Answer) -> str:
    design = answer.question.design
    lines = [
        f"{INPUTS[name].label}: {written(name, range_.low, 4)} to {written(name, range_.high, 4)}"
        for name, range_ in design.unknowns.items()
        if range_.low < range_.high
    ]
    spread = [
        f"{INPUTS[name].label} scatters: {entry.kind}, {_width(name, entry)}"
        for name, entry in design.scatter.items()
    ]
    return _section("What is not known, and what scatters", _listed([*lines, *spread]))


def _width(name: str, entry: Any) -> str:
    if entry.kind == "direction":
        return "static random directions"
    words = (
        f"{100 * entry.width:.3g} %" if entry.kind == "lognormal" else written(name, entry.width, 4)
    )
    return f"{SPREADS[entry.kind]} {words}"


def _map(answer: Answer) -> str:
    drawn = answer.map
    name = answer.question.shown
    quantity = REGISTRY.quantities.get(name)
    if drawn is None or quantity is None or quantity.kind != "number" or name not in drawn.values:
        return ""
    place = (float(answer.values[drawn.x.name]), float(answer.values[drawn.y.name]))
    label = quantity_label(name, answer.values["destination"] == "free_space")
    words = f"{label}. Red line: everything that is wanted holds inside. Ring: this design."
    return _section(
        "Map",
        f'<div class="map">{map_drawing(drawn, name, place, f"Map of {label}")}</div>',
        f'<p class="quiet">{escape(words)}</p>',
    )


def _budget(answer: Answer) -> str:
    return _section("Where the photons go, per second", budget_drawing(answer.rows))


def _angles(answer: Answer) -> str:
    half = float(answer.outcome["half_angle"])
    return _section("Into what angles", angles_drawing(answer.angles, half))


def _measured(design: Design) -> str:
    rows = []
    for device in design.built:
        try:
            says = predicted(design, device)
        except InputError:
            says = {}
        for name, found in device.measured.items():
            unit = REGISTRY.quantities[name].unit
            ends = f"({text(found.low, unit)} to {text(found.high, unit)})"
            model = text(says[name], unit) if name in says else "none"
            label = f"{device.name}, {REGISTRY.quantities[name].label}"
            rows.append((label, f"{text(found.value, unit)} {ends}", f"predicted {model}"))
    return _section("Measured devices", _table(rows))


def _cautions(answer: Answer) -> str:
    design = answer.question.design
    lines = [REGISTRY.cautions[name].sentence for name in answer.cautions]
    lines += [sentence for _, sentence in record_cautions(design)]
    return _section("Cautions", f"<p>{escape(STANDING)}</p>", _listed(map(in_labels, lines)))


def _values(answer: Answer) -> str:
    design = answer.question.design
    rows = []
    for name, entry in INPUTS.items():
        value, origin = answer.values[name], design.origin(name)
        if value is None:
            continue
        words = written(name, value, 4)
        rows.append(f"<div>{MARKS[origin.kind]} {escape(entry.label)}: {escape(words)}</div>")
    key = " ".join(f"{mark} {kind}" for kind, mark in MARKS.items())
    return _section(
        "Assumptions and where they come from",
        f'<p class="quiet">{escape(key)}</p><div class="values">{"".join(rows)}</div>',
    )


def _sources(design: Design) -> str:
    known = references()
    keys = dict.fromkeys(
        origin.source for origin in design.origins.values() if origin.source in known
    )
    lines = [known[key].text for key in keys]
    lines += [f"{name}, SHA-256 {digest}" for name, digest in design.data.items()]
    body = _listed(lines)
    return _section("Sources of the values", f'<div class="sources">{body}</div>' if body else "")
