"""What every fit of measured data tells: its curve, its residuals, its goodness, and what to beware of."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..built import Estimate
from .engine import Fit
from .noise import Array, Noise, goodness

#: Residuals that noise alone gives less often than this are said to be more than noise.
RARE = 1e-3


@dataclass(frozen=True, eq=False, kw_only=True)
class Fitted:
    """What is common to the fits of spectra, decays and coincidences.

    name, digest: of the file. level: of confidence of all intervals. model: expected counts at the
    points of the data, (n,), and residuals: signed roots of the deviance of each, of about unit
    variance, (n,); both NaN where a point was not fitted. chi_square, degrees, p_value: goodness; the
    deviance scaled to the χ² that noise alone would give it, so that it holds for few counts too.
    Where the size of the noise is not known, p_value is the chance that neighbouring residuals are
    so alike, as run_p_value always is. cautions: sentences, none where all is well.
    """

    name: str
    digest: str
    level: float
    model: Array
    residuals: Array
    chi_square: float
    degrees: float
    p_value: float
    run_p_value: float
    cautions: tuple[str, ...]

    def __post_init__(self) -> None:
        for value in vars(self).values():
            if isinstance(value, np.ndarray):
                value.setflags(write=False)


def common(
    data: Any, level: float, fit: Fit, noise: Noise, where: NDArray[np.int64] | None = None
) -> dict[str, Any]:
    """The fields of `Fitted` but the cautions. where: indices of the fitted points, None for all."""
    good = goodness(noise, fit.expected, fit.values.size)
    model, residuals = fit.expected, noise.residuals(fit.expected, fit.size)
    if where is not None:
        model, residuals = (_spread(data.counts.size, where, one) for one in (model, residuals))
    return {
        "name": data.name,
        "digest": data.digest,
        "level": level,
        "model": model,
        "residuals": residuals,
        "chi_square": good.chi_square,
        "degrees": good.degrees,
        "p_value": good.p_value,
        "run_p_value": good.run_p_value,
    }


def _spread(size: int, where: NDArray[np.int64], values: Array) -> Array:
    full = np.full(size, np.nan)
    full[where] = values
    return full


def common_cautions(fields: Mapping[str, Any], fit: Fit, words: Mapping[str, str]) -> list[str]:
    """Cautions that any fit may carry. words: of the parameters that have an interval."""
    told = []
    if not fit.valid:
        told.append("the search did not settle on a best fit: take the numbers as a guess")
    told += [
        f"an end of the interval of {words.get(name, name)} was not found: it may reach further"
        for name in sorted(fit.unsure)
    ]
    if fields["p_value"] < RARE:
        told.append(f"the residuals are more than noise (p = {fields['p_value']:.1g})")
    elif fields["run_p_value"] < RARE:
        told.append(
            f"neighbouring residuals are alike (p = {fields['run_p_value']:.1g}): the data have a "
            "shape that the model lacks"
        )
    return told


def mapped(estimate: Estimate, function: Any) -> Estimate:
    """An estimate of a monotone function of what was fitted."""
    ends = [float(function(end)) for end in (estimate.low, estimate.high)]
    return Estimate(float(function(estimate.value)), min(ends), max(ends))
