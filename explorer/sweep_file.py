"""Plans of sweeps as files: TOML that a person writes, with units as people write them."""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

import numpy as np

from .combine import PARTS
from .design import Design
from .domain import InputError, quoted, real_number
from .exact import RecordError
from .inputs import INPUTS
from .reading import ReadingError, read_number, read_range
from .record import load_design
from .scatter import Spread
from .sweep.draws import whole_number
from .sweep.faults import PlanError
from .sweep.plan import Plan, factorial, sampled
from .sweep.run import CHUNK
from .units import from_si, to_si
from .whole import Lines, WholeError

#: What a file may hold.
KEYS: Final = ("base", "wanted", "records", "axes", "sampled", "output", "chunk")

#: A file that shows everything; the help of the command prints it.
EXAMPLE: Final = """\
# From the harbour office to the lighthouse: how far do Q and V carry the source, in which fibre?
wanted = ["rate_in_fibre", "g2_zero", "half_angle", "regime"]
output = "harbour.csv"            # beside this file; or a .parquet folder; or --out
chunk = 65536                     # rows stored at a time; may be left out

[base]                            # or  base = "harbour.json", a saved design
emission_wavelength = "580 nm"    # a number without a unit is in the unit of the page
lifetime = "3.6 ns"
quantum_yield = 0.95
radiative_share = 0.75
upward_share = 0.9
other_modes = 0.5
repetition_rate = "160 MHz"
background_per_pulse = 0.002

[records]                         # keys of the catalogue, or "all"; scaled = true: at any wavelength
optic = ["single_mode_fibre", "single_mode_fibre_nir"]

[axes]                            # every combination, the last varying fastest
pumping = ["pulsed", "continuous"]
fast_linewidth = ["5 nm", "20 nm", "35 nm"]
quality_factor = { from = 10, to = 1e4, count = 100, spacing = "log" }
mode_volume = { from = 0.01, to = 100, count = 100 }    # spaced as the page's slider is

# In place of number axes, random rows:
# [sampled]
# count = 100000
# seed = 1
# [sampled.ranges]                # or  ranges = "base", those of the saved design
# quantum_yield = "0.5-0.98"
# fast_linewidth = { from = "20 nm", to = "50 nm" }
# [sampled.scatter]               # or  scatter = "base"
# lateral_offset = { kind = "radial", width = "20 nm" }
"""


@dataclass(frozen=True)
class SweepFile:
    """What a file asks for. output: None where it names none."""

    plan: Plan
    wanted: tuple[str, ...]
    output: Path | None
    chunk: int


def read_sweep_file(path: str | os.PathLike[str]) -> SweepFile:
    """The plan in a file (see EXAMPLE). Paths in it are beside it. Raises PlanError, one sentence."""
    file = Path(path)
    name = quoted(file.name)
    try:
        table = tomllib.loads(file.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise PlanError(
            f"{name} cannot be read: {(error.strerror or str(error)).lower()}"
        ) from error
    except UnicodeDecodeError as error:
        raise PlanError(f"{name} is no plan: it is no text in UTF-8") from error
    except (ValueError, RecursionError) as error:
        raise PlanError(f"{name} is no plan: {str(error).lower()}") from error
    try:
        return _read(table, file.parent)
    except (InputError, ReadingError, RecordError, WholeError) as error:
        raise PlanError(f"{name}: {error}") from error


def _read(table: Mapping[str, Any], folder: Path) -> SweepFile:
    _known(table, KEYS, "a plan")
    wanted, output = table.get("wanted"), table.get("output")
    if not isinstance(wanted, list) or not all(isinstance(name, str) for name in wanted):
        raise PlanError('wanted is missing; it is a list such as ["rate_in_fibre", "g2_zero"]')
    if output is not None and not isinstance(output, str):
        raise PlanError(f"output = {quoted(output)} is no path")
    chunk = whole_number(table.get("chunk", CHUNK), "chunk", 1, 10**9)
    return SweepFile(
        _plan(table, _base(table.get("base", {}), folder)),
        tuple(wanted),
        None if output is None else folder / output,
        chunk,
    )


def _known(table: Any, names: Any, what: str) -> Mapping[str, Any]:
    if not isinstance(table, Mapping):
        raise PlanError(f"{what} is a table, not {quoted(table)}")
    for name in table:
        if name not in names:
            raise PlanError(f"{quoted(name)} is nothing that {what} has: {', '.join(names)}")
    return table


def _base(given: Any, folder: Path) -> Design | dict[str, Any]:
    if isinstance(given, str):
        return load_design(folder / given)
    if not isinstance(given, Mapping):
        raise PlanError(
            f"base is a table of inputs or the path of a saved design, not {quoted(given)}"
        )
    return {name: _value(name, entry) for name, entry in given.items()}


def _plan(table: Mapping[str, Any], base: Design | dict[str, Any]) -> Plan:
    records = dict(_known(table.get("records", {}), (*PARTS, "scaled"), "records"))
    scaled = records.pop("scaled", False)
    if not isinstance(scaled, bool):
        raise PlanError(f"scaled is true or false, not {quoted(scaled)}")
    axes = table.get("axes", {})
    if not isinstance(axes, Mapping):
        raise PlanError(f"axes is a table of inputs, not {quoted(axes)}")
    for name in axes:
        if name in PARTS:
            raise PlanError(f"{name} is no input: name its keys under [records]")
    every = {**records, **{name: _axis(name, given) for name, given in axes.items()}}
    if "sampled" not in table:
        return factorial(base, scaled=scaled, **every)
    draw = _known(table["sampled"], ("count", "seed", "ranges", "scatter"), "sampled")
    if "count" not in draw:
        raise PlanError("sampled has no count")
    own = isinstance(base, Design)
    ranges, scatter = draw.get("ranges", {}), draw.get("scatter", {})
    if "base" in (ranges, scatter) and not own:
        raise PlanError('"base" in sampled needs a saved design as the base')
    correlation = base.correlation if isinstance(base, Design) and scatter == "base" else {}
    return sampled(
        base,
        draw["count"],
        draw.get("seed", 0),
        base.unknowns if isinstance(base, Design) and ranges == "base" else _ranges(ranges),
        base.scatter if isinstance(base, Design) and scatter == "base" else _scatter(scatter),
        correlation=correlation,
        scaled=scaled,
        **every,
    )


def _value(name: str, given: Any) -> Any:
    """A value of an input, SI, as a person writes it."""
    entry = INPUTS.get(name)
    if entry is None or entry.choices:
        return given  # the plan says what is wrong with a name or a word
    if entry.types:
        return _lines(name, given)
    if isinstance(given, str):
        try:
            return read_number(given, entry.shown)
        except ReadingError as error:
            raise PlanError(f"{name}: {error}", name) from error
    number = real_number(given)
    if number is None:
        raise PlanError(f"{name} = {quoted(given)} is not a number", name)
    return to_si(number, entry.shown)


def _lines(name: str, given: Any) -> Lines | None:
    """A spectrum of lines: [share, offset, width] each; 'single line' where none is given."""
    if name != "spectrum":
        raise PlanError(f"{name} cannot be written in a plan; take it from a saved design", name)
    if given == "single line":
        return None
    if not isinstance(given, list) or not all(isinstance(row, list) for row in given):
        raise PlanError(
            'a spectrum is "single line" or lines of [share, offset, width], such as '
            '[[0.7, "0 nm", "2 nm"], [0.3, "15 nm", "30 nm"]]',
            name,
        )
    units = ("quantum_yield", "biexciton_shift", "fast_linewidth")  # inputs of these kinds
    return Lines(
        [
            [_value(kind, part) for kind, part in zip(units, row, strict=True)]
            if len(row) == len(units)
            else row
            for row in given
        ]
    )


def _axis(name: str, given: Any) -> Any:
    """The values of an axis, SI: a list, or evenly spaced ones."""
    entry = INPUTS.get(name)
    if entry is None or entry.choices or not isinstance(given, list | Mapping):
        return given
    if isinstance(given, Mapping) and not entry.types:
        return _spaced(name, _known(given, ("from", "to", "count", "spacing"), f"the axis {name}"))
    if isinstance(given, Mapping):
        return {label: _value(name, part) for label, part in given.items()}
    return [_value(name, part) for part in given]


def _ends(name: str, given: Mapping[str, Any], what: str) -> tuple[float, float]:
    for part in ("from", "to"):
        if part not in given:
            raise PlanError(f"{what} has no {part!r}", name)
    low, high = (_value(name, given[part]) for part in ("from", "to"))
    if not low < high or not np.isfinite(high):
        raise PlanError(f"{what} must rise from a low to a high number", name)
    return low, high


def _spaced(name: str, given: Mapping[str, Any]) -> list[float]:
    """Values at even distances in the unit of the page, or in their logarithm."""
    low, high = _ends(name, given, f"the axis {name}")
    count = whole_number(given.get("count"), f"count of the axis {name}", 2, 10**7)
    entry = INPUTS[name]
    usual = "log" if entry.scale.startswith("log") and low > 0 else "even"
    spacing = given.get("spacing", usual)
    if spacing not in ("even", "log"):
        raise PlanError(
            f"spacing of the axis {name} is 'even' or 'log', not {quoted(spacing)}", name
        )
    if spacing == "log" and low <= 0:
        raise PlanError(f"the axis {name} is logarithmic and must start above 0", name)
    space = np.geomspace if spacing == "log" else np.linspace
    # Twelve digits of what is written: 0.3 and not 0.30000000000000004.
    inner = space(from_si(low, entry.shown), from_si(high, entry.shown), count)[1:-1].tolist()
    return [low, *(to_si(float(f"{value:.12g}"), entry.shown) for value in inner), high]


def _ranges(given: Any) -> dict[str, Any]:
    """Ranges of a sampled plan, SI: 'low–high' or from and to."""
    found: dict[str, Any] = {}
    for name, entry in (given if isinstance(given, Mapping) else {"ranges": given}).items():
        if name not in INPUTS or INPUTS[name].whole:
            found[name] = entry  # the plan says what is wrong with it
        elif isinstance(entry, str):
            found[name] = _text_range(name, entry)
        elif isinstance(entry, list):
            found[name] = [_value(name, end) for end in entry]
        elif isinstance(entry, Mapping):
            found[name] = _ends(
                name, _known(entry, ("from", "to"), f"the range of {name}"), f"the range of {name}"
            )
        else:
            found[name] = entry
    return found


def _text_range(name: str, text: str) -> Any:
    try:
        return read_range(text, INPUTS[name].shown) or text
    except ReadingError as error:
        raise PlanError(f"the range of {name}: {error}", name) from error


def _scatter(given: Any) -> dict[str, Spread]:
    """Scatter of a sampled plan: kind and width."""
    found = {}
    for name, entry in _known(given, INPUTS, "scatter").items():
        part = _known(entry, ("kind", "width"), f"the scatter of {name}")
        kind, width = part.get("kind", "normal"), part.get("width", 0)
        relative = kind in ("lognormal", "direction") or INPUTS[name].whole
        found[name] = Spread(kind, width if relative else _value(name, width))
    return found
