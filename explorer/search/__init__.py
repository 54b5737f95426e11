"""What would it take? The nearest design that meets the requirements, and the best one.

    found = nearest(point, requirements, {"quality_factor": (10, 1e4), "mode_volume": (0.1, 10)})
    found.met, found.reason, found.point

Distances count on the scales of the inputs, so inputs of different kinds compare. A search samples the
box evenly, goes down from the best places of the sample (SLSQP of scipy), and checks what it returns as
one design by itself. The same call gives the same answer. The `…_steps` functions do the same in slices
of some tens of milliseconds and yield the best so far after each.
"""

from __future__ import annotations

from .found import Found, Front, Goal
from .front import front_steps, pareto_front
from .optimum import best, best_steps, nearest, nearest_steps
from .scale import Scale

__all__ = [
    "Found",
    "Front",
    "Goal",
    "Scale",
    "best",
    "best_steps",
    "front_steps",
    "nearest",
    "nearest_steps",
    "pareto_front",
]
