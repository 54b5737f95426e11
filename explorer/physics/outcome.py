"""What becomes of a decay: back-action of the resonator, slow wandering, shares, lifetime.

The single-excitation equations integrated over time give the rate R κ/(R + κ) into the light that
leaves, exactly for one line. Slow wandering averages the outcome, never the rate R.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import part, quantity, variant
from ..whole import Lines, Samples
from .wandering import voigt_deficit, voigt_mean


@quantity("1/s", label="Exchange rate", symbol="R", source="auffeves2009", group="rates", log=True)
def exchange_rate(*, ideal_rate: Any, spectral_overlap: Any) -> Any:
    r"""Rate at which emitter and mode exchange the excitation.

    .. math:: R = \gamma_r F \psi \xi\, O = \frac{4g^2}{\kappa+\Gamma} \text{ on resonance}

    At the mean detuning, with the fast width only. [1/s]
    """
    return ideal_rate * spectral_overlap


@part
def resonant_rate(*, ideal_rate: Any, resonator_linewidth: Any, coherence_decay: Any) -> Any:
    """Exchange rate of a single line on resonance, R(0) [1/s]."""
    return ideal_rate * (resonator_linewidth / (resonator_linewidth + coherence_decay))


@part
def still_rate(*, exchange_rate: Any, resonator_linewidth: Any) -> Any:
    """Rate into the light that leaves, without slow wandering [1/s]: R κ/(R + κ)."""
    return exchange_rate * resonator_linewidth / (exchange_rate + resonator_linewidth)


@part
def peak_share(*, resonant_rate: Any, resonator_linewidth: Any, decay_elsewhere: Any) -> Any:
    """Of a single line on resonance: share of the mode β0, and what is left of it, 1 − β0."""
    returned = resonant_rate + resonator_linewidth
    gain = resonant_rate * resonator_linewidth
    total = gain + decay_elsewhere * returned
    return gain / total, decay_elsewhere * returned / total


@part
def share_width(
    *, resonant_rate: Any, resonator_linewidth: Any, coherence_decay: Any, decay_elsewhere: Any
) -> Any:
    """Width of the share of the mode against detuning [rad/s]."""
    lost = decay_elsewhere * (resonant_rate + resonator_linewidth)
    gain = resonant_rate * resonator_linewidth
    ratio = np.sqrt((gain + lost) / (decay_elsewhere * resonator_linewidth))
    # Without another decay every photon leaves through the mode, however far it is detuned.
    return (resonator_linewidth + coherence_decay) * np.where(decay_elsewhere > 0, ratio, 1e60)


@part
def mode_rate(
    *,
    resonant_rate: Any,
    resonator_linewidth: Any,
    coherence_decay: Any,
    detuning: Any,
    slow_deviation: Any,
) -> Any:
    """Mean rate into the light that leaves [1/s], a single line that wanders."""
    width = (resonator_linewidth + coherence_decay) * np.sqrt(
        1 + resonant_rate / resonator_linewidth
    )
    peak = resonant_rate * resonator_linewidth / (resonant_rate + resonator_linewidth)
    return peak * voigt_mean(detuning=detuning, sigma=slow_deviation, width=width)


@variant("mode_rate", slow_linewidth=0)
@variant("mode_rate", slow_linewidth=0, spectrum=Lines)
@variant("mode_rate", slow_linewidth=0, spectrum=Samples)
def still_mode_rate(*, still_rate: Any) -> Any:
    """The same without wandering."""
    return still_rate


@quantity("1", label="Share of the mode", symbol="β", source="auffeves2009", group="shares")
def cavity_share(*, peak_share: Any, share_width: Any, detuning: Any, slow_deviation: Any) -> Any:
    r"""Share of the decays that leave the resonator as light or are absorbed in it.

    .. math:: \beta = \langle R_{\rm eff}/(\gamma + R_{\rm eff}) \rangle,
       \quad R_{\rm eff} = R\kappa/(R+\kappa)

    Exact for one line in every regime; for several lines or a measured spectrum the total R is used
    in the same form. Rates [1/s]. Any broadcastable shapes.
    """
    return peak_share[0] * voigt_mean(detuning=detuning, sigma=slow_deviation, width=share_width)


@variant("cavity_share", slow_linewidth=0)
@variant("cavity_share", slow_linewidth=0, spectrum=Lines)
@variant("cavity_share", slow_linewidth=0, spectrum=Samples)
def still_share(*, still_rate: Any, decay_elsewhere: Any) -> Any:
    """The same without wandering."""
    return still_rate / (decay_elsewhere + still_rate)


@quantity("s", label="Lifetime in the device", symbol="τd", source="auffeves2009", log=True)
def device_lifetime(
    *,
    peak_share: Any,
    share_width: Any,
    detuning: Any,
    slow_deviation: Any,
    decay_elsewhere: Any,
    bare_mode_lifetime: Any,
) -> Any:
    r"""Mean time that the emitter spends excited.

    .. math:: \tau_d = \frac{1-\langle\beta\rangle}{\gamma}
       = \frac{(1-\beta_0) + \beta_0 \langle u^2/(1+u^2)\rangle}{\gamma}

    u = 2δ over the width of the share of the mode. Rates [1/s]. Any broadcastable shapes.
    """
    deficit = voigt_deficit(detuning=detuning, sigma=slow_deviation, width=share_width)
    left = (peak_share[1] + peak_share[0] * deficit) / decay_elsewhere
    return np.where(decay_elsewhere > 0, left, bare_mode_lifetime)


@part
def bare_mode_lifetime(
    *,
    resonant_rate: Any,
    resonator_linewidth: Any,
    coherence_decay: Any,
    detuning: Any,
    slow_deviation: Any,
) -> Any:
    """Lifetime [s] of a single line that decays through the mode alone."""
    offset = 4 * (detuning**2 + slow_deviation**2) / (resonator_linewidth + coherence_decay) ** 2
    return 1 / resonator_linewidth + (1 + offset) / resonant_rate


@variant("device_lifetime", slow_linewidth=0)
@variant("device_lifetime", slow_linewidth=0, spectrum=Lines)
@variant("device_lifetime", slow_linewidth=0, spectrum=Samples)
def still_lifetime(*, still_rate: Any, decay_elsewhere: Any) -> Any:
    """The same without wandering: 1/(γ + Reff)."""
    return 1 / (decay_elsewhere + still_rate)


@quantity("1", label="Share of other light", symbol="ηo", group="shares")
def other_share(*, device_lifetime: Any, other_modes: Any, radiative_rate: Any) -> Any:
    r"""Share of the decays that leave as light past the mode: :math:`(1-\beta)\alpha\gamma_r/\gamma`."""
    return device_lifetime * other_modes * radiative_rate


@quantity("1", label="Share lost in the emitter", symbol="ηl", group="shares")
def lost_share(
    *, device_lifetime: Any, intrinsic_loss_rate: Any, quenching: Any, radiative_rate: Any
) -> Any:
    r"""Share of the decays that give no light: :math:`(1-\beta)(\gamma_{nr}+\zeta\gamma_r)/\gamma`."""
    return device_lifetime * (intrinsic_loss_rate + quenching * radiative_rate)


@quantity("1", label="Rate enhancement", symbol="τ/τd", log=True)
def rate_enhancement(*, lifetime: Any, device_lifetime: Any) -> Any:
    r"""Total decay rate in the device over the bare one: :math:`\tau/\tau_d`."""
    return lifetime / device_lifetime


@quantity("1/s", label="Initial decay rate", symbol="k0", group="rates", log=True)
def initial_decay_rate(*, decay_elsewhere: Any, mode_rate: Any) -> Any:
    r"""Slope that a decay trace of many shifts starts with: :math:`\gamma+\langle R_{\rm eff}\rangle`."""
    return decay_elsewhere + mode_rate


@quantity(
    "1",
    label="Effective Purcell factor",
    symbol="Feff",
    log=True,
    note="the mode's rate alone over the bulk radiative rate; the total is this plus other modes",
)
def effective_purcell(*, mode_rate: Any, radiative_rate: Any) -> Any:
    r"""The mode's rate alone over the bulk radiative rate: :math:`\langle R_{\rm eff}\rangle/\gamma_r`."""
    return mode_rate / radiative_rate
