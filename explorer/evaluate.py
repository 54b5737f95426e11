"""evaluate(): the one place where formulas meet values.

Domain checks and defaults are applied here and nowhere else. A formula runs once a call; what depends on
one axis of a map stays one-dimensional until it meets the other.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np

from .domain import (
    CLOSEST,
    FARTHEST,
    SPECTRUM_REACH,
    InputError,
    number_of,
    quoted,
    refuse_first,
    refuse_part,
    shown,
    whole_of,
)
from .inputs import BROADEST, INPUTS
from .registry import REGISTRY, Formula, Input, dependencies, parameters, split_view
from .whole import Samples

#: Index on either side of the reference's coverslip: no aperture reaches beyond it.
SIDES = {"air": 1.0, "glass": 1.52}

#: Inputs whose default follows others.
FOLLOWING = frozenset(name for name, entry in INPUTS.items() if callable(entry.default))


class Evaluation:
    """The values of one point, worked out as they are asked for.

    `value(name)` gives an input or a formula in its own, unexpanded shape. Made by `evaluate`, and
    by callers that ask for several things of one point in turn. Raises InputError when made with a
    bad point, KeyError for an unknown name.
    """

    def __init__(self, point: Mapping[str, Any]) -> None:
        self._values: dict[str, Any] = {}
        self._steps: dict[str, tuple[Formula, tuple[tuple[str, str], ...]]] = {}
        self._names(point)
        self.given = frozenset(point)
        self._take(point, list(point))

    def changed(self, entries: Mapping[str, Any], without: Iterable[str] = ()) -> Evaluation:
        """The evaluation of the same point with some entries given anew and others left out.

        What was worked out and depends on none of them is kept. Raises InputError.
        """
        self._names(entries)
        dropped = frozenset(without) - entries.keys()
        touched = frozenset({*dropped, *entries})
        work = object.__new__(Evaluation)
        work.given = frozenset({*(self.given - dropped), *entries})
        fixed = work.given & self.given & FOLLOWING
        work._values = _apart(self._values, touched, fixed)
        work._steps = _apart(self._steps, touched, fixed)
        # A given input whose domain follows one that changed is checked again.
        again = [name for name in work.given if not limits_of(name).isdisjoint(touched)]
        work._take(entries, [*again, *(name for name in entries if name not in again)])
        return work

    def adopt(self, other: Evaluation, apart: Iterable[str]) -> None:
        """Take over what another evaluation worked out; the two points may differ in `apart` only."""
        unlike = frozenset(apart)
        fixed = self.given & other.given & FOLLOWING
        self._values = _apart(other._values, unlike, fixed) | self._values
        self._steps = _apart(other._steps, unlike, fixed) | self._steps

    def _take(self, entries: Mapping[str, Any], checked: Iterable[str]) -> None:
        for name, given in entries.items():
            entry = INPUTS[name]
            self._values[name] = whole_of(entry, given) if entry.whole else number_of(entry, given)
        self.shape = self._common_shape()
        with np.errstate(all="ignore"):
            for name in checked:
                self._check_domain(INPUTS[name])
            if "broadening" in self.given and "fast_linewidth" not in self.given:
                self._check_law()
            if "reference_side" in self.given:
                self._check_side()
            self._check_spectrum()

    @staticmethod
    def _names(point: Mapping[str, Any]) -> None:
        if not isinstance(point, Mapping):
            raise InputError(f"a point maps input names to values; got {type(point).__name__}")
        for name in point:
            if name not in INPUTS:
                raise InputError(
                    f"{quoted(name)} is no input; the inputs are: {', '.join(sorted(INPUTS))}"
                )

    def _common_shape(self) -> tuple[int, ...]:
        shape: tuple[int, ...] = ()
        origin = ""
        for name, value in self._values.items():
            if name not in self.given or INPUTS[name].whole:
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

    def _end(self, end: Any, without: float) -> tuple[Any, str]:
        """An end of a domain, and the inputs it comes from in words; `without`: where it has none."""
        if not callable(end):
            return end if np.isfinite(end) else without, ""
        names = parameters(end)
        reason = f" (the limit comes from {' and '.join(names)})"
        return end(**{name: self.value(name) for name in names}), reason

    def domain(self, name: str) -> tuple[Any, Any]:
        """The least and the greatest value that a number may have beside the others, SI."""
        entry = INPUTS[name]
        low, high = self._end(entry.low, -FARTHEST)[0], self._end(entry.high, FARTHEST)[0]
        if name == "numerical_aperture" and "reference_side" in self.given:
            high = np.minimum(high, SIDES[self._values["reference_side"]])
        return low, high

    def _check_law(self) -> None:
        """The width that a broadening law gives is one that may be given."""
        width = self.value("fast_linewidth")
        self._check_domain(
            INPUTS["fast_linewidth"], width, ", as broadening and temperature give it"
        )

    def _check_domain(self, entry: Input, value: Any = None, origin: str = "") -> None:
        if entry.whole:
            return
        if value is None:
            value = self._values[entry.name]
        low, why_low = self._end(entry.low, -FARTHEST)
        high, why_high = self._end(entry.high, FARTHEST)
        under = value <= low if entry.low_open else value < low
        over = (value >= high if entry.high_open else value > high) & np.isfinite(value)
        finite = np.isfinite(value) | (entry.infinite & (value == np.inf))
        for bad in (~finite, under, over):
            if bad.any():
                refuse_first(entry, value, bad, low, high, why_low + why_high + origin)
        if entry.low_open and (value < 1 / FARTHEST).any():
            least = f", at least {shown(1 / FARTHEST, entry)}"
            refuse_first(entry, value, value < 1 / FARTHEST, low, high, least)

    def _check_side(self) -> None:
        """A side that is given: air cannot be watched beyond NA 1, nor glass beyond its index."""
        aperture = np.asarray(self.value("numerical_aperture"))
        side = self._values["reference_side"]
        limit = SIDES[side]
        if (aperture > limit).any():
            entry = replace(INPUTS["numerical_aperture"], high_open=False)
            why = f" where reference_side is {side!r}"
            refuse_first(entry, aperture, aperture > limit, 0.0, limit, why)

    def _check_spectrum(self) -> None:
        """Lines and samples lie at wavelengths near the emission, and no line is too broad."""
        spectrum = self.value("spectrum")
        wavelength = self.value("emission_wavelength")
        if spectrum is None or not np.size(wavelength):
            return
        centre = float(np.min(wavelength))
        rows: Any = (
            [(1.0, spectrum.offsets[end], 0.0) for end in (0, -1)]
            if isinstance(spectrum, Samples)
            else spectrum.lines
        )
        if isinstance(spectrum, Samples):
            gap, least = float(np.diff(spectrum.offsets).min()), CLOSEST * float(np.max(wavelength))
            refuse_part("a spacing", gap, gap >= least, least, SPECTRUM_REACH[1] * centre)
        nearest, farthest = (factor * centre for factor in SPECTRUM_REACH)
        for _, offset, width in rows:
            own = centre + offset
            if width is None:
                widest = np.max(self.value("fast_linewidth"), initial=0.0)
                width = float(widest)  # noqa: PLW2901  # the row's own
            refuse_part(
                "an offset", offset, nearest <= own <= farthest, nearest - centre, farthest - centre
            )
            refuse_part("a width", width, width < BROADEST * own, 0.0, BROADEST * own)

    def value(self, name: str) -> Any:
        """An input (given or filled in) or a formula, in its own shape; KeyError if unknown."""
        if name not in self._values:
            with np.errstate(all="ignore"):
                return self._get(canonical("", name))
        return self._values[name]

    def _get(self, name: str) -> Any:
        """The same, of a canonical name, without guarding against floating-point warnings."""
        values = self._values
        if name in values:
            return values[name]
        entry = INPUTS.get(name)
        if entry is not None and not callable(entry.default):
            value = entry.default if entry.whole else np.float64(entry.default)
        else:
            body, arguments = self._step(name)
            value = body(**{key: self._get(source) for key, source in arguments})
        values[name] = value
        return value

    def _step(self, name: str) -> tuple[Formula, tuple[tuple[str, str], ...]]:
        """The body that works out a formula here, and where each of its arguments comes from."""
        step = self._steps.get(name)
        if step is None:
            step = self._steps[name] = self._chosen(name)
        return step

    def _chosen(self, name: str) -> tuple[Formula, tuple[tuple[str, str], ...]]:
        if name in INPUTS:
            return sourced(INPUTS[name].default, "")
        prefix, inner = ("", name) if name in REGISTRY.nodes else split_view(name)
        for when, body in REGISTRY.nodes[inner].bodies:
            if all(self._matches(key, wanted) for key, wanted in when.items()):
                return sourced(body, prefix)
        raise KeyError(name)

    def _matches(self, name: str, wanted: Any) -> bool:
        value = self._get(name)
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
                value = np.where(
                    empty, "" if np.asarray(value).dtype.kind == "U" else np.nan, value
                )
        return value


def _apart(known: dict[str, Any], touched: frozenset[str], fixed: frozenset[str]) -> dict[str, Any]:
    """What was worked out and reaches none of the touched inputs; `fixed`: no default is followed."""
    return {
        name: entry
        for name, entry in known.items()
        if dependencies(name, fixed).isdisjoint(touched)
    }


@cache
def limits_of(name: str) -> frozenset[str]:
    """Inputs that the domain of an input follows."""
    ends = (INPUTS[name].low, INPUTS[name].high)
    return frozenset(key for end in ends if callable(end) for key in parameters(end))


@cache
def canonical(prefix: str, name: str) -> str:
    """The one name of a formula as seen from a view: shared ones lose the view's prefix."""
    if name in INPUTS or (not prefix and name in REGISTRY.nodes):
        return name
    if not prefix:
        return canonical(*split_view(name))
    replaced = REGISTRY.views[prefix]
    if name in replaced:
        return canonical("", replaced[name])
    own = not dependencies(name).isdisjoint(replaced)
    return f"{prefix}_{name}" if own else canonical("", name)


@cache
def sourced(body: Formula, prefix: str) -> tuple[Formula, tuple[tuple[str, str], ...]]:
    """A body with its arguments: parameter, canonical name of where it comes from."""
    return body, tuple((key, canonical(prefix, key)) for key in parameters(body))


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
    return evaluated(Evaluation(point), wanted)


def evaluated(work: Evaluation, wanted: Iterable[str]) -> dict[str, Any]:
    """The same of a point that is being evaluated. Raises KeyError for an unknown wanted name."""
    names = [wanted] if isinstance(wanted, str) else list(wanted)
    public = REGISTRY.quantities.keys() | REGISTRY.cautions.keys()
    for name in names:
        if not isinstance(name, str) or (name not in public and name not in INPUTS):
            raise KeyError(
                f"{quoted(name)} is no quantity; the quantities are: {', '.join(sorted(public))}"
            )
    found = {}
    for name in names:
        if name in INPUTS:
            value = work.value(name)
            found[name] = value if INPUTS[name].whole else _finished(value, work.shape)
        else:
            found[name] = _finished(work.result(name), work.shape)
    return found
