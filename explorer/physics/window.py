"""Share of light inside a frequency window, for every kind of line: the public names in one place.

`outgoing_*`: the light that leaves the resonator, one homogeneous line. `wandering_*`: the same
averaged over slow wandering. `line_*`: a bare emitter line. Angular frequencies in rad/s, arrays
that broadcast against each other.
"""

from .window_average import wandering_density, wandering_window
from .window_line import line_density, line_window
from .window_outgoing import outgoing_density, outgoing_window

__all__ = [
    "line_density",
    "line_window",
    "outgoing_density",
    "outgoing_window",
    "wandering_density",
    "wandering_window",
]
