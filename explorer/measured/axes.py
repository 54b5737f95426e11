"""Numbers of a file to SI, and what an axis of energy or frequency does to counts per unit of it."""

from __future__ import annotations

from decimal import Decimal

import numpy as np
from scipy import constants

from .columns import Unit
from .data import Array


def shifted(values: Array, exponent: int) -> Array:
    """Values times a power of ten by a shift of the decimal exponent, as units.to_si does it, (n,)."""
    if exponent == 0:
        return values.copy()
    behind = f"e{exponent}"
    return np.array(
        [
            float(text + behind) if "e" not in text else float(Decimal(text).scaleb(exponent))
            for text in map(repr, values.tolist())
        ],
        dtype=np.float64,
    )


def times(values: Array, unit: Unit) -> Array:
    """Times [s] of numbers in a unit of time, or of channel numbers of a given width, (n,)."""
    if unit.step is not None:
        # Fifteen digits of the product: 3 × 0.1 ns is 0.3 ns.
        values = np.array([float(f"{value * unit.step:.15g}") for value in values.tolist()])
    return shifted(values, unit.exponent)


def vacuum_wavelengths(values: Array, unit: Unit) -> Array:
    """Vacuum wavelengths [m] of wavelengths, photon energies, frequencies or wavenumbers above 0."""
    if unit.family == "length":
        return shifted(values, unit.exponent)
    size = shifted(values, unit.exponent)
    if unit.family == "energy":
        return constants.h * constants.c / constants.e / size
    if unit.family == "frequency":
        return constants.c / size
    return 1.0 / size


def axis_values(wavelength: float, unit: Unit) -> float:
    """A vacuum wavelength [m] as a number in a unit of the axis, about."""
    scale = {
        "length": wavelength,
        "energy": constants.h * constants.c / constants.e / wavelength,
        "frequency": constants.c / wavelength,
        "wavenumber": 1.0 / wavelength,
    }[unit.family]
    return scale / 10.0**unit.exponent


def jacobian(wavelengths: Array, unit: Unit) -> Array | None:
    """Steps of an axis per step of wavelength, relative: counts per unit axis times it are per wavelength.

    |dE/dλ| = hc/λ² for photon energies, and the same power of λ for frequencies and wavenumbers; None
    for an axis of wavelength. wavelengths: [m], (n,). Relative to the mean of the first and the last.
    """
    if unit.family == "length":
        return None
    middle = 0.5 * (wavelengths[0] + wavelengths[-1])
    return np.asarray((middle / wavelengths) ** 2)
