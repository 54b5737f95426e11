"""Writes the invented measurements of the demonstration: what the harbour office's first samples might give.

Each file is drawn with a fixed seed from a known truth, which its first lines state. Run it from
anywhere: python notebooks/measured/make.py
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
from scipy.special import voigt_profile
from scipy.stats import exponnorm

FOLDER = Path(__file__).parent
DRAW = np.random.default_rng(20)

INVENTED = "# Invented for the demonstration of the harbour-to-lighthouse link."


def write(name: str, head: list[str], rows: list[str]) -> None:
    """One file with Unix line ends."""
    text = "\n".join([INVENTED, *head, *rows]) + "\n"
    (FOLDER / name).write_text(text, encoding="utf-8", newline="")


def decay(name: str, lifetime: float, photons: int, jitter: float = 0.08) -> None:
    """Arrival times after a pulse at 5 ns, 16 ps bins over 50 ns [all in ns]."""
    edges = np.arange(0, 3126) * 0.016
    shape = np.diff(exponnorm.cdf(edges, lifetime / jitter, 5.0, jitter)) if lifetime else None
    if shape is None:
        from scipy.stats import norm

        shape = np.diff(norm.cdf(edges, 5.0, jitter))
    counts = DRAW.poisson(photons * shape + 0.8)
    rows = [f"{edge + 0.008:.3f},{count}" for edge, count in zip(edges[:-1], counts, strict=True)]
    truth = (
        f"# Truth: one exponential of {lifetime} ns"
        if lifetime
        else "# Truth: instrument's response"
    )
    write(
        name,
        [f"{truth}, {photons} photons, 0.8 counts a bin of background.", "Time (ns),Counts"],
        rows,
    )


def spectrum() -> None:
    """A Voigt line at 583 nm, 26 nm fast and 9 nm slow, with a flat background; semicolons, decimal comma."""
    wavelength = np.linspace(480.0, 720.0, 601)
    c = 299_792.458  # nm THz
    frequency, centre = c / wavelength, c / 583.0
    fast, slow = (c * width / 583.0**2 for width in (26.0, 9.0))
    line = voigt_profile(frequency - centre, slow / 2.354820045, fast / 2) * c / wavelength**2
    counts = DRAW.poisson(4000 * line / line.max() + 60)
    rows = [f"{w:.1f}".replace(".", ",") + f";{n}" for w, n in zip(wavelength, counts, strict=True)]
    head = ["# Truth: 583 nm, fast width 26 nm, slow width 9 nm, 60 counts a row of background."]
    write("emission.csv", [*head, "Wavelength [nm];Counts"], rows)
    dark = DRAW.poisson(60, wavelength.size)
    rows = [f"{w:.1f}".replace(".", ",") + f";{n}" for w, n in zip(wavelength, dark, strict=True)]
    write("emission_background.csv", ["Wavelength [nm];Counts"], rows)


def coincidences() -> None:
    """Pulses every 50 ns, g²(0) = 0.06, decay 4.4 ns, one chance coincidence a bin; tabs."""
    delay = np.arange(-1300, 1301) * 0.25
    order = np.arange(-7, 8)
    peaks = np.exp(-np.abs(delay[:, None] - 50.0 * order) / 4.4)
    counts = DRAW.poisson((peaks * np.where(order == 0, 0.06, 1.0)).sum(axis=1) * 60 + 1.0)
    rows = [f"{t:.2f}\t{n}" for t, n in zip(delay, counts, strict=True)]
    write(
        "coincidences.txt", ["# Truth: g2(0) 0.06, decay 4.4 ns.", "Delay (ns)\tCoincidences"], rows
    )


def pattern() -> None:
    """A beam of 16 degrees half-angle on a weak wide floor, over both sides of the axis."""
    angle = np.arange(-88.0, 88.5, 2.0)
    power = 0.5 ** (np.sin(np.radians(angle)) ** 2 / np.sin(np.radians(16.0)) ** 2) + 0.04 * np.cos(
        np.radians(angle)
    )
    rows = [f"{a:g} {p:.5f}" for a, p in zip(angle, power, strict=True)]
    write(
        "pattern.txt",
        ["# From a full-wave computation of the device, invented.", "theta(deg) power"],
        rows,
    )


if __name__ == "__main__":
    decay("decay_bare.csv", 3.6, 200_000)
    decay("decay_device.csv", 4.4, 150_000)
    decay("response.csv", 0.0, 300_000)
    spectrum()
    coincidences()
    pattern()
