"""A published law of a line's homogeneous width against temperature: a whole value.

Immutable and hashable, one per point. The width is a sum of terms, each in the form in which such
laws are printed; coefficients are full widths at half maximum in Hz.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np

from .whole import WholeError

#: Boltzmann constant [eV/K], exact in the SI of 2019.
BOLTZMANN: Final = 8.617333262145179e-5

#: What the third number of a term means: exponent of T, or an energy [eV].
FORMS: Final = {
    "power": "c·Tᵖ",
    "activated": "c·exp(−E/kT)",
    "phonon": "c/(exp(E/kT) − 1)",
}


@dataclass(frozen=True)
class Broadening:
    """Homogeneous FWHM of an emitter's line against temperature.

    terms: a sequence of (form, coefficient, parameter): 'power' is c·T^p with c [Hz/K^p] and p;
    'activated' c·exp(−E/kT) and 'phonon' c/(exp(E/kT) − 1) with c [Hz] and E [eV]. A constant is a
    power with p = 0. low, high: the temperatures [K] between which the law was measured.
    Raises WholeError.
    """

    terms: tuple[tuple[str, float, float], ...]
    low: float
    high: float

    def __init__(self, terms: Sequence[Sequence[Any]], low: float, high: float) -> None:
        try:
            rows = tuple((str(form), float(size), float(more)) for form, size, more in terms)
            ends = float(low), float(high)
        except (TypeError, ValueError) as error:
            raise WholeError(
                "each term of a broadening is a form and two numbers; low and high are temperatures"
            ) from error
        if not rows or len(rows) > 10:
            raise WholeError(f"a broadening has one to ten terms, not {len(rows)}")
        for index, (form, size, more) in enumerate(rows):
            if form not in FORMS:
                raise WholeError(f"term {index}: {form!r:.40} is none of {', '.join(FORMS)}")
            if not (np.isfinite(size) and np.isfinite(more)) or size < 0 or more < 0:
                raise WholeError(
                    f"term {index}: coefficient and parameter are finite and not below 0"
                )
            if form == "power" and more > 9:
                raise WholeError(f"term {index}: the exponent {more:g} is above 9")
            if form == "phonon" and more == 0:
                raise WholeError(f"term {index}: the energy of a phonon is above 0")
        if not 0 < ends[0] <= ends[1] < np.inf:
            raise WholeError(f"the range of a broadening rises from above 0 K; got {low} to {high}")
        object.__setattr__(self, "terms", rows)
        object.__setattr__(self, "low", ends[0])
        object.__setattr__(self, "high", ends[1])

    def width(self, temperature: Any) -> Any:
        """FWHM [Hz] at a temperature [K], any shape; the law's own shape also outside its range."""
        hot = np.asarray(temperature, dtype=float)
        total = np.zeros_like(hot)
        with np.errstate(over="ignore"):
            for form, size, more in self.terms:
                if form == "power":
                    total = total + size * hot**more
                elif form == "activated":
                    total = total + size * np.exp(-more / (BOLTZMANN * hot))
                else:
                    total = total + size / np.expm1(more / (BOLTZMANN * hot))
        return total
