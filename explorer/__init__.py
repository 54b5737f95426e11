"""Choose an emitter and an optical resonator for a single-photon source.

One noun, the point (input name -> SI value), and one verb, `evaluate(point, wanted)`.
Importing this package loads no widget library and no pandas.
"""

from __future__ import annotations

from . import keyrate
from . import physics as _physics
from .broadening import Broadening
from .budget import budget
from .candidates import candidates
from .combine import combined, with_record
from .design import Decision, Design, Origin, Requirement, Unknown
from .domain import InputError
from .evaluate import evaluate
from .exact import RecordError
from .inputs import INPUTS
from .limits import cost_of_spread, elasticities, headroom
from .maps import Axis, Map, make_map, mesh
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
    "Axis",
    "Broadening",
    "Decision",
    "Design",
    "Found",
    "Front",
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
    "evaluate",
    "factorial",
    "headroom",
    "influences",
    "keyrate",
    "load_design",
    "make_map",
    "make_yield_map",
    "mesh",
    "nearest",
    "pareto_front",
    "prediction_table",
    "quantiles",
    "ranges",
    "sampled",
    "save_design",
    "scattered",
    "sturdiest",
    "sweep",
    "sweep_to",
    "with_record",
    "yield_of",
]

del _physics
