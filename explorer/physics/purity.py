"""g2 at zero delay: how rarely two photons come at once."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import part, quantity, variant


@part
def detected_per_decay(*, transmitted: Any) -> Any:
    """Detected photons per exciton decay, φX [1]."""
    mode, other = transmitted(7)
    return mode + other


@part
def detected_per_pair(*, pair_transmitted: Any) -> Any:
    """Detected photons per biexciton decay, φB [1]."""
    mode, other = pair_transmitted(7)
    return mode + other


@quantity(
    "1",
    label="g²(0)",
    symbol="g²(0)",
    source="nair2011",
    group="photons",
    note="pulsed: same pulse over neighbouring pulses; continuous: zero delay",
)
def g2_zero(
    *,
    occupations: Any,
    period_decay: Any,
    detected_per_decay: Any,
    detected_per_pair: Any,
    background_per_pulse: Any,
    bright_share: Any,
) -> Any:
    r"""Coincidences of one pulse over those of neighbouring pulses.

    .. math:: g^2(0) = \frac{q (G + 2\mu b + b^2) + (1-q) b^2}{q (\mu + b)^2 + (1-q) b^2},
       \quad G = 2 q_B B_0 \varphi_X \varphi_B

    μ photons per pulse while on, b background per pulse, q share of the time on. Weak pumping:
    :math:`\varphi_B/\varphi_X` (Nair et al.).
    """
    _, gone, gone_b, _, both = period_decay
    in_x, in_b = occupations
    photons = in_x * gone * detected_per_decay + in_b * (
        gone_b * detected_per_pair + both * detected_per_decay
    )
    some = np.where(photons > 0, photons, 1.0)
    pure = 2 * in_b * both * (detected_per_decay / some) * (detected_per_pair / some)
    return blinking(pure, photons, background_per_pulse, bright_share)


def blinking(pure: Any, signal: Any, background: Any, on: Any) -> Any:
    """g2 of a source that is on for a share of the time, slowly against the delays compared.

    pure: g2 of the signal alone; signal, background: photons per pulse or per second. Only their
    shares of the whole are squared: the square of a faint signal would be lost as zero.
    """
    whole = np.where(signal + background > 0, signal + background, 1.0)
    clean, stray = signal / whole, background / whole
    dark = (1 - on) * stray**2
    return (on * (pure * clean**2 + stray * (2 * clean + stray)) + dark) / (on + dark)


@variant("g2_zero", pumping="continuous")
def continuous_g2(
    *,
    saturation: Any,
    steady_weight: Any,
    detected_per_decay: Any,
    detected_per_pair: Any,
    decay_rates: Any,
    bright_share: Any,
    background_rate: Any,
) -> Any:
    r"""Zero delay under continuous pumping, over delays long against the decay.

    .. math:: \frac{\varphi_X k_X \varphi_B k_B p_2}{(\varphi_X k_X p_1 + \varphi_B k_B p_2)^2},
       \quad 1 + (g^2 - 1)\rho^2 \text{ with background}

    With a share of the time off, over delays short against the blinking.
    """
    both = detected_per_decay + saturation * detected_per_pair
    some = np.where(both > 0, both, 1.0)
    pure = steady_weight * (detected_per_decay / some) * (detected_per_pair / some)
    signal = decay_rates[0] / bright_share * both
    return blinking(pure, signal, background_rate, bright_share)
