"""The scatter of one input, as a line below its row: kind, width, and a press that takes it away."""

from __future__ import annotations

import math
from typing import Any

from ipywidgets import Button, Dropdown, HBox, Label, Text

from ..design import Design
from ..inputs import INPUTS
from ..reading import ReadingError, read_number
from ..registry import Input
from ..scatter import SPREADS, Spread, kinds_for
from ..units import from_si
from .state import State

#: Kinds as the menu names them.
WORDS = {
    "normal": "± normal",
    "lognormal": "× lognormal",
    "uniform": "± even",
    "radial": "in the plane",
    "direction": "random direction",
}

#: What a first scatter of an input is where a share of its slider would be out of place, SI.
FIRST = {
    "lateral_offset": Spread("radial", 20e-9),
    "fibre_offset": Spread("radial", 0.2e-6),
    "dipole_alignment": Spread("direction"),
    "emission_wavelength": Spread("normal", 2e-9),
    "resonance_wavelength": Spread("normal", 2e-9),
    "filter_centre": Spread("normal", 1e-9),
    "axial_offset": Spread("normal", 10e-9),
}


def first_spread(entry: Input, centre: float) -> Spread:
    """The scatter that an input begins with, around its value, when a person asks for one."""
    if entry.name in FIRST:
        return FIRST[entry.name]
    low, high = entry.slider
    logarithmic = entry.scale.startswith("log")
    if logarithmic and centre > 0:
        return Spread("lognormal", 0.1)
    size = 0.1 * math.sqrt(low * high) if logarithmic else 0.02 * (high - low)
    return Spread("normal", float(f"{size:.1g}"))


def unit_of(name: str, kind: str) -> str:
    """The unit that a width is typed and shown in."""
    return "%" if kind == "lognormal" else INPUTS[name].shown


def width_words(name: str, spread: Spread) -> str:
    """A width as its box shows it."""
    if spread.kind == "direction":
        return ""
    unit = unit_of(name, spread.kind)
    value = 100 * spread.width if unit == "%" else from_si(spread.width, unit)
    return f"{value:.6g}"


def spread_words(name: str, spread: Spread | None) -> str:
    """A scatter in the fewest signs: '±3 nm', '±10 %'; '±' where there is none."""
    if spread is None:
        return "±"
    if spread.kind == "direction":
        return "± any"
    unit = unit_of(name, spread.kind)
    number = 100 * spread.width if unit == "%" else from_si(spread.width, unit)
    return f"±{number:.3g} {'' if unit == '1' else unit}".rstrip()


def scatter_tooltip(entry: Input, spread: Spread | None) -> str:
    """What the button of a scatter says when one asks."""
    if spread is None:
        return f"{entry.label} scatters from device to device: press to say how much"
    return f"{entry.label} scatters from device to device: {spread.kind}, {SPREADS[spread.kind]}"


def other_kind(name: str, spread: Spread, kind: str, centre: float) -> Spread:
    """The same scatter in another kind: a width of a logarithm becomes one of the value, and back."""
    if kind == spread.kind or "direction" in (kind, spread.kind):
        return Spread(kind, 0.0) if kind == "direction" else _sized(name, kind, centre)
    was, will = spread.kind == "lognormal", kind == "lognormal"
    if was and not will:
        return Spread(kind, float(f"{abs(centre) * spread.width:.3g}"))
    if will and not was:
        return (
            Spread(kind, float(f"{spread.width / abs(centre):.3g}"))
            if centre
            else Spread(kind, 0.1)
        )
    return Spread(kind, spread.width)


def _sized(name: str, kind: str, centre: float) -> Spread:
    if kind == "lognormal":
        return Spread(kind, 0.1)
    return Spread(kind, 0.05 * abs(centre) or first_spread(INPUTS[name], centre).width)


class SpreadLine(HBox):
    """Kind and width of an input's scatter; says what is wrong beside the input."""

    def __init__(self, state: State, name: str) -> None:
        self._state, self._name = state, name
        self._syncing = False
        self._shown: Spread | None = None
        options = [(WORDS[kind], kind) for kind in kinds_for(name)]
        label = INPUTS[name].label
        self.kind = Dropdown(options=options, tooltip=f"How {label} scatters from device to device")
        self.box = Text(continuous_update=False)
        self.box.add_class("x-number")
        self.unit = Label("")
        self.unit.add_class("x-unit")
        self.drop = Button(description="×", tooltip=f"{label} no longer scatters")
        self.drop.add_class("x-back")
        super().__init__([self.kind, self.box, self.unit, self.drop])
        self.add_class("x-head")
        self.add_class("x-spread")
        self.kind.observe(self._chosen, "value")
        self.box.observe(self._typed, "value")
        self.drop.on_click(lambda _: state.give_spread(name, None))

    def follow(self, design: Design) -> None:
        """Show the scatter of a design, which has one."""
        spread = design.scatter[self._name]
        self._syncing = True
        self.kind.value = spread.kind
        words = width_words(self._name, spread)
        wrong = self._name in self._state.problems and spread == self._shown
        if self.box.value != words and not wrong:  # what was typed wrongly stays to be mended
            self.box.value = words
        self._shown = spread
        unit = unit_of(self._name, spread.kind)
        self.unit.value = "" if unit == "1" or spread.kind == "direction" else unit
        self.box.tooltip = SPREADS[spread.kind]
        self.box.layout.visibility = "hidden" if spread.kind == "direction" else "visible"
        self._syncing = False

    def _chosen(self, change: dict[str, Any]) -> None:
        if self._syncing:
            return
        design = self._state.question.design
        spread = design.scatter.get(self._name)
        if spread is not None:
            centre = float(design.evaluation.value(self._name))
            self._state.give_spread(
                self._name, other_kind(self._name, spread, change["new"], centre)
            )
            self.follow(self._state.question.design)  # a kind that was refused is not shown

    def _typed(self, change: dict[str, Any]) -> None:
        spread = self._state.question.design.scatter.get(self._name)
        if self._syncing or spread is None:
            return
        try:
            width = read_number(change["new"], unit_of(self._name, spread.kind))
            self._state.give_spread(self._name, Spread(spread.kind, width))
        except (ReadingError, ValueError) as error:
            self._state.refuse(self._name, str(error))
