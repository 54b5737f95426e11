"""Several lines that wander, and their light inside a filter.

The total exchange rate stands in the single line's form; over slow wandering the outcome is averaged
over rigid shifts of the whole spectrum. Inside a filter the product of line and resonance is used:
right where R is far below γ, and said so by a caution.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import part, variant
from ..whole import Lines
from .wandering import average_over_shifts
from .window import outgoing_window


@part
def outcome_of(*, ideal_rate: Any, resonator_linewidth: Any, decay_elsewhere: Any) -> Any:
    """A function of the overlap: rate into the light that leaves, share of the mode, lifetime."""

    def outcome(overlap: Any) -> Any:
        exchange = ideal_rate * overlap
        rate = exchange * resonator_linewidth / (exchange + resonator_linewidth)
        total = decay_elsewhere + rate
        return rate, rate / total, 1 / total

    return outcome


@part
def weight_of(*, outcome_of: Any, ideal_rate: Any) -> Any:
    """A function of the overlap: weight of a shift in the light that leaves through the mode.

    The share of the mode; where nothing couples, its limit, which goes with the overlap.
    """

    def weight(overlap: Any) -> Any:
        return np.where(ideal_rate > 0, outcome_of(overlap)[1], overlap)

    return weight


@part
def lines_at(
    *, line_table: Any, resonator_linewidth: Any, decay_elsewhere: Any, detuning: Any
) -> Any:
    """A function of a rigid shift [rad/s]: (overlap, detuning, width of the line) of each line."""

    def rows(shift: Any) -> Any:
        for share, own, dephasing in line_table:
            coherence = decay_elsewhere + dephasing
            width = resonator_linewidth + coherence
            offset = detuning + own + shift
            overlap = share * resonator_linewidth / width / (1 + (2 * offset / width) ** 2)
            yield overlap, offset, coherence

    return rows


@part
def lines_average(
    *,
    line_table: Any,
    resonator_linewidth: Any,
    decay_elsewhere: Any,
    detuning: Any,
    slow_deviation: Any,
) -> Any:
    """A function that averages an outcome over the shifts of several lines.

    Nodes cluster where a line meets the resonance, and where it meets one of `edges` [rad/s].
    """

    def average(outcome: Any, edges: Any = ()) -> Any:
        centres, widths = [], []
        # A line without width crosses an edge in one step; nodes this close to it leave 1e-9.
        narrowest = 1e-9 * np.where(slow_deviation > 0, slow_deviation, resonator_linewidth)
        for _, own, dephasing in line_table:
            coherence = decay_elsewhere + dephasing
            centres.append(-(detuning + own))
            widths.append((resonator_linewidth + coherence) / 2)
            for edge in edges:
                centres.append(edge - (detuning + own))
                widths.append(np.maximum(coherence / 2, narrowest))
        return average_over_shifts(
            outcome=outcome, sigma=slow_deviation, centres=centres, widths=widths
        )

    return average


@part
def averaged_lines(*, lines_average: Any, lines_at: Any, outcome_of: Any) -> Any:
    """Of several lines that wander together: mean rate [1/s], share [1] and lifetime [s]."""
    return lines_average(lambda shift: outcome_of(sum(row[0] for row in lines_at(shift))))


@variant("mode_rate", spectrum=Lines)
def mode_rate_of_lines(*, averaged_lines: Any) -> Any:
    """Mean rate of several lines that wander together."""
    return averaged_lines[0]


@variant("cavity_share", spectrum=Lines)
def share_of_lines(*, averaged_lines: Any) -> Any:
    """Share of the mode, several lines that wander together."""
    return averaged_lines[1]


@variant("device_lifetime", spectrum=Lines)
def lifetime_of_lines(*, averaged_lines: Any) -> Any:
    """Lifetime in the device, several lines that wander together."""
    return averaged_lines[2]


def _lines_light(rows: Any, edges: Any, kappa: Any) -> Any:
    """Overlap of all lines, and of their light inside the filter."""
    total: Any = 0.0
    passed: Any = 0.0
    for overlap, offset, coherence in rows:
        inside = outgoing_window(
            lower=edges[0],
            upper=edges[1],
            kappa=kappa,
            coherence=coherence,
            g_squared=0.0,
            detuning=offset,
        )
        total, passed = total + overlap, passed + overlap * inside
    return total, passed


@variant("mode_light_window", spectrum=Lines, slow_linewidth=0)
def window_of_still_lines(*, lines_at: Any, filter_edges: Any, resonator_linewidth: Any) -> Any:
    """Share of the mode's light inside the filter, several lines."""
    total, passed = _lines_light(lines_at(0.0), filter_edges, resonator_linewidth)
    return passed / total


@variant("mode_light_window", spectrum=Lines)
def window_of_lines(
    *,
    lines_at: Any,
    lines_average: Any,
    weight_of: Any,
    filter_edges: Any,
    resonator_linewidth: Any,
) -> Any:
    """The same where the lines wander: weighted by the share of the mode."""

    def outcome(shift: Any) -> Any:
        total, passed = _lines_light(lines_at(shift), filter_edges, resonator_linewidth)
        share = weight_of(total)
        return share * passed / total, share

    # Cells without an edge take the resonance in its place: nodes are there already.
    edges = [np.where(np.isfinite(edge), edge, 0.0) for edge in filter_edges]
    passed, share = lines_average(outcome, edges)
    return passed / share
