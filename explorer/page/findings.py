"""What a search found, in words and tables, in the few digits in which it would be taken."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from html import escape
from typing import Any

from ..design import Design
from ..domain import InputError
from ..inputs import INPUTS
from ..registry import REGISTRY
from ..search import Found, Front
from ..sentence import hundred
from ..units import text
from ..yields import yield_of
from .bind import typed
from .proposal import found_by_search, moved_to

#: Devices drawn to say how many of a found design would pass.
DEVICES = 1024

#: Below this share of devices a sturdier design is worth looking for.
STURDY = 0.8


def in_few_digits(asked: Design, found: Found) -> Found:
    """What was found from a design as it would be taken."""
    if not found.changes:
        return found
    short = found_by_search(asked, moved_to(asked, found.point))
    moved = {
        name: (before, float(short.evaluation.value(name)))
        for name, (before, _) in found.changes.items()
    }
    there = short.outcome(list(found.outcome))
    return replace(found, point=short.point, changes=moved, outcome=there)


def paragraph(words: str) -> str:
    """A sentence of the panel as HTML."""
    return f'<p class="x-first">{escape(words)}</p>' if words else ""


def said(found: Found) -> str:
    """What was found in a sentence; what it changes stands in the table."""
    if found.met and found.changes and found.value is None:
        return "Every requirement is met."
    start, with_, _ = found.reason.partition(", with ")
    return f"{start}." if with_ and found.changes else found.reason


def survival(asked: Design, point: Mapping[str, Any]) -> str:
    """How many devices of a found design would pass, scattering as the design that was asked about."""
    if not (asked.scatter and asked.requirements):
        return ""
    wanted = (asked.scatter, asked.requirements)
    try:
        passing = yield_of(point, *wanted, DEVICES, correlation=asked.correlation)
    except InputError:  # what cannot scatter there
        return ""
    words = f"{hundred(passing)} of 100 such devices would pass."
    if passing.share < STURDY:
        words += " To look for a sturdier one, choose “most devices that pass”."
    return f'<p class="x-plain">{escape(words[0].upper() + words[1:])}</p>'


def so_far(found: Found | Front) -> str:
    """How far a search is."""
    return f"searching … {found.done} of {found.starts}" if found.starts else "searching …"


def changes(moved: Mapping[str, tuple[float, float]]) -> str:
    """What a found design changes, as an HTML table."""
    rows = "".join(
        f"<tr><th scope=row>{escape(INPUTS[name].label)}</th>"
        f"<td>{escape(plain(name, before))} → <b>{escape(plain(name, after))}</b> "
        f"{escape('' if INPUTS[name].shown == '1' else INPUTS[name].shown)}</td></tr>"
        for name, (before, after) in moved.items()
    )
    return f'<table class="x-moves"><tbody>{rows}</tbody></table>' if rows else ""


def plain(name: str, value: float) -> str:
    """A value in four digits as its number box shows it: 11800, not 1.18e+04."""
    return typed(name, float(f"{value:.4g}"))


def outcome(found: Mapping[str, float]) -> str:
    """What the required quantities are there, as an HTML table."""
    rows = "".join(
        f"<tr><th scope=row>{escape(REGISTRY.shown(name).label)}</th>"
        f"<td>{escape(text(float(value), REGISTRY.shown(name).unit))}</td></tr>"
        for name, value in found.items()
    )
    return f'<table class="x-moves"><tbody>{rows}</tbody></table>' if rows else ""
