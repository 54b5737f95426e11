"""Measured data: read from a file, fitted, and used as inputs of a design.

Reading loads pandas and fitting loads iminuit, each when it is first asked for.
"""

from __future__ import annotations

from .data import AngularPattern, Coincidences, DataError, Decay, Dropped, Estimate, Spectrum

__all__ = [
    "AngularPattern",
    "Coincidences",
    "DataError",
    "Decay",
    "Dropped",
    "Estimate",
    "Spectrum",
]
