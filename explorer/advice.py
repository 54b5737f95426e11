"""Cautions that belong to the catalogue records a design came from, not to its numbers."""

from __future__ import annotations

from .catalogue import emitters, resonators
from .design import Design

#: Index of an emitter's own surroundings from which a coverslip is no reference for it.
HIGH_INDEX = 1.9


def record_cautions(design: Design) -> tuple[tuple[str, str], ...]:
    """Name and sentence of each caution of the records named in a design."""
    found = []
    emitter = emitters().get(design.emitter)
    if emitter is not None:
        if emitter.caution:
            found.append(("emitter_record", emitter.caution))
        host = emitter.values.get("host_index")
        if host is not None and host.value_si >= HIGH_INDEX:
            sentence = (
                f"{emitter.name}: measured inside a solid of index {host.shown}; gains over a bare "
                "emitter on a coverslip are only a guide."
            )
            found.append(("emitter_reference", sentence))
    resonator = resonators().get(design.resonator)
    if resonator is not None:
        if resonator.caution:
            found.append(("resonator_record", resonator.caution))
        if resonator.gaussian_beam is False and "pattern" not in design.point:
            sentence = (
                f"{resonator.name}: a resonator of this class is not known to radiate a Gaussian "
                "beam; angles and collected share assume one."
            )
            found.append(("resonator_beam", sentence))
    return tuple(found)
