"""Regimes, and how alike two photons are."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..registry import quantity, variant
from .coherence_kernel import off_resonance, wandering_average


@quantity("1", label="Strong-coupling ratio", symbol="2g/(κ+Γ)", group="regime", log=True)
def strong_ratio(*, coupling_rate: Any, resonator_linewidth: Any, coherence_decay: Any) -> Any:
    """Exchange over all losses, 2g/(κ+Γ) [1]; above 1 the regime is strong coupling."""
    return 2 * coupling_rate / (resonator_linewidth + coherence_decay)


@quantity("1", label="Funnelling ratio", symbol="Γ/κ", group="regime", log=True)
def funnelling_ratio(*, resonator_linewidth: Any, coherence_decay: Any) -> Any:
    """Emitter's line over the resonator's, Γ/κ [1]; above 1 the resonator is the narrower one."""
    return coherence_decay / resonator_linewidth


@quantity("1", label="Splitting ratio", symbol="8g²/(κ²+Γ²)", group="regime", log=True)
def splitting_ratio(*, coupling_rate: Any, resonator_linewidth: Any, coherence_decay: Any) -> Any:
    """8g²/(κ²+Γ²) [1]; above 1 the outgoing spectrum on resonance is a visible doublet."""
    return 8 * coupling_rate**2 / (resonator_linewidth**2 + coherence_decay**2)


#: Words of the quantity `regime`.
REGIMES = ("Purcell", "funnelling", "strong")


@quantity(
    "1", label="Regime", group="regime", source="auffeves2009", kind="choice", choices=REGIMES
)
def regime(*, strong_ratio: Any, funnelling_ratio: Any) -> Any:
    """'strong' where 2g > κ + Γ, else 'funnelling' where Γ > κ, else 'Purcell'."""
    return np.where(
        strong_ratio > 1, "strong", np.where(funnelling_ratio > 1, "funnelling", "Purcell")
    )


@quantity("1", label="Visible splitting", group="regime", kind="mask")
def splitting(*, splitting_ratio: Any) -> Any:
    """Whether the outgoing spectrum on resonance is a visible doublet: g² > (κ²+Γ²)/8."""
    return splitting_ratio > 1


@quantity(
    "1",
    label="Indistinguishability",
    symbol="I",
    source="grange2015",
    group="photons",
    note="of successive photons leaving through the resonator; one line, one excitation",
)
def indistinguishability(
    *,
    coupling_rate: Any,
    decay_elsewhere: Any,
    pure_dephasing: Any,
    resonator_linewidth: Any,
    detuning: Any,
    slow_deviation: Any,
) -> Any:
    r"""How alike successive photons through the resonator are, exact for one line.

    .. math:: I = \frac{\iint |\langle a^\dagger(t+\tau) a(t)\rangle|^2}
       {\iint \langle a^\dagger a\rangle(t) \langle a^\dagger a\rangle(t+\tau)},
       \quad \langle\beta^2 I\rangle/\langle\beta^2\rangle \text{ over slow wandering}

    From the quantum regression theorem; both limits of Grange et al. 1 without dephasing.
    """
    return wandering_average(
        g_squared=coupling_rate**2,
        gamma=decay_elsewhere,
        dephasing=pure_dephasing,
        kappa=resonator_linewidth,
        detuning=detuning,
        sigma=slow_deviation,
    )


@variant("indistinguishability", slow_linewidth=0)
def still_indistinguishability(
    *,
    coupling_rate: Any,
    decay_elsewhere: Any,
    pure_dephasing: Any,
    resonator_linewidth: Any,
    detuning: Any,
) -> Any:
    """The same without wandering."""
    return off_resonance(
        g_squared=coupling_rate**2,
        gamma=decay_elsewhere,
        dephasing=pure_dephasing,
        kappa=resonator_linewidth,
        detuning=detuning,
    )
