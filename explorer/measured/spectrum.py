"""Lines from an emission spectrum: one Voigt line, or a zero-phonon line and its sidebands."""

from __future__ import annotations

import math
from collections.abc import Generator, Iterator
from dataclasses import dataclass, replace

import numpy as np

from ..built import Estimate
from ..domain import InputError, finite_number, quoted
from ..whole import Lines
from .data import DataError, Spectrum
from .engine import Fit, Parameter, checked_level, finish, fit_steps, sketch_steps
from .fitted import Fitted, common, mapped
from .noise import Noise
from .spectrum_cautions import spectrum_cautions
from .spectrum_layout import Guess, Layout, first_guess, with_line
from .spectrum_model import split_width, total_width

SHAPES = ("voigt", "lorentzian", "gaussian")

#: A line must lower the deviance by this much, about five standard deviations of its height.
CLEAR = 30.0

#: A zero-phonon line holds at least this share of the light.
LEAST_SHARE = 0.02

#: Up to this many lines each number has a profile of its own; beyond, those of the sidebands have
#: standard errors.
PROFILED = 3


@dataclass(frozen=True, eq=False, kw_only=True)
class SpectrumFit(Fitted):
    """Fitted lines on a flat background.

    centre: wavelength of the line, or of the zero-phonon line [m]. fast_linewidth, slow_linewidth:
    its FWHM, Lorentzian and Gaussian, the resolution taken out [m]. total_fwhm: of both together
    [m]. background: counts per unit wavelength, as in the data. lines: (share, offset from `centre`,
    fast width) of each, the zero-phonon line first, then by wavelength. shape: voigt, lorentzian or
    gaussian. resolution: FWHM of the spectrometer [m].
    """

    centre: Estimate
    fast_linewidth: Estimate
    slow_linewidth: Estimate
    total_fwhm: Estimate
    background: Estimate
    lines: tuple[tuple[Estimate, Estimate, Estimate], ...]
    shape: str
    resolution: float

    def inputs(self) -> dict[str, Estimate | Lines]:
        """Inputs of a design that follow: numbers with intervals, and `spectrum` for several lines."""
        if len(self.lines) == 1:
            return {
                "emission_wavelength": self.centre,
                "fast_linewidth": self.fast_linewidth,
                "slow_linewidth": self.slow_linewidth,
            }
        rows = [tuple(one.value for one in line) for line in self.lines if line[0].value > 1e-12]
        return {
            "emission_wavelength": self.centre,
            "spectrum": Lines(rows),
            "slow_linewidth": self.slow_linewidth,
        }


def fit_spectrum(
    data: Spectrum,
    *,
    sidebands: int = 0,
    shape: str = "voigt",
    resolution: float = 0.0,
    level: float = 0.95,
) -> SpectrumFit:
    """Lines fitted to a spectrum, with intervals of their profiles.

    sidebands: lines beside the zero-phonon line, 0 to 6, each Lorentzian with a width of its own; the
    slow width is common to all. The zero-phonon line is the narrowest that holds two hundredths of
    the light. shape: "voigt", "lorentzian" (no slow width) or "gaussian" (no fast width of the
    zero-phonon line). resolution: FWHM of the spectrometer's Gaussian response [m]. level: of
    confidence. The likelihood is that of the counts where the file holds counts, else least squares
    with noise of even size. Raises InputError and DataError.
    """
    steps = fit_spectrum_steps(
        data, sidebands=sidebands, shape=shape, resolution=resolution, level=level
    )
    return finish(steps)


def fit_spectrum_steps(
    data: Spectrum,
    *,
    sidebands: int = 0,
    shape: str = "voigt",
    resolution: float = 0.0,
    level: float = 0.95,
) -> Iterator[SpectrumFit | None]:
    """The same in slices of some 30 ms: yields None between them, and the fit last."""
    if not isinstance(data, Spectrum):
        raise InputError("fit_spectrum wants a Spectrum")
    if isinstance(sidebands, bool) or sidebands not in range(7):
        raise InputError(f"sidebands = {quoted(sidebands)} is not a whole number from 0 to 6")
    if shape not in SHAPES:
        raise InputError(f"shape = {quoted(shape)} is not one of {', '.join(SHAPES)}")
    level, width = checked_level(level), finite_number(resolution, "resolution")
    span = float(data.wavelengths[-1] - data.wavelengths[0]) if data.wavelengths.size > 1 else 0.0
    if not 0 <= width < max(span, 1e-12):
        raise InputError(f"resolution = {width:g} m is not from 0 to below the span of the data")
    if data.wavelengths.size < 8 + 3 * sidebands:
        raise DataError(f"{data.wavelengths.size} samples are too few for such a fit", data.name)
    yield None
    yield (yield from _fitted(Layout(data, shape, width, 1), sidebands, level))


def _fitted(layout: Layout, sidebands: int, level: float) -> Generator[None, None, SpectrumFit]:
    data = layout.data
    noise = Noise(data.counts, data.gain, data.floor)
    guess = first_guess(layout, noise)
    fit = yield from fit_steps(layout.model, noise, layout.parameters(guess), level=level)
    flat = yield from _flat(layout, noise)
    if (flat - fit.deviance) / fit.size**2 < CLEAR or fit["area"] <= 0:
        raise DataError("no line stands above the noise", data.name)
    guess = layout.read(fit.values)
    for _ in range(sidebands):
        layout = replace(layout, count=layout.count + 1)
        best = math.inf
        for trial in with_line(layout, noise, guess):
            values, misfit = yield from sketch_steps(layout.model, noise, layout.parameters(trial))
            if misfit < best:
                best, found = misfit, layout.read(values)
        guess = found
    guess = _ordered(guess, layout)
    fit = yield from fit_steps(
        layout.model, noise, layout.parameters(guess), wanted=_wanted(layout), level=level
    )
    total, sure = yield from _total(layout, noise, layout.read(fit.values), fit, level)
    if not sure:
        object.__setattr__(fit, "unsure", fit.unsure | {"total"})
    return _result(layout, noise, fit, total, level)


def _flat(layout: Layout, noise: Noise) -> Generator[None, None, float]:
    """Deviance of a flat background alone."""
    counts = layout.data.counts
    middle = float(np.mean(counts))
    flat = Parameter("level", middle, max(abs(middle), float(np.std(counts))) / 10)
    fit = yield from fit_steps(lambda p: np.full(counts.shape, p[0]), noise, [flat])
    return fit.deviance


def _ordered(guess: Guess, layout: Layout) -> Guess:
    """The zero-phonon line first: the narrowest that is not faint; the others by wavelength."""
    area = sum(line.area for line in guess.lines)
    strong = [line for line in guess.lines if line.area >= LEAST_SHARE * area]
    first = min(strong, key=lambda line: line.fast)
    others = sorted((line for line in guess.lines if line is not first), key=lambda one: one.centre)
    lines = (first, *others)
    if layout.shape == "gaussian" and first is not guess.lines[0]:
        lines = guess.lines
    return replace(guess, lines=lines)


def _wanted(layout: Layout) -> list[str]:
    """Which parameters get a profile."""
    names = [name for name in layout.names if name != "area"]
    if layout.count <= PROFILED:
        return names
    return [name for name in names if name in ("share0", "centre", "fast0", "slow", "background")]


def _total(
    layout: Layout, noise: Noise, found: Guess, fit: Fit, level: float
) -> Generator[None, None, tuple[Estimate, bool]]:
    """FWHM of the (zero-phonon) line with the interval of its own profile."""
    centre = found.lines[0].centre
    if layout.shape != "voigt":
        name = "fast0" if layout.shape == "lorentzian" else "slow"
        if layout.shape == "gaussian":
            return mapped(fit.estimates[name], math.sqrt), True
        return fit.estimates[name], True
    whole = replace(layout, whole=True)
    again = yield from fit_steps(
        whole.model, noise, whole.parameters(found), wanted=["total"], level=level
    )
    given = again.estimates["total"]
    fast, slow = split_width(given.value, again["sharpness"], centre)
    exact = total_width(fast, slow, centre) / max(given.value, 1e-300)
    return mapped(given, lambda width: width * exact), "total" not in again.unsure


def _result(layout: Layout, noise: Noise, fit: Fit, total: Estimate, level: float) -> SpectrumFit:
    nothing = Estimate(0.0, 0.0, 0.0)
    slow = mapped(fit.estimates["slow"], math.sqrt) if "slow" in fit.estimates else nothing
    lines = _lines(layout, fit, level)
    fields = common(layout.data, level, fit, noise)
    return SpectrumFit(
        **fields,
        cautions=spectrum_cautions(layout, fields, fit, lines, slow, total),
        centre=fit.estimates["centre"],
        fast_linewidth=fit.estimates.get("fast0", nothing),
        slow_linewidth=slow,
        total_fwhm=total,
        background=fit.estimates["background"],
        lines=lines,
        shape=layout.shape,
        resolution=layout.resolution,
    )


def _lines(
    layout: Layout, fit: Fit, level: float
) -> tuple[tuple[Estimate, Estimate, Estimate], ...]:
    """Share, offset and fast width of each line."""
    from scipy.special import ndtri

    nothing, wide = Estimate(0.0, 0.0, 0.0), float(ndtri((1 + level) / 2))

    def of(name: str) -> Estimate:
        if name in fit.estimates or name not in fit.names:
            return fit.estimates.get(name, nothing)
        value, half = fit[name], wide * fit.error(name)
        low = max(value - half, 0.0) if name.startswith(("share", "fast")) else value - half
        return Estimate(value, low, value + half)

    last = layout.count - 1
    rows = []
    for k in range(layout.count):
        share = of(f"share{k}") if k < last else _last_share(layout, fit, wide)
        rows.append((share, of(f"offset{k}") if k else nothing, of(f"fast{k}")))
    return tuple(rows)


def _last_share(layout: Layout, fit: Fit, wide: float) -> Estimate:
    """What the other shares leave; with two lines its profile is the mirrored one of the first."""
    if layout.count == 1:
        return Estimate(1.0, 1.0, 1.0)
    if layout.count == 2:
        return mapped(fit.estimates["share0"], lambda share: 1 - share)
    rows = [fit.names.index(f"share{k}") for k in range(layout.count - 1)]
    value = max(1 - float(np.sum(fit.values[rows])), 0.0)
    half = wide * math.sqrt(max(float(np.sum(fit.covariance[np.ix_(rows, rows)])), 0.0))
    return Estimate(value, max(value - half, 0.0), min(value + half, 1.0))
