"""What each step of the budget holds back, and what it would give were it ideal."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from ..budget import budget_rows
from ..design import Design
from ..domain import InputError, quoted
from ..evaluate import Evaluation
from ..physics.photons import through
from ..units import text

#: Where a rate arrives -> the steps of the budget up to there.
ARRIVALS = {"rate_at_lens": 6, "rate_in_fibre": 9, "rate_detected": 10}


@dataclass(frozen=True)
class Words:
    """Of a step: by what it holds back, what would be ideal, and what a real change of it also does."""

    held_by: str
    ideal: str
    note: str = ""


#: Step of the budget -> its words.
WORDS = {
    "emitter on": Words("time in which the emitter is off", "An emitter that is always on"),
    "excited and decayed": Words(
        "pulses without a decay",
        "A decay of the exciton after every pulse",
        "Stronger pumping also makes more pairs of photons; decays of the biexciton count in the step.",
    ),
    "photon emitted": Words(
        "decays without a photon",
        "A photon from every decay of the exciton",
        "A better yield or less quenching also changes the lifetime and the share of the mode; the "
        "biexciton's decays without a photon count in the step, and are wanted.",
    ),
    "escaped the resonator": Words(
        "absorption in the resonator",
        "A resonator without absorption",
        "Less absorption also raises Q; light past the mode never crosses the resonator.",
    ),
    "towards the optic": Words(
        "light that heads elsewhere",
        "Sending all light towards the optic",
        "The upward share steers the mode's light alone; half of the light past it stays downward.",
    ),
    "inside the aperture": Words(
        "light outside the aperture",
        "An optic that takes in all that heads for it",
        "Another aperture also changes the match to the fibre.",
    ),
    "through the filter": Words(
        "the filter",
        "An ideal filter",
        "A wider filter also passes more background, which the model does not follow.",
    ),
    "through the optics": Words("loss in the optics", "Optics without loss"),
    "in the fibre": Words(
        "the match to the fibre",
        "An ideal match to the fibre",
        "One fibre cannot match the mode's light and the light past it.",
    ),
    "detected": Words("photons that the detector misses", "An ideal detector"),
}

#: The same under continuous pumping, where it differs.
CONTINUOUS = {
    "excited and decayed": Words(
        "excitations offered in vain",
        "A decay of the exciton for every excitation offered",
        WORDS["excited and decayed"].note,
    )
}

#: A gain below this is none.
NOTICED = 1.005


@dataclass(frozen=True)
class Headroom:
    """What one step of the budget holds back.

    factor: the total after the step over the total before it (of the first step: the bright share).
    headroom: 1/factor; above 1 the step holds back, below 1 it adds (one pulse can start two decays),
    ∞ where nothing passes it, not-a-number where nothing reaches it. now, ideal: photons per second
    that arrive, and that would if this step alone were ideal. alone: ideal over now (1 where both are
    0, ∞ where only now is). words: by what it holds back, and what a real change of it also does.
    """

    step: str
    factor: float
    headroom: float
    alone: float
    now: float
    ideal: float
    words: Words


@dataclass(frozen=True)
class First:
    """The step to improve first (None: no single one gives anything), and a sentence for people."""

    row: Headroom | None
    sentence: str


@dataclass(frozen=True)
class _Path:
    """A way out of one transition: decays per second, the share that goes it, a factor a step."""

    decays: Any
    share: Any
    factors: tuple[Any, ...]

    def arrives(self, steps: int) -> float:
        """Photons per second after so many steps."""
        return float(self.decays * through(self.share, self.factors, steps))

    def opened(self, step: int) -> _Path:
        """The same with one of its factors ideal."""
        factors = [1.0 if at == step else factor for at, factor in enumerate(self.factors)]
        return replace(self, factors=tuple(factors))


def one_design(point: Mapping[str, Any] | Design, what: str) -> Evaluation:
    """The evaluation of one design; InputError for arrays."""
    work = point.evaluation if isinstance(point, Design) else Evaluation(point)
    if work.shape:
        raise InputError(f"{what} is of one design; give single numbers, no arrays")
    return work


def headroom(
    point: Mapping[str, Any] | Design, rate: str = "rate_in_fibre"
) -> tuple[Headroom, ...]:
    r"""What each step of the budget holds back, in the order of the light.

    point: one design, SI, or a `Design`. rate: rate_at_lens, rate_in_fibre or rate_detected. The
    ideal rate is one photon for each excitation offered, were the emitter always on: under pulses the
    repetition rate, under continuous pumping saturation times the decay rate of the device.

    .. math:: N_{ideal} = N \prod_i h_i, \quad h_i = T_{i-1}/T_i

    T the totals of the budget. `alone` is exact: the step keeps everything in every stream, and all
    other factors stay as they are. It differs from `headroom` where streams with unlike later factors
    arrive. Two steps are ideal for the exciton alone, because the biexciton's light comes in pairs
    and its decays without a photon are wanted: after each pulse or excitation offered the exciton
    decays, and each of its decays gives a photon, shared among the ways out as now (not-a-number
    where there is none). Where the rates have no number, no row has one. Raises InputError.
    """
    if not isinstance(rate, str) or rate not in ARRIVALS:
        raise InputError(f"rate = {quoted(rate)} is not one of {', '.join(ARRIVALS)}")
    work = one_design(point, "headroom")
    count = ARRIVALS[rate]
    rows = budget_rows(work)[:count]
    bright = float(work.value("bright_share"))
    totals = [rows[0].total / bright, *(row.total for row in rows)]
    void = math.isnan(rows[-1].total)
    ideal = [math.nan] * count if void else _ideal_rates(work, count)
    words = WORDS | (CONTINUOUS if work.value("pumping") == "continuous" else {})
    found = []
    for at, row in enumerate(rows):
        before, after = totals[at], totals[at + 1]
        factor = after / before if before else math.nan
        back = before / after if after else (math.inf if before else math.nan)
        now = rows[-1].total
        alone = _ratio(ideal[at], now)
        found.append(Headroom(row.step, factor, back, alone, now, ideal[at], words[row.step]))
    return tuple(found)


def _ratio(ideal: float, now: float) -> float:
    if now == 0:
        return 1.0 if ideal == 0 else ideal * math.inf
    return ideal / now


def _ideal_rates(work: Evaluation, count: int) -> list[float]:
    """The rate that would arrive after `count` steps with one after the other of them ideal."""
    steps = count - 3  # those after the emission
    exciton, pair = _paths(work)
    attempts = work.value("attempt_rate")
    dark = work.value("lost_share")
    light = sum(path.share for path in exciton)
    with np.errstate(all="ignore"):
        lit = 1 + dark / light if light > 0 else math.nan
    kept = sum(path.arrives(steps) for path in pair)
    every = [*exciton, *pair]
    found = [
        sum(path.arrives(steps) for path in every) / float(work.value("bright_share")),
        sum(replace(path, decays=attempts).arrives(steps) for path in exciton) + kept,
        sum(replace(path, share=path.share * lit).arrives(steps) for path in exciton) + kept,
    ]
    for step in range(steps):
        found.append(sum(path.opened(step).arrives(steps) for path in every))
    return found


def _paths(work: Evaluation) -> tuple[list[_Path], list[_Path]]:
    """The ways out of the exciton and of the biexciton; none of one that never emits."""
    sides: tuple[list[_Path], list[_Path]] = ([], [])
    for decays, prefix, side in zip(
        work.value("decay_rates"), ("", "biexciton_"), sides, strict=True
    ):
        if prefix and work.value("biexciton_yield") == 0:
            continue
        for share, factors in (("cavity_share", "mode_factors"), ("other_share", "other_factors")):
            side.append(_Path(decays, work.value(prefix + share), work.value(prefix + factors)))
    return sides


def ranked(rows: Iterable[Headroom]) -> tuple[Headroom, ...]:
    """The rows by what their step alone would give, most first; those without number last."""
    return tuple(
        sorted(
            rows, key=lambda row: -math.inf if math.isnan(row.alone) else row.alone, reverse=True
        )
    )


def what_first(rows: Sequence[Headroom]) -> First:
    """The step that would give most if it alone were ideal, and a sentence for people."""
    if all(math.isnan(row.now) for row in rows):
        return First(None, "The photon rates have no number here.")
    best = ranked(rows)[0]
    if not best.alone >= NOTICED:
        if best.now == 0:
            return First(None, "Nothing arrives, and no ideal step alone would change that.")
        return First(None, "No ideal step alone would give more photons.")
    ideal = best.words.ideal
    then = text(best.ideal, "1/s", 2)
    if math.isinf(best.alone):
        return First(best, f"{ideal} alone would let {then} arrive where nothing does.")
    now = text(best.now, "1/s", 2)
    number, _, unit = then.partition(" ")
    shown = number if now.partition(" ")[2] == unit else then
    times = text(best.alone, "1", 2)
    return First(
        best, f"{ideal} alone would give {times} times the photons: {shown} instead of {now}."
    )
