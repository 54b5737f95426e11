"""Measured data, the fit through it and what is left over, as two small plots."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..measured.data import AngularPattern, Decay, Spectrum
from .plot import Curve, Frame
from .ticks import multiples, tidy, written

#: Stretches along x of which the least and the greatest are drawn, where there are more points.
STRETCHES = 700

#: Lowest count on a logarithmic scale: an empty bin is drawn there.
FLOOR = 0.5

#: Residuals are drawn up to this many standard deviations.
FARTHEST = 5.0


@dataclass(frozen=True)
class Drawing:
    """Frames, curves and words of the plot of the data and of that of the residuals (None: no fit)."""

    main: tuple[Frame, list[Curve], str]
    rest: tuple[Frame, list[Curve], str] | None


def drawing(data: Any, fit: Any = None) -> Drawing:
    """The plots of some data, with a fit where there is one."""
    x, y, label, words = _columns(data)
    logarithmic = isinstance(data, Decay)
    model = None if fit is None else np.asarray(fit.model, float)
    scale = 1.0 if logarithmic else 1.0 / max(float(np.max(y)), 1e-300)
    shown, line = y * scale, None if model is None else model * scale
    if logarithmic:
        shown, line = (
            None if values is None else np.log10(np.maximum(values, FLOOR))
            for values in (shown, line)
        )
    low = math.log10(FLOOR) if logarithmic else min(0.0, float(np.min(shown)))
    high = max(float(np.max(shown)), 1.0 if logarithmic else 0.0)
    top = high + 0.05 * (high - low)
    across = (float(x[0]), float(x[-1]))
    marks = _marks(*across)
    names = [name.replace("-", "−") for name in written(marks)]
    ticks = tuple(zip(marks, names, strict=True))
    smooth = isinstance(data, AngularPattern)  # nothing is fitted to it
    curves = [Curve(*_thinned(x, shown), *(("sea", 2.5) if smooth else ("quiet", 1.2)))]
    if line is not None:
        fitted = np.isfinite(line)
        curves.append(Curve(*_thinned(x[fitted], line[fitted]), "red", 2.5))
    frame = Frame(across, (low, top), ticks, _levels(logarithmic, top), label)
    said = f"{words}: {len(x)} points{', with the fit' if fit is not None else ''}"
    return Drawing((frame, curves, said), _rest(x, across, fit))


def _rest(x: Any, across: tuple[float, float], fit: Any) -> Any:
    """The residuals over their standard deviation."""
    if fit is None:
        return None
    left = np.clip(np.asarray(fit.residuals, float), -FARTHEST, FARTHEST)
    inside = np.isfinite(left)
    curves = [
        Curve(list(across), [0.0, 0.0], "ink", 1.0),
        Curve(*_thinned(x[inside], left[inside]), "quiet", 1.2),
    ]
    ticks = ((-3.0, "−3"), (0.0, "0"), (3.0, "3"))
    frame = Frame(across, (-FARTHEST, FARTHEST), (), ticks)
    return frame, curves, "Residuals of the fit over their standard deviation"


def _columns(data: Any) -> tuple[Any, Any, str, str]:
    """x in the unit that is shown, y, label of x, and the plot in words."""
    if isinstance(data, Spectrum):
        return data.wavelengths * 1e9, data.counts, "nm", "Spectrum"
    if isinstance(data, AngularPattern):
        return np.degrees(data.angles), data.powers, "degrees from the axis", "Angular pattern"
    factor, unit = _time_unit(float(np.max(np.abs(data.times))))
    words = "Decay" if isinstance(data, Decay) else "Coincidences"
    return data.times * factor, data.counts, unit, words


def _time_unit(largest: float) -> tuple[float, str]:
    """Factor and name of the unit of time that suits a plot."""
    for power, name in ((12, "ps"), (9, "ns"), (6, "µs"), (3, "ms")):
        if largest * 10.0**power < 2000:
            return 10.0**power, name
    return 1.0, "s"


def _marks(low: float, high: float) -> list[float]:
    return multiples(low, high, tidy((high - low) / 4))


def _levels(logarithmic: bool, top: float) -> tuple[tuple[float, str], ...]:
    """Ticks up the side: powers of ten, or parts of the largest value."""
    if logarithmic:
        raised = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")
        return tuple(
            (float(power), "1" if power == 0 else f"10{str(power).translate(raised)}")
            for power in range(math.floor(top) + 1)
        )
    return ((0.0, "0"), (0.5, "½"), (1.0, "1"))


def _thinned(x: Any, y: Any) -> tuple[Any, Any]:
    """A curve that looks the same with fewer points: least and greatest of each stretch."""
    if len(x) <= 2 * STRETCHES:
        return x, y
    edges = np.linspace(0, len(x), STRETCHES + 1).astype(int)[:-1]
    ends = np.append(edges[1:], len(x))
    low = np.minimum.reduceat(y, edges)
    high = np.maximum.reduceat(y, edges)
    middle = (x[edges] + x[ends - 1]) / 2
    return np.repeat(middle, 2), np.column_stack([low, high]).ravel()
