"""Reading of measured files: every dialect to the same numbers, every hostile file to one sentence."""

from __future__ import annotations

import dataclasses
import hashlib
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import constants

from explorer import units
from explorer.measured.columns import known_unit, read_label
from explorer.measured.data import DataError, Spectrum
from explorer.measured.folding import upward_share
from explorer.measured.numerals import Writing, writings
from explorer.measured.reading import (
    read_coincidences,
    read_decay,
    read_pattern,
    read_spectrum,
)
from explorer.measured.tails import cut_tails
from explorer.measured.text import LARGEST

from .measured_files import ROWS, UNITS, Hostile, hostile, huge, plain, table, variants

READERS: dict[str, Callable[..., Any]] = {
    "spectrum": read_spectrum,
    "decay": read_decay,
    "coincidences": read_coincidences,
    "pattern": read_pattern,
}
COLUMNS = {
    "spectrum": ("wavelengths", "counts"),
    "decay": ("times", "counts"),
    "coincidences": ("times", "counts"),
    "pattern": ("angles", "powers"),
}
VARIANTS = [(kind, name) for kind in ROWS for name in variants(kind)]
HOSTILE = hostile()


def columns(kind: str, data: Any) -> tuple[np.ndarray, np.ndarray]:
    first, second = COLUMNS[kind]
    return getattr(data, first), getattr(data, second)


def said(data: Any) -> str:
    return "\n".join(data.read_as)


def refusal(read: Callable[..., Any], *given: Any, **named: Any) -> DataError:
    with pytest.raises(DataError) as caught:
        read(*given, **named)
    return caught.value


def spectrum(rows: Any, header: str = "", **named: Any) -> Spectrum:
    lines = [[f"{x!r}", f"{y!r}"] for x, y in np.asarray(rows, dtype=float).tolist()]
    return read_spectrum(table(lines, above=[header] if header else []), name="s.csv", **named)


# --- the same numbers in every dialect ---------------------------------------------------------


@pytest.mark.parametrize("kind", ROWS)
def test_a_plain_file_gives_the_numbers_as_they_are_printed(kind: str) -> None:
    data = READERS[kind](plain(kind), name="plain.csv")
    first, second = columns(kind, data)
    # units.to_si is the conversion of the whole project, checked in test_units.
    assert first.tolist() == [units.to_si(float(x), UNITS[kind]) for x, _ in ROWS[kind]()]
    assert second.tolist() == [float(y) for _, y in ROWS[kind]()]
    assert data.units[0] == UNITS[kind]
    assert data.dropped == ()
    assert "no unit" not in said(data)


@pytest.mark.parametrize(("kind", "variant"), VARIANTS)
def test_every_dialect_reads_to_the_same_numbers(kind: str, variant: str) -> None:
    wanted = READERS[kind](plain(kind), name="plain.csv")
    data = READERS[kind](variants(kind)[variant], name="variant.csv")
    for one, other in zip(columns(kind, data), columns(kind, wanted), strict=True):
        assert one.tobytes() == other.tobytes()
    assert data.units[0] == wanted.units[0]
    assert ("no unit in the file" in said(data)) == (
        variant in ("no header", "UTF-16 of the other order", "UTF-16 without a mark")
        or (variant == "powers of ten" and "no unit" in said(data))
    )


@pytest.mark.parametrize(
    ("variant", "line", "reason"),
    [
        ("footer", 302, "'End of data' is no number"),
        ("one empty row", 7, "the first cell is empty"),
        ("one missing number", 7, "'nan' in the first cell is no number"),
        ("one broken row", 7, "'#DIV/0!' in the first cell is no number"),
    ],
)
def test_what_was_dropped_is_named(variant: str, line: int, reason: str) -> None:
    # 300 rows under a header in line 1.
    data = read_spectrum(variants("spectrum")[variant], name="variant.csv")
    assert [(one.line, one.reason) for one in data.dropped] == [(line, reason)]


def test_numbers_that_stand_alone_above_the_table_are_named() -> None:
    data = read_decay(table(ROWS["decay"](), above=["1024,7", "Time (ns),Counts"]), name="d.csv")
    assert [(one.line, one.reason) for one in data.dropped] == [
        (1, "numbers that stand alone above the table")
    ]


@pytest.mark.parametrize(
    ("variant", "words"),
    [
        ("UTF-16", "UTF-16 text, tabulators"),
        ("Latin-1", "Latin-1 text"),
        ("decimal comma, semicolons", "semicolons between columns, decimal comma"),
        ("more columns", "columns that are not used: 'Dark', 'Good'"),
        ("numbered rows", "column 1 only counts the rows"),
        ("reversed", "the axis runs backwards in the file: sorted"),
        ("unsorted", "the axis is not in order in the file: sorted"),
        ("remarks between", "1 line of remarks"),
        ("no header", "no unit in the file: taken as nm"),
    ],
)
def test_what_was_understood_is_said(variant: str, words: str) -> None:
    assert words in said(read_spectrum(variants("spectrum")[variant], name="variant.csv"))


def test_a_path_and_its_bytes_are_the_same(tmp_path: Path) -> None:
    path = tmp_path / "one.csv"
    path.write_bytes(plain("spectrum"))
    for source in (path, str(path), bytearray(plain("spectrum")), memoryview(plain("spectrum"))):
        data = read_spectrum(source, name="one.csv")
        assert data.name == "one.csv"
        assert data.digest == hashlib.sha256(plain("spectrum")).hexdigest()
        assert not data.counts.flags.writeable


CELLS = st.integers(0, 10**7)


@st.composite
def written(draw: st.DrawFn) -> tuple[bytes, list[tuple[float, float]]]:
    """A random table in a random dialect, and its numbers in ascending order."""
    places = draw(st.sampled_from([0, 1, 2, 4, 5]))  # three may be thousands behind a comma
    scale = 10**places
    axis = draw(
        st.lists(st.integers(300 * scale, 1500 * scale), min_size=5, max_size=30, unique=True)
    )
    more = draw(st.sampled_from([0, 1, 2, 6]))
    values = draw(st.lists(CELLS, min_size=len(axis), max_size=len(axis)))
    values[0] = max(values[0], 1)
    rows = [
        (f"{x // scale}.{x % scale:0{places}d}" if places else f"{x}", f"{y / 10**more:.{more}f}")
        for x, y in zip(axis, values, strict=True)
    ]
    numbers = sorted((float(x), float(y)) for x, y in rows)
    delimiter, decimal, quotes = draw(
        st.sampled_from(
            [
                *((one, sign, "") for one in (";", "\t", " ", "   ") for sign in (".", ",")),
                (",", ".", ""),
                (", ", ".", ""),
                *((one, sign, '"') for one in (";", "\t", ",") for sign in (".", ",")),
            ]
        )
    )
    lines = [[quotes + cell.replace(".", decimal) + quotes for cell in row] for row in rows]
    above = draw(
        st.sampled_from(
            [
                [],
                ["Wavelength (nm)", ""],
                ["# lambda [nm]"],
                ["measured by day", "in the old house"],
            ]
        )
    )
    content = table(
        lines,
        above=above,
        delimiter=delimiter,
        end=draw(st.sampled_from(["\n", "\r\n", "\r"])),
        last=draw(st.booleans()),
        encoding=draw(st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "latin-1"])),
    )
    return content, numbers


@given(written())
@settings(max_examples=300, deadline=None)
def test_any_table_in_any_dialect_reads_back_exactly(
    case: tuple[bytes, list[tuple[float, float]]],
) -> None:
    content, numbers = case
    data = read_spectrum(content, name="any.csv")
    assert data.wavelengths.tolist() == [units.to_si(x, "nm") for x, _ in numbers]
    assert data.counts.tolist() == [y for _, y in numbers]
    assert data.dropped == ()


# --- what must be refused ------------------------------------------------------------------------


def check_sentence(error: DataError, name: str) -> None:
    text = str(error)
    assert text.startswith(name)
    assert text.isprintable()
    assert len(text) < 400
    assert not any(
        word in text for word in ("Traceback", "Error", " at 0x", "explorer", "site-packages")
    )


def test_there_are_sixty_hostile_files_of_different_names() -> None:
    assert len({one.name for one in HOSTILE}) == len(HOSTILE) >= 60


@pytest.mark.parametrize("case", HOSTILE, ids=lambda case: case.name)
def test_a_hostile_file_is_refused_in_one_sentence(case: Hostile) -> None:
    error = refusal(READERS[case.kind], case.content, name=case.name)
    check_sentence(error, case.name)
    assert case.says in error.reason
    assert error.line == case.line


def test_a_file_of_200_megabytes_is_refused_by_its_size(tmp_path: Path) -> None:
    path = huge(tmp_path)
    error = refusal(read_spectrum, path)
    assert str(error) == "huge.csv: the file has 200.0 MB, the largest that is read has 20 MB"
    assert LARGEST == 20_000_000


def test_what_is_no_readable_file_is_refused(tmp_path: Path) -> None:
    folder = str(tmp_path)
    for source, reason in [
        (tmp_path / "missing.csv", "there is no such file"),
        (tmp_path, "this is no file but a folder or a device"),
        ("/dev/zero", "this is no file but a folder or a device"),
        ("a\0b.csv", "this is no path of a file"),
        (7, "a file is given by its path or its bytes, not by 'int'"),
    ]:
        error = refusal(read_decay, source)
        assert error.reason == reason
        assert folder not in str(error)
        assert str(error).isprintable()


def test_a_name_is_shown_without_its_folder_and_control_characters() -> None:
    error = refusal(read_decay, b"", name="/home/\x1b[31m\nred.csv")
    assert error.file == "?[31m?red.csv"
    assert refusal(read_decay, b"", name="C:\\data\\red.csv").file == "red.csv"


@given(st.binary(max_size=400) | st.text(max_size=400).map(str.encode))
@settings(max_examples=200, deadline=None)
def test_any_bytes_are_read_or_refused(content: bytes) -> None:
    for read in READERS.values():
        try:
            read(content, name="any.csv")
        except DataError as error:
            check_sentence(error, "any.csv")


LINE = st.lists(
    st.sampled_from(
        [
            "637",
            "638,5",
            "1.234",
            "1,234",
            "-5",
            "nan",
            "",
            '"',
            "'",
            "#",
            "x (nm)",
            "1e5",
            " ",
            "0",
        ]
    ),
    max_size=5,
)


@given(st.lists(st.tuples(LINE, st.sampled_from([",", ";", "\t", " ", ", "])), max_size=25))
@settings(max_examples=200, deadline=None)
def test_any_lines_are_read_or_refused(lines: list[tuple[list[str], str]]) -> None:
    content = "\n".join(delimiter.join(cells) for cells, delimiter in lines).encode()
    for kind, read in READERS.items():
        try:
            data = read(content, name="any.csv")
        except DataError as error:
            check_sentence(error, "any.csv")
        else:
            first, second = columns(kind, data)
            assert np.isfinite(first).all()
            assert np.isfinite(second).all()
            assert (np.diff(first) > 0).all()


# --- numbers -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("cells", "wanted"),
    [
        (["1.5", "2"], [Writing(".")]),
        (["1,5", "2"], [Writing(",")]),
        (["1,234.5"], [Writing(".", ",")]),
        (["1.234,5"], [Writing(",", ".")]),
        (["1.234.567", "12"], [Writing(",", ".")]),
        (["1,234,567", "12"], [Writing(".", ",")]),
        (["0,125", "0,250"], [Writing(",")]),
        (["1,234", "987"], [Writing(".", ",")]),  # decimals would stand behind every number
        (["1,234", "1987"], [Writing(",")]),  # thousands would be parted in every number
        (["1,234", "1,987"], [Writing(","), Writing(".", ",")]),
        (["1,234e5"], [Writing(",")]),
        (["1.234", "987"], [Writing(",", ".")]),
        (["1.234", "1.987"], [Writing(".")]),  # a point is a decimal one where it can be
        (["1.234", "987", "0.5"], [Writing(".")]),
    ],
)
def test_the_ways_in_which_numbers_may_be_written(cells: list[str], wanted: list[Writing]) -> None:
    assert writings([cells]) == wanted


def test_three_digits_behind_every_comma_are_what_the_wavelength_allows() -> None:
    rows = [(f"{600 + at},100", "50") for at in range(40)]  # 600,100 nm is no wavelength of light
    data = read_spectrum(table(rows, delimiter=";"), name="s.csv")
    assert data.wavelengths[0] == 600.1e-9
    assert "three digits behind every comma or point: decimal comma fits the whole file" in said(
        data
    )


def test_thousands_are_read_where_the_other_column_shows_the_decimal_sign() -> None:
    points = [(f"{600 + at}.25", f"1,{100 + at}") for at in range(40)]
    assert read_spectrum(table(points, delimiter=";"), name="s").counts[1] == 1101
    commas = [(f"{600 + at},25", f"1.{100 + at}") for at in range(40)]
    assert read_spectrum(table(commas, delimiter=";"), name="s").counts[1] == 1101
    decimals = [(f"{600 + at},25", f"1,{100 + at}") for at in range(40)]
    assert read_spectrum(table(decimals, delimiter=";"), name="s").counts[1] == 1.101
    spaces = [(f"{600 + at},25", f"1 {100 + at}") for at in range(40)]
    assert read_spectrum(table(spaces, delimiter=";"), name="s").counts[1] == 1101


def test_an_index_before_the_axis_is_not_taken_for_it() -> None:
    rows = [(str(at), f"{at / 4}", "7") for at in range(60)]
    data = read_decay(table(rows, above=["No,Time (ns),Counts"]), name="d")
    assert data.width == 0.25e-9
    assert "column 1 only counts the rows" in said(data)
    assert "only counts the rows" in refusal(read_decay, table(rows), name="d").reason
    # A label, a unit or a choice of columns says that it is the axis.
    assert read_decay(table(rows, above=["Time,A,B"]), name="d").width == 1e-9
    assert read_decay(table(rows, above=["t (ns),A,B"]), name="d").width == 1e-9
    assert read_decay(table(rows), name="d", units=("ns", "")).width == 1e-9
    assert read_decay(table(rows), name="d", columns=(0, 2)).width == 1e-9


def test_powers_written_with_the_letter_of_another_language() -> None:
    rows = [(f"{600 + at}", "1.5D+03") for at in range(9)]
    assert read_spectrum(table(rows), name="s").counts[0] == 1500


# --- labels and units ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        *((one, "µm") for one in ("µm", "μm", "um", "micron", "microns", "micrometre", "\\mum")),
        *((one, "µs") for one in ("µs", "μs", "us", "usec", "microseconds")),
        *((one, "Å") for one in ("Å", "\u212b", "A\u030a", "A", "angstrom", "Ångström")),
        *((one, "cm-1") for one in ("cm-1", "cm^-1", "cm⁻¹", "1/cm", "cm^{-1}", "CM-1")),
        *((one, "°") for one in ("°", "deg", "Degrees", "º")),
        *((one, one) for one in ("nm", "pm", "m", "THz", "GHz", "eV", "meV", "rad", "mrad", "ps")),
        *((one, "nm") for one in ("NM", "Nm", "nanometers", "nanometre")),
        *((one, "ns") for one in ("nsec", "nanoseconds", "NS")),
        ("16 ps", "16 ps"),
        ("16ps", "16 ps"),
        ("0,5 ns", "0.5 ns"),
        ("channel", "channel"),
        *((one, None) for one in ("V", "MeV", "furlong", "", "counts", "16 nm", "0 ps", "-4 ps")),
    ],
)
def test_units_in_all_spellings(text: str, unit: str | None) -> None:
    found = known_unit(text)
    assert (None if found is None else found.name) == unit


@pytest.mark.parametrize(
    ("cell", "name", "unit"),
    [
        ("Wavelength (nm)", "Wavelength", "nm"),
        ("lambda [nm]", "lambda", "nm"),
        ("Time/ns", "Time", "ns"),
        ("Energy, eV", "Energy", "eV"),
        ("Delay (ps)", "Delay", "ps"),
        ("λ / µm", "λ", "µm"),
        ("wavelength_nm", "wavelength", "nm"),
        ("Wavelength (vacuum) [Å]", "Wavelength", "Å"),
        ("Wavelength (air)", "Wavelength", ""),
        ("Raman shift (1/cm)", "Raman shift", "1/cm"),
        ("Detector A", "Detector A", ""),
        ("nm", "", "nm"),
        ("(nm)", "", "nm"),
        ("Tuning (V)", "Tuning", "V"),
        ("Signal", "Signal", ""),
        ("=1+1", "=1+1", ""),
    ],
)
def test_labels(cell: str, name: str, unit: str) -> None:
    label = read_label(cell)
    assert (label.name, label.unit) == (name, unit)


def test_units_of_the_second_column_are_kept_as_they_stand() -> None:
    rows = ROWS["spectrum"]()
    for header, unit in [
        ("Wavelength (nm),Intensity (a.u.)", "a.u."),
        ("Wavelength (nm),Counts/s", "Counts/s"),
        ("Wavelength (nm),Power [mW/nm]", "mW/nm"),
        ("Wavelength (nm),Signal", "counts"),
        ("Wavelength (nm),Counts per 0.1 nm", "counts"),
    ]:
        assert read_spectrum(table(rows, above=[header]), name="s").units == ("nm", unit)


def test_given_units_go_before_those_of_the_header() -> None:
    rows = [(f"{float(x) / 1000:.5f}", y) for x, y in ROWS["spectrum"]()]
    data = read_spectrum(table(rows, above=["Tuning (V),Counts"]), name="s", units=("um", "cts"))
    assert data.units == ("µm", "cts")
    assert data.wavelengths[0] == 600e-9
    error = refusal(read_spectrum, table(rows), name="s", units=("ns", ""))
    assert "'ns' is no unit of the axis of a spectrum" in error.reason
    assert error.line is None
    for wrong in ("nm", ("nm",), ("nm", 3)):
        assert (
            "units is a pair" in refusal(read_spectrum, table(rows), name="s", units=wrong).reason
        )


def test_a_wrong_unit_names_the_column_that_would_fit() -> None:
    rows = [(f"{at / 4}", x, y) for at, (x, y) in enumerate(ROWS["spectrum"]())]
    error = refusal(read_spectrum, table(rows, above=["Time (s),Wavelength (nm),Counts"]), name="s")
    assert "'Wavelength (nm)' may be meant, column 1 from 0" in error.reason
    assert error.line == 1


def test_a_unit_in_a_header_that_is_parted_in_no_way() -> None:
    rows = [(f"{16 * at}", "9") for at in range(60)]
    above = ["delay after the pulse in ps   and what was counted then"]
    data = read_decay(table(rows, above=above, delimiter=" "), name="d")
    assert data.width == 16e-12


def test_wanted_columns_by_position_and_by_label() -> None:
    rows = [(y, "note", x) for x, y in ROWS["spectrum"]()]
    content = table(rows, above=["run 7", "Counts,Remark,Wavelength (nm)"])
    wanted = read_spectrum(plain("spectrum"), name="s")
    for chosen in [(2, 0), ("Wavelength (nm)", "Counts"), ("wavelength", "counts"), (2, "Counts")]:
        data = read_spectrum(content, name="s", columns=chosen)
        assert np.array_equal(data.wavelengths, wanted.wavelengths)
        assert np.array_equal(data.counts, wanted.counts)
    for wrong, reason in [
        ((2, 2), "twice"),
        ((0, -1), "a position from 0"),
        ((0, True), "a position from 0"),
        ((0, 1.5), "a position from 0"),
        ((0,), "columns is a pair"),
        ("ab", "columns is a pair"),
        (("Wavelength", "Nothing"), "no header names the columns"),
        ((0, 9), "no line has numbers in its columns 0 and 9"),
    ]:
        assert reason in refusal(read_spectrum, content, name="s", columns=wrong).reason


# --- spectra -------------------------------------------------------------------------------------


def band(wavelengths: np.ndarray) -> np.ndarray:
    """Photons per unit wavelength, a Gaussian of 12 nm around 637 nm, wavelengths in m."""
    return 1000 * np.exp(-(((wavelengths - 637e-9) / 12e-9) ** 2))


@pytest.mark.parametrize(
    ("unit", "of_wavelength"),
    [
        ("eV", lambda lam: 1.602176634e-19**-1 * 6.62607015e-34 * 299792458 / lam),
        ("meV", lambda lam: 1e3 * 1.602176634e-19**-1 * 6.62607015e-34 * 299792458 / lam),
        ("THz", lambda lam: 1e-12 * 299792458 / lam),
        ("GHz", lambda lam: 1e-9 * 299792458 / lam),
        ("cm-1", lambda lam: 0.01 / lam),
    ],
)
def test_counts_per_unit_energy_become_counts_per_unit_wavelength(
    unit: str, of_wavelength: Callable[[Any], Any]
) -> None:
    # The derivative is taken numerically, so it shares nothing with the code but the definition.
    lam = np.linspace(600e-9, 680e-9, 161)
    step = 1e-6 * lam
    derivative = np.abs(of_wavelength(lam + step) - of_wavelength(lam - step)) / (2 * step)
    per_unit = band(lam) / derivative
    rows = np.column_stack([of_wavelength(lam), per_unit])
    data = spectrum(rows, f"Axis ({unit}),Intensity (a.u.)")
    assert data.wavelengths == pytest.approx(lam, rel=1e-13)
    shape = data.counts / band(data.wavelengths)
    assert shape == pytest.approx(np.full(lam.size, shape[0]), rel=1e-9)
    assert "1/λ²" in said(data)


def test_the_noise_follows_the_jacobian() -> None:
    energy = np.linspace(1.8, 2.1, 61)
    data = spectrum(np.column_stack([energy, np.full(61, 400.0)]), "Energy (eV),Counts")
    assert data.gain is not None
    assert data.floor is not None
    # Raw counts of 400 scatter by 20, a share of 1/20, whatever they are multiplied by.
    variance = data.gain * data.counts + data.floor
    assert np.sqrt(variance) / data.counts == pytest.approx(np.full(61, 1 / 20))
    assert np.array_equal(
        data.wavelengths, np.sort(constants.h * constants.c / constants.e / energy)
    )


def test_power_becomes_photons() -> None:
    lam = np.linspace(600, 680, 81)
    power = band(lam * 1e-9) / lam  # a photon carries hc/λ
    data = spectrum(np.column_stack([lam, power]), "Wavelength (nm),Power (mW/nm)", of="power")
    shape = data.counts / band(lam * 1e-9)
    assert shape == pytest.approx(np.full(81, shape[0]), rel=1e-12)
    assert "power was made photons" in said(data)
    assert (
        'of is "counts" or "power"'
        in refusal(read_spectrum, plain("spectrum"), name="s", of="light").reason
    )


def test_levels_of_power_become_powers() -> None:
    rows = [(600 + at, -30.0 - at / 10) for at in range(50)]
    data = spectrum(rows, "Wavelength (nm),Level (dBm)")
    assert data.counts[10] / data.counts[0] == pytest.approx(10 ** (-0.1))
    assert data.gain is None


def test_whole_counts_have_counting_noise_and_others_have_not() -> None:
    rows = np.array([(600.0 + at, 3.0 * at) for at in range(30)])
    counted = spectrum(rows)
    assert counted.gain is not None
    assert counted.floor is not None
    assert counted.gain.tolist() == [1.0] * 30
    assert counted.floor.tolist() == [0.0] * 30
    for data in (
        spectrum(rows + np.array([0, 0.5])),
        spectrum(rows / np.array([1, 30])),  # whole in part, at most 2.9
        spectrum(np.minimum(rows, [1e9, 9])),
        spectrum(rows - np.array([0, 3])),  # one below zero
        spectrum(rows, of="power"),
        spectrum(rows, "Wavelength (nm),Rate (counts/s)"),
        spectrum(rows, "Wavelength (nm),Rate (cps)"),
    ):
        assert data.gain is None
        assert data.floor is None


def test_repeated_wavelengths_are_averaged_and_listed() -> None:
    rows = [(600.0 + at, 40.0) for at in range(20)] + [(605.0, 60.0), (605.0, 80.0), (607.0, 20.0)]
    data = spectrum(rows)
    assert data.counts[5] == 60.0  # (40 + 60 + 80)/3
    assert data.counts[7] == 30.0
    assert data.gain is not None
    # The mean of three counts of mean m has the variance m/3.
    assert data.gain[[4, 5, 7]] == pytest.approx([1, 1 / 3, 1 / 2])
    assert [one.line for one in data.dropped] == [21, 22, 23]
    assert data.dropped[0].reason == "605 nm stands in line 6 already: averaged"
    error = refusal(spectrum, [(600.0, 5.0)] * 30 + [(601.0, 4.0)])
    assert error.reason == "the rows hold 2 different wavelengths, 5 are needed"


def test_noise_below_zero_is_kept_and_said() -> None:
    rows = [(600.0 + at, -4.0 if at % 10 == 0 else 50.0) for at in range(50)]
    data = spectrum(rows)
    assert data.counts.min() == -4
    assert "5 of 50 counts are below zero; they count as zero in the map" in said(data)
    assert data.samples(600e-9).counts.min() == 0


def test_a_background_is_taken_away_as_a_number_and_as_a_file() -> None:
    lam = np.linspace(600, 640, 41)
    rows = np.column_stack([lam, 100 + np.arange(41)])
    data = spectrum(rows, background=60)
    assert data.counts.tolist() == (40 + np.arange(41.0)).tolist()
    assert data.gain is not None
    assert data.floor is not None
    # A raw count of mean 100 + i scatters by its root; that is (40 + i) + 60.
    assert (data.gain * data.counts + data.floor).tolist() == (100 + np.arange(41.0)).tolist()
    dark = table([(f"{x}", "60") for x in range(590, 651, 10)], above=["Wavelength (nm),Counts"])
    data = spectrum(rows, background=dark)
    assert data.counts == pytest.approx(40 + np.arange(41.0))
    assert data.floor is not None
    # At 600 the dark count itself is used, variance 60; at 605 the mean of two, variance 30.
    assert data.floor[[0, 5, 10]] == pytest.approx([60 + 60, 60 + 30, 60 + 60])
    assert "the background in 'background' was taken away, interpolated" in said(data)


def test_a_response_is_divided_out() -> None:
    lam = np.linspace(600, 640, 41)
    rows = np.column_stack([lam, np.rint(2000 * (1 - (lam - 600) / 80))])
    curve = table([("590", "1.125"), ("650", "0.375")], above=["Wavelength (nm),Sensitivity"])
    data = spectrum(rows, response=curve)
    # The sensitivity falls from 1 at 600 nm to 0.5 at 640 nm, and so do the counts of a flat source.
    assert data.counts == pytest.approx(np.full(41, 2000.0))
    assert data.gain is not None
    assert data.gain[[0, 40]] == pytest.approx([1, 2])


def test_a_background_or_response_that_does_not_fit_is_refused_by_its_own_name(
    tmp_path: Path,
) -> None:
    def other(name: str, rows: list[tuple[str, str]], header: str = "Wavelength (nm),y") -> Path:
        path = tmp_path / name
        path.write_bytes(table(rows, above=[header]))
        return path

    short = other("short.csv", [("610", "5"), ("660", "5"), ("670", "5")])
    blind = other("blind.csv", [("590", "1"), ("640", "0"), ("690", "1")])
    energy = other("energy.csv", [("1.5", "9"), ("1.9", "9"), ("2.5", "9")], "Energy (eV),y")
    volts = other("volts.csv", [("1.5", "9"), ("1.9", "9"), ("2.5", "9")], "Tuning (V),y")
    for named, file, line, reason in [
        ({"background": short}, "short.csv", None, "covers 610 to 670 nm, the spectrum 600 to 674"),
        ({"response": short}, "short.csv", None, "must cover the whole"),
        ({"response": blind}, "blind.csv", 3, "above zero, not 0"),
        ({"background": energy}, "energy.csv", None, "give both over the same axis"),
        ({"background": volts}, "volts.csv", 1, "'V' is no unit"),
        ({"background": float("nan")}, "s.csv", None, "a finite number, not nan"),
        ({"background": tmp_path / "none.csv"}, "none.csv", None, "there is no such file"),
        ({"background": 1e6}, "s.csv", 2, "no value is above zero"),
    ]:
        error = refusal(read_spectrum, plain("spectrum"), name="s.csv", **named)
        assert (error.file, error.line) == (file, line)
        assert reason in error.reason
        check_sentence(error, file)


def test_the_noise_is_that_of_repeated_counts() -> None:
    """Variance of many Poisson draws of signal and background against gain·expected + floor."""
    random = np.random.default_rng(11)
    lam = np.linspace(600, 640, 41)
    signal = 400 * np.exp(-(((lam - 620) / 8) ** 2)) + 30
    places = np.linspace(595, 645, 26)  # every second wavelength of the spectrum lies between two
    curve = table([("590", "1.2"), ("650", "0.6")])
    found, floors = [], []
    for _ in range(150):
        dark = table(
            [(f"{x}", f"{y}") for x, y in zip(places, random.poisson(50, 26), strict=True)]
        )
        raw = random.poisson(signal + 50)
        data = spectrum(np.column_stack([lam, raw]), background=dark, response=curve)
        found.append(data.counts)
        floors.append(data.floor)
    assert data.gain is not None
    expected = np.mean(found, axis=0)
    variance = data.gain * expected + np.mean(floors, axis=0)
    ratio = np.var(found, axis=0, ddof=1) / variance
    # 150 draws know a variance to √(2/149) = 12 %; the mean over 41 places, alike in part, to about 3 %.
    assert ratio.mean() == pytest.approx(1, abs=0.1)
    assert abs(ratio - 1).max() < 0.6
    relative = np.interp(lam, [590, 650], [1.2, 0.6])
    wanted = signal / relative * relative.max()
    assert expected == pytest.approx(wanted, abs=5 * np.sqrt(variance / 150).max())


def test_the_light_beyond_the_ends_is_estimated() -> None:
    lam = np.arange(560, 701, 0.1)
    width, peak = 5.0, 640.0
    line = 1000 / (1 + ((lam - peak) / (width / 2)) ** 2)
    data = spectrum(np.column_stack([lam, line]))
    below, above = cut_tails(data)
    # Integral of a Lorentzian beyond a distance d from its peak: 1/2 − arctan(2d/w)/π.
    exact = [0.5 - np.arctan(2 * d / width) / np.pi for d in (peak - lam[0], lam[-1] - peak)]
    assert [below, above] == pytest.approx(exact, rel=0.07)
    assert "an estimated 2.4 % of the light lies beyond the ends of the file" in said(data)
    whole = dataclasses.replace(data, counts=np.where(line > 100, line, 0.0))
    assert cut_tails(whole) == (0.0, 0.0)


# --- histograms ----------------------------------------------------------------------------------


def test_rounded_times_lie_on_the_grid_through_them() -> None:
    rows = [(f"{at / 61:.3f}", str(at % 7)) for at in range(2000)]  # bins of 1/61 ns
    data = read_decay(table(rows, above=["Time (ns),Counts"]), name="d")
    # Rounding to 0.001 ns, uniform, leaves the slope of 2000 times known to a few times 1e-8 ns.
    assert data.width == pytest.approx(1e-9 / 61, rel=1e-5)
    assert np.diff(data.times) == pytest.approx(np.full(1999, data.width), rel=1e-6)
    assert np.abs(data.times - np.arange(2000) * 1e-9 / 61).max() < 0.0005e-9
    assert "the times are rounded in the file" in said(data)


def test_bins_may_be_missing() -> None:
    rows = [(f"{at * 0.25:.2f}", "3") for at in range(100) if at % 10 or at == 0]
    data = read_decay(table(rows), name="d")
    assert data.width == 0.25e-9
    assert data.times.tolist() == [units.to_si(float(x), "ns") for x, _ in rows]
    assert "9 of 100 bins are missing" in said(data)


def test_channels_of_a_given_width() -> None:
    rows = [(str(at), "3") for at in range(100)]
    content = table(rows, above=["Channel,Counts"])
    data = read_decay(content, name="d", units=("16 ps", "counts"))
    assert data.times.tolist() == [units.to_si(16 * at, "ps") for at in range(100)]
    assert data.width == 16e-12
    assert read_decay(content, name="d", units=("0.1 ns", "")).times[3] == 0.3e-9
    assert read_coincidences(content, name="d", units=("4 ns", "")).width == 4e-9


def test_identical_rows_are_dropped_and_others_refused() -> None:
    rows = [(str(at), str(at)) for at in range(40)]
    data = read_decay(table([*rows, ("7", "7")]), name="d")
    assert data.times.size == 40
    assert [str(one) for one in data.dropped] == [
        "line 41: 7 ns stands in line 8 already: left out"
    ]
    error = refusal(read_decay, table([*rows, ("7", "8")]), name="d")
    assert (error.line, "with another count" in error.reason) == (41, True)


def test_counts_that_are_not_whole_are_no_counts() -> None:
    rows = [(str(at), "1.5") for at in range(40)]
    data = read_coincidences(table(rows), name="c")
    assert not data.counting
    assert "no whole numbers" in said(data)
    assert read_coincidences(plain("coincidences"), name="c").counting


def test_one_time_far_away_is_refused() -> None:
    rows = [(str(at), "3") for at in range(40)]
    error = refusal(read_decay, table([*rows, ("1e12", "3")]), name="d")
    assert (error.line, "lies more than" in error.reason) == (41, True)


# --- angular patterns ----------------------------------------------------------------------------


def pattern(angles: Any, powers: Any, header: str = "", **named: Any) -> Any:
    rows = [(f"{x!r}", f"{y!r}") for x, y in zip(angles, powers, strict=True)]
    return read_pattern(table(rows, above=[header] if header else []), name="p.csv", **named)


@pytest.mark.parametrize(
    "angles",
    [
        [float(at) for at in range(-90, 91)],
        [float(at) for at in range(181)],
        [float(at) for at in range(-180, 181)],
        [float(at) for at in range(361)],
        [float(at) for at in range(-180, 180)],
        [float(at) for at in range(-90, 1)],
    ],
)
def test_a_symmetric_pattern_folds_to_one_side(angles: list[float]) -> None:
    data = pattern(
        angles,
        [float(f"{np.cos(np.radians(at)) ** 2:.9f}") for at in angles],
    )
    wanted = np.radians(np.arange(91.0))
    assert data.angles == pytest.approx(wanted, abs=1e-15)
    assert data.powers == pytest.approx(np.cos(wanted) ** 2, abs=1e-9)
    reaches = max(abs(at) for at in angles) >= 175
    assert (data.upward_share is not None) == reaches
    assert not reaches or data.upward_share == pytest.approx(0.5, abs=1e-9)
    assert ("both sides" in said(data)) == (min(angles) < 0 < max(angles) or max(angles) > 180)


def test_both_sides_are_averaged_where_their_angles_differ() -> None:
    # A slope of 0.01 per degree to the right and level to the left: the mean has half the slope.
    right, left = [float(at) for at in range(0, 81, 2)], [float(-at) for at in range(1, 62, 3)]
    data = pattern(right + left, [1 + 0.01 * at for at in right] + [1.0] * len(left))
    degrees = np.degrees(data.angles)
    both = degrees <= 61
    assert degrees.tolist() == pytest.approx(sorted({*right, *(-at for at in left)}))
    assert data.powers[both] == pytest.approx(1 + 0.005 * degrees[both], abs=1e-12)
    assert data.powers[~both] == pytest.approx(1 + 0.01 * degrees[~both], abs=1e-12)
    assert "interpolated to all angles" in said(data)


@pytest.mark.parametrize(
    ("power", "share"),
    [
        # ∫₀^{π/2} P sin θ dθ / ∫₀^π P sin θ dθ by hand, with u = cos θ.
        (lambda t: np.cos(t) ** 2, 1 / 2),
        (lambda t: np.sin(t) ** 2, 1 / 2),  # a dipole along the axis
        (lambda t: 1 + np.cos(t) / 2, 5 / 8),
        (lambda t: (1 + np.cos(t)) ** 2, 7 / 8),
    ],
)
def test_the_share_that_goes_up(power: Callable[[Any], Any], share: float) -> None:
    degrees = np.arange(0, 180.01, 0.1)
    data = pattern(degrees.tolist(), power(np.radians(degrees)).tolist())
    # Linear pieces of 0.1° are wrong by (0.1°)²/12 = 2.5e-7 of the curvature.
    assert data.upward_share == pytest.approx(share, abs=1e-6)
    assert data.angles[-1] == np.pi / 2


def test_the_share_that_goes_up_is_exact_for_a_straight_line() -> None:
    # ∫₀^{π/2} θ sin θ dθ = 1 and ∫₀^π θ sin θ dθ = π.
    for angles in (np.array([0.0, np.pi]), np.linspace(0, np.pi, 100_001)):
        assert upward_share(angles, angles) == pytest.approx(1 / np.pi, rel=1e-12)


def test_radians_and_levels_of_a_pattern() -> None:
    radians = [f"{at:.4f}" for at in np.linspace(0, np.pi / 2, 46)]  # ends at 1.5708, above π/2
    rows = [(x, f"{-0.1 * at:.1f}") for at, x in enumerate(radians)]
    data = read_pattern(table(rows, above=["theta (rad),Power (dB)"]), name="p")
    assert data.angles[-1] == np.pi / 2
    assert data.angles[:-1].tolist() == [float(x) for x in radians[:-1]]
    assert data.powers == pytest.approx(10 ** (-0.01 * np.arange(46)))
    assert data.units == ("rad", "dB")
    thousandth = [(str(at), "5") for at in range(0, 1500, 100)]
    data = read_pattern(table(thousandth, above=["theta (mrad),Power"]), name="p")
    assert data.angles[1] == 0.1
    full = [(f"{at:.4f}", "5") for at in np.linspace(-np.pi, np.pi, 73)]
    assert read_pattern(table(full, above=["theta (rad),Power"]), name="p").upward_share == (
        pytest.approx(0.5)
    )


def test_a_value_at_the_side_is_interpolated() -> None:
    data = pattern([0.0, 30.0, 60.0, 85.0, 95.0, 120.0], [6.0, 5.0, 4.0, 3.0, 1.0, 0.5])
    assert np.degrees(data.angles) == pytest.approx([0, 30, 60, 85, 90])
    assert data.powers[-1] == pytest.approx(2.0)
    assert data.upward_share is None


# --- the package ---------------------------------------------------------------------------------


def test_reading_loads_pandas_only_when_it_reads() -> None:
    code = "import explorer.measured.reading, sys; print('pandas' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"


def test_a_file_may_come_as_its_name_and_its_bytes() -> None:
    rows = "\n".join(f"{500 + i},{100 + i % 7}" for i in range(40)).encode()
    dark = "\n".join(f"{500 + i},{20}" for i in range(40)).encode()
    data = read_spectrum(("light.csv", rows), background=("dark.csv", dark))
    assert data.name == "light.csv"
    assert any("'dark.csv'" in note for note in data.read_as)
    with pytest.raises(DataError, match=r"^dark\.csv: the file is empty$"):
        read_spectrum(("light.csv", rows), background=("dark.csv", b""))
