"""Random valid points over all inputs, made from the domains in `explorer.INPUTS`.

A fraction of the way through a domain is drawn for each number (log-uniform where the scale is), so
both ends and zero come up often. An input added to the table is drawn without a change here, unless
its domain has no end: then it needs a row in `REACH`.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from hypothesis import HealthCheck, Phase, settings
from hypothesis import strategies as st

from explorer.broadening import FORMS, Broadening
from explorer.evaluate import Evaluation
from explorer.inputs import INPUTS
from explorer.registry import Input, parameters
from explorer.sampling import LIMITING
from explorer.scatter import Spread, kinds_for
from explorer.whole import Lines, Pattern, Samples

Point = dict[str, Any]


def tried(count: int) -> Callable[[Any], Any]:
    """Settings of a property test: the same examples in every run, none kept on disk.

    No time limit an example, which would only fail on slow machines, and no shrinking, which would
    take minutes: the example that fails is printed as it is.
    """
    return settings(
        max_examples=count,
        derandomize=True,
        database=None,
        deadline=None,
        phases=[Phase.explicit, Phase.generate],
        report_multiple_bugs=False,
        suppress_health_check=list(HealthCheck),
    )


#: How far a domain without an end is tried, SI; and where a logarithmic scale starts above zero.
REACH: dict[str, tuple[float, float]] = {
    "fast_linewidth": (1e-18, math.nan),
    "slow_linewidth": (1e-18, math.nan),
    "biexciton_rate_ratio": (1e-3, 1e3),
    "bulk_rate_ratio": (1e-3, 1e3),
    "mode_length": (1e-3, 1e4),
    "other_modes": (1e-6, 1e3),
    "quenching": (1e-6, 1e6),
    "aperture_radius": (1e-9, 1e-2),
    "filter_width": (1e-15, 1e-4),
    "fibre_mode_radius": (1e-8, 1e-3),
    "magnification": (1e-3, 1e5),
    "repetition_rate": (1.0, 1e13),
    "excitations_per_pulse": (1e-6, 1e3),
    "saturation": (1e-6, 1e6),
    "background_per_pulse": (1e-9, 1e2),
    "background_rate": (1e-3, 1e12),
    "lateral_offset": (1e-12, math.nan),
    "axial_offset": (1e-12, math.nan),
    "fibre_offset": (1e-12, math.nan),
}

#: The model promises its digits for widths up to half the wavelength; the domain ends a little later.
WIDEST = 0.5

#: Largest numerical aperture with which a bare emitter can be watched from a given side.
SIDES = {"air": 1.0, "glass": 1.52}

#: Shapes of an array point and the shapes that its inputs may have.
SHAPES: tuple[tuple[tuple[int, ...], ...], ...] = (
    ((3,), (1,)),
    ((2, 1), (1, 2), (2, 2), (2,)),
    ((2, 1, 1), (1, 2), (2, 1), (1, 1, 2)),
)

_STEPS = 2**16
fractions = st.integers(0, _STEPS).map(lambda step: step / _STEPS)

#: Inputs that are numbers; those that the domains of others refer to come first.
NUMBERS = tuple(
    sorted(
        (name for name, entry in INPUTS.items() if not entry.whole),
        key=lambda name: name not in ("emission_wavelength", "medium_index"),
    )
)


def _end(end: Any, point: Mapping[str, Any]) -> Any:
    if not callable(end):
        return end
    return end(**{name: point.get(name, INPUTS[name].default) for name in parameters(end)})


def _ends(entry: Input, point: Mapping[str, Any]) -> tuple[Any, Any]:
    """Lowest and highest value tried, SI; arrays where they depend on arrays."""
    low, high = _end(entry.low, point), _end(entry.high, point)
    if entry.name == "numerical_aperture":
        side = SIDES.get(point.get("reference_side", ""), math.inf)
        high = np.where(np.asarray(high) > side, side, np.asarray(high) * (1 - 1e-12))
    if entry.name.endswith("_linewidth"):
        high = WIDEST * point.get("emission_wavelength", INPUTS["emission_wavelength"].default)
    start, stop = REACH.get(entry.name, (math.nan, math.nan))
    high = stop if not np.all(np.isfinite(high)) else high
    if not np.all(np.isfinite(low)):
        low = start
    assert np.all(np.isfinite(low) & np.isfinite(high)), f"{entry.name} needs a row in REACH"
    return low, high


def value_at(entry: Input, fraction: Any, point: Mapping[str, Any]) -> Any:
    """Value at a fraction 0..1 of the domain of an input, given the inputs its domain refers to."""
    low, high = _ends(entry, point)
    start = REACH.get(entry.name, (math.nan, math.nan))[0]
    f = np.asarray(fraction, dtype=float)
    if entry.infinite and np.all(f > 0.8):
        return np.float64(np.inf) if f.ndim == 0 else np.full(f.shape, np.inf)
    if np.all(low < 0):
        half = np.abs(2 * f - 1)
        first = start if math.isfinite(start) else np.asarray(high) * 1e-6
        size = np.where(half < 0.05, 0.0, first * (high / first) ** half)
        return np.where(f < 0.5, -size, size)
    if entry.scale.startswith("log") or math.isfinite(start):
        first = low if np.all(low > 0) else start
        spread = first * (high / first) ** f
        if entry.scale == "log or zero":
            spread = np.where(f < 0.1, 0.0, spread)
        if entry.infinite:
            spread = np.where(f > 0.8, np.inf, spread)
        return np.clip(spread, low, high if not entry.infinite else None)
    inside = np.maximum(f, 1 / _STEPS) if entry.low_open else f
    return np.clip(low + (high - low) * inside, low, high)


def lines() -> st.SearchStrategy[Lines]:
    """A spectrum of one to four lines, some light at an unknown wavelength."""
    row = st.tuples(st.integers(1, 100), fractions, fractions)

    def build(rows: list[tuple[int, float, float]], missing: float) -> Lines:
        total = sum(row[0] for row in rows) * (1 + missing)
        return Lines(
            [
                (
                    share / total,
                    (at - 0.5) * 150e-9,
                    # Towards the red any width of the point fits: it may be the point's own.
                    None
                    if w > 0.8 and at >= 0.5
                    else 0.0
                    if w < 0.1
                    else 1e-18 * (2e-8 / 1e-18) ** w,
                )
                for share, at, w in rows
            ]
        )

    return st.builds(build, st.lists(row, min_size=1, max_size=4), st.sampled_from((0.0, 0.5)))


def samples() -> st.SearchStrategy[Samples]:
    """A measured spectrum of two to nine samples."""

    def build(counts: list[int], width: float, centre: float) -> Samples:
        size = 1e-13 * (1e-7 / 1e-13) ** width
        offsets = (np.linspace(-0.5, 0.5, len(counts)) + (centre - 0.5)) * size
        return Samples(offsets, [*counts[:-1], max(counts[-1], 1)])

    return st.builds(
        build, st.lists(st.integers(0, 50), min_size=2, max_size=9), fractions, fractions
    )


def broadenings() -> st.SearchStrategy[Broadening]:
    """A law of one to three terms, each at most 3 THz at 1000 K."""

    def term(form: str, size: float, more: float) -> tuple[str, float, float]:
        if form == "power":
            exponent = 7 * more
            return form, 3e12 * 1e-9**size / 1000**exponent, exponent
        return form, 3e10 * 1e-9**size, 0.001 + 0.3 * more

    def build(rows: list[tuple[str, float, float]], low: float, high: float) -> Broadening:
        first = 0.1 * 3000**low
        return Broadening([term(*row) for row in rows], first, first * (1 + 100 * high))

    row = st.tuples(st.sampled_from(tuple(FORMS)), fractions, fractions)
    return st.builds(build, st.lists(row, min_size=1, max_size=3), fractions, fractions)


def patterns() -> st.SearchStrategy[Pattern]:
    """A given pattern of two to eight angles."""

    def build(powers: list[int], reach: float) -> Pattern:
        angles = np.linspace(0, 1, len(powers)) * (0.01 + reach * (np.pi / 2 - 0.01))
        return Pattern(angles, powers if any(powers) else [1.0] * len(powers))

    return st.builds(build, st.lists(st.integers(0, 50), min_size=2, max_size=8), fractions)


def wholes() -> st.SearchStrategy[Point]:
    """Some of the whole values."""
    kinds: dict[type, Callable[[], st.SearchStrategy[Any]]] = {
        Lines: lines,
        Samples: samples,
        Pattern: patterns,
        Broadening: broadenings,
    }
    chosen: dict[str, st.SearchStrategy[Any]] = {}
    for name, entry in INPUTS.items():
        if entry.choices:
            chosen[name] = st.sampled_from(entry.choices)
        elif entry.whole:
            chosen[name] = st.one_of(*(kinds[kind]() for kind in entry.types))
    return st.fixed_dictionaries({}, optional=chosen)


@st.composite
def points(draw: st.DrawFn, *, arrays: bool = False) -> Point:
    """A valid point: any of the inputs given, the others at their defaults.

    arrays: its numbers are scalars and arrays of mixed shapes that broadcast to at most 8 elements.
    """
    point = draw(wholes())
    shapes: tuple[tuple[int, ...], ...] = ()
    if arrays:
        shapes = draw(st.sampled_from(SHAPES))
    chosen = draw(st.lists(st.booleans(), min_size=len(NUMBERS), max_size=len(NUMBERS)))
    for name in (name for name, taken in zip(NUMBERS, chosen, strict=True) if taken):
        shape: tuple[int, ...] = draw(st.sampled_from(((), *shapes))) if shapes else ()
        size = math.prod(shape)
        drawn = (
            draw(st.lists(fractions, min_size=size, max_size=size)) if shape else draw(fractions)
        )
        fraction = np.reshape(drawn, shape) if shape else drawn
        value = value_at(INPUTS[name], fraction, point)
        point[name] = value if np.ndim(value) else float(value)
    Evaluation(point)  # a default that depends on what was drawn must be possible with it
    return point


#: Widths of a scatter over its natural size: still, modest, as wide as the domain, and absurd.
WIDTHS = (0.0, 1e-12, 1e-3, 0.1, 0.5, 2.0, 30.0, 1e6, 1e30, 1e250)


def scatters(point: Mapping[str, Any]) -> st.SearchStrategy[dict[str, Spread]]:
    """A scatter of one to five inputs of a point, of every kind that suits them."""
    work = Evaluation(point)

    def suits(name: str, kind: str) -> bool:
        centre = work.value(name)
        return bool(
            np.all(np.isfinite(centre)) and (kind != "lognormal" or np.all(np.asarray(centre) > 0))
        )

    def spread(name: str, kind: str, width: float) -> tuple[str, Spread]:
        size = 1.0 if kind == "lognormal" else float(np.max(np.abs(work.value(name))))
        return name, Spread(kind, width * (size or INPUTS[name].slider[1]))

    pairs = [(name, kind) for name in NUMBERS for kind in kinds_for(name) if suits(name, kind)]
    first = [pair for pair in pairs if pair[0] in LIMITING]  # half of the time: ranges follow them
    row = st.tuples(
        st.one_of(st.sampled_from(first), st.sampled_from(pairs)), st.sampled_from(WIDTHS)
    )
    return st.lists(row, min_size=1, max_size=5).map(
        lambda rows: dict(spread(name, kind, width) for (name, kind), width in rows)
    )


def element(point: Mapping[str, Any], shape: tuple[int, ...], index: tuple[int, ...]) -> Point:
    """The single design at one element of an array point; `shape` is the point's broadcast."""
    return {
        name: value if INPUTS[name].whole else float(np.broadcast_to(value, shape)[index])
        for name, value in point.items()
    }
