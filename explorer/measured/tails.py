"""How much of the light lies beyond the ends of a measured spectrum."""

from __future__ import annotations

import numpy as np

from .data import Array, Spectrum

#: Share of the samples at each end from which its level is taken.
_END = 0.03


def _end_level(counts: Array) -> float:
    """Median of the samples at an end, at least three, at most a quarter of all; not below zero."""
    return max(float(np.median(counts)), 0.0)


def cut_tails(spectrum: Spectrum) -> tuple[float, float]:
    """Estimated shares of the light below the first and above the last wavelength [1].

    Each end goes on like the far wing of a Lorentzian around the peak, counts ∝ 1/(λ − peak)²: what
    lies beyond is counts at the end times its distance from the peak. The peak is the largest of the
    counts, an end the median of the last 3 % of the samples.
    """
    wavelengths, counts = spectrum.wavelengths, spectrum.counts
    few = max(1, min(max(3, round(_END * counts.size)), counts.size // 4))
    peak = spectrum.peak
    below = _end_level(counts[:few]) * (peak - float(wavelengths[0]))
    above = _end_level(counts[-few:]) * (float(wavelengths[-1]) - peak)
    inside = max(float(np.trapezoid(counts, wavelengths)), 0.0)
    total = inside + below + above
    if total <= 0:
        return 0.0, 0.0
    return below / total, above / total


def tails_note(spectrum: Spectrum) -> list[str]:
    """What is said where more than 1 % of the light is cut."""
    share = sum(cut_tails(spectrum))
    if share <= 0.01:
        return []
    return [f"an estimated {100 * share:.2g} % of the light lies beyond the ends of the file"]
