"""What to beware of in fitted lines, a sentence each."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from ..built import Estimate
from .engine import Fit
from .fitted import common_cautions
from .spectrum_layout import Layout, spacing

#: The data reach over this many widths of the line at least, for its wings to be told from the rest.
WINGS = 5.0

WORDS = {
    "centre": "the wavelength",
    "fast0": "the fast width",
    "slow": "the slow width",
    "total": "the total width",
    "share0": "the share of the first line",
    "background": "the background",
}


def spectrum_cautions(
    layout: Layout,
    fields: Mapping[str, Any],
    fit: Fit,
    lines: tuple[tuple[Estimate, Estimate, Estimate], ...],
    slow: Estimate,
    total: Estimate,
) -> tuple[str, ...]:
    """Sentences; none where all is well."""
    told = common_cautions(fields, fit, WORDS) + _of_the_data(layout, fit, total)
    if layout.shape == "voigt" and slow.low <= 0 < lines[0][2].low:
        told.append("a slow width of zero fits as well: take the upper end as a limit")
    if layout.shape == "voigt" and lines[0][2].low <= 0 < slow.low:
        told.append("a fast width of zero fits as well: take the upper end as a limit")
    if 0 < total.value < layout.resolution:
        told.append(
            "the line is narrower than the resolution: its widths hang on how well that is known"
        )
    for number, (share, _, _) in enumerate(lines[1:], start=1):
        if share.low <= 1e-6:
            told.append(f"sideband {number} may be no more than noise: its share may be zero")
    if layout.data.gain is None:
        told.append(
            "the noise of the spectrum is not known: it is taken from the residuals, as even"
        )
    return tuple(told)


def _of_the_data(layout: Layout, fit: Fit, total: Estimate) -> list[str]:
    """What the range and the spacing of the samples do to the line."""
    told, data, centre = [], layout.data, fit["centre"]
    width = (total.value**2 + layout.resolution**2) ** 0.5
    if width < 3 * spacing(data):
        told.append("the line is narrower than three samples: its width is a guess")
    low, high = float(data.wavelengths[0]), float(data.wavelengths[-1])
    if centre - width / 2 < low or centre + width / 2 > high:
        told.append("the line is cut by the end of the data")
    elif layout.count == 1 and high - low < WINGS * width:
        told.append(
            f"the background is not reached: the data span {(high - low) / width:.1f} widths of the line"
        )
    return told
