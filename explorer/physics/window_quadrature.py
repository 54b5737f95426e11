r"""Mean of a window share over slow wandering, weighted with a Lorentzian in the detuning.

A share is the real part of a function that is analytic in the upper half of the detuning plane:
its branch points (where a pole of the spectrum meets an edge) lie below the real axis. So the
contour can be moved up by a few sigma, where a trapezium of 42 nodes converges whatever the
widths, and the pole of the weight is taken along exactly. Three ways, each for the cells where it
is safe:

- every singularity far from the Gaussian: Gauss-Hermite on the real axis;
- else the trapezium on the moved contour, which reports how much it cancels;
- where it cancels (real part far below the modulus): Gauss-Legendre on the real axis, on panels
  that grow away from each singularity, where every term is positive.
"""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from .window_profile import Cells, Complexes, Floats, Gaussian, Profile

_FAR_ABOVE, _FAR_ASIDE = 4.0, 14.0  # distances in sigma at which a singularity no longer matters
_STEP, _RISE, _REACH = (
    0.5,
    3.0,
    18,
)  # trapezium: step and height of the contour in sigma, nodes to each side
_MOST_CANCELLATION = 1e5
_HERMITE_NODES, _HERMITE_WEIGHTS = np.polynomial.hermite_e.hermegauss(16)
_LEGENDRE_NODES, _LEGENDRE_WEIGHTS = np.polynomial.legendre.leggauss(14)
_INNER, _OUTER = np.linspace(-8, 8, 7), np.linspace(8, 15, 4)  # sigma; exp(-15^2/2) = 1e-49
_OUTER_MATTERS = 1e-4  # the Gaussian has 1.2e-15 beyond 8 sigma, the profile is at most 1
_GROWTH = 4.0
_BLOCK = 4096  # cells worked on at a time


def wandering_mean(profile: Profile, gaussian: Gaussian) -> Floats:
    """Mean of profile times weight over mean of weight, shape (cells,); sigma > 0 everywhere."""
    mean = np.empty(gaussian.sigma.size)
    height, offset = _singularities(profile, gaussian)
    smooth = ((height > _FAR_ABOVE) | (np.abs(offset) > _FAR_ASIDE)).all(axis=0)
    for cells in _blocks(np.flatnonzero(smooth)):
        mean[cells] = _hermite(profile, gaussian, cells)
    cancelled = []
    for cells in _blocks(np.flatnonzero(~smooth)):
        mean[cells], cancels = _moved_contour(profile, gaussian, cells)
        cancelled.append(cells[cancels])
    for cells in _blocks(np.concatenate([*cancelled, np.empty(0, np.intp)])):
        mean[cells] = _positive_mean(profile, gaussian, cells, height[:, cells], offset[:, cells])
    return mean / gaussian.mean_weight()


def _blocks(cells: Cells) -> Iterator[Cells]:
    return (cells[start : start + _BLOCK] for start in range(0, cells.size, _BLOCK))


def _singularities(profile: Profile, gaussian: Gaussian) -> tuple[Floats, Floats]:
    """Height over the real axis and offset from the centre of every singularity, in sigma."""
    points = profile.singularities()
    height = np.abs(points.imag) / gaussian.sigma
    offset = (points.real - gaussian.centre) / gaussian.sigma
    inverse = gaussian.inverse * gaussian.sigma
    weight = 1 / np.where(inverse > 1e-6, inverse, 1e-6)
    return np.vstack([height, weight[None]]), np.vstack(
        [offset, (-gaussian.centre / gaussian.sigma)[None]]
    )


def _hermite(profile: Profile, gaussian: Gaussian, cells: Cells) -> Floats:
    detuning = gaussian.centre[cells, None] + gaussian.sigma[cells, None] * _HERMITE_NODES
    values = profile.real(cells, detuning) * gaussian.weight(cells, detuning)
    return np.asarray(values @ (_HERMITE_WEIGHTS / np.sqrt(2 * np.pi)))


def _moved_contour(
    profile: Profile, gaussian: Gaussian, cells: Cells
) -> tuple[Floats, NDArray[np.bool_]]:
    """Trapezium above the real axis, and whether its terms cancel too much.

    The nodes keep half a step from the pole of the weight at i/inverse, below which half of cot
    stands for what the trapezium misses of its residue; the pole may lie on either side of the
    contour.
    """
    centre, sigma = gaussian.centre[cells, None], gaussian.sigma[cells, None]
    steps = centre / (_STEP * sigma)
    first = np.round(steps) + 0.5 - steps
    along = (first + np.arange(-_REACH - 1, _REACH + 1)) * _STEP
    shift = along + np.complex128(1j * _RISE)
    detuning: Complexes = np.asarray(centre + sigma * shift, complex)
    value, size = profile.upper(cells, detuning)
    weight = gaussian.complex_weight(cells, detuning) * np.exp(-(shift**2) / 2)
    weight *= _STEP / np.sqrt(2 * np.pi)
    pole, pole_size = _pole_of_the_weight(profile, gaussian, cells)
    total = (value * weight).real.sum(axis=1) + pole
    size = (size * np.abs(weight)).sum(axis=1) + pole_size
    return total, ~(size <= _MOST_CANCELLATION * np.abs(total))


def _pole_of_the_weight(
    profile: Profile, gaussian: Gaussian, cells: Cells
) -> tuple[Floats, Floats]:
    """What the trapezium misses at the pole of the weight: above 8 sigma below 1e-13."""
    value, size = np.zeros(cells.size), np.zeros(cells.size)
    height = 1 / np.maximum(gaussian.inverse[cells] * gaussian.sigma[cells], 1e-6)  # sigma
    near = height < 8
    if not near.any():
        return value, size
    height, picked = height[near], cells[near]
    sigma = gaussian.sigma[picked]
    place: Complexes = np.asarray(1j * height * sigma, complex)
    upper, terms = profile.upper(picked, place[:, None])
    missed = 2 / (1 + np.exp(2 * np.pi * (height - _RISE) / _STEP))  # 1 - tanh
    exponent = -((1j * height - gaussian.centre[picked] / sigma) ** 2) / 2
    factor = np.sqrt(np.pi / 8) * height * missed * np.exp(exponent)
    value[near], size[near] = (factor * upper[:, 0]).real, np.abs(factor) * terms[:, 0]
    return value, size


def _positive_mean(
    profile: Profile, gaussian: Gaussian, cells: Cells, height: Floats, offset: Floats
) -> Floats:
    """Real axis out to 8 sigma, and to 15 where what may be left there matters."""
    mean = _panels(profile, gaussian, cells, height, offset, _INNER)
    small = np.flatnonzero(mean < _OUTER_MATTERS)
    if small.size:
        for base in (_OUTER, -_OUTER[::-1]):
            part = height[:, small], offset[:, small]
            mean[small] += _panels(profile, gaussian, cells[small], *part, base)
    return mean


def _panels(
    profile: Profile,
    gaussian: Gaussian,
    cells: Cells,
    height: Floats,
    offset: Floats,
    base: Floats,
) -> Floats:
    """Gauss-Legendre on the base panels, cut at distances height * 4^k from every singularity."""
    row, start, end = _cut(cells.size, height, offset, base)
    total = np.zeros(cells.size)
    for part in _blocks(np.arange(row.size)):
        half = (end[part] - start[part])[:, None] / 2
        shift = (end[part] + start[part])[:, None] / 2 + half * _LEGENDRE_NODES
        owner = cells[row[part]]
        detuning = gaussian.centre[owner, None] + gaussian.sigma[owner, None] * shift
        weight = gaussian.weight(owner, detuning) * np.exp(-(shift**2) / 2)
        values = profile.real(owner, detuning) * weight
        total += np.bincount(row[part], (half * values) @ _LEGENDRE_WEIGHTS, cells.size)
    return np.asarray(total / np.sqrt(2 * np.pi))


def _cut(count: int, height: Floats, offset: Floats, base: Floats) -> tuple[Cells, Floats, Floats]:
    """Cell, start and end of every panel, in sigma."""
    # A line without width has no height; nearer than this nothing of it is left out.
    steps = int(np.ceil(np.log(60 / max(height.min(), 1e-30)) / np.log(_GROWTH)))
    growth = np.concatenate([[0], _GROWTH ** np.arange(max(steps, 0) + 1)])
    distance = height[:, :, None] * growth
    cuts = [offset[:, :, None] + distance, offset[:, :, None] - distance]
    flat = [np.moveaxis(cut, 0, 1).reshape(count, -1) for cut in cuts]
    edges = np.concatenate([np.broadcast_to(base, (count, base.size)), *flat], axis=1)
    edges = np.sort(np.clip(edges, base[0], base[-1]), axis=1)
    row, column = np.nonzero(np.diff(edges, axis=1) > 0)
    return row, edges[row, column], edges[row, column + 1]
