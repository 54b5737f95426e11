"""What holds a design back, and what to improve first: step by step, input by input, spread by spread.

`headroom` says where photons stay on their way, `elasticities` what a small change of each input
gives, `cost_of_spread` what the scatter of each input costs.
"""

from __future__ import annotations

from .levers import Elasticity, elasticities, elasticity_steps
from .spreads import Devices, SpreadCost, SpreadCosts, cost_of_spread, cost_steps
from .steps import First, Headroom, headroom, ranked, what_first

__all__ = [
    "Devices",
    "Elasticity",
    "First",
    "Headroom",
    "SpreadCost",
    "SpreadCosts",
    "cost_of_spread",
    "cost_steps",
    "elasticities",
    "elasticity_steps",
    "headroom",
    "ranked",
    "what_first",
]
