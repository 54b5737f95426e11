"""Lines, resonances and filters on the frequency axis."""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np

from ..broadening import Broadening
from ..registry import part, quantity, variant
from ..whole import Lines, Samples
from .coupling import CIRCLE, angular_width
from .sampled import SampledLine, frequency_density, window_share
from .sampled_wandering import wandering_share
from .window import line_window, outgoing_window, wandering_window

#: Standard deviation of a Gaussian over its FWHM.
DEVIATION = 1 / (2 * np.sqrt(2 * np.log(2)))


@part
def detuning(*, emission_wavelength: Any, resonance_wavelength: Any) -> Any:
    """Emission minus resonance [rad/s], without the difference of two large frequencies."""
    gap = resonance_wavelength - emission_wavelength
    return CIRCLE * gap / (emission_wavelength * resonance_wavelength)


@part
def biexciton_line_detuning(
    *, emission_wavelength: Any, biexciton_shift: Any, resonance_wavelength: Any
) -> Any:
    """Biexciton line minus resonance [rad/s]."""
    line = emission_wavelength + biexciton_shift
    return CIRCLE * (resonance_wavelength - line) / (line * resonance_wavelength)


@part
def slow_deviation(*, slow_linewidth: Any, emission_wavelength: Any) -> Any:
    """Standard deviation of the slow wandering [rad/s]."""
    return angular_width(slow_linewidth, emission_wavelength) * DEVIATION


@lru_cache(maxsize=16)
def measured_line(spectrum: Samples, wavelength: float) -> SampledLine:
    """A measured spectrum on the frequency axis, with the tables made from it."""
    omega, density = frequency_density(
        wavelengths=wavelength + spectrum.offsets, counts=spectrum.counts
    )
    return SampledLine(omega=omega - CIRCLE / wavelength, density=density)


@part
def law_width() -> Any:
    """Fast linewidth [m] where no broadening law is given: a usual one at room temperature."""
    return np.float64(20e-9)


@variant("law_width", broadening=Broadening)
def width_at_temperature(*, broadening: Any, temperature: Any, emission_wavelength: Any) -> Any:
    """Fast linewidth [m] of a published law at the temperature.

    A FWHM Δ at λ is the angular width 2πcΔ/(λ² − Δ²/4); this is its inverse, written without a
    difference of near numbers.
    """
    path = CIRCLE / (2 * np.pi * broadening.width(temperature))
    return 2 * emission_wavelength**2 / (path + np.hypot(path, emission_wavelength))


@part
def line_widths(*, spectrum: Any, fast_linewidth: Any) -> Any:
    """Of several lines: the fast width of each [m], its own or that of the point."""
    return tuple(fast_linewidth if width is None else width for _, _, width in spectrum.lines)


@part
def line_table(*, spectrum: Any, line_widths: Any, emission_wavelength: Any, lifetime: Any) -> Any:
    """Of several lines: (share, shift from the centre [rad/s], pure dephasing [rad/s]) each."""
    rows = []
    for (share, offset, _), width in zip(spectrum.lines, line_widths, strict=True):
        own = emission_wavelength + offset
        shift = -CIRCLE * offset / (emission_wavelength * own)
        rows.append((share, shift, np.maximum(angular_width(width, own) - 1 / lifetime, 0)))
    return tuple(rows)


@variant("pure_dephasing", spectrum=Lines)
def strongest_line_dephasing(*, spectrum: Any, line_table: Any) -> Any:
    """Pure dephasing of the strongest of several lines [rad/s]."""
    return line_table[spectrum.strongest][2]


@variant("pure_dephasing", spectrum=Samples)
def measured_dephasing(*, measured: Any, lifetime: Any) -> Any:
    """Pure dephasing that would give the FWHM of a measured spectrum [rad/s]."""
    return np.maximum(measured(lambda line: line.fwhm) - 1 / lifetime, 0)


@part
def measured(*, spectrum: Any, emission_wavelength: Any) -> Any:
    """A function that applies another to the measured spectrum at each emission wavelength.

    The other takes a SampledLine, whose frequencies count from the centre of the emission, and
    arrays in the shape of the wavelength; each distinct wavelength has one SampledLine.
    """

    def apply(function: Any, *arrays: Any) -> Any:
        if np.ndim(emission_wavelength) == 0:
            return function(measured_line(spectrum, float(emission_wavelength)), *arrays)
        wavelength, *spread = np.broadcast_arrays(emission_wavelength, *arrays)
        result = np.empty(wavelength.shape)
        for one in np.unique(wavelength):
            cells = wavelength == one
            line = measured_line(spectrum, float(one))
            result[cells] = function(line, *(array[cells] for array in spread))
        return result

    return apply


@quantity("1", label="Spectral overlap", symbol="O", source="auffeves2009", log=True)
def spectral_overlap(*, resonator_linewidth: Any, coherence_decay: Any, detuning: Any) -> Any:
    r"""Rate into the mode over that of a much narrower line on resonance.

    .. math:: O = \frac{\kappa}{\kappa+\Gamma} \Big/ \left[1 + \Big(\frac{2\delta}{\kappa+\Gamma}\Big)^2\right]

    Rates [rad/s]. At the mean detuning, with the fast width only. Any broadcastable shapes.
    """
    width = resonator_linewidth + coherence_decay
    return resonator_linewidth / width / (1 + (2 * detuning / width) ** 2)


@variant("spectral_overlap", spectrum=Lines)
def overlap_of_lines(
    *, resonator_linewidth: Any, decay_elsewhere: Any, detuning: Any, line_table: Any
) -> Any:
    """The same for several lines, weighted by their shares."""
    total = 0.0
    for share, shift, dephasing in line_table:
        width = resonator_linewidth + decay_elsewhere + dephasing
        offset = 2 * (detuning + shift) / width
        total = total + share * resonator_linewidth / width / (1 + offset**2)
    return total


@part
def filter_edges(*, filter_width: Any, filter_centre: Any, resonance_wavelength: Any) -> Any:
    """Lower and upper edge of the filter minus the resonance [rad/s].

    From the distances in wavelength, which keep their digits where the filter is far narrower than
    the rounding of a wavelength.
    """
    offset, half = resonance_wavelength - filter_centre, filter_width / 2
    longest, shortest = filter_centre + half, filter_centre - half
    closed = np.isfinite(longest)
    safe = np.where(closed, longest, 1.0)
    lower = CIRCLE * np.where(closed, (offset - half) / safe, -1.0) / resonance_wavelength
    open_above = shortest <= 0
    safe = np.where(open_above, 1.0, shortest)
    upper = CIRCLE * (offset + half) / (resonance_wavelength * safe)
    return lower, np.where(open_above, np.inf, upper)


@quantity("1", label="Filter share", symbol="ηf", group="collection")
def filter_share(*, mode_light_window: Any, filter_width: Any) -> Any:
    r"""Share of the mode's light that passes the filter.

    .. math:: \eta_f = \int_{\rm filter} S\,d\omega, \quad
       S \propto \big|(\kappa/2+i\omega)(\Gamma/2+i(\omega-\delta))+g^2\big|^{-2}

    One line: the exact outgoing spectrum, averaged with the share of the mode over slow wandering.
    Several lines and measured spectra: the product of line and resonance, right for R << γ.
    Right to 1e-9 where the filter is wider than 1e-6 of its distance from the resonance; a narrower
    one loses the rounding of its two edges over its width.
    """
    return np.where(np.isinf(filter_width), 1.0, mode_light_window)


@variant("filter_share", filter_width=np.inf)
def no_filter() -> Any:
    """Without a filter all light passes."""
    return 1.0


@part
def mode_light_window(
    *,
    filter_edges: Any,
    resonator_linewidth: Any,
    decay_elsewhere: Any,
    coherence_decay: Any,
    coupling_rate: Any,
    detuning: Any,
    slow_deviation: Any,
) -> Any:
    """Share of the mode's light inside the filter, one line that wanders."""
    return wandering_window(
        lower=filter_edges[0],
        upper=filter_edges[1],
        kappa=resonator_linewidth,
        gamma=decay_elsewhere,
        coherence=coherence_decay,
        g_squared=coupling_rate**2,
        detuning=detuning,
        sigma=slow_deviation,
    )


@variant("mode_light_window", slow_linewidth=0)
def still_light_window(
    *,
    filter_edges: Any,
    resonator_linewidth: Any,
    coherence_decay: Any,
    coupling_rate: Any,
    detuning: Any,
) -> Any:
    """The same, one line that does not wander."""
    return outgoing_window(
        lower=filter_edges[0],
        upper=filter_edges[1],
        kappa=resonator_linewidth,
        coherence=coherence_decay,
        g_squared=coupling_rate**2,
        detuning=detuning,
    )


@quantity("1", label="Filter share of other light", symbol="ηfo", group="collection")
def other_filter_share(*, own_light_window: Any, filter_width: Any) -> Any:
    r"""Share of the light past the mode that passes the filter: the emitter's own spectrum.

    A Lorentzian of width :math:`\gamma^*+1/\tau`, the lines or the measured spectrum, broadened by
    the slow wandering. [1]
    """
    return np.where(np.isinf(filter_width), 1.0, own_light_window)


@variant("other_filter_share", filter_width=np.inf)
def no_other_filter() -> Any:
    """Without a filter all light passes."""
    return 1.0


@part
def own_light_window(
    *, filter_edges: Any, detuning: Any, pure_dephasing: Any, lifetime: Any, slow_deviation: Any
) -> Any:
    """Share of a single line's own light inside the filter."""
    return line_window(
        lower=filter_edges[0],
        upper=filter_edges[1],
        centre=detuning,
        width=pure_dephasing + 1 / lifetime,
        sigma=slow_deviation,
    )


@variant("own_light_window", spectrum=Lines)
def own_window_of_lines(
    *, filter_edges: Any, detuning: Any, line_table: Any, lifetime: Any, slow_deviation: Any
) -> Any:
    """Share of several lines' own light inside the filter; unknown light is stopped."""
    total = 0.0
    for share, shift, dephasing in line_table:
        total = total + share * line_window(
            lower=filter_edges[0],
            upper=filter_edges[1],
            centre=detuning + shift,
            width=dephasing + 1 / lifetime,
            sigma=slow_deviation,
        )
    return total


@variant("own_light_window", spectrum=Samples, slow_linewidth=0)
def own_window_of_still_samples(*, filter_edges: Any, detuning: Any, measured: Any) -> Any:
    """Share of a measured spectrum inside the filter."""
    return measured(
        lambda line, lower, upper: window_share(
            omega=line.omega, density=line.density, lower=lower, upper=upper
        ),
        filter_edges[0] - detuning,
        filter_edges[1] - detuning,
    )


@variant("own_light_window", spectrum=Samples)
def own_window_of_samples(
    *, filter_edges: Any, detuning: Any, measured: Any, slow_deviation: Any
) -> Any:
    """The same of a measured spectrum that wanders as a whole."""
    return measured(
        lambda line, lower, upper, sigma: wandering_share(
            omega=line.omega, density=line.density, lower=lower, upper=upper, sigma=sigma
        ),
        filter_edges[0] - detuning,
        filter_edges[1] - detuning,
        slow_deviation,
    )
