r"""Secret key rate of a quantum key link with an imperfect single-photon source, and its inverse.

BB84 without decoy states, asymptotic (no finite-size terms). A pulse that holds several photons is
given to an eavesdropper in full: of the clicks, the share

.. math:: \Delta = \frac{\mu^2 g^{(2)}(0)}{2\,p_{\rm click}}, \qquad
   p_{\rm click} = \mu\eta + p_{\rm dark}, \qquad
   e = \frac{e_0\,\mu\eta + p_{\rm dark}/2}{p_{\rm click}}

may be known to him (μ²g²/2 bounds the probability of two or more photons). What is left is, for

- general attacks (Gottesman, Lo, Lütkenhaus and Preskill, Quantum Inf. Comput. 4, 325 (2004)):
  :math:`R = q\,p_{\rm click}\{(1-\Delta)[1-H(e/(1-\Delta))] - f H(e)\}`,
- individual attacks (Waks, Santori and Yamamoto, Phys. Rev. A 66, 042315 (2002)):
  :math:`R = q\,p_{\rm click}\{(1-\Delta)\,\tau(e/(1-\Delta)) - f H(e)\}`,
  :math:`\tau(x) = -\log_2(\tfrac12 + 2x - 2x^2)`,

with the binary entropy H in bits. Never below 0.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

ATTACKS: Final = ("general", "individual")

#: Mean photons a pulse above which pulses of one emitter say nothing any more.
MOST_PHOTONS: Final = 1.0

#: Attenuation [dB] that is an extinction of 1 in nepers, and the 2 % contrast of a visibility.
_DECIBEL: Final = 10 / math.log(10)
_CONTRAST: Final = 3.91


class LinkError(ValueError):
    """A link that cannot be, or a key rate that it cannot give; one sentence."""


@dataclass(frozen=True)
class Link:
    """A quantum key link from the source's fibre to the receiver's detectors.

    clock: pulses per second [1/s]. loss: from the fibre to the receiver [dB]. receiver: transmission
    and detector efficiency of the receiver, 0..1. dark_rate: dark and stray counts of the receiver
    per second [1/s]; gate: time window of one pulse [s], the whole period unless given.
    error: share of wrong bits from preparation and alignment, 0..0.5. correction: inefficiency f of
    error correction, at least 1. sifting: share of clicks in matching bases, 0..1. attacks: 'general'
    or 'individual'. Raises LinkError.
    """

    clock: float
    loss: float
    receiver: float = 0.6
    dark_rate: float = 100.0
    gate: float | None = None
    error: float = 0.01
    correction: float = 1.16
    sifting: float = 0.5
    attacks: str = "general"

    def __post_init__(self) -> None:
        gate = self.gate
        checks = (
            ("clock", self.clock, 1e-3, 1e13, "1/s"),
            ("loss", self.loss, 0.0, 200.0, "dB"),
            ("receiver", self.receiver, 1e-6, 1.0, ""),
            ("dark_rate", self.dark_rate, 0.0, 1e9, "1/s"),
            ("error", self.error, 0.0, 0.5, ""),
            ("correction", self.correction, 1.0, 5.0, ""),
            ("sifting", self.sifting, 1e-6, 1.0, ""),
        )
        for name, value, low, high, unit in checks:
            _within(name, value, low, high, unit)
        if gate is not None:
            _within("gate", gate, 1e-13, 1.0 / self.clock, "s")
        if self.attacks not in ATTACKS:
            raise LinkError(f"attacks is one of {', '.join(ATTACKS)}, not {self.attacks!r:.40}")
        if self.dark_share > 1:
            raise LinkError("the dark counts fill every pulse; lower dark_rate or the gate")

    @property
    def arrival(self) -> float:
        """Share of the source's photons that are detected."""
        return float(10 ** (-self.loss / 10) * self.receiver)

    @property
    def dark_share(self) -> float:
        """Dark and stray clicks per pulse."""
        gate = self.gate if self.gate is not None else 1 / self.clock
        return self.dark_rate * gate


@dataclass(frozen=True)
class Key:
    """A secret key. rate [bit/s]; error: share of wrong bits; known: Δ; clicks: per second."""

    rate: Any
    error: Any
    known: Any
    clicks: Any


def _within(name: str, value: Any, low: float, high: float, unit: str) -> None:
    fits = isinstance(value, int | float) and not isinstance(value, bool) and low <= value <= high
    if not fits:
        tail = f" {unit}" if unit else ""
        raise LinkError(f"{name} = {value!r:.40} is not within {low:g} to {high:g}{tail}")


def entropy(share: Any) -> Array:
    """Binary entropy [bit] of a share 0..1, any shape."""
    from scipy.special import entr

    x = np.asarray(share, dtype=float)
    return np.asarray((entr(x) + entr(1 - x)) / math.log(2))


def secret_key(link: Link, source_rate: Any, g2: Any) -> Key:
    """The secret key of a link. source_rate: photons/s in the fibre [1/s]; g2: g²(0); any shapes."""
    mean = np.asarray(source_rate, dtype=float) / link.clock
    clicks = mean * link.arrival + link.dark_share
    with np.errstate(divide="ignore", invalid="ignore"):
        wrong = (link.error * mean * link.arrival + link.dark_share / 2) / clicks
        known = mean**2 * np.asarray(g2, dtype=float) / 2 / clicks
        single = 1 - known
        x = np.clip(np.where(single > 0, wrong / single, 0.5), 0.0, 0.5)
        safe = 1 - entropy(x) if link.attacks == "general" else -np.log2(0.5 + 2 * x - 2 * x**2)
        share = single * safe - link.correction * entropy(np.clip(wrong, 0, 1))
    rate = link.clock * link.sifting * clicks * np.where(single > 0, np.maximum(share, 0.0), 0.0)
    rate = np.where(clicks > 0, rate, 0.0)
    return Key(rate[()], wrong[()], known[()], (clicks * link.clock)[()])


def best_rate(link: Link, g2: float) -> float:
    """Photons/s in the fibre at which the key is fastest: more light then tells more than it adds."""
    grid = _grid(link)
    index = int(np.argmax(secret_key(link, grid, g2).rate))
    low, high = grid[max(index - 1, 0)], grid[min(index + 1, grid.size - 1)]
    fine = np.linspace(low, high, 2001)
    return float(fine[int(np.argmax(secret_key(link, fine, g2).rate))])


def needed_rate(link: Link, wanted: float, g2: float) -> float:
    """Fewest photons/s in the fibre that give a secret key of `wanted` bit/s at a g²(0).

    Raises LinkError where the link cannot give it: the message says what it can.
    """
    from scipy.optimize import brentq

    _within("the wanted key rate", wanted, 1e-9, 1e13, "bit/s")
    _within("g2", g2, 0.0, 1.0, "")
    most = best_rate(link, g2)
    reached = float(secret_key(link, most, g2).rate)
    if reached < wanted:
        raise LinkError(
            f"this link gives at most {reached:.3g} bit/s at g²(0) = {g2:g}"
            + (f" (with {most:.3g} photons/s in the fibre)" if reached > 0 else "")
        )
    grid = _grid(link)
    below = grid[(grid < most) & (secret_key(link, grid, g2).rate < wanted)]
    low = float(below.max()) if below.size else float(grid[0])
    return float(brentq(lambda rate: float(secret_key(link, rate, g2).rate) - wanted, low, most))


def largest_g2(link: Link, wanted: float, source_rate: float) -> float:
    """Largest g²(0), at most 1, that still gives `wanted` bit/s. Raises LinkError where none does."""
    from scipy.optimize import brentq

    _within("the wanted key rate", wanted, 1e-9, 1e13, "bit/s")
    cleanest = float(secret_key(link, source_rate, 0.0).rate)
    if cleanest < wanted:
        raise LinkError(
            f"with {source_rate:.3g} photons/s in the fibre this link gives at most {cleanest:.3g} "
            "bit/s, whatever the purity"
        )
    if float(secret_key(link, source_rate, 1.0).rate) >= wanted:
        return 1.0
    return float(
        brentq(lambda g2: float(secret_key(link, source_rate, g2).rate) - wanted, 0.0, 1.0)
    )


def largest_loss(link: Link, source_rate: float, g2: float) -> float:
    """Loss [dB] beyond which no secret key is left, the link's own loss aside; 0 where none is."""
    from dataclasses import replace

    losses = np.linspace(0.0, 120.0, 12001)
    left = [
        float(secret_key(replace(link, loss=float(loss)), source_rate, g2).rate) > 0
        for loss in losses[::100]
    ]
    if not left[0]:
        return 0.0
    start = losses[::100][max(index for index, some in enumerate(left) if some)]
    fine = [loss for loss in losses if start <= loss <= start + 1]
    some = [
        loss
        for loss in fine
        if float(secret_key(replace(link, loss=float(loss)), source_rate, g2).rate) > 0
    ]
    return float(max(some))


def _grid(link: Link) -> Array:
    return link.clock * np.geomspace(1e-9, MOST_PHOTONS, 900)


def fibre_loss(length: float, per_kilometre: float = 0.2) -> float:
    """Loss [dB] of a fibre. length [m]; per_kilometre [dB/km], 0.2 at 1550 nm (common practice)."""
    _within("length", length, 0.0, 1e7, "m")
    _within("per_kilometre", per_kilometre, 0.0, 1e3, "dB/km")
    return length / 1000 * per_kilometre


def air_loss(length: float, visibility: float, wavelength: float) -> float:
    r"""Loss [dB] of a level path through hazy air, without spreading, turbulence and pointing.

    .. math:: \sigma = \frac{3.91}{V} \Big(\frac{\lambda}{550\,\mathrm{nm}}\Big)^{-q}

    length, visibility V, wavelength [m]. q after Kim, McArthur and Korevaar, Proc. SPIE 4214, 26
    (2001): 1.6 above 50 km, 1.3 above 6 km, 0.16 V + 0.34 above 1 km, V − 0.5 above 0.5 km, else 0.
    """
    _within("length", length, 0.0, 1e7, "m")
    _within("visibility", visibility, 10.0, 1e6, "m")
    _within("wavelength", wavelength, 200e-9, 10e-6, "m")
    far = visibility / 1000
    if far > 50:
        q = 1.6
    elif far > 6:
        q = 1.3
    elif far > 1:
        q = 0.16 * far + 0.34
    else:
        q = max(far - 0.5, 0.0)
    per_kilometre = _DECIBEL * _CONTRAST / far * (wavelength / 550e-9) ** -q
    return float(length / 1000 * per_kilometre)
