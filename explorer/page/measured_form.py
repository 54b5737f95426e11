"""The form beside measured data: files to load, how they are read, what is fitted."""

from __future__ import annotations

from typing import Any, Protocol

from ipywidgets import Button, Dropdown, HBox, Label, Text, ToggleButton, VBox

from ..reading import ReadingError, read_number
from .kinds import KINDS
from .measuring import Extra, Kind, Measuring, Option
from .upload import Upload


class Owner(Protocol):
    """Who is told what a person does in the form."""

    def take(self, role: str, name: str, content: bytes) -> None:
        """A file was given."""

    def drop(self, role: str) -> None:
        """A file is no longer wanted."""

    def reread(self, across: str, up: str, columns: str) -> None:
        """The file is to be read otherwise."""

    def choose(self, option: Option, value: Any) -> None:
        """An option was set."""

    def refuse(self, words: str) -> None:
        """Something cannot be done."""


class MeasuredForm:
    """Three boxes: files, how they are read, options. kind: the one that it was built for, '' for none."""

    def __init__(self, owner: Owner) -> None:
        self._owner = owner
        self.kind = ""
        self.files, self.otherwise, self.options = VBox(), VBox(), VBox()
        self.files.add_class("x-given")
        self.otherwise.add_class("x-otherwise")
        self.options.add_class("x-choices")
        self._uploads = {name: self._main_upload(kind) for name, kind in KINDS.items()}

    def build(self, held: Measuring) -> None:
        """Buttons, fields and menus for what is held."""
        self.kind = held.kind.name
        for old in (*self.files.children[1:], *self.otherwise.children, *self.options.children):
            old.close()
        self.files.children = self._file_rows(held)
        loaded = held.data is not None
        self.otherwise.children = self._otherwise_rows(held) if loaded else ()
        fitted = loaded and held.kind.steps is not None
        rows = (self._option_row(held, option) for option in held.kind.options)
        self.options.children = tuple(rows) if fitted else ()

    def _file_rows(self, held: Measuring) -> tuple[Any, ...]:
        kind, main = held.kind, self._uploads[held.kind.name]
        main.text = "Load another file" if held.data is not None else f"Load {kind.label.lower()}"
        if held.data is None or not kind.extras:
            return (main,)
        extras = HBox([self._extra_row(held, extra) for extra in kind.extras])
        extras.add_class("x-extras")
        return main, extras

    def _main_upload(self, kind: Kind) -> Upload:
        """The button that loads data of a kind; it stays, so that a keyboard keeps its place."""
        made = self._upload("", f"Load {kind.label.lower()}", kind.hint)
        made.add_class(f"upload-{kind.name}")
        return made

    def _upload(self, role: str, text: str, hint: str) -> Upload:
        owner = self._owner
        return Upload(
            text, hint, lambda name, content: owner.take(role, name, content), owner.refuse
        )

    def _extra_row(self, held: Measuring, extra: Extra) -> HBox:
        given = held.files.get(extra.role)
        text = f"+ {extra.label}" if given is None else f"{extra.label}: {given[0]}"
        load = self._upload(extra.role, text, extra.hint)
        load.add_class(f"upload-{held.kind.name}-{extra.role}")
        if given is None:
            return HBox([load])
        drop = Button(description="×", tooltip=f"Without this {extra.label}")
        drop.add_class("x-back")
        drop.on_click(lambda _: self._owner.drop(extra.role))
        return HBox([load, drop])

    def _otherwise_rows(self, held: Measuring) -> tuple[Any, ...]:
        """How the file is read, to be said otherwise."""
        said = (
            ("Unit across", held.data.units[0], "Unit of the first column"),
            ("Unit up", held.data.units[1], "Unit of the second column"),
            ("Columns", held.columns or "1, 2", "Columns that are read, counted from 1"),
        )
        fields = [Text(value, continuous_update=False, tooltip=hint) for _, value, hint in said]
        for field in fields:
            field.observe(lambda _: self._owner.reread(*(one.value for one in fields)), "value")
        labels = (label for label, _, _ in said)
        return tuple(_row(label, "", field) for label, field in zip(labels, fields, strict=True))

    def _option_row(self, held: Measuring, option: Option) -> HBox:
        field: Any
        if option.unit:
            typed = held.typed.get(option.name, "")
            field = Text(typed, continuous_update=False, tooltip=option.hint, placeholder="—")
            field.add_class("x-number")
            field.observe(lambda change: self.numbered(held, option, change["new"]), "value")
            return _row(option.label, option.hint, field, "" if option.unit == "1" else option.unit)
        value = held.values[option.name]
        if option.choices:
            field = Dropdown(options=option.choices, value=value, tooltip=option.hint)
        else:
            field = ToggleButton(value, description=option.label, tooltip=option.hint)
        field.observe(lambda change: self._owner.choose(option, change["new"]), "value")
        return _row(option.label, option.hint, field) if option.choices else HBox([field])

    def numbered(self, held: Measuring, option: Option, words: str) -> None:
        """Take a number as it was typed; nothing typed is no number."""
        held.typed[option.name] = words
        try:
            value = read_number(words, option.unit) if words.strip() else None
        except ReadingError as error:
            self._owner.refuse(f"{option.label}: {error}")
            return
        self._owner.choose(option, value)


def _row(label: str, hint: str, field: Any, unit: str = "") -> HBox:
    words = Label(label, tooltip=hint)
    words.add_class("x-name")
    row = HBox([words, field, Label(unit)])
    row.add_class("x-head")
    return row
