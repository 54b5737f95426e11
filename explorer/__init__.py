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
from .design import Decision, Design, Origin, Requirement, Spread, Unknown
from .domain import InputError
from .evaluate import evaluate
from .exact import RecordError
from .inputs import INPUTS
from .maps import Axis, Map, make_map, mesh
from .prediction import prediction_table
from .record import design_text, load_design, save_design
from .registry import REGISTRY as _REGISTRY
from .registry import check as _check
from .unknowns import Influence, Range, influences, ranges
from .version import __version__
from .whole import Lines, Pattern, Samples, WholeError

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
    "Range",
    "RecordError",
    "Requirement",
    "Samples",
    "Spread",
    "Unknown",
    "WholeError",
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
    "mesh",
    "prediction_table",
    "ranges",
    "save_design",
    "with_record",
]

del _physics
