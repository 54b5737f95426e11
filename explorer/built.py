"""Devices that were built and measured: where they stand, and what was measured of them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from .domain import InputError, finite_number, quoted
from .frozen import Frozen
from .inputs import INPUTS, RESONATOR
from .registry import REGISTRY

#: Longest name of a device.
LONGEST_NAME = 80

#: Most devices that a design carries.
MOST = 50

#: Inputs of the resonator, which a device keeps as it was built.
KEPT = frozenset(entry.name for entry in RESONATOR if not entry.whole)


@dataclass(frozen=True)
class Estimate:
    """A fitted or measured number with the ends of its interval, in SI. Raises InputError.

    Infinite ends say that the data set no limit there.
    """

    value: float
    low: float
    high: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "value", finite_number(self.value, "a measured value"))
        low, high = float(self.low), float(self.high)
        if not low <= self.value <= high:
            raise InputError(
                f"a measured value lies within its interval; got {self.value:.6g} in {low:.6g} to {high:.6g}"
            )
        object.__setattr__(self, "low", low)
        object.__setattr__(self, "high", high)


@dataclass(frozen=True)
class Built:
    """A device that was built and measured.

    name: short, for the map and the tables. point: its resonator's inputs, SI; what it does not give
    follows the design. measured: quantity -> `Estimate`, SI. files: names of the measured files.
    Raises InputError.
    """

    name: str
    point: Mapping[str, float] = field(default_factory=dict)
    measured: Mapping[str, Estimate] = field(default_factory=dict)
    files: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not 0 < len(self.name.strip()) <= LONGEST_NAME:
            raise InputError(
                f"a device has a name of at most {LONGEST_NAME} signs; got {quoted(self.name)}"
            )
        if not self.name.isprintable():
            raise InputError("the name of a device holds a control character")
        for name in self.point:
            if name not in KEPT:
                raise InputError(f"{quoted(name)} is no number of a resonator that a device keeps")
        for name, estimate in self.measured.items():
            known = REGISTRY.quantities.get(name)
            if known is None or known.kind != "number":
                raise InputError(f"{quoted(name)} is no quantity that can be measured")
            if not isinstance(estimate, Estimate):
                raise InputError(f"what was measured of {name} is no Estimate")
        point = {
            name: finite_number(value, f"{INPUTS[name].label} of {self.name}")
            for name, value in self.point.items()
        }
        object.__setattr__(self, "point", Frozen(point))
        object.__setattr__(self, "measured", Frozen(dict(self.measured)))
        object.__setattr__(self, "files", tuple(self.files))


def with_measurement(
    built: tuple[Built, ...],
    name: str,
    point: Mapping[str, float],
    measured: Mapping[str, Estimate],
    file: str = "",
) -> tuple[Built, ...]:
    """Devices with what was measured of one of them; a new name is a new device.

    A device that is there keeps its place; quantities measured anew replace the old ones. Raises
    InputError, also for more than MOST devices.
    """
    for index, device in enumerate(built):
        if device.name == name:
            files = tuple(dict.fromkeys((*device.files, *([file] if file else []))))
            merged = Built(name, device.point, {**device.measured, **measured}, files)
            return (*built[:index], merged, *built[index + 1 :])
    if len(built) >= MOST:
        raise InputError(f"a design carries at most {MOST} measured devices")
    return (*built, Built(name, point, measured, (file,) if file else ()))
