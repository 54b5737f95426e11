"""What is known of the noise of measured counts: its likelihood, its residuals, and how good a fit is."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

#: Expected counts are not taken below this in the likelihood, so that it stays finite.
LEAST = 1e-9

#: Events that a group holds about at least where goodness is judged.
FEW = 4.0

#: Above these expected counts the mean and the variance of a deviance follow from their series.
MANY = 60.0


@dataclass(frozen=True, eq=False)
class Noise:
    """Measured values and the variance of each.

    values: (n,). gain, floor: the variance of a value of expectation μ is gain·μ + floor, both (n,);
    gain 1 and floor 0 is Poisson. None: noise of even, unknown size. Where the values are counts
    less a background and divided by a response, the quasi-likelihood of this variance is the Poisson
    likelihood of the counts. scaled: whether the size of the gain was taken from a fit's residuals.
    """

    values: Array
    gain: Array | None = None
    floor: Array | None = None
    scaled: bool = False

    @classmethod
    def poisson(cls, counts: Array) -> Noise:
        """Counts that are numbers of events."""
        return cls(counts, np.ones(counts.shape), np.zeros(counts.shape))

    def scaled_to(self, expected: Array, fitted: int) -> Noise:
        """Variance in proportion to the expectation, its factor from the residuals of a fit."""
        scatter = float(np.sum((self.values - expected) ** 2)) / float(np.sum(np.abs(expected)))
        scatter *= self.values.size / max(self.values.size - fitted, 1)
        shape = self.values.shape
        return Noise(self.values, np.full(shape, max(scatter, 1e-12)), np.zeros(shape), True)

    @cached_property
    def _steps(self) -> Array:
        """Counts in a value of one; a gain of almost nothing is raised until rounding is harmless."""
        assert self.gain is not None
        assert self.floor is not None
        return np.asarray(np.maximum(self.gain, 1e-5 * np.sqrt(self.floor)))

    @cached_property
    def _offset(self) -> Array:
        assert self.floor is not None
        return np.asarray(self.floor / self._steps**2)

    @cached_property
    def _events(self) -> Array:
        return np.asarray(self.values / self._steps + self._offset)

    @cached_property
    def _negative(self) -> bool:
        return bool(np.any(self._events < 0))

    @property
    def even(self) -> bool:
        """Whether the size of the noise is unknown."""
        return self.gain is None

    def events(self, expected: Array) -> Array:
        """Expected values as numbers of events."""
        return np.asarray(np.maximum(expected / self._steps + self._offset, LEAST))

    def deviances(self, expected: Array) -> Array:
        """What each value adds to the deviance; the squared difference where the noise is even."""
        if self.even:
            return np.asarray((self.values - expected) ** 2)
        from scipy.special import kl_div

        mean = self.events(expected)
        if not self._negative:
            return np.asarray(2 * kl_div(self._events, mean))
        below = np.minimum(self._events, 0.0)
        return np.asarray(2 * (kl_div(self._events - below, mean) - below * np.log(mean)))

    def deviance(self, expected: Array) -> float:
        """Twice the logarithm of the likelihood, below that of a perfect fit; or a sum of squares."""
        return float(np.sum(self.deviances(expected)))

    def variance(self, expected: Array) -> Array:
        """Variance of each value; 1 where the noise is even."""
        if self.even:
            return np.ones(self.values.shape)
        return np.asarray(self.events(expected) * self._steps**2)

    def grouped(self, expected: Array) -> tuple[Array, Array]:
        """Numbers of events and their expectations, neighbours joined until a few are expected."""
        mean = self.events(expected)
        if float(np.min(mean)) >= FEW:
            return self._events, mean
        group = np.floor(np.cumsum(mean) / FEW)
        starts = np.flatnonzero(np.diff(group, prepend=-1.0) > 0)
        number, mean = np.add.reduceat(self._events, starts), np.add.reduceat(mean, starts)
        return np.asarray(number), np.asarray(mean)

    def residuals(self, expected: Array, scale: float = 1.0) -> Array:
        """Signed roots of the deviances; over `scale`, the size of even noise."""
        sign = np.sign(self.values - expected)
        return np.asarray(sign * np.sqrt(np.maximum(self.deviances(expected), 0.0)) / scale)


@dataclass(frozen=True)
class Goodness:
    """How good a fit is.

    chi_square, degrees: the deviance and what noise alone would give it, scaled so that together
    they are a χ² and its degrees of freedom, also where counts are few. p_value: chance that noise
    alone gives as much. run_p_value: chance that noise alone makes neighbouring residuals as alike.
    """

    chi_square: float
    degrees: float
    p_value: float
    run_p_value: float


def goodness(noise: Noise, expected: Array, fitted: int) -> Goodness:
    """How good a fit of `fitted` parameters is.

    Counts: neighbours are joined until some are expected in each; their deviance has the mean and the variance that Poisson numbers of these expectations
    give it, less one for each parameter, and is compared with the scaled χ² of that mean and
    variance (Satterthwaite, Biometrics Bull. 2, 110 (1946)). Noise of unknown size: it is taken from the
    residuals, so that only neighbouring residuals that are alike can speak against the fit.
    """
    from scipy import special

    if noise.even or noise.scaled:
        degrees = float(noise.values.size - fitted)
        pearson = (noise.values - expected) / np.sqrt(noise.variance(expected))
        run = _run_chance(pearson / np.sqrt(np.sum(pearson**2) / degrees))
        return Goodness(degrees, degrees, run, run)
    number, mean = noise.grouped(expected)
    run = _run_chance((number - mean) / np.sqrt(mean))
    each, spread = _deviance_moments(mean)
    full = float(np.sum(each))
    middle = full * (1 - fitted / number.size)
    if middle <= 0:
        return Goodness(0.0, 0.0, 1.0, run)
    unit = float(np.sum(spread)) / full / 2
    grouped = Noise.poisson(number)
    chi_square, degrees = grouped.deviance(mean) / unit, middle / unit
    return Goodness(chi_square, degrees, float(special.chdtrc(degrees, chi_square)), run)


def _run_chance(pearson: Array) -> float:
    """Chance that neighbours of independent numbers of unit variance are as alike."""
    from scipy import special

    alike = float(np.sum(pearson[1:] * pearson[:-1])) / np.sqrt(max(pearson.size - 1, 1))
    return float(special.ndtr(-alike))


def _deviance_moments(expected: Array) -> tuple[Array, Array]:
    """Mean and variance of the deviance of Poisson numbers about their expectation."""
    grid, means, variances = _moment_table()
    place = np.log(np.maximum(expected, LEAST))
    many = expected > MANY
    series = 1 / (6 * np.maximum(expected, 1.0))
    mean = np.where(many, 1 + series, np.interp(place, grid, means))
    return mean, np.where(many, 2 + 4 * series, np.interp(place, grid, variances))


@lru_cache(maxsize=1)
def _moment_table() -> tuple[Array, Array, Array]:
    from scipy import special

    grid = np.linspace(np.log(LEAST), np.log(1.1 * MANY), 400)
    count = np.arange(200.0)[:, None]
    chance = np.exp(count * grid - np.exp(grid) - special.gammaln(count + 1))
    each = 2 * special.kl_div(count, np.exp(grid))
    mean = np.sum(chance * each, axis=0)
    return grid, mean, np.sum(chance * (each - mean) ** 2, axis=0)
