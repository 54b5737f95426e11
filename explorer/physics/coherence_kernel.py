"""Indistinguishability of successive photons that leave through a resonator: exact, and fast.

The ratio of the two-time integrals of |<a'(t) a(t+T)>|^2 and <a'a>(t) <a'a>(t+T), a' the adjoint
of a, for one emitter that starts excited (quantum regression theorem). Rates are energy decay rates
(kappa, gamma), `dephasing` adds half of itself to the decay of the emitter's coherence; detunings
and sigma are angular frequencies. All in 1/s, g_squared in 1/s^2, any broadcastable shapes.

Every polynomial below has positive coefficients and positive arguments, so nothing cancels; in
units of kappa nothing overflows while the rates lie within a factor 1e16 of each other. On a map
gamma/kappa and dephasing/kappa often vary along one axis only, so they are eliminated first and
4 g^2 comes last.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import zip_longest

import numpy as np
from numpy.typing import NDArray

from .coherence_terms import CAVITY_SHARE, OVERLAP, SPECTRUM, TWO_TIMES, Table
from .wandering_nodes import FAR, narrowest, rules

Array = NDArray[np.float64]
Number = float | Array

CELLS_AT_ONCE = 16384  # their coefficients are held together: about 2 MB


def on_resonance(*, g_squared: Number, gamma: Number, dephasing: Number, kappa: Number) -> Number:
    """Indistinguishability at zero detuning, one emitter and one mode; 1 without dephasing.

    In units of kappa, with G = 4 g^2, a = gamma (all decay but the mode's) and b = dephasing:
    I = [(1+a) G + a (1+a+b)] (u1 G + u0) / [(G + a + b) (1+a+b) (v1 G + v0)].
    """
    big, a, b = _in_units_of_kappa(g_squared, gamma, dephasing, kappa)
    bare = 13 * a * (a + 1) + 3 * (a * a * a + 1)
    u0 = bare + b * (7 * a * a + 19 * a + 10 + b * (5 * a + 6 + b))
    v0 = bare + b * (4 * a * a + 8 * a + 4 + b * (a + 1))
    decay = a + b + 1
    upper = _polynomial([u0 / decay, (4 * (a + 1) + b) / decay], big)
    lower = _polynomial([v0, 4 * (a + 1) + 2 * b], big)
    share = _polynomial([a * decay, a + 1], big) / (big + (a + b))
    return share * (upper / lower)


def off_resonance(
    *, g_squared: Number, gamma: Number, dephasing: Number, kappa: Number, detuning: Number
) -> Number:
    """Indistinguishability at any detuning; even in it. `on_resonance` is its value at zero."""
    big, a, b = _in_units_of_kappa(g_squared, gamma, dephasing, kappa)
    x = np.square(2 * detuning / kappa)
    share, overlap, spectrum, two_times = (
        _polynomial([_polynomial(by_x, x) for by_x in zip_longest(*rows, fillvalue=0.0)], big)
        for rows in (
            _in_x_and_coupling(table, a, b)
            for table in (CAVITY_SHARE, OVERLAP, SPECTRUM, TWO_TIMES)
        )
    )
    return share / spectrum * (overlap / two_times) / (1 + a + b)


def wandering_average(
    *,
    g_squared: Number,
    gamma: Number,
    dephasing: Number,
    kappa: Number,
    detuning: Number,
    sigma: Number,
) -> Number:
    """Indistinguishability while the emitter's frequency wanders slowly: <beta^2 I>/<beta^2>.

    The averages are over detunings of mean `detuning` and standard deviation `sigma`; beta is the
    share of the excitation that leaves through the mode. Two successive photons see one detuning.
    A cell with sigma = 0 gives `off_resonance`. The quadrature is right to 2e-10 relative whatever
    the widths; but for rounding, the value of a cell does not depend on its neighbours.
    """
    given = (g_squared, gamma, dephasing, kappa, detuning, sigma)
    if not np.any(sigma):
        return off_resonance(
            g_squared=g_squared,
            gamma=gamma,
            dephasing=dephasing,
            kappa=kappa,
            detuning=detuning + sigma,
        )
    shape = np.broadcast_shapes(*(np.shape(value) for value in given))
    cells = [np.array(value, dtype=np.float64, ndmin=max(1, len(shape))) for value in given]
    result = np.empty(shape or (1,))
    rows = max(1, CELLS_AT_ONCE * len(result) // max(1, result.size))
    for start in range(0, len(result), rows):
        part = slice(start, start + rows)
        # an axis of length one stays whole: what varies along one axis is computed once
        block = [cell if len(cell) == 1 else cell[part] for cell in cells]
        result[part] = _averages(*block).reshape(result[part].shape)
    average: Number = result.reshape(shape)[()]
    return average


def _in_units_of_kappa(
    g_squared: Number, gamma: Number, dephasing: Number, kappa: Number
) -> tuple[Number, Number, Number]:
    """4 g^2, gamma and dephasing in units of kappa."""
    return g_squared * (4 / kappa / kappa), gamma / kappa, dephasing / kappa


def _in_x_and_coupling(table: Table, a: Number, b: Number) -> list[list[Number]]:
    """Coefficients by power of x = (2 detuning/kappa)^2, then of 4 g^2."""
    return [
        [_polynomial([_polynomial(row, a) for row in rows], b) for rows in block] for block in table
    ]


def _polynomial(coefficients: Sequence[Number], argument: Number) -> Number:
    """Horner's scheme, lowest power first."""
    value = coefficients[-1]
    for coefficient in coefficients[-2::-1]:
        value = value * argument
        value = value + coefficient
    return value


def _averages(
    g_squared: Array, gamma: Array, dephasing: Array, kappa: Array, detuning: Array, sigma: Array
) -> Array:
    """The averages of a block of cells, flat."""
    distance = np.full(np.broadcast_shapes(detuning.shape, sigma.shape), np.inf)
    np.divide(abs(detuning), sigma, out=distance, where=sigma > 0)
    # lengths in units of sigma, or of the detuning where that is far larger
    scale = np.square(2 * np.where(distance > FAR, abs(detuning), sigma) / kappa)
    big, a, b = map(np.asarray, _in_units_of_kappa(g_squared, gamma, dephasing, kappa))
    shape = np.broadcast_shapes(big.shape, a.shape, b.shape, scale.shape)
    share, overlap, spectrum, two_times = (
        _coefficients(_in_x_and_coupling(table, a, b), big, scale, shape)
        for table in (CAVITY_SHARE, OVERLAP, SPECTRUM, TWO_TIMES)
    )
    narrow = np.minimum(np.minimum(narrowest(share), narrowest(spectrum)), narrowest(two_times))
    lower = np.zeros((4, narrow.size))
    lower[:3] = spectrum[0] * two_times
    lower[1:] += spectrum[1] * two_times
    result = np.empty(narrow.size)
    for cells, nodes, weights in rules(narrow, np.broadcast_to(distance, shape).reshape(-1)):
        x = np.square(nodes)
        inverse = 1 / _at(share[:, cells], x)
        kernel = _at(overlap[:, cells], x) / _at(lower[:, cells], x) * inverse
        inverse *= inverse
        result[cells] = _summed(weights, kernel) / _summed(weights, inverse)
    result /= np.broadcast_to(1 + a + b, shape).reshape(-1)
    return result


def _coefficients(
    rows: Sequence[Sequence[Number]], big: Array, scale: Array, shape: tuple[int, ...]
) -> Array:
    """Coefficients of the powers of x, (powers, cells), once lengths are in another unit."""
    found = np.empty((len(rows), *shape))
    for power, row in enumerate(rows):
        found[power] = _polynomial(row, big) * scale**power
    return found.reshape(len(rows), -1)


def _at(coefficients: Array, x: Array) -> Array:
    """Values (nodes, cells); nodes that all cells share come as a column: a matrix product."""
    if x.shape[1] == 1:
        shared: Array = np.power(x, np.arange(len(coefficients))) @ coefficients
        return shared
    return np.asarray(_polynomial(list(coefficients), x))


def _summed(weights: Array, values: Array) -> Array:
    """The weighted sum over nodes."""
    return np.asarray(np.einsum("nc,nc->c", np.broadcast_to(weights, values.shape), values))
