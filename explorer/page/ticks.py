"""Round numbers along the axis of a small plot."""

from __future__ import annotations

import math
from collections.abc import Sequence
from decimal import Decimal


def limits(low: float, high: float) -> tuple[float, float, list[float]]:
    """Ends of the axis just within a range, on round numbers that seldom change; and its ticks."""
    first, *_, last = multiples(low, high, tidy((high - low) / 16))
    step = tidy((high - low) / 1.6)
    marks = multiples(first, last, step)
    return first, last, marks if len(marks) > 1 else multiples(first, last, tidy(step / 1.5))


def multiples(low: float, high: float, step: float) -> list[float]:
    """Multiples of a step from low to high, both included."""
    first, last = math.ceil(low / step - 1e-6), math.floor(high / step + 1e-6)
    return [float(f"{i * step:.13g}") for i in range(first, last + 1)]


def written(values: Sequence[float]) -> list[str]:
    """Numbers in the fewest decimals, the same for all, that still name each as it is."""
    figures = [Decimal(f"{value:.13g}").normalize() for value in values]
    places = max(0, *(-int(figure.as_tuple().exponent) for figure in figures))
    return [f"{figure:.{places}f}" for figure in figures]


def tidy(value: float) -> float:
    """The next lower of 1, 2 and 5 times a power of ten."""
    power = 10.0 ** math.floor(math.log10(value))
    return max(size * power for size in (1, 2, 5) if size * power <= value)
