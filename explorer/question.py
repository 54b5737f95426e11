"""The question is one frozen value, and the answer to it another; `answers` derives it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

from .budget import Step
from .curves import Angles, Colours, Cut
from .design import Design
from .domain import InputError
from .inputs import INPUTS
from .limiting import Limits
from .maps import Axis, Map
from .registry import REGISTRY, parameters
from .sentence import Sentence
from .unknowns import Influence, Range
from .yields import PASSING, Yield

#: Quantities that a page always reads out.
READ_OUT = (
    "rate_in_fibre",
    "rate_at_lens",
    "rate_detected",
    "g2_zero",
    "half_angle",
    "collected_share",
    "brightness_gain",
    "rate_enhancement",
    "effective_purcell",
    "device_lifetime",
    "cavity_share",
    "indistinguishability",
    "regime",
)


@dataclass(frozen=True)
class Question:
    """A design, and what is shown of it: quantity, axes, layers of the map that are on, and a cut.

    cut: quantity and input of a curve through the point, or None. ranked: quantity whose unknowns
    are ranked, or ''.
    """

    design: Design = field(default_factory=Design)
    shown: str = "rate_in_fibre"
    x: Axis = field(default_factory=lambda: Axis("mode_volume", 1e-4, 1e3))
    y: Axis = field(default_factory=lambda: Axis("quality_factor", 3.0, 1e6))
    layers: frozenset[str] = frozenset({"outline", "bands", "marks"})
    cut: tuple[str, str] | None = None
    ranked: str = ""

    def __post_init__(self) -> None:
        if self.shown not in {*REGISTRY.quantities, PASSING}:
            raise InputError(f"{self.shown!r:.60} is no quantity")
        if self.ranked and getattr(REGISTRY.quantities.get(self.ranked), "kind", "") != "number":
            raise InputError(f"{self.ranked!r:.60} is no quantity whose unknowns can be ranked")
        if self.cut is not None:
            quantity, name = self.cut
            if quantity not in {*REGISTRY.quantities, PASSING} or name not in INPUTS:
                raise InputError(f"{self.cut!r:.80} names no quantity and input to cut along")
        if self.x.name == self.y.name:
            raise InputError(
                f"a map needs two different inputs; both are {self.x.name}", self.x.name
            )


@dataclass(frozen=True)
class Answer:
    """What the tool says to a question; `map` is None or of an older question until `whole`.

    values: every input of the design, given or filled in. outcome: quantities by name. cautions:
    names of those that hold. rows: the budget. width: of the emission [m]. half_angles: beam
    half-angle along the horizontal axis [rad], or None where that is not the mode volume. hint: the
    next step that the map shows. rest: a draft of the map is there, the whole one can wait. cut_fault:
    why there is no cut though one is asked for. ranges: of each quantity that is read out, from
    what is not known, and ranking: those unknowns by what they do; limits: what holds the
    ranked quantity back. passing: the devices that pass, and
    passing_range: the range that what is not known leaves their share. All five are None until worked
    out, which waits for a moment of rest. progress: of a map that is still being worked out, 0..1.
    """

    question: Question
    values: Mapping[str, Any]
    outcome: Mapping[str, Any]
    cautions: tuple[str, ...]
    rows: tuple[Step, ...]
    sentence: Sentence
    angles: Angles
    colours: Colours
    width: float
    half_angles: Any
    map: Map | None
    cut: Cut | None
    whole: bool
    hint: str = ""
    rest: bool = False
    cut_fault: str = ""
    ranges: Mapping[str, Range] | None = None
    ranking: tuple[Influence, ...] | None = None
    limits: Limits | None = None
    passing: Yield | None = None
    passing_range: Range | None = None
    progress: float | None = None


def default_axis(name: str, count: int = 256) -> Axis:
    """An axis over an input's slider range. Raises InputError for a whole value."""
    entry = INPUTS[name]
    low, high = entry.slider
    return Axis(name, low, high, log=entry.scale.startswith("log"), count=count)


def fitting_axis(design: Design, name: str, count: int = 256) -> Axis:
    """The same, ending where a design's other values let the input end. Raises InputError."""
    axis, entry = default_axis(name, count), INPUTS[name]
    low, high = (
        float(end(**{key: design.evaluation.value(key) for key in parameters(end)}))
        if callable(end)
        else end
        for end in (entry.low, entry.high)
    )
    return replace(axis, low=max(axis.low, low), high=min(axis.high, high))
