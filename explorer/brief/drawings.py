"""The drawings of the brief as SVG: map, budget, angular pattern. Ink on paper, no script."""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from html import escape
from typing import Any

import numpy as np

from ..budget import Step
from ..curves import Angles
from ..inputs import INPUTS
from ..maps import Axis, Map
from ..registry import REGISTRY
from ..units import from_si, text

INK, QUIET, RULE, RED, AMBER, SEA = "#14222b", "#565f66", "#dedbd0", "#c0272d", "#e6b58a", "#1f6b7c"

#: Colours of the map from less to more.
SCALE = ("#f5f2ea", "#cfe3d8", "#9accbf", "#5fb0aa", "#338f93", "#1f6f80", "#1a526b", "#153a50")

#: Steps of colour on the map, and decades of a logarithmic scale at most.
BANDS, DECADES = 24, 3.0

#: Size of the map's plot and of its margins [px].
SIDE, LEFT, BELOW = 300, 58, 52


def map_drawing(drawn: Map, name: str, place: tuple[float, float], title: str) -> str:
    """One quantity over two inputs: filled bands, the region that meets everything, the point."""
    quantity = REGISTRY.quantities[name]
    values = np.asarray(drawn.values[name], dtype=float)
    log = quantity.log and bool((values[np.isfinite(values)] > 0).any())
    field, low, high = _scaled(values, log)
    parts = [
        (
            f'<svg xmlns="http://www.w3.org/2000/svg" role="img" viewBox="0 0 {LEFT + SIDE + 12} '
            f'{SIDE + BELOW + 44}" width="100%"><title>{escape(title)}</title>'
        ),
        f'<rect x="{LEFT}" y="6" width="{SIDE}" height="{SIDE}" fill="#fff"/>',
        *_bands(field, low, high),
        *(
            f'<path d="{_path(line)}" fill="none" stroke="{RED}" stroke-width="2.5"/>'
            for line in drawn.outline()
        ),
        f'<rect x="{LEFT}" y="6" width="{SIDE}" height="{SIDE}" fill="none" stroke="{INK}"/>',
        *_axis(drawn.x, across=True),
        *_axis(drawn.y, across=False),
        *_point(drawn, place),
        *_legend(low, high, log, quantity.unit),
        "</svg>",
    ]
    return "".join(parts)


def _scaled(values: Any, log: bool) -> tuple[Any, float, float]:
    """The field that is drawn, and its ends: the logarithm to ten where it spans decades."""
    with np.errstate(divide="ignore", invalid="ignore"):
        field = np.log10(values) if log else np.array(values)
    field[~np.isfinite(field)] = np.nan
    if np.isnan(field).all():
        return np.zeros_like(field), 0.0, 1.0
    high = float(np.nanmax(field))
    low = max(float(np.nanmin(field)), high - DECADES) if log else min(float(np.nanmin(field)), 0.0)
    return field, low, high if high > low else low + 1.0


def _colour(share: float) -> str:
    """The colour at a share of the scale."""
    place = min(max(share, 0.0), 1.0) * (len(SCALE) - 1)
    first = min(int(place), len(SCALE) - 2)
    ends = [[int(colour[k : k + 2], 16) for k in (1, 3, 5)] for colour in SCALE[first : first + 2]]
    mixed = [round(a + (b - a) * (place - first)) for a, b in zip(*ends, strict=True)]
    return "#" + "".join(f"{value:02x}" for value in mixed)


def _bands(field: Any, low: float, high: float) -> list[str]:
    """Filled bands of even colour."""
    import contourpy

    padded = np.pad(field, 1, mode="edge")  # cells reach to the frame
    clipped = np.ma.masked_invalid(np.clip(padded, low, high))
    maker = contourpy.contour_generator(z=clipped, fill_type=contourpy.FillType.OuterOffset)
    edges = np.linspace(low, high, BANDS + 1)
    edges[-1] += 1e-9 * max(1.0, abs(high))
    size = np.array(field.shape[::-1], dtype=float)
    found = []
    for index in range(BANDS):
        filled: Any = maker.filled(edges[index], edges[index + 1])
        polygons, offsets = filled
        rings = [
            _path(np.clip((points[a:b] - 0.5) / size, 0, 1)) + "Z"
            for points, starts in zip(polygons, offsets, strict=True)
            for a, b in itertools.pairwise(starts)
        ]
        if rings:
            colour = _colour((index + 0.5) / BANDS)
            found.append(
                f'<path d="{"".join(rings)}" fill="{colour}" stroke="{colour}" stroke-width="0.6" '
                'fill-rule="evenodd"/>'
            )
    return found


def _path(line: Any) -> str:
    """Fractions of the axes as the path of a drawing."""
    points = [f"{LEFT + SIDE * x:.1f} {6 + SIDE * (1 - y):.1f}" for x, y in line]
    return "M" + "L".join(points)


def _axis(axis: Axis, across: bool) -> list[str]:
    """Ticks, numbers and name of one axis."""
    entry = INPUTS[axis.name]
    unit = "" if entry.shown == "1" else f", {entry.shown}"
    label = escape(f"{entry.label} {entry.symbol}{unit}".strip())
    low, high = (from_si(end, entry.shown) for end in (axis.low, axis.high))
    parts = []
    for value in ticks(low, high, axis.log):
        share = (
            math.log(value / low) / math.log(high / low)
            if axis.log
            else (value - low) / (high - low)
        )
        words = _number(value, axis.log)
        if across:
            x = LEFT + SIDE * share
            parts.append(f'<path d="M{x:.1f} {6 + SIDE}v5" stroke="{INK}"/>')
            parts.append(_words(x, SIDE + 25, words, "middle"))
        else:
            y = 6 + SIDE * (1 - share)
            parts.append(f'<path d="M{LEFT} {y:.1f}h-5" stroke="{INK}"/>')
            parts.append(_words(LEFT - 8, y + 4, words, "end"))
    middle = 6 + SIDE / 2
    if across:
        parts.append(_words(LEFT + SIDE / 2, SIDE + 42, label, "middle"))
    else:
        turned = f'transform="rotate(-90 12 {middle})"'
        parts.append(
            f'<text x="12" y="{middle}" text-anchor="middle" font-size="12" fill="{INK}" {turned}>{label}</text>'
        )
    return parts


def ticks(low: float, high: float, log: bool) -> list[float]:
    """Some round numbers within a range."""
    if log:
        powers = range(math.ceil(math.log10(low) - 1e-9), math.floor(math.log10(high) + 1e-9) + 1)
        if len(powers) > 1:
            return [10.0**power for power in powers][:: max(1, math.ceil(len(powers) / 6))]
    power = 10.0 ** math.floor(math.log10((high - low) / 3))
    step = max(size * power for size in (1, 2, 5) if size * power <= (high - low) / 3 * 1.000001)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return [float(f"{k * step:.12g}") for k in range(first, last + 1) if not log or k > 0]


def _number(value: float, log: bool) -> str:
    raised = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
    power = math.log10(value) if log and value > 0 else 0.0
    if log and abs(power - round(power)) < 1e-9 and not -2 <= power <= 3:
        return f"10{str(round(power)).translate(raised)}"
    return f"{value:g}".replace("-", "−")


def _words(x: float, y: float, words: str, anchor: str, colour: str = INK, size: int = 12) -> str:
    return (
        f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" font-size="{size}" '
        f'fill="{colour}">{words}</text>'
    )


def _point(drawn: Map, place: tuple[float, float]) -> list[str]:
    """The design point, where it lies on the map."""
    x, y = (
        float(axis.fraction(value)) for axis, value in zip((drawn.x, drawn.y), place, strict=True)
    )
    if not (0 <= x <= 1 and 0 <= y <= 1):
        return []
    centre = f'cx="{LEFT + SIDE * x:.1f}" cy="{6 + SIDE * (1 - y):.1f}"'
    return [
        f'<circle {centre} r="8" fill="#fff" stroke="{RED}" stroke-width="3"/>',
        f'<circle {centre} r="3" fill="{RED}"/>',
    ]


def _legend(low: float, high: float, log: bool, unit: str) -> list[str]:
    """The colours and what their ends stand for."""
    top, height, steps = SIDE + BELOW + 8, 9, 40
    width = SIDE / steps
    cells = [
        f'<rect x="{LEFT + k * width:.1f}" y="{top}" width="{width + 0.3:.1f}" height="{height}" '
        f'fill="{_colour((k + 0.5) / steps)}"/>'
        for k in range(steps)
    ]
    ends = [10.0**end if log else end for end in (low, high)]
    names = [escape(text(end, unit, 2)) for end in ends]
    return [
        *cells,
        _words(LEFT, top + 24, names[0], "start"),
        _words(LEFT + SIDE, top + 24, names[1], "end"),
    ]


def budget_drawing(rows: Sequence[Step]) -> str:
    """Photons per second after each step, on a logarithmic scale."""
    totals = [row.total for row in rows if row.total > 0]
    if not totals:
        return ""
    high = max(totals)
    low = min(*totals, high / 10) / 1.5
    line, names, width = 21, 150, 250
    parts = [
        (
            f'<svg xmlns="http://www.w3.org/2000/svg" role="img" viewBox="0 0 {names + width + 62} '
            f'{line * len(rows) + 4}" width="100%"><title>Photons per second after each step</title>'
        )
    ]
    for index, row in enumerate(rows):
        y = index * line
        share = math.log(row.total / low) / math.log(high / low) if row.total > 0 else 0.0
        length = width * share
        words = escape(text(row.total, "1/s"))
        inside = length > 80
        factor = "" if row.factor is None or row.factor > 0.9995 else text(row.factor, "%")
        parts += [
            _words(names - 8, y + 15, escape(row.step), "end"),
            f'<rect x="{names}" y="{y + 2}" width="{length:.1f}" height="{line - 4}" fill="{SEA}"/>',
            _words(
                names + (6 if inside else length + 6),
                y + 15,
                words,
                "start",
                "#fff" if inside else INK,
            ),
            _words(names + width + 58, y + 15, escape(factor), "end", QUIET),
        ]
    return "".join([*parts, "</svg>"])


def angles_drawing(angles: Angles, half_angle: float) -> str:
    """The pattern over the angle, with the part inside the aperture shaded."""
    edge = math.degrees(angles.edge)
    degrees = np.degrees(angles.theta)
    power = np.asarray(angles.power) / max(float(np.max(angles.power)), 1e-300)
    width, height, left = 300, 90, 30

    def place(x: Any, y: Any) -> list[str]:
        return [
            f"{left + width * a / 90:.1f} {6 + height * (1 - b):.1f}"
            for a, b in zip(x, y, strict=True)
        ]

    inside = degrees <= edge
    shade = place(degrees[inside], power[inside])
    base = f"{left + width * min(edge, 90) / 90:.1f} {6 + height}L{left} {6 + height}Z"
    parts = [
        (
            f'<svg xmlns="http://www.w3.org/2000/svg" role="img" viewBox="0 0 {width + left + 14} '
            f'{height + 44}" width="100%"><title>Power over the angle; the aperture is shaded</title>'
        ),
        f'<path d="M{"L".join(shade)}L{base}" fill="{SEA}" opacity="0.25"/>'
        if len(shade) > 1
        else "",
        f'<path d="M{"L".join(place(degrees, power))}" fill="none" stroke="{RED}" stroke-width="2"/>',
        f'<path d="M{left} 6V{6 + height}H{left + width}" fill="none" stroke="{INK}"/>',
    ]
    for tick in (0, 30, 60, 90):
        parts.append(_words(left + width * tick / 90, height + 22, f"{tick}°", "middle"))
    said = f"angle from the axis; half-angle {escape(text(half_angle, 'rad'))}"
    parts.append(_words(left + width / 2, height + 38, said, "middle", QUIET))
    return "".join([*parts, "</svg>"])
