"""Parameters of a spectrum's fit: what each number means, where it starts, how far it may go."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from .data import Spectrum
from .engine import Parameter
from .noise import Array, Noise
from .spectrum_model import Line, line_counts, split_width, strongest_box, total_width

#: Widest line over its wavelength.
WIDEST = 0.5


@dataclass(frozen=True, eq=False)
class Guess:
    """Lines to begin with, the first of them the zero-phonon line; slow width, background."""

    lines: tuple[Line, ...]
    slow: float
    background: float


@dataclass(frozen=True, eq=False)
class Layout:
    """How a spectrum is parametrised.

    shape: voigt, lorentzian or gaussian. resolution: FWHM [m]. whole: whether the total width of the
    first line and its Lorentzian part stand in place of its fast and slow width.
    Parameters: area; shares of all lines but the last; centre; offsets of the others; fast widths;
    square of the slow width (so that it may come to rest at zero); background.
    """

    data: Spectrum
    shape: str
    resolution: float
    count: int
    whole: bool = False

    @property
    def names(self) -> list[str]:
        others = range(1, self.count)
        names = ["area", *(f"share{k}" for k in range(self.count - 1)), "centre"]
        names += [f"offset{k}" for k in others]
        names += ["total"] if self.whole else ["fast0"] * (self.shape != "gaussian")
        names += [f"fast{k}" for k in others]
        if self.shape != "lorentzian":
            names.append("sharpness" if self.whole else "slow")
        return [*names, "background"]

    def read(self, p: Array) -> Guess:
        """What the parameters mean."""
        given = dict(zip(self.names, p.tolist(), strict=True))
        centre = given["centre"]
        slow = math.sqrt(max(given.get("slow", 0.0), 0.0))
        fast = given.get("fast0", 0.0)
        if self.whole:
            sharpness = given.get("sharpness", 0.0 if self.shape == "gaussian" else 1.0)
            fast, slow = split_width(given["total"], sharpness, centre)
        shares = [given[f"share{k}"] for k in range(self.count - 1)]
        shares.append(max(1 - sum(shares), 0.0))
        lines = [Line(given["area"] * shares[0], centre, fast)]
        for k in range(1, self.count):
            place = centre + given[f"offset{k}"]
            lines.append(Line(given["area"] * shares[k], place, given[f"fast{k}"]))
        return Guess(tuple(lines), slow, given["background"])

    def model(self, p: Array) -> Array:
        """Expected counts at the points of the data."""
        found = self.read(p)
        return line_counts(
            self.data.wavelengths, found.lines, found.slow, self.resolution, found.background
        )

    def parameters(self, guess: Guess) -> list[Parameter]:
        """Parameters that start from a guess."""
        first = guess.lines[0]
        area = sum(line.area for line in guess.lines)
        width = max(total_width(first.fast, guess.slow, first.centre), spacing(self.data) / 4)
        values: dict[str, tuple[float, float, float, float]] = {
            "area": (area, 0.1 * area, 1e-9 * area, 1e9 * area),
            "centre": (first.centre, 0.1 * width, *_range(self.data, 0.0)),
            "fast0": (first.fast, 0.1 * width, 0.0, WIDEST * first.centre),
            "slow": (guess.slow**2, 0.1 * width**2, 0.0, (WIDEST * first.centre) ** 2),
            "total": (width, 0.1 * width, 1e-3 * spacing(self.data), WIDEST * first.centre),
            "sharpness": (min(first.fast / width, 1.0), 0.1, 0.0, 1.0),
            "background": self._background(guess.background, area),
        }
        for k, line in enumerate(guess.lines):
            own = max(line.fast, width)
            values[f"share{k}"] = (line.area / area, 0.05, 0.0, 1.0)
            if k:
                offset = line.centre - first.centre
                values[f"offset{k}"] = (offset, 0.1 * own, *_range(self.data, first.centre))
                values[f"fast{k}"] = (line.fast, 0.1 * own, 0.0, WIDEST * line.centre)
        return [Parameter(name, *values[name]) for name in self.names]

    def _background(self, level: float, area: float) -> tuple[float, float, float, float]:
        span = float(self.data.wavelengths[-1] - self.data.wavelengths[0])
        step = max(0.1 * abs(level), 0.005 * area / span)
        low = -math.inf
        if self.data.gain is not None and self.data.floor is not None:
            low = -float(np.min(self.data.floor / self.data.gain))
        return max(level, low + 0.1 * step), step, low, math.inf


def spacing(data: Spectrum) -> float:
    """Median distance of the samples [m]."""
    return float(np.median(np.diff(data.wavelengths)))


def _range(data: Spectrum, origin: float) -> tuple[float, float]:
    """How far a line may lie out: a tenth of the span beyond the data [m]."""
    low, high = float(data.wavelengths[0]), float(data.wavelengths[-1])
    return low - 0.1 * (high - low) - origin, high + 0.1 * (high - low) - origin


def first_guess(layout: Layout, noise: Noise) -> Guess:
    """One line and a background to begin with."""
    data = layout.data
    blocks = np.array_split(data.counts, max(min(20, data.counts.size // 4), 1))
    background = float(np.min([np.mean(block) for block in blocks]))
    variances = _variances(noise, np.full(data.counts.shape, max(background, 0.0)))
    net = data.counts - background
    centre, width, area, _ = strongest_box(data.wavelengths, net, variances, spacing(data))
    line = Line(area, centre, _part(layout, width))
    return Guess((line,), _slow(layout, width), background)


def with_line(layout: Layout, noise: Noise, guess: Guess) -> list[Guess]:
    """Guesses of one line more: where the residuals are largest, broad or narrow, or a line split.

    Each also with a smaller slow width, which may have grown to stand for the line that lacked.
    """
    data, lines = layout.data, guess.lines
    expected = line_counts(data.wavelengths, lines, guess.slow, layout.resolution, guess.background)
    net, variances = data.counts - expected, _variances(noise, expected)
    area = sum(line.area for line in lines)
    sets = []
    for widest in (1.0, 0.1):
        centre, width, more, _ = strongest_box(
            data.wavelengths, net, variances, 2 * spacing(data), widest
        )
        sets.append((*lines, Line(max(more, 1e-3 * area), centre, width)))
    broad = max(lines, key=lambda line: line.area)
    width = max(broad.fast, guess.slow)
    halves = [
        Line(broad.area / 2, broad.centre + side * width / 3, 0.6 * width) for side in (-1, 1)
    ]
    sets.append((*(line for line in lines if line is not broad), *halves))
    return [
        Guess(one, slow, guess.background)
        for one in sets
        for slow in (guess.slow, 0.3 * guess.slow)
    ]


def _variances(noise: Noise, expected: Array) -> Array:
    """Of the points about an expectation; even noise by the differences of neighbours."""
    if noise.even:
        rough = float(np.median(np.abs(np.diff(noise.values)))) / (0.6745 * math.sqrt(2))
        return np.full(expected.shape, max(rough**2, 1e-300))
    return noise.variance(expected)


def _part(layout: Layout, width: float) -> float:
    return {"voigt": 0.6, "lorentzian": 1.0, "gaussian": 0.0}[layout.shape] * width


def _slow(layout: Layout, width: float) -> float:
    part = {"voigt": 0.6, "lorentzian": 0.0, "gaussian": 1.0}[layout.shape] * width
    return math.sqrt(max(part**2 - layout.resolution**2, (0.1 * part) ** 2))
