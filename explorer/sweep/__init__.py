"""Sweeps: the whole trade-off as a table, of every combination or of random rows.

A plan (`factorial`, `sampled`) says which rows there are; `sweep` gives them as a data frame,
`sweep_to` writes any number of them to a file in bounded memory, and goes on where it stopped.
"""

from .faults import PlanError
from .plan import Plan, factorial, sampled
from .run import SweepError, process_pool
from .table import sweep
from .writing import Progress, Written, sweep_to

__all__ = [
    "Plan",
    "PlanError",
    "Progress",
    "SweepError",
    "Written",
    "factorial",
    "process_pool",
    "sampled",
    "sweep",
    "sweep_to",
]
