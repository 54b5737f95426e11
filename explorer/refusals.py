"""Refusals in terms of axes: why a map or a cut does not fit a design, in labels and few digits."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import product
from typing import Any

from .design import written
from .domain import InputError
from .evaluate import Evaluation, limits_of
from .inputs import INPUTS
from .maps import Axis
from .registry import parameters


def beyond(axes: Mapping[str, Axis], point: Mapping[str, Any], error: InputError) -> str:
    """Why axes do not fit a design: 'The horizontal axis reaches 150 nm (Linewidth, slow), but …'.

    axes: what each is called in the sentence. error: what the evaluation said.
    """
    for corner in product((0, -1), repeat=len(axes)):
        placed = list(zip(axes.items(), corner, strict=True))
        cell = {axis.name: float(axis.values[at]) for (_, axis), at in placed}
        ends = {axis.name: axis.high if at else axis.low for (_, axis), at in placed}
        try:
            Evaluation({**point, **cell})
        except InputError as found:
            if found.name not in INPUTS:
                continue
            touched = {found.name, *_limiting(found.name)}
            reached = [
                f"{where} reaches {written(axis.name, ends[axis.name], 4)} "
                f"({INPUTS[axis.name].label})"
                for where, axis in axes.items()
                if axis.name in touched
            ]
            if reached:
                said = " and ".join(reached)
                return f"{said[0].upper()}{said[1:]}, {_limit(found.name, {**point, **cell}, ends)}"
    return str(error)


def _limiting(name: str) -> set[str]:
    """The inputs that the domain of an input follows."""
    if name == "spectrum":
        return {"emission_wavelength", "fast_linewidth"}
    return set(limits_of(name))


def _limit(name: str, point: Mapping[str, Any], ends: Mapping[str, float]) -> str:
    """The limit that an input passes where axes end: 'but must stay below 132 nm where …'."""
    entry = INPUTS[name]
    work = Evaluation({key: value for key, value in point.items() if key != name})
    known = {key: ends.get(key, work.value(key)) for key in _limiting(name)}
    low, high = (
        end(**{key: known[key] for key in parameters(end)}) if callable(end) else end
        for end in (entry.low, entry.high)
    )
    value = ends.get(name, point.get(name))
    if entry.whole or value is None or low < value < high:
        return f"which {entry.label.lower()} does not allow"
    side, end = ("below", high) if value >= high else ("above", low)
    must = f"must stay {side} {written(name, float(end), 4)}"
    if name not in ends:
        return f"but there {entry.label} {must}, and it is {written(name, float(value), 4)}"
    causes = [
        f"{INPUTS[key].label} is {written(key, float(value), 4)}"
        for key, value in known.items()
        if key not in ends
    ]
    return f"but {must}{' where ' if causes else ''}{' and '.join(causes)}"
