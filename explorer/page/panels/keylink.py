"""What a quantum key link needs of the source: from distance and key rate to requirements."""

from __future__ import annotations

from dataclasses import replace

from ipywidgets import Button, Dropdown, HBox, Label, Text, VBox

from ...design import Design, Requirement
from ...keyrate import Link, LinkError, air_loss, fibre_loss, needed_rate, secret_key
from ...question import Answer
from ...reading import ReadingError, read_number
from ...scenario import LINK
from ...units import text
from ..state import State

#: Boxes of the form: name, label, unit shown, factor to what the formulas take, tooltip.
FIELDS = (
    ("key", "Secret key", "kbit/s", 1e3, "Secret key rate that is wanted"),
    ("length", "Length", "km", 1e3, "Length of the link"),
    ("visibility", "Visibility", "km", 1e3, "Meteorological visibility along a path through air"),
    ("per_kilometre", "Fibre loss", "dB/km", 1.0, "Loss of the fibre of the link"),
    ("other_loss", "Other losses", "dB", 1.0, "Telescopes, pointing, couplers"),
    ("receiver", "Receiver", "%", 0.01, "Transmission and detector efficiency of the receiver"),
    ("dark_rate", "Dark counts", "/s", 1.0, "Dark and stray counts of the receiver per second"),
    ("gate", "Gate", "ns", 1e-9, "Time window of one pulse"),
    ("error", "Wrong bits", "%", 0.01, "Share of wrong bits from preparation and alignment"),
    ("g2", "g²(0) at most", "", 1.0, "Largest g²(0) that the source may have"),
)

MEDIA = {"air": "visibility", "fibre": "per_kilometre"}


class KeyLinkPanel(VBox):
    """A form behind a press; its result can become the requirements."""

    def __init__(self, state: State) -> None:
        self._state = state
        self._found: tuple[float, float] | None = None
        self.head = Button(
            description="▸ From a key rate",
            tooltip="Requirements from the key rate of a quantum key link: open or close",
        )
        self.head.add_class("x-group")
        self.medium = Dropdown(
            options=[("through air", "air"), ("through fibre", "fibre")],
            value=LINK["medium"],
            tooltip="What the link goes through",
        )
        self.medium.add_class("x-menu")
        self.boxes = {name: self._box(name, tip) for name, _, _, _, tip in FIELDS}
        self.lines = {name: self._line(name, label, unit) for name, label, unit, _, _ in FIELDS}
        self.said = Label("")
        self.said.add_class("x-plain")
        self.use = Button(description="require this", tooltip="Make this the requirements")
        self.body = VBox([self.medium, *self.lines.values(), self.said, self.use])
        self.body.layout.display = "none"
        super().__init__([self.head, self.body])
        self.add_class("panel-keylink")
        self.head.on_click(self._toggle)
        self.use.on_click(lambda _: self._require())
        self.medium.observe(lambda _: self._draw(state.answer), "value")
        state.on_answer(self._draw)

    def _box(self, name: str, tip: str) -> Text:
        box = Text(f"{LINK[name]:g}", continuous_update=False, tooltip=tip)
        box.add_class("x-number")
        box.observe(lambda _: self._draw(self._state.answer), "value")
        return box

    def _line(self, name: str, label: str, unit: str) -> HBox:
        words = Label(label)
        words.add_class("x-name")
        tail = Label(unit)
        tail.add_class("x-unit")
        line = HBox([words, self.boxes[name], tail])
        line.add_class("x-head")
        line.add_class(f"link-{name}")
        return line

    def _toggle(self, _: Button) -> None:
        opening = self.body.layout.display == "none"
        self.body.layout.display = "" if opening else "none"
        self.head.description = f"{'▾' if opening else '▸'} From a key rate"
        self._draw(self._state.answer)

    def _values(self) -> dict[str, float]:
        found = {}
        for name, label, _, factor, _ in FIELDS:
            try:
                found[name] = factor * read_number(self.boxes[name].value, "1")
            except ReadingError as error:
                raise LinkError(f"{label}: {error}") from error
        return found

    def _link(self, values: dict[str, float], answer: Answer) -> Link:
        if self.medium.value == "air":
            wavelength = float(answer.values["emission_wavelength"])
            path = air_loss(values["length"], values["visibility"], wavelength)
        else:
            path = fibre_loss(values["length"], values["per_kilometre"])
        return Link(
            clock=float(answer.values["repetition_rate"]),
            loss=path + values["other_loss"],
            receiver=values["receiver"],
            dark_rate=values["dark_rate"],
            gate=values["gate"],
            error=values["error"],
        )

    def _draw(self, answer: Answer) -> None:
        if self.body.layout.display == "none":
            return
        for medium, name in MEDIA.items():
            self.lines[name].layout.display = "" if medium == self.medium.value else "none"
        self._found = None
        try:
            if answer.values["pumping"] != "pulsed":
                raise LinkError("a key link takes a pulsed source; the pumping is continuous")
            values = self._values()
            link = self._link(values, answer)
            rate = needed_rate(link, values["key"], values["g2"])
        except LinkError as error:
            self.said.value = str(error)
        else:
            self._found = rate, values["g2"]
            key = secret_key(link, rate, values["g2"])
            self.said.value = (
                f"needs {text(rate, '1/s')} in the fibre at {text(link.clock, '1/s')} pulses; loss "
                f"{text(link.loss, '1')} dB, {text(float(key.error), '%', 2)} wrong bits, "
                f"{text(float(key.known), '%', 2)} of the clicks may be pairs"
            )
        self.use.disabled = self._found is None

    def _require(self) -> None:
        if self._found is None:
            return
        rate, g2 = self._found
        wanted = (Requirement("rate_in_fibre", at_least=rate), Requirement("g2_zero", at_most=g2))
        self._state.change(lambda design: wanting(design, wanted), {"wanted"})


def wanting(design: Design, wanted: tuple[Requirement, ...]) -> Design:
    """A design with requirements in place of those on the same quantities."""
    names = {entry.quantity for entry in wanted}
    kept = tuple(entry for entry in design.requirements if entry.quantity not in names)
    return replace(design, requirements=(*wanted, *kept))
