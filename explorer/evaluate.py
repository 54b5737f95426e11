"""evaluate(): the one place where formulas meet values.

Domain checks and defaults live here and nowhere else. A formula runs once a call; what depends on
one axis of a map stays one-dimensional until it meets the other.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from . import units
from .inputs import INPUTS
from .registry import REGISTRY, Input, dependencies, parameters, split_view


class InputError(ValueError):
    """A point that cannot be evaluated: the message names input, value, unit and allowed range.

    `name` is the input at fault, or None if the fault is not one input's.
    """

    def __init__(self, message: str, name: str | None = None) -> None:
        super().__init__(message)
        self.name = name


def shown(value: float, entry: Input) -> str:
    """An SI value of an input as the page and the messages write it: '650 nm'."""
    if np.isnan(value):
        return "not-a-number"
    if np.isinf(value):
        return "∞" if value > 0 else "−∞"
    number = f"{units.from_si(value, entry.shown):.12g}"
    return number if entry.shown == "1" else f"{number} {entry.shown}"


def _allowed(entry: Input, low: float, high: float, reason: str = "") -> str:
    left = "above" if entry.low_open else "from"
    right = "below" if entry.high_open else "to"
    text = []
    if np.isfinite(low):
        text.append(f"{left} {shown(low, entry)}")
    if np.isfinite(high):
        text.append(f"{right} {shown(high, entry)}")
    if entry.infinite:
        text.append("or ∞")
    return (" ".join(text) or "any finite number") + reason


def _number(entry: Input, given: Any) -> NDArray[np.float64]:
    """A number as a float array; InputError for what is none."""
    if isinstance(given, np.ma.MaskedArray):
        raise InputError(f"{entry.name} is a masked array; give plain numbers", entry.name)
    if isinstance(given, str | bytes | bool | np.bool_ | Mapping) or given is None:
        raise InputError(f"{entry.name} = {given!r:.80} is not a number", entry.name)
    try:
        array = np.asarray(given)
    except (ValueError, TypeError) as error:
        raise InputError(f"{entry.name} is not a regular array of numbers", entry.name) from error
    if array.dtype.kind == "c":
        raise InputError(f"{entry.name} is complex; give real numbers", entry.name)
    if array.dtype.kind not in "iuf":
        raise InputError(f"{entry.name} = {given!r:.80} is not a number", entry.name)
    return array.astype(np.float64, copy=False)


def _refuse_first(entry: Input, value: NDArray[np.float64], bad: Any, allowed: str) -> None:
    bad = np.broadcast_to(bad, np.broadcast_shapes(np.shape(bad), value.shape))
    if not bad.any():
        return
    index = tuple(int(i) for i in np.unravel_index(int(np.argmax(bad)), bad.shape))
    number = float(np.broadcast_to(value, bad.shape)[index])
    place = f"[{', '.join(map(str, index))}]" if index else ""
    raise InputError(
        f"{entry.name}{place} = {shown(number, entry)} is outside its range: {allowed}", entry.name
    )


def _whole(entry: Input, given: Any) -> Any:
    if entry.choices:
        if isinstance(given, str) and given in entry.choices:
            return str(given)
        words = " or ".join(repr(word) for word in entry.choices)
        raise InputError(f"{entry.name} = {given!r:.80} is not one of {words}", entry.name)
    if type(given) in entry.types:
        return given
    names = " or ".join(kind.__name__ for kind in entry.types)
    raise InputError(f"{entry.name} = {given!r:.80} is no {names}", entry.name)


class Evaluation:
    """The values of one point, worked out as they are asked for.

    `value(name)` gives an input or a formula in its own, unexpanded shape. Made by `evaluate`, and
    by callers that ask for several things of one point in turn. Raises InputError when made with a
    bad point, KeyError for an unknown name.
    """

    def __init__(self, point: Mapping[str, Any]) -> None:
        self._values: dict[str, Any] = {}
        self._views: dict[str, _View] = {}
        self._names(point)
        for name, given in point.items():
            entry = INPUTS[name]
            self._values[name] = _whole(entry, given) if entry.whole else _number(entry, given)
        self.given = frozenset(point)
        self.shape = self._common_shape()
        with np.errstate(all="ignore"):
            for name in point:
                self._check_domain(INPUTS[name])
            self._check_side()

    @staticmethod
    def _names(point: Mapping[str, Any]) -> None:
        if not isinstance(point, Mapping):
            raise InputError(f"a point maps input names to values; got {type(point).__name__}")
        for name in point:
            if name not in INPUTS:
                raise InputError(
                    f"{name!r:.80} is no input; the inputs are: {', '.join(sorted(INPUTS))}"
                )

    def _common_shape(self) -> tuple[int, ...]:
        shape: tuple[int, ...] = ()
        origin = ""
        for name, value in self._values.items():
            if INPUTS[name].whole:
                continue
            try:
                shape = np.broadcast_shapes(shape, value.shape)
            except ValueError:
                raise InputError(
                    f"the shape {value.shape} of {name} does not fit the shape {shape} of {origin}",
                    name,
                ) from None
            if value.shape:
                origin = f"{origin}, {name}" if origin else name
        return shape

    def _end(self, end: Any) -> tuple[Any, str]:
        """An end of a domain, and the inputs it comes from in words."""
        if not callable(end):
            return end, ""
        names = parameters(end)
        reason = f" (the limit comes from {' and '.join(names)})"
        return end(**{name: self.value(name) for name in names}), reason

    def _check_domain(self, entry: Input) -> None:
        if entry.whole:
            return
        value = self._values[entry.name]
        low, why_low = self._end(entry.low)
        high, why_high = self._end(entry.high)
        ends = (float(np.max(low)), float(np.min(high))) if np.size(low) and np.size(high) else (0.0, 0.0)
        allowed = _allowed(entry, *ends, why_low + why_high)
        finite = np.isfinite(value) | (entry.infinite & (value == np.inf))
        _refuse_first(entry, value, ~finite, allowed)
        _refuse_first(entry, value, value <= low if entry.low_open else value < low, allowed)
        over = (value >= high if entry.high_open else value > high) & np.isfinite(value)
        _refuse_first(entry, value, over, allowed)

    def _check_side(self) -> None:
        """The bare reference: air cannot be watched beyond NA 1, nor glass beyond its index."""
        aperture = self.value("numerical_aperture")
        side = self.value("reference_side")
        limit = 1.0 if side == "air" else 1.52
        entry = INPUTS["numerical_aperture"]
        allowed = f"at most {limit:g} where reference_side is {side!r}"
        _refuse_first(entry, np.asarray(aperture), aperture > limit, allowed)

    def value(self, name: str) -> Any:
        """An input (given or filled in) or a formula, in its own shape; KeyError if unknown."""
        if name not in self._values:
            with np.errstate(all="ignore"):
                self._values[name] = self._worked_out(name)
        return self._values[name]

    def _worked_out(self, name: str) -> Any:
        if name not in INPUTS and name not in REGISTRY.nodes:
            return self._seen_as(name)
        if name in INPUTS:
            default = INPUTS[name].default
            if not callable(default):
                return default if INPUTS[name].whole else np.float64(default)
            return default(**{key: self.value(key) for key in parameters(default)})
        for when, body in REGISTRY.nodes[name].bodies:
            if all(self._matches(key, wanted) for key, wanted in when.items()):
                return body(**{key: self.value(key) for key in parameters(body)})
        raise KeyError(name)

    def _seen_as(self, name: str) -> Any:
        """A formula of another transition: the same formulas with some of them replaced."""
        prefix, inner = split_view(name)
        if prefix not in self._views:
            self._views[prefix] = _View(self, REGISTRY.views[prefix])
        return self._views[prefix].value(inner)

    def _matches(self, name: str, wanted: Any) -> bool:
        value = self.value(name)
        if isinstance(wanted, type):
            return isinstance(value, wanted)
        if wanted is None or isinstance(wanted, str):
            return bool(value == wanted)
        return bool(np.all(value == wanted))

    def result(self, name: str) -> Any:
        """A quantity or caution, NaN where it has no number, in its own shape."""
        value = self.value(name)
        if name in REGISTRY.cautions or REGISTRY.quantities[name].kind == "mask":
            return value
        for mask in voiding(name):
            empty = self.value(mask)
            if np.any(empty):
                value = np.where(empty, "" if np.asarray(value).dtype.kind == "U" else np.nan, value)
        return value


class _View(Evaluation):
    """The same point seen with some formulas replaced; what they do not touch is shared."""

    def __init__(self, parent: Evaluation, replaced: Mapping[str, str]) -> None:
        self._parent = parent
        self._replaced = replaced
        self._values = {}
        self._views = {}

    def value(self, name: str) -> Any:
        if name in self._replaced:
            return self._parent.value(self._replaced[name])
        if name in self._values or dependencies(name) & self._replaced.keys():
            return super().value(name)
        return self._parent.value(name)


@cache
def voiding(name: str) -> tuple[str, ...]:
    """The cautions marked 'no number' that can leave a quantity without one."""
    needs = dependencies(name)
    return tuple(mark.name for mark in REGISTRY.cautions.values() if needs & set(mark.voids))


def _finished(value: Any, shape: tuple[int, ...]) -> Any:
    """A result in the shape of the point; a plain number, word or truth value for one design."""
    array = np.asarray(value)
    if shape:
        return np.broadcast_to(array, shape)
    return array.reshape(()).item() if array.size == 1 else array


def evaluate(point: Mapping[str, Any], wanted: Iterable[str]) -> dict[str, Any]:
    """The wanted quantities of a point, by name.

    point: input name -> SI number, array (arrays broadcast) or whole value; absent inputs take
    their defaults. wanted: names of quantities, cautions or inputs. Returns numbers (words for a
    choice, truth values for a caution), or read-only arrays in the broadcast shape of the inputs.
    Not-a-number stands exactly where a caution marked "no number" is true.
    Raises InputError for a bad point, KeyError for an unknown wanted name.
    """
    names = [wanted] if isinstance(wanted, str) else list(wanted)
    public = REGISTRY.quantities.keys() | REGISTRY.cautions.keys()
    for name in names:
        if name not in public and name not in INPUTS:
            raise KeyError(f"{name!r} is no quantity; the quantities are: {', '.join(sorted(public))}")
    work = Evaluation(point)
    found = {}
    for name in names:
        if name in INPUTS:
            value = work.value(name)
            found[name] = value if INPUTS[name].whole else _finished(value, work.shape)
        else:
            found[name] = _finished(work.result(name), work.shape)
    return found
