"""Measured spectra that wander as a whole, and their light inside a filter.

The overlap stands in the single line's form. Over slow wandering the outcome is averaged over rigid
shifts; `sampled_average` gives the one overlap that has the same outcome, within 2e-9 of the sum over
its shifts. That sum is right to 1e-9 for a resonator wider than two samples; for a narrower one as far
as the samples' own noise allows (see `sampled_shifts`). Seen at worst on a smooth spectrum that is cut
at its ends: 3e-6 for shares and rates, 2e-4 for the lifetime.
"""

from __future__ import annotations

from typing import Any

from ..registry import part, variant
from ..whole import Samples
from .sampled_average import wandering_overlap, wandering_window
from .sampled_still import still_overlap, still_window


@variant("spectral_overlap", spectrum=Samples)
def overlap_of_samples(*, measured: Any, detuning: Any, resonator_linewidth: Any) -> Any:
    """The same for a measured spectrum: the exact integral of its piecewise-linear form."""
    return measured(
        lambda line, offset, width: still_overlap(line, -offset, width),
        detuning,
        resonator_linewidth,
    )


@part
def share_strength(*, ideal_rate: Any, resonator_linewidth: Any, decay_elsewhere: Any) -> Any:
    """Share of the mode over what it misses, for an overlap of 1, without back-action [1]."""
    return (
        ideal_rate
        * ((decay_elsewhere + resonator_linewidth) / resonator_linewidth)
        / (decay_elsewhere)
    )


@part
def rate_strength(*, ideal_rate: Any, resonator_linewidth: Any) -> Any:
    """Rate into the mode over the rate at which it leaves, for an overlap of 1 [1]."""
    return ideal_rate / resonator_linewidth


@part
def wandering_samples(
    *, measured: Any, detuning: Any, slow_deviation: Any, resonator_linewidth: Any, ideal_rate: Any
) -> Any:
    """A function of a strength: rate [1/s] of the overlap that gives the averaged outcome."""

    def rate(strength: Any) -> Any:
        overlap = measured(
            lambda line, offset, sigma, width, c: wandering_overlap(
                line, detuning=offset, sigma=sigma, kappa=width, strength=c
            ),
            detuning,
            slow_deviation,
            resonator_linewidth,
            strength,
        )
        exchange = ideal_rate * overlap
        return exchange * resonator_linewidth / (exchange + resonator_linewidth)

    return rate


@variant("mode_rate", spectrum=Samples)
def mode_rate_of_samples(*, wandering_samples: Any, rate_strength: Any) -> Any:
    """Mean rate of a measured spectrum that wanders as a whole."""
    return wandering_samples(rate_strength)


@part
def share_rate(*, wandering_samples: Any, share_strength: Any) -> Any:
    """Rate [1/s] that, held still, gives the averaged share and lifetime of a measured spectrum."""
    return wandering_samples(share_strength)


@variant("cavity_share", spectrum=Samples)
def share_of_samples(*, share_rate: Any, decay_elsewhere: Any) -> Any:
    """Share of the mode, a measured spectrum that wanders as a whole."""
    return share_rate / (decay_elsewhere + share_rate)


@variant("device_lifetime", spectrum=Samples)
def lifetime_of_samples(*, share_rate: Any, decay_elsewhere: Any) -> Any:
    """Lifetime in the device, a measured spectrum that wanders as a whole."""
    return 1 / (decay_elsewhere + share_rate)


@variant("mode_light_window", spectrum=Samples, slow_linewidth=0)
def window_of_still_samples(
    *,
    measured: Any,
    detuning: Any,
    resonator_linewidth: Any,
    filter_edges: Any,
    spectral_overlap: Any,
) -> Any:
    """Share of the mode's light inside the filter, a measured spectrum."""
    passed = measured(
        lambda line, offset, width, lower, upper: still_window(
            line, -offset, width, lower - offset, upper - offset
        ),
        detuning,
        resonator_linewidth,
        *filter_edges,
    )
    return passed / spectral_overlap


@variant("mode_light_window", spectrum=Samples)
def window_of_samples(
    *,
    measured: Any,
    detuning: Any,
    slow_deviation: Any,
    resonator_linewidth: Any,
    filter_edges: Any,
    share_strength: Any,
) -> Any:
    """The same where the spectrum wanders as a whole: weighted by the share of the mode."""
    return measured(
        lambda line, offset, sigma, width, c, lower, upper: wandering_window(
            line, detuning=offset, sigma=sigma, kappa=width, strength=c, lower=lower, upper=upper
        ),
        detuning,
        slow_deviation,
        resonator_linewidth,
        share_strength,
        *filter_edges,
    )
