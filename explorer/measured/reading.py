"""Measured files to data: spectra, decays, coincidences and angular patterns.

A file is text in two columns, or in more of which two are wanted: `text` makes lines of it, `table`
finds the rows and the header, `cells` the numbers, `columns` the units, `pairs` puts them together.
What was understood stands in `read_as`, what was left out in `dropped`.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass

import numpy as np

from ..domain import quoted
from ..whole import MOST_SAMPLES
from .axes import jacobian
from .bins import histogram
from .correction import (
    Curve,
    curve_of,
    divide_response,
    refuse_negative,
    scale,
    take_background,
)
from .data import AngularPattern, Array, Coincidences, DataError, Decay, Dropped, Spectrum
from .folding import folded
from .pairs import Pairs, Request, understand
from .table import Columns
from .tails import tails_note
from .text import Document, Source, load

#: What the second column of a spectrum may be.
OF = ("counts", "power")

Units = tuple[str, str]


def read_spectrum(
    source: Source,
    *,
    name: str = "",
    units: Units | None = None,
    columns: Columns | None = None,
    of: str = "counts",
    background: Source | float | None = None,
    response: Source | None = None,
) -> Spectrum:
    """An emission spectrum as photon counts per unit of vacuum wavelength.

    source: a path, the bytes of a file with its `name`, or a pair of name and bytes. units: of the two columns, in place of
    those in the header; the axis in nm, µm, Å, pm, m, eV, meV, THz, GHz or cm-1, nm where none is
    named. columns: positions from 0 or labels of the two, the first two where None. of: "counts",
    photons per unit of the file's axis, or "power", which is made photons by a factor λ. background:
    a number in the counts of the file, or a file that is read with the same units and columns, taken
    away. response: a file of relative sensitivity over wavelength, divided out. An axis of energy, frequency or wavenumber brings its Jacobian.

    Whole counts of 10 or more have counting noise: `gain` and `floor` say which; otherwise these are
    None. Raises DataError with file, line and reason.
    """
    document = load(source, name)
    if of not in OF:
        raise document.error(f'of is "counts" or "power", not {quoted(of)}')
    dark: Curve | float | None = None
    if isinstance(background, int | float | np.integer | np.floating):
        dark = float(background)
    elif background is not None:
        same = Request("spectrum", units, columns, least=2, most=MOST_SAMPLES)
        dark = _curve(background, "background", same)
    own = Request("spectrum", None, None, least=2, most=MOST_SAMPLES)
    sensitivity = None if response is None else _curve(response, "response", own)

    def use(pairs: Pairs) -> Spectrum:
        curve = curve_of(pairs, counting=of == "counts", least=5)
        if dark is not None:
            take_background(curve, dark)
        refuse_negative(pairs, curve.values, curve.lines, curve.notes, "counts")
        if sensitivity is not None:
            divide_response(curve, sensitivity)
        _per_wavelength(curve, of)
        return _spectrum(curve)

    return understand(document, Request("spectrum", units, columns, most=MOST_SAMPLES), use)


def _curve(source: Source, what: str, request: Request) -> Curve:
    """A background or a response over wavelength, with its own file's name in errors."""
    given = isinstance(source, bytes | bytearray | memoryview)
    return understand(
        load(source, what if given else ""),
        request,
        lambda pairs: curve_of(pairs, counting=what == "background"),
    )


def _per_wavelength(curve: Curve, of: str) -> None:
    """Power to photons, and counts per unit of the file's axis to counts per unit wavelength."""
    unit = curve.pairs.unit
    if of == "power":
        middle = 0.5 * (curve.wavelengths[0] + curve.wavelengths[-1])
        scale(curve, curve.wavelengths / middle)
        curve.notes.append("power was made photons: multiplied by the wavelength")
    factor = jacobian(curve.wavelengths, unit)
    if factor is not None:
        scale(curve, factor)
        letter = {"energy": "E", "frequency": "ν", "wavenumber": "ν/c"}[unit.family]
        curve.notes.append(
            f"{'power' if of == 'power' else 'counts'} per {unit} were made counts per nm: multiplied "
            f"by |d({letter})/dλ|, which goes as 1/λ²"
        )
    if curve.gain is not None:
        curve.notes.append("whole counts: their noise is that of counting")
    curve.notes.append("wavelengths are taken as those in vacuum")


def _spectrum(curve: Curve) -> Spectrum:
    document, pairs = curve.pairs.document, curve.pairs
    made = Spectrum(
        document.name,
        document.digest,
        (pairs.unit.name, pairs.value_unit),
        tuple(curve.notes),
        _in_order(curve.dropped),
        curve.wavelengths,
        curve.values,
        curve.gain,
        curve.floor,
    )
    if not float(np.trapezoid(np.maximum(made.counts, 0.0), made.wavelengths)) > 0:
        raise document.error("all counts are zero")
    return dataclasses.replace(made, read_as=(*made.read_as, *tails_note(made)))


def _in_order(dropped: list[Dropped]) -> tuple[Dropped, ...]:
    return tuple(sorted(dropped, key=lambda one: one.line))


@dataclass(frozen=True)
class _Bins:
    """The fields that every histogram has."""

    units: Units
    read_as: tuple[str, ...]
    dropped: tuple[Dropped, ...]
    times: Array
    counts: Array
    width: float
    counting: bool


def _histogram(document: Document, request: Request) -> _Bins:
    def use(pairs: Pairs) -> _Bins:
        times, counts, width, notes, dropped = histogram(pairs)
        whole = bool((counts == np.rint(counts)).all())
        rate = "" if whole else "the counts are no whole numbers: their noise is not known"
        return _Bins(
            (pairs.unit.name, pairs.value_unit),
            (*pairs.notes, *notes, *filter(None, [rate])),
            _in_order(dropped),
            times,
            counts,
            width,
            whole,
        )

    return understand(document, request, use)


def read_decay(
    source: Source, *, name: str = "", units: Units | None = None, columns: Columns | None = None
) -> Decay:
    """A histogram of arrival times after a pulse, or of an instrument's response to one.

    source: a path, the bytes of a file with its `name`, or a pair of name and bytes. units: of the two columns, in place of
    those in the header; ns where none is named; ("16 ps", "counts") for an axis of channels of 16 ps.
    columns: positions from 0 or labels of the two, the first two where None. Times are the middles of
    even bins, of which some may be missing; the width is the usual step. counting: whether all counts
    are whole numbers.

    Raises DataError with file, line and reason, for a negative count and for uneven bins too.
    """
    document = load(source, name)
    got = _histogram(document, Request("decay", units, columns))
    return Decay(document.name, document.digest, **vars(got))


def read_coincidences(
    source: Source, *, name: str = "", units: Units | None = None, columns: Columns | None = None
) -> Coincidences:
    """A histogram of delays between detections on two detectors; as `read_decay` otherwise."""
    document = load(source, name)
    got = _histogram(document, Request("coincidences", units, columns))
    return Coincidences(document.name, document.digest, **vars(got))


def read_pattern(
    source: Source, *, name: str = "", units: Units | None = None, columns: Columns | None = None
) -> AngularPattern:
    """An angular pattern: power per solid angle over the angle from the axis.

    source: a path, the bytes of a file with its `name`, or a pair of name and bytes. units: of the two columns, in place of
    those in the header: °, rad or mrad, ° where none is named; values in dB are made powers. columns:
    positions from 0 or labels of the two, the first two where None. Angles from -90° to 90°, 0° to
    180°, -180° to 180° or 0° to 360°: both sides are averaged, what lies beyond 90° goes down and is
    left out, and gives `upward_share` where the file reaches 175°.

    Raises DataError with file, line and reason.
    """
    document = load(source, name)

    def use(pairs: Pairs) -> AngularPattern:
        got = folded(pairs)
        return AngularPattern(
            document.name,
            document.digest,
            (pairs.unit.name, pairs.value_unit),
            (*pairs.notes, *got.notes),
            _in_order(got.dropped),
            got.angles,
            got.powers,
            got.upward_share,
        )

    return understand(document, Request("pattern", units, columns, least=2, most=MOST_SAMPLES), use)


__all__ = ["DataError", "read_coincidences", "read_decay", "read_pattern", "read_spectrum"]
