"""A measured spectrum as pieces: photon counts per wavelength become a density over angular frequency.

The density s(ω) is linear between its nodes, zero outside, and integrates to 1. Frequencies and
full widths are angular [rad/s], from any common origin; arrays broadcast.
"""

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.constants import c as speed_of_light

Floats = NDArray[np.float64]

PIECES_IN_MEMORY = 2**16


def frequency_density(*, wavelengths: ArrayLike, counts: ArrayLike) -> tuple[Floats, Floats]:
    r"""Angular frequencies [rad/s], ascending, and the density of photons over them [s].

    .. math:: s(\omega) \propto N(\lambda)\,\lambda^2/(2\pi c)

    wavelengths [m] in any order, none twice; counts per unit wavelength, not negative, any scale.
    Normalised by the trapezium rule, which is exact for a density linear in frequency. ValueError
    where wavelengths repeat or are not positive, or where there is no light.
    """
    wavelengths, counts = np.asarray(wavelengths, np.float64), np.asarray(counts, np.float64)
    if wavelengths.ndim != 1 or wavelengths.shape != counts.shape or wavelengths.size < 2:
        raise ValueError("a spectrum needs two or more wavelengths and as many counts")
    order = np.argsort(wavelengths)[::-1]
    wavelengths, counts = wavelengths[order], counts[order]
    if not wavelengths[-1] > 0:
        raise ValueError(f"wavelengths must be positive; got {wavelengths[-1]:.6g} m")
    omega = 2 * np.pi * speed_of_light / wavelengths
    if not np.all(np.diff(omega) > 0):
        raise ValueError("a wavelength is given twice, or closer than rounding")
    density = counts / np.max(counts) * wavelengths**2 if np.max(counts) > 0 else 0 * counts
    total = np.trapezoid(density, omega)
    if not (total > 0 and np.isfinite(total)):
        raise ValueError("a spectrum needs finite counts, not all zero")
    return omega, density / total


def sampled_overlap(
    *, omega: ArrayLike, density: ArrayLike, centre: ArrayLike, kappa: ArrayLike
) -> Floats:
    r"""Overlap of a measured spectrum with a resonance, exact per piece (1e-12 relative).

    .. math:: \int s(\omega)\, \frac{(\kappa/2)^2}{(\omega-\omega_c)^2+(\kappa/2)^2}\, d\omega

    omega, density: of `frequency_density`; centre, kappa: any broadcastable shapes. [1]
    """
    return sampled_window(
        omega=omega, density=density, centre=centre, kappa=kappa, lower=-np.inf, upper=np.inf
    )


def sampled_window(
    *,
    omega: ArrayLike,
    density: ArrayLike,
    centre: ArrayLike,
    kappa: ArrayLike,
    lower: ArrayLike,
    upper: ArrayLike,
) -> Floats:
    """The overlap of `sampled_overlap`, from `lower` to `upper` only (infinite allowed). [1]"""
    omega, density = np.asarray(omega, np.float64), np.asarray(density, np.float64)

    def total(rows: Floats) -> Floats:
        centre, kappa, lower, upper = rows.T[:, :, np.newaxis]
        nodes = (omega[:-1], omega[1:], density[:-1], density[1:])
        exact = piece_overlaps(*clip_pieces(*nodes, lower, upper), centre, kappa / 2)
        return np.asarray(exact.sum(axis=1))

    rows = max(1, PIECES_IN_MEMORY // omega.size)
    return each_distinct(total, (centre, kappa, lower, upper), rows)


def window_share(
    *, omega: ArrayLike, density: ArrayLike, lower: ArrayLike, upper: ArrayLike
) -> Floats:
    """Share of a measured spectrum from `lower` to `upper` (infinite allowed). [1]

    Only positive terms are added, so that a tiny share keeps its digits.
    """
    omega, density = np.asarray(omega, np.float64), np.asarray(density, np.float64)
    masses = np.append(np.diff(omega) * (density[:-1] + density[1:]) / 2, 0.0)

    def share(rows: Floats) -> Floats:
        lower, upper = np.clip(rows.T, omega[0], omega[-1])
        first = np.clip(np.searchsorted(omega, lower, "right") - 1, 0, omega.size - 2)
        last = np.clip(np.searchsorted(omega, upper, "right") - 1, 0, omega.size - 2)
        whole = np.add.reduceat(masses, np.stack([first + 1, last], axis=-1).ravel())[::2]
        inside = np.where(last > first + 1, whole, 0.0)
        for piece, start, stop in (
            (first, lower, np.minimum(upper, omega[first + 1])),
            (last, np.maximum(lower, omega[last]), np.where(last > first, upper, -np.inf)),
        ):
            nodes = (omega[piece], omega[piece + 1], density[piece], density[piece + 1])
            left, right, below, above = clip_pieces(*nodes, start, stop)
            inside = inside + (right - left) * (below + above) / 2
        return inside

    return each_distinct(share, (lower, upper), 2**20)


def clip_pieces(
    start: Floats, stop: Floats, below: Floats, above: Floats, lower: Floats, upper: Floats
) -> tuple[Floats, Floats, Floats, Floats]:
    """The part of each piece between lower and upper: its ends and its densities there."""
    if np.all(np.isneginf(lower)) and np.all(np.isposinf(upper)):
        return start, stop, below, above
    left = np.clip(lower, start, stop)
    right = np.maximum(np.clip(upper, start, stop), left)
    slope = (above - below) / np.where(stop > start, stop - start, 1.0)

    def density(at: Floats) -> Floats:  # from the nearer end: keeps the digits next to a zero
        nearer = at - start < stop - at
        return np.where(nearer, below + slope * (at - start), above - slope * (stop - at))

    return left, right, density(left), density(right)


def piece_overlaps(
    left: Floats, right: Floats, below: Floats, above: Floats, centre: Floats, half: Floats
) -> Floats:
    r"""Integral of a density linear from left to right times the Lorentzian of half width `half`.

    With x = (ω−ωc)/half and s = a + bx it is half·[a Δatan + b/2 Δlog(1+x²)]. Where a piece is short
    against its distance the two terms cancel; there s is taken about the middle of the piece, and
    the moment of the Lorentzian about it is the power series of 1 − artanh(t)/t, with
    t = (half length)/(ω_middle−ωc−i·half).
    """
    low, high, span = (left - centre) / half, (right - centre) / half, (right - left) / half
    angle = np.arctan2(span, 1 + low * high)
    middle, rise = (low + high) / 2, above - below
    square = 1 + middle**2
    scale = (span / (2 * square)) ** 2
    real, imaginary = scale * (middle**2 - 1), scale * 2 * middle
    lean = imaginary * (1 / 3 + real * 2 / 5 + (3 * real**2 - imaginary**2) / 7)
    total = np.asarray((below + above) / 2 * angle - rise * lean)
    near = span**2 > 1.6e-3 * square
    if near.any():
        cut = (np.broadcast_to(a, near.shape)[near] for a in (low, high, span, angle, below, above))
        total[near] = _near_overlaps(*cut)
    return total * half


def _near_overlaps(
    low: Floats, high: Floats, span: Floats, angle: Floats, below: Floats, above: Floats
) -> Floats:
    slope = (above - below) / span
    nearer = np.abs(low) < np.abs(high)  # from the nearer end: exact where the density vanishes
    value = np.where(nearer, below - slope * low, above - slope * high)
    growth = span * np.abs(low + high) / (1 + np.minimum(low**2, high**2))
    return np.asarray(value * angle + slope / 2 * np.copysign(np.log1p(growth), low + high))


def parts(size: int, length: int) -> Iterator[slice]:
    """Slices of at most `length` that together are 0..size."""
    return (slice(first, first + length) for first in range(0, size, length))


def each_distinct(
    function: Callable[[Floats], Floats], columns: tuple[ArrayLike, ...], length: int
) -> Floats:
    """function(rows) for the broadcast columns, once for each distinct row, in blocks of rows."""
    arrays = np.broadcast_arrays(*(np.asarray(column, np.float64) for column in columns))
    rows = np.stack([array.ravel() for array in arrays], axis=-1)
    order = np.lexsort(rows.T)
    new = np.ones(len(rows), np.bool_)
    new[1:] = np.any(rows[order[1:]] != rows[order[:-1]], axis=1)
    distinct = rows[order[new]]
    values = np.empty(len(distinct))
    for part in parts(len(distinct), length):
        values[part] = function(distinct[part])
    result = np.empty(len(rows))
    result[order] = values[np.cumsum(new) - 1]
    return result.reshape(arrays[0].shape)
