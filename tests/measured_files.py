"""Builders of measured files: friendly variants of one table, and hostile ones that must be refused."""

from __future__ import annotations

import os
import zipfile
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from io import BytesIO
from pathlib import Path

import numpy as np


@dataclass(frozen=True)
class Hostile:
    """A file that must be refused. kind: of data it is given for. says: part of the sentence.

    line: that the sentence names, or None where the fault is not one line's.
    """

    name: str
    kind: str
    content: bytes
    says: str
    line: int | None = None


def spectrum_rows() -> list[tuple[str, str]]:
    """A line of counts at 637 nm on an even axis, as text with a decimal point."""
    axis = np.arange(600.0, 675.0, 0.25)
    counts = np.rint(5000 / (1 + ((axis - 637.1) / 6) ** 2) + 40 * (1 + np.sin(axis * 7)))
    return [(f"{x:.2f}", f"{int(y)}") for x, y in zip(axis, counts, strict=True)]


def decay_rows() -> list[tuple[str, str]]:
    """A decay of 8 ns in bins of 64 ps, as text with a decimal point."""
    times = [f"{index * 64 / 1000:.3f}" for index in range(600)]
    counts = np.rint(
        [0 if index < 20 else 3000 * np.exp(-(index - 20) * 0.064 / 8) for index in range(600)]
    )
    return [(x, f"{int(y)}") for x, y in zip(times, counts, strict=True)]


def coincidence_rows() -> list[tuple[str, str]]:
    """Peaks of a pulsed source without the one at zero delay, delays of both signs."""
    delays = np.arange(-400, 401)
    counts = [0 if abs(one) < 50 else int(900 * np.exp(-abs(one % 100) / 8)) for one in delays]
    return [(f"{one * 0.25:.2f}", f"{count}") for one, count in zip(delays, counts, strict=True)]


def pattern_rows() -> list[tuple[str, str]]:
    """cos² θ from the axis to the side."""
    return [(f"{angle}", f"{np.cos(np.radians(angle)) ** 2:.6f}") for angle in range(0, 91, 2)]


ROWS = {
    "spectrum": spectrum_rows,
    "decay": decay_rows,
    "coincidences": coincidence_rows,
    "pattern": pattern_rows,
}
UNITS = {"spectrum": "nm", "decay": "ns", "coincidences": "ns", "pattern": "°"}
LABELS = {
    "spectrum": "Wavelength",
    "decay": "Time",
    "coincidences": "Delay",
    "pattern": "Angle",
}


def table(
    rows: Sequence[Sequence[str]],
    *,
    above: Sequence[str] = (),
    delimiter: str = ",",
    decimal: str = ".",
    end: str = "\n",
    last: bool = True,
    encoding: str = "utf-8",
) -> bytes:
    """Bytes of a table under some lines."""
    lines = [*above, *(delimiter.join(row).replace(".", decimal) for row in rows)]
    return (end.join(lines) + (end if last else "")).encode(encoding)


def plain(kind: str) -> bytes:
    """The file of a kind in its plainest form: commas, points, one header line."""
    return table(ROWS[kind](), above=[f"{LABELS[kind]} ({UNITS[kind]}),Counts"])


@cache
def variants(kind: str) -> dict[str, bytes]:
    """The same numbers as instruments and spreadsheets write them; all read to the same arrays."""
    rows, unit, label = ROWS[kind](), UNITS[kind], LABELS[kind]
    head = f"{label} ({unit})"
    quoted = [[f'"{cell}"' for cell in row] for row in rows]
    comma = [[f'"{cell.replace(".", ",")}"' for cell in row] for row in rows]
    wide = [[str(index), *row, "7", "x"] for index, row in enumerate(rows, 1)]
    remarks = [
        row for at, row in enumerate(rows) for row in ([row, ("# a remark", "")][: 1 + (at == 9)])
    ]
    return {
        "no header": table(rows),
        "semicolons": table(rows, above=[f"{head};Counts"], delimiter=";"),
        "tabulators": table(rows, above=[f"{head}\tCounts"], delimiter="\t"),
        "spaces": table(rows, above=[f"{head}   Counts"], delimiter="    "),
        "leading spaces": table(
            [("  " + x, y) for x, y in rows], above=[f"{head} Counts"], delimiter=" "
        ),
        "comma and space": table(rows, above=[f"{head}, Counts"], delimiter=", "),
        "decimal comma, semicolons": table(
            rows, above=[f"{head};Counts"], delimiter=";", decimal=","
        ),
        "decimal comma, tabulators": table(
            rows, above=[f"{head}\tCounts"], delimiter="\t", decimal=","
        ),
        "decimal comma, spaces": table(rows, above=[f"{head} Counts"], delimiter="  ", decimal=","),
        "decimal comma in quotes": table(comma, above=[f'"{head}","Counts"']),
        "quotes": table(quoted, above=[f'"{head}","Counts"']),
        "quotes, semicolons": table(quoted, above=[f'"{label}, {unit}";"Counts"'], delimiter=";"),
        "quotes around rows": table(
            [(f'"{x}', f'{y}"') for x, y in rows], above=[f'"{head},Counts"']
        ),
        "bars": table(rows, above=[f"{head} | Counts"], delimiter=" | "),
        "quotes, tabulators": table(quoted, above=[f'"{head}"\t"Counts"'], delimiter="\t"),
        "byte-order mark": table(rows, above=[f"{head},Counts"], encoding="utf-8-sig"),
        "UTF-16": table(rows, above=[f"{head}\tCounts"], delimiter="\t", encoding="utf-16"),
        "UTF-16 of the other order": b"\xfe\xff"
        + table(rows, delimiter="\t", encoding="utf-16-be"),
        "UTF-16 without a mark": table(rows, above=[f"{label},Counts"], encoding="utf-16-le"),
        "Latin-1": table(rows, above=["größe °,Zähler", f"{head},Counts"], encoding="latin-1"),
        "Windows line ends": table(rows, above=[f"{head},Counts"], end="\r\n"),
        "old line ends": table(rows, above=[f"{head},Counts"], end="\r"),
        "doubled line ends": table(rows, above=[f"{head},Counts"], end="\r\r\n"),
        "no last line end": table(rows, above=[f"{head},Counts"], last=False),
        "end-of-file sign": table(rows, above=[f"{head},Counts"]) + b"\x1a",
        "empty lines": table(rows, above=["", f"{head},Counts", ""], end="\n\n"),
        "empty cells behind": table(rows, above=[f"{head},Counts,,"]).replace(b"\n", b",,\n"),
        "separators behind": table(rows, above=[f"{head};Counts;"], delimiter=";").replace(
            b"\n", b";\n"
        ),
        "units in square brackets": table(rows, above=[f"{label} [{unit}],Counts [1]"]),
        "unit behind a slash": table(rows, above=[f"{label}/{unit},Counts"]),
        "unit behind a comma": table(rows, above=[f"{label}, {unit},Counts"]),
        "unit behind an underscore": table(rows, above=[f"{label.lower()}_{unit},counts"]),
        "unit in words": table(rows, above=[f"{label} in {unit},Counts"]),
        "units row": table(rows, above=[f"{label};Counts", f"{unit};"], delimiter=";"),
        "units row in brackets": table(
            rows, above=[f"{label};Counts", f"({unit});(a.u.)"], delimiter=";"
        ),
        "units row and remarks row": table(
            rows,
            above=[f"{label}\tCounts", f"{unit}\tcounts", "first run\tsecond floor"],
            delimiter="\t",
        ),
        "header in a remark": table(rows, above=["# of a Monday", f"# {head}, Counts"]),
        "preamble": table(
            rows,
            above=["Measured: 2 May", "Exposure (s): 10", "Mode; 5; on", "", f"{head},Counts"],
        ),
        "preamble of numbers": table(rows, above=["Gain,7", "Grating,1200,500", f"{head},Counts"]),
        "remarks between": table(remarks, above=[f"{head},Counts"]),
        "percent remarks": table(rows, above=["% by hand", f"% {head},Counts"]),
        "slashed remarks": table(rows, above=["// by hand", f"{head},Counts"]),
        "semicolon remarks": table(rows, above=["; by hand", f"{head},Counts"]),
        "quoted remark": table(rows, above=['"taken, by hand"', f"{head},Counts"]),
        "footer": table(rows, above=[f"{head},Counts"]) + b"End of data\n",
        "reversed": table(rows[::-1], above=[f"{head},Counts"]),
        "unsorted": table(rows[1::2] + rows[::2], above=[f"{head},Counts"]),
        "numbered rows": table(wide, above=[f"No.,{head},Counts,Dark,Remark"]),
        "more columns": table(
            [(*row, "8", "yes") for row in rows], above=[f"{head},Counts,Dark,Good"]
        ),
        "powers of ten": table(
            [(f"{float(x) / 100!r}e2", f"{y}E+00") for x, y in rows], above=[f"{head},Counts"]
        )
        if all(float(f"{float(x) / 100!r}e2") == float(x) for x, _ in rows)
        else table(rows),
        "plus signs": table([(x, f"+{y}") for x, y in rows], above=[f"{head},Counts"]),
        "typeset minus": table(
            [(x.replace("-", "−"), y) for x, y in rows], above=[f"{head},Counts"]
        ),
        "formula in the preamble": table(
            rows, above=["=1+1", "=CMD|' /C calc'!A0", f"{head},Counts"]
        ),
        "script in the preamble": table(
            rows, above=["<script>alert(1)</script>", "<b>bold</b>", f"{head},Counts"]
        ),
        "open quote in the preamble": table(rows, above=['"an open quote', f"{head},Counts"]),
        "one empty row": table([*rows[:5], ("", ""), *rows[5:]], above=[f"{head},Counts"]),
        "one missing number": table([*rows[:5], ("nan", "1"), *rows[5:]], above=[f"{head},Counts"]),
        "one broken row": table(
            [*rows[:5], ("#DIV/0!", "oops"), *rows[5:]], above=[f"{head},Counts"]
        ),
    }


def _packed(names: Sequence[str]) -> bytes:
    made = BytesIO()
    with zipfile.ZipFile(made, "w") as archive:
        for name in names:
            archive.writestr(name, "<x/>")
    return made.getvalue()


def _with(kind: str, row: int, cells: Sequence[str]) -> bytes:
    """The plain file with another row; row 0 stands in line 2."""
    rows: list[Sequence[str]] = list(ROWS[kind]())
    rows[row] = cells
    return table(rows, above=[f"{LABELS[kind]} ({UNITS[kind]}),Counts"])


def _headed(kind: str, header: str) -> bytes:
    return table(ROWS[kind](), above=[header])


def _no_text() -> list[Hostile]:
    """Files that are no text."""
    noise = np.random.default_rng(5).integers(0, 256, 20_000, dtype=np.uint8).tobytes()
    sheet = _packed(["[Content_Types].xml", "xl/workbook.xml"])
    return [
        Hostile("empty.csv", "spectrum", b"", "the file is empty"),
        Hostile("blank.csv", "decay", b" \n\r\n\t\n", "the file is empty"),
        Hostile("mark.csv", "decay", b"\xef\xbb\xbf", "the file is empty"),
        Hostile(
            "noise.dat", "spectrum", noise, "binary file", noise[: noise.index(0)].count(10) + 1
        ),
        Hostile(
            "null.txt", "decay", plain("decay")[:40] + b"\0" + plain("decay")[40:], "null byte", 4
        ),
        Hostile("control.txt", "decay", bytes(range(1, 9)) * 500, "binary file"),
        Hostile("sheet.csv", "spectrum", sheet, "this is a spreadsheet file, save it as CSV text"),
        Hostile(
            "old_sheet.csv",
            "spectrum",
            b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + bytes(99),
            "save it as CSV",
        ),
        Hostile("packed.csv", "spectrum", _packed(["a.txt"]), "compressed file"),
        Hostile("packed.gz", "decay", b"\x1f\x8b\x08\x00" + bytes(30), "compressed file"),
        Hostile("paper.csv", "pattern", b"%PDF-1.7\n1 0 obj", "PDF document"),
        Hostile("picture.csv", "pattern", b"\x89PNG\r\n\x1a\n" + bytes(30), "picture"),
        Hostile("letter.csv", "spectrum", b"{\\rtf1\\ansi 637 5}", "word processor"),
        Hostile(
            "half.csv",
            "spectrum",
            b"\xff\xfe1\x00,\x00\x00\xd8\x00\xd8",
            "says that it is UTF-16",
            1,
        ),
        Hostile("hierarchy.csv", "decay", b"\x89HDF\r\n\x1a\n" + bytes(30), "HDF5"),
    ]


def _no_table() -> list[Hostile]:
    """Text that holds no table of two columns of numbers."""
    page = (
        "<html><body><table>" + "<tr><td>637</td><td>5</td></tr>\n" * 40 + "</table></body></html>"
    )
    return [
        Hostile("one_column.csv", "spectrum", b"Counts\n5\n6\n7\n8\n9\n", "only one column", 2),
        Hostile(
            "words.txt", "decay", b"nothing here\nbut words\n" * 9, "no line holds two columns"
        ),
        Hostile(
            "header_only.csv", "spectrum", b"Wavelength (nm),Counts\n", "no line holds two columns"
        ),
        Hostile("page.csv", "spectrum", page.encode(), "markup language", 1),
        Hostile(
            "record.csv",
            "decay",
            b'{"time": [1, 2, 3],\n "counts": [4, 5, 6]}\n',
            "markup language",
            1,
        ),
        Hostile(
            "all_nan.csv", "spectrum", b"a,b\n" + b"nan,nan\n" * 30, "no line holds two columns"
        ),
        Hostile(
            "text_first.csv",
            "spectrum",
            b"t,x,y\n" + b"noon,600,5\n" * 9,
            "say which are wanted",
            2,
        ),
        Hostile("four_rows.csv", "decay", b"0,5\n1,4\n2,3\n3,2\n", "only 4 rows", 1),
        Hostile("one_row.csv", "pattern", b"0;5\n", "only 1 row of", 1),
        Hostile(
            "lying_down.csv",
            "spectrum",
            (",".join(map(str, range(400, 900))) + "\n" + ",".join(map(str, range(500)))).encode(),
            "only 2 rows",
            1,
        ),
        Hostile("thirds_nan.csv", "spectrum", _third("nan"), "hold no two numbers", 4),
        Hostile("thirds_empty.csv", "decay", _third(""), "cell is empty", 4),
        Hostile("thirds_words.csv", "spectrum", _third("off-scale"), "'off-scale' is no number", 4),
        Hostile("thirds_formulas.csv", "decay", _third("=1+1"), "'=1+1' is no number", 4),
        Hostile("infinite.csv", "decay", _third("inf"), "'inf' in the second cell", 4),
        Hostile("overflow.csv", "decay", _third("1e999"), "usable size", 4),
        Hostile("underscores.csv", "decay", _third("1_000"), "'1_000' is no number", 4),
        Hostile("hexadecimal.csv", "decay", _third("0x1F"), "'0x1F' is no number", 4),
        Hostile("long_cells.csv", "decay", _third("9" * 5000), "999…' is no number", 4),
        Hostile("scripts.csv", "decay", _third("<script>alert(1)</script>"), "is no number", 4),
        Hostile("control_cells.csv", "decay", _third("\x1b[31mred"), "x1b[31mred' is no number", 4),
        Hostile(
            "turned_text.csv", "decay", _third("\u202egnp.exe"), "u202egnp.exe' is no number", 4
        ),
        Hostile("two_tables.csv", "spectrum", plain("spectrum") * 2, "a second table begins", 302),
    ]


def _third(cell: str) -> bytes:
    """A decay or spectrum in which every third row from the third holds a cell that is no number."""
    rows = [(f"{600 + at}", cell if at % 3 == 2 else "12") for at in range(60)]
    return table(rows, above=["x,y"])


def _ambiguous() -> list[Hostile]:
    """Text that can be understood in more than one way."""
    both = [(f"{600 + at}", f"1,{at + 100}") for at in range(50)]
    commas = [(f"{600 + at},5", f"{at},25") for at in range(50)]
    numbered = [(str(at), str(600 + at), str(at + 5)) for at in range(50)]
    return [
        Hostile("thousands.csv", "spectrum", table(both, delimiter=";"), "decimals or thousands"),
        Hostile(
            "commas.csv",
            "spectrum",
            table(commas, above=["x,y"]),
            "save the file with semicolons",
            2,
        ),
        Hostile("numbered.csv", "spectrum", table(numbered), "only counts the rows", 1),
        Hostile("channels.csv", "decay", _headed("decay", "Channel,Counts"), "give the width", 1),
        Hostile(
            "swapped.csv",
            "spectrum",
            table([row[::-1] for row in spectrum_rows()], above=["Counts,Wavelength (nm)"]),
            "columns=(1, 0)",
            1,
        ),
    ]


def _wrong_values() -> list[Hostile]:
    """Tables of numbers that are no data of their kind."""
    zeros = {kind: table([(x, "0") for x, _ in rows()]) for kind, rows in ROWS.items()}
    uneven = [(f"{at * at / 10}", "5") for at in range(60)]
    return [
        Hostile(
            "time_unit.csv",
            "spectrum",
            _headed("spectrum", "Time (ns),Counts"),
            "'ns' is no unit",
            1,
        ),
        Hostile(
            "shift.csv",
            "spectrum",
            _headed("spectrum", "Raman shift (cm-1),Counts"),
            "from a line or a laser",
            1,
        ),
        Hostile(
            "volts.csv", "spectrum", _headed("spectrum", "Tuning (V),Counts"), "'V' is no unit", 1
        ),
        Hostile(
            "furlongs.csv", "spectrum", _headed("spectrum", "x (furlongs),Counts"), "'furlongs'", 1
        ),
        Hostile("lengths.csv", "decay", _headed("decay", "Time (nm),Counts"), "'nm' is no unit", 1),
        Hostile(
            "angle_unit.csv", "coincidences", _headed("coincidences", "Delay (°),Counts"), "'°'", 1
        ),
        Hostile(
            "pattern_unit.csv",
            "pattern",
            _headed("pattern", "Angle (mm),Power"),
            "'mm' is no unit",
            1,
        ),
        Hostile(
            "units_row.csv",
            "spectrum",
            _headed("spectrum", "Axis,Counts\nps,1"),
            "'ps' is no unit",
            2,
        ),
        Hostile(
            "pixels.csv",
            "spectrum",
            _headed("spectrum", "x (pixel),Counts"),
            "'pixel' is no unit",
            1,
        ),
        Hostile(
            "mega.csv",
            "spectrum",
            _headed("spectrum", "Energy (MeV),Counts"),
            "'MeV' is no unit",
            1,
        ),
        Hostile(
            "electronvolts.csv",
            "spectrum",
            table([(f"{1.8 + at / 100:.2f}", "50") for at in range(50)]),
            "give the unit",
            1,
        ),
        Hostile(
            "micrometres.csv",
            "spectrum",
            _headed("spectrum", "Wavelength (µm),Counts"),
            "600 µm lies outside",
            2,
        ),
        Hostile(
            "zero_energy.csv",
            "spectrum",
            table([(f"{at / 10}", "50") for at in range(50)], above=["Energy (eV),Counts"]),
            "0 eV lies outside",
            2,
        ),
        Hostile(
            "negative_axis.csv",
            "spectrum",
            _with("spectrum", 7, ("-607", "5")),
            "-607 nm lies outside",
            9,
        ),
        Hostile(
            "far_wavelength.csv",
            "spectrum",
            _with("spectrum", 8, ("1e90", "5")),
            "1e+90 nm lies outside",
            10,
        ),
        Hostile(
            "deep.csv",
            "spectrum",
            _with("spectrum", 9, ("602.25", "-900")),
            "-900 lies below zero",
            11,
        ),
        Hostile(
            "all_below.csv",
            "spectrum",
            table([(x, "-3") for x, _ in spectrum_rows()]),
            "no value is above zero",
            1,
        ),
        Hostile("zeros.csv", "spectrum", zeros["spectrum"], "all values are zero", 1),
        Hostile("zero_decay.csv", "decay", zeros["decay"], "all counts are zero", 1),
        Hostile("zero_delays.csv", "coincidences", zeros["coincidences"], "all counts are zero", 1),
        Hostile("zero_pattern.csv", "pattern", zeros["pattern"], "all values are zero", 1),
        Hostile(
            "negative.csv", "decay", _with("decay", 4, ("0.256", "-1")), "-1 is a negative count", 6
        ),
        Hostile(
            "negative_delay.csv",
            "coincidences",
            _with("coincidences", 3, ("-99.25", "-0.5")),
            "-0.5 is a negative count",
            5,
        ),
        Hostile(
            "deep_pattern.csv",
            "pattern",
            _with("pattern", 3, ("6", "-0.9")),
            "-0.9 lies below zero",
            5,
        ),
        Hostile("uneven.csv", "decay", table(uneven), "no even grid", 2),
        Hostile(
            "off_grid.csv",
            "decay",
            _with("decay", 100, ("6.42", "7")),
            "6.42 ns lies on no even grid",
            102,
        ),
        Hostile(
            "twice.csv", "decay", _with("decay", 11, ("0.64", "9")), "stands in line 12 already", 13
        ),
        Hostile(
            "one_time.csv", "decay", table([("3", "5")] * 20), "all rows have the same time", 1
        ),
        Hostile(
            "turns.csv", "pattern", _with("pattern", 20, ("4000", "0.5")), "more than a turn", 22
        ),
        Hostile(
            "loud.csv",
            "pattern",
            table([(str(at), "2000") for at in range(0, 90, 5)], above=["Angle (°),Power (dB)"]),
            "no level of a power",
            2,
        ),
        Hostile(
            "downward.csv",
            "pattern",
            table([(str(at), "5") for at in range(100, 181, 5)]),
            "within 90°",
            1,
        ),
    ]


def _vast() -> list[Hostile]:
    """Files that must neither hang nor fill the memory."""
    return [
        Hostile("over.csv", "spectrum", b"637,5\n" * 3_400_000, "the file has 20.4 MB"),
        Hostile("one_line.txt", "spectrum", b"7" * 19_900_000, "no line holds two columns"),
        Hostile("one_row_wide.csv", "spectrum", b"637," * 4_900_000, "only 1 row of", 1),
        Hostile("wide.csv", "decay", (b"1," * 100_000 + b"\n") * 4, "only 4 rows", 1),
        Hostile("quotes.txt", "decay", b'"' * 1_000_000, "no line holds two columns"),
        Hostile("quote_lines.txt", "decay", b'"\n' * 450_000, "no line holds two columns"),
        Hostile(
            "nested.txt", "decay", b'"""a""' * 100_000 + b',5\n"1', "no line holds two columns"
        ),
        Hostile(
            "brackets.txt", "spectrum", b"(" * 500_000 + b"\n" + b"[" * 500_000, "no line holds"
        ),
        Hostile("line_ends.txt", "decay", b"1" + b"\n" * 5_000_000 + b"2", "5,000,000 lines"),
        Hostile("rows.csv", "spectrum", b"637.25 5\n" * 200_001, "more than 200,000 rows", 200_001),
        Hostile("commas.txt", "decay", b"," * 5_000_000, "no line holds two columns"),
        Hostile("spaces.txt", "decay", b" " * 5_000_000 + b"1", "no line holds two columns"),
        Hostile(
            "slashes.txt", "spectrum", b"a/" * 300_000 + b"\n" + b"5,6\n" * 3, "only 3 rows", 2
        ),
        Hostile("remarks.txt", "decay", b"# 1 2\n" * 500_000, "every line is a remark"),
    ]


def hostile() -> list[Hostile]:
    """Files that must each give one sentence with its reason."""
    return [*_no_text(), *_no_table(), *_ambiguous(), *_wrong_values(), *_vast()]


def huge(folder: Path) -> Path:
    """A file of 200 MB that takes no room: it must be refused by its size."""
    path = folder / "huge.csv"
    with path.open("wb") as file:
        file.write(plain("spectrum"))
    os.truncate(path, 200_000_000)
    return path
