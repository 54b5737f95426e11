r"""Shares of light inside a frequency window under slow wandering of the line.

Outgoing light: with p1, p2 the poles of the spectrum in the upper half plane and e = kappa detuning/(kappa + Gamma), the share in
a window is the real part of

.. math:: G(\delta)=\frac{i}{\pi}\,\frac{(p_2-e)\,\ell_1-(p_1-e)\,\ell_2}{p_1-p_2},\qquad \ell_j=\ln\frac{u-p_j}{l-p_j},

analytic for Im delta > 0 (partial fractions; the norm cancels every other denominator). Its branch points are
delta = w - i Gamma/2 - i g^2/(kappa/2 + iw) with w an edge.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from explorer.physics.window_outgoing import Line, finite_edges, outgoing_density, outgoing_window
from explorer.physics.window_quadrature import (
    Cells,
    Complexes,
    Floats,
    Gaussian,
    flattened,
    log_ratio,
    wandering_mean,
)

_NOWHERE = 1e40  # rad/s


def wandering_window(
    *,
    lower: ArrayLike,
    upper: ArrayLike,
    kappa: ArrayLike,
    gamma: ArrayLike,
    coherence: ArrayLike,
    g_squared: ArrayLike,
    detuning: ArrayLike,
    sigma: ArrayLike,
) -> Floats:
    """Share of the light through the resonator inside [lower, upper], averaged over slow wandering.

    <beta S_window>/<beta> over detunings of mean `detuning` and standard deviation `sigma` >= 0 [rad/s]; beta is the share of
    decays through the resonator against a rate `gamma` <= coherence of every other decay [rad/s]. The rest and the shapes as
    for `outgoing_window`, which sigma = 0 gives. Right to 1e-9 while an edge, or the mean, is not over 1e6 sigma away.
    """
    arrays, shape = flattened(lower, upper, kappa, gamma, coherence, g_squared, detuning, sigma)
    low, high, *_ = arrays
    line, gaussian = _line_and_weight(*arrays[2:])
    low, high = finite_edges(
        low, high, line._replace(detuning=np.abs(line.detuning) + 40 * gaussian.sigma)
    )
    share = outgoing_window(lower=low, upper=high, **line._asdict())
    moves = np.flatnonzero(gaussian.sigma > 0)
    if moves.size:
        profile = _OutgoingWindow(low[moves], high[moves], Line(*(x[moves] for x in line)))
        share[moves] = wandering_mean(profile, _taken(gaussian, moves))
    return share.reshape(shape)


def wandering_density(
    *,
    frequency: ArrayLike,
    kappa: ArrayLike,
    gamma: ArrayLike,
    coherence: ArrayLike,
    g_squared: ArrayLike,
    detuning: ArrayLike,
    sigma: ArrayLike,
) -> Floats:
    """Outgoing spectrum averaged over slow wandering [s/rad], its integral 1; arguments as for `wandering_window`."""
    arrays, shape = flattened(frequency, kappa, gamma, coherence, g_squared, detuning, sigma)
    line, gaussian = _line_and_weight(*arrays[1:])
    density = outgoing_density(frequency=arrays[0], **line._asdict())
    moves = np.flatnonzero(gaussian.sigma > 0)
    if moves.size:
        profile = _OutgoingDensity(arrays[0][moves], Line(*(x[moves] for x in line)))
        density[moves] = wandering_mean(profile, _taken(gaussian, moves))
    return density.reshape(shape)


def _line_and_weight(
    kappa: Floats,
    gamma: Floats,
    coherence: Floats,
    g_squared: Floats,
    detuning: Floats,
    sigma: Floats,
) -> tuple[Line, Gaussian]:
    """The line, and beta(delta) as a Lorentzian: 1/W^2 = gamma kappa/[(R0 kappa + gamma R0 + gamma kappa)(kappa + Gamma)^2]."""
    total = kappa + coherence
    exchange = 4 * g_squared / total
    slow = exchange * (kappa + gamma) + gamma * kappa
    inverse = (
        2 / total * np.sqrt(np.where(slow > 0, gamma * kappa / np.where(slow > 0, slow, 1), 1))
    )
    return Line(kappa, coherence, g_squared, detuning), Gaussian(detuning, sigma, inverse)


def _taken(gaussian: Gaussian, cells: Cells) -> Gaussian:
    return Gaussian(gaussian.centre[cells], gaussian.sigma[cells], gaussian.inverse[cells])


def _meeting(frequency: Floats, line: Line) -> Complexes:
    """The complex detuning at which a pole of the spectrum sits at a real frequency."""
    return np.asarray(
        frequency - 0.5j * line.coherence - 1j * line.g_squared / (line.kappa / 2 + 1j * frequency)
    )


@dataclass(frozen=True)
class _OutgoingWindow:
    low: Floats
    high: Floats
    line: Line

    def real(self, cells: Cells, detuning: Floats) -> Floats:
        kappa, coherence, g_squared, _ = (x[cells, None] for x in self.line)
        return outgoing_window(
            lower=self.low[cells, None],
            upper=self.high[cells, None],
            kappa=kappa,
            coherence=coherence,
            g_squared=g_squared,
            detuning=detuning,
        )

    def upper(self, cells: Cells, detuning: Complexes) -> tuple[Complexes, Floats]:
        kappa, coherence, g_squared, _ = (x[cells, None] for x in self.line)
        low, high = self.low[cells, None], self.high[cells, None]
        total = kappa + coherence
        distance = detuning + 0.5j * (coherence - kappa)  # bare emitter minus bare mode
        gap = np.sqrt((distance / 2) ** 2 + g_squared)
        gap = np.where((np.conj(distance) * gap).real < 0, -gap, gap)
        push = g_squared / (distance / 2 + gap)
        mode, emitter = 0.5j * kappa - push, detuning + 0.5j * coherence + push
        logarithms = (
            log_ratio(high - low, low - mode, high - mode),
            log_ratio(high - low, low - emitter, high - emitter),
        )
        shifted = kappa * detuning / total
        direct = emitter - shifted
        # their product is known without a difference, so the smaller one keeps its digits
        product = -(kappa * coherence / 4 + g_squared + kappa * coherence * (detuning / total) ** 2)
        other = mode - shifted
        emitter_larger = np.abs(direct) >= np.abs(other)
        larger = np.where(emitter_larger, direct, other)
        smaller = product / larger
        direct, other = (
            np.where(emitter_larger, larger, smaller),
            np.where(emitter_larger, smaller, larger),
        )
        terms = direct * logarithms[0], -other * logarithms[1]
        factor = -0.5j / np.pi / gap
        return factor * (terms[0] + terms[1]), np.abs(factor) * (
            np.abs(terms[0]) + np.abs(terms[1])
        )

    def singularities(self) -> Complexes:
        # where the two poles coincide below the axis, the window may hold one of them and not the other
        kappa, coherence, g_squared, _ = self.line
        coupling = np.sqrt(g_squared)
        depth = np.where(4 * coupling > kappa, 2 * coupling + (coherence - kappa) / 2, _NOWHERE)
        edges = _meeting(self.low, self.line), _meeting(self.high, self.line)
        return np.stack([*edges, -1j * depth])


@dataclass(frozen=True)
class _OutgoingDensity:
    frequency: Floats
    line: Line

    def real(self, cells: Cells, detuning: Floats) -> Floats:
        kappa, coherence, g_squared, _ = (x[cells, None] for x in self.line)
        return outgoing_density(
            frequency=self.frequency[cells, None],
            kappa=kappa,
            coherence=coherence,
            g_squared=g_squared,
            detuning=detuning,
        )

    def upper(self, cells: Cells, detuning: Complexes) -> tuple[Complexes, Floats]:
        kappa, coherence, g_squared, _ = (x[cells, None] for x in self.line)
        frequency = self.frequency[cells, None]
        total = kappa + coherence
        poles = (frequency - 0.5j * kappa) * (frequency - detuning - 0.5j * coherence) - g_squared
        value = 1j / np.pi * (coherence * detuning / total + 0.5j * total - frequency) / poles
        return value, np.abs(value)

    def singularities(self) -> Complexes:
        return _meeting(self.frequency, self.line)[None]
