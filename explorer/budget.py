"""The budget: photons per second after each step, stream by stream."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from .domain import InputError
from .evaluate import Evaluation, voiding
from .physics.photons import STEPS, STREAMS

if TYPE_CHECKING:
    import pandas


@dataclass(frozen=True)
class Step:
    """One row: step, photons per second of each stream (none before the emission), their total,
    and the factor, the ratio of the total to the one before (None in the first row)."""

    step: str
    streams: Mapping[str, float]
    total: float
    factor: float | None


def budget_rows(work: Evaluation) -> list[Step]:
    """The rows of one design's budget; the last total is the detected rate.

    Where a caution leaves the photon rates without a number, no row has one.
    """
    if work.shape:
        raise InputError("a budget is of one design; give single numbers, no arrays")
    void = any(bool(work.value(mark)) for mark in voiding("budget_table"))
    rows: list[Step] = []
    for name, streams, total in work.value("budget_table"):
        now = float("nan") if void else float(total)
        before = rows[-1].total if rows else None
        factor = None if before is None else (now / before if before else float("nan"))
        split = {
            stream: float(value)
            for stream, value in zip(STREAMS, streams, strict=True)
            if not math.isnan(value) and not void
        }
        rows.append(Step(name, split, now, factor))
    return rows


def budget(point: Mapping[str, Any]) -> pandas.DataFrame:
    """Where the photons go: a table of streams and steps.

    point: one design, SI. Rows are the steps from the pulse (or the decay offered) to the detector;
    columns are the streams (photons per second; not-a-number before the emission), `total` and
    `factor`, the ratio of consecutive totals. The last total is `rate_detected`. Raises InputError.
    """
    import pandas

    rows = budget_rows(Evaluation(point))
    table = pandas.DataFrame(
        [{**row.streams, "total": row.total, "factor": row.factor} for row in rows],
        index=pandas.Index([row.step for row in rows], name="step"),
        columns=[*STREAMS, "total", "factor"],
    )
    return table.astype(float)


__all__ = ["STEPS", "STREAMS", "Step", "budget", "budget_rows"]
