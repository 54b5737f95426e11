"""The formulas, one topic a module. Importing this package registers all of them."""

from . import (
    cautions,
    coherence,
    coupling,
    farfield,
    interface,
    mixtures,
    outcome,
    photons,
    purity,
    sampled_outcome,
    spectra,
)

__all__ = [
    "cautions",
    "coherence",
    "coupling",
    "farfield",
    "interface",
    "mixtures",
    "outcome",
    "photons",
    "purity",
    "sampled_outcome",
    "spectra",
]
