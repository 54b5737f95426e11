"""Measured data: load a file, see what was understood, fit it, and use it in the design."""

from __future__ import annotations

from collections.abc import Callable
from html import escape
from typing import Any

from ipywidgets import HTML, Button, Dropdown, HBox, Label, Text, ToggleButton, VBox

from ...built import LONGEST_NAME
from ...design import Design
from ...measured.use import without_device
from ...question import Answer
from ..built import table
from ..kinds import KINDS
from ..measured_form import MeasuredForm
from ..measured_plots import drawing
from ..measured_words import understood
from ..measuring import Measuring, Option
from ..plot import Plot
from ..state import State
from ..uses import Use, done, says, uses
from ..work import Work

#: Where the panel's refusals are shown.
SEAT = "measured"

FIRST = "Load a file of two columns, as text or CSV. It is read here first, and used only when you press so."

CAUTION = (
    "Laser light: class 3B and 4 lasers can blind; follow the laser-safety officer and local rules "
    "before any measurement."
)


class MeasuredPanel(VBox):
    """Kinds of data across the top; files, options and uses on the left, plots and results beside."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._work = Work()
        self._quiet = False
        self.held = {name: Measuring(kind) for name, kind in KINDS.items()}
        self._shown = "spectrum"
        self._open = False
        self.switch = {
            name: ToggleButton(description=kind.label, tooltip=kind.hint)
            for name, kind in KINDS.items()
        }
        self.form = MeasuredForm(self)
        kinds = HBox(list(self.switch.values()))
        kinds.add_class("x-switch")
        self.uses = VBox()
        self.read, self.result, self.devices, self.said = HTML(), HTML(), HTML(), HTML()
        self.wrong = Label("")
        self.wrong.add_class("x-wrong")
        self.remove = Dropdown(
            options=[("remove a device", "")], tooltip="Remove a measured device"
        )
        self.plot, self.rest = Plot(), Plot()
        for widget, name in (
            (self.read, "x-understood"),
            (self.result, "x-result"),
            (self.plot, "x-main-plot"),
            (self.rest, "x-rest-plot"),
            (self.uses, "x-uses"),
            (self.remove, "x-more"),
        ):
            widget.add_class(name)
        form = self.form
        left = VBox([form.files, self.wrong, self.read, form.otherwise, form.options])
        middle = VBox([self.plot, self.rest, HTML(f'<p class="x-plain">{escape(CAUTION)}</p>')])
        right = VBox([self.result, self.uses, self.said, self.devices, self.remove])
        for box, name in ((left, "x-from"), (middle, "x-plots"), (right, "x-to")):
            box.add_class(name)
        body = HBox([left, middle, right])
        body.add_class("x-bench")
        super().__init__([kinds, body])
        self.add_class("panel-measured")
        for name, button in self.switch.items():
            button.observe(lambda _, name=name: self._pressed(name), "value")
        self.remove.observe(self._removed, "value")
        state.seat(SEAT)
        state.on_answer(self._follow)
        state.on_problem(self._complain)

    @property
    def now(self) -> Measuring:
        """The kind of data that is shown."""
        return self.held[self._shown]

    def opened(self, is_open: bool) -> None:
        """Hear that the sheet opens or closes."""
        self._open = is_open
        if is_open:
            self._follow(self._state.answer)
            self.turn_to(self._shown)
        else:
            self._work.stop()
            self._state.settle(SEAT)

    def turn_to(self, name: str) -> None:
        """Show one kind of data; what is held of the others stays."""
        self._work.stop()
        self._shown = name
        self._quiet = True
        for other, button in self.switch.items():
            button.value = other == name
        self._quiet = False
        if self.form.kind != name:
            self.form.build(self.now)
        self._draw()
        if self.now.data is not None and self.now.fit is None and not self.now.fault:
            self._fit()

    def take(self, role: str, name: str, content: bytes) -> None:
        """Read a file; where it cannot be read, all stays as it was."""
        self._work.stop()
        if self.now.take(role, name, content):
            self.form.build(self.now)
        self._fit()

    def _pressed(self, name: str) -> None:
        if not self._quiet:
            self.turn_to(name)

    # ------------------------------------------------------------ what the form asks for

    def drop(self, role: str) -> None:
        """Read the data again without the file that plays a role."""
        self._work.stop()
        self.now.drop(role)
        self.form.build(self.now)
        self._fit()

    def reread(self, across: str, up: str, columns: str) -> None:
        """Read the same file with other units or columns; where that fails the last reading stays."""
        self._work.stop()
        wanted = "" if columns.replace(" ", "") == "1,2" else columns
        if self.now.read_as((across.strip(), up.strip()), wanted):
            self.form.build(self.now)
        self._fit()

    def choose(self, option: Option, value: Any) -> None:
        """Set an option, and fit anew."""
        self._work.stop()
        self.now.set(option.name, value)
        self._fit()

    def refuse(self, words: str) -> None:
        """Say why something was not done."""
        self._state.refuse(SEAT, words)

    # ------------------------------------------------------------ fit and show

    def _fit(self) -> None:
        """Fit what is loaded, in slices, and show it."""
        held = self.now
        self._state.settle(SEAT)
        if held.fault:
            self.refuse(held.fault)
        self._draw()
        if held.data is not None and held.kind.steps is not None and held.fit is None:
            self.result.value = '<p class="x-plain">fitting …</p>'
            self._work.start(held.fit_steps(), lambda _: self._fitted(held))

    def _fitted(self, held: Measuring) -> None:
        if held.fault:
            self.refuse(held.fault)
        if held is self.now:
            self._draw()

    def _draw(self) -> None:
        """Everything that is known of the data that is shown."""
        data, fit = self.now.data, self.now.fit
        self.said.value = ""
        for widget, shown in ((self.plot, data is not None), (self.rest, fit is not None)):
            widget.layout.display = "" if shown else "none"
        if data is None:
            self.read.value = f'<p class="x-plain">{escape(FIRST)}</p>'
            self.result.value = ""
        else:
            self.read.value = understood(data)
            drawn = drawing(data, fit)
            self.plot.show(*drawn.main)
            if drawn.rest is not None:
                self.rest.show(*drawn.rest)
            self.result.value = says(self._state.question.design, self.now)
        self._offer()

    def _offer(self) -> None:
        """The uses of what is shown, one press each."""
        for old in self.uses.children:
            old.close()
        self.uses.children = [self._use_row(use) for use in uses(self.now)]

    def _use_row(self, use: Use) -> HBox:
        button = Button(description=use.label, tooltip=use.hint)
        button.add_class("x-use")
        if not use.device:
            button.on_click(lambda _: self._used(use, lambda design: use.change(design, "")))
            return HBox([button])
        count = len(self._state.question.design.built)
        name = Text(
            f"Device {count + 1}", tooltip="Name of the device; a known one takes the value too"
        )
        button.on_click(
            lambda _: self._used(
                use, lambda design: use.change(design, name.value.strip()[:LONGEST_NAME])
            )
        )
        return HBox([button, name])

    def _used(self, use: Use, change: Callable[[Design], Design]) -> None:
        before = self._state.question.design
        self._state.settle(SEAT)
        self._state.change(change, use.names)
        if self._state.question.design != before:
            self.said.value = (
                f'<p class="x-first">{escape(done(use, self._state.question.design))}</p>'
            )

    def _removed(self, change: dict[str, Any]) -> None:
        if change["new"]:
            self._state.change(lambda design: without_device(design, change["new"]), ())

    def _follow(self, answer: Answer) -> None:
        """The devices that the design carries."""
        design = answer.question.design
        if not self._open or not answer.whole:
            return
        words = table(design)
        if words != self.devices.value:
            self.devices.value = words
        names = [("remove a device", ""), *((row.name, row.name) for row in design.built)]
        if list(self.remove.options) != names:
            self.remove.options = names
        self.remove.layout.display = "" if design.built else "none"

    def _complain(self) -> None:
        words = self._state.problems.get(SEAT, "")
        if words != self.wrong.value:
            self.wrong.value = words
