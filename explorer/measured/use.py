"""From measured data to a design: inputs with their intervals, and devices beside their predictions."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from ..built import KEPT, Built, Estimate, with_measurement
from ..design import Design, Origin, Unknown
from ..evaluate import Evaluation
from ..inputs import INPUTS

#: What places a device on the map, whether the design gives it or not.
PLACE = ("quality_factor", "mode_volume")

#: Where an interval reaches beyond an open end of a domain, this share of the value is its end.
LEAST = 1e-3


def with_measured(
    design: Design, values: Mapping[str, Any], file: str, digest: str, where: str = ""
) -> Design:
    """A design with inputs as they were measured, of origin "measured".

    values: input -> `Estimate`, whose interval becomes the range that is not known (as far as the
    input's domain reaches), or a plain SI number or whole value, which is known. file, digest: name
    and SHA-256 of the file, which the record names. where: how the values were found in it; the
    origin says both. Raises InputError.
    """
    plain = {name: getattr(value, "value", value) for name, value in values.items()}
    made = design.with_values(**plain)
    unknowns = dict(made.unknowns)
    for name, value in values.items():
        if isinstance(value, Estimate) and value.low < value.high:
            unknowns[name] = Unknown(*_within(made.evaluation, name, value))
    origin = Origin("measured", file, f"{file}: {where}" if where else file)
    made = replace(
        made, origins={**made.origins, **dict.fromkeys(values, origin)}, unknowns=unknowns
    )
    return replace(made, data=_still_named(made, {**design.data, file: digest}))


def _within(work: Evaluation, name: str, estimate: Estimate) -> tuple[float, float]:
    """An interval as far as the domain of an input reaches."""
    entry = INPUTS[name]
    first, last = (float(np.asarray(end)) for end in work.domain(name))
    low, high = max(estimate.low, first), min(estimate.high, last)
    if low == first and entry.low_open:
        low = first + LEAST * (estimate.value - first)
    if high == last and entry.high_open:
        high = math.nextafter(last, first)
    return min(low, estimate.value), max(high, estimate.value)


def with_device(
    design: Design,
    name: str,
    measured: Mapping[str, Estimate],
    file: str = "",
    digest: str = "",
) -> Design:
    """A design with what was measured of a device (quantity -> `Estimate`, SI).

    A new name is a device whose resonator is that of the design as it now stands; a known one keeps
    its resonator and takes the new values. Raises InputError.
    """
    point = {key: value for key, value in design.point.items() if key in KEPT}
    for key in PLACE:
        point.setdefault(key, float(design.evaluation.value(key)))
    made = replace(design, built=with_measurement(design.built, name, point, measured, file))
    return replace(
        made, data=_still_named(made, {**design.data, **({file: digest} if file else {})})
    )


def without_device(design: Design, name: str) -> Design:
    """A design without one of its measured devices; a name that is not there changes nothing."""
    made = replace(design, built=tuple(device for device in design.built if device.name != name))
    return replace(made, data=_still_named(made, design.data))


def _still_named(design: Design, data: Mapping[str, str]) -> dict[str, str]:
    """Hashes of the files that an input or a device comes from."""
    named = {origin.source for origin in design.origins.values() if origin.kind == "measured"}
    named.update(file for device in design.built for file in device.files)
    return {name: digest for name, digest in data.items() if name in named}


def predicted(design: Design, device: Built) -> dict[str, float]:
    """What the model says of the quantities that were measured of a device, SI.

    Its resonator as it was built, all else as the design now has it; not-a-number where the model
    has no answer. Raises InputError where that resonator does not go with the design.
    """
    work = design.evaluation.changed(device.point, without=KEPT - device.point.keys())
    return {name: float(np.asarray(work.result(name))) for name in device.measured}
