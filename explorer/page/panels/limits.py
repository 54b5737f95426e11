"""What limits the design: what to improve, to fabricate better and to measure first."""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

from ipywidgets import HTML, Dropdown, Label, VBox

from ...inputs import INPUTS
from ...limiting import Limits
from ...limits import Elasticity, Headroom, SpreadCosts
from ...question import Answer
from ...registry import REGISTRY
from ...sentence import hundred, in_labels
from ...units import text
from ...unknowns import Influence
from ...yields import Share, Yield
from ..state import State

WORKING = '<p class="x-plain">working …</p>'

NOTHING = "Nothing is given as a range. Type one, such as 3.4–3.9, into the number box of what is not known."

UNASKED = "Nothing is required, so every device passes. Say what is wanted on the left."

STILL = "Nothing scatters. Press ± beside a slider to say how much an input differs from device to device."

#: A share of devices below this is none [of 1].
LEAST = 5e-4

#: Most levers that are listed.
LEVERS = 6


class LimitsPanel(VBox):
    """A quantity, and three ranked lists of what stands in its way."""

    def __init__(self, state: State) -> None:
        self._state = state
        options = [(e.label, e.name) for e in REGISTRY.quantities.values() if e.kind == "number"]
        self.quantity = Dropdown(options=options, tooltip="Quantity whose limits are shown")
        self.quantity.add_class("x-menu")
        self.improve, self.fabricate, self.list = HTML(), HTML(), HTML()
        super().__init__(
            [
                self.quantity,
                _title("What to improve first"),
                self.improve,
                _title("What to fabricate better"),
                self.fabricate,
                _title("What to measure first"),
                self.list,
            ]
        )
        self.add_class("panel-limits")
        self._open = self._chosen = False
        self.quantity.observe(lambda _: self._ask(), "value")
        state.on_answer(self._draw)

    def opened(self, is_open: bool) -> None:
        """Hear that the view is opened or closed; nothing is worked out for a closed one."""
        if is_open and not self._chosen:  # later what a person chose stays
            self._chosen = True
            wanted = self._state.question.design.requirements
            self.quantity.value = wanted[0].quantity if wanted else "rate_in_fibre"
        self._open = is_open
        self._ask()

    def _ask(self) -> None:
        self._state.ask(ranked=self.quantity.value if self._open else "")

    def _draw(self, answer: Answer) -> None:
        if not answer.question.ranked or not self._open:
            return
        unit = REGISTRY.quantities[answer.question.ranked].unit
        self.improve.value = WORKING if answer.limits is None else improvements(answer.limits)
        self.list.value = WORKING if answer.ranking is None else ranked(answer.ranking, unit)
        design = answer.question.design
        if not design.scatter or not design.requirements:
            why = STILL if design.requirements else UNASKED
            self.fabricate.value = f'<p class="x-plain">{escape(why)}</p>'
        elif answer.limits is None:
            self.fabricate.value = WORKING
        else:
            self.fabricate.value = fabrication(answer.limits, answer.passing)


def _title(words: str) -> Label:
    label = Label(words)
    label.add_class("x-title")
    return label


def improvements(limits: Limits) -> str:
    """Steps of the budget by what each alone would give, and what small changes give, as HTML."""
    parts = []
    if limits.steps:
        parts.append(f'<p class="x-first">{escape(limits.first)}</p>')
        rows = "".join(_step(row) for row in _by_gain(limits.steps))
        parts.append(
            '<table class="x-budget x-ranked"><caption>photons/s if this step alone were ideal</caption>'
            f"<tbody>{rows}</tbody></table>"
        )
    levers = [row for row in limits.levers if row.lever and not _at_its_best(row)][:LEVERS]
    if levers:
        label = REGISTRY.quantities[limits.quantity].label
        rows = "".join(_lever(row, abs(levers[0].value)) for row in levers)
        parts.append(
            f'<table class="x-budget x-ranked"><caption>what 1 % more of each does to {escape(label)}'
            f"</caption><tbody>{rows}</tbody></table>"
        )
    if limits.fault:
        parts.append(_plain(limits.fault))
    return "".join(parts) or _plain("Nothing here would change it.")


def _plain(words: str) -> str:
    return f'<p class="x-plain">{escape(in_labels(words))}</p>'


def _by_gain(steps: Sequence[Headroom]) -> list[Headroom]:
    """Steps that would give something, most first."""
    found = [row for row in steps if row.alone >= 1.005]
    return sorted(found, key=lambda row: -row.alone)


def _step(row: Headroom) -> str:
    gain = row.alone
    length = 0.0 if math.isinf(gain) else 100 * (1 - 1 / gain)
    shown = "" if math.isinf(gain) else f"×{text(gain, '1', 2)}"
    return _bar(
        row.step, length, text(row.ideal, "1/s", 2), shown, f"{row.words.held_by}. {row.words.note}"
    )


def _at_its_best(row: Elasticity) -> bool:
    """Whether an input stands at the end of its range that is better for more of the quantity."""
    return (row.side, row.value > 0) in (("below", True), ("above", False))


def _lever(row: Elasticity, largest: float) -> str:
    """An input by what a small change of it gives."""
    sign = "+" if row.value > 0 else "−"
    size = f"{sign}{text(abs(row.value), '1', 2)} %"
    length = 100 * abs(row.value) / largest
    return _bar(INPUTS[row.name].label, length, "", size, f"{row.words}.", row.value < 0)


def fabrication(limits: Limits, passing: Yield | None) -> str:
    """The devices that pass, by requirement, and what each scatter costs, as HTML."""
    parts = []
    if passing is not None:
        rows = "".join(
            _bar(_requirement(name), 100 * float(share.share), "", _percent(share))
            for name, share in passing.by_requirement.items()
        )
        ends = f"{100 * float(passing.low):.2g}–{100 * float(passing.high):.3g}"
        sure = f" (95 % sure: {ends})" if passing.low < passing.high else ""
        said = f"{hundred(passing)} of 100 devices meet everything{sure}."
        parts.append(
            f'<p class="x-first">{said[0].upper()}{said[1:]}</p>'
            '<table class="x-budget x-ranked"><caption>devices that meet each requirement</caption>'
            f"<tbody>{rows}</tbody></table>"
        )
    if limits.costs is not None:
        parts.append(costs(limits.costs))
    elif limits.scatter_fault:
        parts.append(_plain(limits.scatter_fault))
    return "".join(parts) or WORKING


def _percent(share: Share) -> str:
    return f"{hundred(share).replace('over ', '>').replace('under ', '<')} %"


def _requirement(name: str) -> str:
    quantity, _, limit = name.partition(" ")
    return f"{REGISTRY.quantities[quantity].label} {limit}".strip()


def costs(found: SpreadCosts) -> str:
    """What each scatter costs, in devices of a hundred."""
    if not any(abs(row.cost) >= LEAST for row in found.rows):
        still = f"Without any scatter {100 * found.still.value:.3g} of 100 would pass"
        return f'<p class="x-plain">{still}: no single scatter changes that.</p>'
    rows = "".join(
        _bar(
            INPUTS[row.name].label,
            100 * max(row.cost, 0.0),
            "",
            f"{100 * row.cost:+.2g}".replace("-", "−") if abs(row.cost) >= LEAST else "·",
            f"alone it would leave {100 * row.only.value:.3g} of 100 devices that pass",
        )
        for row in found.rows
    )
    return (
        '<table class="x-budget x-ranked"><caption>more devices of 100 if this alone stopped '
        f"scattering; without any scatter {100 * found.still.value:.3g} of 100</caption>"
        f"<tbody>{rows}</tbody></table>"
    )


def _bar(
    name: str, length: float, inside: str, factor: str, title: str = "", less: bool = False
) -> str:
    """A row of a ranked list: name, bar, words beside it, figure; less: the bar takes."""
    tone = ' class="x-less"' if less else ""
    return (
        f'<tr><th scope=row title="{escape(title or name)}">{escape(name)}</th>'
        f'<td class="x-bar"><b{tone} style="width:{min(length, 100.0):.1f}%"></b>'
        f'<span class="{"x-in" if length > 50 else "x-out"}" style="--at:{length:.1f}%">{escape(inside)}</span></td>'
        f'<td class="x-factor">{escape(factor)}</td></tr>'
    )


def ranked(rows: Sequence[Influence], unit: str) -> str:
    """The list as HTML: unknown, bar and share, and what the quantity is at the ends of its range."""
    if not rows:
        return f'<p class="x-plain">{escape(NOTHING)}</p>'
    body = "".join(_line(row, unit) for row in rows)
    return (
        '<table class="x-budget x-ranked x-ends"><caption>share of what is open that hangs on each; the '
        "quantity at the ends of each range alone</caption>"
        f"<tbody>{body}</tbody></table>"
    )


def _line(row: Influence, unit: str) -> str:
    ends, share = _two(row.low, row.high, unit), 100 * row.share
    number, _, same = ends[0].rpartition(" ")
    if number and ends[1].rpartition(" ")[2] == same:  # 6.7–16 M/s
        ends[0] = number
    return _bar(INPUTS[row.name].label, share, f"{share:.0f} %", "–".join(ends))


def _two(low: float, high: float, unit: str) -> list[str]:
    """Both ends to two digits, to three where two do not tell them apart."""
    for digits in (2, 3):
        shown = ["no number" if math.isnan(e) else text(e, unit, digits) for e in (low, high)]
        if shown[0] != shown[1]:
            break
    return shown
