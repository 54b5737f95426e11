"""A map as the canvas takes it: scales in shown units, lines, notes and hatching; knows no widget."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..design import Requirement
from ..inputs import INPUTS
from ..maps import FRONTIERS, Map
from ..question import Answer
from ..registry import REGISTRY
from ..sentence import met_by, quantity_label
from ..units import from_si, text
from ..yields import PASSING
from .backdrop import Drawn
from .canvas import AxisScale, ColourScale, Line, Mark, Picture
from .canvas import Label as Note

#: Most decades that a logarithmic colour scale spans by itself.
DECADES = 3.0

#: Most cautions that the hatching tells apart.
MASKS = 8

#: Devices that are shown at first: those nearest to the design's wavelength.
FIRST = 12


def picture_of(answer: Answer, drawn: Map, back: Drawn, own: tuple[Mark, ...] = ()) -> Picture:
    """Everything that the canvas draws for an answer; own: marks of measured devices."""
    question = answer.question
    name = question.shown if question.shown in drawn.values else next(iter(drawn.values))
    layers = question.layers
    scale = colour_scale(name, drawn, is_free(answer))
    cautioned, texts = masks(drawn) if "hatching" in layers else (None, ())
    border = drawn.outline()
    return Picture(
        values=coded(name, drawn.values[name]),
        x=axis_scale(drawn.x.name, drawn.x.low, drawn.x.high, drawn.x.log),
        y=axis_scale(drawn.y.name, drawn.y.low, drawn.y.high, drawn.y.log),
        colour=scale,
        ends_included=False,
        cautioned=cautioned,
        caution_texts=texts,
        holds=None if drawn.margin is None else drawn.margin >= 0,
        lines=(
            *iso_lines(name, drawn, scale, layers),
            *frontiers(drawn, layers),
            *outline(border),
        ),
        labels=notes(border, drawn, answer),
        bands=back.bands if "all_bands" in layers else tuple(b for b in back.bands if b.own),
        marks=own + published_marks(back, layers),
        top=back.top if "scales" in layers else None,
        right=back.right if "scales" in layers else None,
    )


def published_marks(back: Drawn, layers: frozenset[str]) -> tuple[Mark, ...]:
    """The published devices that these layers show."""
    if "all_marks" in layers:
        return back.marks
    return back.marks[:FIRST] if "marks" in layers else ()


def axis_scale(name: str, low: float, high: float, log: bool) -> AxisScale:
    """An axis of the picture in the unit that the input is shown in."""
    entry = INPUTS[name]
    unit = "" if entry.shown == "1" else entry.shown
    ends = (from_si(value, entry.shown) for value in (low, high))
    label = f"{entry.label} {entry.symbol}".strip()
    return AxisScale(label, *ends, unit=unit, log=log)


def coded(name: str, values: Any) -> Any:
    """Values as the canvas takes them: shown units, codes for words and masks."""
    quantity = REGISTRY.shown(name)
    if quantity.kind == "choice":
        codes = np.full(values.shape, np.nan)
        for code, word in enumerate(quantity.choices):
            codes[values == word] = code
        return codes
    if quantity.unit == "rad":
        return np.degrees(values)
    if quantity.unit == "%":
        return 100 * values
    return values


def colour_scale(name: str, drawn: Map, free: bool = False) -> ColourScale:
    """Limits of the colours from the map, rounded outwards to 1, 2, 5."""
    quantity = REGISTRY.shown(name)
    title = quantity_label(name, free)
    unit = {"1": "", "rad": "°"}.get(quantity.unit, quantity.unit)
    if quantity.kind == "choice":
        return ColourScale(title, 0, len(quantity.choices) - 1, categories=quantity.choices)
    if quantity.kind == "mask":
        return ColourScale(title, 0, 1, categories=("no", "yes"))
    if quantity.unit == "%":
        return ColourScale(title, 0.0, 100.0, "%")
    values = coded(name, drawn.values[name])
    finite = values[np.isfinite(values) & (values > 0 if quantity.log else True)]
    if finite.size == 0:
        return ColourScale(title, 0.1 if quantity.log else 0.0, 1.0, unit, quantity.log)
    low, high = float(finite.min()), float(finite.max())
    if quantity.log:
        high = _round(high, up=True)
        low = max(_round(low, up=False), high / 10**DECADES)
        return ColourScale(title, min(low, high / 10), high, unit, True)
    high = _round(high, up=True) if high > 0 else 1.0
    return ColourScale(title, 0.0 if low >= 0 else low, high, unit, False)


def _round(value: float, up: bool) -> float:
    power = 10.0 ** np.floor(np.log10(value) + 1e-12)
    steps = [step * power for step in (1, 2, 5, 10)]
    if up:
        return float(next(step for step in steps if step >= value * (1 - 1e-9)))
    return float(max(step for step in steps if step <= value * (1 + 1e-9)))


def levels(scale: ColourScale) -> list[float]:
    """Levels of iso-lines within a colour scale, in its unit, at most eight."""
    if scale.log:
        decades = np.arange(np.ceil(np.log10(scale.low)), np.floor(np.log10(scale.high)) + 1)
        found = [step * 10.0**decade for decade in decades for step in (1.0, 3.0)]
        found = [level for level in found if scale.low < level < scale.high]
        return found[-8:]
    step = _round((scale.high - scale.low) / 6, up=True)
    return [step * i for i in range(1, 20) if scale.low < step * i < scale.high][:8]


def iso_lines(name: str, drawn: Map, scale: ColourScale, layers: frozenset[str]) -> list[Line]:
    """Iso-lines of the shown quantity with their values written along."""
    quantity = REGISTRY.shown(name)
    if "iso" not in layers or quantity.kind != "number":
        return []
    wanted = levels(scale)
    factor = {"rad": np.pi / 180, "%": 0.01}.get(quantity.unit, 1.0)
    inside = [level * factor for level in wanted]
    return [
        Line("iso", tuple(paths), text(level, quantity.unit, 2), level=shown)
        for level, shown, paths in zip(inside, wanted, drawn.lines(name, inside), strict=True)
        if paths
    ]


def frontiers(drawn: Map, layers: frozenset[str]) -> list[Line]:
    """Lines on which the regime changes."""
    if "frontiers" not in layers:
        return []
    found = []
    for name, level, words in FRONTIERS:
        if name in drawn.values:
            paths = drawn.lines(name, [level])[0]
            if paths:
                found.append(Line("frontier", tuple(paths), words))
    return found


def outline(border: list[Any]) -> list[Line]:
    """Border of the region that meets everything."""
    return [Line("outline", tuple(border))] if border else []


def notes(border: list[Any], drawn: Map, answer: Answer) -> tuple[Note, ...]:
    """The requirement that binds, named at the longest stretch of the outline where it does."""
    if drawn.binding is None:
        return ()
    ny, nx = drawn.binding.shape
    best: dict[int, Any] = {}
    for path in border:
        inside = (path > 0.01).all(axis=1) & (path < 0.99).all(axis=1)
        column = np.clip((path[:, 0] * nx).astype(int), 0, nx - 1)
        line = np.clip((path[:, 1] * ny).astype(int), 0, ny - 1)
        which = np.where(inside, drawn.binding[line, column], -1)
        cuts = np.flatnonzero(np.diff(which)) + 1
        for run in np.split(np.arange(len(path)), cuts):
            index = int(which[run[0]])
            if index >= 0 and len(run) > len(best.get(index, ())):
                best[index] = path[run]
    entries = answer.question.design.requirements
    free = is_free(answer)
    return tuple(
        Note(*map(float, run[len(run) // 2]), wish(entries[index], free))
        for index, run in best.items()
        if index < len(entries)
    )


def wish(entry: Requirement, free: bool) -> str:
    """A requirement as the outline names it: 'Photons/s in the fibre ≥ 20 M/s'."""
    limit = text(entry.limit, REGISTRY.quantities[entry.quantity].unit, 2)
    return f"{quantity_label(entry.quantity, free)} {entry.sense} {limit}"


def masks(drawn: Map) -> tuple[np.ndarray | None, tuple[str, ...]]:
    """A bit a caution that holds somewhere on the map, and their names; the last may be of many."""
    found = {
        REGISTRY.cautions[name].label: values
        for name, values in drawn.values.items()
        if name in REGISTRY.cautions and values.any()
    }
    if len(found) > MASKS:
        rest = list(found)[MASKS - 1 :]
        others = np.logical_or.reduce([found.pop(name) for name in rest])
        found["another caution, see the list below"] = others
    if not found:
        return None, ()
    bits = sum(mask.astype("u1") << bit for bit, mask in enumerate(found.values()))
    return np.asarray(bits), tuple(found)


def is_free(answer: Answer) -> bool:
    """Whether the photons are wanted in free space, where no fibre is."""
    return bool(answer.values["destination"] == "free_space")


def passing_share(answer: Answer) -> float:
    """The share of devices that pass at the design point; not-a-number until it is worked out."""
    if answer.passing is not None:
        return float(answer.passing.share)
    design = answer.question.design
    if design.scatter and design.requirements:
        return float("nan")
    return 0.0 if met_by(design, answer.outcome) is False else 1.0  # every device is the design


def described(answer: Answer, drawn: Map) -> str:
    """The map in words, for screen readers."""
    quantity = REGISTRY.shown(answer.question.shown)
    value = answer.outcome.get(answer.question.shown)
    if quantity.name == PASSING:
        value = passing_share(answer)
    here = text(value, quantity.unit) if isinstance(value, float) else str(value)
    region = ""
    if drawn.margin is not None:
        share = float(np.mean(drawn.margin >= 0))
        region = f" {share:.0%} of the map meets every requirement."
    label = quantity_label(quantity.name, is_free(answer))
    return (
        f"Map of {label} over {INPUTS[drawn.x.name].label} and {INPUTS[drawn.y.name].label}."
        f" At the design point: {here}.{region} Arrow keys move the point."
    )
