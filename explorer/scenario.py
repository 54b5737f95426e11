"""The demonstration: a quantum key link from a harbour office to a lighthouse.

Invented, and nothing but the demonstration uses it. 20 million photons per second into the fibre of
the telescope, g²(0) at most 0.1, at room temperature, with a published emitter.
"""

from __future__ import annotations

import math

from .catalogue import emitters, optics
from .design import Design, Origin, Requirement
from .question import Question

EMITTER = "terrylene_crystal"
OPTIC = "single_mode_fibre"

#: What the device team is asked for, invented.
WANTED = (
    Requirement("rate_in_fibre", at_least=20e6),
    Requirement("g2_zero", at_most=0.1),
    Requirement("half_angle", at_most=math.radians(40.0)),
)

#: What the team would build around the emitter, invented.
DEVICE = {
    "quality_factor": 25.0,
    "mode_volume": 1.0,
    "radiative_share": 0.75,
    "upward_share": 0.9,
    "other_modes": 0.5,
    "repetition_rate": 160e6,
    "excitations_per_pulse": 1.2,
    "background_per_pulse": 0.002,
}


def first_question() -> Question:
    """The question that a first visit shows: the scenario, its target missed."""
    records = (emitters()[EMITTER], optics()[OPTIC])
    point: dict[str, object] = {}
    origins: dict[str, Origin] = {}
    for record in records:
        point |= record.inputs()
        for name, (kind, where) in record.origins().items():
            value = record.values.get(name)
            origins[name] = Origin(kind, value.source if value else "", where[:400])
    typed = {name: Origin("typed", "", "invented for the demonstration") for name in DEVICE}
    design = Design(
        point={**point, **DEVICE},
        requirements=WANTED,
        origins={**origins, **typed},
        emitter=EMITTER,
        optic=OPTIC,
        name="Harbour to lighthouse",
        note="Demonstration with an invented device; the emitter's values are published.",
    )
    return Question(design=design)
