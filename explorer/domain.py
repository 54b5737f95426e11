"""What a value may be: numbers and whole values of inputs, their ranges, and how they are refused."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import units
from .registry import Input

#: Where a domain has no end of its own, SI: beyond it a formula could overflow, and no device is.
FARTHEST = 1e20

#: A line or a sample of a spectrum lies within these multiples of `emission_wavelength`.
SPECTRUM_REACH = (0.1, 10.0)

#: Closest spacing of samples over the wavelength; closer, rounding would make them one.
CLOSEST = 1e-14


class InputError(ValueError):
    """A point that cannot be evaluated: the message names input, value, unit and allowed range.

    `name` is the input at fault, or None if the fault is not one input's.
    """

    def __init__(self, message: str, name: str | None = None) -> None:
        super().__init__(message)
        self.name = name


def real_number(value: Any) -> float | None:
    """A real number of Python or NumPy as a float (∞ where it is too large); None for what is none."""
    if isinstance(value, bool) or not isinstance(value, int | float | np.integer | np.floating):
        return None
    try:
        return float(value)
    except OverflowError:
        return math.inf if value > 0 else -math.inf


def finite_number(value: Any, what: str) -> float:
    """A real, finite number as a float; InputError, naming `what`, for anything else."""
    number = real_number(value)
    if number is None:
        raise InputError(f"{what} = {quoted(value)} is not a number")
    if not math.isfinite(number):
        raise InputError(f"{what} = {number} is not a finite number")
    return number


def shown(value: float, entry: Input, digits: int = 12) -> str:
    """An SI value of an input as the page and the messages write it: '650 nm'."""
    if np.isnan(value):
        return "not-a-number"
    if np.isinf(value):
        return "∞" if value > 0 else "−∞"
    number = f"{units.from_si(value, entry.shown):.{digits}g}"
    return number if entry.shown == "1" else f"{number} {entry.shown}"


def allowed_range(entry: Input, low: float, high: float, reason: str = "") -> str:
    left = "above" if entry.low_open else "from"
    right = "to below" if entry.high_open else "to"
    text = f"{left} {shown(low, entry)} {right} {shown(high, entry)}"
    return text + (" or ∞" if entry.infinite else "") + reason


def number_of(entry: Input, given: Any) -> NDArray[np.float64]:
    """A number as a float array; InputError for what is none."""
    if isinstance(given, np.ma.MaskedArray):
        raise InputError(f"{entry.name} is a masked array; give plain numbers", entry.name)
    if isinstance(given, str | bytes | bool | np.bool_ | Mapping) or given is None:
        raise InputError(f"{entry.name} = {quoted(given)} is not a number", entry.name)
    try:
        # A whole number beyond 64 bits is a number too.
        array = np.asarray(float(given) if type(given) is int else given)
    except OverflowError as error:
        raise InputError(f"{entry.name} is a whole number too large to use", entry.name) from error
    except (ValueError, TypeError) as error:
        raise InputError(f"{entry.name} is not a regular array of numbers", entry.name) from error
    if array.dtype.kind == "c":
        raise InputError(f"{entry.name} is complex; give real numbers", entry.name)
    if array.dtype.kind not in "iuf":
        raise InputError(f"{entry.name} = {quoted(given)} is not a number", entry.name)
    return array.astype(np.float64, copy=False)


def quoted(given: Any) -> str:
    """Something that a person gave, on one line, cut where it is long, without inner workings."""
    if isinstance(given, np.ndarray):
        given = given.ravel()[:9].tolist()
    plain = given is None or isinstance(given, str | bytes | int | float | complex | list | tuple)
    text = " ".join(repr(given).split())
    if not (plain or isinstance(given, Mapping | set)) or " at 0x" in text:
        text = f"something of the kind {type(given).__name__!r}"
    return text if len(text) <= 80 else f"{text[:79]}…"


def refuse_first(
    entry: Input, value: NDArray[np.float64], bad: Any, low: Any, high: Any, why: str
) -> None:
    """InputError for the first element that is `bad`, of which there is one."""
    shape = np.broadcast_shapes(np.shape(bad), value.shape)
    bad = np.broadcast_to(bad, shape)
    index = np.unravel_index(int(np.argmax(bad)), shape)
    number, first, last = (float(np.broadcast_to(one, shape)[index]) for one in (value, low, high))
    # The place in the array as it was given, which may be smaller than the shape of the point.
    own = index[len(shape) - value.ndim :]
    steps = [str(int(at) if size > 1 else 0) for at, size in zip(own, value.shape, strict=True)]
    place = f"[{', '.join(steps)}]" if steps else ""
    text = shown(number, entry)
    if text in (shown(first, entry), shown(last, entry)):
        text = shown(number, entry, digits=17)
    raise InputError(
        f"{entry.name}{place} = {text} is outside its range: {allowed_range(entry, first, last, why)}",
        entry.name,
    )


def refuse_part(what: str, value: float, fits: bool, low: float, high: float) -> None:
    """InputError for an offset or a width of a spectrum that does not fit; lengths in m."""
    if not fits:
        number, first, last = (f"{length * 1e9:.6g} nm" for length in (value, low, high))
        raise InputError(
            f"spectrum has {what} of {number}, outside its range: from {first} to {last} (the limit "
            "comes from emission_wavelength)",
            "spectrum",
        )


def whole_of(entry: Input, given: Any) -> Any:
    if entry.choices:
        if isinstance(given, str) and given in entry.choices:
            return str(given)
        words = " or ".join(repr(word) for word in entry.choices)
        raise InputError(f"{entry.name} = {quoted(given)} is not one of {words}", entry.name)
    if type(given) in entry.types:
        return given
    names = " or ".join(kind.__name__ for kind in entry.types)
    raise InputError(f"{entry.name} = {quoted(given)} is no {names}", entry.name)
