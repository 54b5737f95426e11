"""Several lines and measured spectra that wander, and their light inside a filter.

The total exchange rate stands in the single line's form; over slow wandering the outcome is averaged
over rigid shifts of the whole spectrum. Inside a filter the product of line and resonance is used:
right where R is far below γ, and said so by a caution.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import part, variant
from ..whole import Lines, Samples
from .wandering import average_over_samples, average_over_shifts
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


@part
def averaged_samples(
    *, measured: Any, detuning: Any, resonator_linewidth: Any, samples_average: Any, outcome_of: Any
) -> Any:
    """Of a measured spectrum that wanders as a whole: mean rate, share and lifetime."""

    def outcome(shift: Any) -> Any:
        return outcome_of(
            measured(
                lambda line, offset, width: line.overlap(-offset, width),
                detuning + shift,
                resonator_linewidth,
            )
        )

    return samples_average(outcome)


@part
def samples_average(
    *, measured: Any, detuning: Any, resonator_linewidth: Any, slow_deviation: Any
) -> Any:
    """A function that averages an outcome over the shifts of a measured spectrum.

    Right to 1e-6 and better for a resonator wider than two samples; for a narrower one as far as
    the samples' own noise allows (see `average_over_samples`). Seen at worst on a smooth spectrum
    that is cut at its ends: 3e-5 for shares, rates and light inside a filter, 1e-3 for the lifetime
    beside a resonance far narrower than the wandering. The nodes do not follow a filter: where the
    spectrum is over a hundred times narrower than its wandering, the light inside is right to 1e-2 of
    the whole only.
    """
    half = resonator_linewidth / 2

    def average(outcome: Any) -> Any:
        return average_over_samples(
            outcome=outcome,
            sigma=slow_deviation,
            step=np.maximum(measured(lambda line: line.step), half),
            centre=-detuning,
            feature=measured(lambda line: line.fwhm) / 2 + half,
        )

    return average


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


@variant("mode_rate", spectrum=Samples)
def mode_rate_of_samples(*, averaged_samples: Any) -> Any:
    """Mean rate of a measured spectrum that wanders as a whole."""
    return averaged_samples[0]


@variant("cavity_share", spectrum=Samples)
def share_of_samples(*, averaged_samples: Any) -> Any:
    """Share of the mode, a measured spectrum that wanders as a whole."""
    return averaged_samples[1]


@variant("device_lifetime", spectrum=Samples)
def lifetime_of_samples(*, averaged_samples: Any) -> Any:
    """Lifetime in the device, a measured spectrum that wanders as a whole."""
    return averaged_samples[2]


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


@part
def sampled_light(
    *, measured: Any, detuning: Any, resonator_linewidth: Any, filter_edges: Any
) -> Any:
    """A function of a rigid shift: overlap of a measured spectrum, and that inside the filter."""

    def light(shift: Any) -> Any:
        offset = detuning + shift
        total = measured(
            lambda line, centre, width: line.overlap(centre, width), -offset, resonator_linewidth
        )
        passed = measured(
            lambda line, centre, width, lower, upper: line.window(centre, width, lower, upper),
            -offset,
            resonator_linewidth,
            filter_edges[0] - offset,
            filter_edges[1] - offset,
        )
        return total, passed

    return light


@variant("mode_light_window", spectrum=Samples, slow_linewidth=0)
def window_of_still_samples(*, sampled_light: Any) -> Any:
    """Share of the mode's light inside the filter, a measured spectrum."""
    total, passed = sampled_light(0.0)
    return passed / total


@variant("mode_light_window", spectrum=Samples)
def window_of_samples(*, sampled_light: Any, weight_of: Any, samples_average: Any) -> Any:
    """The same where the spectrum wanders as a whole: weighted by the share of the mode."""

    def outcome(shift: Any) -> Any:
        total, passed = sampled_light(shift)
        share = weight_of(total)
        return share * passed / total, share

    passed, share = samples_average(outcome)
    return passed / share
