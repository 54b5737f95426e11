"""From two measured decays to the rate enhancement, and to what it says of the mode's share of it."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ..built import Estimate
from ..domain import InputError, finite_number

#: What of a decay was measured: the mean time in the excited state, or the slope it starts with.
KINDS = ("mean", "first slope")


@dataclass(frozen=True)
class Enhancement:
    """Measured rate enhancement and what follows for the mode.

    total: `lifetime` over the lifetime in the device, with its interval [1]. effective: bounds on the
    effective enhancement (the mode's rate alone over the bulk radiative rate) [1]: not an interval of
    confidence, but what the interval of the total and the ranges of all else leave open. kind: see KINDS.
    """

    total: Estimate
    effective: tuple[float, float]
    kind: str

    @property
    def words(self) -> str:
        """What was measured, and what stands in the way of reading it as the mode's alone."""
        if self.kind == "mean":
            return "the mean time in the excited state was measured"
        return "the first slope was measured: the devices or moments that decay fastest count most"


def ratio(above: Estimate, below: Estimate) -> Estimate:
    """The ratio of two independent measurements, all above 0.

    The interval adds the distances to the ends, on the scale of the logarithm, in quadrature: exact
    for normal logarithms, else as good as both intervals are near to that.
    """
    if min(above.value, below.value) <= 0:
        raise InputError("a ratio of measured values takes values above 0")

    def distance(high: float, low: float) -> float:
        return math.inf if low <= 0 or math.isinf(high) else math.log(high / low)

    value = above.value / below.value
    up = math.hypot(distance(above.high, above.value), distance(below.value, below.low))
    down = math.hypot(distance(above.value, above.low), distance(below.high, below.value))
    high = math.inf if math.isinf(up) else value * math.exp(up)
    return Estimate(value, value * math.exp(-down), high)


def enhancement(
    bare: Estimate,
    device: Estimate,
    quantum_yield: float | tuple[float, float],
    *,
    bulk_rate_ratio: float | tuple[float, float] = 1.0,
    other_modes: float | tuple[float, float] = (0.0, 1.0),
    quenching: float | tuple[float, float] = 0.0,
    kind: str = "mean",
) -> Enhancement:
    r"""Rate enhancement of an emitter in a device, and bounds on the mode's part of it.

    .. math:: \tau_0/\tau = 1 - \eta + b\,\eta\,(P + o + q)

    bare: lifetime in the reference surroundings [s]. device: lifetime in the device [s], the mean (or,
    kind "first slope", one over the rate that the decay starts with). quantum_yield η,
    bulk_rate_ratio b, other_modes o, quenching q: as the inputs of those names, numbers or ranges
    (low, high). P is the effective enhancement; its bounds take the worst of every range, and are
    never below 0. Holds for the mean where the emission line does not wander slowly (else the mean
    favours moments off resonance). Raises InputError.
    """
    if kind not in KINDS:
        raise InputError(f"{kind!r:.40} is none of {', '.join(KINDS)}")
    total = ratio(bare, device)
    yields = _range(quantum_yield, "quantum_yield", 1.0)
    bulk = _range(bulk_rate_ratio, "bulk_rate_ratio")
    others = _range(other_modes, "other_modes", least=0.0)
    quench = _range(quenching, "quenching", least=0.0)
    modes = [
        (end - 1 + share) / (rate * share)
        for end in (total.low, total.high)
        for share in yields
        for rate in bulk
    ]
    low = max(min(modes) - others[1] - quench[1], 0.0)
    high = max(max(modes) - others[0] - quench[0], 0.0)
    return Enhancement(total, (low, high), kind)


def _range(
    given: float | tuple[float, float],
    name: str,
    most: float = math.inf,
    least: float | None = None,
) -> tuple[float, float]:
    """A number or a range as a range; InputError outside the input's domain."""
    pair = given if isinstance(given, tuple) else (given, given)
    if len(pair) != 2:
        raise InputError(f"{name} is a number or a range of two", name)
    low, high = (finite_number(end, name) for end in pair)
    under = low <= 0 if least is None else low < least
    if under or high > most or low > high:
        raise InputError(f"{name} = {low:g} to {high:g} is no range of it", name)
    return low, high
