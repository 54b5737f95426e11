"""Published enhancements beside their predictions, as a table and as a drawing (SVG)."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

from ..prediction import Prediction, Unpredicted
from ..units import text
from .look import INK, RED, SEA

#: Size of the drawing: a row, the names, the plot [px].
ROW, NAMES, WIDTH, TOP = 23, 330, 460, 30
LOWEST, HIGHEST = 0.5, 500.0

SHORT = {
    "measured total-rate ratio": "total rate",
    "measured zero-phonon-line enhancement": "line alone",
    "measured effective broadband value": "effective",
    "calculated ideal": "ideal",
}


def number(value: float) -> str:
    """An enhancement to three digits."""
    return "∞" if math.isinf(value) else text(value, "1", 3)


def span(low: float, high: float) -> str:
    """A range, or the one value it is."""
    if math.isinf(high):
        return f"≥ {number(low)}"
    return number(low) if low == high else f"{number(low)}–{number(high)}"


def _place(value: float) -> float:
    """Where a value lies across the drawing [px]."""
    inside = min(max(value, LOWEST), HIGHEST)
    return NAMES + WIDTH * math.log(inside / LOWEST) / math.log(HIGHEST / LOWEST)


def drawing(rows: Sequence[Prediction]) -> str:
    """Ranges of the predictions as bars, the published values as marks, on a logarithmic scale."""
    height = ROW * len(rows) + TOP + 34
    head = (
        f'<svg xmlns="http://www.w3.org/2000/svg" role="img" width="{NAMES + WIDTH + 20}" '
        f'height="{height}" viewBox="0 0 {NAMES + WIDTH + 20} {height}" font-family="sans-serif" '
        f'font-size="14" fill="{INK}"><title>Published enhancements and their predictions</title>'
    )
    parts = [head, '<rect width="100%" height="100%" fill="#fbfaf6"/>']
    for tick in (1, 10, 100):
        x = _place(tick)
        parts.append(
            f'<path d="M{x:.1f} {TOP - 6}V{height - 30}" stroke="#dedbd0"/>'
            f'<text x="{x:.1f}" y="{TOP - 12}" text-anchor="middle">{tick}</text>'
        )
    parts.append(
        f'<text x="{NAMES + WIDTH / 2}" y="{height - 12}" text-anchor="middle">enhancement; bar: '
        "predicted, tick: at the published values, mark: published</text>"
    )
    parts += [_bar(row, TOP + ROW * index + ROW / 2) for index, row in enumerate(rows)]
    return "".join(parts) + "</svg>\n"


def _bar(row: Prediction, y: float) -> str:
    low, high, mid = _place(row.low), _place(row.high), _place(row.predicted)
    first, last = _place(row.published_low), _place(row.published_high)
    there = _place(row.published)
    colour = INK if row.inside else RED
    name = row.name if len(row.name) <= 44 else f"{row.name[:43]}…"
    return (
        f'<text x="{NAMES - 10}" y="{y + 5:.1f}" text-anchor="end">{escape(name)}</text>'
        f'<path d="M{low:.1f} {y:.1f}H{max(high, low + 2):.1f}" stroke="{SEA}" stroke-width="9" opacity="0.45"/>'
        f'<path d="M{mid:.1f} {y - 6:.1f}V{y + 6:.1f}" stroke="{SEA}" stroke-width="3"/>'
        f'<path d="M{first:.1f} {y:.1f}H{last:.1f}" stroke="{colour}" stroke-width="2"/>'
        f'<circle cx="{there:.1f}" cy="{y:.1f}" r="5" fill="{colour if row.seen else "#fbfaf6"}" '
        f'stroke="{colour}" stroke-width="2"/>'
    )


def lines(rows: Sequence[Prediction]) -> list[tuple[str, ...]]:
    """The table: device, what the number is, published, predicted, range, verdict, source."""
    return [
        (
            row.name,
            SHORT[row.meaning],
            span(row.published_low, row.published_high) + ("" if row.seen else " (from memory)"),
            number(row.predicted),
            span(row.low, row.high),
            "inside" if row.inside else f"missed: {row.reason}",
            row.source,
        )
        for row in rows
    ]


HEADINGS = ("Device", "Number", "Published", "Predicted", "Range", "Verdict", "Source")


def html(rows: Sequence[Prediction], missing: Sequence[Unpredicted]) -> str:
    """Drawing, table and the list of what is not predicted, as HTML."""
    head = "".join(f"<th scope=col>{escape(word)}</th>" for word in HEADINGS)
    body = "".join(
        f"<tr><th scope=row>{escape(first)}</th>{''.join(f'<td>{escape(cell)}</td>' for cell in rest)}</tr>"
        for first, *rest in lines(rows)
    )
    listed = "".join(
        f"<li>{escape(row.name)} (published {number(row.published)}): {escape(row.missing)}</li>"
        for row in missing
    )
    return (
        f'{drawing(rows)}<table class="x-devices"><thead><tr>{head}</tr></thead><tbody>{body}</tbody>'
        f"</table><p>Not predicted, and what is missing:</p><ul>{listed}</ul>"
    )


def markdown(rows: Sequence[Prediction]) -> str:
    """The table for README."""
    every = [HEADINGS, ("---",) * len(HEADINGS), *lines(rows)]
    return "\n".join("| " + " | ".join(row) + " |" for row in every) + "\n"
