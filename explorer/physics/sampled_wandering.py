"""Measured spectra that wander as a whole, seen without a resonance: the light past the mode.

The density s(ω) of `sampled` shifted by a Gaussian of standard deviation σ, angular frequencies
[rad/s] from any common origin; arrays broadcast.
"""

import numpy as np
from numpy.typing import ArrayLike

from .sampled_pieces import Floats, each_distinct, parts, window_share
from .window_line import gaussian_share

#: Where the integrand is cut beside an edge, in σ: half a σ apart, and 1e-19 lies beyond.
_CUTS = np.linspace(-9.0, 9.0, 37)
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(8)

PIECES_AT_ONCE = 4096


def wandering_share(
    *, omega: ArrayLike, density: ArrayLike, lower: ArrayLike, upper: ArrayLike, sigma: ArrayLike
) -> Floats:
    r"""Share of a measured spectrum from `lower` to `upper`, averaged over slow wandering. [1]

    .. math:: \int s(\omega) \left[\Phi\!\left(\frac{u-\omega}{\sigma}\right)
              - \Phi\!\left(\frac{l-\omega}{\sigma}\right)\right] d\omega

    omega, density: of `frequency_density`; lower, upper may be infinite; sigma = 0 is the sharp
    window. Cut at every sample and every half σ beside the edges, so that each panel is smooth, and
    only positive terms are added: right to 1e-9 relative down to shares of 1e-15.
    """
    omega, density = np.asarray(omega, np.float64), np.asarray(density, np.float64)
    sigma = np.asarray(sigma, np.float64)
    still = window_share(omega=omega, density=density, lower=lower, upper=upper)
    pieces = [slice(part.start, part.stop + 1) for part in parts(omega.size - 1, PIECES_AT_ONCE)]

    def share(rows: Floats) -> Floats:
        return np.asarray(sum(_share(omega[piece], density[piece], rows) for piece in pieces))

    rows = max(1, PIECES_AT_ONCE // (omega.size + 2 * _CUTS.size))
    moved = each_distinct(share, (lower, upper, np.where(sigma > 0, sigma, 1.0)), rows)
    return np.where(sigma > 0, moved, still)


def _share(omega: Floats, density: Floats, rows: Floats) -> Floats:
    """The integral from the first to the last of some samples, for each (lower, upper, sigma)."""
    lower, upper, sigma = rows.T[:, :, np.newaxis]
    samples = np.broadcast_to(omega, (len(rows), omega.size))
    beside = sigma * _CUTS
    cuts = np.sort(np.concatenate([samples, lower + beside, upper + beside], axis=1), axis=1)
    cuts = np.clip(cuts, omega[0], omega[-1])
    half = np.diff(cuts)[:, :, np.newaxis] / 2
    at = cuts[:, :-1, np.newaxis] + half * (1 + _NODES)
    lower, upper, sigma = (column[:, :, np.newaxis] for column in (lower, upper, sigma))
    low, high = (lower - at) / sigma, (upper - at) / sigma
    inside = gaussian_share(low, high, np.broadcast_to((upper - lower) / sigma, at.shape))
    values = inside * np.interp(at, omega, density) * half
    return np.asarray((values @ _WEIGHTS).sum(axis=1))
