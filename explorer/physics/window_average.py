r"""Shares of light inside a frequency window under slow wandering of the line.

Outgoing light: with p1, p2 the poles of the spectrum in the upper half plane and e = kappa
detuning/(kappa + Gamma), the share in a window is the real part of

.. math:: G(\delta)=\frac{i}{\pi}\,\frac{(p_2-e)\,\ell_1-(p_1-e)\,\ell_2}{p_1-p_2},
          \qquad \ell_j=\ln\frac{u-p_j}{l-p_j},

analytic for Im delta > 0 (partial fractions; the norm cancels every other denominator). Its
branch points are delta = w - i Gamma/2 - i g^2/(kappa/2 + iw) with w an edge.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from .window_outgoing import finite_edges, outgoing_density, outgoing_window
from .window_poles import Line
from .window_profile import (
    Cells,
    Complexes,
    Floats,
    Gaussian,
    flattened,
    log_ratio,
)
from .window_quadrature import wandering_mean

#: A depth below the real axis that no cell feels [rad/s].
_NOWHERE = 1e40


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

    <beta S_window>/<beta> over detunings of mean `detuning` and standard deviation `sigma` >= 0
    [rad/s]; beta is the share of decays through the resonator against a rate `gamma` <= coherence
    of every other decay [rad/s]. The rest and the shapes as for `outgoing_window`, which sigma =
    0 gives. Right to 1e-9 while an edge, or the mean, is not over 1e6 sigma away.
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
    """Outgoing spectrum averaged over slow wandering [s/rad], its integral 1.

    frequency [rad/s] from the resonance; the rest as for `wandering_window`.
    """
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
    """The line, and beta(delta) as a Lorentzian in the detuning.

    Its width is (kappa + Gamma) sqrt((R0 kappa + gamma R0 + gamma kappa)/(gamma kappa)).
    """
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


def _complex_poles(line: Line, detuning: Complexes) -> tuple[Complexes, Complexes, Complexes]:
    """Poles that start from mode and emitter, and half their distance; NaN where they coincide."""
    distance = detuning + 0.5j * (line.coherence - line.kappa)
    gap = np.sqrt((distance / 2) ** 2 + line.g_squared)
    gap = np.where((np.conj(distance) * gap).real < 0, -gap, gap)
    gap[gap == 0] = np.nan  # such a cell goes to the real axis
    push = line.g_squared / (distance / 2 + gap)
    mode, emitter = 0.5j * line.kappa - push, detuning + 0.5j * line.coherence + push
    return np.asarray(mode), np.asarray(emitter), np.asarray(gap)


def _less_the_mean(
    line: Line, detuning: Complexes, mode: Complexes, emitter: Complexes
) -> tuple[Complexes, Complexes]:
    """Both poles minus e: the product is known as a sum, so the smaller one keeps its digits."""
    total, loss = line.kappa + line.coherence, line.kappa * line.coherence
    of_mode, of_emitter = (
        mode - line.kappa / total * detuning,
        emitter - line.kappa / total * detuning,
    )
    product = -(loss / 4 + line.g_squared + loss * (detuning / total) ** 2)
    emitter_larger = np.abs(of_emitter) >= np.abs(of_mode)
    smaller = product / np.where(emitter_larger, of_emitter, of_mode)
    return np.where(emitter_larger, smaller, of_mode), np.where(emitter_larger, of_emitter, smaller)


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
        line = Line(*(x[cells, None] for x in self.line))
        low, high = self.low[cells, None], self.high[cells, None]
        mode, emitter, gap = _complex_poles(line, detuning)
        of_mode, of_emitter = _less_the_mean(line, detuning, mode, emitter)
        first = of_emitter * log_ratio(high - low, low - mode, high - mode)
        second = of_mode * log_ratio(high - low, low - emitter, high - emitter)
        factor = -0.5j / np.pi / gap
        size = np.abs(factor) * (np.abs(first) + np.abs(second))
        return np.asarray(factor * (first - second)), np.asarray(size)

    def singularities(self) -> Complexes:
        # where the poles coincide below the axis, the window may hold one and not the other
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
        return np.asarray(value), np.asarray(np.abs(value))

    def singularities(self) -> Complexes:
        return _meeting(self.frequency, self.line)[None]
