"""Published devices predicted by the model, and held against what was measured.

A device is a resonator record with Q, V and a published enhancement; its `device` values say what is
known of its emitter and surroundings. Each enhancement is predicted as its source defines it. What
is not known is drawn within its published or usual range (see `unknowns`); nothing is fitted.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from .catalogue import resonators
from .design import Design, Unknown
from .evaluate import Evaluation
from .inputs import INPUTS
from .published import Record, Value
from .unknowns import DRAWS, INSIDE, drawn_point, spread

if TYPE_CHECKING:
    import pandas as pd

#: Share of the emission in the line that the resonator serves; the rest is light elsewhere.
LINE_SHARE: Final = "zero_phonon_share"

#: What a published enhancement is -> the quantity that predicts it, and how that is read.
MEANINGS: Final[Mapping[str, tuple[str, str]]] = {
    "measured total-rate ratio": (
        "rate_enhancement",
        "reference lifetime over the lifetime in the device",
    ),
    "measured zero-phonon-line enhancement": (
        "effective_purcell",
        "the mode's rate over the bulk rate of the line alone",
    ),
    "measured effective broadband value": (
        "effective_purcell",
        "the mode's rate over the whole bulk radiative rate",
    ),
    "calculated ideal": ("peak_purcell", "3Q/(4π²V), nothing else"),
}

#: Inputs of the emitter without which a measured enhancement is not predicted.
NEEDED: Final = ("lifetime", "quantum_yield", "fast_linewidth")

LABELS: Final = {
    "quality_factor": "Q",
    "mode_volume": "V",
    "lifetime": "the emitter's lifetime",
    "quantum_yield": "its yield",
    "fast_linewidth": "its linewidth",
    "meaning": "a rate: an intensity ratio holds the change of collection and pumping too",
}


@dataclass(frozen=True)
class Prediction:
    """One device. predicted: at the values as published; low, high: nine tenths of the draws.

    published_low, published_high: the published range, the value twice, or (printed as a lower bound) ∞. seen: whether the
    published enhancement was seen in its source. reason: why it is missed, where it is.
    """

    key: str
    name: str
    meaning: str
    published: float
    published_low: float
    published_high: float
    predicted: float
    low: float
    high: float
    seen: bool
    source: str
    reason: str

    @property
    def inside(self) -> bool:
        """Whether the published range and the predicted one meet."""
        return self.published_low <= self.high and self.published_high >= self.low


@dataclass(frozen=True)
class Unpredicted:
    """A device whose published enhancement is not predicted, and what is missing."""

    key: str
    name: str
    meaning: str
    published: float
    missing: str


def missing(record: Record) -> list[str]:
    """What a record lacks to be predicted, in words; empty where it lacks nothing."""
    if record.enhancement is None or record.enhancement.meaning not in MEANINGS:
        return [LABELS["meaning"]]
    known = record.values
    found = [name for name in ("quality_factor", "mode_volume") if name not in known]
    if record.enhancement.meaning != "calculated ideal":
        found += [name for name in NEEDED if name not in record.device]
    return [LABELS[name] for name in found]


def _devices() -> Iterator[Record]:
    return (record for record in resonators().values() if record.enhancement is not None)


def unpredicted() -> tuple[Unpredicted, ...]:
    """Devices with a published enhancement that lack a number. Raises CatalogueError."""
    rows = []
    for record in _devices():
        lacking = missing(record)
        if lacking and record.enhancement is not None:
            boost = record.enhancement
            words = ", ".join(lacking)
            rows.append(
                Unpredicted(record.key, record.name, boost.meaning, boost.value.value_si, words)
            )
    return tuple(rows)


@cache
def _prediction(key: str) -> Prediction:
    return predicted(resonators()[key])


def prediction_steps() -> Iterator[Prediction]:
    """Every device that lacks no number, one after the other; worked out once."""
    return (_prediction(record.key) for record in _devices() if not missing(record))


def predictions() -> tuple[Prediction, ...]:
    """All of them. Raises CatalogueError, InputError."""
    return tuple(prediction_steps())


def predicted(record: Record, count: int = DRAWS) -> Prediction:
    """The prediction of one device, `count` draws of what is not known. Raises InputError."""
    boost = record.enhancement
    if boost is None or missing(record):
        raise ValueError(f"{record.key} lacks {', '.join(missing(record)) or 'an enhancement'}")
    value = boost.value
    single = _enhancement(record, device_design(record).point, _share(record))
    many = _drawn(record, count)
    edge = (1 - INSIDE) / 2
    low, high = np.quantile(many, [edge, 1 - edge])
    bottom, top = value.ends or (value.value_si, value.value_si)
    return Prediction(
        record.key,
        record.name,
        boost.meaning,
        value.value_si,
        bottom,
        np.inf if boost.at_least else top,
        float(single),
        float(low),
        float(high),
        value.checked == "seen",
        value.reference.text if value.reference else value.source,
        boost.miss,
    )


def device_design(record: Record) -> Design:
    """The device as a design: the resonator, its emitter and surroundings, their ranges as unknowns."""
    values: dict[str, Value] = {
        name: value for name, value in {**record.values, **record.device}.items() if name in INPUTS
    }
    point: dict[str, Any] = {name: value.value_si for name, value in values.items()}
    if "emission_wavelength" not in point and "resonance_wavelength" in point:
        # On resonance, as such values are measured.
        point["emission_wavelength"] = point["resonance_wavelength"]
    unknowns = {name: Unknown(*value.ends) for name, value in values.items() if value.ends}
    return Design(point={**point, **record.choices}, unknowns=unknowns)


def _share(record: Record) -> float:
    value = record.device.get(LINE_SHARE)
    return value.value_si if value else 1.0


def _drawn(record: Record, count: int) -> NDArray[np.float64]:
    """The enhancement at `count` draws; the share of the line takes its low, middle and high part."""
    point = drawn_point(device_design(record), count)
    value = record.device.get(LINE_SHARE)
    shares: Any = _share(record)
    if value is not None and value.ends:
        low, high = value.ends
        shares = spread("quantum_yield", Unknown(low, high), _even(count))
    found = np.asarray(_enhancement(record, point, shares), dtype=np.float64)
    return np.broadcast_to(found, (count,))


def _even(count: int) -> NDArray[np.float64]:
    """Fractions 0..1, evenly spread and in no order that goes with another draw's."""
    return np.asarray((np.arange(count) * 0.6180339887498949 + 0.5) % 1.0, dtype=np.float64)


def _enhancement(record: Record, point: Mapping[str, Any], share: Any) -> Any:
    """The enhancement as its source defines it.

    A resonator on one line that holds a share of the emission couples to that share of the dipole:
    the alignment is multiplied by it. The enhancement of the line alone is then over its own rate.
    """
    assert record.enhancement is not None
    meaning = record.enhancement.meaning
    quantity = MEANINGS[meaning][0]
    alignment = Evaluation(point).value("dipole_alignment")
    work = Evaluation({**point, "dipole_alignment": np.minimum(alignment * share, 1.0)})
    value = work.result(quantity)
    return value / share if meaning == "measured zero-phonon-line enhancement" else value


def prediction_table() -> pd.DataFrame:
    """Predicted and missed devices as one table; SI. Raises CatalogueError, InputError."""
    import pandas as pd

    rows = [vars(row) | {"inside": row.inside, "missing": ""} for row in predictions()]
    rows += [vars(row) | {"inside": None} for row in unpredicted()]
    return pd.DataFrame(rows)
