"""Averages over slow wandering: the detuning drawn from a Gaussian, once per emitter or per minute.

Widths, detunings and sigmas are angular frequencies [rad/s] of any broadcastable shapes; a width is
a full width at half maximum, sigma is a standard deviation.
"""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from itertools import islice

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import erfcx, wofz

Floats = NDArray[np.float64]
Outcome = Callable[[Floats], "Floats | tuple[Floats, ...]"]
Average = Floats | tuple[Floats, ...]

REACH = 9.0  # sigmas; a feature of 1e-6 sigma further out is below 1e-9 of its own Lorentzian tail
SMOOTH = 1.25  # sigmas; scale of the nodes far from every feature
POLE_STEP = 0.26  # of the strip: exp(-2π/0.26) = 3e-11
GAUSSIAN_STEP = 0.6  # sigmas, where no feature is near
VALUES_IN_MEMORY = 2**17


def voigt_mean(*, detuning: ArrayLike, sigma: ArrayLike, width: ArrayLike) -> Floats:
    r"""Mean of a Lorentzian of height 1 over Gaussian wandering about the detuning.

    .. math:: \langle 1/(1+(2\delta/W)^2)\rangle = \sqrt\pi\,y\,\mathrm{Re}\,w(x+iy)

    with x = detuning/(sigma√2), y = (width/2)/(sigma√2), w the Faddeeva function (Abramowitz and
    Stegun 7.4.13, from memory). sigma may be 0: the plain Lorentzian. width > 0.
    """
    detuning, sigma, width = (np.asarray(a, np.float64) for a in (detuning, sigma, width))
    if not sigma.any():
        return np.asarray(1 / (1 + (2 * detuning / width) ** 2) + 0 * sigma)
    still = _negligible(detuning, sigma, width)
    scale = np.where(still, 1.0, sigma) * np.sqrt(2)
    y = np.where(still, 1.0, width / 2) / scale
    if not detuning.any():
        mean = np.sqrt(np.pi) * y * erfcx(y) + 0 * detuning
    else:
        mean = np.sqrt(np.pi) * y * wofz(np.where(still, 0, detuning) / scale + 1j * y).real
    return np.where(still, 1 / (1 + (2 * detuning / width) ** 2), mean)


def voigt_deficit(*, detuning: ArrayLike, sigma: ArrayLike, width: ArrayLike) -> Floats:
    r"""One minus `voigt_mean`, to full relative accuracy when it is tiny.

    .. math:: \langle u^2/(1+u^2)\rangle, \quad u = 2\delta/W

    A line wider than 40 sigma is smooth to 8 Gauss-Hermite nodes (3e-14); a narrower one has a
    deficit above 2e-3, where the difference loses three digits at most. width > 0.
    """
    detuning, sigma, width = (np.asarray(a, np.float64) for a in (detuning, sigma, width))
    if not sigma.any():
        return np.asarray(_missing(2 * detuning / width) + 0 * sigma)
    wide = width > 40 * sigma
    if not wide.any():
        return np.asarray(1 - voigt_mean(detuning=detuning, sigma=sigma, width=width))
    smooth = _hermite_deficit(detuning, sigma, width)
    if wide.all():
        return smooth
    spread = np.where(wide, 0.0, sigma)  # no special function where its value is not used
    return np.where(wide, smooth, 1 - voigt_mean(detuning=detuning, sigma=spread, width=width))


def _negligible(detuning: Floats, sigma: Floats, width: Floats) -> NDArray[np.bool_]:
    """Where wandering changes the Lorentzian by less than 1e-16, sigma = 0 included."""
    return np.asarray(sigma <= 1e-9 * np.hypot(width / 2, detuning))


def _missing(offset: Floats) -> Floats:
    return np.asarray(offset**2 / (1 + offset**2))


def _hermite_deficit(detuning: Floats, sigma: Floats, width: Floats) -> Floats:
    nodes, weights = np.polynomial.hermite_e.hermegauss(8)
    weights = weights / weights.sum()
    if not detuning.any():  # even: half of the nodes do
        nodes, weights = nodes[4:], 2 * weights[4:]
    centre, step = 2 * detuning / width, 2 * sigma / width
    total = np.zeros(np.broadcast_shapes(centre.shape, step.shape))
    for node, weight in zip(nodes, weights, strict=True):
        total += weight * _missing(centre + node * step)
    return total


@dataclass(frozen=True)
class _Clustering:
    """Map from an even coordinate to shifts in units of sigma, crowded about every feature.

    position(x) = Σ asinh((x−c)/w) + x/SMOOTH. Its inverse is analytic in a strip: the slope is a sum
    of terms with positive real parts, so it vanishes nowhere, and every pole c ± iW, W >= w, is
    mapped to the edge of the strip or beyond. An even trapezium then converges exponentially.
    """

    features: tuple[tuple[Floats, Floats], ...]

    def position(self, shift: Floats) -> Floats:
        """The even coordinate of a shift."""
        total = shift / SMOOTH
        for centre, width in self.features:
            total = total + np.arcsinh((shift - centre) / width)
        return total

    def slope(self, shift: Floats) -> tuple[Floats, Floats]:
        """First and second derivative of the position."""
        slope, bend = np.full(np.shape(shift), 1 / SMOOTH), np.zeros(np.shape(shift))
        for centre, width in self.features:
            away = shift - centre
            inverse = 1 / np.hypot(away, width)
            slope = slope + inverse
            bend = bend - away * inverse**3
        return slope, bend

    def spacing(self) -> Floats:
        """Step of the trapezium that resolves every pole and the Gaussian."""
        spacing = GAUSSIAN_STEP * np.minimum(
            self.slope(np.asarray(3.0))[0], self.slope(np.asarray(-3.0))[0]
        )
        for pole, height in self.features:
            edge = height / SMOOTH
            for centre, width in self.features:
                edge = edge + np.arcsinh((pole - centre + 1j * height) / width).imag
            spacing = np.minimum(spacing, POLE_STEP * edge)
        return np.asarray(spacing)

    def nodes(self, count: int) -> Iterator[tuple[Floats, Floats]]:
        """Shifts at even coordinates from one end to the other, and their Gaussian weights.

        Each shift follows from the one before by a Taylor step and two of Halley's: the coordinate
        is smooth over a step by construction, so they converge to rounding.
        """
        first = self.position(np.asarray(-REACH))
        step = (self.position(np.asarray(REACH)) - first) / (count - 1)
        shift = np.full(first.shape, -REACH)
        for index in range(count):
            slope, bend = self.slope(shift)
            yield shift, np.exp(-(shift**2) / 2) / slope
            shift = shift + step / slope * (1 - bend * step / (2 * slope**2))
            for _ in range(2):
                error = self.position(shift) - (first + (index + 1) * step)
                slope, bend = self.slope(shift)
                shift = shift - error / (slope - error * bend / (2 * slope))


def average_over_shifts(
    *,
    outcome: Outcome,
    sigma: ArrayLike,
    centres: Sequence[ArrayLike],
    widths: Sequence[ArrayLike],
) -> Average:
    """Mean of outcome(shift) over rigid shifts ~ N(0, sigma²), to 1e-9 for one to four features.

    outcome: a smooth elementwise function of shifts [rad/s]; it gets arrays of the cell shape (that
    of sigma, centres and widths together) with a leading axis of nodes, and once without it; its
    result may have more cells, and may be a tuple of arrays. centres: the shifts at which each line
    meets the resonance; widths: the narrowest half width at half maximum that shows there (broader
    ones are resolved too) [rad/s]. sigma = 0 gives outcome(0). From 45 nodes (wide lines) to about
    90 a line (1e-6 sigma).
    """
    sigma = np.asarray(sigma, np.float64)
    spread = np.where(sigma > 0, sigma, 1.0)
    pairs = zip(centres, widths, strict=True)
    clustering = _Clustering(
        tuple(
            (np.asarray(c, np.float64) / spread, np.asarray(w, np.float64) / spread)
            for c, w in pairs
        )
    )
    ends = clustering.position(np.asarray(REACH)) - clustering.position(np.asarray(-REACH))
    count = int(np.ceil(np.max(ends / clustering.spacing(), initial=1.0))) + 1
    return _mean(outcome, sigma, clustering, count)


def average_over_samples(
    *,
    outcome: Outcome,
    sigma: ArrayLike,
    step: ArrayLike = 0.0,
    centre: ArrayLike = 0.0,
    feature: ArrayLike = np.inf,
) -> Average:
    """Mean of outcome(shift) over shifts ~ N(0, sigma²) for outcomes with a kink at every sample.

    As `average_over_shifts`. step: the scale of the kinks, the larger of the sample spacing and half
    the resonator's width (0: the most nodes); centre, feature: the shift at which the main peak
    meets the resonance, and its half width, needed where that is below about sigma/8 [rad/s].
    64 to 768 nodes, three a step where that suffices. The nodes do not follow the kinks, whose
    errors average out. Seen: 1e-9 for a resonator wider than two steps (1e-6 at sigma = 300 steps);
    for a narrower one 1e-5 on a smooth spectrum, 4e-5 with 1 % of noise up to sigma = 10 steps and
    3e-3 at 300, where each node meets another sample: about a third of the noise itself. The formulas
    use the tables of `sampled_average`; this sum, at other nodes, is what they are held against.
    """
    sigma = np.asarray(sigma, np.float64)
    spread = np.where(sigma > 0, sigma, 1.0)
    clustering = _Clustering(((np.asarray(centre / spread), np.asarray(feature / spread)),))
    ends = clustering.position(np.asarray(REACH)) - clustering.position(np.asarray(-REACH))
    spacing = np.asarray(step) / spread * clustering.slope(np.asarray(centre / spread))[0] / 3
    wanted = np.max(ends / np.maximum(spacing, ends / 768), initial=1.0)
    return _mean(outcome, sigma, clustering, max(64, int(np.ceil(wanted))))


def _mean(outcome: Outcome, sigma: Floats, clustering: _Clustering, count: int) -> Average:
    """Weighted mean over the nodes, in blocks that bound the memory."""
    shape = np.broadcast_shapes(sigma.shape, clustering.position(np.asarray(0.0)).shape)
    at_rest, several = _as_tuple(outcome(np.zeros(shape)))
    if not sigma.any() or not all(value.size for value in at_rest):
        return at_rest if several else at_rest[0]
    cells = max(value.size for value in at_rest)
    padded = (1,) * (max(value.ndim for value in at_rest) - len(shape)) + shape
    totals: list[Floats] = [np.zeros(value.shape) for value in at_rest]
    weight_total = np.zeros(padded)
    nodes = clustering.nodes(count)
    while block := list(islice(nodes, max(1, VALUES_IN_MEMORY // cells))):
        shifts = np.stack([np.broadcast_to(shift, padded) for shift, _ in block])
        weights = np.stack([np.broadcast_to(weight, padded) for _, weight in block])
        weight_total += weights.sum(axis=0)
        values, _ = _as_tuple(outcome(sigma * shifts))
        totals = [t + (weights * v).sum(axis=0) for t, v in zip(totals, values, strict=True)]
    means = tuple(
        np.where(sigma > 0, total / weight_total, value)
        for total, value in zip(totals, at_rest, strict=True)
    )
    return means if several else means[0]


def _as_tuple(result: Average) -> tuple[tuple[Floats, ...], bool]:
    if isinstance(result, tuple):
        return tuple(np.asarray(value) for value in result), True
    return (np.asarray(result),), False
