"""Pulses, decays and photon streams: how many photons a second arrive, and where the rest goes."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.special import gammainc

from ..registry import part, quantity, variant

#: The steps of the budget, in order; each is a total of photons (or pulses, or decays) per second.
STEPS = (
    ("emitter on", "pulses or decays offered while the emitter is on"),
    ("excited and decayed", "decays of exciton and biexciton: one pulse can start both"),
    ("photon emitted", "not lost in the emitter or to quenching"),
    ("escaped the resonator", "not absorbed in the resonator"),
    ("towards the optic", "not downwards or trapped"),
    ("inside the aperture", "within the numerical aperture"),
    ("through the filter", "inside the filter"),
    ("through the optics", "not lost in the optics"),
    ("in the fibre", "in the mode of the fibre"),
    ("detected", "counted"),
)

#: Streams of light: transition and way out.
STREAMS = ("exciton, mode", "exciton, other", "biexciton, mode", "biexciton, other")


def chain_decay(x: Any, y: Any) -> tuple[Any, Any, Any, Any, Any]:
    """What a period does to X and B: e^−x, 1−e^−x, 1−e^−y, BX = y(e^−x − e^−y)/(y−x), and B0.

    x, y: decay rates of X and B times the period [1], broadcasting. B0, the probability that B
    decays to X and X to the ground, is [y(1−e^−x) − x(1−e^−y)]/(y−x): the complement 1 − e^−y − BX
    where it is not small.
    """
    x, y = np.broadcast_arrays(np.asarray(x, dtype=float), np.asarray(y, dtype=float))
    stays, gone, gone_b = np.exp(-x), -np.expm1(-x), -np.expm1(-y)
    gap = np.abs(y - x)
    ratio = np.divide(-np.expm1(-gap), gap, out=np.ones_like(gap), where=gap > 0)
    one = y * np.maximum(stays, np.exp(-y)) * ratio
    both = np.asarray(gone_b - one)
    rare = x * y < 1e-4 * (1 + np.maximum(x, y))
    if rare.any():
        both[rare] = _rarely_both(x[rare], y[rare], gone[rare], gone_b[rare])
    return stays, gone, gone_b, one, both


def _rarely_both(x: Any, y: Any, gone: Any, gone_b: Any) -> Any:
    """B0 where it is small: a series where both rates are, else the quotient itself.

    The series is xy Σ (−1)^k h_k(x, y)/(k+2)!, h_k the sum of all monomials of degree k.
    """
    gap = np.where(x == y, 1.0, y - x)
    quotient = (y * gone - x * gone_b) / gap
    total, term, power, size = 0.5, 1.0, 1.0, 2.0
    for k in range(1, 7):
        power = power * y
        term = x * term + power
        size = size * (k + 2)
        total = total + (-1) ** k * term / size
    return np.where(np.maximum(x, y) < 0.02, x * y * total, quotient)


@part
def exciton_rate(*, device_lifetime: Any) -> Any:
    """Decay rate of the exciton in the device, kX [1/s]."""
    return 1 / device_lifetime


@part
def biexciton_rate(*, biexciton_device_lifetime: Any) -> Any:
    """Decay rate of the biexciton in the device, kB [1/s]."""
    return 1 / biexciton_device_lifetime


@part
def period_decay(*, exciton_rate: Any, biexciton_rate: Any, repetition_rate: Any) -> Any:
    """What a period does: e^−x, 1−e^−x, 1−e^−y, BX and B0."""
    return chain_decay(exciton_rate / repetition_rate, biexciton_rate / repetition_rate)


@variant("period_decay", biexciton_yield=0)
def period_decay_without_biexciton(*, exciton_rate: Any, repetition_rate: Any) -> Any:
    """The same where the biexciton is gone at once: then it leaves an exciton behind."""
    x = exciton_rate / repetition_rate
    stays, gone = np.exp(-x), -np.expm1(-x)
    return stays, gone, 1.0, stays, gone


@part
def occupations(*, excitations_per_pulse: Any, period_decay: Any) -> Any:
    """Stationary shares of exciton and biexciton after a pulse, (qX, qB).

    From the spanning trees of the three states, a sum of products without any subtraction.
    """
    stays, gone, _, one, both = period_decay
    none = np.exp(-excitations_per_pulse)
    single = excitations_per_pulse * none
    double = gammainc(2.0, excitations_per_pulse)
    some = -np.expm1(-excitations_per_pulse)
    x_to_0, x_to_b = gone * none, gone * double + stays * some
    b_to_0, b_to_x = both * none, both * single + one * none
    weight_0 = x_to_0 * b_to_0 + x_to_b * b_to_0 + b_to_x * x_to_0
    weight_x = single * b_to_x + double * b_to_x + b_to_0 * single
    weight_b = double * x_to_b + single * x_to_b + x_to_0 * double
    total = weight_0 + weight_x + weight_b
    return weight_x / total, weight_b / total


@variant("occupations", biexciton_yield=0)
def occupations_without_biexciton(*, excitations_per_pulse: Any, period_decay: Any) -> Any:
    """The same where the biexciton is gone at once: excited at all, p/(D + p(1 − D))."""
    stays, gone, *_ = period_decay
    none, some = np.exp(-excitations_per_pulse), -np.expm1(-excitations_per_pulse)
    double = gammainc(2.0, excitations_per_pulse)
    total = gone + some * stays
    empty, excited = gone / total, some * stays / total  # before the pulse
    in_x = (empty * excitations_per_pulse + excited) * none
    return in_x, empty * double + excited * some


@part
def attempt_rate(*, repetition_rate: Any, bright_share: Any) -> Any:
    """Pulses per second while the emitter is on [1/s]."""
    return repetition_rate * bright_share


@variant("attempt_rate", pumping="continuous")
def continuous_attempts(*, saturation: Any, exciton_rate: Any, bright_share: Any) -> Any:
    """Decays offered per second by a continuous pump while the emitter is on [1/s]."""
    return saturation * exciton_rate * bright_share


@part
def decay_rates(*, attempt_rate: Any, occupations: Any, period_decay: Any) -> Any:
    """Decays per second of exciton and of biexciton, the time off included."""
    _, gone, gone_b, _, both = period_decay
    in_x, in_b = occupations
    return attempt_rate * (in_x * gone + in_b * both), attempt_rate * in_b * gone_b


@part
def steady_weight(*, saturation: Any, exciton_rate: Any, biexciton_rate: Any) -> Any:
    """Sum of the weights 1, s, s² kX/kB of the three states under a continuous pump."""
    return 1 + saturation * (1 + saturation * exciton_rate / biexciton_rate)


@variant("decay_rates", pumping="continuous")
def continuous_decay_rates(
    *, saturation: Any, exciton_rate: Any, steady_weight: Any, bright_share: Any
) -> Any:
    """The same under a continuous pump."""
    exciton = saturation * exciton_rate / steady_weight * bright_share
    return exciton, saturation * exciton


@part
def mode_factors(
    *,
    radiative_share: Any,
    upward_share: Any,
    collected_share: Any,
    filter_share: Any,
    optics_transmission: Any,
    fibre_share: Any,
    detector_efficiency: Any,
) -> Any:
    """Factors of the mode's light from emission to detection, one a step."""
    return (
        radiative_share,
        upward_share,
        collected_share,
        filter_share,
        optics_transmission,
        fibre_share,
        detector_efficiency,
    )


@part
def other_factors(
    *,
    dipole_collected: Any,
    other_filter_share: Any,
    optics_transmission: Any,
    other_fibre_share: Any,
    detector_efficiency: Any,
) -> Any:
    """Factors of the light past the mode, one a step: it does not cross the resonator."""
    return (
        1.0,
        0.5,
        dipole_collected,
        other_filter_share,
        optics_transmission,
        other_fibre_share,
        detector_efficiency,
    )


def through(share: Any, factors: Any, steps: int) -> Any:
    """A share of the decays after so many steps; exactly 0 where the share is 0."""
    product: Any = 1.0
    for factor in factors[:steps]:
        product = product * factor
    if np.all(np.isfinite(product)):
        return share * product
    return np.where(share > 0, share * product, 0.0)


@part
def transmitted(
    *, cavity_share: Any, mode_factors: Any, other_share: Any, other_factors: Any
) -> Any:
    """A function of a number of steps: photons per exciton decay of the two ways out."""
    return lambda steps: (
        through(cavity_share, mode_factors, steps),
        through(other_share, other_factors, steps),
    )


@part
def pair_transmitted(*, biexciton_yield: Any, biexciton_transmitted: Any) -> Any:
    """The same per biexciton decay; a yield of 0 gives no photon at all."""
    emits = biexciton_yield > 0

    def after(steps: int) -> Any:
        return tuple(np.where(emits, share, 0.0) for share in biexciton_transmitted(steps))

    return after


@variant("pair_transmitted", biexciton_yield=0)
def no_pair_transmitted() -> Any:
    """No photon from the biexciton."""
    return lambda _: (0.0, 0.0)


@part
def photons_after(*, decay_rates: Any, transmitted: Any, pair_transmitted: Any) -> Any:
    """A function of a number of steps: photons per second in all streams together."""
    exciton, biexciton = decay_rates

    def after(steps: int) -> Any:
        mode, other = transmitted(steps)
        pair_mode, pair_other = pair_transmitted(steps)
        return exciton * (mode + other) + biexciton * (pair_mode + pair_other)

    return after


@quantity("1/s", label="Photons/s at the lens", symbol="N0", group="photons", log=True)
def rate_at_lens(*, photons_after: Any) -> Any:
    """Photons per second inside the numerical aperture, before filter and optics [1/s]."""
    return photons_after(3)


@quantity("1/s", label="Photons/s in the fibre", symbol="NF", group="photons", log=True)
def rate_in_fibre(*, photons_after: Any) -> Any:
    """Photons per second in the fibre [1/s]; in free space, behind the optics."""
    return photons_after(6)


@quantity("1/s", label="Photons/s detected", symbol="N", group="photons", log=True)
def rate_detected(*, photons_after: Any) -> Any:
    """Photons per second counted by the detector [1/s], without background."""
    return photons_after(7)


@part
def budget_table(
    *,
    attempt_rate: Any,
    decay_rates: Any,
    transmitted: Any,
    pair_transmitted: Any,
    photons_after: Any,
) -> Any:
    """Rows of (step, photons per second of each stream, total), the last total the end rate."""
    exciton, biexciton = decay_rates
    blank = (np.nan,) * len(STREAMS)
    rows = [(STEPS[0][0], blank, attempt_rate)]
    rows.append((STEPS[1][0], blank, exciton + biexciton))
    for steps, (name, _) in enumerate(STEPS[2:]):
        mode, other = transmitted(steps)
        pair_mode, pair_other = pair_transmitted(steps)
        streams = (exciton * mode, exciton * other, biexciton * pair_mode, biexciton * pair_other)
        rows.append((name, streams, photons_after(steps)))
    return tuple(rows)
