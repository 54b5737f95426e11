"""g2 at zero delay: how rarely two photons come at once."""

from __future__ import annotations

from typing import Any

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


@part
def signal_while_on(*, rate_detected: Any, attempt_rate: Any) -> Any:
    """Detected photons per pulse while the emitter is on, μ [1]."""
    return rate_detected / attempt_rate


@variant("signal_while_on", pumping="continuous")
def continuous_signal(*, rate_detected: Any, bright_share: Any) -> Any:
    """Detected photons per second while the emitter is on [1/s]."""
    return rate_detected / bright_share


@part
def coincidences(
    *, occupations: Any, period_decay: Any, detected_per_decay: Any, detected_per_pair: Any
) -> Any:
    """Ordered pairs of detected photons in a pulse, G = 2 qB B0 φX φB [1]."""
    return 2 * occupations[1] * period_decay[4] * detected_per_decay * detected_per_pair


@variant("coincidences", biexciton_yield=0)
@variant("coincidences", biexciton_yield=0, pumping="continuous")
def no_coincidences() -> Any:
    """A biexciton that emits nothing makes no pair."""
    return 0.0


@variant("coincidences", pumping="continuous")
def continuous_coincidences(
    *,
    saturation: Any,
    exciton_rate: Any,
    steady_weight: Any,
    detected_per_decay: Any,
    detected_per_pair: Any,
) -> Any:
    """Pairs at zero delay over the time squared, φX kX φB kB p2 [1/s²]."""
    pumped = saturation * exciton_rate
    return pumped**2 / steady_weight * detected_per_decay * detected_per_pair


@part
def active_background(*, background_per_pulse: Any) -> Any:
    """Background photons per pulse [1]."""
    return background_per_pulse


@variant("active_background", pumping="continuous")
def continuous_background(*, background_rate: Any) -> Any:
    """Background photons per second [1/s]."""
    return background_rate


@quantity(
    "1",
    label="g²(0)",
    symbol="g²(0)",
    source="nair2011",
    group="photons",
    note="pulsed: same pulse over neighbouring pulses; continuous: zero delay over delays long "
    "against the decay and short against the blinking",
)
def g2_zero(
    *, coincidences: Any, signal_while_on: Any, active_background: Any, bright_share: Any
) -> Any:
    r"""Coincidences at zero delay over those of neighbouring pulses, or of longer delays.

    .. math:: g^2(0) = \frac{q (G + 2\mu b + b^2) + (1-q) b^2}{q (\mu + b)^2 + (1-q) b^2}

    G pairs and μ photons of the source while on, b of the background, q share of the time on; per
    pulse, or per second under continuous pumping. With q = 1: 1 + (g² − 1)ρ², ρ = μ/(μ + b) (Brouri
    et al.). Weak pumping: φB/φX (Nair et al.).
    """
    pure, share = compared(coincidences, signal_while_on, active_background)
    dark = (1 - bright_share) * share**2
    return (bright_share * (pure + share * (2 - share)) + dark) / (bright_share + dark)


def compared(coincidences: Any, signal: Any, background: Any) -> tuple[Any, Any]:
    """Pairs over the square of all light, and the background's share; no square that underflows."""
    total = signal + background
    return coincidences / total / total, background / total


@variant("g2_zero", bright_share=1)
def steady_g2(*, coincidences: Any, signal_while_on: Any, active_background: Any) -> Any:
    """The same of an emitter that is always on: (G + 2μb + b²)/(μ + b)²."""
    pure, share = compared(coincidences, signal_while_on, active_background)
    return pure + share * (2 - share)
