"""What the measured-data panel holds for one kind of data: files, what they were read as, options, fit.

Knows no widget. A file that cannot be read, or a fit that fails, leaves what was there.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any

from ..domain import InputError
from ..measured.data import DataError

#: A file as it came: its name and its bytes.
File = tuple[str, bytes]


@dataclass(frozen=True)
class Option:
    """What a person may choose: one of `choices` (text, value), a number in `unit`, or a switch.

    reads: whether it says how the file is read, and not how it is fitted.
    """

    name: str
    label: str
    hint: str
    default: Any
    unit: str = ""
    choices: tuple[tuple[str, Any], ...] = ()
    reads: bool = False


@dataclass(frozen=True)
class Extra:
    """A second file that goes with the first."""

    role: str
    label: str
    hint: str


@dataclass(frozen=True)
class Kind:
    """A kind of data: how it is read and fitted.

    read(files by role, units, columns, values of the options) -> data and read extras;
    steps(data, extras, values) -> iterator whose last item is the fit, None where there is nothing to fit.
    """

    name: str
    label: str
    hint: str
    read: Callable[..., Any]
    extras: tuple[Extra, ...] = ()
    options: tuple[Option, ...] = ()
    steps: Callable[..., Iterator[Any]] | None = None


@dataclass
class Measuring:
    """One kind of data on the page.

    fault: why the last file was not read, or the last fit not made; '' where all is well. units,
    columns: how a person says that the file is to be read, '' where the file says it itself. values: of
    the options, and typed: their numbers as they were typed.
    """

    kind: Kind
    files: dict[str, File] = field(default_factory=dict)
    units: tuple[str, str] = ("", "")
    columns: str = ""
    values: dict[str, Any] = field(default_factory=dict)
    typed: dict[str, str] = field(default_factory=dict)
    data: Any = None
    extras: dict[str, Any] = field(default_factory=dict)
    fit: Any = None
    fault: str = ""

    def __post_init__(self) -> None:
        self.values = {option.name: option.default for option in self.kind.options}

    def take(self, role: str, name: str, content: bytes) -> bool:
        """Read a file in place of the one that plays its role ('' is the data itself).

        Where it cannot be read `fault` says why, and the older one stays.
        """
        before = (dict(self.files), self.units, self.columns)
        self.files[role] = (name, content)
        if not role:
            self.units, self.columns = ("", ""), ""
        if self._read():
            return True
        self.files, self.units, self.columns = before
        return False

    def drop(self, role: str) -> None:
        """Read the data again without one of its extra files."""
        if self.files.pop(role, None) is not None:
            self._read()

    def read_as(self, units: tuple[str, str], columns: str) -> bool:
        """Read the same file in another way; where that fails `fault` says why."""
        before = (self.units, self.columns)
        self.units, self.columns = units, columns
        if self._read():
            return True
        self.units, self.columns = before
        return False

    def _read(self) -> bool:
        """Read all files; the fit of older data is dropped with them."""
        self.fault = ""
        if "" not in self.files:
            return True
        try:
            how = (self._units(), columns_of(self.columns), self.values)
            data, extras = self.kind.read(self.files, *how)
        except (DataError, InputError) as error:
            self.fault = str(error)
            return False
        self.data, self.extras, self.fit = data, extras, None
        return True

    def _units(self) -> tuple[str, str] | None:
        """Units as the readers take them; what a person did not say is as it was read."""
        if not any(self.units):
            return None
        known = self.data.units if self.data is not None else ("", "")
        return self.units[0] or known[0], self.units[1] or known[1]

    def set(self, name: str, value: Any) -> None:
        """Choose an option; an older fit no longer holds, nor what was read in another way."""
        if self.values[name] != value:
            self.values[name] = value
            self.fit, self.fault = None, ""
            if any(option.reads for option in self.kind.options if option.name == name):
                self._read()

    def fit_steps(self) -> Iterator[Any]:
        """The fit in small pieces of work; `fit` holds it at the end, or `fault` why there is none."""
        if self.data is None or self.kind.steps is None:
            return
        self.fault = ""
        try:
            for found in self.kind.steps(self.data, self.extras, self.values):
                yield found
            self.fit = found
        except (DataError, InputError) as error:
            self.fit, self.fault = None, str(error)


def columns_of(text: str) -> tuple[Any, Any] | None:
    """Columns as the readers take them, from '1, 3' or 'Wavelength; Dark' (counted from 1)."""
    parts = [part.strip() for part in text.replace(";", ",").split(",") if part.strip()]
    if not parts:
        return None
    if len(parts) != 2:
        raise InputError("two columns are read: write for example 1, 3")
    found = [int(part) - 1 if part.isdigit() else part for part in parts]
    if any(isinstance(place, int) and place < 0 for place in found):
        raise InputError("columns count from 1")
    return found[0], found[1]
