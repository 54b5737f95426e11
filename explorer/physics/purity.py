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
    pairs = 2 * in_b * both * detected_per_decay * detected_per_pair
    return blinking(pairs, photons, background_per_pulse, bright_share)


def blinking(pairs: Any, signal: Any, background: Any, on: Any) -> Any:
    """g2 of a source that is on for a share of the time, slowly against the delays compared.

    pairs: coincidences of the signal alone; signal, background: photons per pulse or per second.
    """
    dark = (1 - on) * background**2
    same = on * (pairs + background * (2 * signal + background)) + dark
    return same / (on * (signal + background) ** 2 + dark)


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
    pure = steady_weight * detected_per_decay * detected_per_pair / both**2
    signal = decay_rates[0] / bright_share * both
    pure = np.where(both > 0, pure, 0.0)
    return blinking(pure * signal**2, signal, background_rate, bright_share)
