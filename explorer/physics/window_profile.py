"""What averages over slow wandering work on: a profile, a weighted Gaussian, logarithms."""

from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import wofz

Floats = NDArray[np.float64]
Complexes = NDArray[np.complex128]
Cells = NDArray[np.intp]


class Profile(Protocol):
    """What is averaged, for cells given by index and detunings of shape (cells, nodes) [rad/s]."""

    def real(self, cells: Cells, detuning: Floats) -> Floats:
        """The share (or density) on the real axis."""

    def upper(self, cells: Cells, detuning: Complexes) -> tuple[Complexes, Floats]:
        """The function analytic above the real axis, its real part the share; size of its terms."""

    def singularities(self) -> Complexes:
        """Its branch points in the detuning (points, cells), above or below the real axis."""


class Gaussian:
    """Gaussian in the detuning and the weight 1/(1 + (detuning/half width)^2), one a cell."""

    def __init__(self, centre: Floats, sigma: Floats, inverse_half_width: Floats) -> None:
        self.centre, self.sigma, self.inverse = centre, sigma, inverse_half_width

    def weight(self, cells: Cells, detuning: Floats) -> Floats:
        """On the real axis."""
        return np.asarray(1 / (1 + (detuning * self.inverse[cells, None]) ** 2))

    def complex_weight(self, cells: Cells, detuning: Complexes) -> Complexes:
        """Above the real axis."""
        return np.asarray(1 / (1 + (detuning * self.inverse[cells, None]) ** 2))

    def mean_weight(self) -> Floats:
        """Gaussian mean of the weight: a Voigt value; 1 where the weight is flat."""
        flat = self.inverse * (self.sigma + np.abs(self.centre)) < 1e-9
        half_width = 1 / np.where(flat, 1, self.inverse)
        scale = np.where(flat, half_width, self.sigma) * np.sqrt(2)
        value = (
            np.sqrt(np.pi) * half_width / scale * wofz((self.centre + 1j * half_width) / scale).real
        )
        return np.where(flat, 1, value)


def flattened(*given: ArrayLike) -> tuple[list[Floats], tuple[int, ...]]:
    """All arguments as flat arrays of their common shape, and that shape."""
    arrays = np.broadcast_arrays(*(np.asarray(x, float) for x in given))
    return [x.ravel() for x in arrays], arrays[0].shape


def log_ratio(
    width: Floats,
    start: NDArray[np.complexfloating],
    end: NDArray[np.complexfloating],
) -> Complexes:
    """Logarithm of end/start, end = start + width, right for narrow windows too."""
    logarithm: Complexes = np.asarray(np.log(end / start), complex)
    step = width / start
    narrow = step.real**2 + step.imag**2 < 0.01
    if narrow.any():
        real, imaginary = step.real[narrow], step.imag[narrow]
        growth = real * (2 + real) + imaginary**2
        logarithm[narrow] = np.log1p(growth) / 2 + 1j * np.arctan2(imaginary, 1 + real)
    return logarithm
