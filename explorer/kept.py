"""What a page keeps: its question and its shortlist as text, whole for the browser or short for a link.

Nothing that is worked out is kept. Text that comes back is checked like any file.
"""

from __future__ import annotations

import base64
import binascii
import zlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from .design import Design
from .domain import InputError
from .exact import RecordError, number_in, parse, serialise, value_of
from .inputs import INPUTS
from .maps import Axis
from .question import Question
from .record import LARGEST, design_of, given_of
from .schema import PAGE_FORMAT, VERSION, problems

Json = dict[str, Any]

#: Longest link [signs]: what every browser and most mail programs carry.
LONGEST_LINK = 8000

#: What a link begins with, after the sign that opens a fragment.
LINK = "q="

#: Inputs that hold measured data too long for a link: it names them by the hash of their file.
LONG = ("spectrum", "pattern")


@dataclass(frozen=True)
class Page:
    """A question, and kept designs by letter. missing: files (name -> SHA-256) that a link could not carry."""

    question: Question
    kept: Mapping[str, Design] = field(default_factory=dict)
    missing: Mapping[str, str] = field(default_factory=dict)


def page_text(page: Page) -> str:
    """A page as JSON text."""
    return serialise(_page(page))


def _page(page: Page) -> Json:
    question = page.question
    return {
        "format": PAGE_FORMAT,
        "version": VERSION,
        "design": given_of(question.design),
        "shown": {
            "quantity": question.shown,
            "x": _axis(question.x),
            "y": _axis(question.y),
            "layers": sorted(question.layers),
            "cut": list(question.cut or ()),
        },
        "kept": {letter: given_of(design) for letter, design in page.kept.items()},
    }


def _axis(axis: Axis) -> Json:
    unit = INPUTS[axis.name].shown
    ends = {end: number_in(getattr(axis, end), unit) for end in ("low", "high")}
    return {"input": axis.name, **ends, "log": axis.log}


def page_from(text: str | bytes, name: str = "what was kept") -> Page:
    """A page from its text. Raises RecordError, in one sentence, for what cannot be one."""
    content = text.encode() if isinstance(text, str) else text
    if len(content) > LARGEST:
        raise RecordError(f"{name} is larger than {LARGEST / 1e6:.0f} MB")
    record = parse(content, name)
    found = problems(record, page=True)
    if found:
        raise RecordError(f"{name} is no page of this tool: {found}")
    design = design_of(record["design"], name)
    kept = {letter: design_of(part, name) for letter, part in sorted(record["kept"].items())}
    shown = record["shown"]
    cut = shown["cut"]
    try:
        x, y = (_axis_from(shown[side]) for side in ("x", "y"))
        layers = frozenset(shown["layers"])
        pair = (cut[0], cut[1]) if len(cut) == 2 else None
        question = Question(design, shown["quantity"], x, y, layers, pair)
    except (InputError, RecordError) as error:
        raise RecordError(f"{name} holds what cannot be: {error}") from error
    return Page(question, kept)


def _axis_from(entry: Json) -> Axis:
    unit = INPUTS[entry["input"]].shown
    low, high = (value_of(entry[end], unit) for end in ("low", "high"))
    return Axis(entry["input"], low, high, log=entry["log"])


def link_of(question: Question) -> str:
    """A question as the fragment of an address, at most LONGEST_LINK signs.

    Measured spectra and patterns stay out: the link names the hash of their file. Raises InputError
    where it is longer all the same.
    """
    design = question.design
    long = [name for name in LONG if name in design.point and not _short(design.point[name])]
    record = _page(Page(question))
    for name in long:
        del record["design"]["inputs"]["given"][name]
    packed = zlib.compress(serialise(record).replace("\n", "").encode(), 9)
    link = LINK + base64.urlsafe_b64encode(packed).decode().rstrip("=")
    if len(link) > LONGEST_LINK:
        raise InputError(
            f"this question makes a link of {len(link)} signs, and at most {LONGEST_LINK} are safe: "
            "save the design instead, or shorten its note"
        )
    return link


def _short(value: Any) -> bool:
    return hasattr(value, "lines") or isinstance(value, str)


def from_link(link: str) -> Page:
    """The question of a link; `missing` names the measured files that it does not carry.

    Raises RecordError for anything else.
    """
    if not link.startswith(LINK) or len(link) > LONGEST_LINK:
        raise RecordError("the link is none of this tool, or was cut")
    code = link.removeprefix(LINK)
    try:
        packed = base64.b64decode(code + "=" * (-len(code) % 4), altchars=b"-_", validate=True)
        unpack = zlib.decompressobj()
        content = unpack.decompress(packed, LARGEST // 20)
        if not unpack.eof:
            raise RecordError("the link holds more than a link can hold, or was cut")
    except (binascii.Error, zlib.error, ValueError) as error:
        if isinstance(error, RecordError):
            raise
        raise RecordError("the link was cut or changed on its way") from error
    page = page_from(content, "the link")
    design = page.question.design
    lost = {
        origin.source: design.data.get(origin.source, "")
        for name, origin in design.origins.items()
        if name in LONG and name not in design.point
    }
    return Page(page.question, page.kept, lost)
