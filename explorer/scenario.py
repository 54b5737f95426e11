"""The demonstration: a quantum key link from a harbour office to a lighthouse.

Invented, and nothing but the demonstration uses it. 20 million photons per second into the fibre of
the telescope, g²(0) at most 0.1, at room temperature, with a published emitter.
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

from .combine import with_record
from .design import Design, Origin, Requirement
from .question import Question
from .scatter import Spread

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

#: How the devices would differ, invented.
SCATTER = {
    "resonance_wavelength": Spread("normal", 3e-9),
    "quality_factor": Spread("lognormal", 0.1),
    "mode_volume": Spread("lognormal", 0.1),
    "lateral_offset": Spread("radial", 40e-9),
}

#: The link that the source is for, invented: from it and the key rate the wanted rate follows.
LINK: dict[str, Any] = {
    "medium": "air",
    "key": 150.0,  # kbit/s
    "length": 9.0,  # km, over water
    "visibility": 20.0,  # km
    "per_kilometre": 0.2,  # dB/km, if it went through a fibre
    "other_loss": 5.4,  # dB
    "receiver": 50.0,  # %
    "dark_rate": 200.0,  # 1/s
    "gate": 2.0,  # ns
    "error": 1.5,  # %
    "g2": 0.1,
}


def first_question() -> Question:
    """The question that a first visit shows: the scenario, its target missed."""
    bare = Design(
        requirements=WANTED,
        name="Harbour to lighthouse",
        note="Demonstration with an invented device; the emitter's values are published.",
    )
    published = with_record(with_record(bare, "emitter", EMITTER), "optic", OPTIC)
    typed = {name: Origin("typed", "", "invented for the demonstration") for name in DEVICE}
    design = replace(
        published,
        point={**published.point, **DEVICE},
        origins={**published.origins, **typed},
        scatter=SCATTER,
    )
    return Question(design=design)
