"""Choose an emitter and an optical resonator for a single-photon source.

One noun, the point (input name -> SI value), and one verb, `evaluate(point, wanted)`.
Importing this package loads no widget library and no pandas.
"""

from __future__ import annotations

from . import keyrate
from . import physics as _physics
from .broadening import Broadening
from .budget import budget
from .built import Built, Estimate
from .candidates import candidates
from .combine import combined, with_record
from .design import Decision, Design, Origin, Requirement, Unknown
from .domain import InputError
from .evaluate import evaluate
from .exact import RecordError
from .inputs import INPUTS
from .limits import cost_of_spread, elasticities, headroom
from .maps import Axis, Map, make_map, mesh
from .measured.data import AngularPattern, Coincidences, DataError, Decay, Dropped, Spectrum
from .measured.decay import DecayFit, fit_decay
from .measured.enhancement import Enhancement, enhancement
from .measured.g2 import G2Fit, fit_g2
from .measured.reading import read_coincidences, read_decay, read_pattern, read_spectrum
from .measured.spectrum import SpectrumFit, fit_spectrum
from .measured.use import predicted, with_device, with_measured, without_device
from .prediction import prediction_table
from .record import design_text, load_design, save_design
from .registry import REGISTRY as _REGISTRY
from .registry import check as _check
from .sampling import scattered
from .scatter import Spread
from .search import Found, Front, Goal, best, nearest, pareto_front
from .sturdy import sturdiest
from .sweep import PlanError, SweepError, factorial, sampled, sweep, sweep_to
from .unknowns import Influence, Range, influences, ranges
from .version import __version__
from .whole import Lines, Pattern, Samples, WholeError
from .yield_maps import make_yield_map
from .yields import Quantiles, Share, Yield, quantiles, yield_of

_check()

#: Every quantity by name.
QUANTITIES = _REGISTRY.quantities

#: Every caution by name.
CAUTIONS = _REGISTRY.cautions

__all__ = [
    "CAUTIONS",
    "INPUTS",
    "QUANTITIES",
    "AngularPattern",
    "Axis",
    "Broadening",
    "Built",
    "Coincidences",
    "DataError",
    "Decay",
    "DecayFit",
    "Decision",
    "Design",
    "Dropped",
    "Enhancement",
    "Estimate",
    "Found",
    "Front",
    "G2Fit",
    "Goal",
    "Influence",
    "InputError",
    "Lines",
    "Map",
    "Origin",
    "Pattern",
    "PlanError",
    "Quantiles",
    "Range",
    "RecordError",
    "Requirement",
    "Samples",
    "Share",
    "Spectrum",
    "SpectrumFit",
    "Spread",
    "SweepError",
    "Unknown",
    "WholeError",
    "Yield",
    "__version__",
    "best",
    "budget",
    "candidates",
    "combined",
    "cost_of_spread",
    "design_text",
    "elasticities",
    "enhancement",
    "evaluate",
    "factorial",
    "fit_decay",
    "fit_g2",
    "fit_spectrum",
    "headroom",
    "influences",
    "keyrate",
    "load_design",
    "make_map",
    "make_yield_map",
    "mesh",
    "nearest",
    "pareto_front",
    "predicted",
    "prediction_table",
    "quantiles",
    "ranges",
    "read_coincidences",
    "read_decay",
    "read_pattern",
    "read_spectrum",
    "sampled",
    "save_design",
    "scattered",
    "sturdiest",
    "sweep",
    "sweep_to",
    "with_device",
    "with_measured",
    "with_record",
    "without_device",
    "yield_of",
]

del _physics
