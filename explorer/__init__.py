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
from .maps import Axis, Map, make_map, mesh
from .prediction import prediction_table
from .record import design_text, load_design, save_design
from .registry import REGISTRY as _REGISTRY
from .registry import check as _check
from .sampling import scattered
from .scatter import Spread
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
    "Influence",
    "InputError",
    "Lines",
    "Map",
    "Origin",
    "Pattern",
    "Quantiles",
    "Range",
    "RecordError",
    "Requirement",
    "Samples",
    "Share",
    "Spread",
    "Unknown",
    "WholeError",
    "Yield",
    "__version__",
    "budget",
    "candidates",
    "combined",
    "design_text",
    "evaluate",
    "influences",
    "keyrate",
    "load_design",
    "make_map",
    "make_yield_map",
    "mesh",
    "prediction_table",
    "quantiles",
    "ranges",
    "save_design",
    "scattered",
    "with_record",
    "yield_of",
]

del _physics
